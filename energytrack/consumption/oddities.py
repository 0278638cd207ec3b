"""Segments that stand far from what their own neighbours predict, set aside by a rule fixed in advance.

The rule knows nothing of modifications. Consumption is adjusted for temperature, speed and season by a robust fit of
local differences (Huber 1964), then held against the median of the five segments before and, apart, of the five after.
Only what stands off from both sides in the same direction is odd: after a lasting shift a segment agrees with one of
them. Scale: median absolute deviation (Rousseeuw and Croux 1993), each segment by its length.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from energytrack.consumption.averages import LEAST_KNOWN_SHARE, Array
from energytrack.consumption.conditions import choose, fill
from energytrack.consumption.observations import Observations

LIMIT_SD = 4.0
FEWEST = 10  # segments before any is judged
NEIGHBOURS = 5  # on each side
MAD_TO_SD = 1.4826  # for a normal distribution
LEAST_SCATTER = 0.01  # of consumption: a short or rounded record can look steadier than it is
_PLACES = np.delete(np.arange(2 * NEIGHBOURS + 1), NEIGHBOURS)  # of the neighbours in a window around each segment
_PARTNER_SD = 2.0  # of the other half of a pair, in the opposite direction
_MERGED_SD = 2.5  # a pair taken together must be as usual
_HUBER = 1.345  # 95 % efficient for normal scatter
_ROUNDS = 6
_SETTLED = 1e-3  # of consumption: a response that moves by less is as good as found


@dataclass(frozen=True)
class Judgement:
    """How each of n segments compares with its neighbours; nan while too few are there."""

    expected: Array  # (n,) energy per km its neighbours predict at its conditions
    sd: Array  # (n,) robust sd of the segment's consumption, energy per km
    deviation_sd: Array  # (n,) from the nearer of the two sides, 0 where it lies between them


@dataclass(frozen=True)
class Odd:
    """One segment set aside, or a pair merged because the level (or the place) between the two does not fit."""

    segment: int  # the first of a pair
    deviation_sd: float  # of a pair: of the odder one, with the sign of the first
    is_pair: bool


@dataclass(frozen=True)
class Sorted:
    """A log without what is odd in it."""

    kept: Observations
    odd: tuple[Odd, ...]
    judgement: Judgement
    newest_kept: bool


def judge(observed: Observations, covariates: Sequence[str] = ()) -> Judgement:
    """Hold every segment against its neighbours. Linear in the number of segments."""
    count = len(observed)
    if count < FEWEST:
        unknown = np.full(count, np.nan)
        return Judgement(unknown, unknown, np.zeros(count))
    consumption, weight = observed.energy / observed.distance_km, observed.distance_km
    shape = _shape(observed.distance_km)
    response = _response(observed, consumption, shape, covariates)
    adjusted = consumption - response
    before, after = _sides(adjusted, weight)
    around = _around(adjusted, weight)
    usual = _median(consumption)
    scatter = MAD_TO_SD * _median(np.abs(adjusted - around) / shape) * count / (count - 0.8)
    sd = max(scatter, LEAST_SCATTER * usual) * shape
    below, above = adjusted - before, adjusted - after
    nearer = np.where(np.abs(below) < np.abs(above), below, above)
    deviation = np.where(below * above > 0, nearer, 0.0) / sd
    return Judgement(around + response, sd, deviation)


def set_aside(observed: Observations, covariates: Sequence[str] = ()) -> Sorted:
    """The log without its odd segments: a single one is void and its link cut, a pair is merged into one."""
    judgement = judge(observed, covariates)
    odd = _odd(observed, judgement)
    if not odd:
        return Sorted(observed, (), judgement, True)
    group = np.zeros(len(observed), dtype=np.int64)
    for each in odd:
        group[each.segment] = -1
        if each.is_pair:
            group[each.segment] = 0
            group[each.segment + 1] = 1  # belongs to the one before
    return Sorted(_regrouped(observed, group), odd, judgement, bool(group[-1] >= 0))


def _shape(distance: Array) -> Array:
    """Relative sd of consumption by length: half trips (variance ~ 1/d), half levels (~ 1/d^2) at the usual length."""
    relative = _median(distance) / distance
    shape: Array = np.sqrt((relative + relative**2) / 2)
    return shape


def _response(observed: Observations, consumption: Array, shape: Array, covariates: Sequence[str]) -> Array:
    """What the conditions contribute to each segment's consumption (n,), up to a constant.

    Fitted to the differences from the neighbours' mean conditions, so that no lasting shift can bend it.
    """
    conditions = fill(observed)
    terms = choose(observed, conditions, covariates)
    columns = terms.columns(conditions)
    if columns.shape[1] == 0:
        return np.zeros(len(consumption))
    weight = observed.distance_km
    local = columns - _local_means(columns, weight)
    difference = consumption - _around(consumption, weight)
    usual = _median(consumption)
    held = np.diag(1 / (terms.prior_sd * usual) ** 2)
    foreseen = held @ (terms.prior_mean * usual)
    slopes: Array = np.zeros(columns.shape[1])
    least = LEAST_SCATTER * usual
    for _ in range(_ROUNDS):
        residual = (difference - local @ slopes) / shape
        size = np.abs(residual)
        scale = max(MAD_TO_SD * _median(size), least)
        trust = np.minimum(1.0, _HUBER * scale / np.maximum(size, 1e-300)) / (scale * shape) ** 2
        weighted = (local * trust[:, None]).T
        explained = weighted @ difference + foreseen
        before, slopes = slopes, np.asarray(np.linalg.solve(weighted @ local + held, explained), dtype=np.float64)
        if np.abs(slopes - before).max() < _SETTLED * usual:
            break
    response: Array = columns @ slopes
    return response


def _sides(values: Array, weight: Array) -> tuple[Array, Array]:
    """Weighted medians (n,) of the neighbours before and after.

    Where a side is empty, the single segment next to it stands in: the newest one is odd only where it differs from
    the five before it and from the last of them, so that the second segment after a shift already agrees.
    """
    near_values, near_weight = _neighbours(values, np.nan), _neighbours(weight, 0.0)
    before = _medians(near_values[:, :NEIGHBOURS], near_weight[:, :NEIGHBOURS])
    after = _medians(near_values[:, NEIGHBOURS:], near_weight[:, NEIGHBOURS:])
    before[0], after[-1] = values[1], values[-2]
    return before, after


def _around(values: Array, weight: Array) -> Array:
    """Weighted median (n,) of the neighbours on both sides."""
    return _medians(_neighbours(values, np.nan), _neighbours(weight, 0.0))


def _neighbours(values: Array, padding: float) -> Array:
    """The five before and the five after each value (n, 10)."""
    padded = np.full(len(values) + 2 * NEIGHBOURS, padding)
    padded[NEIGHBOURS:-NEIGHBOURS] = values
    near: Array = padded[np.arange(len(values))[:, None] + _PLACES]
    return near


def _local_means(columns: Array, weight: Array) -> Array:
    """Weighted mean of the neighbours of each segment, for each column (n, k)."""
    near = _neighbours(weight, 0.0)
    summed = [(_neighbours(column, 0.0) * near).sum(axis=1) for column in columns.T]
    means: Array = (np.array(summed) / near.sum(axis=1)).T
    return means


def _median(values: Array) -> float:
    """As numpy's, without its care for nan: this one is asked for hundreds of times an answer."""
    ordered, half = np.sort(values), len(values) // 2
    return float(ordered[half] if len(values) % 2 else (ordered[half - 1] + ordered[half]) / 2)


