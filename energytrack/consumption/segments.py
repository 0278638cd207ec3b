"""Entries become segments: what was used between two moments at which the stored energy is known.

Legs and segments are named tuples: long logs make many of them, and logging one entry must start fast.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, NamedTuple

from energytrack.consumption.positions import (
    driving_order,
    known_distance,
    monotone_days,
    position_on,
    scale_positions,
)
from energytrack.logbook.records import Entry, Event, Problem

GAUGE_WEIGHT = 2.0  # a fuel gauge is read to about twice the error of a fill to the click-off
TOLERATED_SHARE = 0.10  # odometer and noted distance may differ by this share,
TOLERATED_KM = 20.0  # or by this much
CAPACITY_MARGIN = 1.05  # nobody arrives with an empty tank

Reason = Literal["missed entry", "no distance", "no amount", "no known level", "no energy used", "not driven"]


class Leg(NamedTuple):
    """Driving between two consecutive entries, split where an odometer factor changes."""

    start_km: float  # position on the log's own scale: odometer, or distance added up from 0
    end_km: float
    distance_km: float  # true km, odometer factors applied
    entry: int  # index of the entry that ends it, in driving order
    start_day: int  # date ordinals
    end_day: int


class Segment(NamedTuple):
    """Driving from one known level to the next."""

    legs: tuple[Leg, ...]
    distance_km: float  # true km
    energy: float  # used, in the vehicle's unit
    start_km: float
    end_km: float
    start_day: int
    end_day: int
    linked: bool  # shares its start level with the segment before it; False: first, or after a gap
    start_weight: float  # sd of the level at each end, relative to a fill to the click-off
    end_weight: float


class Void(NamedTuple):
    """A span whose consumption cannot be measured."""

    start_km: float
    end_km: float
    start_day: int
    end_day: int
    entry: int  # index of the entry that ends it, in driving order
    reason: Reason


@dataclass(frozen=True)
class SegmentedLog:
    """One vehicle's log as segments. positions and days belong to entries."""

    entries: tuple[Entry, ...]  # in driving order
    positions: tuple[float, ...]  # km on the log's own scale
    days: tuple[int, ...]  # date ordinals, never decreasing
    segments: tuple[Segment, ...]
    open_legs: tuple[Leg, ...]  # driving since the last known level
    void: tuple[Void, ...]
    capacity: float | None
    capacity_is_estimated: bool
    unit: str
    problems: tuple[Problem, ...]
    electric: tuple[float, ...] = ()  # kWh from the plug in each segment, where a vehicle has tank and battery

    @property
    def lacks_levels(self) -> bool:
        """Driving was logged, and nothing can be measured because no two entries tell the level they left."""
        spans = bool(self.void or self.open_legs)
        return spans and not self.segments and all(span.reason == "no known level" for span in self.void)


class Level(NamedTuple):
    """A known level: how much is missing from full, and how well that is known."""

    missing: float
    weight: float


def close_segments(
    entries: Sequence[Entry], events: Sequence[Event] = (), *, capacity: float | None = None, unit: str = "L"
) -> SegmentedLog:
    """Close a segment at every known level. Linear in the number of entries; problems are values, nothing raises.

    entries: of one vehicle, in any order. capacity: of tank or usable battery in `unit` (L, kg or kWh); estimated
    from the largest purchases where it is needed and not given.
    """
    ordered = driving_order(entries)
    size, estimated = (capacity, False) if capacity else (estimate_capacity(ordered, unit), True)
    levels = [known_level(entry, size, unit) for entry in ordered]
    return close_at(ordered, levels, events, capacity=size, capacity_is_estimated=estimated, unit=unit)


