"""Is there any break at all? The largest F statistic over all places a break may be, and how unusual that is.

Statistic and trimming of Andrews (1993). Under no break it follows, for long series, the largest value of a squared
Bessel process; its p-value is computed from that process without simulation (Estrella, 2003). Hansen (1997) has a
published approximation of the same distribution; it was fitted to simulated paths seen at a grid of moments, and lies
a tenth lower near 5 %, more in the far tail.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from math import exp, lgamma, log

import numpy as np
from scipy.linalg import expm
from scipy.special import roots_jacobi

from energytrack.errors import InferenceError
from energytrack.inference.noise import Array

_NODES = 48  # of the Chebyshev grid
_FAR = 30.0  # statistics beyond this lie in the tail, whose leading terms are then right to 2 %


@dataclass(frozen=True)
class SupF:
    """The sup-F statistic in its Wald form, q times F, and where it was reached."""

    statistic: float
    at: int  # observations before the break
    candidates: tuple[int, int]  # first and last place tried, in observations before the break
    values: Array  # of every place tried


def sup_f(y: Array, breaking: Array, common: Array, *, trimming: float = 0.15) -> SupF:
    """Largest Wald statistic for a break in the coefficients of `breaking` (n, q), those of `common` (n, p) staying.

    Places from trimming x n to n - trimming x n are tried. Errors of equal variance, independent; the variance is
    estimated with the break, on n - p - 2 q degrees of freedom. Raises InferenceError where nothing is left to try.
    """
    n, q = breaking.shape
    margin = int(trimming * n + 1e-9)
    freedom = n - common.shape[1] - 2 * q
    candidates = np.arange(margin, n - margin + 1)
    if margin < q or not len(candidates) or freedom < 1:
        raise InferenceError(f"{n} observations are too few to look for a break in {q} coefficients")
    left, sizes, _ = np.linalg.svd(np.column_stack([common, breaking]), full_matrices=False)
    basis = left[:, sizes > 1e-10 * sizes.max(initial=0.0)]
    rest = y - basis @ (basis.T @ y)
    after = n - candidates  # a sum over the last so many observations
    square = _suffix(breaking[:, :, None] * breaking[:, None, :])[after]
    beside = _suffix(breaking[:, :, None] * basis[:, None, :])[after]
    score = _suffix(breaking * rest[:, None])[after]
    information = square - beside @ beside.transpose(0, 2, 1)
    lowered = np.einsum("ka,ka->k", score, np.linalg.solve(information, score[:, :, None])[:, :, 0])
    residual = float(rest @ rest)
    values = lowered / ((residual - lowered) / freedom)
    best = int(values.argmax())
    return SupF(float(values[best]), int(candidates[best]), (int(candidates[0]), int(candidates[-1])), values)


def _suffix(rows: Array) -> Array:
    """Sums of the last 0, 1, ... n rows (n + 1, ...)."""
    sums = np.zeros((len(rows) + 1, *rows.shape[1:]))
    np.cumsum(rows[::-1], axis=0, out=sums[1:])
    return sums


def p_value(statistic: float, q: int, trimming: float = 0.15) -> float:
    """Chance of a sup-F (Wald form) of this size or more without any break, for q coefficients and a long series.

    The standardised path of the score is a q-dimensional Ornstein-Uhlenbeck process over a time of 2 log((1 - t) / t)
    for trimming t; the chance that its squared length stays below the statistic solves a parabolic equation in that
    square, solved here on a Chebyshev grid.
    """
    if statistic <= 0:
        return 1.0
    time = 2 * log((1 - trimming) / trimming)
    if statistic > _FAR:
        return _tail(statistic, q, time)
    points, first, second = _chebyshev(_NODES)
    x = statistic * (1 + points) / 2
    slope, bend = 2 / statistic * first, (2 / statistic) ** 2 * second
    generator = 2 * x[:, None] * bend + (q - x)[:, None] * slope
    inside = slice(1, None)  # the first node is the bound itself, where the path is lost
    stays = np.append(0.0, expm(time * generator[inside, inside]) @ np.ones(_NODES))
    return float(np.clip(1 - _expected(stays, points, statistic, q), 0.0, 1.0))


def _expected(values: Array, points: Array, statistic: float, q: int) -> float:
    """Integral over (0, statistic) of a function given on the grid against the chi-square density at the start."""
    nodes, weights = roots_jacobi(_NODES, 0.0, q / 2 - 1)
    coefficients = np.polynomial.chebyshev.chebfit(points, values, _NODES)
    x = statistic * (1 + nodes) / 2
    scaled = np.exp((q / 2) * log(statistic / 4) - lgamma(q / 2) - x / 2)
    return float((weights * scaled) @ np.polynomial.chebyshev.chebval(nodes, coefficients))


@lru_cache
def _chebyshev(count: int) -> tuple[Array, Array, Array]:
    """Points from 1 down to -1 (count + 1,), and the matrices of the first and second derivative (Trefethen, 2000)."""
    points = np.cos(np.pi * np.arange(count + 1) / count)
    ends = np.ones(count + 1)
    ends[[0, -1]] = 2.0
    ends *= (-1.0) ** np.arange(count + 1)
    gaps = points[:, None] - points[None, :] + np.eye(count + 1)
    first = np.outer(ends, 1 / ends) / gaps
    first -= np.diag(first.sum(axis=1))
    return points, first, first @ first


def _tail(statistic: float, q: int, time: float) -> float:
    """Leading terms of the tail (DeLong, 1981): accurate where the chance is very small."""
    density = exp((q / 2) * log(statistic) - statistic / 2 - (q / 2) * log(2) - lgamma(q / 2))
    return density * (time * (1 - q / statistic) + 2 / statistic)
