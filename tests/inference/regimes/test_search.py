"""Partitions against a general-purpose library's exact search, and against every partition written down."""

from __future__ import annotations

from itertools import combinations
from unittest import mock

import numpy as np
import pytest
import ruptures
from hypothesis import given, settings
from hypothesis import strategies as st

from energytrack.inference.regimes import search
from energytrack.inference.regimes.search import by_regime, partial_partitions, partitions


def a_series(seed: int, n: int, q: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    columns = np.column_stack([np.ones(n), *(rng.normal(50, 10, n) for _ in range(q - 1))])
    y = columns @ rng.normal(1, 0.1, q) + rng.normal(0, 1, n)
    y[n // 3 :] += rng.normal(0, 2)
    y[2 * n // 3 :] += rng.normal(0, 2)
    return y, columns


def residual(y: np.ndarray, columns: np.ndarray, breaks: tuple[int, ...]) -> float:
    design = by_regime(columns, breaks)
    rest = y - design @ np.linalg.lstsq(design, y, rcond=None)[0]
    return float(rest @ rest)


@settings(max_examples=25, deadline=None)
@given(
    seed=st.integers(0, 10_000),
    n=st.integers(16, 45),
    q=st.integers(1, 3),
    breaks=st.integers(1, 3),
    shortest=st.integers(3, 5),
)
def test_same_breaks_as_ruptures(seed: int, n: int, q: int, breaks: int, shortest: int) -> None:
    """Oracle: ruptures Dynp with the model "linear" at every place (jump 1)."""
    y, columns = a_series(seed, n, q)
    shortest = min(shortest, n // (breaks + 1))
    signal = np.column_stack([y, columns])
    theirs = ruptures.Dynp(model="linear", min_size=shortest, jump=1).fit(signal).predict(n_bkps=breaks)[:-1]
    ours = partitions(y, columns, most=breaks, shortest=shortest)[breaks]
    assert ours.residual == pytest.approx(residual(y, columns, ours.breaks), rel=1e-7, abs=1e-9)
    assert ours.residual <= residual(y, columns, tuple(theirs)) * (1 + 1e-9) + 1e-9
    if residual(y, columns, tuple(theirs)) > 1e-6:  # regimes that fit perfectly may be cut anywhere
        assert ours.breaks == tuple(theirs)


@settings(max_examples=20, deadline=None)
@given(seed=st.integers(0, 10_000), n=st.integers(9, 14), blocks=st.sampled_from([1, 40, 8_192]))
def test_best_of_all_partitions(seed: int, n: int, blocks: int) -> None:
    y, columns = a_series(seed, n, 1)
    allowed = [cut for cut in combinations(range(3, n - 2), 2) if cut[1] - cut[0] >= 3]
    with mock.patch.object(search, "_AT_ONCE", blocks):
        found = partitions(y, columns, most=2, shortest=3)
    assert found[2].residual == pytest.approx(min(residual(y, columns, cut) for cut in allowed), rel=1e-9)


def test_common_coefficients_stay_the_same_in_all_regimes() -> None:
    """With one break every place can be tried: the search in turns ends at the best of them."""
    rng = np.random.default_rng(4)
    common = rng.normal(10, 6, (60, 2))
    y = 5 + common @ [0.2, -0.1] + 1.2 * (np.arange(60) >= 41) + rng.normal(0, 0.4, 60)
    found = partial_partitions(y, np.ones((60, 1)), common, most=2, shortest=9)

    def with_break(at: int) -> float:
        design = np.column_stack([common, by_regime(np.ones((60, 1)), (at,))])
        rest = y - design @ np.linalg.lstsq(design, y, rcond=None)[0]
        return float(rest @ rest)

    assert found[1].residual == pytest.approx(min(with_break(at) for at in range(9, 52)), rel=1e-9)
    assert found[1].breaks == (41,)
    assert found[0].residual > found[1].residual > found[2].residual


def test_columns_that_are_constant_within_a_regime_do_no_harm() -> None:
    y = np.concatenate([np.full(10, 2.0), np.full(10, 3.0)]) + np.tile([0.1, -0.1], 10)
    columns = np.column_stack([np.ones(20), np.repeat([0.0, 1.0], 10)])
    best = min(residual(y, columns, (at,)) for at in range(4, 17))
    assert partitions(y, columns, most=1, shortest=4)[1].residual == pytest.approx(best, rel=1e-9)


def test_no_room_for_more_breaks() -> None:
    y, columns = a_series(1, 20, 1)
    assert [len(found.breaks) for found in partitions(y, columns, most=5, shortest=6)] == [0, 1, 2]
    assert partitions(y, columns, most=5, shortest=21) == ()


def test_grid_of_a_long_series_finds_the_breaks_of_the_whole_search() -> None:
    rng = np.random.default_rng(2)
    n, true = 1_500, (310, 700, 1_111)
    y = sum((np.arange(n) >= at) * step for at, step in zip(true, (1.0, -1.3, 0.8), strict=True))
    y = y + rng.normal(0, 1, n)
    whole = partitions(y, np.ones((n, 1)), most=4, shortest=75)
    with mock.patch.multiple(search, _WHOLE=1_000, _GRID=150):
        coarse = partitions(y, np.ones((n, 1)), most=4, shortest=75)
    assert coarse[3].breaks == whole[3].breaks
    assert all(one.residual >= other.residual * (1 - 1e-9) for one, other in zip(coarse, whole, strict=True))
