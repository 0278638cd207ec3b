"""The columns of each table: how a cell becomes a value in base units, and what a value may be."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

from energytrack.errors import EntryError
from energytrack.logbook.cells import CellError, date_reader, number_reader, text_of, yes_or_no
from energytrack.logbook.checks import LARGEST_TARGET_PERCENT
from energytrack.logbook.quantities import CONSUMPTION, DISTANCE, ENERGY, SMALLEST, celsius, in_short
from energytrack.logbook.records import CARRIERS, KINDS, UNITS

Reader = Callable[[str], Any]

ENTRIES = (
    "vehicle", "date", "odometer_km", "energy", "kind", "full", "level_percent", "missed", "distance_km",
    "cost", "currency", "temperature_c", "speed_kmh", "place", "note", "confirmed",
)  # fmt: skip
VEHICLES = (
    "vehicle", "carrier", "unit", "capacity", "distance_unit", "display", "typed_unit",
    "second_carrier", "second_unit", "second_capacity", "co2_kg", "second_co2_kg", "note",
)  # fmt: skip
MODIFICATIONS = (
    "vehicle", "name", "fitted_date", "fitted_km", "removed_date", "removed_km", "level", "target_percent",
    "known_low_percent", "known_high_percent", "reversible", "note",
)  # fmt: skip
EVENTS = ("vehicle", "date", "odometer_km", "what", "odometer_factor", "note")
WEATHER = ("date", "temperature_c")


@dataclass(frozen=True, slots=True)
class Form:
    """How a table is written, where it is not written as this project writes its own."""

    columns: Mapping[str, str] = field(default_factory=dict)  # our column -> theirs
    delimiter: str | None = None  # None: , ; or tab, as the header line shows
    encoding: str | None = None  # None: UTF-8, else Windows-1252
    decimal_comma: bool = False
    thousands: str | None = None
    day_first: bool = False
    date_format: str | None = None
    km: float = 1.0  # km in one unit of odometer and distance
    energy: float = 1.0  # the vehicle's units in one unit of energy
    kmh: float = 1.0  # km/h in one unit of speed
    fahrenheit: bool = False
    typed_units: Mapping[str, str] = field(default_factory=dict)  # our column -> its unit in the file, where not ours
    vehicle: str | None = None  # for rows that name none
    kinds: Mapping[str, str] = field(default_factory=dict)  # vehicle -> kind of rows that name none; "": any vehicle
    currency: str | None = None  # for costs without one

    def __post_init__(self) -> None:
        marks = ("'", " ", "." if self.decimal_comma else ",")
        if self.thousands is not None and self.thousands not in marks:
            raise EntryError(f"{self.thousands!r} cannot be the thousands mark of this file; it is one of {marks}")
        try:
            date_reader(self.day_first, self.date_format)
        except CellError as error:
            raise EntryError(str(error)) from None


def entry_readers(form: Form) -> dict[str, Reader]:
    """Readers of the entries table."""
    number, date = number_reader(form.decimal_comma, form.thousands), date_reader(form.day_first, form.date_format)
    return {
        "vehicle": text_of,
        "date": date,
        "odometer_km": _scaled(_at_least_zero(number, "an odometer value"), form.km),
        "energy": _scaled(_positive(number, "the energy bought"), form.energy),
        "kind": _one_of(KINDS),
        "full": yes_or_no,
        "level_percent": _within(number, 0, 100, "a level is read in percent of the capacity"),
        "missed": yes_or_no,
        "distance_km": _scaled(_positive(number, "the distance since the last entry"), form.km),
        "cost": _at_least_zero(number, "a cost"),
        "currency": text_of,
        "temperature_c": _temperature(form, number),
        "speed_kmh": _scaled(_positive(number, "a mean speed"), form.kmh),
        "place": text_of,
        "note": text_of,
        "confirmed": yes_or_no,
    }


def vehicle_readers(form: Form) -> dict[str, Reader]:
    """Readers of the vehicles table."""
    number = number_reader(form.decimal_comma, form.thousands)
    return {
        "vehicle": text_of,
        "carrier": _one_of(CARRIERS),
        "unit": _one_of(UNITS),
        "capacity": _positive(number, "a capacity"),
        "distance_unit": _one_of(tuple(DISTANCE)),
        "display": _one_of(tuple(CONSUMPTION)),
        "typed_unit": _one_of(tuple(ENERGY)),
        "second_carrier": _one_of(CARRIERS),
        "second_unit": _one_of(UNITS),
        "second_capacity": _positive(number, "a capacity"),
        "co2_kg": _at_least_zero(number, "a CO2 factor"),
        "second_co2_kg": _at_least_zero(number, "a CO2 factor"),
        "note": text_of,
    }


def modification_readers(form: Form) -> dict[str, Reader]:
    """Readers of the modifications table."""
    number, date = number_reader(form.decimal_comma, form.thousands), date_reader(form.day_first, form.date_format)
    odometer = _scaled(_at_least_zero(number, "an odometer value"), form.km)
    return {
        "vehicle": text_of,
        "name": text_of,
        "fitted_date": date,
        "fitted_km": odometer,
        "removed_date": date,
        "removed_km": odometer,
        "level": number,
        "target_percent": _target(_positive(number, "a target")),
        "known_low_percent": number,
        "known_high_percent": number,
        "reversible": yes_or_no,
        "note": text_of,
    }


def event_readers(form: Form) -> dict[str, Reader]:
    """Readers of the events table."""
    number = number_reader(form.decimal_comma, form.thousands)
    return {
        "vehicle": text_of,
        "date": date_reader(form.day_first, form.date_format),
        "odometer_km": _scaled(_at_least_zero(number, "an odometer value"), form.km),
        "what": text_of,
        "odometer_factor": _within(number, 0.5, 2, "true km per odometer km lies near 1"),
        "note": text_of,
    }


def weather_readers(form: Form) -> dict[str, Reader]:
    """Readers of the weather table."""
    number = number_reader(form.decimal_comma, form.thousands)
    return {"date": date_reader(form.day_first, form.date_format), "temperature_c": _temperature(form, number)}


def _scaled(read: Reader, factor: float) -> Reader:
    return read if factor == 1.0 else lambda text: read(text) * factor


def _positive(number: Reader, what: str) -> Reader:
    def read(text: str) -> float:
        value: float = number(text)
        if value <= 0:
            raise CellError(f"{in_short(text)}: {what} is more than 0; leave the cell empty if it is unknown")
        if value < SMALLEST:
            raise CellError(f"{in_short(text)} is beyond anything measured on a vehicle; correct it")
        return value

    return read


def _target(positive: Reader) -> Reader:
    def read(text: str) -> float:
        value: float = positive(text)
        if value > LARGEST_TARGET_PERCENT:
            raise CellError(f"{in_short(text)}: a target is at most {LARGEST_TARGET_PERCENT:g} %; write 3 for 3 %")
        return value

    return read


def _at_least_zero(number: Reader, what: str) -> Reader:
    def read(text: str) -> float:
        value: float = number(text)
        if value < 0:
            raise CellError(f"{in_short(text)}: {what} is not below 0; leave the cell empty if it is unknown")
        return value

    return read


def _within(number: Reader, low: float, high: float, why: str) -> Reader:
    def read(text: str) -> float:
        value: float = number(text)
        if not low <= value <= high:
            raise CellError(f"{in_short(text)} is outside {low:g} to {high:g}: {why}")
        return value

    return read


def _temperature(form: Form, number: Reader) -> Reader:
    """The outside temperatures met on Earth lie between -90 and 60 degrees Celsius."""

    def read(text: str) -> float:
        value: float = celsius(number(text)) if form.fahrenheit else number(text)
        if not -90 <= value <= 60:
            remedy = "correct it" if form.fahrenheit else "correct it, or import with --temperature-unit F"
            raise CellError(f"{in_short(text)} is no outside temperature; {remedy}")
        return value

    return read


def _one_of(words: tuple[str, ...]) -> Reader:
    def read(text: str) -> str:
        if text in words:
            return text
        raise CellError(f"{in_short(text)} is not one of: {', '.join(words)}")

    return read
