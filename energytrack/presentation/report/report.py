"""Months of one or several vehicles as a page."""

from __future__ import annotations

import datetime as dt
import re
import unicodedata
from collections.abc import Sequence

from energytrack.inference.fleet.results import FleetAssessment
from energytrack.inference.report.results import MonthReport
from energytrack.logbook.carriers import in_total
from energytrack.logbook.records import Vehicle
from energytrack.presentation.plain import plain_text
from energytrack.presentation.report import together
from energytrack.presentation.report.chapter import chapter_of
from energytrack.presentation.report.page import Page, Section

_READ = (
    "Consumption is brought to reference conditions, so that a cold month is not blamed on the driver or the part.",
    "A look-proof range holds however often the test is looked at, and whenever it is ended.",
    "Every figure is by the log up to the end of the month; the entry that closes the last segment counts whole.",
)


def page_of(
    found: Sequence[tuple[Vehicle, MonthReport]],
    made_on: dt.date,
    cautions: Sequence[str],
    fleet: FleetAssessment | None = None,
) -> Page:
    """A chapter a vehicle, after one of all together where `fleet` is given.

    `made_on` is stated; nothing else on the page depends on when it was made.
    """
    names = _names([vehicle.name for vehicle, _ in found])
    chapters = tuple(
        chapter_of(one, in_total(vehicle), name) for (vehicle, one), name in zip(found, names, strict=True)
    )
    if fleet is not None:
        chapters = (together.chapter_of(fleet, {vehicle.name: vehicle for vehicle, _ in found}), *chapters)
    months = sorted({one.review.month for _, one in found})
    span = months[0] if len(months) == 1 else f"{months[0]} to {months[-1]}"
    whose = f" of {plain_text(found[0][0].name)}" if len(found) == 1 else ""
    made = f"Made on {made_on.isoformat()} from the logbook, one vehicle after the other."
    if len(found) == 1:
        made = f"Made on {made_on.isoformat()} from the logbook."
    return Page(f"Energy use{whose}, {span}", made, chapters, Section("How to read it", items=(*_READ, *cautions)))


def _names(vehicles: Sequence[str]) -> list[str]:
    """Of files and places in a page: plain letters and digits, each unlike the others."""
    found = [together.NAME]
    for number, vehicle in enumerate(vehicles, start=1):
        plain = unicodedata.normalize("NFKD", vehicle).encode("ascii", "ignore").decode().lower()
        name = re.sub(r"[^a-z0-9]+", "-", plain).strip("-")[:40] or "vehicle"
        name = name if name[0].isalpha() else f"vehicle-{name}"
        found.append(name if name not in found else f"{name}-{number}")
    return found[1:]
