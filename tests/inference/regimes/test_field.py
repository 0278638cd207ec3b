"""Candidates taken all at once agree with fitting each of them in turn."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from energytrack.consumption.frames import observe_frames
from energytrack.inference.likelihood import Problem, evaluate
from energytrack.inference.model import fit_model
from energytrack.inference.regimes import places as where
from energytrack.inference.regimes.breaks import Search
from tests.simulation import simulate
from tests.uses import STEADY_COMMUTE


def a_search(*, slopes: bool) -> Search:
    use = replace(STEADY_COMMUTE, fillings=50, shift_percent=4.0)
    log = simulate(use, np.random.default_rng(8))
    observed = observe_frames(log.entries, None, capacity=use.capacity)[0]
    bare = fit_model(observed, None)
    own = bare.terms.columns(bare.conditions) if slopes else np.zeros((len(observed), 0))
    return Search(observed, (), bare, np.column_stack([np.ones(len(observed)), own]), 8)


def with_columns(problem: Problem, columns: np.ndarray) -> Problem:
    flat = np.zeros(columns.shape[1])
    return replace(
        problem, columns=np.column_stack([problem.columns, columns]), precision=np.append(problem.precision, flat)
    )


@pytest.mark.parametrize("slopes", [False, True])
@pytest.mark.parametrize("given", [(), (30.0,)])
def test_gains_equal_a_fit_with_each_candidate(slopes: bool, given: tuple[float, ...]) -> None:
    search = a_search(slopes=slopes)
    problem, scatter = search.bare.problem, search.bare.fit.scatter
    relative = problem.columns[:, :1]

    def columns(place: float) -> np.ndarray:
        return relative * where.shares(np.array([place]), len(relative)) * search.terms

    for place in given:
        problem = with_columns(problem, columns(place))
    places = np.array([10.0, 17.3, 22.0])
    gains = search.field(scatter, given, places).gains
    for place, gain in zip(places, gains, strict=True):
        point = evaluate(with_columns(problem, columns(place)), search.bare.fit.theta)
        own = slice(-search.width, None)
        effects, covariance = point.coefficients[own], point.covariance[own, own]
        assert gain == pytest.approx(effects @ np.linalg.solve(covariance, effects), rel=1e-6)


def test_two_at_once_gain_at_least_what_each_does() -> None:
    search = a_search(slopes=False)
    places = np.array([10.0, 20.0, 35.0])
    field = search.field(search.bare.fit.scatter, (), places)
    both = field.joined(np.array([[0, 1], [0, 2], [1, 2]])).gains
    one = field.gains
    assert (both >= [max(one[0], one[1]), max(one[0], one[2]), max(one[1], one[2])]).all()


def test_standardised_rows_have_length_one() -> None:
    search = a_search(slopes=True)
    rows = search.field(search.bare.fit.scatter, (), np.arange(8.0, 42.0)).unit_rows
    np.testing.assert_allclose(rows @ rows.transpose(0, 2, 1), np.broadcast_to(np.eye(3), (34, 3, 3)), atol=1e-8)


def test_residual_falls_by_the_gain() -> None:
    search = a_search(slopes=False)
    cross = search.cross(search.bare.fit.scatter, np.array([12.0, 25.0]))
    fallen = cross.residual([]) - cross.residual([1])
    assert fallen == pytest.approx(cross.given([], [0, 1]).gains[1], rel=1e-8)
