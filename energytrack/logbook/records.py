"""What a logbook holds: vehicles, entries, switches of modifications, events, weather. Plain values, base units.

Base units: km, the vehicle's own energy unit (L, kg or kWh), degrees Celsius, km/h.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

CARRIERS = ("petrol", "diesel", "ethanol-blend", "lpg", "cng", "hydrogen", "electricity")
UNIT_OF_CARRIER = MappingProxyType(
    {
        "petrol": "L",
        "diesel": "L",
        "ethanol-blend": "L",
        "lpg": "L",
        "cng": "kg",
        "hydrogen": "kg",
        "electricity": "kWh",
    }
)
UNITS = ("L", "kg", "kWh")
KINDS = ("fill-up", "charge")
_NOTHING: Mapping[str, float] = MappingProxyType({})


@dataclass(frozen=True, slots=True)
class Vehicle:
    """A vehicle and how its owner wants it shown."""

    name: str
    carrier: str
    unit: str  # L, kg or kWh: the unit of every stored energy of this vehicle
    capacity: float | None = None  # tank or usable battery capacity, in `unit`
    distance_unit: str = "km"  # km or mi: how odometer values are typed and shown
    display: str | None = None  # consumption unit shown, a key of quantities.CONSUMPTION; None: the carrier's usual one
    note: str = ""
    typed_unit: str | None = None  # unit of amounts typed without one, a key of quantities.ENERGY; None: `unit`
    second_carrier: str | None = None  # of a vehicle with tank and battery; None: it has one carrier
    second_unit: str | None = None  # of amounts of the second carrier
    second_capacity: float | None = None  # in `second_unit`
    co2_kg: float | None = None  # of one `unit` of energy, tank to wheel or by the grid; None: the carrier's usual one
    second_co2_kg: float | None = None  # of one `second_unit`


@dataclass(frozen=True, slots=True)
class Entry:
    """One fill-up or charge session."""

    vehicle: str
    date: dt.date
    energy: float  # bought, in the vehicle's unit; nan where a receipt has no amount
    odometer_km: float | None = None
    kind: str = "fill-up"
    full: bool = True  # filled to the usual full mark; ignored where level_percent is given
    level_percent: float | None = None  # reading after the entry
    missed: bool = False  # entries are missing before this one
    distance_km: float | None = None  # since the last entry, for logs without an odometer
    cost: float | None = None
    currency: str | None = None
    temperature_c: float | None = None  # of the driving since the last entry
    speed_kmh: float | None = None  # mean speed of the driving since the last entry
    place: str = ""
    note: str = ""
    extra: Mapping[str, float] = field(default_factory=lambda: _NOTHING)  # further numeric columns
    confirmed: bool = False  # looks odd and is right: kept
    id: int | None = None  # the store's number, None outside a store


@dataclass(frozen=True, slots=True)
class Modification:
    """One period in which a part was fitted; several of one name mean it was fitted several times."""

    vehicle: str
    name: str
    fitted_date: dt.date | None = None
    fitted_km: float | None = None
    removed_date: dt.date | None = None  # both removed_* empty: still on
    removed_km: float | None = None
    level: float | None = None  # empty: on or off
    target_percent: float | None = None
    note: str = ""
    known: tuple[float, float] | None = None  # shift expected beforehand, low to high percent: a known change
    reversible: bool = True  # can be taken off again

    @property
    def known_low_percent(self) -> float | None:
        return None if self.known is None else self.known[0]

    @property
    def known_high_percent(self) -> float | None:
        return None if self.known is None else self.known[1]


@dataclass(frozen=True, slots=True)
class Event:
    """Something that happened to the vehicle and is not a modification under test."""

    vehicle: str
    date: dt.date
    what: str
    odometer_km: float | None = None
    odometer_factor: float | None = None  # true km per odometer km from here on
    note: str = ""


@dataclass(frozen=True, slots=True)
class Weather:
    """Mean outside temperature of one day."""

    date: dt.date
    temperature_c: float


@dataclass(frozen=True, slots=True)
class Problem:
    """Something wrong with the data, as a value: where it stands and what to do."""

    message: str
    file: str = ""
    line: int | None = None

    def __str__(self) -> str:
        where = f"{self.file}:{self.line}: " if self.line is not None else f"{self.file}: " if self.file else ""
        return where + self.message
