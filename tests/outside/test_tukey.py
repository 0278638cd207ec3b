"""Variants pair by pair against Tukey's honest differences, where the designs agree: equal groups, alike conditions."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pandas as pd
import pytest
from scipy.stats import tukey_hsd

from energytrack.inference.comparison import NOTHING, compare, equicoordinate_quantile
from energytrack.inference.results import Comparison

VARIANTS = {"short": -0.03, "middle": -0.05, "long": 0.0}
TANKS = 40  # of each, and as many with nothing fitted
SCATTER = 0.03


def alternating(seed: int) -> tuple[pd.DataFrame, pd.DataFrame, dict[str, np.ndarray]]:
    """Tanks of 500 km, one of each kind in turn, always at 20 degrees; independent noise. Consumption by group too."""
    rng = np.random.default_rng(seed)
    kinds = [NOTHING, *VARIANTS] * TANKS
    use = 8 * (1 + np.array([VARIANTS.get(kind, 0.0) for kind in kinds]) + SCATTER * rng.standard_normal(len(kinds)))
    km = 10_000 + 500.0 * np.arange(len(kinds) + 1)
    entries = pd.DataFrame(
        {
            "vehicle": "van",
            "date": pd.date_range("2024-01-01", periods=len(km), freq="3D"),
            "odometer_km": km,
            "energy": np.concatenate([[40.0], 5 * use]),
            "temperature_c": 20.0,
        }
    )
    rows = [
        {"vehicle": "van", "name": kind, "fitted_km": km[k], "removed_km": km[k + 1]}
        for k, kind in enumerate(kinds)
        if kind != NOTHING
    ]
    groups = {kind: use[np.array(kinds) == kind] for kind in (*VARIANTS, NOTHING)}
    return entries, pd.DataFrame(rows), groups


@pytest.fixture(scope="module")
def found() -> tuple[Comparison, dict[str, np.ndarray]]:
    entries, parts, groups = alternating(3)
    return compare(entries, parts, capacity=60.0), groups


def test_familywise_range_of_equal_groups() -> None:
    """scipy.stats.tukey_hsd: with known noise and equal groups the joint normal quantile is Tukey's."""
    rng = np.random.default_rng(8)
    groups = [rng.standard_normal(400) for _ in range(4)]
    theirs = tukey_hsd(*groups).confidence_interval(0.95)
    variance = np.mean([np.var(group, ddof=1) for group in groups])
    pairs = list(combinations(range(4), 2))
    contrasts = np.array([np.eye(4)[i] - np.eye(4)[j] for i, j in pairs])
    half = equicoordinate_quantile(contrasts @ contrasts.T, 0.05) * np.sqrt(2 * variance / 400)
    assert [theirs.high[i, j] - theirs.low[i, j] for i, j in pairs] == pytest.approx([2 * half] * 6, rel=0.01)


def test_pairwise_shifts_and_their_ranges(found: tuple[Comparison, dict[str, np.ndarray]]) -> None:
    """The same differences; ranges a little wider: they hold at every look and pay for possible drift."""
    comparison, groups = found
    names = list(groups)
    theirs = tukey_hsd(*groups.values())
    span, base = theirs.confidence_interval(0.95), groups[NOTHING].mean()
    for pair in comparison.pairs:
        i, j = names.index(pair.one), names.index(pair.other)
        assert pair.shift_percent == pytest.approx(100 * theirs.statistic[i, j] / base, abs=0.35)
        ours = pair.interval_percent[1] - pair.interval_percent[0]
        assert 1.0 < ours / (100 * (span.high[i, j] - span.low[i, j]) / base) < 1.5


def test_clear_and_unclear_pairs_agree(found: tuple[Comparison, dict[str, np.ndarray]]) -> None:
    comparison, groups = found
    theirs = tukey_hsd(*groups.values())
    names = list(groups)
    p_values = {(pair.one, pair.other): theirs.pvalue[names.index(pair.one), names.index(pair.other)]
                for pair in comparison.pairs}  # fmt: skip
    for pair in comparison.pairs:
        p = p_values[pair.one, pair.other]
        if p < 0.001 or p > 0.05:
            assert pair.differs == (p < 0.001), (pair, p)
    assert min(p_values.values()) < 0.001 < 0.05 < max(p_values.values())
