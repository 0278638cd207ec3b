"""A vehicle with tank and battery: fill-ups and charges become segments in kWh, and nothing is thrown away.

The tank is the anchor: a segment runs from one known level of the tank to the next, and every charge between adds its
energy. Where the battery stood at the anchor is rarely known; that it may be anything from empty to full is carried as
a level error of the segment's ends. No heavy libraries.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from math import fsum, hypot, sqrt
from typing import NamedTuple

from energytrack.consumption.energy_content import kwh_per_unit
from energytrack.consumption.positions import driving_order
from energytrack.consumption.segments import (
    Level,
    Segment,
    SegmentedLog,
    close_at,
    close_segments,
    estimate_capacity,
    known_level,
)
from energytrack.errors import ConsumptionError
from energytrack.logbook.carriers import kind_of
from energytrack.logbook.records import Entry, Event, Vehicle

CLICK_OFF_SHARE = 0.012  # usual error of a fill to the click-off, of the tank's capacity
READING_SHARE = 0.01  # error of a charge reading, of the battery's capacity
ANY_LEVEL_SHARE = 1 / sqrt(12)  # sd of a level that may be anything from empty to full (uniform distribution)
FUEL_PER_ELECTRIC = 3.0  # kWh of fuel that drive as far as one kWh from the plug; common practice, no source


@dataclass(frozen=True)
class TwoCarriers:
    """Tank and battery of one vehicle: which fuel, how much each holds, and what the fuel's energy content is."""

    fuel: str = "petrol"  # a carrier other than electricity
    tank_capacity: float | None = None  # in the fuel's unit, L or kg; estimated from the fill-ups if not given
    battery_capacity: float | None = None  # usable, kWh; estimated from the charges if not given
    energy_content: float | None = None  # kWh per unit of the fuel; the table's lower heating value if not given

    def __post_init__(self) -> None:
        if self.fuel == "electricity":
            raise ConsumptionError("the fuel of a vehicle with tank and battery is not electricity: name what it burns")
        kwh_per_unit(self.fuel, self.energy_content)
        for what, capacity in (("tank", self.tank_capacity), ("battery", self.battery_capacity)):
            if capacity is not None and not capacity > 0:
                raise ConsumptionError(f"{what} capacity {capacity:g} must be more than 0: state what it holds")

    @property
    def kwh_per_unit(self) -> float:
        """Energy in one unit of the fuel."""
        return kwh_per_unit(self.fuel, self.energy_content)


class _Battery(NamedTuple):
    """How much is missing from a full battery, and the sd of that, in kWh."""

    missing: float
    sd: float


def two_carriers_of(vehicle: Vehicle, contents: Mapping[str, float] | None = None) -> TwoCarriers | None:
    """Tank and battery of a vehicle, None where it has one carrier. contents: kWh per unit of a fuel, if stated.

    Raises ConsumptionError for two carriers of one kind.
    """
    if vehicle.second_carrier is None:
        return None
    if kind_of(vehicle.carrier) == kind_of(vehicle.second_carrier):
        raise ConsumptionError(f"{vehicle.name} has two carriers of one kind: one must be electricity, one a fuel")
    first, second = (vehicle.carrier, vehicle.capacity), (vehicle.second_carrier, vehicle.second_capacity)
    (fuel, tank), (_, battery) = (second, first) if vehicle.carrier == "electricity" else (first, second)
    return TwoCarriers(fuel, tank, battery, (contents or {}).get(fuel))


def close_vehicle(vehicle: Vehicle, entries: Sequence[Entry], events: Sequence[Event] = ()) -> SegmentedLog:
    """Segments of a vehicle of either sort: in its own unit, or in kWh where it has tank and battery."""
    both = two_carriers_of(vehicle)
    if both is None:
        return close_segments(entries, events, capacity=vehicle.capacity, unit=vehicle.unit)
    return close_two_carriers(entries, events, both)


def close_two_carriers(entries: Sequence[Entry], events: Sequence[Event], both: TwoCarriers) -> SegmentedLog:
    """Segments in kWh of fill-ups (in the fuel's unit) and charges (in kWh), closed where the tank's level is known.

    The entries of the result stand as logged; its capacity is the tank's, in kWh.
    """
    ordered = driving_order(sorted(entries, key=_charges_first))
    stream = [in_kwh(entry, both) for entry in ordered]
    fillings = [entry for entry in stream if entry.kind != "charge"]
    tank = both.tank_capacity * both.kwh_per_unit if both.tank_capacity else estimate_capacity(fillings, "L")
    charges = [entry for entry in ordered if entry.kind == "charge"]
    room = both.battery_capacity or estimate_capacity(charges, "L") or 0.0
    batteries = [_battery_at(ordered, index, room) for index in range(len(ordered))]
    levels = [_level_at(entry, battery, tank) for entry, battery in zip(stream, batteries, strict=True)]
    closed = close_at(
        stream, levels, events, capacity=tank, capacity_is_estimated=both.tank_capacity is None, unit="kWh"
    )
    electric = tuple(_electric(ordered, batteries, segment) for segment in closed.segments)
    return replace(closed, entries=tuple(ordered), electric=electric)


def in_kwh(entry: Entry, both: TwoCarriers) -> Entry:
    """An entry's energy in kWh; a charge only adds energy, so it is no known level."""
    if entry.kind == "charge":
        return replace(entry, full=False, level_percent=None)
    return replace(entry, energy=entry.energy * both.kwh_per_unit)


def fuel_and_electric(segmented: SegmentedLog, which: int, both: TwoCarriers) -> tuple[float, float]:
    """What one segment used of each: fuel in its own unit, electricity in kWh."""
    electric = segmented.electric[which]
    return (segmented.segments[which].energy - electric) / both.kwh_per_unit, electric


def _charges_first(entry: Entry) -> str:
    """At one odometer value on one day a charge counts before the fill-up, so that its reading holds there."""
    return "" if entry.odometer_km is None else entry.kind


def _battery_at(ordered: Sequence[Entry], index: int, room: float) -> _Battery:
    """The battery at a fill-up: read where a charge stands at the same odometer value, else anything it can hold."""
    entry, before = ordered[index], ordered[index - 1] if index else None
    if before is not None and before.kind == "charge" and entry.odometer_km is not None:
        percent = before.level_percent if before.level_percent is not None else 100.0 if before.full else None
        if before.odometer_km == entry.odometer_km and percent is not None and 0 <= percent <= 100:
            return _Battery((1 - percent / 100) * room, READING_SHARE * room)
    return _Battery(room / 2, ANY_LEVEL_SHARE * room)


def _level_at(entry: Entry, battery: _Battery, tank: float | None) -> Level | None:
    """Tank and battery together. A kWh that was in the battery is missing three times over in the tank."""
    level = None if entry.kind == "charge" else known_level(entry, tank, "L")
    if level is None or not tank:
        return level
    weight = FUEL_PER_ELECTRIC * battery.sd / (CLICK_OFF_SHARE * tank)
    return Level(level.missing + battery.missing, hypot(level.weight, weight))


def _electric(ordered: Sequence[Entry], batteries: Sequence[_Battery], segment: Segment) -> float:
    """kWh from the plug used in a segment."""
    first, last = segment.legs[0].entry, segment.legs[-1].entry
    charged = fsum(entry.energy for entry in ordered[first : last + 1] if entry.kind == "charge")
    return charged + batteries[last].missing - batteries[first - 1].missing
