"""The ratio interval against published and recomputed examples."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import t

from energytrack.inference.shift import ratio_interval
from tests.outside.values import reference


@pytest.mark.parametrize("example", ["ex1", "ex2"])
def test_fieller_interval_of_given_moments(example: str) -> None:
    """Fieller (1954), inverted by R uniroot."""
    v = reference("fieller.generic").values[example]
    bound = t.ppf(0.975, v["df"])
    found = ratio_interval(v["a"], v["b"], v["va"], v["vb"], v["cab"], bound)
    assert found is not None
    np.testing.assert_allclose(found, v["ci"], rtol=1e-9)


def test_ratio_of_two_means_with_published_interval() -> None:
    """Published output of R mratios (Tamhane and Logan 2004): 0.4056763 to 2.6170008."""
    v = reference("fieller.published.welch").values
    x, y = np.array(v["x"]), np.array(v["y"])
    bound = t.ppf(0.975, v["df_plugin"])
    found = ratio_interval(x.mean(), y.mean(), x.var(ddof=1) / 5, y.var(ddof=1) / 5, 0.0, bound)
    assert found is not None
    np.testing.assert_allclose(found, v["ci_published"], rtol=1e-6)


def test_two_samples_of_consumption() -> None:
    """R lm with test inversion: mean after over mean before, equal variances."""
    after = np.array([5.31, 5.42, 5.25, 5.50, 5.38, 5.29, 5.44])
    before = np.array([5.62, 5.71, 5.55, 5.80, 5.66, 5.74, 5.60, 5.69])
    pooled = (after.var(ddof=1) * 6 + before.var(ddof=1) * 7) / 13
    found = ratio_interval(after.mean(), before.mean(), pooled / 7, pooled / 8, 0.0, t.ppf(0.975, 13))
    np.testing.assert_allclose(found, reference("fieller.twosample").values["ci"], rtol=1e-8)


def test_an_unbounded_interval_is_none() -> None:
    assert ratio_interval(0.1, 0.1, 0.01, 0.04, 0.0, 2.0) is None
