"""What was driven, used, bought and paid in a month: sums over entries and segments, nothing estimated.

A segment that crosses a month's end counts in each month by its share of the distance, the distance of each leg spread
evenly over its days. Standard library only.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from energytrack.consumption.segments import Leg, SegmentedLog
from energytrack.consumption.two_carriers import TwoCarriers, fuel_and_electric, in_kwh
from energytrack.inference.review.month import Month
from energytrack.inference.review.results import Driven
from energytrack.logbook.records import Entry


@dataclass(frozen=True)
class Account:
    """One vehicle's log, and the currency its costs are in."""

    log: SegmentedLog
    currency: str | None  # of all costs that name one
    mixed: str | None  # which entries are in which currency, where there are several

    def bought(self, both: TwoCarriers | None) -> list[tuple[int, Entry]]:
        """Day and entry, energies in the unit of the segments."""
        entries = self.log.entries if both is None else [in_kwh(entry, both) for entry in self.log.entries]
        return list(zip(self.log.days, entries, strict=True))


def account(log: SegmentedLog) -> Account:
    """The log with its currency; several currencies are never added up."""
    paid: dict[str, list[Entry]] = {}
    for entry in log.entries:
        if entry.cost is not None and entry.currency:
            paid.setdefault(entry.currency, []).append(entry)
    if len(paid) > 1:
        return Account(log, None, "; ".join(_named(currency, own) for currency, own in paid.items()))
    return Account(log, next(iter(paid), None), None)


def _named(currency: str, entries: Sequence[Entry]) -> str:
    """The entries in one currency: their days where they are few, else how many and from when to when."""
    days = [entry.date.isoformat() for entry in entries]
    told = ", ".join(days) if len(days) <= 3 else f"{len(days)} entries, {days[0]} to {days[-1]}"
    return f"{currency}: {told}"


def driven(accounted: Account, month: Month, both: TwoCarriers | None) -> Driven:
    """One month of a log."""
    log = accounted.log
    measured, energy = _measured(log, month)
    distance = _distance(log, month)
    consumption = energy / measured if measured > 0 else None
    own = [entry for day, entry in accounted.bought(both) if month.holds(day)]
    amounts = [entry.energy for entry in own if math.isfinite(entry.energy)]
    priced = [entry for entry in own if entry.cost is not None and math.isfinite(entry.energy) and entry.energy > 0]
    cost = math.fsum(entry.cost or 0.0 for entry in own) if priced and accounted.mixed is None else None
    price = None if cost is None else _price(priced)
    return Driven(
        month=str(month),
        distance_km=distance,
        measured_km=measured,
        energy=None if consumption is None else consumption * distance,
        consumption=consumption,
        bought=math.fsum(amounts),
        cost=cost,
        cost_per_km=None if price is None or consumption is None else price * consumption,
        entries=len(own),
    )


def _price(entries: Sequence[Entry]) -> float:
    """Cost of one unit of energy over entries that have both."""
    return math.fsum(entry.cost or 0.0 for entry in entries) / math.fsum(entry.energy for entry in entries)


def month_shares(log: SegmentedLog, month: Month) -> list[float]:
    """For each segment the share of its distance that was driven in the month."""
    return [_within(segment.legs, month) / segment.distance_km for segment in log.segments]


def each_carrier(log: SegmentedLog, month: Month, both: TwoCarriers) -> tuple[float, float]:
    """Fuel (in its unit) and electricity (kWh) used in the month's measured distance."""
    fuel = electric = 0.0
    for which, share in enumerate(month_shares(log, month)):
        if share:
            one, other = fuel_and_electric(log, which, both)
            fuel, electric = fuel + share * one, electric + share * other
    return fuel, electric


def _within(legs: Sequence[Leg], month: Month) -> float:
    return math.fsum(leg.distance_km * month.share(leg.start_day, leg.end_day) for leg in legs)


def _measured(log: SegmentedLog, month: Month) -> tuple[float, float]:
    """Distance and energy between known levels."""
    km = energy = 0.0
    for segment, share in zip(log.segments, month_shares(log, month), strict=True):
        km += share * segment.distance_km
        energy += share * segment.energy
    return km, energy


def _distance(log: SegmentedLog, month: Month) -> float:
    """All driving, of known consumption or not."""
    return math.fsum(km * month.share(start, end) for start, end, km in pieces(log))


def pieces(log: SegmentedLog) -> Iterator[tuple[int, int, float]]:
    """Start day, end day and km of the driving between consecutive entries; true km where the consumption is known."""
    for segment in log.segments:
        yield from ((leg.start_day, leg.end_day, leg.distance_km) for leg in segment.legs)
    yield from ((leg.start_day, leg.end_day, leg.distance_km) for leg in log.open_legs)
    covered = {leg.entry for segment in log.segments for leg in segment.legs} | {leg.entry for leg in log.open_legs}
    for index in range(1, len(log.entries)):
        if index not in covered:
            yield log.days[index - 1], log.days[index], log.positions[index] - log.positions[index - 1]
