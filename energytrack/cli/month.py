"""What a month is asked with, by `review` and by `report`: factors and costs as typed, and the vehicle's tables."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from energytrack.cli import questions as asking
from energytrack.errors import EntryError, UnknownNameError
from energytrack.logbook.quantities import parse_number

if TYPE_CHECKING:
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle

_EXAMPLES = {"--co2": "diesel=2.62", "--part-cost": '"side skirts=350"'}


def asked(
    logbook: Logbook,
    vehicle: Vehicle,
    month: str | None,
    factors: Mapping[str, float],
    costs: Mapping[str, float],
    today: dt.date,
) -> dict[str, Any]:
    """What `review` takes by name."""
    own = {row.name for row in logbook.modifications(vehicle.name)}
    return {
        **asking.tables(logbook, vehicle),
        "month": month,
        "carrier": vehicle.carrier,
        "co2_kg_per_unit": {**_own_factors(vehicle), **factors},
        "part_costs": {name: cost for name, cost in costs.items() if name in own},
        "typed_in": (vehicle.distance_unit, vehicle.typed_unit),
        "today": today,
    }


def check_parts(costs: Mapping[str, float], logbook: Logbook, vehicles: list[Vehicle]) -> None:
    """Raises UnknownNameError for the cost of a modification that no vehicle has."""
    names = {row.name for each in vehicles for row in logbook.modifications(each.name)}
    unknown = next((name for name in costs if name not in names), None)
    if unknown is not None:
        raise UnknownNameError(f"no modification named {unknown!r}; logged: {', '.join(sorted(names)) or 'none'}")


def factors(grid: str | None, typed: list[str] | None) -> dict[str, float]:
    """kg of CO2 per unit of each carrier stated. Raises EntryError."""
    found = named_amounts(typed, "--co2")
    if grid is not None:
        found["electricity"] = parse_number(grid, "grid factor") / 1000
    return found


def named_amounts(typed: list[str] | None, option: str) -> dict[str, float]:
    """NAME=NUMBER as typed, by name. Raises EntryError."""
    found = {}
    for each in typed or ():
        name, mark, value = each.rpartition("=")
        if not mark or not name.strip():
            raise EntryError(f"{option} {each!r} is not written as NAME=NUMBER, such as {_EXAMPLES[option]}")
        found[name.strip()] = parse_number(value, f"{option} of {name.strip()}")
    return found


def _own_factors(vehicle: Vehicle) -> dict[str, float]:
    """kg of CO2 per unit of each carrier, as the logbook states them for this vehicle."""
    stated = {vehicle.carrier: vehicle.co2_kg, vehicle.second_carrier: vehicle.second_co2_kg}
    return {carrier: kg for carrier, kg in stated.items() if carrier is not None and kg is not None}
