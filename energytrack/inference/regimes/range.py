"""The range of places in which a found break may lie, from what the regression knows about each place near it."""

from __future__ import annotations

import numpy as np

from energytrack.inference.noise import Array, Scatter
from energytrack.inference.regimes.breaks import Search
from energytrack.inference.regimes.dates import argmax_quantile

_INSIDE = np.arange(0.0, 2.0, 0.1)  # segments from the break; farther ones are whole
_FARTHEST = 100  # distances tried beyond those, ever more apart in a long log


def place_range(
    search: Search, scatter: Scatter, place: float, effects: Array, confidence: float
) -> tuple[float, float]:
    """First and last place (in segments) at which the break may lie (Bai, 1997).

    effects (q,): what breaks there, in the regression's units. Moving the break by v costs the residual sum
    (s_v - s)' V^-1 (s_v - s) on average, s being what the break adds to each segment; Bai's quantile is of that
    sum, so that it holds for errors of any covariance and for segments of unequal length.
    """
    count = len(search.observed)
    far = np.unique(np.geomspace(2.0, max(count, 3), _FARTHEST).round())
    distance = np.concatenate([_INSIDE, far])
    bound = argmax_quantile((1 - confidence) / 2)
    ends = []
    for sign, room in ((-1.0, place), (1.0, count - place)):
        tried = np.append(distance[distance < room], room)
        cost = _costs(search, scatter, place + sign * tried, effects)
        ends.append(place + sign * _first_beyond(tried, cost, bound))
    return float(ends[0]), float(ends[1])


def _costs(search: Search, scatter: Scatter, places: Array, effects: Array) -> Array:
    """Cost (K,) of moving a break with these effects from the first place to each of the places."""
    cross = search.cross(scatter, places)
    q, count = search.width, len(places)
    own = slice(cross.own, cross.own + q * count)
    between = np.einsum("kalb,a,b->kl", cross.cross[own, own].reshape(count, q, count, q), effects, effects)
    cost: Array = np.diag(between) - 2 * between[0] + between[0, 0]
    return cost


def _first_beyond(distance: Array, cost: Array, bound: float) -> float:
    """The distance at which the cost first exceeds the bound; the last one where it never does."""
    beyond = np.flatnonzero(cost > bound)
    if not len(beyond):
        return float(distance[-1])
    k = int(beyond[0])
    return float(np.interp(bound, cost[k - 1 : k + 1], distance[k - 1 : k + 1])) if k else 0.0
