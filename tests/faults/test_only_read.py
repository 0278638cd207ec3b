"""A file or folder that cannot be written: reading works, writing is refused in one line."""

from __future__ import annotations

import ctypes
import datetime as dt
import os
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from energytrack.logbook.records import Entry
from energytrack.logbook.store import Store
from tests.faults.commands import new_logbook, odometers, refused, run

pytestmark = pytest.mark.skipif(os.name != "posix", reason="permissions of POSIX")
PERMISSIONS_PASSED_OVER, PR_CAPBSET_DROP = (1, 2), 24  # linux/capability.h, linux/prctl.h

READING = [
    ("entries",), ("entries", "--as-of", "2025-12-01"), ("history",), ("plan", "--target", "3"), ("check",),
    ("export", "OUT"), ("backup", "OUT"),
]  # fmt: skip
WRITING = [("fillup", 20_000, 40), ("vehicle", "add", "car", "--carrier", "petrol"), ("undo",), ("import", "TABLE")]


def held_to_permissions() -> Callable[[], None] | None:
    """What a process must do first so that permissions hold for it: root is not held to them otherwise."""
    if os.getuid() != 0:
        return None
    if sys.platform != "linux":
        pytest.skip("root is not held to permissions, and only Linux lets it give that up")
    prctl = ctypes.CDLL(None, use_errno=True).prctl

    def give_up() -> None:
        for privilege in PERMISSIONS_PASSED_OVER:
            if prctl(PR_CAPBSET_DROP, privilege, 0, 0, 0):
                raise OSError(ctypes.get_errno(), "this root may not give up its privilege")

    return give_up


@pytest.fixture
def give_up() -> Callable[[], None] | None:
    return held_to_permissions()


@pytest.fixture(params=["file", "folder", "both"])
def path(request: pytest.FixtureRequest, tmp_path: Path) -> Path:
    (tmp_path / "kept").mkdir()
    made = new_logbook(tmp_path / "kept" / "my.logbook")
    if request.param in ("file", "both"):
        made.chmod(0o400)
    if request.param in ("folder", "both"):
        made.parent.chmod(0o500)
    return made


def test_reading_works_and_writing_is_refused(
    path: Path, tmp_path: Path, give_up: Callable[[], None] | None
) -> None:
    (tmp_path / "more.csv").write_text("date,odometer_km,energy\n2025-06-01,20000,40\n")
    for number, words in enumerate(READING):
        named = [str(tmp_path / f"out-{number}") if word == "OUT" else word for word in words]
        ended = run(path, *named, before=give_up)
        assert ended.returncode == 0, (words, ended.stderr)
    for words in WRITING:
        named = [str(tmp_path / "more.csv") if word == "TABLE" else str(word) for word in words]
        refused(run(path, *named, before=give_up), "it cannot be written" if "import" in words else "cannot be written")
    assert len(odometers(path)) == 12
    assert odometers(tmp_path / f"out-{len(READING) - 1}") == odometers(path)


def test_places_that_cannot_be_written(tmp_path: Path, give_up: Callable[[], None] | None) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    closed = tmp_path / "closed"
    closed.mkdir(mode=0o500)
    for words in (("export", closed / "out"), ("backup", closed / "copy")):
        refused(run(path, *words, before=give_up), "Permission denied")
    refused(run(closed / "new.logbook", "new", before=give_up), "choose a folder you can write to")
    assert list(closed.iterdir()) == []


def test_a_file_that_cannot_be_read(tmp_path: Path, give_up: Callable[[], None] | None) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    path.chmod(0)
    for words in (("entries",), ("fillup", 20_000, 40), ("backup", tmp_path / "copy")):
        refused(run(path, *words, before=give_up), "check its permissions")


def test_what_another_program_just_wrote_is_read_too(tmp_path: Path, give_up: Callable[[], None] | None) -> None:
    """It stands in the write-ahead log beside the file for as long as that program has the logbook open."""
    (tmp_path / "kept").mkdir()
    path = new_logbook(tmp_path / "kept" / "my.logbook", 2)
    store = Store(path)
    store.add_entry(Entry("van", dt.date(2025, 3, 1), 40.0, 11_500.0), {})
    path.parent.chmod(0o500)
    try:
        ended = run(path, "entries", before=give_up)
        assert "11,500 km" in ended.stdout, ended.stderr
    finally:
        path.parent.chmod(0o700)
        store.close()
