"""Copies of a logbook, faults that are found, and repair: real files, real writers."""

from __future__ import annotations

import datetime as dt
import os
import sqlite3
import stat
import subprocess
import sys
from pathlib import Path

import pytest

from energytrack.errors import LogbookError
from energytrack.logbook import revisions
from energytrack.logbook.backup import back_up, repair
from energytrack.logbook.checking import faults
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store

DAY = dt.date(2026, 5, 3)
PAGE = 4096


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "my.logbook"


@pytest.fixture
def store(path: Path) -> Store:
    made = Store.create(path)
    made.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    made.add_entries([(Entry("van", DAY, 40.0 + n / 10, 1_000.0 + n), {}) for n in range(300)], "log.csv")
    return made


def damage(path: Path) -> bytes:
    """Overwrite two pages in the middle of the file; what it holds then."""
    content = bytearray(path.read_bytes())
    middle = len(content) // PAGE // 2 * PAGE
    content[middle : middle + 2 * PAGE] = b"\xff" * (2 * PAGE)
    path.write_bytes(content)
    return bytes(content)


def changed_behind(path: Path, *statements: str) -> None:
    """What somebody might do with another program: guards taken away, rows changed."""
    connection = sqlite3.connect(path)
    for (trigger,) in connection.execute("SELECT name FROM sqlite_schema WHERE type = 'trigger'").fetchall():
        connection.execute(f"DROP TRIGGER {trigger}")
    for statement in statements:
        connection.execute(statement)
    connection.commit()
    connection.close()


def test_a_backup_is_the_logbook(store: Store, tmp_path: Path) -> None:
    back_up(store, tmp_path / "copy")
    copy = Store(tmp_path / "copy")
    assert copy.entries("van") == store.entries("van")
    assert copy.query("PRAGMA journal_mode") == [("wal",)]
    if os.name == "posix":
        assert stat.S_IMODE((tmp_path / "copy").stat().st_mode) == 0o600
    copy.close()
    assert sorted(each.name for each in tmp_path.iterdir() if each.name.startswith(".")) == []


WRITER = """
import datetime as dt, sys
from pathlib import Path
from energytrack.logbook.records import Entry
from energytrack.logbook.store import Store
store = Store(Path(sys.argv[1]))
for number in range(60):
    store.add_entry(Entry("van", dt.date(2026, 6, 3), 40.0, 5000.0 + number), {})
    print(number, flush=True)
"""


def test_a_backup_while_another_program_writes_is_of_one_moment(store: Store, path: Path, tmp_path: Path) -> None:
    writer = subprocess.Popen([sys.executable, "-c", WRITER, str(path)], stdout=subprocess.PIPE, text=True)
    assert writer.stdout is not None
    lengths = []
    for number in range(5):
        told = int(writer.stdout.readline())
        back_up(store, tmp_path / f"copy-{number}")
        assert faults(tmp_path / f"copy-{number}") == []
        copy = Store(tmp_path / f"copy-{number}")
        lengths.append(len(copy.entries("van")))
        assert lengths[-1] >= 300 + told + 1  # what was acknowledged before is in it
        assert len(copy.query("SELECT 1 FROM change")) == lengths[-1] - 300 + 2
        copy.close()
    writer.communicate(timeout=60)
    assert writer.returncode == 0
    assert len(store.entries("van")) == 360
    assert lengths == sorted(lengths)


def test_what_is_there_is_kept(store: Store, path: Path, tmp_path: Path) -> None:
    back_up(store, tmp_path / "copy")
    (tmp_path / "letter").write_text("mine")
    store.add_entry(Entry("van", DAY, 40.0, 2_000.0), {})
    with pytest.raises(LogbookError, match="exists already"):
        back_up(store, tmp_path / "copy")
    back_up(store, tmp_path / "copy", force=True)
    assert len(Store(tmp_path / "copy").entries("van")) == 301
    for target, why in ((path, "itself"), (tmp_path / "letter", "not a backup"), (tmp_path / "no" / "copy", "cannot")):
        with pytest.raises(LogbookError, match=why):
            back_up(store, target, force=True)
    assert (tmp_path / "letter").read_text() == "mine"


