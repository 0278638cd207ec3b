"""One vehicle's part of a fleet review, as a worker does it."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from energytrack.consumption.observations import Observations, observe
from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.two_carriers import close_vehicle, two_carriers_of
from energytrack.errors import EnergytrackError
from energytrack.inference.fleet.brief import brief
from energytrack.inference.fleet.deviation import deviation_of
from energytrack.inference.fleet.logs import Packed, VehicleLog, unpack
from energytrack.inference.fleet.results import VehicleReview
from energytrack.inference.question import Question
from energytrack.inference.review.cut import entries_until, fitted_until
from energytrack.inference.review.driven import account, driven, month_shares
from energytrack.inference.review.month import Month
from energytrack.inference.undeclared import Logged

_FAULTS = (EnergytrackError, np.linalg.LinAlgError, ArithmeticError, ValueError)


@dataclass(frozen=True)
class Asked:
    """What is asked of every vehicle. `name`: one modification only. `target`: a ratio; None: as logged, or usual."""

    month: Month
    name: str | None
    target: float | None
    usual_target: float
    confidence: float
    power: float


@dataclass(frozen=True)
class Chunk:
    """Vehicles that one job reviews, so that its overhead is shared."""

    logs: tuple[Packed, ...]
    asked: Asked


def review_chunk(chunk: Chunk) -> list[VehicleReview]:
    """The vehicles of a chunk, in order. One that cannot be answered is a value with its message."""
    return [review(unpack(packed), chunk.asked) for packed in chunk.logs]


def review(log: VehicleLog, asked: Asked) -> VehicleReview:
    """One vehicle's month against its own record, and its modifications."""
    try:
        return _review(log, asked)
    except _FAULTS as fault:
        return VehicleReview(log.vehicle.name, log.vehicle.unit, message=str(fault) or type(fault).__name__)


def _review(log: VehicleLog, asked: Asked) -> VehicleReview:
    segmented, observed = _measured(log)
    until = _until(log, segmented, asked.month)
    known, seen = (segmented, observed) if until is log else _measured(until)
    month = driven(account(known), asked.month, two_carriers_of(log.vehicle))
    row = VehicleReview(
        log.vehicle.name, segmented.unit, distance_km=month.distance_km, energy=month.energy or 0.0
    )
    if not len(observed):
        lacking = "no two entries tell the level they left" if segmented.lacks_levels else "fewer than two known levels"
        return replace(row, message=f"nothing can be measured: {lacking}")
    deviation, why_none, odd = deviation_of(seen, np.array(month_shares(known, asked.month)))
    logged = Logged(log.modifications, log.events)
    return replace(
        row,
        deviation=deviation,
        why_none=why_none if deviation or month.entries else "no entries in the month",
        odd_segments=odd,
        answers=tuple(brief(observed, segmented, logged, question) for question in _questions(log, asked)),
    )


def _measured(log: VehicleLog) -> tuple[SegmentedLog, Observations]:
    segmented = close_vehicle(log.vehicle, log.entries, log.events)
    return segmented, observe(segmented, log.modifications, (), log.weather)


def _until(log: VehicleLog, segmented: SegmentedLog, month: Month) -> VehicleLog:
    """The log as far as the month is concerned; itself where that is all of it."""
    entries = entries_until(segmented, month)
    if len(entries) == len(log.entries):
        return log
    rows = fitted_until(log.modifications, entries, month)
    return replace(log, entries=tuple(entries), modifications=tuple(rows))


def _questions(log: VehicleLog, asked: Asked) -> list[Question]:
    """One for each modification, at the target last logged with it."""
    targets: dict[str, float] = {}
    reversible: dict[str, bool] = {}
    for row in log.modifications:
        before = targets.get(row.name, asked.usual_target)
        targets[row.name] = before if row.target_percent is None else row.target_percent / 100
        reversible[row.name] = reversible.get(row.name, True) and row.reversible
    return [
        Question(
            name,
            target if asked.target is None else asked.target,
            1 - asked.confidence,
            asked.power,
            reversible=reversible[name],
        )
        for name, target in targets.items()
        if asked.name in (None, name)
    ]
