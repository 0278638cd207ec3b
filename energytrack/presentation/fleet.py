"""A month of a fleet on the terminal: a row a vehicle, the furthest from its own expectation first; pooled shifts."""

from __future__ import annotations

import calendar
from collections import Counter
from collections.abc import Mapping, Sequence

from rich.text import Text

from energytrack.inference.fleet.results import BriefAnswer, FleetAssessment, PooledShift, VehicleReview
from energytrack.inference.results import Verdict
from energytrack.logbook import quantities
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures
from energytrack.presentation.columns import aligned, cells_wide
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import bullets, join, labelled, wrap

_HEAD = ("", "vehicle", "driven", "used", "expected", "", "off by", "SE")
_RIGHT = (2, 3, 4, 6, 7)
_MOST_NAMED = 3  # vehicles named in a sentence
_VERDICTS: dict[Verdict, str] = {
    "shifted": "shifted",
    "no-shift-of-target-size": "no shift of the target size",
    "closed-unclear": "over and unclear",
    "not-yet": "not yet",
    "out-of-reach": "out of reach",
    "no-baseline": "no baseline",
}


def render(found: FleetAssessment, vehicles: Mapping[str, Vehicle], width: int = 80) -> list[Text]:
    """The whole review. vehicles: by name, for their units."""
    lines = [Text(line, style="bold") for line in wrap(first(found), width)]
    lines += [Text(line) for line in wrap(attention(found), width)]
    rows = [each for each in found.vehicles if each.deviation is not None]
    if rows:
        lines += [Text(), *_table(rows, vehicles, width)]
        rate = figures.target(100 * found.false_discovery_rate)
        note = (
            "SE: standard errors from what the vehicle's own record expects of that month's driving. Marked ! are those"
            f" called, with at most {rate} false calls expected among them."
        )
        lines += [Text(), *map(Text, wrap(note, width))]
        doubted = [f"{plain_text(each.vehicle)} ({each.odd_segments})" for each in rows if each.odd_segments]
        if doubted:
            second = f"entries that stand out from their neighbours, worth a second look: {', '.join(doubted)}"
            lines += [*map(Text, bullets([second], "! ", width))]
    said = not_held(found)
    if said:
        lines += [Text(), Text("not held against their record"), *map(Text, bullets(said, "  ", width))]
    alone = alone_of(found)
    if alone:
        lines += [Text(), Text("fitted to one vehicle"), *map(Text, bullets(alone, "  ", width))]
    lines += [line for pooled in found.pooled for line in [Text(), *_pooled(pooled, found, vehicles, width)]]
    return lines


def not_held(found: FleetAssessment) -> list[str]:
    """Vehicles that are not held against their record, and why."""
    others = [each for each in found.vehicles if each.deviation is None]
    return [f"{plain_text(each.vehicle)}: {plain_text(each.message or each.why_none)}" for each in others]


def first(found: FleetAssessment) -> str:
    """The fleet's month in a sentence."""
    year, month = found.month.split("-")
    amounts = [join(f"{amount:,.0f} {unit}") for unit, amount in found.energy.items()]
    parts = [_count(len(found.vehicles), "vehicle"), join(f"{found.distance_km:,.0f} km"), *amounts]
    return f"{calendar.month_name[int(month)]} {year}: {', '.join(parts)}."


def attention(found: FleetAssessment) -> str:
    """Which vehicles need it."""
    called = found.attention
    if not called:
        return "No vehicle stands further from its own record than chance explains."
    names = [
        f"{plain_text(each.vehicle)} ({figures.percent(each.deviation.deviation_percent, signed=True)})"
        for each in called[:_MOST_NAMED]
        if each.deviation is not None
    ]
    more = len(called) - len(names)
    verb = "needs" if len(called) == 1 else "need"
    return (
        f"{_count(len(called), 'vehicle')} {verb} attention: {', '.join(names)}{f' and {more} more' if more else ''}."
    )


def _table(rows: Sequence[VehicleReview], vehicles: Mapping[str, Vehicle], width: int) -> list[Text]:
    """Columns; a name too wide for its own stands on a line above its row."""
    cells = [cells_of(each, vehicles[each.vehicle]) for each in rows]
    bare = max(cells_wide(line) for line in aligned([_HEAD, *(("!", "", *row[2:]) for row in cells)], _RIGHT))
    room = width - bare + len("vehicle")
    fitted = [row if cells_wide(plain_text(row[1])) <= room else (row[0], "", *row[2:]) for row in cells]
    head, *lines = aligned([_HEAD, *fitted], _RIGHT)
    shown = [Text(head)]
    for row, fitting, line in zip(cells, fitted, lines, strict=True):
        style = "bold" if row[0] else ""
        if fitting[1] != row[1]:
            shown += [Text(f"{row[0] or ' '}  {part}", style=style) for part in wrap(plain_text(row[1]), width - 3)]
            line = " " + line[1:]
        shown.append(Text(line, style=style))
    return shown


