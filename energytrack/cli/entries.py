"""`entries`: what was logged."""

from __future__ import annotations

import math
import shlex
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Annotated, Any

import typer

from energytrack.cli import options
from energytrack.cli.context import readable_as_of, say, say_json, the_vehicles
from energytrack.logbook.carriers import for_kind, in_total
from energytrack.logbook.opening import Logbook
from energytrack.logbook.quantities import consumption_text, distance_text, energy_text
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.rows import entry_values
from energytrack.presentation.columns import aligned, folded

if TYPE_CHECKING:
    from energytrack.consumption.slips import Slip

MOST_ENTRIES = 1_000_000_000
WIDTH = 80


def entries(
    context: typer.Context,
    vehicle: options.VehicleName = None,
    last: Annotated[int, typer.Option(min=1, max=MOST_ENTRIES, metavar="N", help="How many of the newest.")] = 20,
    as_of: options.AsOf = None,
    json: options.Json = False,
) -> None:
    """List the newest entries of each vehicle. Oldest first, with what is special about them."""
    logbook = readable_as_of(context, as_of)
    vehicles = the_vehicles(logbook, vehicle)
    listed = [(each, _newest(logbook, each, last)) for each in vehicles]
    if json:
        say_json({"entries": [_columns(line) for _, lines in listed for line in lines]})
        return
    for each, lines in listed:
        say([*_table(each, lines, last), *_corrections(each, lines, len(logbook.vehicles()) > 1)])
    if not vehicles:
        say(["no vehicles yet: add one with `vehicle add`" if as_of is None else f"nothing was recorded by {as_of}"])


@dataclass(frozen=True, slots=True)
class Line:
    """An entry, and the consumption of the segment it closes: energy per km, None where it closes none."""

    entry: Entry
    consumption: float | None
    is_unusual: bool
    slips: tuple[Slip, ...] = ()  # what may have happened, where it is unusual


def _newest(logbook: Logbook, vehicle: Vehicle, last: int) -> list[Line]:
    """The newest `last` entries, judged by the record of those before them too."""
    from energytrack.consumption.meaning import RECENT_ENTRIES, slips_of, unusual
    from energytrack.consumption.two_carriers import close_vehicle

    recent = logbook.last_entries(vehicle.name, last + RECENT_ENTRIES)
    segmented = close_vehicle(vehicle, recent, logbook.events(vehicle.name))
    lines = [Line(entry, None, False) for entry in segmented.entries]
    flags = unusual(segmented.segments)
    slips = slips_of(segmented, [which for which, flag in enumerate(flags) if flag], vehicle)
    for which, segment in enumerate(segmented.segments):
        closing = segmented.entries[segment.legs[-1].entry]
        told = Line(closing, segment.energy / segment.distance_km, False)
        if flags[which] and not closing.confirmed:
            told = replace(told, is_unusual=True, slips=tuple(slips[which]))
        lines[segment.legs[-1].entry] = told
    return lines[-last:]


def entry_columns(entry: Entry) -> dict[str, Any]:
    """An entry under the names of the entries table, further numbers under their own."""
    values = entry_values(entry)
    del values["extra"]
    yes_or_no = {name: bool(values[name]) for name in ("full", "missed")}
    return {"id": entry.id, "vehicle": entry.vehicle, **values, **yes_or_no, **entry.extra}


def _columns(line: Line) -> dict[str, Any]:
    amend = [f"energytrack amend {slip.amend}" for slip in line.slips]
    judged = {"energy_per_km": line.consumption, "unusual": line.is_unusual, "slips": [*map(str, line.slips)]}
    return {**entry_columns(line.entry), **judged, "amend": amend}


def _table(vehicle: Vehicle, lines: list[Line], last: int) -> list[str]:
    if not lines:
        return [f"{vehicle.name}: no entries yet"]
    title = vehicle.name + (f", the newest {last} (--last N for more)" if len(lines) == last else "")
    rows = aligned([_cells(vehicle, line) for line in lines], right=(1, 2, 3))
    return [title, *folded(rows, [", ".join(_flags(line)) for line in lines], WIDTH)]


def _corrections(vehicle: Vehicle, lines: list[Line], several: bool) -> list[str]:
    """What to type if an entry is unusual by a slip."""
    whose = f" --vehicle {shlex.quote(vehicle.name)}" if several else ""
    told = [
        f"{slip.what}? energytrack amend {slip.amend}{whose}"
        for line in lines
        for slip in line.slips
    ]
    return ["", *told] if told else []


def _cells(vehicle: Vehicle, line: Line) -> tuple[str, ...]:
    entry = line.entry
    amount = "no amount" if math.isnan(entry.energy) else energy_text(entry.energy, for_kind(vehicle, entry.kind))
    consumption = "" if line.consumption is None else consumption_text(line.consumption, in_total(vehicle))
    return entry.date.isoformat(), _place(vehicle, entry), amount, consumption


def _place(vehicle: Vehicle, entry: Entry) -> str:
    if entry.odometer_km is not None:
        return distance_text(entry.odometer_km, vehicle)
    return "" if entry.distance_km is None else f"+{distance_text(entry.distance_km, vehicle)}"


def _flags(line: Line) -> list[str]:
    entry = line.entry
    unlike = ["unusual", *map(str, line.slips[:1])] if line.is_unusual else []
    level = [] if entry.level_percent is None else [f"level {entry.level_percent:g} %"]
    partial = ["partial"] if not entry.full and entry.level_percent is None else []
    missed = ["entries missing before"] if entry.missed else []
    sure = ["confirmed"] if entry.confirmed else []
    return [*unlike, *level, *partial, *missed, *sure, *([entry.note] if entry.note else [])]
