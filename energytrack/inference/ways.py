"""The ways to run a test that a plan compares: each one alone, or the best of several of a kind."""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass
from itertools import accumulate
from math import ceil, inf, isfinite, sqrt

from energytrack.inference.ahead import Reach, Road, Schedule, always_fitted, reach, segments_begun, segments_within
from energytrack.inference.costliest import cost_shares
from energytrack.inference.distance import ALTERNATIONS, LONGER_BASELINES, Course, course, need_along
from energytrack.inference.model import Model
from energytrack.inference.question import Question
from energytrack.inference.results import Design, DesignName
from energytrack.inference.schedules import WEEK_DAYS, alternating, from_day, off_first, on_off_on, weekly

DISTANCES_KM = (1_000, 2_500, 5_000, 10_000)
_MONTHS = 12  # ahead, in which the best date is looked for
_PHASES = (1, 2, 4, 8, 16, 32, 64)  # fill-ups, tried for each of the first two phases of on-off-on
_USUAL_PRICE = 1.2  # factor on the variance for not knowing the noise
_LOOKED_INTO = 4  # ways of a kind
_TAKEN_OFF: tuple[DesignName, ...] = ("on-off-on", "alternate", "alternate-weekly")


@dataclass(frozen=True)
class Way:
    """One schedule, and how it is called."""

    name: DesignName
    schedule: Schedule
    every_fillups: int | None = None
    phases: tuple[int, ...] = ()
    start: dt.date | None = None


def designs(model: Model, question: Question) -> tuple[Design, ...]:
    """The best way of each kind; of those that take the modification off, none where that cannot be done.

    Nor those that cover the target before they would take it off: they are one switch by another name.
    """
    kinds = ways(dt.date.fromordinal(int(model.observed.end_day[-1] + question.wait_days)))
    fitting = [kind for kind in kinds if question.reversible or kind[0].name not in _TAKEN_OFF]
    found = (_design(model, *_best(model, kind, question), question) for kind in fitting)
    return tuple(design for design in found if not _never_off(design))


def left_out(found: tuple[Design, ...], question: Question) -> list[str]:
    """A note where ways that take the modification off were left out for covering the target before they would."""
    swapping = sum(kind[0].name in _TAKEN_OFF for kind in ways(dt.date.min))
    lacking = swapping - sum(design.name in _TAKEN_OFF for design in found)
    if not found or not question.reversible or not lacking:
        return []
    which = "ways" if lacking == swapping else "some ways"
    return [f"{which} that take it off would get there before they first do: the same as one switch, and left out"]


def _never_off(design: Design) -> bool:
    return design.name in _TAKEN_OFF and design.distance_km is not None and (design.swaps or 0) <= 1


def ways(today: dt.date) -> tuple[tuple[Way, ...], ...]:
    """All of them, those of a kind together."""
    return (
        (Way("one-switch", always_fitted),),
        tuple(Way("best-date", from_day((day - today).days), start=day) for day in months_after(today)),
        tuple(Way("on-off-on", on_off_on(on, off), phases=(on, off)) for on in _PHASES for off in _PHASES),
        *((Way("alternate", alternating(every), every),) for every in ALTERNATIONS),
        (Way("alternate-weekly", weekly),),
        tuple(Way("longer-baseline", off_first(count), phases=(count,)) for count in LONGER_BASELINES),
    )


def months_after(today: dt.date) -> list[dt.date]:
    """The first days of the next twelve months."""
    first = today.year * 12 + today.month  # months since the year 0, January = 0: the month after this one
    return [dt.date(month // 12, month % 12 + 1, 1) for month in range(first, first + _MONTHS)]


def _best(model: Model, kind: tuple[Way, ...], question: Question) -> tuple[Way, Course]:
    """The shortest way to the target; where none gets there, the one that tells most in the end.

    All are ranked with the noise held for known, and only the first few with the price of not knowing it.
    """
    courses = [(way, course(model, way.schedule, question)) for way in kind]
    wanted = 1 / question.information

    def roughly(candidate: tuple[Way, Course]) -> tuple[bool, float, float]:
        way, here = candidate
        found = reach(here.road, here.variances.__getitem__, wanted / _USUAL_PRICE)
        return *_merit(way, here, found), float(here.variances[-1])

    def exactly(candidate: tuple[Way, Course]) -> tuple[bool, float, float]:
        way, here = candidate
        return *_merit(way, here, here.reach(wanted)), here.priced(here.road.ahead)

    return min(sorted(courses, key=roughly)[:_LOOKED_INTO], key=exactly)


def _merit(way: Way, here: Course, found: Reach | None) -> tuple[bool, float]:
    """Last those that end before their last phase has begun: they are other ways in truth."""
    if found is None:
        return False, inf
    return _phases_begun(here.road, way, found) <= len(way.phases), found.distance_km


def _phases_begun(ahead: Road, way: Way, found: Reach) -> int:
    """Phases entered by the time the target is covered."""
    begun = segments_begun(ahead, found.distance_km)
    return 1 + sum(begun > end for end in accumulate(way.phases))


def _design(model: Model, way: Way, here: Course, question: Question) -> Design:
    required = need_along(here, model, way.schedule, question)
    central = required.central
    count = here.road.ahead if central is None else segments_begun(here.road, central.distance_km)
    shares = cost_shares(model, here, count)
    source = max(shares, key=shares.__getitem__, default=None)
    return Design(
        name=way.name,
        every_fillups=way.every_fillups,
        swaps=_swaps(here.road, way, central),
        distance_km=None if central is None else central.distance_km,
        distance_interval_km=required.interval_km,
        days=None if central is None else central.days,
        resolvable_percent=_resolvable(here, question),
        start=None if way.start is None else way.start.isoformat(),
        phases=way.phases,
        costliest=source,
        costliest_share=None if source is None else shares[source],
        cost_shares=shares,
    )


def _resolvable(here: Course, question: Question) -> dict[str, float | None]:
    z = question.drift
    by_then = [100 * z * sqrt(here.priced(segments_within(here.road, km))) for km in DISTANCES_KM]
    never_worse = accumulate(by_then, min)  # the freedom is an approximation, and may lose more than a segment brings
    return {
        str(km): shift if isfinite(shift) else None for km, shift in zip(DISTANCES_KM, never_worse, strict=True)
    }


def _swaps(ahead: Road, way: Way, central: Reach | None) -> int | None:
    """Times the part goes on or comes off, the first fitting included."""
    if way.name in ("one-switch", "best-date", "longer-baseline"):
        return 1
    if way.name == "on-off-on":
        return 3 if central is None else _phases_begun(ahead, way, central)
    if central is None:
        return None
    if way.every_fillups is None:
        return ceil(central.days / WEEK_DAYS)
    return ceil(segments_begun(ahead, central.distance_km) / way.every_fillups)
