"""Rules for a new entry against itself and its neighbours. Pure functions; each refusal is one EntryError."""

from __future__ import annotations

import datetime as dt
import math
from contextlib import suppress

from energytrack.errors import EntryError
from energytrack.logbook.quantities import distance_text, energy_text, in_short, speed_text
from energytrack.logbook.records import Entry, Vehicle

FARTHEST_DAY_KM = 2000.0  # what drivers taking turns can do in a day
LARGEST_ODOMETER_KM = 10_000_000.0
OVERFILL = 1.3  # a filling may exceed the stated capacity: filler neck, charging losses, a rounded capacity
LARGEST_AMOUNT = 20_000.0  # L, kg or kWh: beyond the tanks and batteries of road vehicles
COLDEST_C, HOTTEST_C = -90.0, 60.0  # beyond any outside temperature met on Earth
FASTEST_KMH = 500.0
EARLIEST_YEAR = 1900
LATEST_YEAR = 2999  # of a day to plan from: the months after it are days of the calendar too
LARGEST_KNOWN_PERCENT = 100.0
LARGEST_TARGET_PERCENT = 50.0
LONGEST_NAME = 60  # keeps lists and answers readable
LONGEST_TEXT = 10_000  # characters: a few pages


def parse_date(text: str) -> dt.date:
    """A day written as 2026-05-03. Raises EntryError."""
    day = text.strip()
    with suppress(ValueError):
        if len(day) == 10 and day[4::3] == "--":  # fromisoformat takes other forms of ISO 8601 too
            found = dt.date.fromisoformat(day)
            if found.year <= LATEST_YEAR:
                return found
    wrong = f"date {in_short(text)} is not a day of the calendar"
    raise EntryError(f"{wrong} written as year-month-day, such as 2026-05-03")


def check_name(name: str, what: str) -> None:
    """Refuse a name of a vehicle or modification that a list cannot show. Raises EntryError."""
    if not name.strip() or not name.isprintable():
        raise EntryError(f"a {what} needs a name of printable characters")
    if len(name) > LONGEST_NAME:
        raise EntryError(f"the name of a {what} has at most {LONGEST_NAME} characters, not {len(name)}: shorten it")


def check_text(text: str, what: str) -> None:
    """Refuse a note no list can show. Raises EntryError."""
    if len(text) > LONGEST_TEXT:
        raise EntryError(f"a {what} has at most {LONGEST_TEXT:,} characters, not {len(text):,}: shorten it")


def check_date(date: dt.date, today: dt.date) -> None:
    """Refuse days to come, and years no log reaches back to. Raises EntryError."""
    if date > today:
        raise EntryError(f"date {date} lies in the future (today is {today}): correct it")
    if date.year < EARLIEST_YEAR:
        raise EntryError(f"date {date} lies before {EARLIEST_YEAR}: correct the year")


def check_odometer(odometer_km: float, vehicle: Vehicle) -> None:
    """Refuse a value that no odometer shows. Raises EntryError."""
    if not 0 <= odometer_km <= LARGEST_ODOMETER_KM:
        shown = distance_text(odometer_km, vehicle)
        raise EntryError(f"odometer {shown} is no odometer value: type what the instrument shows")


def check_distance(distance_km: float, vehicle: Vehicle) -> None:
    """Refuse a distance since the last entry that cannot be. Raises EntryError."""
    if not 0 < distance_km <= LARGEST_ODOMETER_KM:
        shown = distance_text(distance_km, vehicle)
        raise EntryError(f"distance {shown} since the last entry is not possible: correct it")


def check_energy(energy: float, vehicle: Vehicle) -> None:
    """Refuse an amount that was not bought at once. Raises EntryError."""
    if not (energy > 0 and math.isfinite(energy)):
        raise EntryError(f"amount {energy:g} must be more than 0: type what was bought")
    if energy > LARGEST_AMOUNT:
        raise EntryError(f"amount {energy:g} {vehicle.unit} is more than any vehicle holds: correct it")
    if vehicle.capacity is not None and energy > OVERFILL * vehicle.capacity:
        raise EntryError(
            f"amount {energy_text(energy, vehicle)} is more than {OVERFILL:g} times the capacity of "
            f"{vehicle.name}, {energy_text(vehicle.capacity, vehicle)}: correct it, or log each filling by itself"
        )


def check_known(low: float, high: float) -> None:
    """A known change lies on one side of zero, from its low to its high end, in percent. Raises EntryError."""
    shown = f"a known change of {low:g} to {high:g} %"
    if min(low, high) <= 0 <= max(low, high):
        raise EntryError(f"{shown} may be none at all: both ends above 0 (it costs), or both below 0 (it saves)")
    if low > high:
        raise EntryError(f"{shown} is written the wrong way round: the lower number comes first, {high:g}:{low:g}")
    if max(-low, high) > LARGEST_KNOWN_PERCENT:
        raise EntryError(f"{shown} is beyond {LARGEST_KNOWN_PERCENT:g} %: correct it")


