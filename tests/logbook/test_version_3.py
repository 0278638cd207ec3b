"""A file of version 3 gets a place for the monitor's state, and keeps all it has."""

from __future__ import annotations

import datetime as dt
import sqlite3
from pathlib import Path

import pytest

from energytrack.errors import LogbookError
from energytrack.logbook.records import Entry
from energytrack.logbook.store import Store

VERSION_3 = Path(__file__).with_name("version_3.sql")
ROWS = """
INSERT INTO change VALUES (1, 'logged', '', NULL, '2026-05-01T08:00:00+00:00');
INSERT INTO vehicle VALUES (1, 'van', 'diesel', 'L', 70.0, 'km', NULL, '', NULL, '2026-05-01T08:00:00+00:00',
    NULL, NULL, NULL, 1);
INSERT INTO entry VALUES (1, 1, '2026-05-03', 1000.0, NULL, 40.0, 'fill-up', 1, NULL, 0, NULL, NULL, NULL, NULL,
    '', '', '{}', '{}', 'terminal', '2026-05-03T08:00:00+00:00', NULL, 0, 1, NULL);
"""
STATE = {"end_date": "2026-05-03", "x": [1.5, None]}


@pytest.fixture
def store(tmp_path: Path) -> Store:
    path = tmp_path / "my.logbook"
    connection = sqlite3.connect(path)
    connection.executescript(VERSION_3.read_text(encoding="utf-8") + ROWS)
    connection.close()
    return Store(path)


def test_a_file_of_version_3_becomes_what_a_new_file_is(store: Store, tmp_path: Path) -> None:
    columns = (
        "SELECT t.name, c.* FROM pragma_table_list AS t, pragma_table_info(t.name) AS c "
        "WHERE t.schema = 'main' ORDER BY t.name, c.cid"
    )
    guards = "SELECT name, sql FROM sqlite_schema WHERE type IN ('trigger', 'index', 'view') ORDER BY name"
    new = Store.create(tmp_path / "new.logbook")
    assert store.query(columns) == new.query(columns)
    assert store.query(guards) == new.query(guards)
    assert [entry.energy for entry in store.entries("van")] == [40.0]


def test_the_state_is_kept_in_the_place_of_the_last_one(store: Store) -> None:
    assert store.watch("van") is None
    store.keep_watch("van", {"end_date": "2026-05-01"})
    store.keep_watch("van", STATE)
    assert store.watch("van") == STATE
    assert store.query("SELECT count(*) FROM watch") == [(1,)]
    store.keep_watch("van", None)
    assert store.watch("van") is None


def test_a_newer_entry_leaves_it_and_an_older_one_voids_it(store: Store) -> None:
    store.keep_watch("van", STATE)
    store.add_entry(Entry("van", dt.date(2026, 5, 9), 41.0, 1600.0), {})
    assert store.watch("van") == STATE
    store.add_entry(Entry("van", dt.date(2026, 4, 9), 41.0, 400.0), {})
    assert store.watch("van") is None


def test_what_is_not_a_number_is_refused(store: Store) -> None:
    store.keep_watch("van", STATE)
    with pytest.raises(LogbookError):
        store.keep_watch("van", {"x": float("nan")})
    assert store.watch("van") == STATE
