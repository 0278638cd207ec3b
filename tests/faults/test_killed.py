"""A program that is killed, and a power cut: what was acknowledged is there, and nothing is there by half."""

from __future__ import annotations

import datetime as dt
import os
import random
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.faults.commands import command, done, entries, environment, is_sound, new_logbook, odometers

RUNS = int(os.environ.get("ENERGYTRACK_KILLS", "40"))  # of `fillup`

pytestmark = pytest.mark.skipif(os.name != "posix", reason="SIGKILL is POSIX")


def test_entries_acknowledged_before_a_kill_are_there(tmp_path: Path) -> None:
    """`fillup` killed at random moments of its life, from its first instant until after its end."""
    path = new_logbook(tmp_path / "my.logbook", 1)
    draw = random.Random(6)
    start = time.monotonic()
    done(path, "fillup", 10_500, 40, "--date", "2025-01-02")
    usual = time.monotonic() - start
    acknowledged = {10_000, 10_500}
    killed = 0
    for turn in range(RUNS):
        km = 11_000 + turn
        words = ("fillup", km, f"{30 + km % 30}.5", "--date", "2025-01-09", "--note", f"note {km}")
        process = subprocess.Popen(command(path, *words), stdout=subprocess.PIPE, env=environment())
        time.sleep(draw.uniform(0, 1.4 * usual))
        process.kill()
        said, _ = process.communicate()
        killed += process.returncode == -signal.SIGKILL
        if said:
            acknowledged.add(km)
    found = entries(path)
    assert acknowledged <= {int(entry.odometer_km or 0) for entry in found}
    for entry in found[2:]:  # acknowledged or not, whole
        km = int(entry.odometer_km or 0)
        assert (entry.energy, entry.note, entry.date) == (30.5 + km % 30, f"note {km}", dt.date(2025, 1, 9))
    assert is_sound(path)
    assert killed > RUNS // 10, "the kills came too late to show anything"
    done(path, "fillup", 12_000, 40, "--date", "2025-01-09")


WRITER = """
import datetime as dt, sys
from pathlib import Path
from energytrack.logbook.records import Entry
from energytrack.logbook.store import Store
store = Store(Path(sys.argv[1]))
print("ready", flush=True)
for km in range(int(sys.argv[2]), int(sys.argv[2]) + 1000):
    store.add_entry(Entry("van", dt.date(2025, 1, 9), 40.0, float(km), note=f"note {km}"), {"amount": {"value": "40"}})
    print(km, flush=True)
"""


def test_writing_without_pause_until_killed(tmp_path: Path) -> None:
    """Here every kill falls into a write: each process does nothing else."""
    path = new_logbook(tmp_path / "my.logbook", 1)
    draw = random.Random(7)
    acknowledged: list[int] = []
    for turn in range(max(RUNS // 6, 5)):
        first = 11_000 + 1_000 * turn
        words = [sys.executable, "-c", WRITER, str(path), str(first)]
        process = subprocess.Popen(words, stdout=subprocess.PIPE, text=True, env=environment())
        assert process.stdout is not None
        assert process.stdout.readline() == "ready\n"
        time.sleep(draw.uniform(0, 0.2))
        process.kill()
        acknowledged += [int(line) for line in process.communicate()[0].split()]
    found = entries(path)[1:]
    assert set(acknowledged) <= {int(entry.odometer_km or 0) for entry in found}
    assert all(entry.note == f"note {entry.odometer_km:.0f}" for entry in found)
    assert is_sound(path)
    assert acknowledged


def torn_files(folder: Path) -> tuple[Path, list[int]]:
    """A logbook and its write-ahead log as a power cut leaves them; the odometer values, in the order of logging."""
    path = new_logbook(folder / "my.logbook", 1)
    process = subprocess.Popen(
        [sys.executable, "-c", WRITER, str(path), "11000"], stdout=subprocess.PIPE, text=True, env=environment()
    )
    assert process.stdout is not None
    logged = [process.stdout.readline() for _ in range(31)][1:]
    process.kill()
    logged += process.communicate()[0].splitlines(keepends=True)
    whole = [int(line) for line in logged if line.endswith("\n")]
    return path, [10_000, *whole, *range(whole[-1] + 1, whole[-1] + 3)]  # the last may be written and not yet told


def test_a_torn_write_ahead_log_leaves_the_entries_up_to_some_moment(tmp_path: Path) -> None:
    """Cut short, or overwritten, at random places: the file opens, with the first so many entries and no other."""
    folder = tmp_path / "first"
    folder.mkdir()
    path, logged = torn_files(folder)
    written = Path(f"{path}-wal").read_bytes()
    assert written
    draw = random.Random(8)
    lengths = set()
    for turn in range(24):
        torn = tmp_path / f"torn-{turn}" / path.name
        torn.parent.mkdir()
        shutil.copyfile(path, torn)
        place = draw.randrange(len(written))
        rest = b"" if turn % 2 else draw.randbytes(min(512, len(written) - place)) + written[place + 512 :]
        Path(f"{torn}-wal").write_bytes(written[:place] + rest)
        if turn < 2:
            done(torn, "entries")
        assert is_sound(torn)
        found = odometers(torn)
        assert found == logged[: len(found)]
        lengths.add(len(found))
    assert len(lengths) > 3, "the places should have made a difference"
    assert len(odometers(path)) >= len(logged) - 2, "nothing is lost where nothing is torn"


def test_an_import_that_is_killed_brought_in_nothing_or_all(tmp_path: Path) -> None:
    rows = 8_000
    table = tmp_path / "log.csv"
    first = dt.date(2020, 1, 1)
    lines = (f"{first + dt.timedelta(n // 10)},{100 * n},{40 + n % 9},note {n}" for n in range(rows))
    table.write_text("\n".join(["date,odometer_km,energy,note", *lines]) + "\n")
    whole = new_logbook(tmp_path / "whole.logbook", 0)
    start = time.monotonic()
    done(whole, "import", table)
    usual = time.monotonic() - start
    draw = random.Random(9)
    for turn in range(max(RUNS // 8, 4)):
        path = new_logbook(tmp_path / f"{turn}.logbook", 0)
        process = subprocess.Popen(command(path, "import", table), stdout=subprocess.PIPE, env=environment())
        time.sleep(draw.uniform(0.2, 1.1) * usual)
        process.kill()
        said, _ = process.communicate()
        assert len(odometers(path)) in ((rows,) if said else (0, rows))
        assert is_sound(path)
