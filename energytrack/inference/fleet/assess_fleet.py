"""A month of many vehicles: each against its own record, each one's modifications, and shifts pooled over vehicles."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import replace
from itertools import chain

from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference.fleet.discovery import adjusted
from energytrack.inference.fleet.logs import VehicleLog, pack
from energytrack.inference.fleet.pooled import pooled_shifts
from energytrack.inference.fleet.results import FleetAssessment, VehicleReview
from energytrack.inference.fleet.vehicle import Asked, Chunk, review_chunk
from energytrack.inference.jobs import Progress, run_all
from energytrack.inference.question import Question
from energytrack.inference.review.month import Month, month_of, month_with

_CHUNK = 8  # vehicles a job: about half a second, beside which its overhead is nothing


def assess_fleet(
    fleet: Sequence[VehicleLog],
    name: str | None = None,
    *,
    month: str | None = None,
    target_percent: float | None = None,
    confidence: float = 0.95,
    power: float = 0.80,
    false_discovery_rate: float = 0.05,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> FleetAssessment:
    """Review a fleet.

    fleet: logs as `fleet_logs` reads them. name: one modification only; otherwise each of every vehicle. month:
    YYYY-MM; otherwise that of the newest entry. target_percent: otherwise as last logged with the modification, or 3.
    executor: any of `concurrent.futures`, such as a process pool or `Client.get_executor()` of dask.distributed.
    progress: called with how many vehicles are done, and of how many. A vehicle that cannot be answered is a row with
    a message.

    Raises InferenceError for a fleet without entries, a month that is none, or a target, confidence, power or rate out
    of range; UnknownNameError for a modification no vehicle has.
    """
    asked = Asked(_month(fleet, month), name, _ratio(target_percent), 0.03, confidence, power)
    usual = asked.usual_target if asked.target is None else asked.target
    Question(name or "", usual, 1 - confidence, power)  # refuses what is out of range
    if not 0 < false_discovery_rate < 1:
        asked_rate = f"{false_discovery_rate:g}"
        raise InferenceError(f"the false discovery rate must lie between 0 and 1, not {asked_rate}: try 0.05")
    _check_name(fleet, name)
    chunks = [
        Chunk(tuple(map(pack, fleet[start : start + _CHUNK])), asked) for start in range(0, len(fleet), _CHUNK)
    ]
    done = run_all(review_chunk, chunks, executor, None if progress is None else _by_vehicle(progress, len(fleet)))
    vehicles = _ranked(list(chain.from_iterable(done)), false_discovery_rate)
    energy: dict[str, float] = defaultdict(float)
    for each in vehicles:
        energy[each.unit] += each.energy
    pooled = pooled_shifts(vehicles, confidence=confidence, power=power)
    return FleetAssessment(
        month=str(asked.month),
        confidence=confidence,
        false_discovery_rate=false_discovery_rate,
        vehicles=tuple(map(_without_roads, vehicles)),
        pooled=pooled,
        distance_km=sum(each.distance_km for each in vehicles),
        energy={unit: amount for unit, amount in sorted(energy.items()) if amount},
    )


def _without_roads(review: VehicleReview) -> VehicleReview:
    """Roads were for pooling: they are no part of the answer."""
    return replace(review, answers=tuple(replace(answer, ahead=()) for answer in review.answers))


def _month(fleet: Sequence[VehicleLog], written: str | None) -> Month:
    newest = max((entry.date for log in fleet for entry in log.entries), default=None)
    if newest is None:
        raise InferenceError("the fleet has no entries yet: log fill-ups or charges first")
    return month_with(newest) if written is None else month_of(written)


def _ratio(percent: float | None) -> float | None:
    return None if percent is None else percent / 100


def _check_name(fleet: Sequence[VehicleLog], name: str | None) -> None:
    known = dict.fromkeys(row.name for log in fleet for row in log.modifications)
    if name is not None and name not in known:
        raise UnknownNameError(f"no vehicle has a modification named {name!r}; logged: {', '.join(known) or 'none'}")


def _by_vehicle(progress: Progress, count: int) -> Progress:
    """Progress of chunks, told in vehicles."""
    return lambda done, of: progress(min(done * _CHUNK, count), count)


def _ranked(reviews: list[VehicleReview], rate: float) -> tuple[VehicleReview, ...]:
    """With adjusted p-values: furthest from its own expectation first, those without an answer last."""
    judged = [each for each in reviews if each.deviation is not None]
    p_values = adjusted([each.deviation.p_value for each in judged if each.deviation is not None])
    called = [
        replace(each, adjusted_p=float(p), attention=bool(p <= rate)) for each, p in zip(judged, p_values, strict=True)
    ]
    others = [each for each in reviews if each.deviation is None]
    ordered = sorted(called, key=lambda each: -abs(each.deviation.z if each.deviation else 0.0))
    return (*ordered, *sorted(others, key=lambda each: bool(each.message)))
