"""The echo of an entry, on a real logbook file."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import replace
from typing import Any

import pytest

from energytrack.consumption.meaning import echo_lines, unusual
from energytrack.consumption.segments import close_segments
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store
from tests.consumption.logs import day, fill

VAN = Vehicle("van", "diesel", "L", 70.0)
WOBBLE = (0.0, 0.6, -0.5, 0.3, -0.8, 0.9, -0.2, 0.4)  # litres around 40
KEPT: dict[str, Any] = {
    "modification": "skirts",
    "verdict": "not-yet",
    "target_percent": 3.0,
    "distance_to_go_km": 2000.0,
    "at_km": 4500.0,
    "expectation": {
        "consumption": 0.08,
        "shift_percent": -2.0,
        "sd_percent": 3.0,
        "terms": {"heating": 0.5, "payload": 1.0},
        "centres": {"heating": 8.0, "payload": 0.0},
    },
}


@pytest.fixture
def book(tmp_path) -> Store:
    """A van with eight tanks of 500 km and about 8 L/100 km, the last at 4500 km."""
    store = open_logbook(tmp_path / "my.logbook", create=True)
    store.add_vehicle(VAN)
    for number, wobble in enumerate(WOBBLE):
        store.add_entry(fill(3 * number, 1000 + 500 * number, 40 + wobble), {})
    return store


def logged(book: Store, entry: Entry, vehicle: Vehicle = VAN) -> list[str]:
    number = book.add_entry(entry, {})
    return echo_lines(book, vehicle, replace(entry, id=number))


def test_first_entry(tmp_path):
    store = open_logbook(tmp_path / "my.logbook", create=True)
    store.add_vehicle(VAN)
    assert logged(store, fill(0, 1000, 40)) == ["first entry: consumption follows with the next full tank"]


def test_more_than_the_tank_holds_is_flagged(book):
    """A filling may exceed the stated capacity, filler neck and all, yet it is worth a second look."""
    flag = "75.00 L is more than the capacity of 70.00 L: kept; check the amount"
    assert flag in logged(book, fill(30, 5400, 75.0))
    assert not any("capacity" in line for line in logged(book, fill(33, 6000, 70.0)))


def test_full_tank_is_compared_with_the_recent_record(book):
    # 42.2 L / 500 km = 8.44; the median of 8.12 7.9 8.06 7.84 8.18 7.96 8.08 is 8.06: 4.7 % more.
    # Deviations 0.06 0.16 0 0.22 0.12 0.10 0.02: median 0.10, times 1.4826 / 8.06 = 1.84 %, twice that 4 %.
    assert logged(book, fill(30, 5000, 42.2)) == [
        "500 km since the last entry: 8.44 L/100 km",
        "expected from its recent record: 8.06 L/100 km",
        "4.7 % more than expected, outside the usual scatter (± 4 %)",
    ]


@pytest.mark.parametrize(
    ("energy", "flagged"), [(40.0, False), (9.9, True), (10.1, False), (160.1, True), (159.9, False)]
)
def test_without_a_record_a_consumption_four_times_off_the_usual_is_flagged(tmp_path, energy, flagged):
    """500 km; 8 L/100 km of diesel is usual for cars and vans (common practice, no source): 2 to 32 pass."""
    store = open_logbook(tmp_path / "my.logbook", create=True)
    store.add_vehicle(replace(VAN, capacity=None))
    store.add_entry(fill(0, 1000, 40), {})
    said = logged(store, fill(3, 1500, energy), replace(VAN, capacity=None))
    flag = "far from what is usual for diesel (about 8.00 L/100 km): kept; check amount, odometer and their units"
    assert (flag in said) == flagged


def test_with_a_record_its_own_figures_count(book):
    assert not any("usual for diesel" in line for line in logged(book, fill(30, 5000, 2.0)))


def test_entry_without_a_number_is_found_by_what_it_says(book):
    entry = fill(30, 5000, 40.3)
    book.add_entry(entry, {})
    assert echo_lines(book, VAN, entry)[0] == "500 km since the last entry: 8.06 L/100 km"


def test_partial_fill_says_when_consumption_follows(book):
    assert logged(book, fill(30, 4700, 10, full=False)) == [
        "200 km since the last entry",
        "partial fill: consumption follows with the next full tank",
    ]
    assert logged(book, fill(31, 5000, 30.3))[:2] == [
        "300 km since the last entry",
        "500 km since the last known level: 8.06 L/100 km",
    ]


def test_missed_entry_says_why_there_is_no_consumption(book):
    assert logged(book, fill(30, 5600, 40, missed=True)) == [
        "no consumption: an entry is missing before it"
    ]


def test_level_above_what_was_bought_is_explained(book):
    book.add_entry(fill(30, 4800, 5, level_percent=20), {})
    assert logged(book, fill(31, 4900, 5, level_percent=90)) == [
        "100 km since the last entry",
        "no consumption: more energy is left than was bought; check amount and level",
    ]


def test_vehicle_units_are_used(book):
    miles = replace(VAN, distance_unit="mi", display="mpg-us")
    # 500 km = 310.7 mi; 40.3 L = 10.646 US gal (NIST SP 811): 29.2 mpg
    assert logged(book, fill(30, 5000, 40.3), miles)[0] == "311 mi since the last entry: 29.2 mpg (US)"


def test_kept_answer_gives_what_is_expected_at_these_conditions(book):
    book.fit("van", "skirts", day(22), 4000.0, 3.0, None, "")
    book.keep_assessment("van", "skirts", KEPT)
    # 8 L/100 km x (1 + 0.5 % x (heating 14 - 8) - 2 %) = 8.08; payload is unknown and counts as usual. 40.8 L: 8.16.
    assert logged(book, fill(30, 5000, 40.8, temperature_c=4.0)) == [
        "500 km since the last entry: 8.16 L/100 km",
        "expected at these conditions: 8.08 L/100 km",
        "1.0 % more than expected, within the usual scatter (± 6 %)",
        "skirts: about 1,500 km to go at the 3 % target",
    ]


@pytest.mark.parametrize(
    ("levels", "expected"),
    [
        ([], "7.84"),  # 8 L less the average of 2 %, at the reference temperature
        ([{"level": 0.0, "shift_percent": 0.0}, {"level": 2.5, "shift_percent": -5.0}], "7.60"),  # less its own 5 %
    ],
)
def test_shift_of_a_graded_part_is_that_of_its_level_else_the_average(book, levels, expected):
    book.fit("van", "skirts", None, 1500)
    book.fit("van", "skirts", None, 1600, level=0.5)
    book.remove("van", "skirts", None, 1700)
    book.fit("van", "skirts", None, 4500, level=2.5)
    book.keep_assessment("van", "skirts", {**KEPT, "response": {"levels": levels} if levels else None})
    told = logged(book, fill(30, 5000, 40, temperature_c=10.0))
    assert told[1] == f"expected at these conditions: {expected} L/100 km"


def test_distance_to_go_counts_only_what_was_driven_with_the_part_fitted(book):
    book.fit("van", "skirts", day(22), 4000.0, 3.0, None, "")
    book.keep_assessment("van", "skirts", KEPT)
    book.remove("van", "skirts", day(25), 4600.0)
    book.add_entry(fill(30, 5000, 40.2), {})
    assert not any(line.startswith("skirts") for line in logged(book, fill(33, 5500, 40.1)))
    book.fit("van", "skirts", day(33), 5500.0, 3.0, None, "")
    assert logged(book, fill(36, 6000, 40.1))[-1].startswith("skirts: about 1,400 km to go")


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"distance_to_go_km": 400.0}, "skirts: the distance asked for at the 3 % target is covered"),
        ({"verdict": "out-of-reach", "distance_to_go_km": None}, "skirts: the 3 % target is out of reach"),
        ({"verdict": "no-baseline", "distance_to_go_km": None}, "skirts: no baseline yet"),
        ({"at_km": None}, "skirts: about 2,000 km to go at the 3 % target when last looked at"),
        ({"distance_to_go_km": 1861.0}, "skirts: about 1,370 km to go"),
    ],
)
def test_what_is_left_to_go(book, change, says):
    book.fit("van", "skirts", day(22), 4000.0, 3.0, None, "")
    book.keep_assessment("van", "skirts", {**KEPT, **change})
    assert logged(book, fill(30, 5000, 40.2))[-1].startswith(says)


def test_settled_modification_is_not_mentioned(book):
    book.fit("van", "skirts", day(22), 4000.0, 3.0, None, "")
    book.keep_assessment("van", "skirts", {**KEPT, "verdict": "shifted"})
    assert not any("skirts" in line for line in logged(book, fill(30, 5000, 40.2)))


def test_modification_never_looked_at_points_to_the_question(book):
    book.fit("van", "skirts", day(22), 4000.0, 3.0, None, "")
    assert logged(book, fill(30, 5000, 40.2))[-1] == (
        "skirts: run `energytrack enough` to see how far there is to go"
    )


def test_swapped_digits_are_named_where_they_fit(book):
    # 40.20 typed as 04.20 would be refused elsewhere; 63.90 for 36.90 is possible: 12.8 instead of 7.4 L/100 km
    assert logged(book, fill(30, 4960, 63.9))[-2:] == [
        "unusual for this vehicle: kept; check the amount and the odometer",
        "two digits swapped? amount 63.90 -> 36.90 L fits",
    ]


def test_swapped_odometer_digits_are_named_where_they_fit(book):
    # 37.8 L over 290 km would be 13.0 L/100 km, over 470 km it is 8.04
    assert logged(book, fill(30, 4790, 37.8))[-1] == "two digits swapped? odometer 4,790 -> 4,970 km fits"


def test_unusual_without_a_fitting_swap_names_none(book):
    assert logged(book, fill(30, 5000, 66.6))[-1] == "unusual for this vehicle: kept; check the amount and the odometer"


def test_short_tank_is_allowed_its_larger_scatter(book):
    # 50 km are a tenth of a usual tank: the +/- 4 % of the record become +/- 37 %
    lines = logged(book, fill(30, 4550, 4.9))
    assert lines[2:] == ["21.6 % more than expected, within the usual scatter (± 37 %)"]


def test_log_without_odometer_counts_from_its_first_entry(tmp_path):
    store = open_logbook(tmp_path / "my.logbook", create=True)
    store.add_vehicle(VAN)
    rows = [fill(n, None, 40 + WOBBLE[n % 8], distance_km=500) for n in range(90)]  # ends at 45,000 km
    store.add_entries([(row, {}) for row in rows], "test")
    store.fit("van", "skirts", None, 44_000.0, 3.0, None, "")
    store.keep_assessment("van", "skirts", {**KEPT, "at_km": 44_500.0})
    lines = logged(store, fill(100, None, 40, distance_km=500))
    assert lines[0] == "500 km since the last entry: 8.00 L/100 km"
    assert "expected at these conditions: 7.84 L/100 km" in lines[1]  # 2 % below 8, fitted throughout
    assert lines[3].startswith("skirts: about 1,000 km to go")


def test_receipt_older_than_the_recent_ones_is_kept_without_a_comparison(book):
    for number in range(70):
        book.add_entry(fill(40 + number, 5000 + 500 * number, 40), {})
    assert logged(book, fill(1, 1200, 16)) == ["kept among the older entries"]


def test_unusual_flags_one_of_many_and_spares_short_segments():
    entries = [fill(n, 1000 + 500 * n, 40 + WOBBLE[n % 8] + (20 if n == 12 else 0)) for n in range(20)]
    entries.append(fill(21, 10_510, 1.2))  # a top-up after 10 km: 12 L/100 km, all of it the filling error
    flags = unusual(close_segments(entries).segments)
    assert [index for index, flag in enumerate(flags) if flag] == [11]


def test_short_record_flags_nothing():
    assert unusual(close_segments([fill(n, 500 * n, 10 ** (n % 3)) for n in range(5)]).segments) == [False] * 4


def test_no_heavy_library_is_loaded():
    script = (
        "import sys, energytrack.consumption.meaning;"
        "print(sorted({'numpy', 'pandas', 'scipy', 'statsmodels', 'rich', 'statistics', 'decimal'} & set(sys.modules)))"
    )
    run = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "[]"
