"""A computer whose clock was set back: nothing is lost, ordered wrongly, or called a fault."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from tests.documents import ROOT
from tests.faults.commands import done, is_sound, new_logbook, odometers, refused, run

SET_BACK = """
import datetime, os
there = datetime.date.fromisoformat(os.environ["CLOCK"])
class Date(datetime.date):
    @classmethod
    def today(cls):
        return cls(there.year, there.month, there.day)
class Moment(datetime.datetime):
    @classmethod
    def now(cls, zone=None):
        return cls(there.year, there.month, there.day, 12, tzinfo=zone)
datetime.date, datetime.datetime = Date, Moment
"""


@pytest.fixture
def clock(tmp_path: Path) -> str:
    """The folder that gives a process of ours another clock."""
    folder = tmp_path / "clock"
    folder.mkdir()
    (folder / "sitecustomize.py").write_text(SET_BACK)
    return f"{folder}{os.pathsep}{ROOT}"


def at(clock: str, day: str) -> dict[str, str]:
    return {"PYTHONPATH": clock, "CLOCK": day}


def test_the_clock_is_set_back_between_two_entries(tmp_path: Path, clock: str) -> None:
    path = new_logbook(tmp_path / "my.logbook", 3)
    refusal = refused(run(path, "fillup", 20_000, 40, **at(clock, "2000-01-01")))
    assert "2000-01-01 does not fit" in refusal
    assert "2025-01-03" in refusal
    assert len(odometers(path)) == 3


def test_what_was_logged_before_is_no_fault_and_keeps_its_order(tmp_path: Path, clock: str) -> None:
    path = new_logbook(tmp_path / "my.logbook", 3)
    done(path, "fillup", 12_000, 40, "--date", "2025-01-20", "--note", "first", **at(clock, "2025-02-01"))
    done(path, "amend", 12_000, "--note", "second", **at(clock, "2025-01-25"))
    assert "no fault" in done(path, "check", **at(clock, "2025-12-01"))
    history = done(path, "history", 12_000, **at(clock, "2025-01-25")).splitlines()
    assert [line.split()[0] for line in history if line[0].isdigit()] == sorted(
        line.split()[0] for line in history if line[0].isdigit()
    )
    assert "second" in done(path, "entries", **at(clock, "2025-01-25"))
    assert "12,000 km" in done(path, "entries", "--last", 1, **at(clock, "2025-12-01"))
    assert is_sound(path)
