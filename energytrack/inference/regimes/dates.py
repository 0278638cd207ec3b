"""How well a break is dated: the limits between which it lies (Bai, 1997).

Around the true break the residual sum behaves like a two-sided Brownian motion with drift, and the break's estimate
like the place of its maximum. The law of that place has closed pieces; limits are its quantiles.
"""

from __future__ import annotations

from functools import lru_cache
from math import exp, pi, sqrt

from scipy.integrate import quad
from scipy.optimize import brentq

_FAR = 1e4


@lru_cache(maxsize=64)
def argmax_quantile(chance: float, slope: float = 1.0, variance: float = 1.0) -> float:
    """s with P(place of the maximum > s) = chance, s > 0, for W1(-s) - |s| / 2 to the left of zero and
    sqrt(variance) W2(s) - slope s / 2 to the right.

    11.0 for a chance of 0.025 and equal sides: the published quantile of Bai (1997) and Yao (1987). 0.0 where even
    s = 0 is exceeded less often.
    """
    if beyond(1e-9, slope, variance) <= chance:
        return 0.0
    return float(brentq(lambda s: beyond(s, slope, variance) - chance, 1e-9, _FAR * max(1.0, variance / slope**2)))


def beyond(place: float, slope: float = 1.0, variance: float = 1.0) -> float:
    """P(place of the maximum > place) on the right side, place > 0.

    The maximum of the left side is exponential with rate 1, what the right side rises beyond its value at `place` with
    rate slope / variance; the joint density of that value and the maximum before it is elementary (reflection), and
    depends on their sum r alone once the two are put together.
    """
    rate, drift = slope / variance, slope / 2
    scale = 2 / sqrt(2 * pi * (variance * place) ** 3)

    def density(r: float) -> float:
        height = r - rate / (1 + rate) * (1 - exp(-r))
        return scale * r * height * exp(-((r + drift * place) ** 2) / (2 * variance * place))

    width = sqrt(variance * place)
    return float(quad(density, 0.0, 12 * width, epsabs=1e-13, limit=200)[0])


def limits(
    shift_squared: tuple[float, float], noise_squared: tuple[float, float], confidence: float
) -> tuple[float, float]:
    """How far before and after its estimate the true break may lie, in observations.

    shift_squared: d' Q d before and after the break, for a shift d and mean squares Q of the columns; noise_squared:
    the same with the mean squares of columns times errors. In the order before, after; both limits are positive.
    """
    tail = (1 - confidence) / 2
    (before, after), (noise_before, noise_after) = shift_squared, noise_squared
    unit = noise_before / before**2  # of time on the left side, in observations
    slope, variance = after / before, noise_after / noise_before
    own_time = variance / slope**2  # of the right side: measured in it and in its own height, the left is the other
    left = own_time * argmax_quantile(tail, 1 / slope, 1 / variance)
    return unit * argmax_quantile(tail, slope, variance), unit * left  # late estimates mean an earlier break
