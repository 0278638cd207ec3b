"""Units: what is typed into base units, base units into what is shown. Exact definitions throughout.

Source of the factors: NIST SP 811 (2008), appendix B.8; mile, pound and both gallons are exact by definition.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from contextlib import suppress
from types import MappingProxyType
from typing import NamedTuple

from energytrack.errors import EntryError
from energytrack.logbook.records import Vehicle

LITRES_PER_US_GALLON = 3.785411784
LITRES_PER_IMPERIAL_GALLON = 4.54609
KM_PER_MILE = 1.609344
KG_PER_POUND = 0.45359237
MJ_PER_KWH = 3.6

ENERGY = MappingProxyType(  # unit as typed -> base unit, base units in one of it
    {
        "L": ("L", 1.0),
        "gal-us": ("L", LITRES_PER_US_GALLON),
        "gal-imp": ("L", LITRES_PER_IMPERIAL_GALLON),
        "kg": ("kg", 1.0),
        "lb": ("kg", KG_PER_POUND),
        "kWh": ("kWh", 1.0),
        "MJ": ("kWh", 1 / MJ_PER_KWH),
    }
)
DISTANCE = MappingProxyType({"km": 1.0, "mi": KM_PER_MILE})


class ConsumptionUnit(NamedTuple):
    """One way to show energy per distance."""

    label: str
    energy: str  # a key of ENERGY
    km: float  # distance the figure refers to
    inverse: bool  # distance per energy


CONSUMPTION = MappingProxyType(
    {
        "L/100km": ConsumptionUnit("L/100 km", "L", 100.0, False),
        "kg/100km": ConsumptionUnit("kg/100 km", "kg", 100.0, False),
        "kWh/100km": ConsumptionUnit("kWh/100 km", "kWh", 100.0, False),
        "km/L": ConsumptionUnit("km/L", "L", 1.0, True),
        "km/kg": ConsumptionUnit("km/kg", "kg", 1.0, True),
        "km/kWh": ConsumptionUnit("km/kWh", "kWh", 1.0, True),
        "mpg-us": ConsumptionUnit("mpg (US)", "gal-us", KM_PER_MILE, True),
        "mpg-imp": ConsumptionUnit("mpg (imperial)", "gal-imp", KM_PER_MILE, True),
        "mi/kg": ConsumptionUnit("mi/kg", "kg", KM_PER_MILE, True),
        "mi/kWh": ConsumptionUnit("mi/kWh", "kWh", KM_PER_MILE, True),
    }
)

SMALLEST, LARGEST = 1e-15, 1e15  # of a typed number that is not 0: squares, sums and quotients stay finite
_NUMERIC = frozenset("0123456789+-.eE")  # float() also takes nan, inf, 1_000 and the digits of other scripts
_DECIMAL_COMMA = r"[+-]?[0-9]+,[0-9]+"
_GROUPED = r"[+-]?[0-9]{1,3}(?:[ ,.'_\u00a0\u202f][0-9]{3})+(?:[.,][0-9]+)?"


def parse_number(text: str, what: str) -> float:
    """A finite number as typed. Raises EntryError naming `what` and how to write it."""
    text = text.strip()
    value = math.nan
    with suppress(ValueError):
        value = float(text) if _NUMERIC.issuperset(text) else math.nan
    if math.isfinite(value):
        if value and not SMALLEST <= abs(value) <= LARGEST:
            raise EntryError(f"{what} {in_short(text)} is beyond anything measured on a vehicle: correct it")
        return value
    if re.fullmatch(_DECIMAL_COMMA, text) and re.fullmatch(_GROUPED, text):
        whole, decimal = text.replace(",", ""), text.replace(",", ".")
        raise EntryError(f"{what} {in_short(text)} can be read two ways: write {whole}, or {decimal} if that is meant")
    if re.fullmatch(_DECIMAL_COMMA, text):
        raise EntryError(f"{what} has a decimal comma: write {text.replace(',', '.')}, not {text}")
    if re.fullmatch(_GROUPED, text):
        raise EntryError(f"{what} {in_short(text)} has thousands separators: write digits and a decimal point only")
    raise EntryError(f"{what} {in_short(text)} is not a number: write digits with a decimal point, such as 41.32")


def in_short(text: str) -> str:
    """The text as a message may show it: short, one line, nothing a terminal would obey."""
    return repr(text if len(text) <= 40 else text[:40] + "...")


def parse_temperature(text: str) -> float:
    """Degrees Celsius from `12`, `12C` or `54F`. Raises EntryError."""
    text = text.strip()
    unit = text[-1:].upper()
    if unit not in ("C", "F"):
        return parse_number(text, "temperature")
    value = parse_number(text[:-1].rstrip().removesuffix("°"), "temperature")
    return celsius(value) if unit == "F" else value


def celsius(fahrenheit: float) -> float:
    """Degrees Celsius of degrees Fahrenheit."""
    return (fahrenheit - 32.0) / 1.8


def in_any_case(text: str, words: Iterable[str]) -> str:
    """The word that `text` is but for capitals: `kwh` is `kWh`; `text` itself where it is none of them."""
    return next((word for word in words if word.lower() == text.strip().lower()), text)


def base_unit(unit: str) -> str:
    """The base unit (L, kg, kWh or km) of a typed unit. Raises EntryError for one that does not exist."""
    if unit in DISTANCE:
        return "km"
    if unit in ENERGY:
        return ENERGY[unit][0]
    raise EntryError(f"unknown unit {unit!r}: use one of {', '.join([*ENERGY, *DISTANCE])}")


def to_base(value: float, unit: str) -> float:
    """A typed value in its base unit; speeds in mi/h convert as miles. Raises EntryError for an unknown unit."""
    base_unit(unit)
    return value * (DISTANCE[unit] if unit in DISTANCE else ENERGY[unit][1])


def from_base(value: float, unit: str) -> float:
    """A base value in the unit it is shown in. Raises EntryError for an unknown unit."""
    return value / to_base(1.0, unit)


def consumption_unit(vehicle: Vehicle) -> ConsumptionUnit:
    """How this vehicle's consumption is shown: its setting, else its unit per 100 km."""
    return CONSUMPTION[vehicle.display or f"{vehicle.unit}/100km"]