def _medians(values: Array, weight: Array) -> Array:
    """Weighted median of each row; between the two middle values where half of the weight is reached exactly."""
    order = np.argsort(values, axis=1)  # nan, of weight 0, last
    ordered = np.take_along_axis(values, order, axis=1)
    covered = np.cumsum(np.take_along_axis(weight, order, axis=1), axis=1)
    half = covered[:, -1:] / 2
    low = np.argmax(covered >= half * (1 - 1e-12), axis=1)
    high = np.argmax(covered > half * (1 + 1e-12), axis=1)
    rows = np.arange(len(values))
    medians: Array = (ordered[rows, low] + ordered[rows, high]) / 2
    return medians


def _odd(observed: Observations, judgement: Judgement) -> tuple[Odd, ...]:
    """What stands out and was not confirmed, in driving order."""
    found: list[Odd] = []
    used: set[int] = set()
    beyond = np.flatnonzero((np.abs(judgement.deviation_sd) > LIMIT_SD) & ~observed.confirmed)
    for segment in beyond.tolist():
        if segment in used:
            continue
        first = _pair(observed, judgement, segment, used)
        members = [segment] if first is None else [first, first + 1]
        used.update(members)
        worst = float(np.abs(judgement.deviation_sd[members]).max())
        own = observed.energy[members[0]] - judgement.expected[members[0]] * observed.distance_km[members[0]]
        found.append(Odd(members[0], float(np.copysign(worst, own)), first is not None))
    return tuple(sorted(found, key=lambda odd: odd.segment))


