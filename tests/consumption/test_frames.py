"""Frames into records and back, and the logbook that hands out frames."""

from __future__ import annotations

import datetime as dt
import io
import subprocess
import sys

import numpy as np
import pandas as pd
import pytest

import energytrack
from energytrack.consumption.frames import (
    entries_from_frame,
    entries_to_frame,
    events_from_frame,
    modifications_from_frame,
    observe_frames,
    weather_from_frame,
)
from energytrack.errors import ConsumptionError, UnknownNameError
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Event, Modification, Vehicle, Weather
from tests.consumption.logs import day, fill

FULL_ENTRY = Entry(
    *("van", day(0), 41.32, 48_230.0, "fill-up", False, 40.0, True, 512.0, 70.2, "EUR", 12.0, 94.0, "depot", "wet"),
    {"rain": 0.3},
)


def frame(text: str) -> pd.DataFrame:
    return pd.read_csv(io.StringIO(text))


def test_every_column_comes_back():
    entries = [FULL_ENTRY, fill(3, None, 30.0)]
    assert entries_from_frame(entries_to_frame(entries)) == entries


def test_every_column_comes_back_from_csv():
    text = entries_to_frame([FULL_ENTRY, fill(3, 49_000.0, 30.0)]).to_csv(index=False)
    assert entries_from_frame(frame(text)) == [FULL_ENTRY, fill(3, 49_000.0, 30.0)]


def test_optional_columns_may_be_absent():
    (entry,) = entries_from_frame(frame("date,odometer_km,energy\n2026-01-01,1000,40\n"))
    assert entry == Entry("vehicle", dt.date(2026, 1, 1), 40.0, 1000.0)


@pytest.mark.parametrize(
    ("written", "meant"),
    [("yes", True), ("No", False), (True, True), (np.False_, False), (1, True), (0.0, False), (None, True), ("", True)],
)
def test_yes_and_no_in_their_usual_spellings(written, meant):
    table = pd.DataFrame({"date": ["2026-01-01"], "odometer_km": [1.0], "energy": [2.0], "full": [written]})
    assert entries_from_frame(table)[0].full is meant


@pytest.mark.parametrize(
    "written",
    ["2026-01-01", "2026-01-01T08:30", dt.date(2026, 1, 1), dt.datetime(2026, 1, 1, 9), pd.Timestamp("2026-01-01")],
)
def test_dates_as_text_date_or_timestamp(written):
    table = pd.DataFrame({"date": [written], "odometer_km": [1.0], "energy": [2.0]})
    assert entries_from_frame(table)[0].date == dt.date(2026, 1, 1)


def test_missing_amount_is_kept_as_not_a_number():
    (entry,) = entries_from_frame(frame("date,odometer_km,energy\n2026-01-01,1000,\n"))
    assert entry.energy != entry.energy


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("date,odometer_km\n2026-01-01,1\n", "lack the column 'energy'"),
        ("date,energy\n2026-01-01,1\n", "'odometer_km' nor 'distance_km'"),
        ("date,odometer_km,energy\n,1,2\n", "row 0 has no date"),
        ("date,odometer_km,energy\nyesterday,1,2\n", "column 'date'"),
        ("date,odometer_km,energy\n2026-01-01,1,plenty\n", "column 'energy'"),
        ("date,odometer_km,energy,full\n2026-01-01,1,2,perhaps\n", "column 'full'.*neither yes nor no"),
        ("date,odometer_km,energy,kind\n2026-01-01,1,2,gift\n", "kind 'gift'"),
    ],
)
def test_unreadable_tables_name_the_column(text: str, says: str):
    with pytest.raises(ConsumptionError, match=says):
        entries_from_frame(frame(text))


def test_rows_of_one_vehicle():
    table = frame("vehicle,date,odometer_km,energy\nvan,2026-01-01,1,2\ncar,2026-01-01,1,3\n")
    assert [entry.energy for entry in entries_from_frame(table, "car")] == [3]
    with pytest.raises(UnknownNameError, match=r"'bus'.*car, van"):
        entries_from_frame(table, "bus")
    with pytest.raises(ConsumptionError, match="several vehicles"):
        observe_frames(table)