def consumption(energy_per_km: float, vehicle: Vehicle) -> float:
    """Energy per km in the vehicle's own consumption unit; infinite distance per no energy is nan."""
    shown = consumption_unit(vehicle)
    per_distance = from_base(energy_per_km * shown.km, shown.energy)
    if not shown.inverse:
        return per_distance
    return 1 / per_distance if per_distance else math.nan


def consumption_text(energy_per_km: float, vehicle: Vehicle) -> str:
    """Consumption to three significant digits: `8.24 L/100 km`, `34.1 mpg (US)`."""
    return f"{rounded(consumption(energy_per_km, vehicle), 3)} {consumption_unit(vehicle).label}"


def distance_text(km: float, vehicle: Vehicle) -> str:
    """A distance in whole units of the vehicle, grouped: `1,860 km`; one decimal below 10."""
    value = from_base(km, vehicle.distance_unit)
    return f"{value:,.{1 if abs(value) < 9.95 and value % 1 else 0}f} {vehicle.distance_unit}"


def energy_text(energy: float, vehicle: Vehicle) -> str:
    """An amount in the unit this vehicle's amounts are typed in, two decimals: `41.32 L`, `10.92 gal (US)`."""
    unit = vehicle.typed_unit or vehicle.unit
    label = {"gal-us": "gal (US)", "gal-imp": "gal (imperial)"}.get(unit, unit)
    return f"{from_base(energy, unit):,.2f} {label}"


def speed_text(kmh: float, vehicle: Vehicle) -> str:
    """A mean speed in whole km/h, or mi/h where the vehicle counts miles."""
    return f"{from_base(kmh, vehicle.distance_unit):.0f} {vehicle.distance_unit}/h"


def rounded(value: float, digits: int) -> str:
    """A value to so many significant digits, never in powers of ten; digits before the point are all kept."""
    if not math.isfinite(value) or value == 0:
        return f"{value:g}"
    value = float(f"{value:.{digits - 1}e}") if abs(value) < 10**digits else value
    decimals = max(0, digits - 1 - math.floor(math.log10(abs(value))))
    return f"{value:,.{decimals}f}"
