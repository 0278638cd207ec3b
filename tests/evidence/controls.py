"""What a control vehicle of the same run saves: the vehicle alone against the same vehicle beside its controls."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.special import ndtr

from energytrack.consumption.observations import observe
from energytrack.consumption.two_carriers import close_vehicle
from energytrack.inference import bounds
from energytrack.inference.fleet.controls import look_beside
from energytrack.inference.fleet.logs import VehicleLog
from energytrack.inference.looks import look_points
from energytrack.inference.shift import Shift, shift_of
from tests.evidence.block import Block
from tests.evidence.logs import QUESTION
from tests.evidence.measure import rate
from tests.fleets import run
from tests.uses import DRIFTING, STEADY_COMMUTE, Use

FIRST_SEED = 40_000
LOGS = 60  # of each kind
_TAIL = float(ndtr(-1.959964))
CELLS: tuple[tuple[Use, float, int], ...] = (
    *((use, share, 1) for use in (STEADY_COMMUTE, DRIFTING) for share in (0.0, 0.5, 0.9)),
    (DRIFTING, 0.9, 3),
)


@dataclass(frozen=True)
class Job:
    """One run: its use, the share of the drift in common, how many controls, and its seed."""

    cell: int
    seed: int


@dataclass(frozen=True)
class Compared:
    """One run, alone and beside its controls. Errors in percent of consumption."""

    cell: int
    error_alone: float
    error_beside: float
    held_alone: bool  # the 95 % range of a single look held the truth
    held_beside: bool
    variance: float  # as claimed, beside its controls / alone
    distance: float  # with the part at which the controls bring what the vehicle alone has at the end, as a share


def jobs(count: int) -> list[Job]:
    return [Job(cell, FIRST_SEED + seed) for cell in range(len(CELLS)) for seed in range(count)]


def compare(job: Job) -> Compared:
    """Both answers from the whole run, and where on the way the one beside the controls is as sure as the other."""
    use, share, controls = CELLS[job.cell]
    use = replace(use, fillings=100)
    test, beside = run(use, share, job.seed, controls)
    observed, others = _observed(test), [_observed(log) for log in beside]
    points, guesses = look_points(observed, "part"), {}
    whole = look_beside(observed, others, QUESTION, points[-1], guesses)
    assert whole is not None  # the newest entry of these runs is never odd
    alone, together = shift_of(whole.models[0].fit), whole.estimate.shift
    low, high = 0, len(points) - 1
    while high - low > 1:
        middle = (low + high) // 2
        seen = look_beside(observed, others, QUESTION, points[middle], guesses)
        sure = seen is not None and seen.estimate.shift.standard_error <= alone.standard_error
        low, high = (low, middle) if sure else (middle, high)
    driven = np.cumsum(observed.distance_km * observed.fitted[:, 0])
    truth = use.shift_percent
    return Compared(
        job.cell,
        100 * alone.ratio - truth,
        100 * together.ratio - truth,
        _held(alone, truth),
        _held(together, truth),
        (together.standard_error / alone.standard_error) ** 2,
        float(driven[points[high] - 1] / driven[-1]),
    )


def _observed(log: VehicleLog):
    return observe(close_vehicle(log.vehicle, log.entries), log.modifications)


def _held(shift: Shift, truth: float) -> bool:
    bound = bounds.mixture_quantile(_TAIL, shift.freedom)
    span = shift.interval(bound)
    return span is None or 100 * span[0] <= truth <= 100 * span[1]


def block(found: Sequence[Compared], count: int) -> Block:
    """A row a kind of run."""
    return Block(
        "controls",
        "",
        f"{count} runs a row of 100 tanks, the part fitted half-way; seeds from {FIRST_SEED:,}",
        (
            "use",
            "drift in common",
            "controls",
            "error (rms) alone",
            "beside controls",
            "95 % range held alone",
            "beside controls",
            "variance claimed, beside / alone",
            "distance with the part for the same certainty",
        ),
        tuple(_row(cell, [each for each in found if each.cell == cell]) for cell in range(len(CELLS))),
    )


def _row(cell: int, found: Sequence[Compared]) -> tuple[str, ...]:
    use, share, controls = CELLS[cell]
    alone, beside = (
        f"{np.sqrt(np.mean(np.square(errors))):.2f} %"
        for errors in ([each.error_alone for each in found], [each.error_beside for each in found])
    )
    return (
        use.vehicle,
        f"{100 * share:.0f} %",
        str(controls),
        alone,
        beside,
        str(rate([each.held_alone for each in found])),
        str(rate([each.held_beside for each in found])),
        f"{np.median([each.variance for each in found]):.2f}",
        f"{100 * np.median([each.distance for each in found]):.0f} %",
    )
