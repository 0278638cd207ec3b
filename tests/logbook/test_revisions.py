"""Corrections of a logbook file: nothing is lost, and what stood at any time is told again."""

from __future__ import annotations

import datetime as dt
import sqlite3
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from energytrack.errors import EntryError, LogbookError, UnknownNameError
from energytrack.logbook import history, revisions, rows
from energytrack.logbook.as_of import EarlierStore, as_of
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Event, Vehicle, Weather
from energytrack.logbook.store import Store

DAY = dt.date(2026, 5, 3)
VAN = Vehicle("van", "diesel", "L", 70.0)


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "my.logbook"


@pytest.fixture
def store(path: Path) -> Iterator[Store]:
    made = Store.create(path)
    made.add_vehicle(VAN)
    yield made
    made.close()


def at(km: float, days: int = 0, energy: float = 40.0) -> Entry:
    return Entry("van", DAY + dt.timedelta(days=days), energy, km)


def logged(store: Store, *entries: Entry) -> list[Entry]:
    return [store.entry("van", store.add_entry(entry, {})) for entry in entries]


def state(store: Store) -> tuple[object, ...]:
    """All that counts in a logbook; its vehicles stay whatever happens."""
    known = store.vehicles() != []
    own = (store.entries("van"), store.modifications("van"), store.events("van")) if known else ()
    return (*own, store.weather())


def kept_rows(store: Store) -> dict[str, list[tuple[object, ...]]]:
    return {
        table: store.query(f"SELECT * FROM {table} ORDER BY 1")
        for table in ("change", "vehicle", "entry", "switch", "event", "weather", "confirmation")
    }


# One correction


def test_an_amended_entry_says_the_new_and_keeps_its_number(store: Store) -> None:
    first, second = logged(store, at(1_000), at(1_500, 3))
    number = revisions.amend(store, replace(first, energy=31.4), {"amount": "31.4"}, "read again")
    assert [(entry.id, entry.energy) for entry in store.entries("van")] == [(first.id, 31.4), (second.id, 40.0)]
    change = history.change_of(store, number)
    assert (change.what, change.why) == ("amended", "read again")
    assert change.revisions == (history.Revision("van", first, replace(first, energy=31.4)),)


def test_entries_of_one_day_keep_their_order_when_amended(store: Store) -> None:
    trips = logged(store, *(replace(at(0, energy=amount), odometer_km=None, distance_km=100.0) for amount in (5, 6, 7)))
    revisions.amend(store, replace(trips[0], note="uphill"), {})
    assert [entry.id for entry in store.entries("van")] == [entry.id for entry in trips]
    assert [entry.id for entry in store.last_entries("van", 2)] == [entry.id for entry in trips[1:]]


def test_amending_to_the_same_is_refused(store: Store) -> None:
    (entry,) = logged(store, at(1_000))
    before = kept_rows(store)
    with pytest.raises(EntryError, match="says so already"):
        revisions.amend(store, entry, {})
    assert kept_rows(store) == before


def test_a_reason_that_is_no_utf8_is_refused(store: Store) -> None:
    (entry,) = logged(store, at(1_000))
    before = kept_rows(store)
    for correct in (lambda: revisions.strike(store, entry, "\udcff"), lambda: revisions.undo(store, "\ud800")):
        with pytest.raises(LogbookError, match="not valid UTF-8"):
            correct()
    assert kept_rows(store) == before


def test_a_confirmed_entry_stays_so_unless_what_was_measured_changes(store: Store) -> None:
    (entry,) = logged(store, at(1_000))
    store.confirm(1)
    revisions.amend(store, replace(entry, note="hills"), {})
    assert store.entry("van", 1).confirmed
    revisions.amend(store, replace(store.entry("van", 1), energy=30.0), {})
    assert not store.entry("van", 1).confirmed


def test_a_struck_entry_counts_no_more_and_stays(store: Store) -> None:
    entries = logged(store, at(1_000), at(1_500, 3))
    number = revisions.strike(store, entries[0], "logged twice")
    assert [entry.odometer_km for entry in store.entries("van")] == [1_500]
    with pytest.raises(UnknownNameError, match="no entry 1"):
        store.entry("van", 1)
    with pytest.raises(UnknownNameError, match="no entry 1"):
        revisions.amend(store, replace(entries[0], energy=1.0), {})
    assert history.change_of(store, number).revisions == (history.Revision("van", entries[0], None),)
    assert history.ever_at(store, VAN, 999, 1_001) == [1]
    assert [change.what for change in history.changes_of(store, [1])] == ["logged", "struck"]


