"""Draw the demonstration logbook: python -m tests.make_demo_logbook demo_logbook

Two years of an invented workshop with three vehicles; what they are and do stands in demo_scenario.py.

The same bytes come out on every platform: only the standard library's seeded uniform numbers, the four operations and
square roots are used, whose results do not depend on the platform's mathematical library.
"""

from __future__ import annotations

import csv
import datetime as dt
import math
import random
import sys
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

from tests.demo_scenario import (
    CHARGE_GOALS,
    CLOSED,
    CURRENCY,
    FIRST,
    LAST,
    MISSING_TEMPERATURE_SHARE,
    MONTHS,
    USUAL_TEMPERATURE,
    VEHICLES,
    Driven,
)

Row = dict[str, object]


class Dice:
    """Seeded numbers that are the same everywhere."""

    def __init__(self, seed: int) -> None:
        self._random = random.Random(seed)

    def uniform(self, low: float = 0.0, high: float = 1.0) -> float:
        return low + (high - low) * self._random.random()

    def normal(self) -> float:
        """Twelve uniforms less six: mean 0, variance 1, within six sd (Irwin-Hall)."""
        return math.fsum(self._random.random() for _ in range(12)) - 6.0

    def drift(self, keep: float, sd: float, days: int) -> list[float]:
        """A stationary first-order autoregression, one value a day."""
        value = sd * self.normal()
        path = []
        for _ in range(days):
            path.append(value)
            value = keep * value + sd * math.sqrt(1 - keep * keep) * self.normal()
        return path


def calendar() -> list[dt.date]:
    """Every day of the logbook."""
    return [FIRST + dt.timedelta(days=index) for index in range((LAST - FIRST).days + 1)]


def weather(dice: Dice) -> dict[dt.date, float]:
    """Mean temperature of each day: the season, and weather that lasts about a week (half-life 5 days)."""
    around = dice.drift(0.871, 3.2, len(calendar()))
    return {day: _season(day) + around[index] for index, day in enumerate(calendar())}


def _season(day: dt.date) -> float:
    month, share = (day.month - 1, (day.day - 15) / 30) if day.day >= 15 else (day.month - 2, (day.day + 15) / 30)
    return MONTHS[month % 12] * (1 - share) + MONTHS[(month + 1) % 12] * share


def is_working(day: dt.date, vehicle: Driven) -> bool:
    if any(first <= day <= last for first, last in CLOSED):
        return False
    return day.weekday() < (6 if vehicle.saturdays else 5)


@dataclass
class Tank:
    """What is in the tank or battery, and what has been driven since the last entry."""

    level: float
    odometer_km: float
    refill_below: float
    missed_on: dt.date | None  # the first full entry from here on is still to be forgotten
    forgotten: bool = False  # the last entry was
    km: float = 0.0
    hours: float = 0.0
    degree_km: float = 0.0

    def drive(self, km: float, on_odometer: float, speed: float, temperature: float, used: float) -> None:
        self.km += km
        self.hours += km / speed
        self.degree_km += km * temperature
        self.odometer_km += on_odometer
        self.level -= used


@dataclass
class Drawn:
    """What came out for one vehicle."""

    entries: list[Row] = field(default_factory=list)
    fitted_km: int | None = None  # odometer on the morning of the fitting
    tyres_km: int | None = None  # odometer on the morning of the tyre change


def drive(vehicle: Driven, temperatures: Mapping[dt.date, float]) -> Drawn:
    """Two years of one vehicle, day by day."""
    dice = Dice(vehicle.seed)
    days = calendar()
    weeks = dice.drift(0.96753, vehicle.weeks_percent / 100, len(days))  # half-life 21 days
    seasons = dice.drift(0.99616, vehicle.seasons_percent / 100, len(days))  # half-life 180 days
    prices = dice.drift(0.995, 0.06 * vehicle.price, len(days))
    opening = vehicle.capacity * 0.5
    tank = Tank(opening, vehicle.odometer_km, refill_below=opening, missed_on=vehicle.missed_on)  # fills up at once
    drawn = Drawn()
    for index, day in enumerate(days):
        if not is_working(day, vehicle):
            continue
        if day >= vehicle.fitted and drawn.fitted_km is None:
            drawn.fitted_km = round(tank.odometer_km)
        if vehicle.tyres and day >= vehicle.tyres[0] and drawn.tyres_km is None:
            drawn.tyres_km = round(tank.odometer_km)
        _drive_day(vehicle, dice, tank, day, temperatures[day], weeks[index] + seasons[index])
        if tank.level < tank.refill_below:
            row = _fill(vehicle, dice, tank, day, vehicle.price + prices[index])
            if not tank.forgotten:
                drawn.entries.append(row)
    return drawn


