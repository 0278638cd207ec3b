"""A logbook that another process keeps to itself: waiting is said, and ends."""

from __future__ import annotations

import sqlite3
import subprocess
import sys
from pathlib import Path

import pytest

from energytrack.logbook.file import WAIT_SECONDS
from tests.faults.commands import command, environment, new_logbook, odometers, run

HOLDER = """
import sqlite3, sys
connection = sqlite3.connect(sys.argv[1], isolation_level=None)
for statement in sys.argv[2:]:
    connection.execute(statement)
print("held", flush=True)
sys.stdin.readline()
connection.rollback()
"""
LOCKS = {
    "writing": ["BEGIN IMMEDIATE"],
    "nobody else may even read": ["PRAGMA locking_mode = EXCLUSIVE", "BEGIN IMMEDIATE", "DELETE FROM look"],
}


def hold(path: Path, *statements: str) -> subprocess.Popen[str]:
    words = [sys.executable, "-c", HOLDER, str(path), *statements]
    holder = subprocess.Popen(words, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
    assert holder.stdout is not None
    assert holder.stdout.readline() == "held\n"
    return holder


def let_go(holder: subprocess.Popen[str]) -> None:
    holder.communicate("go\n")
    assert holder.returncode == 0


@pytest.mark.parametrize("lock", LOCKS)
def test_a_lock_that_stays_is_waited_for_and_then_refused(tmp_path: Path, lock: str) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    holder = hold(path, *LOCKS[lock])
    try:
        ended = run(path, "fillup", 20_000, 40)
    finally:
        let_go(holder)
    assert ended.returncode == 1
    waiting, refusal = ended.stderr.splitlines()
    assert waiting == f"energytrack: another program is writing to {path}; waiting up to {WAIT_SECONDS:.0f} s"
    assert refusal.endswith(f"another program kept writing to it for {WAIT_SECONDS:.0f} s: try again")
    assert len(odometers(path)) == 12


def test_a_lock_that_goes_lets_the_entry_in(tmp_path: Path) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    holder = hold(path, *LOCKS["writing"])
    process = subprocess.Popen(
        command(path, "fillup", 20_000, 40),
        stderr=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
        env=environment(),
    )
    assert process.stderr is not None
    assert "waiting" in process.stderr.readline()
    let_go(holder)
    said, complained = process.communicate(timeout=60)
    assert (process.returncode, complained) == (0, ""), complained
    assert said
    assert odometers(path)[-1] == 20_000


def test_reading_goes_on_while_another_writes(tmp_path: Path) -> None:
    path = new_logbook(tmp_path / "my.logbook")
    holder = hold(path, *LOCKS["writing"])
    try:
        for words in (("entries",), ("history",), ("check",), ("backup", tmp_path / "copy")):
            ended = run(path, *words)
            assert (ended.returncode, ended.stderr) == (0, ""), ended.stderr
    finally:
        let_go(holder)
    assert sqlite3.connect(tmp_path / "copy").execute("SELECT count(*) FROM entry").fetchone() == (12,)
