"""A table that comes in batch by batch is what it would be if it were read whole, and any other is read whole."""

from __future__ import annotations

import datetime as dt
import json
from dataclasses import replace
from pathlib import Path

import pytest

from energytrack.errors import EnergytrackError
from energytrack.logbook import in_order
from energytrack.logbook.columns import Form
from energytrack.logbook.importing import Request, run_import
from energytrack.logbook.in_order import NotPlainError, PlainTable
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store

TODAY = dt.date(2026, 5, 3)
VAN, CAR = Vehicle("van", "diesel", "L", 70.0), Vehicle("car", "electricity", "kWh")
HEADER = "vehicle,date,odometer_km,energy"
PLAIN = {
    "two vehicles in turns": [HEADER, "van,2026-01-01,1000,40", "car,2026-01-01,500,20", "van,2026-01-03,1500.5,41.25",
                              "car,2026-01-02,700,22"],
    "every column": [HEADER + ",kind,full,level_percent,missed,distance_km,cost,currency,temperature_c,speed_kmh,place,"
                     "note,confirmed,payload",
                     "van,2026-01-01,1000,40,fill-up,no,50,yes,400,70.2,EUR,-4,61,here,'=1+1,no,300",
                     "van,2026-01-01,1400,40,,,,,,70.2,,,,,,,", "van,2026-01-02,1800,41,,yes,,no,,,,,,,\"a, b\",,2.5"],
    "nothing below the header": [HEADER],
    "dates with a time": [HEADER, "van,2026-01-01 08:00,1000,40", "van,2026-01-01T18:00,1300,20"],
}  # fmt: skip
NOT_PLAIN = {
    "newest first": [HEADER, "van,2026-01-03,1500,41", "van,2026-01-01,1000,40"],
    "without an amount": [HEADER, "van,2026-01-01,1000,", "van,2026-01-03,1500,41"],
    "without an odometer": ["vehicle,date,distance_km,energy", "van,2026-01-01,500,40"],
    "a bad number": [HEADER, "van,2026-01-01,1000,forty"],
    "a jump": [HEADER, "van,2026-01-01,1000,40", "van,2026-01-02,9000,40"],
    "twice at one place": [HEADER, "van,2026-01-01,1000,40", "van,2026-01-01,1000,30"],
    "more than the tank holds": [HEADER, "van,2026-01-01,1000,400", "van,2026-01-03,1500,40"],
    "a day to come": [HEADER, "van,2026-05-01,1000,40", "van,2026-06-03,1500,40"],
    "another vehicle": [HEADER, "van,2026-01-01,1000,40", "bus,2026-01-01,1000,40"],
    "one cell too many": [HEADER, "van,2026-01-01,1000,40,7"],
    "a quote that is never closed": [HEADER, 'van,2026-01-01,"1000,40'],
    "one kept though odd": [HEADER + ",confirmed", "van,2026-01-01,1000,40,yes"],
}


@pytest.fixture
def logbook(tmp_path: Path) -> Path:
    store = Store.create(tmp_path / "my.logbook")
    store.add_vehicle(VAN)
    store.add_vehicle(CAR)
    store.close()
    return tmp_path / "my.logbook"


@pytest.fixture
def batches(monkeypatch: pytest.MonkeyPatch) -> list[int]:
    """Batches of two rows, so that a small table has several; their lengths."""
    seen: list[int] = []
    stored = in_order._stored

    def counted(values: dict[str, in_order.Column]) -> dict[str, in_order.Column]:
        seen.append(len(values["date"]))
        return stored(values)

    monkeypatch.setattr(in_order, "BATCH", 2)
    monkeypatch.setattr(in_order, "_stored", counted)
    return seen


def table(folder: Path, lines: list[str]) -> Path:
    path = folder / "log.csv"
    path.write_text("\n".join(lines) + "\n")
    return path


def brought_in(logbook: Path, request: Request) -> tuple[str, list[list[Entry]], list[tuple[object, ...]]]:
    """What an import says, the entries and what was typed for them."""
    try:
        said = json.dumps(run_import(request, logbook, TODAY).to_dict())
    except EnergytrackError as refusal:
        said = str(refusal)
    store = Store(logbook)
    entries = [[replace(entry, id=None) for entry in store.entries(name)] for name in ("van", "car")]
    typed = store.query("SELECT typed, source, change_id FROM entry ORDER BY vehicle_id, odometer_km")
    store.close()
    return said, entries, typed


@pytest.mark.parametrize("name", [*PLAIN, *NOT_PLAIN])
@pytest.mark.parametrize("form", [Form(), Form(typed_units={"odometer_km": "mi"}, km=1.609344, currency="CHF")])
def test_both_ways_give_the_same(
    tmp_path: Path, logbook: Path, batches: list[int], monkeypatch: pytest.MonkeyPatch, name: str, form: Form
) -> None:
    lines = {**PLAIN, **NOT_PLAIN}[name]
    request = Request(table(tmp_path, lines), form)
    whole = tmp_path / "whole.logbook"
    whole.write_bytes(logbook.read_bytes())
    in_batches = brought_in(logbook, request)
    assert (sum(batches) == len(lines) - 1) == (name in PLAIN)

    def never(*_: object) -> PlainTable:
        raise NotPlainError

    monkeypatch.setattr(PlainTable, "open", never)
    assert in_batches == brought_in(whole, request)


def test_a_row_that_was_logged_before_is_found(tmp_path: Path, logbook: Path, batches: list[int]) -> None:
    request = Request(table(tmp_path, PLAIN["two vehicles in turns"]), Form())
    for new, already in ((4, 0), (0, 4)):
        outcome = run_import(request, logbook, TODAY)
        assert (outcome.new, outcome.already) == ({"entries": new}, {"entries": already})
    assert batches == [2, 2]


def test_the_guard_of_the_entries_is_back(tmp_path: Path, logbook: Path, batches: list[int]) -> None:
    run_import(Request(table(tmp_path, PLAIN["two vehicles in turns"]), Form()), logbook, TODAY)
    store = Store(logbook)
    with pytest.raises(EnergytrackError, match="never changed"):
        store.query("INSERT OR REPLACE INTO entry SELECT * FROM entry WHERE id = 1")
    guards = "SELECT name, sql FROM sqlite_schema WHERE type = 'trigger' ORDER BY name"
    assert store.query(guards) == Store.create(tmp_path / "new.logbook").query(guards)
    assert batches


@pytest.mark.parametrize("rows", [2_000, 40_000])
def test_memory_does_not_grow_with_the_table(tmp_path: Path, logbook: Path, rows: int) -> None:
    """The rows held at once are those of a batch."""
    import tracemalloc

    day = dt.date(2020, 1, 1)
    lines = [HEADER, *(f"van,{day + dt.timedelta(n // 40)},{1000 + 20 * n},{40 + n % 10}" for n in range(rows))]
    request = Request(table(tmp_path, lines), Form())
    tracemalloc.start()
    outcome = run_import(request, logbook, TODAY)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert outcome.new == {"entries": rows}
    assert peak < 2_000 * in_order.BATCH, f"{peak:,} bytes"