def _drive_day(vehicle: Driven, dice: Dice, tank: Tank, day: dt.date, temperature: float, drift: float) -> None:
    km = vehicle.km_per_day + vehicle.km_sd * dice.normal()
    speed = vehicle.speed_kmh + vehicle.speed_sd * dice.normal()
    ratio = speed / vehicle.speed_kmh
    relative = (
        1
        + vehicle.heating / 100 * (max(0.0, 18 - temperature) - (18 - USUAL_TEMPERATURE))
        + vehicle.cooling / 100 * max(0.0, temperature - 22)
        + vehicle.drag_share * (ratio * ratio - 1)
        + vehicle.accessory_share * (1 / ratio - 1)
        + drift
        + (vehicle.shift_percent / 100 if day >= vehicle.fitted else 0.0)
        + vehicle.day_percent / 100 * dice.normal()
    )
    factor = vehicle.tyres[1] if vehicle.tyres and day >= vehicle.tyres[0] else 1.0
    tank.drive(km, km / factor, speed, temperature, vehicle.consumption / 100 * km * relative)


def _fill(vehicle: Driven, dice: Dice, tank: Tank, day: dt.date, price: float) -> Row:
    """Fill up or charge, and write the entry; the tank remembers whether the entry was then forgotten."""
    electric = vehicle.unit == "kWh"
    error = vehicle.level_percent / 100 * vehicle.capacity
    partial = not electric and dice.uniform() < vehicle.partial_share
    if electric:
        goal = vehicle.capacity * CHARGE_GOALS[int(dice.uniform(0, len(CHARGE_GOALS)))]
    elif partial:
        goal = tank.level + 20 + 5 * int(dice.uniform(0, 3))
    else:
        goal = 0.96 * vehicle.capacity + error * dice.normal()
    bought = round(goal - tank.level, 2)
    tank.level += bought
    reading = min(100, round(100 * (tank.level + error * dice.normal()) / vehicle.capacity))
    reading_logged = electric and dice.uniform() > 0.03
    away = dice.uniform() < 0.2
    temperature_logged = dice.uniform() > MISSING_TEMPERATURE_SHARE
    row: Row = {
        "vehicle": vehicle.name,
        "date": day.isoformat(),
        "odometer_km": round(tank.odometer_km),
        "energy": f"{bought:.2f}",
        "kind": "charge" if electric else "fill-up",
        "full": "no" if partial or (electric and reading < 99) else "yes",
        "level_percent": reading if reading_logged else "",
        "missed": "yes" if tank.forgotten else "no",
        "cost": f"{bought * price * (1.4 if electric and away else 1.0):.2f}",
        "currency": CURRENCY,
        "temperature_c": round(tank.degree_km / tank.km) if temperature_logged else "",
        "speed_kmh": round(tank.km / tank.hours),
        "place": "roadside" if away else "yard" if electric else "ring road",
        "note": "paid for a set amount" if partial else "receipt before this one lost" if tank.forgotten else "",
    }
    tank.km = tank.hours = tank.degree_km = 0.0
    tank.refill_below = vehicle.capacity * dice.uniform(*vehicle.refill_at)
    tank.forgotten = tank.missed_on is not None and day >= tank.missed_on and not partial
    if tank.forgotten:
        tank.missed_on = None
    return row


def tables() -> dict[str, list[Row]]:
    """The tables of the logbook by file name."""
    temperatures = weather(Dice(1))
    drawn = {vehicle: drive(vehicle, temperatures) for vehicle in VEHICLES}
    entries = [row for one in drawn.values() for row in one.entries]
    entries.sort(key=lambda row: str(row["date"]))  # stable: the vehicles keep their order within a day
    return {
        "vehicles.csv": [
            {"vehicle": v.name, "carrier": v.carrier, "unit": v.unit, "capacity": v.capacity, "note": v.note}
            for v in VEHICLES
        ],
        "entries.csv": entries,
        "modifications.csv": [_modification(vehicle, one.fitted_km) for vehicle, one in drawn.items()],
        "events.csv": [_tyre_event(vehicle, one.tyres_km) for vehicle, one in drawn.items() if vehicle.tyres],
    }


def _modification(vehicle: Driven, fitted_km: int | None) -> Row:
    return {
        "vehicle": vehicle.name,
        "name": vehicle.part,
        "fitted_date": vehicle.fitted.isoformat(),
        "fitted_km": fitted_km,
        "removed_date": "",
        "removed_km": "",
        "level": "",
        "target_percent": vehicle.target_percent,
        "note": vehicle.part_note,
    }


def _tyre_event(vehicle: Driven, odometer_km: int | None) -> Row:
    assert vehicle.tyres is not None
    day, factor = vehicle.tyres
    return {
        "vehicle": vehicle.name,
        "date": day.isoformat(),
        "odometer_km": odometer_km,
        "what": "tyres of another size",
        "odometer_factor": factor,
        "note": "rolling circumference measured over ten turns",
    }


def write(folder: Path) -> None:
    """Write the tables as CSV: UTF-8, header row, line feed."""
    folder.mkdir(parents=True, exist_ok=True)
    for name, rows in tables().items():
        with (folder / name).open("w", encoding="utf-8", newline="") as file:
            writer = csv.DictWriter(file, fieldnames=list(rows[0]), lineterminator="\n")
            writer.writeheader()
            writer.writerows(rows)


if __name__ == "__main__":
    write(Path(sys.argv[1]))