def test_a_sound_logbook_has_no_fault(store: Store, path: Path) -> None:
    entry = store.entries("van")[5]
    revisions.strike(store, entry)
    revisions.undo(store)
    store.fit("van", "skirts", DAY, 1_100.0)
    assert faults(path) == []


@pytest.mark.parametrize(
    ("statement", "said"),
    [
        ("UPDATE entry SET date = '2999-01-01' WHERE id = 7", "entry 7: date 2999-01-01 lies in the future"),
        ("UPDATE entry SET odometer_km = 900000 WHERE id = 7", "entry 7: "),
        ("UPDATE entry SET energy = 900 WHERE id = 7", "entry 7: amount 900.00 L is more than"),
        ("UPDATE entry SET date = 'May' WHERE id = 7", "cannot be read"),
        ("UPDATE entry SET vehicle_id = 9 WHERE id = 7", "row 7 of entry refers to a row of vehicle"),
        ("UPDATE entry SET origin = 3 WHERE id = 7", "row 7 of entry has lost the number"),
        ("UPDATE entry SET supersedes = 9, origin = 9 WHERE id = 7", "row 7 of entry corrects what it cannot"),
        ("UPDATE entry SET extra = '{' WHERE id = 7", "cannot be read"),
    ],
)
def test_a_row_that_cannot_be_is_named_with_a_remedy(store: Store, path: Path, statement: str, said: str) -> None:
    store.close()
    changed_behind(path, statement)
    found = faults(path)
    assert any(said in fault.what for fault in found), found
    assert all("energytrack " in fault.remedy for fault in found)


def test_damage_is_found_and_a_backup_takes_its_place(store: Store, path: Path, tmp_path: Path) -> None:
    back_up(store, tmp_path / "copy")
    store.close()
    content = damage(path)
    assert faults(path) != []
    aside = repair(path, tmp_path / "copy")
    assert aside.read_bytes() == content
    assert len(Store(path).entries("van")) == 300
    assert faults(path) == []
    damage(path)
    assert repair(path, tmp_path / "copy").name == "my.logbook.damaged-2"


def test_a_repair_that_would_not_help_changes_nothing(store: Store, path: Path, tmp_path: Path) -> None:
    back_up(store, tmp_path / "copy")
    store.close()
    with pytest.raises(LogbookError, match="nothing to repair"):
        repair(path, tmp_path / "copy")
    damage(tmp_path / "copy")
    content = damage(path)
    for backup, why in ((tmp_path / "copy", "a fault itself"), (path, "itself"), (tmp_path / "none", "no logbook")):
        with pytest.raises(LogbookError, match=why):
            repair(path, backup)
    assert path.read_bytes() == content
    assert sorted(each.name for each in tmp_path.iterdir()) == ["copy", "my.logbook"]


def test_a_damaged_logbook_is_not_backed_up_silently(store: Store, path: Path, tmp_path: Path) -> None:
    store.query("PRAGMA wal_checkpoint(TRUNCATE)")
    damage(path)
    with pytest.raises(LogbookError, match="it is damaged"):
        back_up(store, tmp_path / "copy")
    assert not (tmp_path / "copy").exists()


@pytest.mark.parametrize("content", [b"", b"not a database at all", b"SQLite format 3\0" + b"\0" * 200])
def test_files_that_are_no_logbook_are_told(tmp_path: Path, content: bytes) -> None:
    (tmp_path / "other").write_bytes(content)
    (fault, *_) = faults(tmp_path / "other")
    assert "\n" not in fault.what + fault.remedy
    assert (tmp_path / "other").read_bytes() == content
