"""What `import` was told, as values; and what it tells back."""

from __future__ import annotations

import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager

import typer

from energytrack.cli.context import say, say_json
from energytrack.cli.vehicle import described
from energytrack.logbook.importing import OTHER_TABLES, Outcome
from energytrack.logbook.quantities import DISTANCE, ENERGY
from energytrack.logbook.records import KINDS, UNITS, Vehicle
from energytrack.logbook.rejected import BadRowsError
from energytrack.presentation.plain import plain_text


def check_words(
    table: str, odometer: str | None, energy: str | None, speed: str | None, temperature: str | None, kind: str | None
) -> None:
    """Raises typer.BadParameter for a word that is none of those an option takes."""
    for option, value, words in (
        ("--table", table, ("entries", *OTHER_TABLES)),
        ("--odometer-unit", odometer, tuple(DISTANCE)),
        ("--energy-unit", energy, tuple(ENERGY)),
        ("--speed-unit", speed, ("km/h", "mph")),
        ("--temperature-unit", temperature, ("C", "F")),
        ("--kind", kind, KINDS),
    ):
        if value is not None:
            one_of(option, value, words)


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
        "energy": None if energy in UNITS else energy,
        "speed_kmh": speed,
        "temperature_c": None if temperature == "C" else temperature,
    }
    return {name: unit for name, unit in told.items() if unit is not None}


def new_vehicle(
    name: str | None, carrier: str | None, capacity: str | None, odometer: str | None, energy: str | None
) -> Vehicle | None:
    """The vehicle to add where it is new. Raises typer.BadParameter, EntryError."""
    if carrier is None:
        if capacity is not None:
            raise typer.BadParameter("is of a new vehicle; give its --carrier too", param_hint="--capacity")
        return None
    if not name:
        raise typer.BadParameter("adds a vehicle; name it with --vehicle", param_hint="--carrier")
    return described(name, carrier, capacity, energy, odometer or "km", None, "")


@contextmanager
def bad_rows_told() -> Iterator[None]:
    """Every bad row as a line on stderr, above the refusal; a single one is told by the refusal itself."""
    try:
        yield
    except BadRowsError as refusal:
        if len({problem.line for problem in refusal.problems}) > 1:
            for problem in refusal.problems:
                print(plain_text(str(problem)), file=sys.stderr)
        raise


def tell(outcome: Outcome, as_json: bool) -> None:
    """Print what the import did."""
    if as_json:
        say_json(outcome.to_dict())
        return
    lines = []
    for table, new in outcome.new.items():
        name = outcome.file if len(outcome.new) == 1 else f"{outcome.file}, {table}"
        lines.append(f"{name}: {new} new, {outcome.already[table]} already there")
    if outcome.rejected_file:
        count = len({problem.line for problem in outcome.rejected})
        lines.append(f"{count} bad {'row' if count == 1 else 'rows'} written to {outcome.rejected_file}")
    say([*lines, *(f"note: {note}" for note in outcome.notes)])
