"""A monitor begun from a fitted log: the heavy part, run by the commands that fit anyway."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import replace
from math import exp, sqrt

import numpy as np

from energytrack.consumption.conditions import fill
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside
from energytrack.inference.model import Model, fit_model
from energytrack.inference.noise import Array
from energytrack.inference.regimes.places import FEWEST
from energytrack.inference.watch import runs
from energytrack.inference.watch.kept import Column, Watch
from energytrack.inference.watch.monitor import LARGEST_SHARE, Filter, Monitor, Segment, Sum, advance, predict, start
from energytrack.inference.watch.monitor import learn as learned

FALSE_ALARM_EVERY_KM = 50_000.0
WORTH = 0.05  # the shift the sums are built to find
_NEWEST = 200  # segments the monitor starts from
_YARDSTICK = 10  # newest segments that do not count in the noise they are held against
_RECENT = 20  # segments that tell how the vehicle is driven now
_AFTER = 10  # segments over which the effect of a shift is averaged
_HORIZON = 400
_VAGUE = 100.0  # variance of the level before anything is known
_UNKNOWN = 0.2  # prior sd of a modification's shift, as in inference/model.py


def begin(
    observed: Observations,
    events_km: Sequence[float] = (),
    *,
    false_alarm_every_km: float = FALSE_ALARM_EVERY_KM,
    with_delays: bool = False,
) -> Watch | None:
    """The monitor after all of a log's segments, the newest 200 at most; None for fewer than twelve.

    The noise is fitted without the newest ten, so that what is watched does not set its own measure. Segments that
    stand out from their neighbours do not count in it. At each event (odometer positions, km) the level may have moved
    and the sums start anew. `with_delays`: how soon a shift would be told as well. Raises InferenceError where effects
    cannot be told apart.
    """
    recent = observed.part(max(0, len(observed) - _NEWEST), len(observed))
    if len(recent) < FEWEST:
        return None
    model = fit_model(set_aside(recent.head(max(FEWEST, len(recent) - _YARDSTICK))).kept, None)
    return watched(recent, model, false_alarm_every_km, events_km, with_delays=with_delays)


def watched(
    observed: Observations,
    model: Model,
    false_alarm_every_km: float,
    events_km: Sequence[float] = (),
    *,
    with_delays: bool = False,
) -> Watch:
    """The monitor after all segments of `observed`, with the noise, terms and scale of a model fitted to some."""
    names = tuple(name for name in observed.names if np.ptp(observed.shares[:, observed.names.index(name)]) > 0)
    segments = segments_of(observed, model, names)
    noise = (model.fit.scatter.trip, model.fit.scatter.level, model.fit.scatter.weeks, model.fit.scatter.seasons)
    priors = [0.0, *model.terms.prior_mean.tolist(), *[0.0] * len(names)]
    variances = [_VAGUE, *(model.terms.prior_sd**2).tolist(), *[_UNKNOWN**2] * len(names)]
    filtered = _filtered(start(noise, priors, variances), segments)
    effects = WORTH * responses(filtered, segments, _AFTER)
    kept = float(effects.mean() / effects[0])
    recent_km = float(observed.distance_km[-_RECENT:].mean())
    expected = float(effects.mean())
    share = runs.threshold_for(
        expected / 2, max(2.0, false_alarm_every_km / recent_km), _doubt(model, filtered, segments), LARGEST_SHARE
    )
    begun = Monitor(start(noise, priors, variances), Sum(), Sum(), WORTH, kept, share * expected)
    for segment, end_km in zip(segments, observed.end_km.tolist(), strict=True):
        if any(segment.start_km <= place < end_km for place in events_km):
            begun = begun._replace(filter=_loosened(begun.filter), rise=Sum(), fall=Sum())
        begun = advance(begun, segment)
    return Watch(
        monitor=begun,
        columns=_columns(observed, model, names),
        segment_km=model.scale.distance_km,
        segment_energy=model.scale.energy,
        recent_km=recent_km,
        false_alarm_every_km=false_alarm_every_km,
        segments=len(segments),
        end_km=float(observed.end_km[-1]),
        end_date=_iso(observed.end_day[-1]),
        last_energy=float(observed.energy[-1]),
        delays=delays(begun, expected, share, segments, recent_km) if with_delays else (),
    )


def delays(
    monitor: Monitor, expected: float, share: float, segments: Sequence[Segment], recent_km: float
) -> tuple[tuple[float, float | None], ...]:
    """Shift in percent -> km until its alarm on average, both sums at zero before it."""
    found = []
    effects = responses(monitor.filter, segments, _HORIZON)
    for shift in (0.03, 0.05, 0.10):
        running = runs.chances_to_run(expected / 2, share, (shift * effects).tolist(), LARGEST_SHARE * share)
        lost = running[-1] > 0.05
        found.append((100 * shift, None if lost else float(running[:-1].sum()) * recent_km))
    return tuple(found)


def responses(filtered: Filter, segments: Sequence[Segment], count: int) -> Array:
    """What a lasting shift of 100 % adds to the standardised errors of the next `count` average segments."""
    newest = segments[-_RECENT:]
    days = np.diff([segment.day for segment in newest])
    gap = float(np.median(days)) if len(days) else 7.0
    typical = newest[-1]._replace(
        distance=float(np.mean([segment.distance for segment in newest])),
        columns=[1.0, *np.mean([segment.columns[1:] for segment in newest], axis=0).tolist()],
        extra=0.0,
        linked=any(segment.linked for segment in newest),
    )
    level = filtered.mean[0]
    here = filtered._replace(mean=[0.0] * len(filtered.mean))
    found = []
    for number in range(count):
        day = (filtered.day or 0.0) + gap * (number + 1)
        step = typical._replace(day=day, energy=level * typical.distance)
        moved, error, variance, reached = predict(here, step)
        found.append(error / sqrt(variance))
        here = learned(moved, error, variance, reached)
    return np.array(found)


def _filtered(filtered: Filter, segments: Sequence[Segment]) -> Filter:
    for segment in segments:
        filtered = learned(*predict(filtered, segment))
    return filtered


def _loosened(filtered: Filter) -> Filter:
    """The level may have moved as far as a modification moves it."""
    covariance = [list(line) for line in filtered.covariance]
    covariance[0][0] += _UNKNOWN**2
    return filtered._replace(covariance=covariance)


def _doubt(model: Model, filtered: Filter, segments: Sequence[Segment]) -> float:
    """Sd of the log of a prediction error's standard deviation, from that of the noise sizes (delta method)."""
    slopes = []
    last = segments[-1]._replace(day=(filtered.day or 0.0) + 7.0)
    for source in range(4):
        noise = list(filtered.noise)
        noise[source] *= exp(0.1)
        more = _filtered(start((noise[0], noise[1], noise[2], noise[3]), *_prior(model, filtered)), segments[-60:])
        same = _filtered(start(filtered.noise, *_prior(model, filtered)), segments[-60:])
        slopes.append(0.5 * np.log(predict(more, last)[2] / predict(same, last)[2]) / 0.1)
    slope = np.array(slopes)
    return float(np.sqrt(max(0.0, slope @ model.fit.theta_covariance @ slope)))