def check_values(entry: Entry, vehicle: Vehicle, today: dt.date) -> None:
    """What can be said of an entry alone. Raises EntryError."""
    check_date(entry.date, today)
    check_text(entry.place, "place")
    check_text(entry.note, "note")
    if entry.odometer_km is not None:
        check_odometer(entry.odometer_km, vehicle)
    if entry.distance_km is not None:
        check_distance(entry.distance_km, vehicle)
    check_energy(entry.energy, vehicle)
    if entry.level_percent is not None and not 0 <= entry.level_percent <= 100:
        raise EntryError(f"level {entry.level_percent:g} is outside 0 to 100 %: type the reading after the entry")
    if entry.temperature_c is not None and not COLDEST_C <= entry.temperature_c <= HOTTEST_C:
        raise EntryError(
            f"temperature {entry.temperature_c:g} °C is no outside temperature: mark degrees Fahrenheit, such as 54F"
        )
    if entry.speed_kmh is not None and not 0 < entry.speed_kmh <= FASTEST_KMH:
        raise EntryError(f"speed {speed_text(entry.speed_kmh, vehicle)} is no mean speed of a road vehicle: correct it")
    if entry.cost is not None and not (entry.cost >= 0 and math.isfinite(entry.cost)):
        raise EntryError(f"cost {entry.cost:g} must not be below 0: correct it")


def check_place(
    entry: Entry,
    vehicle: Vehicle,
    before: Entry | None,
    after: Entry | None,
    twin: Entry | None,
    *,
    again: bool = False,
) -> None:
    """Whether an entry fits between its neighbours in driving order.

    `before` and `after` stand next to it by odometer, or by date where it has none; `twin` is an entry like it.
    `again` insists on a twin. Raises EntryError.
    """
    if twin is not None and not again:
        raise EntryError(f"{_what(twin, vehicle)} is logged already: add --again if this is another one")
    if entry.odometer_km is None:
        if entry.distance_km is not None and before is not None:
            _check_jump(entry.distance_km, before.date, entry.date, vehicle)
        return
    stands = before is not None and before.odometer_km == entry.odometer_km and before.kind == entry.kind
    if twin is None and before is not None and stands:
        raise EntryError(f"odometer stands still: {_stood(before, vehicle)}; type what the instrument shows now")
    check_reading(entry.date, entry.odometer_km, vehicle, before, after)


def check_reading(
    date: dt.date, odometer_km: float, vehicle: Vehicle, before: Entry | None, after: Entry | None
) -> None:
    """Whether a day and an odometer value fit between the entries next to it by odometer. Raises EntryError."""
    shown = distance_text(odometer_km, vehicle)
    same_day = after is not None and after.date == date
    too_far = after is not None and (after.odometer_km or 0.0) - odometer_km > FARTHEST_DAY_KM
    if after is not None and (after.date < date or (same_day and too_far)):
        raise EntryError(
            f"odometer goes back: {shown} on {date}, but {_stood(after, vehicle)}; "
            "correct it, or give the date of a forgotten receipt with --date"
        )
    if before is not None and before.date > date:
        raise EntryError(f"{shown} on {date} does not fit: {_stood(before, vehicle)}; correct the odometer or the date")
    if before is not None and before.odometer_km is not None:
        _check_jump(odometer_km - before.odometer_km, before.date, date, vehicle)
    if after is not None and after.odometer_km is not None:
        _check_jump(after.odometer_km - odometer_km, date, after.date, vehicle)


def check_measure(entry: Entry, last: Entry | None) -> None:
    """One vehicle is logged by odometer or by distance, not both. Raises EntryError."""
    if entry.odometer_km is None and entry.distance_km is None:
        raise EntryError("the odometer value is missing: type it, or --distance for a vehicle without an odometer")
    if last is None:
        return
    if (entry.odometer_km is None) != (last.odometer_km is None):
        needed = "--distance" if last.odometer_km is None else "an odometer value"
        raise EntryError(f"the entries of {entry.vehicle} so far have {needed}: type that for this one too")


def _check_jump(distance_km: float, start: dt.date, end: dt.date, vehicle: Vehicle) -> None:
    """A date is known to the day only: two days next to each other may hold almost two days of driving."""
    days = (end - start).days + 1
    if distance_km > FARTHEST_DAY_KM * days:
        raise EntryError(
            f"{distance_text(distance_km, vehicle)} between {start} and {end} is a jump no vehicle drives: "
            "correct odometer, distance or date"
        )


def _stood(entry: Entry, vehicle: Vehicle) -> str:
    return f"{distance_text(entry.odometer_km or 0.0, vehicle)} stood on {entry.date}"


def _what(entry: Entry, vehicle: Vehicle) -> str:
    place = f" at {distance_text(entry.odometer_km, vehicle)}" if entry.odometer_km is not None else ""
    return f"a {entry.kind} of {energy_text(entry.energy, vehicle)} on {entry.date}{place}"
