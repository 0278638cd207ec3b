"""Changes nobody declared: how often is one reported that is not there, and how often is one found that is?"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.oddities import set_aside
from energytrack.inference.regimes.breaks import find_breaks
from energytrack.inference.regimes.describe import breaks_of
from tests.evidence import goals
from tests.evidence.block import Block
from tests.evidence.logs import Job, by_kind, sample
from tests.evidence.measure import proportion, rate
from tests.simulation import simulate
from tests.uses import STEADY_COMMUTE, Use

FIRST_SEED = 60_000
STEP = 5.0  # percent
DRIFTS = ((1.0, 1.0), (2.0, 1.0), (1.0, 2.0), (2.0, 2.0))  # of weeks and of seasons, percent
HEADING = (
    "kind of use",
    "no change: one reported",
    "goal",
    "verdict",
    "step: found",
    "step: its place in the range",
    "step: its size in the range",
    "on and off again: found",
)


@dataclass(frozen=True)
class Reports:
    """What was reported on one log, drawn three times over with the same noise."""

    use: str
    false_alarm: bool
    found: bool
    place_held: bool | None  # None: the step was not found as one break
    size_held: bool | None
    both_found: bool  # places of on and off lie inside the ranges of two breaks


def drifting_uses() -> tuple[Use, ...]:
    """A steady commute with the drifts a log may well have."""
    return tuple(
        replace(
            STEADY_COMMUTE, vehicle=f"drift {weeks:g} and {seasons:g} %", drift_weeks_percent=weeks,
            drift_seasons_percent=seasons,
        )
        for weeks, seasons in DRIFTS
    )  # fmt: skip


def reports(job: Job) -> Reports:
    still, _ = _ranges(job, 0.0, (0.6,))
    stepped, places = _ranges(job, STEP, (0.6,))
    swapped, both = _ranges(job, STEP, (0.35, 0.65))
    one = stepped[0] if len(stepped) == 1 else None
    return Reports(
        job.use.vehicle,
        len(still) > 0,
        len(stepped) > 0,
        None if one is None else _inside(one[0], places[0]),
        None if one is None or one[1] is None else _inside(one[1], STEP),
        len(swapped) == 2 and all(_inside(each[0], km) for each, km in zip(swapped, both, strict=True)),
    )


Range = tuple[float, float]


def _ranges(
    job: Job, shift: float, switches: tuple[float, ...]
) -> tuple[list[tuple[Range, Range | None]], list[float]]:
    """Ranges of place and size of every break reported, and where the changes truly were (km)."""
    use = replace(job.use, shift_percent=shift, switches=switches)
    log = simulate(use, np.random.default_rng(job.seed))
    observed = set_aside(observe_frames(log.entries, None, unit=use.unit, capacity=use.capacity)[0]).kept
    breaks = breaks_of(find_breaks(observed, declared=False), (), (), 0.95)
    places = log.modifications[["fitted_km", "removed_km"]].to_numpy().ravel()
    return [(one.interval_km, one.interval_percent) for one in breaks], places[~np.isnan(places)].tolist()


def _inside(ends: Range, value: float) -> bool:
    return ends[0] <= value <= ends[1]


def block(name: str, results: list[Reports], uses: tuple[Use, ...], logs: int) -> Block:
    rows = tuple(_row(kind, of_kind) for kind, of_kind in by_kind(results, uses).items())
    return Block(name, "", sample(uses, logs, FIRST_SEED), HEADING, rows)


def _row(name: str, results: list[Reports]) -> tuple[str, ...]:
    return (
        name,
        rate(one.false_alarm for one in results),
        goals.FALSE_ALARMS.words,
        goals.FALSE_ALARMS.verdict(proportion(one.false_alarm for one in results)),
        rate(one.found for one in results),
        rate(one.place_held for one in results if one.place_held is not None),
        rate(one.size_held for one in results if one.size_held is not None),
        rate(one.both_found for one in results),
    )
