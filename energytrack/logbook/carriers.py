"""What an entry of one kind means to a vehicle: a charge is for the battery, a fill-up for the tank."""

from __future__ import annotations

from dataclasses import replace

from energytrack.logbook.records import Vehicle


def kind_of(carrier: str) -> str:
    """The kind of entry that buys a carrier."""
    return "charge" if carrier == "electricity" else "fill-up"


def kinds_of(vehicle: Vehicle) -> tuple[str, ...]:
    """The kinds of entry this vehicle takes."""
    carriers = (vehicle.carrier, vehicle.second_carrier)
    return tuple(kind_of(carrier) for carrier in carriers if carrier is not None)


def for_kind(vehicle: Vehicle, kind: str) -> Vehicle:
    """The vehicle as an entry of one kind sees it: with the carrier, unit and capacity that entry is about."""
    if vehicle.second_carrier is None or vehicle.second_unit is None or kind_of(vehicle.second_carrier) != kind:
        return vehicle
    return replace(
        vehicle,
        carrier=vehicle.second_carrier,
        unit=vehicle.second_unit,
        capacity=vehicle.second_capacity,
        co2_kg=vehicle.second_co2_kg,
        typed_unit=vehicle.second_unit,
        display=None,
    )


def in_total(vehicle: Vehicle) -> Vehicle:
    """The vehicle as its whole consumption is shown: by the kWh where it has two carriers, else as it is."""
    if vehicle.second_carrier is None:
        return vehicle
    return replace(vehicle, unit="kWh", typed_unit="kWh", display="mi/kWh" if vehicle.distance_unit == "mi" else None)
