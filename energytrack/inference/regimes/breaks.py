"""Breaks found one after another, each a column of the same regression as a declared modification.

A break inflates the drift that is fitted without it, and so hides; noise fitted with the most striking break taken out
is too small where there is none, least of all where there is real drift. The test uses noise between the two (in log
standard deviations), at a place chosen by how often a break is then claimed on drifting logs without any; see
docs/method.md and docs/evidence.md.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference.model import Model, fit_model
from energytrack.inference.noise import Array, Scatter
from energytrack.inference.regimes import places as where
from energytrack.inference.regimes.field import CrossProducts, Field, cross_products
from energytrack.inference.regimes.supremum import as_if_known, chance
from energytrack.inference.shift import shift_along

_NAME = "\x00break"  # no modification that was typed is called so
_TOWARDS = 0.3  # how far the noise of the test lies from that without the break to that with it
_SINGLE = 0.75  # of the error allowed, for the test of one break more
_ROUNDS = 4
_GRAIN, _SAME_PLACE = 0.05, 0.06  # of a place, in segments
_MOST_FREEDOM = 1e6  # degrees of freedom; more are none to speak of


@dataclass(frozen=True)
class Trial:
    """One test for one break more, or two."""

    breaks: int  # already in the regression
    more: int  # tried for at once
    statistic: float  # the largest Wald statistic
    p_value: float
    places: tuple[float, ...]  # where it was reached, in segments
    candidates: int


@dataclass(frozen=True)
class Found:
    """Breaks of a log, and the regression with all of them in it."""

    observed: Observations  # without the breaks
    bare: Model  # without breaks
    model: Model  # with them
    places: tuple[float, ...]  # ascending, in segments
    trials: tuple[Trial, ...]
    search: Search

    def coefficients_of(self, number: int) -> tuple[int, ...]:
        """Of the model's coefficients, those of one break (q,): its level's first."""
        return tuple(_coefficient(self.model, _name(number, k)) for k in range(self.search.width))


@dataclass(frozen=True)
class Search:
    """The log, and how breaks are looked for in it."""

    observed: Observations
    covariates: Sequence[str]
    bare: Model  # fitted without breaks
    terms: Array  # (n, q) what a break switches on: ones, and the terms whose slopes may break
    shortest: int  # segments a regime has at least

    @property
    def width(self) -> int:
        return int(self.terms.shape[1])

    def fit(self, places: Sequence[float], start: Array) -> Model:
        """The regression with breaks at these places (ascending); the last one's level has no prior."""
        after = where.shares(np.array(places), len(self.observed))
        observed = self.observed
        for number in range(len(places)):
            for k, term in enumerate(self.terms.T):
                observed = observed.adding(_name(number, k), after[:, number] * term, after[:, number])
        return fit_model(observed, _name(len(places) - 1, 0), covariates=self.covariates, start=start)

    def cross(self, scatter: Scatter, places: Array) -> CrossProducts:
        """Products of the regression without breaks with candidates at these places (K,)."""
        relative = self.observed.distance_km / self.bare.scale.distance_km
        steps = where.shares(places, len(relative)) * relative[:, None]
        return cross_products(self.bare.problem, scatter, steps[:, :, None] * self.terms[:, None, :])

    def field(self, scatter: Scatter, given: Sequence[float], places: Array) -> Field:
        """What the data say about candidates at `places`, with breaks at the places `given`."""
        known = len(given)
        both = self.cross(scatter, np.concatenate([np.array(given), places]))
        return both.given(range(known), range(known, known + len(places)))


def find_breaks(
    observed: Observations,
    *,
    declared: bool,
    covariates: Sequence[str] = (),
    slopes: bool = False,
    max_breaks: int = 5,
    confidence: float = 0.95,
    trimming: float = 0.15,
    temporary: bool = True,
    start: Array | None = None,
) -> Found:
    """Breaks by tests for one more, given those found, until none is significant.

    declared: the modifications of `observed` are columns of the regression, and only what they do not account for is
    found; otherwise they are left out and found like anything else. slopes: the responses to the conditions may break
    along with the level. temporary: where no single break is significant, look for two at once. start: a guess of the
    log standard deviations (4,), such as another fit's. Needs `places.FEWEST` segments; raises InferenceError where
    columns cannot be told apart.
    """
    own = observed if declared else observed.keeping(())
    bare = fit_model(own, None, covariates=covariates, start=start)
    terms = bare.terms.columns(bare.conditions) if slopes else np.zeros((len(own), 0))
    search = Search(
        own, covariates, bare, np.column_stack([np.ones(len(own)), terms]), where.margin(len(own), trimming)
    )
    model = bare
    found: tuple[float, ...] = ()
    trials: list[Trial] = []
    while len(found) < max_breaks:
        tried = _try_more(search, model, found, max_breaks if temporary else len(found) + 1, 1 - confidence)
        trials += [trial for trial, _ in tried]
        if not tried or trials[-1].p_value > 1 - confidence:
            break
        found, model = _settle(search, tuple(sorted((*found, *trials[-1].places))), tried[-1][1])
    return Found(own, bare, model, found, tuple(trials), search)


