"""Fleets drawn from a known truth: a log a vehicle, as records."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from energytrack.consumption.frames import entries_from_frame, modifications_from_frame
from energytrack.inference.fleet.logs import VehicleLog
from energytrack.logbook.records import Vehicle
from energytrack.logbook.store import Store
from tests.simulation import CommonDrift, SimulatedLog, simulate
from tests.uses import USES, Use

FIRST = dt.date(2024, 1, 1)


def as_log(log: SimulatedLog, name: str | None = None) -> VehicleLog:
    """A simulated log as records, under another name where one is given."""
    use = log.truth.use
    vehicle = Vehicle(name or use.vehicle, "electricity" if use.readings else "diesel", use.unit, use.capacity)
    entries = tuple(replace(entry, vehicle=vehicle.name) for entry in entries_from_frame(log.entries))
    fitted = modifications_from_frame(log.modifications) if len(log.modifications) else []
    return VehicleLog(vehicle, entries, tuple(replace(row, vehicle=vehicle.name) for row in fitted))


def fleet(count: int, *, entries: int = 100, seed: int = 0, uses: Sequence[Use] = USES) -> list[VehicleLog]:
    """Vehicles of all kinds of use in turn, each with `part` fitted half-way."""
    kinds = [replace(uses[k % len(uses)], fillings=entries) for k in range(count)]
    return [
        as_log(simulate(use, np.random.default_rng(seed + k), start=FIRST), f"{use.vehicle}-{k}")
        for k, use in enumerate(kinds)
    ]


def run(use: Use, share: float, seed: int, controls: int = 1) -> tuple[VehicleLog, list[VehicleLog]]:
    """A vehicle with the part and others of the same run without it; their drifts share `share` of the variance."""
    rng = np.random.default_rng(seed)
    days = 4 * use.fillings * max(use.days_per_fill)
    common = CommonDrift.drawn(share, FIRST, days, rng)
    without = replace(use, switches=(), shift_percent=0.0)
    test = as_log(simulate(use, rng, start=FIRST, common=common), "test")
    return test, [as_log(simulate(without, rng, start=FIRST, common=common), f"control-{k}") for k in range(controls)]


def write(store: Store, logs: Sequence[VehicleLog]) -> None:
    """All of it into a logbook."""
    for log in logs:
        name = log.vehicle.name
        store.add_vehicle(log.vehicle)
        store.add_entries([(entry, {}) for entry in log.entries], source="drawn")
        for row in log.modifications:
            store.fit(name, row.name, row.fitted_date, row.fitted_km, row.target_percent, None, "")
