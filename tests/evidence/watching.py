"""The watch: how far apart its false alarms lie, and how soon it tells a rise of 3, 5 and 10 percent."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside
from energytrack.inference.model import fit_model
from energytrack.inference.watch.begin import FALSE_ALARM_EVERY_KM, segments_of, watched
from energytrack.inference.watch.kept import Watch
from energytrack.inference.watch.monitor import Segment, Sum, advance, alarm
from tests.evidence.block import Block
from tests.evidence.logs import Job, by_kind, sample
from tests.evidence.measure import middle
from tests.simulation import simulate
from tests.uses import Use

FIRST_SEED = 70_000
LOGS = 12  # of each kind: each is watched for 400 fillings
BASELINE = 40  # segments before the watch begins
FURTHER = 400  # fillings without a change, after them
AFTER = 150  # fillings after a change
SHIFTS = (3.0, 5.0, 10.0)
SOON_KM = 10_000.0
HEADING = (
    "kind of use",
    "km between false alarms, set: 50,000",
    *(f"+{shift:g} %: tanks, km (told within 10,000 km)" for shift in SHIFTS),
)


@dataclass(frozen=True)
class Watched:
    """One log without a change, and the same vehicle with one of each size."""

    use: str
    alarms: int
    km: float  # watched without a change
    delays: tuple[tuple[int, float] | None, ...]  # tanks and km from each change to its alarm; None: not by the end


def watch(job: Job) -> Watched:
    calm = replace(job.use, shift_percent=0.0, fillings=BASELINE + FURTHER)
    observed, _ = _drawn(calm, job.seed)
    begun, later = _begun(observed)
    alarms = _alarms(begun, later, again=True)
    km = float(observed.end_km[-1] - observed.end_km[BASELINE - 1])
    return Watched(job.use.vehicle, len(alarms), km, tuple(_delay(job, shift) for shift in SHIFTS))


def _delay(job: Job, shift: float) -> tuple[int, float] | None:
    """False alarms before the change start the sums anew."""
    fillings = 2 * BASELINE + AFTER
    use = replace(job.use, shift_percent=shift, fillings=fillings, switches=((2 * BASELINE + 0.5) / fillings,))
    observed, changed_km = _drawn(use, job.seed)
    begun, later = _begun(observed)
    before = [k for k in range(len(later)) if observed.end_km[BASELINE + k] <= changed_km]
    for segment in later[: len(before)]:
        begun = _restarted(begun, segment)
    found = _alarms(begun, later[len(before) :], again=False)
    if not found:
        return None
    tanks = found[0] + 1
    return tanks, float(observed.end_km[BASELINE + len(before) + found[0]] - changed_km)


def _drawn(use: Use, seed: int) -> tuple[Observations, float]:
    log = simulate(use, np.random.default_rng(seed))
    observed = observe_frames(log.entries, log.modifications, unit=use.unit, capacity=use.capacity)[0]
    return observed.keeping(()), float(log.modifications["fitted_km"].iloc[0])


def _begun(observed: Observations) -> tuple[Watch, Sequence[Segment]]:
    """Fitted once, to the baseline; the rest as the echo of each entry would take it in."""
    known = observed.head(BASELINE)
    model = fit_model(set_aside(known).kept, None)
    watch = watched(known, model, FALSE_ALARM_EVERY_KM)
    calm = watch.monitor._replace(rise=Sum(), fall=Sum())
    return watch._replace(monitor=calm), segments_of(observed, model, ())[BASELINE:]


def _restarted(watch: Watch, segment: Segment) -> Watch:
    monitor = advance(watch.monitor, segment)
    if alarm(monitor) is not None:
        monitor = monitor._replace(rise=Sum(), fall=Sum())
    return watch._replace(monitor=monitor)


def _alarms(watch: Watch, later: Sequence[Segment], *, again: bool) -> list[int]:
    """Which segments gave an alarm; after the first, unless `again`, nothing more is asked."""
    found = []
    monitor = watch.monitor
    for place, segment in enumerate(later):
        monitor = advance(monitor, segment)
        if alarm(monitor) is not None:
            found.append(place)
            monitor = monitor._replace(rise=Sum(), fall=Sum())
            if not again:
                break
    return found


def block(results: list[Watched], uses: tuple[Use, ...], logs: int) -> Block:
    rows = tuple(_row(name, of_kind) for name, of_kind in by_kind(results, uses).items())
    return Block("watch", "", sample(uses, logs, FIRST_SEED), HEADING, rows)


def _row(name: str, results: list[Watched]) -> tuple[str, ...]:
    return (name, _between(results), *(_told([one.delays[k] for one in results]) for k in range(len(SHIFTS))))


def _between(results: list[Watched]) -> str:
    """Km watched for each alarm, with the range that resampling whole logs gives."""
    if not results:
        return "-"
    alarms, km = np.array([one.alarms for one in results]), np.array([one.km for one in results])
    picks = np.random.default_rng(0).integers(len(results), size=(2_000, len(results)))
    low, high = np.quantile(km[picks].sum(axis=1) / np.maximum(alarms[picks].sum(axis=1), 1), [0.025, 0.975])
    return f"{km.sum() / max(int(alarms.sum()), 1):,.0f} [{low:,.0f}, {high:,.0f}]"


def _told(delays: list[tuple[int, float] | None]) -> str:
    """Medians, those never told counted as later than all others; and the share told soon."""
    if not delays:
        return "-"
    never = float("inf")
    tanks = [never if one is None else one[0] for one in delays]
    km = [never if one is None else one[1] for one in delays]
    soon = 100 * np.mean([far <= SOON_KM for far in km])
    if np.isinf(np.median(km)):
        return f"most never ({soon:.0f} %)"
    return f"{middle(tanks)}, {middle(km)} ({soon:.0f} %)"