def close_at(
    ordered: Sequence[Entry],
    levels: Sequence[Level | None],
    events: Sequence[Event],
    *,
    capacity: float | None,
    capacity_is_estimated: bool,
    unit: str,
) -> SegmentedLog:
    """Close a segment wherever a level is known. ordered: entries in driving order, levels: known after each."""
    days, problems = monotone_days(ordered)
    problems += _level_problems(ordered, levels)
    chain = _Chain(ordered, scale_positions(ordered), days, events, levels[0] if levels else None)
    for index in range(1, len(ordered)):
        chain.drive(index, levels[index])
    chain.finish()
    return SegmentedLog(
        entries=tuple(ordered),
        positions=tuple(chain.positions),
        days=tuple(days),
        segments=tuple(chain.segments),
        open_legs=tuple(chain.legs),
        void=tuple(chain.void),
        capacity=capacity,
        capacity_is_estimated=capacity_is_estimated and capacity is not None,
        unit=unit,
        problems=tuple(problems + chain.problems),
    )


class _Chain:
    """Walks from entry to entry and closes a segment, or voids a span, at every known level."""

    begin: int  # the entry at which the span in hand starts
    start: Level | None  # known there
    linked: bool  # whether the segment before ended there
    legs: list[Leg]
    bought: float
    reason: Reason | None  # why the span in hand cannot be measured

    def __init__(
        self,
        ordered: Sequence[Entry],
        positions: list[float],
        days: list[int],
        events: Sequence[Event],
        level: Level | None,
    ) -> None:
        self.ordered, self.positions, self.days = ordered, positions, days
        self.problems: list[Problem] = []
        self.segments: list[Segment] = []
        self.void: list[Void] = []
        self.changes, self.factors = self._factors(events)
        self.anchored = bool(ordered) and ordered[0].odometer_km is not None  # position of the last entry is certain
        self._restart(0, level, linked=False)

    def drive(self, index: int, level: Level | None) -> None:
        """Take in the driving up to entry `index` and the level known after it, if any."""
        entry = self.ordered[index]
        distance, reason = self._distance(index)
        if distance is not None:
            self.legs += self._legs(index, distance)
        if not 0 <= entry.energy < math.inf:
            reason = reason or "no amount"
        self.bought += entry.energy
        self.reason = self.reason or reason
        if level is not None:
            self._close(index, level)

    def finish(self) -> None:
        """Driving since the last known level stays open, unless it can no longer be measured."""
        last = len(self.ordered) - 1
        if last > self.begin and (self.reason or self.start is None):
            self._cut(last, self.reason or "no known level")
            self.legs = []

    def _close(self, index: int, level: Level) -> None:
        reason = self.reason or ("no known level" if self.start is None else None)
        distance = math.fsum([leg.distance_km for leg in self.legs])
        energy = self.bought + level.missing - (self.start.missing if self.start else 0.0)
        reason = reason or ("not driven" if distance <= 0 else None) or ("no energy used" if energy <= 0 else None)
        if reason or self.start is None:
            self._cut(index, reason or "no known level")
        else:
            self.segments.append(
                Segment(
                    tuple(self.legs),
                    distance,
                    energy,
                    self.positions[self.begin],
                    self.positions[index],
                    self.days[self.begin],
                    self.days[index],
                    self.linked,
                    self.start.weight,
                    level.weight,
                )
            )
        self._restart(index, level, linked=reason is None)

    def _restart(self, index: int, level: Level | None, *, linked: bool) -> None:
        self.begin, self.start, self.linked = index, level, linked
        self.legs, self.bought, self.reason = [], 0.0, None

    def _cut(self, index: int, reason: Reason) -> None:
        start, positions, days = self.begin, self.positions, self.days
        self.void.append(Void(positions[start], positions[index], days[start], days[index], index, reason))

    def _distance(self, index: int) -> tuple[float | None, Reason | None]:
        """Distance of one leg on the odometer's scale, or the reason why there is none to rely on."""
        entry, before = self.ordered[index], self.ordered[index - 1]
        noted = known_distance(entry)
        moved = self.positions[index] - self.positions[index - 1]
        anchored = self.anchored
        self.anchored = entry.odometer_km is not None or (anchored and noted is not None)
        if entry.missed:
            return None, "missed entry"
        if entry.odometer_km is None or before.odometer_km is None:
            derived = moved if anchored and entry.odometer_km is not None else None
            distance = derived if noted is None else noted
            return distance, "no distance" if distance is None else None
        if noted is None or abs(moved - noted) <= max(TOLERATED_SHARE * noted, TOLERATED_KM):
            return moved, None
        said = f"between {before.date} and {entry.date} the odometer moved {moved:,.0f} km, noted are {noted:,.0f} km"
        if moved > noted:
            self.problems.append(Problem(f"{said}: an entry seems to be missing"))
            return None, "missed entry"
        self.problems.append(Problem(f"{said}: the noted distance is used; check the odometer values"))
        return noted, None

    def _legs(self, index: int, distance: float) -> list[Leg]:
        """One leg, or one for each odometer factor that held in it."""
        start, end = self.positions[index - 1], self.positions[index]
        first_day, last_day = self.days[index - 1], self.days[index]
        lowest, highest = bisect_right(self.changes, start), bisect_right(self.changes, end)
        if lowest == highest or end <= start:
            return [Leg(start, end, distance * self.factors[lowest], index, first_day, last_day)]
        marks = [start, *(mark for mark in self.changes[lowest:highest] if mark < end), end]
        days = [first_day + round((mark - start) / (end - start) * (last_day - first_day)) for mark in marks]
        return [
            Leg(
                marks[k],
                marks[k + 1],
                distance * (marks[k + 1] - marks[k]) / (end - start) * self.factors[lowest + k],
                index,
                days[k],
                days[k + 1],
            )
            for k in range(len(marks) - 1)
        ]

    def _factors(self, events: Sequence[Event]) -> tuple[list[float], list[float]]:
        """Positions at which the odometer factor changes, and the factor before, between and after them."""
        held: dict[float, float] = {}
        for event in sorted(events, key=lambda event: event.date) if self.ordered else ():
            factor = event.odometer_factor
            if factor is None:
                continue
            if not 0 < factor < math.inf:
                self.problems.append(Problem(f"event {event.what!r} of {event.date}: odometer factor must be above 0"))
                continue
            known = event.odometer_km
            held[position_on(self.positions, self.days, event.date) if known is None else known] = factor
        changes = sorted(held)
        return changes, [1.0, *(held[change] for change in changes)]


