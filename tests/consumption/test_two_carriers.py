"""Tank and battery of one vehicle: a worked example, and energy conserved."""

from __future__ import annotations

from itertools import pairwise
from math import hypot, sqrt
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.two_carriers import TwoCarriers, close_two_carriers, fuel_and_electric, two_carriers_of
from energytrack.errors import ConsumptionError
from energytrack.logbook.records import Entry, Vehicle
from tests.consumption.logs import fill

BOTH = TwoCarriers("petrol", tank_capacity=40.0, battery_capacity=12.0, energy_content=9.0)  # 360 kWh and 12 kWh


def charge(number: int, odometer: float | None, energy: float, **more: Any) -> Entry:
    return fill(number, odometer, energy, kind="charge", **more)


def closed(*entries: Entry) -> SegmentedLog:
    return close_two_carriers(entries, (), BOTH)


def test_a_worked_example() -> None:
    """20 L of 9 kWh and charges of 8 and 6 kWh over 500 km: 194 kWh, 38.8 kWh/100 km."""
    log = closed(fill(0, 10_000, 30), charge(2, 10_100, 8), charge(4, 10_250, 6), fill(8, 10_500, 20))
    (segment,) = log.segments
    assert (segment.energy, segment.distance_km) == (194.0, 500.0)
    assert log.electric == (14.0,)
    assert fuel_and_electric(log, 0, BOTH) == (20.0, 14.0)
    assert (log.unit, log.capacity) == ("kWh", 360.0)
    anything = 3 * 12 / sqrt(12) / (0.012 * 360)  # uniform over the battery, three-fold, against the click-off
    assert segment.end_weight == pytest.approx(hypot(1, anything))


def test_entries_stand_as_logged() -> None:
    entries = (fill(0, 10_000, 30), charge(2, 10_100, 8, level_percent=80), fill(8, 10_500, 20))
    assert closed(*entries).entries == entries


@pytest.mark.parametrize("first", [0, 1])
def test_a_charge_at_the_fill_ups_odometer_tells_the_batterys_level(first: int) -> None:
    """75 % of 12 kWh: 3 are missing, where 6 were to be expected before. Whichever of the two was logged first."""
    at_once = [charge(8, 10_500, 5, level_percent=75), fill(8, 10_500, 20)]
    log = closed(fill(0, 10_000, 30), *at_once[first:], *at_once[:first])
    assert log.segments[0].energy == pytest.approx(20 * 9 + 5 + 3 - 6)
    assert log.electric == (pytest.approx(5 + 3 - 6),)
    assert log.segments[0].end_weight == pytest.approx(hypot(1, 3 * 0.12 / 4.32))


def test_a_charge_never_closes_a_segment() -> None:
    log = closed(fill(0, 10_000, 30), charge(2, 10_100, 8), charge(4, 10_200, 8, level_percent=100))
    assert log.segments == ()
    assert len(log.open_legs) == 2


def test_charges_alone_measure_nothing() -> None:
    log = closed(charge(0, 10_000, 8), charge(2, 10_100, 8))
    assert log.segments == ()
    assert [span.reason for span in log.void] == ["no known level"]


def test_a_missed_charge_voids_its_segment() -> None:
    log = closed(fill(0, 10_000, 30), charge(2, 10_100, 8, missed=True), fill(8, 10_500, 20), fill(9, 11_000, 20))
    assert [span.reason for span in log.void] == ["missed entry"]
    assert [segment.energy for segment in log.segments] == [180.0]
    assert log.electric == (0.0,)


def test_a_log_without_odometer() -> None:
    log = closed(fill(0, None, 30, distance_km=300.0), charge(1, None, 8, distance_km=100.0),
                 fill(1, None, 20, distance_km=400.0))  # fmt: skip
    assert [(segment.energy, segment.distance_km) for segment in log.segments] == [(188.0, 500.0)]


def test_capacities_are_estimated_where_they_are_not_given() -> None:
    log = close_two_carriers(
        [fill(0, 10_000, 30), charge(2, 10_100, 8), fill(8, 10_500, 20)], (), TwoCarriers("petrol", energy_content=9.0)
    )
    assert log.capacity == pytest.approx(1.05 * 30 * 9)
    assert log.capacity_is_estimated


