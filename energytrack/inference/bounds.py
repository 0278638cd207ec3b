"""How sure is sure enough when someone looks after every fill-up.

The estimate's standardised path over the information gathered is a Brownian motion (Lan and Wittes, 1988). The bound is
the continuous limit of O'Brien and Fleming (1979): looking at any number of moments keeps the error below alpha.

The noise is estimated too. Its sizes are known as log-normal quantities (reml.py), so the standardised estimate is a
normal with a log-normal variance; quantiles are taken from that mixture. Student's t with the same Satterthwaite
degrees of freedom assumes an inverse chi-square variance, whose tail is longer: docs/evidence.md compares the two.
"""

from __future__ import annotations

from functools import lru_cache
from math import exp, expm1, fsum, pi, sin, sqrt

import numpy as np
from scipy.optimize import brentq
from scipy.special import log_ndtr, ndtr, ndtri

from energytrack.errors import InferenceError

_SERIES = 200
_SMALLEST_TAIL = 1e-200
_NODES, _WEIGHTS = np.polynomial.hermite_e.hermegauss(81)
_WEIGHTS = _WEIGHTS / _WEIGHTS.sum()


@lru_cache
def level(alpha: float) -> float:
    """b with P(sup over [0, 1] of |Brownian motion| > b) = alpha; 2.2414 at 0.05 (Feller, 1971, X.5)."""
    if not 0 < alpha < 1:
        raise InferenceError(f"confidence must lie between 0 and 1, not {1 - alpha:g}: 0.95 is usual")
    return float(brentq(lambda b: _crossing(b) - alpha, 0.2, 10.0, xtol=1e-13))


def _crossing(b: float) -> float:
    inside = fsum((-1) ** k / (2 * k + 1) * exp(-((pi * (2 * k + 1) / b) ** 2) / 8) for k in range(_SERIES))
    return 1 - 4 / pi * inside


@lru_cache
def drift(alpha: float, power: float) -> float:
    """theta: standardised true shift found with this power by the end of the test; 2.8807 at 0.05 and 0.80."""
    if not 0 < power < 1:
        raise InferenceError(f"power must lie between 0 and 1, not {power:g}: 0.8 is usual")
    if power <= alpha:
        raise InferenceError(f"power {power:g} must exceed the error rate {alpha:g}: 0.8 is usual")
    b = level(alpha)

    def found(theta: float) -> float:  # the chance of crossing +b by time 1 (reflection with drift)
        return float(ndtr(theta - b)) + exp(2 * b * theta + float(log_ndtr(-b - theta)))

    return float(brentq(lambda theta: found(theta) - power, 0.0, 40.0, xtol=1e-12))


def critical(information: float, freedom: float, alpha: float) -> float | None:
    """Look-proof bound on |estimate| / standard error at a share of the information; None beyond any number.

    The normal bound b / sqrt(share) is turned into a tail probability and read off the mixture for `freedom`.
    """
    return widened(level(alpha) / sqrt(information), freedom) if information > 0 else None


def widened(known: float, freedom: float) -> float | None:
    """A bound on |z| for known noise as one for noise estimated with `freedom`; None beyond any number."""
    tail = float(ndtr(-known))
    return mixture_quantile(tail, freedom) if tail > _SMALLEST_TAIL else None


def price(freedom: float, alpha: float) -> float:
    """Factor by which not knowing the noise widens the final bound: 1 when it is known."""
    return mixture_quantile(float(ndtr(-level(alpha))), freedom) / level(alpha)


def mixture_quantile(tail: float, freedom: float) -> float:
    """c with P(Z > c) = tail for Z normal with variance exp(sqrt(2 / freedom) N), N standard normal.

    2 / freedom is the variance of a log variance as Satterthwaite (1946) matches it.
    """
    known = -float(ndtri(tail))

    def excess(c: float) -> float:
        return mixture_tail(c, freedom) - tail

    upper = known
    while excess(upper) > 0:
        upper *= 1.5
    return float(brentq(excess, known / 2, upper, xtol=1e-10))


def mixture_tail(c: float, freedom: float) -> float:
    """P(Z > c) for the Z of mixture_quantile."""
    half = sqrt(2 / freedom) / 2
    return float(_WEIGHTS @ ndtr(-c * np.exp(-half * _NODES)))


@lru_cache
def expected_share(alpha: float, power: float) -> float:
    """Mean share of the information used until the test stops, when the true shift equals the target.

    Time until Brownian motion with drift theta leaves (-b, b) or reaches 1, from the eigenfunction series of the
    survival probability (Darling and Siegert, 1953), integrated term by term.
    """
    b, theta = level(alpha), drift(alpha, power)
    total = 0.0
    for k in range(1, _SERIES):
        rate = 0.5 * (theta**2 + (k * pi / (2 * b)) ** 2)
        weight = k * pi / (2 * b) ** 2 * sin(k * pi / 2) / rate  # of exp(-rate t), for a start in the middle
        edges = exp(theta * b) - (-1) ** k * exp(-theta * b)
        total += weight * edges * -expm1(-rate) / rate
    return total
