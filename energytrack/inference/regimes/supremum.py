"""How often the largest of many correlated chi-square statistics exceeds a bound, when there is nothing to find.

Candidates for a break are tried by the dozen and the best is taken. Under no break their standardised effects are
jointly normal with a correlation that the regression knows, so the chance that the best exceeds c is a plain integral.
It is found by importance sampling that starts from one exceeding candidate (Naiman and Priebe, 2001), as accurate for
a chance of one in a million as for one in twenty, with a fixed seed.
"""

from __future__ import annotations

import numpy as np
from scipy.special import chdtrc, chdtri

from energytrack.inference.noise import Array

_DRAWS, _FEW_DRAWS = 4_000, 500  # right to about 3 % and 8 %
_PLAINLY_USUAL = 0.2  # a chance that few draws are enough for
_SEED = 19  # any: fixed, so that one log has one answer
_SMALLEST = 1e-300
_NODES, _WEIGHTS = np.polynomial.hermite_e.hermegauss(81)
_WEIGHTS = _WEIGHTS / _WEIGHTS.sum()


def chance(rows: Array, bound: float) -> float:
    """P(max over k of |rows_k xi|^2 > bound) for rows (K, q, m), each group orthonormal, and unit normal xi (m,)."""
    count, width = rows.shape[:2]
    alone = float(chdtrc(width, bound))
    if count == 1 or alone < _SMALLEST:
        return alone
    found = 1.0
    for draws in (_FEW_DRAWS, _DRAWS):
        found = min(1.0, count * alone * _mean_share(rows, bound, alone, draws))
        if found > _PLAINLY_USUAL:
            break
    return found


def _mean_share(rows: Array, bound: float, alone: float, draws: int) -> float:
    """Mean of 1 / (number of statistics beyond the bound) over draws in which one, each in turn, is beyond it."""
    count, width, size = rows.shape
    rng = np.random.default_rng(_SEED)
    first = np.arange(draws) * count // draws if count <= draws else rng.integers(count, size=draws)
    direction = rng.standard_normal((draws, width))
    direction /= np.linalg.norm(direction, axis=1, keepdims=True)
    radius = np.sqrt(chdtri(width, alone * rng.uniform(size=draws)))
    noise = rng.standard_normal((draws, size))
    own = rows[first]
    noise += np.einsum("dqm,dq->dm", own, radius[:, None] * direction - np.einsum("dqm,dm->dq", own, noise))
    reached = ((noise @ rows.reshape(-1, size).T).reshape(draws, count, width) ** 2).sum(axis=2)
    exceeding = np.maximum((reached > bound).sum(axis=1), 1)  # the first one does, up to rounding
    return float(np.mean(1 / exceeding))


def as_if_known(statistic: float, width: int, freedom: float) -> float:
    """The chi-square statistic of known noise that is as unusual as this one of noise estimated with `freedom`.

    The log variance is taken as normal with variance 2 / freedom, as it is for the bounds of `enough`.
    """
    tail = float(_WEIGHTS @ chdtrc(width, statistic * np.exp(-np.sqrt(2 / freedom) * _NODES)))
    return float(chdtri(width, max(tail, _SMALLEST)))
