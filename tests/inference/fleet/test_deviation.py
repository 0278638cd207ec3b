"""A month against the vehicle's own record."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import kstest, norm, t

from energytrack.consumption.observations import observe
from energytrack.consumption.segments import close_segments
from energytrack.inference import bounds
from energytrack.inference.fleet.deviation import deviation_of
from energytrack.inference.review.driven import month_shares
from energytrack.inference.review.month import Month, month_of
from tests.fleets import FIRST, as_log
from tests.simulation import simulate
from tests.uses import DRIFTING, STEADY_COMMUTE

MONTH = month_of("2024-06")


def observed(use, seed: int, factor: float = 1.0, month: Month = MONTH):
    """A drawn log that used more in June, up to the end of a month, and the shares of that month."""
    log = as_log(simulate(use, np.random.default_rng(seed), start=FIRST))
    segmented = close_segments(log.entries, capacity=use.capacity, unit=use.unit)
    thirsty, shares = (np.array(month_shares(segmented, each)) for each in (MONTH, month))
    known = observe(segmented, log.modifications)
    known = replace(known, energy=known.energy * (1 + (factor - 1) * thirsty))
    count = sum(segment.start_day <= month.last for segment in segmented.segments)
    return known.head(count), shares[:count]


def test_a_month_that_used_more_is_found_and_one_that_did_not_is_not() -> None:
    use = replace(STEADY_COMMUTE, fillings=80)
    usual, more = (deviation_of(*observed(use, 1, factor))[0] for factor in (1.0, 1.15))
    assert abs(usual.z) < 2.5
    assert more.z > 4
    assert more.p_value < 0.001
    difference = more.deviation_percent - usual.deviation_percent
    assert difference == pytest.approx(15, abs=1)
    assert more.measured == pytest.approx(more.expected * (1 + more.deviation_percent / 100), rel=0.03)


def test_p_values_are_uniform_where_nothing_happened() -> None:
    """Drifting use, whose drift must be counted: Kolmogorov and Smirnov's test against uniform."""
    use = replace(DRIFTING, fillings=60)
    p_values = [deviation_of(*observed(use, seed))[0].p_value for seed in range(60)]
    assert kstest(p_values, "uniform").pvalue > 0.01
    assert np.mean(np.array(p_values) < 0.05) <= 0.15


def test_months_without_an_answer_say_why() -> None:
    use = replace(STEADY_COMMUTE, fillings=40)
    assert deviation_of(*observed(use, 1, month=month_of("2031-01")))[1] == "nothing closed between known levels"
    assert "fewer than 5" in deviation_of(*observed(use, 1, month=month_of("2024-01")))[1]


def test_tail_of_an_estimated_noise() -> None:
    """Normal where the noise is known; with few degrees of freedom between the normal's and Student's."""
    assert bounds.mixture_tail(1.96, 1e12) == pytest.approx(norm.sf(1.96), rel=1e-4)
    assert norm.sf(2.5) < bounds.mixture_tail(2.5, 8) < 1.5 * t.sf(2.5, 8)
