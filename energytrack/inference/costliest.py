"""What a test's distance is spent on: the one source of scatter, or the one condition, that adds most to the variance.

Each is taken away in turn: a source of noise by setting it to next to nothing, a condition by holding its effect for
known, the price of estimating the noise by holding the noise for known.
"""

from __future__ import annotations

import numpy as np

from energytrack.consumption.terms import condition_of
from energytrack.inference.ahead import shift_variance
from energytrack.inference.distance import Course
from energytrack.inference.graded import together_named
from energytrack.inference.model import Model
from energytrack.inference.noise import Array

SOURCES = ("trip", "filling", "drift-weeks", "drift-seasons")  # in the order of theta
UNKNOWN_NOISE = "unknown-noise"
_TO_NOTHING = np.log(0.01)  # on a log standard deviation
_KNOWN = 1e9  # precision of an effect held for known


def cost_shares(model: Model, here: Course, count: int) -> dict[str, float]:
    """By how much of itself the variance after `count` segments would fall without each; {} where it is infinite.

    The shares overlap, so they need not add up to one: trips that scatter less would also tell the effect of the
    weather sooner.
    """
    variance = float(here.variances[count])
    if not np.isfinite(variance):
        return {}
    ahead, theta = here.road, model.fit.theta
    without = {
        source: ahead.variance(count, theta + step)
        for source, step in zip(SOURCES, _TO_NOTHING * np.eye(4), strict=True)
    }
    normal = ahead.normals(theta)[count]
    for name, columns in _effects(model).items():
        without[name] = float(shift_variance(_held(normal, columns)[None], ahead.base, ahead.ratio)[0])
    shares = {name: 1 - less / variance for name, less in without.items()}
    return shares | {UNKNOWN_NOISE: 1 - 1 / here.price(count)}


def _effects(model: Model) -> dict[str, list[int]]:
    """Columns of the road's design by condition, and of each other modification."""
    found: dict[str, list[int]] = {}
    names = [*map(condition_of, model.terms.names), *map(together_named, model.others)]
    for column, name in enumerate(names, start=2):  # after the level and the modification asked about
        found.setdefault(name, []).append(column)
    return found


def _held(normal: Array, columns: list[int]) -> Array:
    held = normal.copy()
    held[columns, columns] += _KNOWN
    return held
