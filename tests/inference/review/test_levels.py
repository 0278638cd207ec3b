"""Months as columns of the regression, against the same regression written down cell by cell."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm

from energytrack.consumption.frames import observe_frames
from energytrack.inference.bounds import mixture_quantile
from energytrack.inference.graded import averaged
from energytrack.inference.model import fit_model
from energytrack.inference.review.levels import Months
from tests.dense import dense_covariance
from tests.simulation import simulate
from tests.uses import STEADY_COMMUTE


@pytest.fixture(scope="module")
def months() -> Months:
    """A commute with a part fitted half-way, and two months of four segments each, the second half crossed."""
    log = simulate(replace(STEADY_COMMUTE, fillings=60, shift_percent=-6.0), np.random.default_rng(7))
    observed, _ = observe_frames(log.entries, log.modifications, capacity=50.0)
    shares = {"late": np.zeros(len(observed)), "early": np.zeros(len(observed)), "never": np.zeros(len(observed))}
    shares["late"][-4:] = (0.5, 1.0, 1.0, 1.0)
    shares["early"][-8:-3] = (0.3, 1.0, 1.0, 1.0, 0.5)
    return Months(fit_model(averaged(observed), None), shares, 0.95)


def oracle(months: Months, names: list[str]) -> tuple[np.ndarray, np.ndarray]:
    """Coefficients and covariance by statsmodels' GLS; priors as further observations of the coefficients."""
    model = months.model
    problem, observed = model.problem, model.observed
    relative = observed.distance_km / model.scale.distance_km
    columns = np.column_stack([problem.columns, *(relative * months.shares[name] for name in names)])
    covariance = dense_covariance(problem.shape, model.fit.scatter, observed.mid_day)
    own = np.flatnonzero(problem.precision)
    whole = np.zeros((len(columns) + len(own), len(columns) + len(own)))
    whole[: len(columns), : len(columns)] = covariance
    whole[len(columns) :, len(columns) :] = np.diag(1 / problem.precision[own])
    prior = np.eye(columns.shape[1])[own]
    energy = np.append(problem.energy, np.zeros(len(own)))
    found = sm.GLS(energy, np.vstack([columns, prior]), sigma=whole).fit(cov_type="fixed scale")
    return np.asarray(found.params), np.asarray(found.cov_params())


def test_a_level_is_that_of_generalised_least_squares(months: Months) -> None:
    coefficients, covariance = oracle(months, ["late"])
    weights = np.zeros(len(coefficients))
    weights[[0, -2, -1]] = 1.0  # level, the part (on throughout), the month
    found = months.level("late")
    assert found is not None
    assert found.interval is not None
    unit = months.model.scale.consumption
    assert found.value == pytest.approx(unit * (weights @ coefficients), rel=1e-6)
    error = unit * float(np.sqrt(weights @ covariance @ weights))
    reach = mixture_quantile(0.025, found.freedom) * error
    assert found.interval[1] - found.value == pytest.approx(reach, rel=1e-4)


def test_a_difference_is_that_of_two_columns(months: Months) -> None:
    coefficients, covariance = oracle(months, ["late", "early"])
    late, early = np.zeros(len(coefficients)), np.zeros(len(coefficients))
    late[[0, -3, -2]], early[[0, -3, -1]] = 1.0, 1.0
    found = months.difference("late", "early")
    assert found is not None
    estimate, reference = found
    ratio = float((late - early) @ coefficients / (early @ coefficients))
    assert estimate.value == pytest.approx(ratio, rel=1e-6)
    assert reference == pytest.approx(months.model.scale.consumption * (early @ coefficients), rel=1e-6)
    direction = (late - (1 + ratio) * early) / (early @ coefficients)
    error = float(np.sqrt(direction @ covariance @ direction))
    assert estimate.interval is not None
    width = (estimate.interval[1] - estimate.interval[0]) / 2
    assert width == pytest.approx(mixture_quantile(0.025, estimate.freedom) * error, rel=0.01)  # Fieller, near delta


def test_neighbours_are_better_known_apart_than_two_levels_on_their_own(months: Months) -> None:
    levels = [months.level(name) for name in ("late", "early")]
    found = months.difference("late", "early")
    assert found is not None
    assert found[0].interval is not None
    reaches = [(each.interval[1] - each.value) / each.value for each in levels if each and each.interval]
    assert found[0].interval[1] - found[0].value < 1.05 * float(np.hypot(*reaches))


def test_the_baseline_has_nothing_fitted(months: Months) -> None:
    found = months.difference("late", None)
    assert found is not None
    estimate, _ = found
    assert estimate.interval is not None
    assert estimate.interval[0] < -0.06 < estimate.interval[1] < 0.0


def test_a_month_without_driving_has_no_level(months: Months) -> None:
    assert months.level("never") is None
    assert months.difference("late", "never") is None


def test_a_log_that_is_all_of_one_month_has_no_level(months: Months) -> None:
    everything = replace(months, shares={"all": np.ones(len(months.model.observed))})
    assert everything.level("all") is None


def test_reference_conditions_are_the_means_of_the_log(months: Months) -> None:
    observed = months.model.observed
    told = months.reference_conditions()
    assert set(told) == {"temperature_c", "speed_kmh"}
    mean = np.average(months.model.conditions.values["speed_kmh"], weights=observed.distance_km)
    assert told["speed_kmh"] == pytest.approx(mean)
