"""The logbook file: what is kept, what cannot be changed, and how it fails."""

from __future__ import annotations

import datetime as dt
import math
import os
import sqlite3
import stat
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import pytest

from energytrack.errors import EnergytrackError, EntryError, LogbookError, UnknownNameError
from energytrack.logbook import schema
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Event, Modification, Vehicle, Weather
from energytrack.logbook.store import Store

DAY = dt.date(2026, 5, 3)
VAN = Vehicle("van", "diesel", "L", 70.0, "mi", "mpg-imp", "white", "gal-imp")
FULL_ENTRY = Entry(
    "van", DAY, 41.32, 48_230.0, "fill-up", False, 40.0, True, None, 70.2, "EUR", 12.0, 94.0, "pump", "note",
    {"payload": 300.0},
)  # fmt: skip


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "my.logbook"


@pytest.fixture
def store(path: Path) -> Store:
    made = Store.create(path)
    made.add_vehicle(VAN)
    return made


def at(km: float, days: int = 0, energy: float = 40.0) -> Entry:
    return Entry("van", DAY + dt.timedelta(days=days), energy, km)


def same(one: Entry, other: Entry) -> bool:
    return replace(one, id=None) == replace(other, id=None)


def raw(path: Path, *statements: str) -> list[tuple[object, ...]]:
    """Run SQL behind the store's back."""
    connection = sqlite3.connect(path)
    try:
        rows = [row for statement in statements for row in connection.execute(statement).fetchall()]
        connection.commit()
        return rows
    finally:
        connection.close()


# What goes in comes out


def test_everything_comes_back_after_reopening(store: Store, path: Path) -> None:
    store.add_entry(FULL_ENTRY, {})
    store.add_event(Event("van", DAY, "winter tyres", 48_300.0, 1.02, "worn"))
    store.add_weather([Weather(DAY, 7.5), Weather(DAY - dt.timedelta(days=1), 9.0), Weather(DAY, 8.0)])
    store.fit("van", "skirts", DAY, 48_900.0, 3.0, 2.4, "left first")
    store.remove("van", "skirts", None, 52_100.0)
    store.close()
    again = open_logbook(path)
    assert again.vehicles() == [VAN]
    assert again.vehicle("van") == VAN
    assert same(again.entries("van")[0], FULL_ENTRY)
    assert again.events("van") == [Event("van", DAY, "winter tyres", 48_300.0, 1.02, "worn")]
    assert again.weather() == [Weather(DAY - dt.timedelta(days=1), 9.0), Weather(DAY, 8.0)]
    assert again.modifications("van") == [
        Modification("van", "skirts", DAY, 48_900.0, None, 52_100.0, 2.4, 3.0, "left first")
    ]


def test_an_amount_that_is_not_known_stays_unknown(store: Store) -> None:
    store.add_entry(at(1_000, energy=math.nan), {})
    assert math.isnan(store.entries("van")[0].energy)


def test_driving_order_and_the_newest(store: Store) -> None:
    for km, days in ((1_500, 2), (1_000, 0), (2_000, 2), (1_200, 1)):
        store.add_entry(at(km, days), {})
    assert [entry.odometer_km for entry in store.entries("van")] == [1_000, 1_200, 1_500, 2_000]
    assert [entry.odometer_km for entry in store.last_entries("van", 2)] == [1_500, 2_000]
    before, after = store.neighbours(at(1_300))
    assert before is not None
    assert after is not None
    assert (before.odometer_km, after.odometer_km) == (1_200, 1_500)
    assert store.neighbours(at(900))[0] is None
    assert store.neighbours(at(2_000))[1] is None


