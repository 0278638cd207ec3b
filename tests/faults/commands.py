"""The command line as processes, and what must be true of every refusal."""

from __future__ import annotations

import datetime as dt
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

from energytrack.logbook.checking import faults
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store
from tests.documents import ROOT

FIRST_KM, STEP_KM = 10_000, 500


def command(logbook: Path, *words: object) -> list[str]:
    return [sys.executable, "-m", "energytrack", "--logbook", str(logbook), *map(str, words)]


def environment(**more: str) -> dict[str, str]:
    return {**os.environ, "COLUMNS": "80", "PYTHONPATH": str(ROOT), **more}


def run(
    logbook: Path, *words: object, before: Callable[[], None] | None = None, **more: str
) -> subprocess.CompletedProcess[str]:
    """One process, whatever becomes of it. before: run in it before the program starts (POSIX)."""
    return subprocess.run(
        command(logbook, *words), capture_output=True, text=True, check=False, timeout=120,
        preexec_fn=before, env=environment(**more),
    )  # fmt: skip


def done(logbook: Path, *words: object, **more: str) -> str:
    """What a process prints that must succeed."""
    ended = run(logbook, *words, **more)
    assert ended.returncode == 0, ended.stderr
    return ended.stdout


def refused(ended: subprocess.CompletedProcess[str], *said: str) -> str:
    """The one line of a refusal; it holds what is `said`."""
    lines = ended.stderr.splitlines()
    assert ended.returncode == 1, (ended.returncode, ended.stdout, ended.stderr)
    assert len(lines) == 1, ended.stderr
    assert lines[0].startswith("energytrack: ")
    for part in said:
        assert part in lines[0]
    return lines[0]


def new_logbook(path: Path, count: int = 12) -> Path:
    """A logbook of one van with so many entries."""
    store = Store.create(path)
    store.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    first = dt.date(2025, 1, 1)
    logged = [Entry("van", first + dt.timedelta(n), 40 + n % 7 / 10, FIRST_KM + n * STEP_KM) for n in range(count)]
    store.add_entries([(entry, {}) for entry in logged], "log.csv")
    store.close()
    return path


def entries(path: Path) -> list[Entry]:
    store = Store(path)
    found = store.entries("van")
    store.close()
    return found


def odometers(path: Path) -> list[int]:
    return [int(entry.odometer_km or 0) for entry in entries(path)]


def is_sound(path: Path) -> bool:
    return faults(path) == []


def beside(path: Path) -> set[str]:
    """The names of the files in the folder of a logbook."""
    return {each.name for each in path.parent.iterdir()}
