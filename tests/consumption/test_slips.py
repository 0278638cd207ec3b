"""Slips of the pen: each kind made on purpose in an invented log, and recognised with the value that fits.

Conversion factors: 1.609344 km in a mile and 3.785411784 L in a US gallon are exact (NIST SP 811).
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import replace

import pytest

from energytrack.consumption.segments import close_segments
from energytrack.consumption.slips import Case, completed, find_slips, swapped, undoubled
from energytrack.logbook.records import Entry, Vehicle
from tests.consumption.logs import fill

VAN = Vehicle("van", "diesel", "L", 70.0)
WOBBLE = (0.0, 0.6, -0.5, 0.3, -0.8, 0.9, -0.2, 0.4)
USUAL, SD = 0.08, 0.0015  # L/km


def by_odometer() -> list[Entry]:
    """Twelve tanks of 500 km and about 40 L."""
    return [fill(3 * n, 30_000 + 500 * n, 40 + WOBBLE[n % 8]) for n in range(13)]


def by_distance() -> list[Entry]:
    return [fill(3 * n, None, 40 + WOBBLE[n % 8], distance_km=500) for n in range(13)]


def found(entries: list[Entry], place: int, vehicle: Vehicle = VAN) -> list[str]:
    """What is suspected of the segment that entry `place` closes."""
    segmented = close_segments(entries, capacity=vehicle.capacity, unit=vehicle.unit)
    which = [segment.legs[-1].entry for segment in segmented.segments].index(place)
    count = len(segmented.segments)
    return [str(slip) for slip in find_slips(Case(segmented, which, [USUAL] * count, [SD] * count, vehicle))]


def changed(entries: list[Entry], place: int, **values: object) -> list[Entry]:
    entries[place] = replace(entries[place], **values)  # type: ignore[arg-type]
    return entries


def test_two_digits_of_the_odometer() -> None:
    entries = [replace(entry, odometer_km=entry.odometer_km + 250) for entry in by_odometer()]  # 33,250 for the sixth
    said = "two digits swapped? odometer 33,520 -> 33,250 km fits"
    entries = changed(entries, 6, odometer_km=33_520.0)
    assert found(entries, 6)[0] == said
    assert found(entries, 7)[0] == said, "it spoils the segment after it as much"


def test_two_digits_of_the_amount() -> None:
    assert found(changed(by_odometer(), 6, energy=14.0), 6)[0].startswith("two digits swapped? amount 14.00 -> 41.00")


def test_a_digit_doubled() -> None:
    assert found(changed(by_odometer(), 6, energy=440.1), 6)[0] == "a digit doubled? amount 440.10 -> 40.10 L fits"
    assert found(changed(by_distance(), 6, distance_km=5500.0), 6)[0] == (
        "a digit doubled? distance 5,500 -> 500 km fits"
    )


def test_a_digit_missing() -> None:
    assert found(changed(by_odometer(), 6, energy=4.1), 6)[0].startswith("a digit missing? amount 4.10 -> 4")
    assert "a digit missing? distance 50 -> 500 km fits" in found(changed(by_distance(), 6, distance_km=50.0), 6)


def test_miles_for_km_and_the_other_way_round() -> None:
    assert "miles typed for km? distance 311 -> 500 km fits" in found(
        changed(by_distance(), 6, distance_km=500 / 1.609344), 6
    )
    in_miles = replace(VAN, distance_unit="mi")
    assert "km typed for miles? distance 500 -> 311 mi fits" in found(
        changed(by_distance(), 6, distance_km=500 * 1.609344), 6, in_miles
    )


def test_gallons_for_litres_and_the_other_way_round() -> None:
    assert "US gallons typed for litres? amount 10.57 -> 40.01 L fits" in found(
        changed(by_odometer(), 6, energy=10.57), 6
    )
    assert "imperial gallons typed for litres? amount 8.80 -> 40.01 L fits" in found(
        changed(by_odometer(), 6, energy=8.80), 6
    )
    american = replace(VAN, typed_unit="gal-us", capacity=None)
    assert any(
        line.startswith("litres typed for gallons?")
        for line in found(changed(by_odometer(), 6, energy=40 * 3.785411784), 6, american)
    )


@pytest.mark.parametrize("place", [6, 7])
def test_a_partial_fill_not_marked_is_named_from_either_side(place: int) -> None:
    entries = changed(changed(by_odometer(), 6, energy=30.0), 7, energy=50.2)
    assert "partial fill not marked? mark the entry at 33,000 km as partial" in found(entries, place)


@pytest.mark.parametrize(("missing", "said"), [(1, "an entry"), (2, "two entries"), (3, "three entries")])
@pytest.mark.parametrize("log", [by_odometer, by_distance])
def test_missing_entries_in_a_row(missing: int, said: str, log: Callable[[], list[Entry]]) -> None:
    entries = log()
    entries = [*entries[:6], replace(entries[6], distance_km=500.0 * (missing + 1)), *entries[7:]]
    where = "of 2026-01-19"
    if log is by_odometer:
        later = [replace(e, odometer_km=(e.odometer_km or 0.0) + 500 * missing) for e in log()[6:]]
        entries, where = [*log()[:6], *later], f"at {33_000 + 500 * missing:,} km"
    assert f"{said} missing? say that entries are missing before the one {where}" in found(entries, 6)


@pytest.mark.parametrize(("missing", "amount"), [(4, 40.0), (2, 13.0)])
def test_many_missing_entries_and_small_amounts_are_not_called_that(missing: int, amount: float) -> None:
    entries = changed(by_distance(), 6, distance_km=500.0 * (missing + 1), energy=amount)
    assert not any("missing" in line and "digit" not in line for line in found(entries, 6))


def test_what_fits_nothing_is_not_named() -> None:
    assert found(changed(by_odometer(), 6, energy=66.6), 6) == []


def test_an_impossible_amount_blames_the_amount_alone() -> None:
    lines = found(changed(by_odometer(), 6, energy=187.9), 6)
    assert all("amount" in line for line in lines)
    assert not any(re.search("distance|odometer", line) for line in lines)


def test_variants_of_what_was_typed() -> None:
    assert sorted(swapped("121")) == ["112", "211"]
    assert list(swapped("41.32")) == ["14.32", "43.12", "41.23"]
    assert list(undoubled("4413.5")) == ["413.5"]
    assert "48230" in set(completed("4230"))
    assert "04230" not in set(completed("4230"))
