"""A fleet in one process, in two, and on a cluster: the same answer."""

from __future__ import annotations

from concurrent.futures import ProcessPoolExecutor
from dataclasses import replace
from multiprocessing import get_context

import pytest

import energytrack as et
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference.review.month import month_of
from tests.fleets import fleet

MONTH = "2024-03"


@pytest.fixture(scope="module")
def logs():
    drawn = fleet(10, entries=40, seed=7)
    broken = drawn[3]
    overlapping = (*broken.modifications, replace(broken.modifications[0], fitted_km=None))
    drawn[3] = replace(broken, modifications=overlapping)
    march = month_of(MONTH)
    factors = [1.3 if march.holds(entry.date.toordinal()) else 1.0 for entry in drawn[0].entries]
    thirsty = [replace(e, energy=k * e.energy) for e, k in zip(drawn[0].entries, factors, strict=True)]
    drawn[0] = replace(drawn[0], entries=tuple(thirsty))
    return drawn


@pytest.fixture(scope="module")
def alone(logs):
    return et.assess_fleet(logs, month=MONTH)


def test_the_one_that_used_more_comes_first_and_is_called(alone, logs) -> None:
    first = alone.vehicles[0]
    assert first.vehicle == logs[0].vehicle.name
    assert first.attention
    assert first.deviation.z > 3
    far = [abs(each.deviation.z) for each in alone.vehicles if each.deviation]
    assert far == sorted(far, reverse=True)
    assert len(alone.attention) <= 2


def test_a_vehicle_that_fails_is_a_message_and_not_the_end(alone, logs) -> None:
    last = alone.vehicles[-1]
    assert last.vehicle == logs[3].vehicle.name
    assert "while it is still on" in last.message
    assert sum(bool(each.message) for each in alone.vehicles) == 1


def test_totals_are_those_of_the_vehicles(alone) -> None:
    assert alone.distance_km == pytest.approx(sum(each.distance_km for each in alone.vehicles))
    assert set(alone.energy) <= {"L", "kWh"}
    assert alone.energy["L"] == pytest.approx(sum(each.energy for each in alone.vehicles if each.unit == "L"))


def test_two_processes_give_the_same_and_tell_how_far_they_are(alone, logs) -> None:
    told = []
    with ProcessPoolExecutor(2, get_context("spawn")) as pool:
        found = et.assess_fleet(logs, month=MONTH, executor=pool, progress=lambda done, of: told.append((done, of)))
    assert found == alone
    assert told[0] == (0, 10)
    assert told[-1] == (10, 10)


def test_a_local_cluster_gives_the_same(alone, logs) -> None:
    """dask.distributed's own executor, on workers in this process: what travels is serialised all the same."""
    distributed = pytest.importorskip("distributed", reason="dask.distributed is not installed")
    with (
        distributed.LocalCluster(n_workers=2, processes=True, threads_per_worker=1, dashboard_address=None) as cluster,
        distributed.Client(cluster) as client,
    ):
        found = et.assess_fleet(logs, month=MONTH, executor=client.get_executor())
    assert found == alone


def test_what_cannot_be_asked() -> None:
    logs = fleet(1, entries=12)
    for wrong in ({"month": "November"}, {"month": "2024-13"}, {"false_discovery_rate": 0.0}, {"target_percent": 0.0}):
        with pytest.raises(InferenceError):
            et.assess_fleet(logs, **wrong)
    with pytest.raises(UnknownNameError, match="logged: part"):
        et.assess_fleet(logs, "wing")
    with pytest.raises(InferenceError, match="no entries"):
        et.assess_fleet([])