def _pair(observed: Observations, judgement: Judgement, segment: int, used: set[int]) -> int | None:
    """First of the two linked segments that are odd in opposite directions by about the same energy."""
    fits = []
    for first in (segment - 1, segment):
        if first < 0 or first + 1 >= len(observed) or not observed.linked[first + 1] or {first, first + 1} & used:
            continue
        if observed.confirmed[first : first + 2].any():
            continue
        pair = slice(first, first + 2)
        distance, scatter = observed.distance_km[pair], judgement.sd[pair]
        excess = observed.energy[pair] - judgement.expected[pair] * distance
        relative = excess / (scatter * distance)
        merged = abs(excess.sum()) / float(np.hypot(*(scatter * distance)))
        if relative[0] * relative[1] < 0 and np.abs(relative).min() >= _PARTNER_SD and merged <= _MERGED_SD:
            fits.append((merged, first))
    return min(fits)[1] if fits else None


def _regrouped(observed: Observations, group: NDArray[np.int64]) -> Observations:
    """Segments of group -1 left out, those of group 1 joined to the one before; energy and distance are conserved."""
    stays = np.flatnonzero(group >= 0)
    starts = np.flatnonzero(group[stays] == 0)  # first of each run, among those that stay
    first = stays[starts]
    last = stays[np.append(starts[1:], len(stays)) - 1]
    weight = observed.distance_km[stays]
    total = np.add.reduceat(weight, starts) if len(starts) else weight
    cut = np.zeros(len(group), dtype=np.bool_)
    cut[1:] = group[:-1] == -1
    start_day = 2 * observed.mid_day - observed.end_day
    conditions, known_share = {}, {}
    for name, values in observed.conditions.items():
        known = observed.known_share[name][stays] * weight
        covered = _sums(known, starts)
        known_share[name] = covered / total
        mean = np.full(len(first), np.nan)
        summed = _sums(np.where(np.isnan(values[stays]), 0.0, values[stays]) * known, starts)
        counted = _sums(np.where(np.isnan(values[stays]), 0.0, known), starts)
        np.divide(summed, counted, out=mean, where=(known_share[name] >= LEAST_KNOWN_SHARE) & (counted > 0))
        conditions[name] = np.where(first == last, values[first], mean)

    def joined(shares: Array) -> Array:
        weighted = shares[stays] * weight[:, None]
        mean = np.add.reduceat(weighted, starts, axis=0) / total[:, None] if len(starts) else weighted
        return np.where((first == last)[:, None], shares[first], mean)

    return replace(
        observed,
        distance_km=total,
        energy=_sums(observed.energy[stays], starts),
        mid_day=(start_day[first] + observed.end_day[last]) / 2,
        start_km=observed.start_km[first],
        end_km=observed.end_km[last],
        end_day=observed.end_day[last],
        linked=observed.linked[first] & ~cut[first],
        start_weight=observed.start_weight[first],
        end_weight=observed.end_weight[last],
        conditions=conditions,
        known_share=known_share,
        shares=joined(observed.shares),
        fitted=joined(observed.fitted),
        levels=observed.levels[last],
        entry=observed.entry[last],
        confirmed=observed.confirmed[first],
    )


def _sums(values: Array, starts: NDArray[np.int64]) -> Array:
    return np.add.reduceat(values, starts) if len(starts) else values[:0]