def _try_more(
    search: Search, model: Model, found: tuple[float, ...], most: int, alpha: float
) -> list[tuple[Trial, Array]]:
    """The test for one break more and, where that fails, for two at once, with the noise to start the next fit from.

    Two steps in opposite directions, a part on and off again, can hide each other from the first. Most of the error
    allowed goes to the first test (weighted Bonferroni; Genovese, Roeder and Wasserman, 2006).
    """
    tried = []
    free = where.candidates(len(search.observed), search.shortest, found)
    if len(free):
        tried.append(_test(search, model, found, free[:, None], _SINGLE))
    if tried and tried[0][0].p_value > alpha and len(found) + 2 <= most:
        pairs = where.pairs(free, search.shortest)
        if len(pairs):
            tried.append(_test(search, model, found, pairs, 1 - _SINGLE))
    return tried


def _test(
    search: Search, model: Model, found: tuple[float, ...], groups: Array, share: float
) -> tuple[Trial, Array]:
    """The test for breaks at one of the groups (G, s) of places, and the noise (4,) with the most striking one."""
    free, members = np.unique(groups, return_inverse=True)
    members = members.reshape(groups.shape)
    without = model.fit
    striking = groups[int(search.field(without.scatter, found, free).joined(members).gains.argmax())]
    places = sorted((*found, *striking.tolist()))
    fitted = search.fit(places, without.theta)
    between = without.theta + _TOWARDS * (fitted.fit.theta - without.theta)
    field = search.field(Scatter(*np.exp(between).tolist()), found, free).joined(members)
    gains = field.gains
    best = int(gains.argmax())
    freedom = min(_freedom(fitted, places.index(place)) for place in striking.tolist())
    known = as_if_known(float(gains[best]), field.rows.shape[1], freedom)
    p_value = min(1.0, chance(field.unit_rows, known) / share)
    trial = Trial(len(found), groups.shape[1], float(gains[best]), p_value, tuple(groups[best].tolist()), len(groups))
    return trial, fitted.fit.theta


def _freedom(model: Model, number: int) -> float:
    """Satterthwaite's degrees of freedom of one break's level, as of a modification's shift."""
    weights = np.zeros(len(model.fit.coefficients))
    weights[_coefficient(model, _name(number, 0))] = 1.0
    return min(shift_along(model.fit, weights).freedom, _MOST_FREEDOM)


def _settle(search: Search, places: tuple[float, ...], start: Array) -> tuple[tuple[float, ...], Model]:
    """Move each break to its best place given the others (Bai, 1997, repartition), fit the noise again, repeat."""
    model = search.fit(places, start)
    for _ in range(_ROUNDS):
        moved = list(places)
        for number in range(len(moved)):
            others = (*moved[:number], *moved[number + 1 :])
            moved[number] = best_place(search, model.fit.scatter, moved[number], others)
        moved.sort()
        strayed = max(abs(new - old) for new, old in zip(moved, places, strict=True))
        places, model = tuple(moved), search.fit(moved, model.fit.theta)
        if strayed < _SAME_PLACE:
            break
    return places, model


def best_place(search: Search, scatter: Scatter, place: float, others: tuple[float, ...]) -> float:
    """The best place given the other breaks: among all whole ones, then near it, then inside a segment."""
    count, least = len(search.observed), search.shortest
    free = np.union1d(where.candidates(count, least, others), [np.clip(round(place), least, count - least)])
    best = free[int(search.field(scatter, others, free).gains.argmax())]
    step = float(np.diff(free).max(initial=1.0))
    for reach, grain in ((step, 1.0), (1.0, _GRAIN)):
        near = np.arange(max(best - reach, least), min(best + reach, count - least) + grain / 2, grain)
        best = near[int(search.field(scatter, others, near).gains.argmax())]
    return float(best)


def _coefficient(model: Model, name: str) -> int:
    """Index of a column among the coefficients of a model that asks about a break."""
    return 1 if name == model.modification else 2 + len(model.terms.names) + model.others.index(name)


def _name(number: int, term: int) -> str:
    return f"{_NAME} {number} {term}"
