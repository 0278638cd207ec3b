"""Noise sizes, coefficients and degrees of freedom against R, and coefficients against NIST."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm

from energytrack.errors import InferenceError
from energytrack.inference.likelihood import Prior, Problem, evaluate
from energytrack.inference.noise import structure
from energytrack.inference.reml import fit
from tests.outside.values import reference, table

OFF = np.log(1e-6)  # a source of noise that is not there
TRIP_AND_LEVEL = (0, 1)


def problem_of(log, *, first_level_known: bool = False, columns=("temp", "mod"), energy="fuel") -> Problem:  # type: ignore[no-untyped-def]
    """Trip noise per distance and level errors only, no priors: the model the reference packages fitted."""
    distance = log["d"].to_numpy() if "d" in log else np.ones(len(log))
    linked = np.arange(len(log)) > 0
    weights = np.ones(len(log))
    start = weights.copy()
    start[0] = 0.0 if first_level_known else 1.0
    shape = structure(distance, np.arange(len(log)) * 7.0, linked, start, weights, trip_shape=distance**2)
    design = distance[:, None] * np.column_stack([np.ones(len(log)), log[list(columns)]])
    return Problem(shape, design, log[energy].to_numpy(), np.zeros(design.shape[1]), (), free=TRIP_AND_LEVEL)


def fitted(problem: Problem, trip: float, level: float):  # type: ignore[no-untyped-def]
    return fit(problem, np.array([np.log(trip), np.log(level), OFF, OFF]))


def test_known_noise_gives_the_coefficients_of_generalised_least_squares() -> None:
    """R MASS lm.gls with s_e = 0.18, s_u = 1.2."""
    record = reference("gls.tridiag.known")
    point = evaluate(problem_of(table("tridiag_logbook")), np.array([np.log(0.18), np.log(1.2), OFF, OFF]))
    np.testing.assert_allclose(point.coefficients, record.values["coef"], rtol=1e-7)
    np.testing.assert_allclose(np.sqrt(np.diag(point.covariance)), record.values["se_known"], rtol=1e-7)


def test_restricted_likelihood_of_the_tridiagonal_example() -> None:
    """R metafor rma.mv and lme4, REML: variance components, coefficients, standard errors."""
    values = reference("gls.tridiag.REML").values["metafor_REML"]
    found = fitted(problem_of(table("tridiag_logbook")), 0.3, 0.8)
    assert found.scatter.trip**2 == pytest.approx(values["sigma2_e"], rel=5e-3)
    assert found.scatter.level**2 == pytest.approx(values["sigma2_u"], rel=5e-3)
    np.testing.assert_allclose(found.coefficients, values["coef"], rtol=2e-4)
    np.testing.assert_allclose(np.sqrt(np.diag(found.covariance)), values["se"], rtol=2e-3)


def test_satterthwaite_degrees_of_freedom() -> None:
    """R lme4 with hand-written Satterthwaite (8.84, 23.22, 3.36): far from n - p = 37."""
    values = reference("kr.tridiag.u0known").values
    found = fitted(problem_of(table("tridiag_logbook"), first_level_known=True), 0.2, 1.2)
    np.testing.assert_allclose(found.coefficients, values["coef"], rtol=1e-3)
    slopes = np.einsum("kii->ik", found.covariance_gradient)
    wobble = [slope @ found.theta_covariance @ slope for slope in slopes]
    freedom = 2 * np.diag(found.covariance) ** 2 / wobble
    np.testing.assert_allclose(freedom, values["df_satt"], rtol=0.04)


def test_moving_average_errors() -> None:
    """R nlme gls corARMA(q = 1), REML: level errors of a chain are a moving average of order one."""
    values = reference("gls.ma1.logbook").values["REML"]
    log = table("ma1_logbook")
    found = fitted(problem_of(log, columns=("temp", "speed", "mod"), energy="y"), 0.05, 0.2)
    np.testing.assert_allclose(found.coefficients, values["coef"], rtol=5e-3)
    np.testing.assert_allclose(np.sqrt(np.diag(found.covariance)), values["se"], rtol=2e-2)


def test_longley_certified_coefficients() -> None:
    """NIST StRD Longley, through the centring and scaling every design gets."""
    values = reference("longley.nist").values
    data = sm.datasets.longley.load_pandas()
    raw = data.exog[["GNPDEFL", "GNP", "UNEMP", "ARMED", "POP", "YEAR"]].to_numpy()
    centre, scale = raw.mean(axis=0), raw.std(axis=0)
    ones, days = np.ones(len(raw)), np.arange(len(raw)) * 1e6
    shape = structure(ones, days, days < 0, 0 * ones, 0 * ones)
    design = np.column_stack([ones, (raw - centre) / scale])
    point = evaluate(Problem(shape, design, data.endog.to_numpy(), np.zeros(7), ()), np.array([0.0, OFF, OFF, OFF]))
    slopes = point.coefficients[1:] / scale
    np.testing.assert_allclose(slopes, values["coef"][1:], rtol=1e-8)
    assert point.coefficients[0] - slopes @ centre == pytest.approx(values["coef"][0], rel=1e-8)
    errors = np.sqrt(np.diag(point.covariance))[1:] / scale * values["resid_sd"]
    np.testing.assert_allclose(errors, values["se"][1:], rtol=1e-8)


def test_search_ends_at_the_top_of_the_restricted_posterior() -> None:
    rng = np.random.default_rng(2)
    n = 60
    shape = structure(np.ones(n), np.arange(n) * 6.0, np.arange(n) > 0, np.ones(n), np.ones(n))
    energy = 1 + 0.05 * rng.normal(size=n) + 0.03 * np.diff(rng.normal(size=n + 1))
    priors = (
        Prior((0, 1, 0, 0), np.log(0.02), 0.8),
        Prior((-1, 0, 1, 0), np.log(0.3), 0.8),
        Prior((-1, 0, 0, 1), np.log(0.2), 0.8),
    )
    problem = Problem(shape, np.ones((n, 1)), energy, np.zeros(1), priors)
    best = fit(problem, np.log([0.05, 0.02, 0.015, 0.01]))
    again = fit(problem, np.log([0.3, 0.002, 0.1, 0.1]))
    np.testing.assert_allclose(best.theta, again.theta, atol=0.03)
    top = evaluate(problem, best.theta).cost
    for k in range(4):
        for step in (-0.2, 0.2):
            assert evaluate(problem, best.theta + step * np.eye(4)[k]).cost > top


def test_columns_that_cannot_be_told_apart_are_refused() -> None:
    shape = structure(np.ones(9), np.arange(9.0), np.arange(9) > 0, np.ones(9), np.ones(9))
    problem = Problem(shape, np.zeros((9, 2)), np.ones(9), np.zeros(2), ())
    with pytest.raises(InferenceError, match="cannot be told apart"):
        fit(problem, np.log([0.05, 0.02, 0.015, 0.01]))
