"""Parts put on and taken off: single switches as they were logged, and the periods they add up to."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterable, Sequence
from dataclasses import replace
from functools import cmp_to_key
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


def pair(vehicle: str, switches: Iterable[Switch]) -> list[Modification]:
    """The periods in which each part was on. Fitting at another level ends the earlier level there."""
    by_name: dict[str, list[Switch]] = {}
    for switch in switches:
        by_name.setdefault(switch.modification, []).append(switch)
    return [period for own in by_name.values() for period in _periods(vehicle, in_order(own))]


def in_order(switches: Iterable[Switch]) -> list[Switch]:
    """By odometer where both have one, else by date where both have one, else as logged."""
    return sorted(switches, key=cmp_to_key(_compare))


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


def _compare(one: Switch, other: Switch) -> int:
    if one.km is not None and other.km is not None and one.km != other.km:
        return -1 if one.km < other.km else 1
    if one.date is not None and other.date is not None and one.date != other.date:
        return -1 if one.date < other.date else 1
    return 0


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