stops = st.lists(
    st.tuples(
        st.floats(5, 300),  # km
        st.floats(0.0, 1.0),  # share of the battery used
        st.floats(0.0, 0.09),  # kWh of fuel a km
        st.sampled_from(["charge", "some charge", "fill-up", "some fuel", "both"]),
    ),
    min_size=1,
    max_size=30,
)


@given(stops)
def test_energy_is_conserved(stops: list[tuple[float, float, float, str]]) -> None:
    """Tank and battery of known level: what the segments used is what truly was used (first law).

    With both filled at every anchor segment by segment; the battery's level is told there.
    """
    odometer, tank, battery, used = 1000.0, 0.0, 0.0, 0.0  # tank and battery: kWh missing
    entries = [charge(0, odometer, 1.0), fill(0, odometer, 10.0)]
    at_anchor = [0.0]
    for number, (km, share, rate, what) in enumerate(stops, start=1):
        electric = share * (12.0 - battery)
        odometer, battery, tank, used = odometer + km, battery + electric, tank + km * rate, used + electric + km * rate
        if what == "some fuel":
            entries.append(fill(number, odometer, tank / 2 / 9, full=False))
            tank /= 2
        if what == "some charge":
            entries.append(charge(number, odometer, battery / 2, full=False))
            battery /= 2
        if what in ("charge", "both", "fill-up"):
            entries.append(charge(number, odometer, battery))
            battery = 0.0
        if what in ("fill-up", "both") and used > at_anchor[-1] + 1e-6:
            entries.append(fill(number, odometer, tank / 9))
            tank = 0.0
            at_anchor.append(used)
    log = closed(*entries)
    truly = [end - start for start, end in pairwise(at_anchor)]
    assert [segment.energy for segment in log.segments] == pytest.approx(truly, abs=1e-6)
    for which, segment in enumerate(log.segments):
        fuel, electric = fuel_and_electric(log, which, BOTH)
        assert fuel * 9 + electric == pytest.approx(segment.energy)
        assert electric >= -1e-6


@given(stops)
def test_what_was_bought_is_all_there(stops: list[tuple[float, float, float, str]]) -> None:
    """Where the battery's level is never told, the segments use exactly what was bought."""
    odometer, entries, bought = 1000.0, [fill(0, 1000.0, 10.0)], 0.0
    for number, (km, share, _, what) in enumerate(stops, start=1):
        odometer += km
        energy = 0.5 + share
        full = what in ("fill-up", "both")
        is_charge = what in ("charge", "some charge")
        entries.append(fill(number, odometer, energy, kind="charge" if is_charge else "fill-up", full=full))
        bought += energy if is_charge else 9 * energy
    entries.append(fill(len(stops) + 1, odometer + 50, 1.0))
    assert sum(segment.energy for segment in closed(*entries).segments) == pytest.approx(bought + 9.0)


def test_either_carrier_may_come_first() -> None:
    one = Vehicle("phev", "petrol", "L", 40.0, second_carrier="electricity", second_unit="kWh", second_capacity=12.0)
    other = Vehicle("phev", "electricity", "kWh", 12.0, second_carrier="petrol", second_unit="L", second_capacity=40.0)
    assert two_carriers_of(one) == two_carriers_of(other) == TwoCarriers("petrol", 40.0, 12.0)
    assert two_carriers_of(Vehicle("van", "diesel", "L")) is None
    with pytest.raises(ConsumptionError, match="one must be electricity"):
        two_carriers_of(Vehicle("car", "petrol", "L", second_carrier="lpg", second_unit="L"))


@pytest.mark.parametrize(
    ("wrong", "said"),
    [
        ({"fuel": "electricity"}, "name what it burns"),
        ({"fuel": "steam"}, "unknown carrier 'steam'"),
        ({"tank_capacity": 0.0}, "tank capacity 0 must be more than 0"),
        ({"battery_capacity": -3.0}, "battery capacity -3 must be more than 0"),
        ({"energy_content": 0.0}, "must be more than 0: state kWh per L"),
    ],
)
def test_impossible_tanks_and_batteries_are_refused(wrong: dict[str, Any], said: str) -> None:
    with pytest.raises(ConsumptionError, match=said):
        TwoCarriers(**wrong)
