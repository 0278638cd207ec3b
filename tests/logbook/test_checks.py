"""Rules for a new entry, as pure functions."""

from __future__ import annotations

import datetime as dt
import math
from dataclasses import replace
from typing import Any

import pytest

from energytrack.errors import EntryError
from energytrack.logbook.checks import (
    check_known,
    check_measure,
    check_name,
    check_place,
    check_reading,
    check_values,
    parse_date,
)
from energytrack.logbook.records import Entry, Vehicle

TODAY = dt.date(2026, 5, 10)
VAN = Vehicle("van", "diesel", "L", 70)
BEFORE = Entry("van", dt.date(2026, 5, 1), 40.0, 48_000)
AFTER = Entry("van", dt.date(2026, 5, 9), 40.0, 49_000)
ENTRY = Entry("van", dt.date(2026, 5, 5), 40.0, 48_500)


def test_a_good_entry_passes() -> None:
    check_values(ENTRY, VAN, TODAY)
    check_place(ENTRY, VAN, BEFORE, AFTER, None)
    check_place(ENTRY, VAN, None, None, None)


@pytest.mark.parametrize(
    ("change", "refusal"),
    [
        ({"energy": 0.0}, "amount 0 must be more than 0"),
        ({"energy": -3.0}, "amount -3 must be more than 0"),
        ({"energy": math.nan}, "amount nan"),
        ({"energy": math.inf}, "amount inf"),
        ({"energy": 91.1}, "more than 1.3 times the capacity"),
        ({"level_percent": 100.5}, "outside 0 to 100"),
        ({"level_percent": -0.5}, "outside 0 to 100"),
        ({"level_percent": math.nan}, "outside 0 to 100"),
        ({"odometer_km": -1.0}, "no odometer value"),
        ({"odometer_km": math.inf}, "no odometer value"),
        ({"date": TODAY + dt.timedelta(days=1)}, "in the future"),
        ({"date": dt.date(26, 5, 3)}, "before 1900"),
        ({"temperature_c": 75.0}, "such as 54F"),
        ({"speed_kmh": 0.0}, "no mean speed"),
        ({"cost": -1.0}, "cost"),
        ({"odometer_km": None, "distance_km": 0.0}, "distance"),
    ],
)
def test_values_that_cannot_be(change: dict[str, Any], refusal: str) -> None:
    with pytest.raises(EntryError, match=refusal):
        check_values(replace(ENTRY, **change), VAN, TODAY)


def test_the_limits_themselves_pass() -> None:
    for change in ({"energy": 91.0}, {"level_percent": 0.0}, {"level_percent": 100.0}, {"date": TODAY}):
        check_values(replace(ENTRY, **change), VAN, TODAY)


def test_without_capacity_only_the_absurd_is_refused() -> None:
    unknown = replace(VAN, capacity=None)
    check_values(replace(ENTRY, energy=400.0), unknown, TODAY)
    with pytest.raises(EntryError, match="more than any vehicle holds"):
        check_values(replace(ENTRY, energy=1e300), unknown, TODAY)


def test_neighbours_decide() -> None:
    with pytest.raises(EntryError, match="odometer goes back"):
        check_place(replace(ENTRY, date=TODAY), VAN, BEFORE, AFTER, None)
    with pytest.raises(EntryError, match="does not fit"):
        check_place(replace(ENTRY, date=dt.date(2026, 4, 1)), VAN, BEFORE, AFTER, None)
    with pytest.raises(EntryError, match="stands still"):
        check_place(replace(ENTRY, odometer_km=48_000), VAN, BEFORE, AFTER, None)
    with pytest.raises(EntryError, match=r"logged already.*--again"):
        check_place(BEFORE, VAN, BEFORE, AFTER, BEFORE)
    check_place(BEFORE, VAN, BEFORE, AFTER, BEFORE, again=True)


def test_two_dates_next_to_each_other_hold_two_days_of_driving() -> None:
    """2,000 km a day (common practice, no source: two drivers in turns); a date is known to the day only."""
    day, next_day = dt.date(2026, 5, 1), dt.date(2026, 5, 2)
    check_reading(day, 50_000, VAN, BEFORE, None)
    check_reading(next_day, 52_000, VAN, BEFORE, None)
    with pytest.raises(EntryError, match="a jump no vehicle drives"):
        check_reading(day, 50_001, VAN, BEFORE, None)
    with pytest.raises(EntryError, match="a jump no vehicle drives"):
        check_reading(next_day, 52_001, VAN, BEFORE, None)
    with pytest.raises(EntryError, match="a jump no vehicle drives"):
        check_reading(dt.date(2026, 5, 8), 44_000, VAN, None, AFTER)


def test_far_below_a_reading_of_the_same_day_is_going_back() -> None:
    with pytest.raises(EntryError, match="odometer goes back: 46,000 km on 2026-05-09, but 49,000 km stood on"):
        check_reading(AFTER.date, 46_000, VAN, None, AFTER)
    check_reading(AFTER.date, 48_600, VAN, None, AFTER)


def test_names_fit_into_a_list() -> None:
    check_name("x" * 60, "vehicle")
    with pytest.raises(EntryError, match="at most 60 characters, not 61"):
        check_name("x" * 61, "vehicle")
    with pytest.raises(EntryError, match="printable"):
        check_name("a\x1bb", "modification")


def test_distance_entries() -> None:
    trip = Entry("van", dt.date(2026, 5, 2), 8.0, distance_km=300.0)
    earlier = replace(trip, date=dt.date(2026, 5, 1))
    check_place(trip, VAN, earlier, None, None)
    check_place(trip, VAN, None, None, None)
    with pytest.raises(EntryError, match="a jump no vehicle drives"):
        check_place(replace(trip, distance_km=4_001.0), VAN, earlier, None, None)
    with pytest.raises(EntryError, match="logged already"):
        check_place(trip, VAN, earlier, None, trip)
    with pytest.raises(EntryError, match="have an odometer value"):
        check_measure(trip, BEFORE)
    with pytest.raises(EntryError, match="have --distance"):
        check_measure(ENTRY, trip)
    with pytest.raises(EntryError, match="the odometer value is missing"):
        check_measure(replace(ENTRY, odometer_km=None), None)


@pytest.mark.parametrize(
    "typed", ["3.5.2026", "20260503", "2026-W18-7", "2026-02-30", "2026-5-3", "today", "", "2026-05-03x"]
)
def test_days_written_another_way_are_refused(typed: str) -> None:
    """ISO 8601 calendar dates in extended format are the one form taken."""
    with pytest.raises(EntryError, match="such as 2026-05-03"):
        parse_date(typed)


def test_a_leap_day_is_a_day() -> None:
    assert parse_date("2024-02-29") == dt.date(2024, 2, 29)


@pytest.mark.parametrize(
    ("low", "high", "refusal"),
    [
        (9.0, 4.0, "the lower number comes first, 4:9"),
        (4.0, -9.0, "may be none at all"),  # turning it round would not mend it
        (-9.0, 4.0, "may be none at all"),
        (0.0, 4.0, "may be none at all"),
    ],
)
def test_a_known_change_lies_on_one_side_of_zero(low: float, high: float, refusal: str) -> None:
    with pytest.raises(EntryError, match=refusal):
        check_known(low, high)
