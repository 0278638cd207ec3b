"""Months as written and as days."""

from __future__ import annotations

import datetime as dt

import pytest

from energytrack.errors import InferenceError
from energytrack.inference.review.month import Month, month_of, month_with


def test_a_month_has_its_days() -> None:
    february = month_of("2024-02")
    assert (february.first, february.last) == (dt.date(2024, 2, 1).toordinal(), dt.date(2024, 2, 29).toordinal())
    assert str(month_with(dt.date(2024, 2, 29))) == "2024-02"
    assert february.holds(february.last)
    assert not february.holds(february.last + 1)


@pytest.mark.parametrize(
    ("months", "other"), [(1, "2025-01"), (-1, "2024-11"), (-12, "2023-12"), (13, "2026-01"), (0, "2024-12")]
)
def test_months_follow_each_other_across_years(months: int, other: str) -> None:
    assert str(month_of("2024-12").later(months)) == other


@pytest.mark.parametrize("text", ["2026-13", "2026-00", "2026-1", "26-11", "11-2026", "2026/11", "nov", "", "२०२६-११"])
def test_a_misspelled_month_says_how_to_write_one(text: str) -> None:
    with pytest.raises(InferenceError, match="write it as YYYY-MM, such as 2026-11"):
        month_of(text)


def test_driving_is_spread_evenly_from_noon_to_noon() -> None:
    """From 29 November to 3 December are four days, of which one and a half lie in November."""
    start, end = dt.date(2026, 11, 29).toordinal(), dt.date(2026, 12, 3).toordinal()
    assert Month(2026, 11).share(start, end) == pytest.approx(1.5 / 4)
    assert Month(2026, 12).share(start, end) == pytest.approx(2.5 / 4)
    assert Month(2026, 10).share(start, end) == 0.0


def test_shares_of_all_months_add_up() -> None:
    start, end = dt.date(2025, 11, 17).toordinal(), dt.date(2026, 4, 2).toordinal()
    assert sum(month_of("2025-10").later(k).share(start, end) for k in range(8)) == pytest.approx(1.0)


def test_two_entries_of_one_day_lie_in_its_month() -> None:
    day = dt.date(2026, 11, 30).toordinal()
    assert (Month(2026, 11).share(day, day), Month(2026, 12).share(day, day)) == (1.0, 0.0)
