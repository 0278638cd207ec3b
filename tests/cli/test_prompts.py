"""Questions on a real terminal."""

from __future__ import annotations

import os
import signal
import sqlite3
import sys
from pathlib import Path

import pytest

from energytrack.logbook.records import Vehicle
from energytrack.logbook.store import Store

pexpect = pytest.importorskip("pexpect")
pytestmark = pytest.mark.skipif(os.name != "posix", reason="pexpect's terminals are POSIX")

ROOT = Path(__file__).parents[2]


@pytest.fixture
def logbook(tmp_path: Path) -> Path:
    store = Store.create(tmp_path / "my.logbook")
    store.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    store.close()
    return tmp_path / "my.logbook"


def listening() -> None:
    """A suite run in the background of a shell passes on that Ctrl-C is ignored: a command in front hears it."""
    signal.signal(signal.SIGINT, signal.SIG_DFL)


def start(logbook: Path, *arguments: str):
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    command = ["-m", "energytrack", "--logbook", str(logbook), *arguments]
    return pexpect.spawn(sys.executable, command, env=environment, encoding="utf-8", timeout=30, preexec_fn=listening)


def entries(logbook: Path) -> list[tuple[float, float]]:
    connection = sqlite3.connect(logbook)
    try:
        return connection.execute("SELECT odometer_km, energy FROM entry ORDER BY id").fetchall()
    finally:
        connection.close()


def test_what_is_missing_is_asked_with_the_last_odometer_as_hint(logbook: Path) -> None:
    first = start(logbook, "fillup", "48230", "41.32", "--date", "2026-05-03")
    first.expect(pexpect.EOF)
    asked = start(logbook, "fillup")
    asked.expect("Odometer in km, last 48,230 km on 2026-05-03: ")
    asked.sendline("48,9")
    asked.expect("write 48.9, not 48,9")
    asked.expect("Odometer in km")
    asked.sendline("48900")
    asked.expect("Amount in L: ")
    asked.sendline("40.1")
    asked.expect("670 km since the last entry")
    asked.expect(pexpect.EOF)
    asked.close()
    assert asked.exitstatus == 0
    assert entries(logbook) == [(48230.0, 41.32), (48900.0, 40.1)]


def test_only_the_amount_is_asked_where_the_odometer_was_typed(logbook: Path) -> None:
    asked = start(logbook, "fillup", "48230")
    asked.expect("Amount in L: ")
    asked.sendline("41.32")
    asked.expect(pexpect.EOF)
    assert entries(logbook) == [(48230.0, 41.32)]


def test_an_answer_out_of_range_is_refused_at_once_and_asked_again(logbook: Path) -> None:
    start(logbook, "fillup", "48230", "41.32", "--date", "2026-05-03").expect(pexpect.EOF)
    asked = start(logbook, "fillup", "--date", "2026-05-10")
    for odometer, reason in (
        ("-5", "is no odometer value"),
        ("47000", "odometer goes back"),
        ("489000", "a jump no vehicle drives"),
    ):
        asked.expect("Odometer in km, last 48,230 km on 2026-05-03: ")
        asked.sendline(odometer)
        asked.expect(reason)
    asked.expect("Odometer in km")
    asked.sendline("48900")
    for amount, reason in (("0", "must be more than 0"), ("400", "more than 1.3 times the capacity of van, 70.00 L")):
        asked.expect("Amount in L: ")
        asked.sendline(amount)
        asked.expect(reason)
    asked.expect("Amount in L: ")
    asked.sendline("40.1")
    asked.expect(pexpect.EOF)
    assert entries(logbook) == [(48230.0, 41.32), (48900.0, 40.1)]


def test_a_distance_out_of_range_is_asked_again(logbook: Path) -> None:
    start(logbook, "fillup", "40", "--distance", "500", "--date", "2026-05-03").expect(pexpect.EOF)
    asked = start(logbook, "fillup")
    asked.expect("Distance since the last entry, 2026-05-03, in km: ")
    asked.sendline("-500")
    asked.expect("is not possible")
    asked.expect("Distance since the last entry, 2026-05-03, in km: ")
    asked.sendline("510")
    asked.expect("Amount in L: ")
    asked.sendline("40.1")
    asked.expect(pexpect.EOF)
    assert [energy for _, energy in entries(logbook)] == [40.0, 40.1]


@pytest.mark.parametrize(("key", "status"), [("\x04", 1), ("\x03", 130)])
def test_leaving_the_questions_writes_nothing(logbook: Path, key: str, status: int) -> None:
    """End of input and interrupt; 128 + SIGINT is the shell's convention."""
    asked = start(logbook, "fillup")
    asked.expect("Odometer in km: ")
    asked.send(key)
    asked.expect(pexpect.EOF)
    asked.close()
    assert asked.exitstatus == status
    assert "Traceback" not in asked.before
    assert entries(logbook) == []
