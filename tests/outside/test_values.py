"""The copied check values still agree with plain linear algebra on the series beside them."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.stats import norm

from tests.outside.values import reference, references, table


def test_records_name_their_source_and_package() -> None:
    assert len(references()) == 55
    assert all(record.source and record.computed_with and record.tolerance > 0 for record in references().values())


def test_generalised_least_squares_with_known_covariance() -> None:
    """Level errors of sd 1.2 at both ends of a segment, trip noise of sd 0.18 (MASS lm.gls)."""
    record, log = reference("gls.tridiag.known"), table("tridiag_logbook")
    design = np.column_stack([np.ones(len(log)), log["temp"], log["mod"]])
    ends = (np.eye(len(log), len(log) + 1, 1) - np.eye(len(log), len(log) + 1)) / log["d"].to_numpy()[:, None]
    covariance = 0.18**2 * np.eye(len(log)) + 1.2**2 * ends @ ends.T
    fit = sm.GLS(log["fuel"] / log["d"], design, sigma=covariance).fit(cov_type="fixed scale")
    np.testing.assert_allclose(fit.params, record.values["coef"], rtol=record.tolerance)
    np.testing.assert_allclose(fit.bse, record.values["se_known"], rtol=record.tolerance)


def test_power_with_known_standard_error() -> None:
    values = reference("power.gls.known.0.1").values
    z, reached = norm.ppf(0.975), values["delta"] / values["se"]
    assert norm.sf(z - reached) + norm.cdf(-z - reached) == pytest.approx(values["power"], rel=1e-9)
    assert (z + norm.ppf(0.8)) * values["se"] == pytest.approx(values["mde80"], rel=1e-6)


def test_longley_certified_values() -> None:
    values, longley = reference("longley.nist").values, sm.datasets.longley.load_pandas()
    fit = sm.OLS(longley.endog, sm.add_constant(longley.exog[values["terms"][1:]])).fit()
    np.testing.assert_allclose(fit.params, values["coef"], rtol=1e-8)
    np.testing.assert_allclose(fit.bse, values["se"], rtol=1e-8)


def test_discrete_look_constants_rise_towards_the_continuous_bound() -> None:
    constants = [reference(f"jt.OF.K{looks}").values["C"] for looks in range(2, 11)]
    assert (np.diff(constants) > 0).all()
    assert constants[-1] < 2.2414
