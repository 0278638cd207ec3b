"""A break beside what was logged: what agrees with it, or where to look. Never a diagnosis."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence

from energytrack.inference.regimes.results import Match
from energytrack.inference.results import Range
from energytrack.logbook.records import Event, Modification

CAUTION = (
    "A sudden unexplained rise: have brakes, tyres and leaks inspected by a qualified person "
    "before further driving tests."
)
_LARGE = 8.0  # percent; beyond the usual swing of habits: common practice, no source
_COLD, _WARM = (10, 11, 12, 1), (3, 4, 5, 6)  # months in which the north turns to winter and to summer


def matches(
    place_km: float,
    interval_km: Range,
    interval_dates: tuple[str, str],
    modifications: Sequence[Modification],
    events: Sequence[Event],
) -> tuple[Match, ...]:
    """What was fitted, removed or noted inside the break's range, nearest first; the odometer decides where known."""
    found = [match for match in _logged(modifications, events) if _inside(match, interval_km, interval_dates)]
    return tuple(sorted(found, key=lambda match: abs((match.odometer_km or place_km) - place_km)))


def _logged(modifications: Sequence[Modification], events: Sequence[Event]) -> list[Match]:
    found = []
    for row in modifications:
        found.append(_match(row.name, "fitted", row.fitted_km, row.fitted_date))
        if row.removed_km is not None or row.removed_date is not None:
            found.append(_match(row.name, "removed", row.removed_km, row.removed_date))
    return [*found, *(_match(event.what, "event", event.odometer_km, event.date) for event in events)]


def _match(what: str, kind: str, km: float | None, day: dt.date | None) -> Match:
    return Match(what, kind, km, None if day is None else day.isoformat())  # type: ignore[arg-type]


def _inside(match: Match, interval_km: Range, interval_dates: tuple[str, str]) -> bool:
    if match.odometer_km is not None:
        return interval_km[0] <= match.odometer_km <= interval_km[1]
    return match.date is not None and interval_dates[0] <= match.date <= interval_dates[1]


def explanation(found: Sequence[Match], interval_km: Range, interval_dates: tuple[str, str]) -> str:
    """What agrees with the break, or that nothing logged does."""
    low, high = interval_km
    km = f"{low:,.0f}-{high:,.0f} km"
    if not found:
        return f"unexplained: nothing was logged from {low:,.0f} to {high:,.0f} km ({' to '.join(interval_dates)})"
    first = found[0]
    happened = first.what if first.kind == "event" else f"{first.what} {first.kind}"
    if first.odometer_km is not None:
        where = f"at {first.odometer_km:,.0f} km, inside the break's range {km}"
    else:
        where = f"on {first.date}, inside the break's range {interval_dates[0]} to {interval_dates[1]}"
    more = "" if len(found) == 1 else f"; so does {', '.join(_named(match) for match in found[1:])}"
    return f"{happened} {where}: agrees{more}"


def _named(match: Match) -> str:
    return match.what if match.kind == "event" else f"{match.what} {match.kind}"


def suspects(shift_percent: float, date: str, unit: str) -> tuple[str, ...]:
    """Places to look, the likeliest first, by sign, size and season. Common practice, no source."""
    month = int(date[5:7])
    return _of_a_rise(shift_percent, month, unit) if shift_percent > 0 else _of_a_fall(shift_percent, month, unit)


def _of_a_rise(shift_percent: float, month: int, unit: str) -> tuple[str, ...]:
    """Common practice, no source."""
    places = ["tyres: pressure lost, or another set put on"]
    if shift_percent >= _LARGE:
        places[:0] = ["brakes: one that drags makes a wheel hot", "something on the roof or in tow, or a heavy load"]
    if month in _COLD:
        winter = "winter blend, winter tyres" if unit != "kWh" else "a cold battery, winter tyres"
        places.append(f"the cold season, where it begins then: {winter}, heating")
    leak = "a leak of fuel, or another brand of it"
    return (*places, "losses of another charger" if unit == "kWh" else leak, "another driver, route or habit")


def _of_a_fall(shift_percent: float, month: int, unit: str) -> tuple[str, ...]:
    """Common practice, no source."""
    places = ["tyres: pumped up, or another set put on"]
    if shift_percent <= -_LARGE:
        places.insert(0, "something taken off the roof or the tow bar, or a fault mended, such as a brake that dragged")
    if month in _WARM:
        summer = "summer blend, summer tyres" if unit != "kWh" else "a warm battery, summer tyres"
        places.append(f"the warm season, where it begins then: {summer}, no heating")
    return (*places, "tyres of another size: the odometer counts other kilometres", "another driver, route or habit")
