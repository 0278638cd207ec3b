"""Processor time of answers in one process: many looks against one, and vehicles one after the other."""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import partial

import numpy as np

from energytrack.inference.assess import assess
from energytrack.inference.results import Assessment
from tests.simulation import SimulatedLog, simulate
from tests.uses import DRIFTING, STEADY_COMMUTE, USES, Use

LOOKS = 60
MOST_TIMES_ONE_LOOK = 10.0
ENTRIES = 100
LEAST_VEHICLES_A_SECOND = 20.0
_SAMPLE = 28  # vehicles of the fleet that are timed


def answers() -> Iterator[str]:
    """One line a figure."""
    for use, entries in ((STEADY_COMMUTE, 120), (DRIFTING, 120), (STEADY_COMMUTE, 250)):
        yield looks(use, entries)
    for every_look in (False, True):
        yield fleet(every_look=every_look)


def looks(use: Use, entries: int) -> str:
    """An answer with a look after each of the last 60 entries against one with a single look."""
    log = simulate(replace(use, fillings=entries, switches=(1 - LOOKS / entries,)), np.random.default_rng(3))
    many = _assess(log, every_look=True)
    one, all_ = (_seconds(partial(_assess, log, every_look=every)) for every in (False, True))
    return (
        f"assess, {use.vehicle}, {entries} entries, {len(many.looks)} looks / one look: {1000 * all_:.0f} ms / "
        f"{1000 * one:.0f} ms = {all_ / one:.1f} (target <= {MOST_TIMES_ONE_LOOK:g})"
    )


def fleet(*, every_look: bool) -> str:
    """Vehicles of all kinds of use, one after the other."""
    drawn = [
        simulate(replace(use, fillings=ENTRIES), np.random.default_rng(seed))
        for seed in range(_SAMPLE // len(USES))
        for use in USES
    ]
    spent = statistics.fmean(_once(partial(_assess, log, every_look=every_look)) for log in drawn)
    seen = "a look at every entry" if every_look else "one look"
    return (
        f"assess, {len(drawn)} vehicles of {ENTRIES} entries, {seen}: {1 / spent:.1f} vehicles a second a core "
        f"(target >= {LEAST_VEHICLES_A_SECOND:g})"
    )


def _assess(log: SimulatedLog, *, every_look: bool) -> Assessment:
    return assess(log.entries, log.modifications, "part", capacity=log.truth.use.capacity, every_look=every_look)


def _seconds(work: Callable[[], object], rounds: int = 5) -> float:
    """Median processor time."""
    return statistics.median(_once(work) for _ in range(rounds))


def _once(work: Callable[[], object]) -> float:
    begun = time.process_time()
    work()
    return time.process_time() - begun
