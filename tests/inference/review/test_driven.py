"""What was driven, used and paid in a month, against sums done by hand."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace

import pytest

from energytrack.consumption.segments import SegmentedLog, close_segments
from energytrack.inference.review.driven import account, driven, month_shares, pieces
from energytrack.inference.review.month import month_of
from energytrack.logbook.records import Entry

OCTOBER, NOVEMBER = month_of("2026-10"), month_of("2026-11")


def entry(day: str, km: float, litres: float, cost: float | None = None, currency: str | None = "EUR") -> Entry:
    return Entry("van", dt.date.fromisoformat(day), litres, km, cost=cost, currency=currency if cost else None)


def a_log(*entries: Entry) -> SegmentedLog:
    return close_segments(entries, capacity=70.0)


# From 22 October to 1 November are ten days, of which nine and a half lie in October.
CROSSING = (entry("2026-10-22", 1000, 40), entry("2026-11-01", 1500, 40, 64.0), entry("2026-11-21", 1900, 36, 54.0))


def test_a_segment_across_the_end_of_a_month_counts_in_each() -> None:
    log = a_log(*CROSSING)
    assert month_shares(log, OCTOBER) == pytest.approx([0.95, 0.0])
    assert month_shares(log, NOVEMBER) == pytest.approx([0.05, 1.0])
    october, november = (driven(account(log), month, None) for month in (OCTOBER, NOVEMBER))
    assert (october.distance_km, november.distance_km) == (pytest.approx(475.0), pytest.approx(425.0))
    assert october.consumption == pytest.approx(40 / 500)
    assert november.energy == pytest.approx(0.05 * 40 + 36)


def test_energy_and_distance_are_conserved_over_months() -> None:
    log = a_log(*CROSSING)
    months = [driven(account(log), month, None) for month in (OCTOBER, NOVEMBER)]
    assert sum(month.distance_km for month in months) == pytest.approx(900.0)
    assert sum(month.energy or 0.0 for month in months) == pytest.approx(76.0)


def test_what_was_bought_and_paid_belongs_to_the_day_it_was() -> None:
    november = driven(account(a_log(*CROSSING)), NOVEMBER, None)
    assert (november.bought, november.cost, november.entries) == (76.0, 118.0, 2)
    assert november.cost_per_km == pytest.approx(118.0 / 76.0 * 38.0 / 425.0)


def test_driving_of_unknown_consumption_is_distance_all_the_same() -> None:
    missed = replace(CROSSING[2], missed=True)
    log = a_log(*CROSSING[:2], missed, entry("2026-11-29", 2000, 9))
    november = driven(account(log), NOVEMBER, None)
    assert november.distance_km == pytest.approx(525.0)
    assert november.measured_km == pytest.approx(125.0)
    assert sum(km for _, _, km in pieces(log)) == pytest.approx(1000.0)


def test_an_open_end_counts_as_distance() -> None:
    log = a_log(*CROSSING, replace(entry("2026-11-28", 2100, 10), full=False))
    november = driven(account(log), NOVEMBER, None)
    assert (november.distance_km, november.measured_km) == (pytest.approx(625.0), pytest.approx(425.0))


def test_currencies_are_never_added_up() -> None:
    mixed = a_log(*CROSSING[:2], entry("2026-11-21", 1900, 36, 54.0, "CHF"))
    found = account(mixed)
    assert found.currency is None
    assert found.mixed == "EUR: 2026-11-01; CHF: 2026-11-21"
    assert driven(found, NOVEMBER, None).cost is None


def test_many_entries_of_a_currency_are_told_by_their_span() -> None:
    paid = {day: "EUR" if day < 9 else "CHF" for day in range(1, 11)}
    many = [entry(f"2026-10-{day:02d}", 1000.0 + 100 * day, 8, 12.0, currency) for day, currency in paid.items()]
    assert account(a_log(*many)).mixed == "EUR: 8 entries, 2026-10-01 to 2026-10-08; CHF: 2026-10-09, 2026-10-10"
