"""The information in every beginning of a log, against the same log cut short."""

from __future__ import annotations

import numpy as np
import pytest

from energytrack.inference.growing import growing_products
from energytrack.inference.noise import Scatter, Structure, products, structure

SCATTER = Scatter(0.05, 0.02, 0.03, 0.01)


def uneven_log(count: int, seed: int) -> tuple[Structure, np.ndarray]:
    rng = np.random.default_rng(seed)
    shape = structure(
        rng.uniform(0.5, 1.5, count),
        np.cumsum(rng.integers(0, 9, count)).astype(float),
        rng.random(count) > 0.1,
        rng.uniform(0.5, 1.0, count),
        rng.uniform(0.5, 1.0, count),
        extra=rng.random(count) * 1e-4,
    )
    return shape, rng.standard_normal((count, 4))


def cut(shape: Structure, days_seed: int, count: int) -> Structure:
    whole = np.random.default_rng(days_seed)
    size = len(shape.distance)
    whole.uniform(0.5, 1.5, size)
    day = np.cumsum(whole.integers(0, 9, size)).astype(float)
    parts = (shape.distance, day, shape.linked, shape.start_weight, shape.end_weight)
    return structure(*(part[:count] for part in parts), extra=shape.extra[:count])  # type: ignore[arg-type]


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("count", [1, 2, 17, 59, 60])
def test_each_beginning_is_the_log_cut_short(seed: int, count: int) -> None:
    shape, columns = uneven_log(60, seed)
    grown = growing_products(shape, SCATTER, columns)
    assert grown.shape == (60, 4, 4)
    alone = products(cut(shape, seed, count), SCATTER, columns[:count]).cross
    np.testing.assert_allclose(grown[count - 1], alone, rtol=1e-9, atol=1e-9 * np.abs(alone).max())


def test_starting_later_leaves_the_rest_as_it_is() -> None:
    shape, columns = uneven_log(30, 5)
    whole = growing_products(shape, SCATTER, columns)
    np.testing.assert_array_equal(growing_products(shape, SCATTER, columns, 12), whole[11:])