def test_an_entry_is_no_neighbour_and_no_twin_of_itself(store: Store) -> None:
    first, second, third = logged(store, at(1_000), at(1_500, 3), at(2_000, 6))
    assert store.neighbours(replace(second, odometer_km=1_600.0)) == (first, third)
    assert store.twin(second) is None
    assert store.twin(replace(second, id=None)) == second


def test_an_entry_amended_to_and_fro_is_known_once(store: Store) -> None:
    (entry,) = logged(store, at(1_000))
    for energy in (41.0, 40.0, 41.0):
        revisions.amend(store, replace(entry, energy=energy), {})
    assert store.add_entries([(at(1_000), {}), (at(1_000, energy=41.0), {})], "log.csv") == 0
    assert store.add_entries([(at(1_000), {}), (at(1_000), {})], "log.csv") == 1


# Taking back


def test_an_undone_import_can_come_in_again(store: Store) -> None:
    many = [(at(1_000), {}), (at(1_500, 3), {})]
    store.add_entries(many, "log.csv")
    revisions.undo(store)
    assert store.entries("van") == []
    assert store.add_entries(many, "log.csv") == 2


def test_a_struck_entry_does_not_come_in_again(store: Store) -> None:
    store.add_entries([(at(1_000), {})], "log.csv")
    revisions.strike(store, store.entry("van", 1))
    assert store.add_entries([(at(1_000), {})], "log.csv") == 0


def test_weather_given_again_is_kept_twice_and_taken_back(store: Store) -> None:
    store.add_weather([Weather(DAY, 7.0)])
    store.add_weather([Weather(DAY, 8.0), Weather(DAY + dt.timedelta(days=1), 9.0)])
    assert [day.temperature_c for day in store.weather()] == [8.0, 9.0]
    revisions.undo(store)
    assert store.weather() == [Weather(DAY, 7.0)]
    revisions.undo(store)
    assert store.weather() == []
    assert [row[0] for row in store.query("SELECT temperature_c FROM weather ORDER BY id")][:3] == [7.0, 8.0, 9.0]


def test_a_vehicle_stays(store: Store) -> None:
    before = kept_rows(store)
    with pytest.raises(LogbookError, match="a vehicle stays"):
        revisions.undo(store)
    assert kept_rows(store) == before


STEPS = ("log", "amend", "note", "strike", "confirm", "fit", "remove", "event", "weather", "import", "undo")


def step(store: Store, name: str, pick: int) -> None:
    """One thing somebody might do; refused where it makes no sense."""
    standing = store.entries("van")
    entry = standing[pick % len(standing)] if standing else None
    km, days = 1_000.0 + 100 * store.last_change(), store.last_change()
    if name == "log":
        store.add_entry(at(km, days), {})
    elif name == "import":
        store.add_entries([(replace(at(km + n, days), confirmed=n == 0), {}) for n in range(3)], "log.csv")
    elif name == "fit":
        store.fit("van", "skirts", None, km)
    elif name == "remove":
        store.remove("van", "skirts", None, km)
    elif name == "event":
        store.add_event(Event("van", DAY, f"service {pick}"))
    elif name == "weather":
        store.add_weather([Weather(DAY + dt.timedelta(days=pick % 3), float(pick))])
    elif name == "undo":
        revisions.undo(store)
    elif entry is not None:
        number = entry.id or 0
        {
            "amend": lambda: revisions.amend(store, replace(entry, energy=entry.energy + 1), {}),
            "note": lambda: revisions.amend(store, replace(entry, note=f"{entry.note}x"), {}),
            "strike": lambda: revisions.strike(store, entry),
            "confirm": lambda: store.confirm(number),
        }[name]()


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(steps=st.lists(st.tuples(st.sampled_from(STEPS), st.integers(0, 9)), max_size=14))
def test_every_earlier_state_is_told_again_and_undo_leads_back(
    tmp_path_factory: pytest.TempPathFactory, steps: list[tuple[str, int]]
) -> None:
    path = tmp_path_factory.mktemp("steps") / "my.logbook"
    store = Store.create(path)
    store.add_vehicle(VAN)
    states = {store.last_change(): state(store)}
    kept = kept_rows(store)
    for name, pick in steps:
        try:
            step(store, name, pick)
        except (EntryError, LogbookError):
            assert kept_rows(store) == kept
        now = kept_rows(store)
        assert all(row in now[table] for table, old in kept.items() for row in old)  # nothing is lost
        states[store.last_change()], kept = state(store), now
    for number, then in states.items():
        earlier = EarlierStore(path, number)
        assert state(earlier) == then
        earlier.close()
    for _ in store.query("SELECT 1 FROM change WHERE undoes IS NULL")[1:]:
        taken = {row[0] for row in store.query("SELECT undoes FROM change WHERE undoes IS NOT NULL")}
        newest = max(row[0] for row in store.query("SELECT id FROM change WHERE undoes IS NULL") if row[0] not in taken)
        if newest == 1:
            break
        revisions.undo(store)
        assert state(store) == states[newest - 1]
    assert state(store) == ([], [], [], [])
    store.close()


