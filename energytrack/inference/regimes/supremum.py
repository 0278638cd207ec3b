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

_DRAWS = 4_000  # right to about 3 %
_SEED = 19  # any: fixed, so that one log has one answer
_SMALLEST = 1e-300
_NODES, _WEIGHTS = np.polynomial.hermite_e.hermegauss(81)
_WEIGHTS = _WEIGHTS / _WEIGHTS.sum()


def chance(rows: Array, bound: float) -> float:
    """P(max over k of |rows_k xi|^2 > bound) for rows (K, q, m), each group orthonormal, and unit normal xi (m,)."""
    count, width, size = rows.shape
    alone = float(chdtrc(width, bound))
    if count == 1 or alone < _SMALLEST:
        return alone
    rng = np.random.default_rng(_SEED)
    first = np.arange(_DRAWS) * count // _DRAWS if count <= _DRAWS else rng.integers(count, size=_DRAWS)
    direction = rng.standard_normal((_DRAWS, width))
    direction /= np.linalg.norm(direction, axis=1, keepdims=True)
    radius = np.sqrt(chdtri(width, alone * rng.uniform(size=_DRAWS)))
    noise = rng.standard_normal((_DRAWS, size))
    own = rows[first]
    noise += np.einsum("dqm,dq->dm", own, radius[:, None] * direction - np.einsum("dqm,dm->dq", own, noise))
    reached = ((noise @ rows.reshape(-1, size).T).reshape(_DRAWS, count, width) ** 2).sum(axis=2)
    exceeding = np.maximum((reached > bound).sum(axis=1), 1)  # the first one does, up to rounding
    found: float = count * alone * float(np.mean(1 / exceeding))
    return min(1.0, found)


def as_if_known(statistic: float, width: int, freedom: float) -> float:
    """The chi-square statistic of known noise that is as unusual as this one of noise estimated with `freedom`.

    The log variance is taken as normal with variance 2 / freedom, as it is for the bounds of `enough`.
    """
    tail = float(_WEIGHTS @ chdtrc(width, statistic * np.exp(-np.sqrt(2 / freedom) * _NODES)))
    return float(chdtri(width, max(tail, _SMALLEST)))
