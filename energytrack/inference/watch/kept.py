"""The monitor as it is kept in the logbook, and carried on by each entry. Standard library only."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

from energytrack.consumption.meaning import condition_in
from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.shares import shares
from energytrack.consumption.terms import condition_of, term
from energytrack.inference.watch.monitor import Filter, Monitor, Segment, Sum, advance, alarm
from energytrack.logbook.quantities import distance_text
from energytrack.logbook.records import Modification, Vehicle

_SAME_KM, _SAME_ENERGY = 0.5, 1e-6


class Column(NamedTuple):
    """A column of the regression beside the level."""

    name: str
    kind: str  # term or modification
    centre: float
    scale: float
    unknown: float  # variance per unit distance where the condition is not known: the terms have unit spread


class Watch(NamedTuple):
    """A monitor, how to make its segments of what is logged, and how far it has come."""

    monitor: Monitor
    columns: tuple[Column, ...]
    segment_km: float  # what relative distance and energy are relative to
    segment_energy: float
    recent_km: float  # average segment as driven now
    false_alarm_every_km: float
    segments: int
    end_km: float  # of the last segment taken in, and its energy: where to go on
    end_date: str
    last_energy: float
    delays: tuple[tuple[float, float | None], ...]  # shift in percent -> km until its alarm on average


def as_json(watch: Watch) -> dict[str, Any]:
    """Plain lists and numbers."""
    monitor = watch.monitor
    return {
        **watch._asdict(),
        "monitor": {
            **monitor._asdict(),
            "filter": monitor.filter._asdict(),
            "rise": monitor.rise._asdict(),
            "fall": monitor.fall._asdict(),
        },
    }


def from_json(kept: Mapping[str, Any]) -> Watch:
    """What `as_json` made, read again. Raises KeyError, TypeError where another version wrote it."""
    monitor = dict(kept["monitor"])
    monitor["filter"] = Filter(**monitor["filter"])
    monitor["rise"], monitor["fall"] = Sum(**monitor["rise"]), Sum(**monitor["fall"])
    columns = tuple(Column(*column) for column in kept["columns"])
    return Watch(**{**kept, "monitor": Monitor(**monitor), "columns": columns})


def carried_on(watch: Watch, log: SegmentedLog, modifications: Sequence[Modification]) -> Watch | None:
    """The monitor with the segments after the one it had come to; None where that one is not there as it was."""
    ends = [abs(segment.end_km - watch.end_km) < _SAME_KM for segment in log.segments]
    if True not in ends:
        return None
    last = len(ends) - 1 - ends[::-1].index(True)
    if abs(log.segments[last].energy - watch.last_energy) > _SAME_ENERGY * max(1.0, watch.last_energy):
        return None
    monitor = watch.monitor
    new = range(last + 1, len(log.segments))
    if new:
        parts = _shares(watch, log, modifications)
        for which in new:
            monitor = advance(monitor, _segment(watch, log, which, parts))
        newest = log.segments[-1]
        end = dt.date.fromordinal(newest.end_day).isoformat()
        watch = watch._replace(
            segments=watch.segments + len(new), end_km=newest.end_km, end_date=end, last_energy=newest.energy
        )
    return watch._replace(monitor=monitor)


def alarm_lines(watch: Watch, vehicle: Vehicle) -> list[str]:
    """One line where consumption stands apart from what is expected, and where to look; nothing otherwise."""
    found = alarm(watch.monitor)
    if found is None or found[0].since_km is None:
        return []
    since, shift = found
    place = distance_text(since.since_km or 0.0, vehicle)
    line = (
        f"consumption has stood about {abs(100 * shift):.0f} % {'above' if shift > 0 else 'below'} what is expected "
        f"since about {place} ({since.since_date}): "
    )
    electric = vehicle.unit == "kWh"
    if shift < 0:
        return [line + "if something was fitted, mended or changed then, log it with `mod` or `event`"]
    look = "tyre pressure, a dragging brake, " + ("charging losses" if electric else "a leak") + ", load, roof or route"
    return [
        f"{line}look at {look}; have brakes, tyres and leaks inspected by a qualified person before further driving "
        "tests; log what you find with `event`"
    ]


def _segment(watch: Watch, log: SegmentedLog, which: int, parts: Mapping[str, Sequence[float]]) -> Segment:
    segment = log.segments[which]
    distance = segment.distance_km / watch.segment_km
    values, extra = [1.0], 0.0
    for column in watch.columns:
        if column.kind == "modification":
            values.append(parts[column.name][which] / column.scale if column.name in parts else 0.0)
            continue
        value = condition_in(log, which, condition_of(column.name))
        values.append(0.0 if value is None else (term(column.name, value) - column.centre) / column.scale)
        extra += column.unknown * distance * distance if value is None else 0.0
    return Segment(
        distance=distance,
        energy=segment.energy / watch.segment_energy,
        day=(segment.start_day + segment.end_day) / 2,
        columns=values,
        extra=extra,
        linked=segment.linked,
        start_weight=segment.start_weight,
        end_weight=segment.end_weight,
        start_km=segment.start_km,
        start_date=dt.date.fromordinal(segment.start_day).isoformat(),
    )


def _shares(watch: Watch, log: SegmentedLog, rows: Sequence[Modification]) -> dict[str, list[float]]:
    names = [column.name for column in watch.columns if column.kind == "modification"]
    return {name: shares(log, [row for row in rows if row.name == name]) for name in names}