# What had been recorded by a day


@pytest.fixture
def clock(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """The clock of the computer: what it shows is the last of this list."""
    shown = ["2026-05-03T12:00:00+00:00"]
    real = rows._stamped
    monkeypatch.setattr(rows, "_stamped", lambda values: [{**row, "recorded_at": shown[-1]} for row in real(values)])
    return shown


def test_as_of_goes_by_the_day_of_recording(clock: list[str], store: Store, path: Path) -> None:
    logged(store, at(1_000, -100))
    clock.append("2026-06-10T12:00:00+00:00")
    logged(store, at(1_500, -90))
    revisions.amend(store, replace(store.entry("van", 1), energy=31.0), {})
    told = {day: [entry.energy for entry in as_of(path, day).entries("van")] for day in (DAY, dt.date(2026, 6, 10))}
    assert told == {DAY: [40.0], dt.date(2026, 6, 10): [31.0, 40.0]}
    assert as_of(path, DAY - dt.timedelta(days=2)).vehicles() == []


def test_a_clock_set_back_does_not_change_the_order(clock: list[str], store: Store, path: Path) -> None:
    logged(store, at(1_000))
    clock.append("2020-01-01T12:00:00+00:00")
    logged(store, at(1_500, 3))
    revisions.strike(store, store.entry("van", 1))
    assert as_of(path, dt.date(2020, 2, 1)).vehicles() == []
    assert [entry.id for entry in as_of(path, DAY).entries("van")] == [2]
    assert [change.what for change in history.last_changes(store, 9)][-2:] == ["logged", "struck"]


def test_an_earlier_state_cannot_be_written_to(store: Store, path: Path) -> None:
    logged(store, at(1_000))
    earlier = EarlierStore(path, 1)
    assert not earlier.writable
    with pytest.raises(LogbookError):
        earlier.add_entry(at(2_000, 9), {})
    assert len(store.entries("van")) == 1


def test_a_day_to_come_and_a_folder_are_refused(store: Store, path: Path) -> None:
    with pytest.raises(EntryError, match="in the future"):
        as_of(path, dt.date.today() + dt.timedelta(days=1))
    with pytest.raises(LogbookError, match="import it first"):
        as_of(path.parent, DAY)


# Files of earlier versions


VERSION_2 = Path(__file__).with_name("version_2.sql")
COMMON = "'', '', '{}', '{}', 'terminal'"
ROWS = f"""
INSERT INTO vehicle VALUES (1, 'van', 'diesel', 'L', 70.0, 'km', NULL, '', NULL, '2026-05-01T08:00:00+00:00',
    NULL, NULL, NULL);
INSERT INTO entry VALUES (1, 1, '2026-05-03', 1000.0, NULL, 40.0, 'fill-up', 1, NULL, 0, NULL, NULL, NULL, NULL,
    {COMMON}, '2026-05-03T08:00:00+00:00', NULL, 0);
INSERT INTO entry VALUES (2, 1, '2026-05-04', 1500.0, NULL, 41.0, 'fill-up', 1, NULL, 0, NULL, NULL, NULL, NULL,
    {COMMON}, '2026-05-02T08:00:00+00:00', NULL, 0);
INSERT INTO entry VALUES (3, 1, '2026-05-03', 1000.0, NULL, 42.0, 'fill-up', 1, NULL, 0, NULL, NULL, NULL, NULL,
    {COMMON}, '2026-05-06T08:00:00+00:00', 1, 0);
INSERT INTO entry VALUES (4, 1, '2026-05-03', 1000.0, NULL, 43.0, 'fill-up', 1, NULL, 0, NULL, NULL, NULL, NULL,
    {COMMON}, '2026-05-07T08:00:00+00:00', 3, 0);
INSERT INTO switch VALUES (1, 1, 'skirts', 'fitted', NULL, 1200.0, NULL, 3.0, '', '2026-05-05T08:00:00+00:00', NULL, 0,
    NULL, NULL, 1);
INSERT INTO confirmation VALUES (4, '2026-05-07T08:00:00+00:00');
INSERT INTO weather VALUES ('2026-05-03', 8.0);
"""


@pytest.fixture
def second_version(path: Path) -> Path:
    connection = sqlite3.connect(path)
    connection.executescript(VERSION_2.read_text() + ROWS)
    connection.close()
    return path


def test_a_file_of_version_2_keeps_all_and_gets_a_history(second_version: Path) -> None:
    store = open_logbook(second_version)
    assert isinstance(store, Store)
    assert [(entry.id, entry.energy, entry.confirmed) for entry in store.entries("van")] == [
        (1, 43.0, True),
        (2, 41.0, False),
    ]
    assert store.weather() == [Weather(DAY, 8.0)]
    assert store.query("SELECT id, origin, change_id FROM entry ORDER BY id") == [
        (1, None, 2), (2, None, 2), (3, 1, 4), (4, 1, 5),  # the second was recorded no earlier than the first
    ]  # fmt: skip
    assert [entry.energy for entry in as_of(second_version, dt.date(2026, 5, 6)).entries("van")] == [42.0, 41.0]
    assert [change.number for change in history.changes_of(store, [1])] == [2, 4, 5]


def test_what_a_file_of_version_2_recorded_can_be_taken_back(second_version: Path) -> None:
    store = open_logbook(second_version)
    assert isinstance(store, Store)
    seen = []
    for _ in range(4):
        revisions.undo(store)
        entries = [(entry.energy, entry.confirmed) for entry in store.entries("van")]
        seen.append((entries, len(store.modifications("van"))))
    assert seen == [
        ([(42.0, False), (41.0, False)], 1),
        ([(40.0, False), (41.0, False)], 1),
        ([(40.0, False), (41.0, False)], 0),
        ([], 0),
    ]


def test_version_2_becomes_what_a_new_file_is(second_version: Path, tmp_path: Path) -> None:
    def shape(store: Store) -> list[tuple[object, ...]]:
        columns = (
            "SELECT t.name, c.* FROM pragma_table_list AS t, pragma_table_info(t.name) AS c "
            "WHERE t.schema = 'main' ORDER BY t.name, c.cid"
        )
        guards = "SELECT name, sql FROM sqlite_schema WHERE type IN ('trigger', 'index', 'view') ORDER BY name"
        return store.query(columns) + store.query(guards)

    assert shape(Store(second_version)) == shape(Store.create(tmp_path / "new.logbook"))


def test_a_long_history_costs_an_entry_nothing(store: Store) -> None:
    """The standing entries are found through indexes, however often entries were corrected."""
    (entry,) = logged(store, at(1_000))
    for amount in range(20):
        revisions.amend(store, replace(entry, energy=41.0 + amount), {})
    seen: list[str] = []
    store._db.set_trace_callback(seen.append)
    store.entry("van", 1)
    store.last_entries("van", 1)
    store.neighbours(store.entry("van", 1))
    store._db.set_trace_callback(None)
    plans = [row[3] for query in seen for row in store._db.execute(f"EXPLAIN QUERY PLAN {query}").fetchall()]
    assert len(plans) > 8
    assert not [plan for plan in plans if (plan.startswith("SCAN") and "CONSTANT" not in plan) or "TEMP B-TREE" in plan]