def test_distance_entries_have_neighbours_and_twins_by_date(store: Store) -> None:
    trips = [Entry("van", DAY + dt.timedelta(days=days), 8.0, distance_km=300.0) for days in (0, 4)]
    for trip in trips:
        store.add_entry(trip, {})
    between = replace(trips[0], date=DAY + dt.timedelta(days=2))
    before, after = store.neighbours(between)
    assert before is not None
    assert after is not None
    assert same(before, trips[0])
    assert same(after, trips[1])
    assert store.twin(between) is None
    assert store.twin(trips[0]) is not None
    assert store.twin(replace(trips[0], distance_km=301.0)) is None


def test_what_was_typed_is_kept(store: Store, path: Path) -> None:
    store.add_entry(at(1_000), {"amount": {"value": "8.8", "unit": "gal-imp"}})
    assert raw(path, "SELECT typed, source, recorded_at IS NOT NULL FROM entry") == [
        ('{"amount": {"value": "8.8", "unit": "gal-imp"}}', "terminal", 1)
    ]


def test_the_last_answer_of_each_modification_is_read(store: Store) -> None:
    for name, verdict in (("skirts", "not-yet"), ("tyres", "not-yet"), ("skirts", "shifted")):
        store.keep_assessment("van", name, {"modification": name, "verdict": verdict, "looks": [1, 2]})
    assert store.assessments("van") == [
        {"modification": "tyres", "verdict": "not-yet"},
        {"modification": "skirts", "verdict": "shifted"},
    ]


def test_a_look_is_noted_once_for_each_segment_end(store: Store) -> None:
    for km, days in ((1_000.0, 0), (1_500.0, 3), (1_500.2, 3), (1_000.0, 0)):
        store.record_look("van", "skirts", km, DAY + dt.timedelta(days=days))
    store.record_look("van", "tyres", 1_000.0, DAY)
    assert store.looks("van", "skirts") == [1_000.0, 1_500.0]
    assert store.looks("van", "tyres") == [1_000.0]
    assert store.looks("van", "rack") == []
    with pytest.raises(UnknownNameError):
        store.record_look("bus", "skirts", 1_000.0, DAY)


def test_an_entry_that_looks_odd_is_confirmed(store: Store) -> None:
    numbers = [store.add_entry(at(km), {}) for km in (1_000, 1_500)]
    store.confirm(numbers[0])
    store.confirm(numbers[0])
    assert [entry.confirmed for entry in store.entries("van")] == [True, False]
    assert store.entry("van", numbers[0]).confirmed
    with pytest.raises(UnknownNameError, match="no entry 99"):
        store.confirm(99)


def test_entries_come_in_confirmed(store: Store) -> None:
    store.add_entry(at(500), {})
    many = [(replace(at(km), confirmed=km == 1_500), {}) for km in (1_000, 1_500, 2_000)]
    assert store.add_entries([(at(500), {}), *many], "log.csv") == 3
    assert [entry.odometer_km for entry in store.entries("van") if entry.confirmed] == [1_500]
    store.add_entry(replace(at(2_500), confirmed=True), {})
    assert store.last_entries("van", 1)[0].confirmed


# Adding many


def test_the_same_entries_are_added_once(store: Store) -> None:
    many = [(at(1_000), {}), (at(1_500, 3), {}), (Entry("van", DAY, 8.0, distance_km=30.0), {})]
    assert store.add_entries(many, "log.csv") == 3
    assert store.add_entries(many, "log.csv") == 0
    twice = [many[2], many[2]]  # two equal trips of one day
    assert store.add_entries(twice, "log.csv") == 1
    assert store.add_entries(twice, "log.csv") == 0


def test_many_are_added_wholly_or_not_at_all(store: Store) -> None:
    with pytest.raises(UnknownNameError):
        store.add_entries([(at(1_000), {}), (replace(at(1_500), vehicle="bus"), {})], "log.csv")
    assert store.entries("van") == []


# Nothing is overwritten


