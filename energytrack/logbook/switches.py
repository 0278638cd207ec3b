"""Parts put on and taken off: single switches as they were logged, and the periods they add up to."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterable, Sequence
from dataclasses import replace
from itertools import groupby
from typing import NamedTuple

from energytrack.errors import EntryError
from energytrack.logbook.records import Modification


class Switch(NamedTuple):  # a frozen dataclass takes five times as long to define, on every command
    """A part fitted or removed, at an odometer value, on a date, or both."""

    modification: str
    fitted: bool  # False: removed
    date: dt.date | None
    km: float | None
    level: float | None = None
    target_percent: float | None = None
    note: str = ""
    known: tuple[float, float] | None = None
    reversible: bool = True


_Logged = tuple[int, Switch]  # the place in the order of logging


def pair(vehicle: str, switches: Iterable[Switch]) -> list[Modification]:
    """The periods in which each part was on. Fitting at another level ends the earlier level there."""
    by_name: dict[str, list[Switch]] = {}
    for switch in switches:
        by_name.setdefault(switch.modification, []).append(switch)
    return [period for own in by_name.values() for period in _periods(vehicle, in_order(own))]


def in_order(switches: Iterable[Switch]) -> list[Switch]:
    """The one order that what was logged allows: odometer values first, then dates, then the order of logging.

    Those with an odometer value stand in its order; at one value by date, or as logged where one has no date. Those
    with a date alone stand among them: after all of an earlier day, before all of a later one, and between these (the
    same day, or no day known) after all that were logged before. Among themselves they stand by date, then as logged.
    """
    logged = list(enumerate(switches))
    measured = _by_odometer([each for each in logged if each[1].km is not None])
    dated = sorted(((number, one) for number, one in logged if one.km is None and one.date), key=_day)
    nowhere = [(number, one) for number, one in logged if one.km is None and not one.date]
    placed: list[tuple[int, int, Switch]] = [(place, -1, one) for place, (_, one) in enumerate(measured)]
    least = -1
    for rank, each in enumerate(dated):
        least = max(least, _last_before(each, measured))
        placed.append((least, rank, each[1]))
    return [one for *_, one in sorted(placed, key=lambda each: each[:2])] + [one for _, one in nowhere]


def check_switch(vehicle: str, switches: Sequence[Switch], new: Switch) -> None:
    """Refuse fitting what is on and removing what is not. Raises EntryError with what is fitted."""
    own = [each for each in switches if each.modification == new.modification]
    order = in_order([*own, new])
    here = next(index for index, each in enumerate(order) if each is new)
    before = order[here - 1] if here else None
    on = before if before is not None and before.fitted else None
    if new.fitted and on is not None and on.level == new.level:
        raise EntryError(
            f"{new.modification!r} is fitted to {vehicle} since {place(on)}: log its removal first, "
            "or name another --level if it was changed"
        )
    if not new.fitted and (on is None or (here + 1 < len(order) and not order[here + 1].fitted)):
        periods = pair(vehicle, switches)
        fitted = ", ".join(repr(each.name) for each in periods if each.removed_date is None and each.removed_km is None)
        raise EntryError(
            f"{new.modification!r} is not fitted to {vehicle} at {place(new)}; fitted now: {fitted or 'nothing'}"
        )


def place(switch: Switch) -> str:
    """Where a switch stands, for messages."""
    parts = ([f"{switch.km:,.0f} km"] if switch.km is not None else []) + ([f"{switch.date}"] if switch.date else [])
    return ", ".join(parts)


def _day(logged: _Logged) -> dt.date:
    return logged[1].date or dt.date.min


def _by_odometer(measured: list[_Logged]) -> list[_Logged]:
    ordered: list[_Logged] = []
    for _, same in groupby(sorted(measured, key=lambda each: each[1].km or 0.0), key=lambda each: each[1].km):
        at_one_value = list(same)
        ordered += sorted(at_one_value, key=_day) if all(one.date for _, one in at_one_value) else at_one_value
    return ordered


def _last_before(logged: _Logged, measured: Sequence[_Logged]) -> int:
    """Place of the last of those with an odometer value that comes before one with a date alone; -1 for none."""
    number, own = logged[0], _day(logged)
    last = -1
    for place, (other, switch) in enumerate(measured):
        if switch.date is not None and switch.date > own:
            break
        if other < number or (switch.date is not None and switch.date < own):
            last = place
    return last


def _periods(vehicle: str, ordered: Iterable[Switch]) -> list[Modification]:
    periods: list[Modification] = []
    on = False
    for switch in ordered:
        if on:
            periods[-1] = replace(periods[-1], removed_date=switch.date, removed_km=switch.km)
        if switch.fitted:
            periods.append(_fitted(vehicle, switch))
        on = switch.fitted
    return periods


def _fitted(vehicle: str, switch: Switch) -> Modification:
    return Modification(
        vehicle=vehicle,
        name=switch.modification,
        fitted_date=switch.date,
        fitted_km=switch.km,
        level=switch.level,
        target_percent=switch.target_percent,
        note=switch.note,
        known=switch.known,
        reversible=switch.reversible,
    )
