"""Of rows that contradict each other the fewest are blamed, and what is left is in driving order."""

from __future__ import annotations

import datetime as dt
from itertools import combinations, pairwise

from hypothesis import given
from hypothesis import strategies as st

from energytrack.logbook.order import Row, driving_order
from energytrack.logbook.records import Entry

START = dt.date(2026, 1, 1)


def _rows(odometers: list[float | None]) -> list[Row]:
    day = dt.timedelta(days=1)
    return [(2 + place, Entry("van", START + place * day, 8.0, odometer_km=km)) for place, km in enumerate(odometers)]


def _longest(values: list[int], again: bool) -> int:
    """By trying every choice of rows."""
    for size in range(len(values), 0, -1):
        for chosen in combinations(values, size):
            if all(a < b or (again and a == b) for a, b in pairwise(chosen)):
                return size
    return 0


@given(values=st.lists(st.integers(0, 9), max_size=8), again=st.booleans())
def test_the_fewest_rows_are_blamed(values: list[int], again: bool) -> None:
    ordered, problems = driving_order(_rows([float(value) for value in values]), again=again)
    kept = [entry.odometer_km or 0.0 for _, entry in ordered]
    assert len(kept) == _longest(values, again)
    assert len(kept) + len(problems) == len(values)
    assert all(a < b or (again and a == b) for a, b in pairwise(kept))
    assert {line for line, _ in ordered}.isdisjoint({problem.line for problem in problems})


def test_the_later_of_two_is_the_one_that_goes_back() -> None:
    _, problems = driving_order(_rows([1000.0, 1600.0, 1500.0]))
    assert [problem.line for problem in problems] == [4]


def test_a_repeated_value_blames_the_later_row() -> None:
    _, problems = driving_order(_rows([1000.0, 1600.0, 1600.0, 2000.0]))
    assert [problem.line for problem in problems] == [4]


def test_rows_without_odometer_between_rows_with_one_stay_in_place() -> None:
    ordered, problems = driving_order(_rows([None, 1000.0, None, 1600.0]))
    assert problems == []
    assert [line for line, _ in ordered] == [2, 3, 4, 5]