def _prior(model: Model, filtered: Filter) -> tuple[list[float], list[float]]:
    others = len(filtered.mean) - 4 - len(model.terms.names)
    return (
        [0.0, *model.terms.prior_mean.tolist(), *[0.0] * others],
        [_VAGUE, *(model.terms.prior_sd**2).tolist(), *[_UNKNOWN**2] * others],
    )


def segments_of(observed: Observations, model: Model, names: Sequence[str]) -> list[Segment]:
    conditions = fill(observed)
    known = dict(conditions.values)
    missing = [name for name in model.conditions.values if name not in known]
    if missing:  # a condition of the fit that the newest segments lack
        conditions = replace(conditions, values={**known, **{name: np.full(len(observed), np.nan) for name in missing}})
    terms = np.nan_to_num(model.terms.columns(conditions))
    slopes = model.fit.coefficients[model.term_columns]
    extra = model.terms.variances(conditions) @ slopes**2 if len(slopes) else np.zeros(len(observed))
    places = [observed.names.index(name) for name in names]
    shares = observed.shares[:, places] / np.array([observed.levels[-1, place] for place in places])
    columns = np.hstack([np.ones((len(observed), 1)), terms, shares])
    relative = observed.distance_km / model.scale.distance_km
    start_day = 2 * observed.mid_day - observed.end_day
    return [
        Segment(
            distance=float(relative[k]),
            energy=float(observed.energy[k] / model.scale.energy),
            day=float(observed.mid_day[k]),
            columns=columns[k].tolist(),
            extra=float(extra[k] * relative[k] ** 2),
            linked=bool(observed.linked[k]) and k > 0,
            start_weight=float(observed.start_weight[k]),
            end_weight=float(observed.end_weight[k]),
            start_km=float(observed.start_km[k]),
            start_date=_iso(start_day[k]),
        )
        for k in range(len(observed))
    ]


def _columns(observed: Observations, model: Model, names: Sequence[str]) -> tuple[Column, ...]:
    slopes = model.fit.coefficients[model.term_columns]
    terms = [
        Column(name, "term", float(centre), float(scale), float(slope**2))
        for name, centre, scale, slope in zip(
            model.terms.names, model.terms.centres, model.terms.scales, slopes, strict=True
        )
    ]
    parts = [
        Column(name, "modification", 0.0, float(observed.levels[-1, observed.names.index(name)]), 0.0) for name in names
    ]
    return (*terms, *parts)


def _iso(day: float) -> str:
    return dt.date.fromordinal(round(float(day))).isoformat()
