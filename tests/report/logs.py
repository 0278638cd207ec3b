"""A logbook with names that mean mischief to a page, and the report of it."""

from __future__ import annotations

import datetime as dt
import math
import random
from pathlib import Path

from energytrack.cli.cautions import CAUTIONS
from energytrack.cli.questions import tables
from energytrack.inference.fleet.results import FleetAssessment
from energytrack.inference.report.month_report import month_report
from energytrack.inference.report.results import MonthReport
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Entry, Event, Vehicle
from energytrack.logbook.store import Store
from energytrack.presentation.report.page import Page
from energytrack.presentation.report.report import page_of

VAN = 'van <script>alert(1)</script> & "x" | `y` $z$'
PART = "<img src=x onerror=alert(2)> *skirts* | [a](javascript:b) $\\frac{1}$ {{ 7 * 7 }}"
WHAT = "</svg><script>alert(3)</script> tyres"
OTHER = "van script alert 1"  # close to the first name once marks are left out
TODAY = dt.date(2026, 1, 10)
FITTED_KM, STEP_KM = 15_000.0, 500.0
COLD = 0.006  # of consumption, per degree below 18


def make(path: Path) -> Store:
    """Two vehicles: one with a part that saves 8 %, one in miles without any."""
    book = Store.create(path)
    book.add_vehicle(Vehicle(VAN, "diesel", "L", 70.0, "km"))
    book.add_vehicle(Vehicle(OTHER, "petrol", "L", 50.0, "mi", display="mpg-imp"))
    drive(book, VAN, 75, -0.08, seed=4)
    drive(book, OTHER, 30, 0.0, seed=5)
    book.fit(VAN, PART, dt.date(2025, 5, 4), FITTED_KM, 3.0, None, "<b>note</b>")
    book.add_event(Event(VAN, dt.date(2025, 3, 14), WHAT, 8_000.0))
    return book


def drive(book: Store, vehicle: str, tanks: int, shift: float, seed: int) -> None:
    rng, entries = random.Random(seed), []
    for tank in range(tanks):
        temperature, speed = 12 - 12 * math.cos(tank / 12), 60 + 6 * rng.random()
        rate = 0.08 * (1 + shift * (STEP_KM * tank > FITTED_KM) + COLD * max(0.0, 18 - temperature))
        rate *= 1 + 0.004 * (speed - 63) + 0.01 * rng.gauss(0, 1)
        day = dt.date(2025, 1, 4) + dt.timedelta(days=4 * tank)
        entry = Entry(
            vehicle, day, STEP_KM * rate, STEP_KM * tank, cost=70.0, currency="EUR",
            temperature_c=None if tank % 9 == 8 else temperature, speed_kmh=speed,
        )  # fmt: skip
        entries.append((entry, {}))
    book.add_entries(entries, source="test")


def reported(path: Path) -> list[tuple[Vehicle, MonthReport]]:
    book = open_logbook(path)
    return [
        (
            vehicle,
            month_report(
                **tables(book, vehicle),
                carrier=vehicle.carrier,
                typed_in=(vehicle.distance_unit, vehicle.typed_unit),
                today=TODAY,
            ),
        )
        for vehicle in book.vehicles()
    ]


def page(
    found: list[tuple[Vehicle, MonthReport]], day: dt.date = TODAY, fleet: FleetAssessment | None = None
) -> Page:
    return page_of(found, day, CAUTIONS, fleet)
