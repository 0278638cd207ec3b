"""A vehicle's month in a fleet is the month that its own review shows."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace

import pytest

from energytrack.consumption.frames import EVENT_COLUMNS, MODIFICATION_COLUMNS, entries_to_frame, records_to_frame
from energytrack.inference.fleet.logs import VehicleLog, fleet_logs
from energytrack.inference.fleet.results import VehicleReview
from energytrack.inference.fleet.vehicle import Asked
from energytrack.inference.fleet.vehicle import review as in_a_fleet
from energytrack.inference.review.month import month_of
from energytrack.inference.review.results import Driven
from energytrack.inference.review.review import review
from tests.documents import ROOT

LOGS = {log.vehicle.name: log for log in fleet_logs(ROOT / "demo_logbook")}


def both(log: VehicleLog, month: str) -> tuple[VehicleReview, Driven]:
    alone = review(
        entries_to_frame(log.entries),
        records_to_frame(log.modifications, MODIFICATION_COLUMNS),
        month=month,
        carrier=log.vehicle.carrier,
        capacity=log.vehicle.capacity,
        unit=log.vehicle.unit,
        events=records_to_frame(log.events, EVENT_COLUMNS),
        today=dt.date(2040, 1, 1),
    )
    return in_a_fleet(log, Asked(month_of(month), None, None, 0.03, 0.95, 0.80)), alone.this


def check(log: VehicleLog, month: str) -> VehicleReview:
    found, alone = both(log, month)
    assert found.distance_km == pytest.approx(alone.distance_km, rel=1e-9)
    assert found.energy == pytest.approx(alone.energy, rel=1e-9)
    assert found.deviation.measured == pytest.approx(alone.consumption, rel=1e-9)
    return found


@pytest.mark.parametrize("name", LOGS)
@pytest.mark.parametrize("month", ["2025-09", "2026-10"])
def test_demonstration_logbook(name: str, month: str) -> None:
    check(LOGS[name], month)


def test_what_the_driving_of_unknown_consumption_adds() -> None:
    log = LOGS["van"]
    first_week = [dt.date(2026, 3, day) for day in range(1, 9)]
    missed = [replace(each, missed=each.date in first_week) for each in log.entries]
    assert any(each.missed for each in missed)
    found = check(replace(log, entries=tuple(missed)), "2026-03")
    assert found.distance_km == pytest.approx(both(log, "2026-03")[0].distance_km, rel=0.01)


def test_what_came_after_the_month_does_not_change_it() -> None:
    """A capacity estimated from larger purchases later on would."""
    log = LOGS["electric"]
    own = replace(log, vehicle=replace(log.vehicle, capacity=None))
    late = [replace(each, energy=each.energy * (1 if each.date.year < 2026 else 1.3)) for each in own.entries]
    assert check(replace(own, entries=tuple(late)), "2025-09").distance_km > 0


def test_a_month_before_all_entries_says_so() -> None:
    found = in_a_fleet(LOGS["van"], Asked(month_of("1990-01"), None, None, 0.03, 0.95, 0.80))
    assert (found.distance_km, found.deviation, found.why_none) == (0.0, None, "no entries in the month")
    assert [answer.verdict for answer in found.answers] == ["shifted"]