def cells_of(each: VehicleReview, vehicle: Vehicle) -> tuple[str, ...]:
    """A row: call, name, driven, used, expected, unit, difference, standard errors. It has a deviation."""
    off = each.deviation
    assert off is not None
    display = vehicle.display if each.unit == vehicle.unit else None  # in kWh for tank and battery together
    as_shown = Vehicle(vehicle.name, vehicle.carrier, each.unit, display=display)
    used, expected = (quantities.consumption(value, as_shown) for value in (off.measured, off.expected))
    return (
        "!" if each.attention else "",
        each.vehicle,
        figures.driven(each.distance_km, vehicle.distance_unit).replace("\u00a0", " "),
        quantities.rounded(used, 3),
        quantities.rounded(expected, 3),
        quantities.consumption_unit(as_shown).label,
        figures.percent(off.deviation_percent, off.standard_error_percent, signed=True).replace("\u00a0", " "),
        f"{off.z:+.1f}",
    )


def alone_of(found: FleetAssessment) -> list[str]:
    """Modifications that are not pooled, with their verdicts."""
    pooled = {each.modification for each in found.pooled}
    return [
        f"{plain_text(each.vehicle)}, {plain_text(answer.modification)}: {_brief(answer)}"
        for each in found.vehicles
        for answer in each.answers
        if answer.modification not in pooled
    ]


def _brief(answer: BriefAnswer) -> str:
    said = "withheld, see enough" if answer.withheld else _VERDICTS[answer.verdict]
    if answer.shift_percent is not None:
        said += f", {figures.percent(answer.shift_percent, answer.standard_error_percent, signed=True)}"
    if answer.distance_to_go_km:
        said += f", about {figures.distance(answer.distance_to_go_km, 'km')} to go"
    return said


def _pooled(found: PooledShift, fleet: FleetAssessment, vehicles: Mapping[str, Vehicle], width: int) -> list[Text]:
    title, rows = pooled_title(found), pooled_rows(found, fleet, vehicles)
    return [*(Text(line, style="bold") for line in wrap(title, width)), *map(Text, labelled(rows, width))]


def pooled_title(found: PooledShift) -> str:
    """Of its rows."""
    return f"{plain_text(found.modification)}, pooled over {_count(len(found.vehicles), 'vehicle')}"


def pooled_rows(
    found: PooledShift, fleet: FleetAssessment, vehicles: Mapping[str, Vehicle]
) -> list[tuple[str, str]]:
    """What a pooled shift says, each with its label."""
    unit = _common_unit(found, vehicles)
    error, mixed = found.standard_error_percent, found.heterogeneity
    shift = figures.percent(found.shift_percent, error, signed=True)
    span = figures.percent_range(found.interval_percent, error)
    rows = [
        ("  shift", f"{shift}, {figures.target(100 * found.confidence)} range {span}, looked at once"),
        (
            "  vehicles differ",
            f"by {figures.percent(mixed.between_percent, error)} (sd); {mixed.i_squared_percent:.0f}\u00a0% of the "
            f"scatter, Q\u00a0{mixed.q:.1f}, p\u00a0{_p(mixed.p_value)}",
        ),
    ]
    if found.next_vehicle_percent is not None:
        rows.append(("  the next vehicle", figures.percent_range(found.next_vehicle_percent, error)))
    rows.append((f"  target {found.target_percent:g} %", _to_go(found, unit)))
    best = [each for each in found.vehicles if each.gain_percent][:_MOST_NAMED]
    if best and not found.resolved:
        said = [f"{plain_text(each.vehicle)} {join(f'+{each.gain_percent:.1g} %')}" for each in best]
        rows.append(("  most per km", f"{', '.join(said)} of what is known, by their next {join('1,000 km')}"))
    rows.append(("  one by one", _one_by_one(found.modification, fleet)))
    return rows


def _to_go(found: PooledShift, unit: str) -> str:
    if found.resolved:
        return "covered"
    share = f"{100 * found.information_fraction:.0f}\u00a0% of the evidence"
    if found.distance_to_go_km is not None and found.days_to_go is not None:
        far = figures.distance(found.distance_to_go_km, unit)
        return f"{share}; about {far} more of all together, {figures.days(found.days_to_go)}"
    if found.vehicles_needed is None:
        return f"{share}; out of reach, however many vehicles like these are added"
    return f"{share}; out of reach with these: it takes about {_count(found.vehicles_needed, 'vehicle')} like them"


def _common_unit(found: PooledShift, vehicles: Mapping[str, Vehicle]) -> str:
    units = {vehicles[each.vehicle].distance_unit for each in found.vehicles}
    return units.pop() if len(units) == 1 else "km"


def _one_by_one(modification: str, fleet: FleetAssessment) -> str:
    counts = Counter(
        answer.verdict for each in fleet.vehicles for answer in each.answers if answer.modification == modification
    )
    return ", ".join(f"{counts[verdict]}\u00a0{said}" for verdict, said in _VERDICTS.items() if counts[verdict])


def _p(value: float) -> str:
    return "below 0.001" if value < 0.001 else f"{value:.2g}"


def _count(number: int, noun: str) -> str:
    return join(f"{number:,} {noun}" if number == 1 else f"{number:,} {noun}s")