def known_level(entry: Entry, capacity: float | None, unit: str) -> Level | None:
    """The level an entry leaves behind, from its reading or its filling; None where it tells none."""
    percent = entry.level_percent
    if percent is None:
        return Level(0.0, 1.0) if entry.full else None
    if not 0 <= percent <= 100 or (capacity is None and percent < 100):
        return None
    return Level((1 - percent / 100) * (capacity or 0.0), 1.0 if unit == "kWh" else GAUGE_WEIGHT)


def _level_problems(ordered: Sequence[Entry], levels: Sequence[Level | None]) -> list[Problem]:
    problems = []
    unusable = 0
    for entry, level in zip(ordered, levels, strict=True):
        if level is None and entry.level_percent is not None:
            if 0 <= entry.level_percent <= 100:
                unusable += 1
            else:
                problems.append(Problem(f"entry of {entry.date}: level {entry.level_percent:g} % is outside 0 to 100"))
    if unusable:
        problems.append(Problem(f"{unusable} level readings cannot be used: give the vehicle's capacity"))
    return problems


def estimate_capacity(ordered: Sequence[Entry], unit: str) -> float | None:
    """A little above the largest purchases, each scaled to a full tank or battery by the level it ended at.

    For electricity only where a reading needs it: charges tell less about a battery than fill-ups about a tank.
    """
    if unit == "kWh" and all(entry.level_percent is None for entry in ordered):
        return None
    reached = []
    for entry in ordered:
        level = entry.level_percent if entry.level_percent is not None else 100.0 if entry.full else math.nan
        if 50 <= level <= 100 and 0 < entry.energy < math.inf:  # a low reading would magnify its own error
            reached.append(entry.energy * 100 / level)
    reached = sorted(reached or (entry.energy for entry in ordered if 0 < entry.energy < math.inf))
    return CAPACITY_MARGIN * reached[math.ceil(0.98 * len(reached)) - 1] if reached else None
