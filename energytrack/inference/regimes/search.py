"""Least-squares partitions of a series into regimes: exact, for every number of breaks at once.

Dynamic programming over the triangular table of residual sums (Bai and Perron, 1998, 2003), of which one row is held
at a time: the residual sums of all regimes that end at one observation come from prefix sums of cross-products in one
sweep over all their starts. Time grows with the square of the places tried, memory with n.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from energytrack.inference.noise import Array

_SINGULAR = 1e-10  # what is left of a column, relative to it, once the others are taken out of a regime
_ROUNDING = 1e-13  # of a sum of products, for each observation before it
_ROUNDS = 50
_WHOLE, _GRID = 5_000, 2_000  # observations searched whole; places of the grid that a longer series is searched on
_AT_ONCE = 8_192  # regimes swept together: their products fit a processor's cache


@dataclass(frozen=True)
class Partition:
    """Regimes of a series: `breaks` are the numbers of observations before each new regime, ascending."""

    breaks: tuple[int, ...]
    residual: float  # sum of squares


def partitions(y: Array, columns: Array, *, most: int, shortest: int) -> tuple[Partition, ...]:
    """The best partition with 0, 1, ... `most` breaks, each regime with coefficients of its own.

    y (n,), columns (n, q); no regime has fewer than `shortest` observations, and fewer breaks than `most` are tried
    where that leaves no room for more. Where columns cannot be told apart within a regime, as many are used as can.

    Up to 5,000 observations the minimum over all partitions is exact, up to rounding. A longer series is searched on
    a grid of 2,000 places first and then, with the grid, at every place within two steps of any break found there:
    exact if the best breaks lie that near to the best ones of the grid, and never worse than the grid's.
    """
    n = len(y)
    most = min(most, n // max(shortest, 1) - 1)
    if most < 0:
        return ()
    scale, sums = _prefix_sums(y, columns)
    places = np.arange(n + 1)
    if n > _WHOLE:
        step = -(-n // _GRID)
        places = np.union1d(places[::step], [n])
        near = [place for found in _best(sums, places, most, shortest) for place in found[0]]
        windows = np.add.outer(np.array(near, dtype=np.intp), np.arange(-2 * step, 2 * step + 1))
        places = np.union1d(places, windows[(windows > 0) & (windows < n)])
    return tuple(Partition(breaks, scale * cost) for breaks, cost in _best(sums, places, most, shortest))


def _best(sums: Array, places: NDArray[np.intp], most: int, shortest: int) -> list[tuple[tuple[int, ...], float]]:
    """Breaks at some of these places (ascending, from 0 to n) and their cost, for 0, 1, ... as many as there is room.

    Ends are taken in blocks none of whose members starts where another one ends.
    """
    q = int(np.sqrt(2 * len(sums))) - 1
    best = np.full((most + 1, len(places)), np.inf)
    origin = np.zeros((most + 1, len(places)), dtype=np.int32)
    first = int(np.searchsorted(places, shortest))
    while first < len(places):
        room = int(np.searchsorted(places, places[first] + shortest)) - first
        block = slice(first, first + max(1, min(_AT_ONCE // first, room, len(places) - first)))
        ends = places[block]
        starts = places[: np.searchsorted(places, ends[-1] - shortest, side="right")]
        costs = _residuals(sums[:, ends, None] - sums[:, None, starts], q)
        costs[starts > ends[:, None] - shortest] = np.inf
        best[0, block] = costs[:, 0]
        for breaks in range(1, most + 1):
            totals = best[breaks - 1, : len(starts)] + costs
            origin[breaks, block] = totals.argmin(axis=1)
            best[breaks, block] = totals.min(axis=1)
        first = block.stop
    return [
        (_traced(origin, places, breaks), float(best[breaks, -1]))
        for breaks in range(most + 1)
        if np.isfinite(best[breaks, -1])
    ]


def partial_partitions(
    y: Array, columns: Array, common: Array, *, most: int, shortest: int
) -> tuple[Partition, ...]:
    """As partitions, with `common` columns (n, p) whose coefficients stay the same in all regimes.

    For each number of breaks, the best partition at given common coefficients and the common coefficients at that
    partition are found in turns until neither changes (Bai and Perron, 2003, section 2.2). Every turn lowers the
    residual sum; the end is a minimum over each of the two, as a rule that over both.
    """
    if common.shape[1] == 0:
        return partitions(y, columns, most=most, shortest=shortest)
    found: list[Partition] = []
    for count in range(min(most, len(y) // max(shortest, 1) - 1) + 1):
        breaks, residual = _fitted(y, columns, common, found[-1].breaks if found else ())
        here = Partition(found[-1].breaks if found else (), np.inf)
        for _ in range(_ROUNDS):
            there = partitions(y - common @ breaks, columns, most=count, shortest=shortest)[count].breaks
            breaks, residual = _fitted(y, columns, common, there)
            if residual >= here.residual * (1 - 1e-12):
                break
            here = Partition(there, residual)
        found.append(here)
    return tuple(found)


def _fitted(y: Array, columns: Array, common: Array, breaks: tuple[int, ...]) -> tuple[Array, float]:
    """Common coefficients (p,) and the residual sum at given breaks."""
    design = np.column_stack([common, by_regime(columns, breaks)])
    coefficients: Array = np.linalg.lstsq(design, y, rcond=None)[0].astype(np.float64)
    residual = y - design @ coefficients
    return coefficients[: common.shape[1]], float(residual @ residual)


def by_regime(columns: Array, breaks: tuple[int, ...]) -> Array:
    """Columns (n, q) cut at the breaks: (n, q regimes), each with the values of one regime and zeros elsewhere."""
    regime = np.searchsorted(np.array(breaks, dtype=np.intp), np.arange(len(columns)), side="right")
    inside = regime[:, None] == np.arange(len(breaks) + 1)
    cut: Array = (inside[:, :, None] * columns[:, None, :]).reshape(len(columns), -1)
    return cut


def _prefix_sums(y: Array, columns: Array) -> tuple[float, Array]:
    """Sums of products of columns and y up to each observation (pairs, n + 1), and the scale of y squared.

    The columns are made orthonormal and y freed of them first, so that differences of sums lose no digits.
    """
    n, q = columns.shape
    left, sizes, _ = np.linalg.svd(columns, full_matrices=False)
    basis = left * (sizes > _SINGULAR * sizes.max(initial=0.0))
    rest = y - basis @ (basis.T @ y)
    scale = float(np.sqrt(np.mean(rest**2))) or 1.0
    stacked = np.column_stack([basis * np.sqrt(n), rest / scale])
    rows, others = np.triu_indices(q + 1)
    sums = np.zeros((len(rows), n + 1))
    np.cumsum((stacked[:, rows] * stacked[:, others]).T, axis=1, out=sums[:, 1:])
    return scale**2, sums


def _residuals(products: Array, q: int) -> Array:
    """Residual sums of many regressions from the upper triangles (pairs, ...) of their cross-products.

    Columns are swept out one after another, as Cholesky's method does; one that the earlier ones explain is passed by.
    """
    triangle = dict(zip(zip(*(side.tolist() for side in np.triu_indices(q + 1)), strict=True), products, strict=True))
    whole = [triangle[a, a] * _SINGULAR + _ROUNDING * products.shape[-1] for a in range(q)]
    for a in range(q):
        own = triangle[a, a]
        weight = np.where(own > whole[a], 1.0, 0.0) / np.maximum(own, whole[a])
        for b in range(a + 1, q + 1):
            factor = triangle[a, b] * weight
            for c in range(b, q + 1):
                triangle[b, c] -= factor * triangle[a, c]
    residuals: Array = np.maximum(triangle[q, q], 0.0)
    return residuals


def _traced(origin: NDArray[np.int32], places: NDArray[np.intp], breaks: int) -> tuple[int, ...]:
    """Break places from the table of best last starts."""
    found: list[int] = []
    end = len(places) - 1
    for count in range(breaks, 0, -1):
        end = int(origin[count, end])
        found.append(int(places[end]))
    return tuple(reversed(found))