@pytest.mark.parametrize(
    ("table", "column"),
    [
        *(("entry", "note"), ("switch", "note"), ("event", "note")),
        *(("look", "modification"), ("confirmation", "recorded_at"), ("vehicle", "note"), ("weather", "date")),
    ],
)
@pytest.mark.parametrize(
    "statement", ["UPDATE {0} SET {1} = 'x'", "DELETE FROM {0}", "REPLACE INTO {0} SELECT * FROM {0}"]
)
def test_rows_cannot_be_changed(store: Store, path: Path, table: str, column: str, statement: str) -> None:
    store.confirm(store.add_entry(at(1_000), {}))
    store.record_look("van", "skirts", 1_000.0, DAY)
    store.fit("van", "skirts", DAY, None)
    store.add_event(Event("van", DAY, "service"))
    store.add_weather([Weather(DAY, 8.0)])
    before = raw(path, f"SELECT * FROM {table}")
    assert len(before) == 1
    with pytest.raises(sqlite3.IntegrityError, match="never changed"):
        raw(path, statement.format(table, column))
    assert raw(path, f"SELECT * FROM {table}") == before


COLUMNS = "vehicle_id, date, odometer_km, energy, kind, full, missed, place, note, extra, typed, source, recorded_at"


def test_the_tables_allow_correcting_and_striking(store: Store, path: Path) -> None:
    for km in (1_000, 1_500, 2_000):
        store.add_entry(at(km, km // 100), {})
    corrected = COLUMNS.replace("odometer_km", "odometer_km + 1")
    raw(path, f"INSERT INTO entry ({COLUMNS}, supersedes) SELECT {corrected}, id FROM entry WHERE id = 1")
    raw(path, f"INSERT INTO entry ({COLUMNS}, supersedes, struck) SELECT {COLUMNS}, id, 1 FROM entry WHERE id = 2")
    assert [entry.odometer_km for entry in store.entries("van")] == [1_001, 2_000]
    assert store.add_entries([(at(1_000, 10), {}), (at(1_500, 15), {})], "log.csv") == 0  # known, though not standing
    with pytest.raises(sqlite3.IntegrityError):
        raw(path, f"INSERT INTO entry ({COLUMNS}, supersedes) SELECT {COLUMNS}, id FROM entry WHERE id = 1")


# The file


@pytest.mark.skipif(os.name != "posix", reason="file modes are POSIX")
def test_only_its_owner_may_read_it(path: Path) -> None:
    earlier = os.umask(0)
    try:
        store = Store.create(path)
        store.add_vehicle(VAN)
        modes = {each.name: stat.S_IMODE(each.stat().st_mode) for each in path.parent.iterdir()}
    finally:
        os.umask(earlier)
    assert modes == {"my.logbook": 0o600, "my.logbook-wal": 0o600, "my.logbook-shm": 0o600}


def test_settings_of_the_file(store: Store, path: Path) -> None:
    def setting(name: str) -> object:
        return store._db.execute(f"PRAGMA {name}").fetchone()[0]

    assert setting("journal_mode") == "wal"
    assert setting("synchronous") == 2  # FULL
    assert setting("foreign_keys") == 1
    assert setting("busy_timeout") == 10_000
    assert setting("user_version") == len(schema.MIGRATIONS)
    strict = raw(path, "SELECT name, strict FROM pragma_table_list WHERE schema = 'main' AND type = 'table'")
    assert {name: flag for name, flag in strict if not str(name).startswith("sqlite_")} == dict.fromkeys(
        ("vehicle", "entry", "switch", "event", "weather", "assessment", "look", "confirmation", "change", "watch"), 1
    )


def test_an_entry_costs_the_same_in_a_large_logbook(store: Store) -> None:
    """Every query made for one more entry goes through an index and never sorts."""
    entry = at(1_000)
    seen: list[str] = []
    store._db.set_trace_callback(seen.append)
    with store.transaction():
        store.last_entries("van", 1)
        store.neighbours(entry)
        store.twin(entry)
        store.neighbours(replace(entry, odometer_km=None, distance_km=5.0))
        store.twin(replace(entry, odometer_km=None, distance_km=5.0))
        store.entry("van", store.add_entry(entry, {}))
    store._db.set_trace_callback(None)
    queries = [statement for statement in seen if statement.startswith("SELECT")]
    plans = [row[3] for query in queries for row in store._db.execute(f"EXPLAIN QUERY PLAN {query}").fetchall()]
    assert len(queries) >= 8
    whole = [step for step in plans if step.startswith("SCAN") and step != "SCAN CONSTANT ROW"]  # a row given by value
    assert whole + [step for step in plans if "TEMP B-TREE" in step] == []


def test_new_never_touches_an_existing_path(store: Store, path: Path, tmp_path: Path) -> None:
    for existing in (path, tmp_path):
        with pytest.raises(LogbookError, match="exists already"):
            open_logbook(existing, create=True)
    assert store.vehicles() == [VAN]


def test_new_in_a_folder_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(LogbookError, match="cannot create"):
        Store.create(tmp_path / "none" / "my.logbook")


def test_paths_that_are_no_logbook(tmp_path: Path, path: Path) -> None:
    with pytest.raises(LogbookError, match=r"there is no logbook .* new`"):
        open_logbook(path)
    assert not path.exists()
    text = tmp_path / "notes.txt"
    text.write_text("not a database, but long enough to look at: " * 20)
    with pytest.raises(LogbookError, match="it is not a logbook"):
        open_logbook(text)
    empty = tmp_path / "empty"
    empty.touch()
    with pytest.raises(LogbookError, match="not a logbook of this program"):
        open_logbook(empty)
    other = tmp_path / "other.sqlite"
    raw(other, "CREATE TABLE entry (id INTEGER)")
    before = other.read_bytes()
    with pytest.raises(LogbookError, match="not a logbook of this program"):
        open_logbook(other)
    assert other.read_bytes() == before


@pytest.mark.skipif(os.name != "posix", reason="device files are POSIX")
def test_a_device_is_no_logbook() -> None:
    with pytest.raises(LogbookError, match="is not a file"):
        open_logbook("/dev/null")


def test_a_damaged_file_is_refused_in_one_line(store: Store, path: Path) -> None:
    for km in range(1_000, 3_000, 10):
        store.add_entry(at(km), {"note": "x" * 200})
    store.close()
    content = bytearray(path.read_bytes())
    content[4096:] = b"\xff" * (len(content) - 4096)
    path.write_bytes(content)
    with pytest.raises(LogbookError) as refusal:
        open_logbook(path).entries("van")
    assert "damaged" in str(refusal.value)
    assert "\n" not in str(refusal.value)


def test_values_that_nothing_here_wrote_are_refused(store: Store, path: Path) -> None:
    raw(path, f"INSERT INTO entry ({COLUMNS}) VALUES (1, 'May', 1, 1, 'charge', 1, 0, '', '', '{{}}', '{{}}', '', '')")
    with pytest.raises(LogbookError, match="cannot be read"):
        store.entries("van")


# Versions


NEWEST = len(schema.MIGRATIONS)
FIRST_VERSION = Path(__file__).with_name("version_1.sql")  # the statements as they were released
FIRST_ROWS = """
INSERT INTO vehicle VALUES (1, 'van', 'diesel', 'L', 70.0, 'mi', 'mpg-imp', 'white', 'gal-imp', '2026-05-03T08:00:00');
INSERT INTO entry VALUES (1, 1, '2026-05-03', 48230.0, NULL, 41.32, 'fill-up', 0, 40.0, 1, 70.2, 'EUR', 12.0, 94.0,
    'pump', 'note', '{"payload": 300.0}', '{}', 'terminal', '2026-05-03T08:00:00', NULL, 0);
INSERT INTO entry VALUES (2, 1, '2026-05-09', 48900.0, NULL, 44.0, 'fill-up', 1, NULL, 0, NULL, NULL, NULL, NULL,
    '', '', '{}', '{}', 'terminal', '2026-05-09T08:00:00', NULL, 0);
INSERT INTO entry VALUES (3, 1, '2026-05-09', 48910.0, NULL, 44.0, 'fill-up', 1, NULL, 0, NULL, NULL, NULL, NULL,
    '', '', '{}', '{}', 'terminal', '2026-05-09T08:05:00', 2, 0);
INSERT INTO switch VALUES (1, 1, 'skirts', 'fitted', '2026-05-03', 48900.0, 2.4, 3.0, 'left first', 'x', NULL, 0);
INSERT INTO event VALUES (1, 1, '2026-05-03', 48300.0, 'winter tyres', 1.02, 'worn', 'x', NULL, 0);
INSERT INTO weather VALUES ('2026-05-03', 8.0);
INSERT INTO assessment VALUES (1, 1, 'skirts', '{"verdict": "not-yet"}', 'x');
"""


@pytest.fixture
def first_version(path: Path) -> Path:
    connection = sqlite3.connect(path)
    connection.executescript(FIRST_VERSION.read_text() + FIRST_ROWS)
    connection.close()
    return path


def test_a_file_of_version_1_is_brought_up_to_date(first_version: Path) -> None:
    store = open_logbook(first_version)
    assert raw(first_version, "PRAGMA user_version") == [(NEWEST,)]
    assert store.vehicles() == [VAN]
    first, second = store.entries("van")
    assert same(first, FULL_ENTRY)
    assert (second.odometer_km, second.confirmed) == (48_910.0, False)
    (skirts,) = store.modifications("van")
    assert skirts == Modification("van", "skirts", DAY, 48_900.0, level=2.4, target_percent=3.0, note="left first")
    assert (skirts.known, skirts.reversible) == (None, True)
    assert store.events("van") == [Event("van", DAY, "winter tyres", 48_300.0, 1.02, "worn")]
    assert store.weather() == [Weather(DAY, 8.0)]
    assert store.assessments("van") == [{"verdict": "not-yet"}]
    assert store.looks("van", "skirts") == []


def test_a_file_of_version_1_takes_what_is_new_in_version_2(first_version: Path) -> None:
    store = open_logbook(first_version)
    assert isinstance(store, Store)
    bus = replace(VAN, name="bus", second_carrier="electricity", second_unit="kWh", second_capacity=11.0)
    store.add_vehicle(bus)
    store.fit("van", "windows open", DAY, 49_000.0, known=(4.0, 9.0), reversible=False)
    store.record_look("van", "skirts", 48_910.0, DAY)
    store.confirm(3)
    store.close()
    again = open_logbook(first_version)
    assert again.vehicle("bus") == bus
    windows = again.modifications("van")[1]
    assert (windows.known, windows.reversible) == ((4.0, 9.0), False)
    assert again.looks("van", "skirts") == [48_910.0]
    assert [entry.confirmed for entry in again.entries("van")] == [False, True]


def test_version_1_becomes_what_a_new_file_is(first_version: Path, tmp_path: Path) -> None:
    open_logbook(first_version).close()
    Store.create(tmp_path / "new.logbook").close()
    columns = (
        "SELECT t.name, c.* FROM pragma_table_list AS t, pragma_table_info(t.name) AS c "
        "WHERE t.schema = 'main' ORDER BY t.name, c.cid"
    )
    guards = "SELECT name, sql FROM sqlite_schema WHERE type IN ('trigger', 'index', 'view') ORDER BY name"
    assert raw(first_version, columns, guards) == raw(tmp_path / "new.logbook", columns, guards)


def test_a_later_version_is_one_more_step(store: Store, path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    store.add_entry(FULL_ENTRY, {})
    store.close()
    assert raw(path, "PRAGMA user_version") == [(NEWEST,)]
    step = "ALTER TABLE entry ADD COLUMN weight REAL;\nCREATE TABLE driver (id INTEGER) STRICT;\n"
    later = (*schema.MIGRATIONS, step)
    monkeypatch.setattr(schema, "MIGRATIONS", later)
    newer = open_logbook(path)
    assert same(newer.entries("van")[0], FULL_ENTRY)
    assert raw(path, "PRAGMA user_version", "SELECT weight FROM standing_entry") == [(NEWEST + 1,), (None,)]
    newer.add_entry(at(50_000, 9), {})
    monkeypatch.undo()
    with pytest.raises(LogbookError, match=rf"tables of version {NEWEST + 1}.*install the newer"):
        open_logbook(path)


def test_a_step_that_fails_leaves_the_file_as_it_was(
    store: Store, path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    store.close()
    broken = (*schema.MIGRATIONS, "CREATE TABLE driver (id INTEGER) STRICT;\nCREATE TABLE entry (id INTEGER);\n")
    monkeypatch.setattr(schema, "MIGRATIONS", broken)
    with pytest.raises(LogbookError):
        open_logbook(path)
    monkeypatch.undo()
    assert raw(path, "PRAGMA user_version") == [(NEWEST,)]
    assert raw(path, "SELECT name FROM sqlite_schema WHERE name = 'driver'") == []
    assert open_logbook(path).vehicles() == [VAN]


# Refusals


def test_names(store: Store) -> None:
    with pytest.raises(UnknownNameError, match="no vehicle 'bus' in this logbook; there are: van"):
        store.vehicle("bus")
    with pytest.raises(UnknownNameError, match="there are: van"):
        store.add_entry(replace(at(1_000), vehicle="bus"), {})
    with pytest.raises(LogbookError, match="there is a vehicle 'van' already"):
        store.add_vehicle(VAN)


def test_switches_are_checked_as_they_are_written(store: Store) -> None:
    store.fit("van", "skirts", DAY, 1_000.0)
    with pytest.raises(EntryError, match="is fitted to van since"):
        store.fit("van", "skirts", DAY, 1_200.0)
    with pytest.raises(EntryError, match="fitted now: 'skirts'"):
        store.remove("van", "spoiler", DAY, 1_300.0)
    assert len(store.modifications("van")) == 1


@pytest.mark.parametrize("note", ["\ud800", "broken \udcff bytes"])
def test_text_that_is_no_utf8_is_refused(store: Store, note: str) -> None:
    with pytest.raises(LogbookError, match="not valid UTF-8"):
        store.add_entry(replace(at(1_000), note=note), {})
    assert store.entries("van") == []


def test_an_error_inside_a_transaction_undoes_it(store: Store) -> None:
    with pytest.raises(EnergytrackError, match="second thoughts"), store.transaction():  # noqa: PT012
        store.add_entry(at(1_000), {})
        raise EntryError("second thoughts")
    assert store.entries("van") == []


# Two processes

WRITER = """
import datetime as dt, sys
from pathlib import Path
from energytrack.logbook.records import Entry
from energytrack.logbook.store import Store
store = Store(Path(sys.argv[1]))
for number in range(100):
    store.add_entry(Entry("van", dt.date(2026, 5, 3), 40.0, float(sys.argv[2]) + number), {})
"""


def test_two_processes_write_at_once(store: Store, path: Path) -> None:
    writers = [subprocess.Popen([sys.executable, "-c", WRITER, str(path), start]) for start in ("0", "1000")]
    assert [writer.wait(60) for writer in writers] == [0, 0]
    assert len({entry.odometer_km for entry in store.entries("van")}) == 200


def test_a_locked_logbook_is_waited_for_and_then_refused(
    store: Store, path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("energytrack.logbook.file.WAIT_SECONDS", 0.05)
    other = Store(path)
    with store.transaction(), pytest.raises(LogbookError, match="another program kept writing"):
        other.add_entry(at(1_000), {})
    other.add_entry(at(1_000), {})
    assert len(store.entries("van")) == 1
