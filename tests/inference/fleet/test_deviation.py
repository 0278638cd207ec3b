"""A month against the vehicle's own record."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import kstest, norm, t

from energytrack.consumption.observations import observe
from energytrack.consumption.segments import close_segments
from energytrack.inference import bounds
from energytrack.inference.fleet.deviation import deviation_of, shares_of
from energytrack.inference.fleet.month import month_of
from tests.fleets import FIRST, as_log
from tests.simulation import simulate
from tests.uses import DRIFTING, STEADY_COMMUTE

MONTH = month_of("2024-06")


def observed(use, seed: int, factor: float = 1.0):
    log = as_log(simulate(use, np.random.default_rng(seed), start=FIRST))
    known = observe(close_segments(log.entries, capacity=use.capacity, unit=use.unit), log.modifications)
    return replace(known, energy=known.energy * (1 + (factor - 1) * shares_of(known, MONTH)))


def test_a_month_that_used_more_is_found_and_one_that_did_not_is_not() -> None:
    use = replace(STEADY_COMMUTE, fillings=80)
    usual, more = (deviation_of(observed(use, 1, factor), MONTH)[0] for factor in (1.0, 1.15))
    assert abs(usual.z) < 2.5
    assert more.z > 4
    assert more.p_value < 0.001
    difference = more.deviation_percent - usual.deviation_percent
    assert difference == pytest.approx(15, abs=1)
    assert more.measured == pytest.approx(more.expected * (1 + more.deviation_percent / 100), rel=0.03)


def test_p_values_are_uniform_where_nothing_happened() -> None:
    """Drifting use, whose drift must be counted: Kolmogorov and Smirnov's test against uniform."""
    use = replace(DRIFTING, fillings=60)
    p_values = [deviation_of(observed(use, seed), MONTH)[0].p_value for seed in range(60)]
    assert kstest(p_values, "uniform").pvalue > 0.01
    assert np.mean(np.array(p_values) < 0.05) <= 0.15


def test_days_decide_the_share() -> None:
    known = observed(STEADY_COMMUTE, 1)
    shares = shares_of(known, MONTH)
    whole = (known.end_day <= MONTH.last) & (2 * known.mid_day - known.end_day >= MONTH.first - 1)
    assert (shares[whole] == 1).all()
    assert 0 < whole.sum() < (shares > 0).sum()
    assert shares.max() == 1


def test_months_without_an_answer_say_why() -> None:
    known = observed(replace(STEADY_COMMUTE, fillings=40), 1)
    assert deviation_of(known, month_of("2031-01"))[1] == "nothing closed between known levels"
    assert "fewer than 5" in deviation_of(known.head(6), month_of("2024-01"))[1]


def test_tail_of_an_estimated_noise() -> None:
    """Normal where the noise is known; with few degrees of freedom between the normal's and Student's."""
    assert bounds.mixture_tail(1.96, 1e12) == pytest.approx(norm.sf(1.96), rel=1e-4)
    assert norm.sf(2.5) < bounds.mixture_tail(2.5, 8) < 1.5 * t.sf(2.5, 8)
