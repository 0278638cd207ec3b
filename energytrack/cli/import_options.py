"""What `import` was told, as values; and what it tells back."""

from __future__ import annotations

import json
from collections.abc import Sequence

import typer

from energytrack.logbook.importing import Outcome
from energytrack.logbook.quantities import DISTANCE, ENERGY
from energytrack.logbook.records import CARRIERS, UNIT_OF_CARRIER, Vehicle

ENERGY_UNITS = tuple(ENERGY)


def one_of(option: str, value: str, words: Sequence[str]) -> str:
    """The value, if it is one of the words. Raises typer.BadParameter."""
    if value not in words:
        raise typer.BadParameter(f"{value!r} is not one of: {', '.join(words)}", param_hint=option)
    return value


def columns(pairs: Sequence[str]) -> dict[str, str]:
    """Our column -> theirs, from `ours=theirs`. Raises typer.BadParameter."""
    found: dict[str, str] = {}
    for pair in pairs:
        ours, equals, theirs = (part.strip() for part in pair.partition("="))
        if not (ours and equals and theirs):
            raise typer.BadParameter(f"{pair!r}: write our column, =, and theirs: energy=Litres", param_hint="--column")
        if ours in found:
            raise typer.BadParameter(f"{ours} is named twice", param_hint="--column")
        found[ours] = theirs
    return found


def units(odometer: str | None, energy: str | None, speed: str | None, temperature: str | None) -> dict[str, str]:
    """Our column -> the unit it has in the file, where that is not ours."""
    odometer, speed = (None if odometer == "km" else odometer), (None if speed == "km/h" else speed)
    told = {
        "odometer_km": odometer,
        "distance_km": odometer,
        "fitted_km": odometer,
        "removed_km": odometer,
        "energy": None if energy in (None, *UNIT_OF_CARRIER.values()) else energy,
        "speed_kmh": speed,
        "temperature_c": None if temperature == "C" else temperature,
    }
    return {name: unit for name, unit in told.items() if unit is not None}


def factors(odometer: str | None, energy: str | None, speed: str | None) -> dict[str, float]:
    """Factors into base units, as Form names them."""
    return {
        "km": DISTANCE[odometer or "km"],
        "energy": ENERGY[energy][1] if energy else 1.0,
        "kmh": DISTANCE["mi" if speed == "mph" else "km"],
    }


def new_vehicle(
    name: str | None, carrier: str | None, capacity: float | None, odometer: str | None, energy: str | None
) -> Vehicle | None:
    """The vehicle to add where it is new. Raises typer.BadParameter."""
    if carrier is None:
        if capacity is not None:
            raise typer.BadParameter("is of a new vehicle; give its --carrier too", param_hint="--capacity")
        return None
    if not name:
        raise typer.BadParameter("adds a vehicle; name it with --vehicle", param_hint="--carrier")
    unit = UNIT_OF_CARRIER[one_of("--carrier", carrier, CARRIERS)]
    if capacity is not None and not 0 < capacity < float("inf"):
        raise typer.BadParameter(f"{capacity:g} is no capacity; give {unit} above 0", param_hint="--capacity")
    if energy is not None and ENERGY[energy][0] != unit:
        raise typer.BadParameter(f"{energy} is no unit of {carrier}, counted in {unit}", param_hint="--energy-unit")
    return Vehicle(name, carrier, unit, capacity, odometer or "km", typed_unit=None if energy == unit else energy)


def tell(outcome: Outcome, as_json: bool) -> None:
    """Print what the import did."""
    if as_json:
        print(json.dumps(outcome.to_dict(), indent=2, ensure_ascii=False))
        return
    for table, new in outcome.new.items():
        name = outcome.file if len(outcome.new) == 1 else f"{outcome.file}, {table}"
        print(f"{name}: {new} new, {outcome.already[table]} already there")
    if outcome.rejected_file:
        lines = {problem.line for problem in outcome.rejected}
        print(f"{len(lines)} bad rows written to {outcome.rejected_file}")
    for note in outcome.notes:
        print(f"note: {note}")