def test_other_tables():
    header = "vehicle,name,fitted_date,fitted_km,removed_date,removed_km\n"
    mods = frame(header + "van,skirts,2026-01-05,,,2000\ncar,x,,1,,\n")
    assert modifications_from_frame(mods, "van") == [
        Modification("van", "skirts", fitted_date=dt.date(2026, 1, 5), removed_km=2000.0)
    ]
    changes = frame("name,fitted_km,known_low_percent,known_high_percent,reversible\nwindows,1,4,9,\nremap,1,,,no\n")
    assert [(row.known, row.reversible) for row in modifications_from_frame(changes)] == [
        ((4.0, 9.0), True), (None, False)
    ]  # fmt: skip
    for ends in ("4,", "9,4", "-4,9"):
        with pytest.raises(ConsumptionError, match="known change"):
            modifications_from_frame(frame(f"name,fitted_km,known_low_percent,known_high_percent\nx,1,{ends}\n"))
    events = frame("date,what,odometer_factor\n2026-01-05,tyres,1.02\n")
    assert events_from_frame(events, "van") == [Event("van", dt.date(2026, 1, 5), "tyres", None, 1.02)]
    weather = frame("date,temperature_c\n2026-01-05,3.5\n2026-01-06,\n")
    assert weather_from_frame(weather) == [Weather(dt.date(2026, 1, 5), 3.5)]


def test_frames_become_arrays_and_notes():
    entries = entries_to_frame([fill(n, 1000 + 500.0 * n, 40.0, missed=n == 2, level_percent=90.0) for n in range(5)])
    mods = frame("name,fitted_km\nskirts,2750\n")
    events = frame("date,odometer_km,what,odometer_factor\n2026-01-01,2500,tyres,1.1\n")
    observed, notes = observe_frames(entries, mods, events=events)
    assert observed.distance_km == pytest.approx([500, 500, 550])
    assert observed.shares[:, 0] == pytest.approx([0, 0, 0.5])
    assert notes[0] == "1 span between known levels set aside: missed entry (1)"
    assert "capacity is not given: 46.7 L estimated" in notes[1]  # 1.05 x 40 / 0.9


def test_unknown_unit_is_refused():
    with pytest.raises(ConsumptionError, match="gallon"):
        observe_frames(frame("date,odometer_km,energy\n2026-01-01,1,2\n"), unit="gallon")


def test_logbook_hands_out_frames(tmp_path):
    path = tmp_path / "my.logbook"
    store = open_logbook(path, create=True)
    store.add_vehicle(Vehicle("van", "diesel", "L", 70.0))
    entries = [fill(n, 1000 + 500.0 * n, 40.0, extra={"rain": 0.5}) for n in range(3)]
    store.add_entries([(entry, {}) for entry in entries], "test")
    store.fit("van", "skirts", day(1), 1600.0, 3.0, None, "")
    store.add_event(Event("van", day(1), "tyres", 1500.0, 1.02))
    store.add_weather([Weather(day(0), 4.0)])
    log = energytrack.open_logbook(path)
    assert log.vehicles()[["vehicle", "carrier", "capacity"]].values.tolist() == [["van", "diesel", 70.0]]
    assert log.entries("van")["odometer_km"].tolist() == [1000, 1500, 2000]
    assert log.entries("van")["rain"].tolist() == [0.5, 0.5, 0.5]
    assert log.modifications("van")["fitted_km"].tolist() == [1600]
    assert log.events("van")["odometer_factor"].tolist() == [1.02]
    assert log.weather()["temperature_c"].tolist() == [4.0]
    observed, _ = observe_frames(log.entries("van"), log.modifications("van"), events=log.events("van"))
    assert observed.shares[:, 0] == pytest.approx([0, 0.8])
    with pytest.raises(UnknownNameError, match="van"):
        log.entries("bus")


def test_importing_the_package_loads_nothing_heavy():
    script = (
        "import sys, energytrack; heavy = {'numpy', 'pandas', 'scipy', 'statsmodels', 'sqlite3'} & set(sys.modules);"
        "print(sorted(heavy))"
    )
    run = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "[]"


def test_package_offers_what_it_says():
    assert {"open_logbook", "assess", "plan"} <= set(dir(energytrack))
    assert energytrack.assess.__module__ == "energytrack.inference.assess"
    with pytest.raises(AttributeError, match="open_logbook, assess, plan"):
        _ = energytrack.nothing
