"""Sampling errors by hand, by closed form, and by reference libraries."""

from __future__ import annotations

import pytest
from scipy.stats import binomtest
from statsmodels.stats.proportion import proportion_confint

from energytrack.inference.rates import rate, settled


def test_a_rate_by_hand():
    """One of two: the lower end p has P(at least 1 of 2) = 1 - (1 - p)^2 = 0.025, so p = 1 - sqrt(0.975)."""
    found = rate(1, 2)
    assert (found.count, found.of, found.percent) == (1, 2, 50.0)
    assert found.interval_percent == pytest.approx((100 * (1 - 0.975**0.5), 100 * 0.975**0.5))


def test_none_and_all_have_closed_forms():
    """None of n: (1 - p)^n = 0.025."""
    assert rate(0, 200).interval_percent == pytest.approx((0.0, 100 * (1 - 0.025 ** (1 / 200))))
    assert rate(200, 200).interval_percent == pytest.approx((100 * 0.025 ** (1 / 200), 100.0))


@pytest.mark.parametrize(("count", "of"), [(4, 200), (162, 200), (1, 12), (0, 7), (7, 7)])
def test_rates_equal_the_exact_range_of_reference_libraries(count: int, of: int):
    low, high = proportion_confint(count, of, method="beta")
    exact = binomtest(count, of).proportion_ci(0.95, method="exact")
    found = rate(count, of).interval_percent
    assert found == pytest.approx((100 * exact.low, 100 * exact.high))
    if 0 < count < of:
        assert found == pytest.approx((100 * low, 100 * high))


def test_median_and_its_range_between_order_statistics():
    """n = 20: the 6th and 15th value, as in published tables of the sign test's range (level 95.9 %)."""
    found = settled([float(km) for km in range(1, 21)])
    assert found is not None
    assert found.median_km == 10.0
    assert found.median_interval_km == (6.0, 15.0)
    assert found.range_km == (2.0, 18.0)


def test_logs_never_settled_count_as_the_farthest():
    found = settled([None, 100.0, None, 200.0, None])
    assert found is not None
    assert found.median_km is None
    assert found.range_km == (100.0, None)
    assert settled([None, None]) is None
    few = settled([50.0, *[None] * 19])
    assert few is not None
    assert few.range_km == (None, None)
