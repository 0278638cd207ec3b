"""The false discovery rate against statsmodels' `multipletests` (Benjamini and Hochberg, 1995)."""

from __future__ import annotations

import numpy as np
import pytest
from statsmodels.stats.multitest import multipletests

from energytrack.inference.fleet.discovery import adjusted


@pytest.mark.parametrize("count", [1, 2, 15, 1000])
@pytest.mark.parametrize("power", [1.0, 4.0])
def test_as_statsmodels(count: int, power: float) -> None:
    p_values = np.random.default_rng(count).uniform(size=count) ** power
    called, theirs, *_ = multipletests(p_values, alpha=0.05, method="fdr_bh")
    assert adjusted(p_values) == pytest.approx(theirs, rel=1e-12)
    assert ((adjusted(p_values) <= 0.05) == called).all()


def test_ties_and_none() -> None:
    assert adjusted([0.02, 0.02, 0.9]) == pytest.approx(multipletests([0.02, 0.02, 0.9], method="fdr_bh")[1])
    assert len(adjusted([])) == 0
