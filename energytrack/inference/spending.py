"""Looks that are counted: each spends some of the error allowed, and only the looks really taken spend it.

The spending function of O'Brien-Fleming type and the bounds it gives are those of Lan and DeMets (1983). Bounds are
found by carrying the density of the paths still inside from look to look (Armitage, McPherson and Rowe, 1969).
"""

from __future__ import annotations

from functools import lru_cache
from math import ceil, log, pi, sqrt

import numpy as np
from scipy.optimize import brentq
from scipy.special import log_ndtr, logsumexp, ndtri, ndtri_exp

from energytrack.inference.noise import Array

SAME_LOOK = 1e-3  # share of the information; a look that adds less is the one before it, seen again
_FEWEST_NODES, _PER_SD = 48, 2.5  # of the integration, and how many in one sd of what a look adds
_BEYOND = 8.0  # standard deviations past the last bound at which nothing is left to find
_LOG_SMALLEST = -460.0  # of a chance; below 1e-200 the bound is beyond any number
_NOTHING = 1e-300


def log_spent(share: float, alpha: float) -> float:
    """Log of the two-sided error spent by a share of the information: all of it, log(alpha), from 1 on."""
    return log(4) + float(log_ndtr(ndtri(alpha / 4) / sqrt(min(share, 1.0)))) if share > 0 else -float("inf")


class Counted:
    """The looks taken so far, in order; asked for the bound of the next."""

    def __init__(self, alpha: float) -> None:
        self._alpha = alpha
        self._share = 0.0  # of the information, at the last look
        self._bound: float | None = None  # on |z|, at the last look
        self._nodes: Array = np.zeros(1)  # of the path at the last look, inside the bound
        self._log_mass: Array = np.zeros(1)  # chance of being near each node and never out before

    def bound(self, share: float) -> float | None:
        """Bound on |z| at a look with this share of the information; None where it is beyond any number."""
        share = min(share, 1.0)
        if share - self._share < SAME_LOOK:
            return self._bound
        before, now = log_spent(self._share, self._alpha), log_spent(share, self._alpha)
        spend = now + log(-np.expm1(before - now))
        step = sqrt(share - self._share)
        edge = self._edge(spend, step) if spend > _LOG_SMALLEST else None
        self._carry(edge if edge is not None else _BEYOND * sqrt(share), step)
        self._share, self._bound = share, None if edge is None else edge / sqrt(share)
        return self._bound

    def _edge(self, spend: float, step: float) -> float:
        """c such that a path still inside moves beyond +-c with a chance of exp(spend)."""

        def excess(c: float) -> float:
            outside = np.logaddexp(log_ndtr((self._nodes - c) / step), log_ndtr((-self._nodes - c) / step))
            return float(logsumexp(self._log_mass + outside)) - spend

        far = float(np.abs(self._nodes).max()) - step * float(ndtri_exp(spend - log(2))) + step
        return float(brentq(excess, 0.0, far, xtol=1e-11))

    def _carry(self, edge: float, step: float) -> None:
        """Move the paths one look on and drop those outside."""
        unit, weights = _rule(ceil(_PER_SD * 2 * edge / step / _FEWEST_NODES) * _FEWEST_NODES)
        nodes: Array = edge * unit
        move = np.exp(-(((nodes[:, None] - self._nodes[None, :]) / step) ** 2) / 2) / (step * sqrt(2 * pi))
        mass = edge * weights * (move @ np.exp(self._log_mass))
        self._nodes, self._log_mass = nodes, np.log(np.maximum(mass, _NOTHING))


@lru_cache(maxsize=32)
def _rule(count: int) -> tuple[Array, Array]:
    """Nodes and weights of Gauss-Legendre integration over (-1, 1)."""
    unit, weights = np.polynomial.legendre.leggauss(count)
    return unit, weights
