"""How many breaks: information criteria over the best partition of each number of breaks.

Bayesian criterion (Schwarz, 1978; Yao, 1988) and the stricter one of Liu, Wu and Zidek (1997).
"""

from __future__ import annotations

from math import log, pi

import numpy as np

from energytrack.inference.noise import Array, Scatter
from energytrack.inference.regimes.breaks import Search
from energytrack.inference.regimes.field import CrossProducts
from energytrack.inference.regimes.places import candidates
from energytrack.inference.regimes.results import Criterion
from energytrack.inference.regimes.search import partitions

_LWZ = (0.299, 0.1)  # c0 and delta0 of Liu, Wu and Zidek
_ROUNDS = 5


def bic(residual: float, n: int, parameters: int) -> float:
    """-2 log likelihood at the best variance + parameters log n. Breaks and the variance count as parameters."""
    return n * (log(residual / n) + 1 + log(2 * pi)) + parameters * log(n)


def lwz(residual: float, n: int, parameters: int) -> float:
    """As bic, with a penalty of 0.299 log(n)^2.1 for each parameter."""
    strict, power = _LWZ
    penalty: float = strict * log(n) ** (2 + power)
    return n * (log(residual / n) + 1 + log(2 * pi)) + parameters * penalty


def criteria(search: Search, scatter: Scatter, most: int) -> tuple[Criterion, ...]:
    """For 0, 1, ... `most` breaks: the best partition under this noise, and its criteria.

    The exact partition of the segments as if their errors were independent is the start; then each break is moved to
    its best place given the others under the full covariance, until none moves.
    """
    count, width = len(search.observed), search.width
    free = candidates(count, search.shortest)
    cross = search.cross(scatter, free)
    found = []
    for breaks, start in enumerate(_starts(search, scatter, most)):
        residual = cross.residual(_settled(cross, free, start, search.shortest))
        parameters = cross.own + breaks * (width + 1) + 1
        found.append(Criterion(breaks, residual, bic(residual, count, parameters), lwz(residual, count, parameters)))
    return tuple(found)


def _starts(search: Search, scatter: Scatter, most: int) -> list[tuple[int, ...]]:
    """Breaks of the partitions of adjusted energies, weighted by what is independent in their scatter."""
    problem = search.bare.problem
    relative = problem.columns[:, 0]
    slopes = search.bare.fit.coefficients[1:] if search.width == 1 else np.zeros(problem.columns.shape[1] - 1)
    rest = search.observed.energy / search.bare.scale.energy - problem.columns[:, 1:] @ slopes
    weight = 1 / np.sqrt(scatter.trip**2 * relative + problem.shape.extra + 2 * scatter.level**2)
    found = partitions(rest * weight, search.terms * (relative * weight)[:, None], most=most, shortest=search.shortest)
    return [partition.breaks for partition in found]


def _settled(cross: CrossProducts, free: Array, start: tuple[int, ...], shortest: int) -> list[int]:
    """Candidates, by number, each the best given the others."""
    chosen = [int(np.abs(free - place).argmin()) for place in start]
    for _ in range(_ROUNDS):
        before = list(chosen)
        for number in range(len(chosen)):
            others = chosen[:number] + chosen[number + 1 :]
            apart = np.abs(free[:, None] - free[others]).min(axis=1, initial=np.inf) >= shortest
            among = np.flatnonzero(apart)
            if len(among):
                chosen[number] = int(among[int(cross.given(others, among.tolist()).gains.argmax())])
        if chosen == before:
            break
    return chosen
