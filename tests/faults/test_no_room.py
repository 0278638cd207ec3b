"""A full disk, and a limit on the size of files: one clear line, and what was there is there."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from tests.faults.commands import beside, done, is_sound, new_logbook, odometers, refused, run

pytestmark = pytest.mark.skipif(os.name != "posix", reason="resource limits and mounts are POSIX")
LONG_NOTE = "n" * 10_000  # the longest there may be, and more than the room that is left


def limited(size: int) -> Callable[[], None]:
    """No file may grow beyond so many bytes, as `ulimit -f` has it."""
    import resource

    return lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (size, size))


def large_table(folder: Path) -> Path:
    table = folder / "large.csv"
    rows = [f"2025-06-{1 + n // 200:02d},{20_000 + n},4{n % 10},{'n' * 100}" for n in range(4_000)]
    table.write_text("\n".join(["date,odometer_km,energy,note", *rows]) + "\n")
    return table


WRITES: dict[str, Callable[[Path], tuple[object, ...]]] = {
    "fillup": lambda folder: ("fillup", 20_000, 40, "--date", "2025-06-01", "--note", LONG_NOTE),
    "import": lambda folder: ("import", large_table(folder)),
    "backup": lambda folder: ("backup", folder / "copy"),
    "export": lambda folder: ("export", folder / "out"),
}


@pytest.mark.parametrize("size", [0, 60_000])
@pytest.mark.parametrize("name", WRITES)
def test_a_limit_on_the_size_of_files(tmp_path: Path, name: str, size: int) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    words = WRITES[name](tmp_path)
    before, held = odometers(path), beside(path)
    if name in ("export", "fillup") and size:
        size = {"export": 200, "fillup": 12_000}[name]  # what they write is small
    refused(run(path, *words, before=limited(size)))
    assert odometers(path) == before
    assert is_sound(path)
    assert beside(path) == held, "nothing half-written is left"
    done(path, *words)  # with room again


def test_a_new_logbook_that_has_no_room_is_not_begun(tmp_path: Path) -> None:
    refused(run(tmp_path / "my.logbook", "new", before=limited(10_000)), "limit on the size of files")
    assert beside(tmp_path / "my.logbook") == set()


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    """A file system of 1 MiB, most of it taken."""
    folder = tmp_path / "disk"
    folder.mkdir()
    mounted = sys.platform == "linux" and subprocess.run(
        ["mount", "-t", "tmpfs", "-o", "size=1m,mode=0700", "tmpfs", str(folder)], capture_output=True, check=False
    ).returncode == 0  # fmt: skip
    if not mounted:
        pytest.skip("a small file system cannot be mounted here (it takes root, on Linux)")
    yield folder
    subprocess.run(["umount", str(folder)], check=True)


def fill(disk: Path, left: int) -> Path:
    """Take all but `left` bytes."""
    free = os.statvfs(disk).f_bavail * os.statvfs(disk).f_frsize
    filler = disk / "filler"
    filler.write_bytes(b"x" * max(free - left, 0))
    return filler


@pytest.mark.parametrize("left", [0, 50_000])
@pytest.mark.parametrize("name", WRITES)
def test_a_full_disk(small_disk: Path, tmp_path: Path, name: str, left: int) -> None:
    path = new_logbook(small_disk / "my.logbook")
    words = ("import", large_table(tmp_path)) if name == "import" else WRITES[name](small_disk)
    before = odometers(path)
    filler = fill(small_disk, left if name != "export" else 0)
    held = beside(path)
    refused(run(path, *words))
    filler.unlink()
    assert odometers(path) == before
    assert is_sound(path)
    assert beside(path) == held - {"filler"}
    if name != "import":
        done(path, *words)


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full here")
def test_an_output_that_takes_nothing_is_told_and_the_entry_is_kept(tmp_path: Path) -> None:
    path = new_logbook(tmp_path / "my.logbook", 2)
    with open("/dev/full", "w") as full:
        ended = subprocess.run(
            [sys.executable, "-m", "energytrack", "--logbook", str(path), "fillup", "12000", "40"],
            stdout=full, stderr=subprocess.PIPE, text=True, check=False,
        )  # fmt: skip
    assert ended.returncode == 1
    assert len(ended.stderr.splitlines()) == 1
    assert odometers(path)[-1] == 12_000
