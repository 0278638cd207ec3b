"""Money against examples worked by hand."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace
from types import SimpleNamespace
from typing import Any

import pytest

from energytrack.consumption.segments import close_segments
from energytrack.inference.review.driven import account
from energytrack.inference.review.money import price_of, worth
from energytrack.inference.review.results import Price
from energytrack.logbook.records import Entry

# 20,000 km a year at 8 L/100 km and 1.50 a litre: 2,400 a year, 24 for each percent.
PRICE = Price("EUR", 1.5, 0.08, 20_000.0, 2_400.0, "2025-01-01", False)


def answer(shift: float | None, interval: tuple[float, float] | None, verdict: str = "shifted") -> Any:
    return SimpleNamespace(
        shift_percent=shift, interval_percent=interval, verdict=verdict, expectation=SimpleNamespace(consumption=0.08)
    )


def test_a_year_of_driving_every_tenth_day() -> None:
    """400 km at 8 L/100 km every 10 days for 400 days: 36.5 tanks a year, 32 L at 1.50."""
    start = dt.date(2025, 1, 1)
    entries = [
        Entry("van", start + dt.timedelta(days=10 * k), 32.0, 400.0 * k, cost=48.0, currency="EUR") for k in range(41)
    ]
    price, why = price_of(account(close_segments(entries, capacity=60.0)), None)
    assert why is None
    assert price is not None
    assert (price.per_unit, price.consumption) == (pytest.approx(1.5), pytest.approx(0.08))
    assert price.yearly_km == pytest.approx(14_600.0)
    assert price.yearly_cost == pytest.approx(36.5 * 48.0)
    assert (price.scaled, price.since) == (False, (entries[-1].date - dt.timedelta(days=365)).isoformat())


def test_a_short_log_is_scaled_and_a_shorter_one_refused() -> None:
    start = dt.date(2025, 1, 1)
    entries = [Entry("van", start + dt.timedelta(days=10 * k), 32.0, 400.0 * k, cost=48.0) for k in range(11)]
    price, _ = price_of(account(close_segments(entries, capacity=60.0)), None)
    assert price is not None
    assert price.scaled
    assert price.yearly_km == pytest.approx(14_600.0)
    none, why = price_of(account(close_segments(entries[:5], capacity=60.0)), None)
    assert none is None
    assert why is not None
    assert "covers 40 days" in why


def test_without_a_cost_there_is_no_price() -> None:
    entries = [Entry("van", dt.date(2025, 1 + k, 1), 32.0, 400.0 * k) for k in range(6)]
    assert price_of(account(close_segments(entries, capacity=60.0)), None) == (
        None,
        "no entry of the last 12 months has a cost: log it with --cost",
    )


def test_a_settled_saving_and_how_far_pays_the_part() -> None:
    found = worth(answer(-5.0, (-7.5, -2.5)), PRICE, None, 300.0)
    assert found is not None
    assert found.resolved
    assert found.yearly == pytest.approx(120.0)
    assert found.interval == (pytest.approx(60.0), pytest.approx(180.0))
    assert found.payback_km == pytest.approx(50_000.0)
    assert found.payback_interval_km == (pytest.approx(300 / 0.009), pytest.approx(100_000.0))


def test_an_open_question_is_not_resolved() -> None:
    found = worth(answer(-1.0, (-4.0, 2.0), "not-yet"), PRICE, None, 300.0)
    assert found is not None
    assert not found.resolved
    assert found.interval == (pytest.approx(-48.0), pytest.approx(96.0))
    assert found.payback_km is None
    assert found.payback_interval_km is None


def test_a_settled_loss_never_pays() -> None:
    found = worth(answer(4.0, (2.0, 6.0)), PRICE, None, 300.0)
    assert found is not None
    assert found.resolved
    assert found.yearly == pytest.approx(-96.0)
    assert found.payback_km is None


def test_no_range_is_nothing_resolved() -> None:
    found = worth(answer(-5.0, None), PRICE, None, None)
    assert found is not None
    assert not found.resolved
    assert found.interval is None
    assert worth(answer(None, None), PRICE, None, None) is None


def test_with_tank_and_battery_the_shift_is_of_what_was_bought() -> None:
    from energytrack.consumption.two_carriers import TwoCarriers

    price = replace(PRICE, consumption=0.04)
    found = worth(answer(-5.0, (-7.5, -2.5)), price, TwoCarriers(), None)
    assert found is not None
    assert found.yearly == pytest.approx(60.0)
