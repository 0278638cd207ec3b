"""What one entry meant: distance, consumption, what was expected, and what is left to go. No heavy libraries."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from typing import Any, Protocol

from energytrack.consumption.segments import Segment, SegmentedLog, close_segments
from energytrack.consumption.shares import fitted_periods, shares
from energytrack.consumption.slips import Case, Slip, find_slips
from energytrack.consumption.terms import ELECTRIC, condition_of, term
from energytrack.consumption.usual import far_from_usual
from energytrack.errors import ConsumptionError
from energytrack.logbook.carriers import for_kind, in_total
from energytrack.logbook.quantities import consumption_text, distance_text, energy_text, from_base, to_base
from energytrack.logbook.records import Entry, Event, Modification, Vehicle

RECENT_ENTRIES = 60  # looked at for one echo, however long the log is
FEWEST_SEGMENTS = 5  # before a vehicle has a record to compare with
WITHIN_SD = 2.0  # usual scatter: about 19 of 20 segments
UNUSUAL_SD = 4.0
MAD_TO_SD = 1.4826  # for a normal distribution (Rousseeuw and Croux 1993)
LEAST_SCATTER = 0.01  # of consumption; a shorter record can look steadier than it is

WHY_VOID = {
    "missed entry": "an entry is missing before it",
    "no distance": "the distance since the last entry is unknown",
    "no amount": "an amount is missing since the last known level",
    "no known level": "the level at its start is unknown",
    "no energy used": "more energy is left than was bought; check amount and level",
    "not driven": "no distance was driven since the last known level",
}


class EchoLogbook(Protocol):
    """What an echo needs to read."""

    def entries(self, vehicle_name: str) -> list[Entry]: ...
    def last_entries(self, vehicle_name: str, count: int) -> list[Entry]: ...
    def modifications(self, vehicle_name: str) -> list[Modification]: ...
    def events(self, vehicle_name: str) -> list[Event]: ...
    def assessments(self, vehicle_name: str) -> list[dict[str, Any]]: ...


def echo_lines(logbook: EchoLogbook, vehicle: Vehicle, entry: Entry) -> list[str]:
    """What `entry`, already in the logbook, meant: a few short lines in the vehicle's units."""
    recent = logbook.last_entries(vehicle.name, RECENT_ENTRIES)
    if len(recent) == RECENT_ENTRIES and all(row.odometer_km is None for row in recent):
        recent = logbook.entries(vehicle.name)  # without an odometer, positions count from the first entry
    segmented = segmented_of(vehicle, recent, logbook.events(vehicle.name))
    index = _index_of(segmented, entry)
    if index is None or (index == 0 and len(recent) >= RECENT_ENTRIES):
        return ["kept among the older entries"]
    kept = logbook.assessments(vehicle.name)
    rows = logbook.modifications(vehicle.name)
    which = next((k for k, segment in enumerate(segmented.segments) if segment.legs[-1].entry == index), None)
    if which is None:
        lines = _without_consumption(segmented, vehicle, index)
    else:
        lines = _with_consumption(segmented.segments[which], vehicle) + _of_each(segmented, which, vehicle)
        lines += _compared(segmented, which, vehicle, kept, rows)
    lines += _overfilled(entry, for_kind(vehicle, entry.kind))
    return lines + _still_to_go(segmented, vehicle, index, kept, rows)


def segmented_of(vehicle: Vehicle, entries: Sequence[Entry], events: Sequence[Event]) -> SegmentedLog:
    if vehicle.second_carrier is None:
        return close_segments(entries, events, capacity=vehicle.capacity, unit=vehicle.unit)
    from energytrack.consumption.two_carriers import close_vehicle  # only where it is needed: logging starts fast

    return close_vehicle(vehicle, entries, events)


def _of_each(segmented: SegmentedLog, which: int, vehicle: Vehicle) -> list[str]:
    """What a segment used of each carrier, of a vehicle with tank and battery."""
    if vehicle.second_carrier is None:
        return []
    from energytrack.consumption.two_carriers import fuel_and_electric, two_carriers_of

    both = two_carriers_of(vehicle)
    if both is None:
        return []
    km, energy = segmented.segments[which].distance_km, segmented.segments[which].energy
    fuel, electric = fuel_and_electric(segmented, which, both)
    tank, battery = for_kind(vehicle, "fill-up"), for_kind(vehicle, "charge")
    each = f"{consumption_text(fuel / km, tank)} and {consumption_text(electric / km, battery)}"
    return [f"of that {each} from the plug, {100 * electric / energy:.0f} % of the energy"]


def _overfilled(entry: Entry, vehicle: Vehicle) -> list[str]:
    """A flag where more was bought than a tank holds; charging losses make that usual for a battery."""
    if vehicle.capacity is None or vehicle.unit == "kWh" or entry.energy <= vehicle.capacity:
        return []
    amount, capacity = energy_text(entry.energy, vehicle), energy_text(vehicle.capacity, vehicle)
    return [f"{amount} is more than the capacity of {capacity}: kept; check the amount"]


def unusual(segments: Sequence[Segment]) -> list[bool]:
    """Which segments' consumption lies beyond 4 robust standard deviations of their own record.

    Deviations of segments shorter than the median one are scaled down by their length: there the level error, which
    does not grow with distance, weighs more. With fewer than 5 segments none is unusual.
    """
    if len(segments) < FEWEST_SEGMENTS:
        return [False] * len(segments)
    _, deviations, sd = _record(segments)
    return [abs(deviation) > UNUSUAL_SD * sd for deviation in deviations]


def slips_of(segmented: SegmentedLog, unlike: Sequence[int], vehicle: Vehicle) -> dict[int, list[Slip]]:
    """What may have happened in each of the unusual segments, held against the vehicle's own record."""
    segments = segmented.segments
    if vehicle.second_carrier is not None:  # its segments are in kWh, what was typed is not
        return {which: [] for which in unlike}
    if not unlike:
        return {}
    usual, _, sd = _record(segments)
    usual_km = _median(segment.distance_km for segment in segments)
    scatter = [sd / min(1.0, segment.distance_km / usual_km) for segment in segments]
    expected = [usual] * len(segments)
    return {which: find_slips(Case(segmented, which, expected, scatter, vehicle)) for which in unlike}


def _record(segments: Sequence[Segment]) -> tuple[float, list[float], float]:
    """Median consumption, each segment's deviation from it, and their robust sd, in energy per km."""
    consumption = [segment.energy / segment.distance_km for segment in segments]
    usual = _median(consumption)
    usual_km = _median(segment.distance_km for segment in segments)
    deviations = [
        (value - usual) * min(1.0, segment.distance_km / usual_km)
        for value, segment in zip(consumption, segments, strict=True)
    ]
    sd = MAD_TO_SD * _median(abs(deviation) for deviation in deviations)
    return usual, deviations, max(sd, LEAST_SCATTER * usual)


def _relative_length(segment: Segment, others: Sequence[Segment]) -> float:
    """Length of a segment relative to the usual one, at most 1: shorter ones scatter more."""
    usual_km = _median(other.distance_km for other in others) if others else segment.distance_km
    return min(1.0, segment.distance_km / usual_km)


def _median(values: Iterable[float]) -> float:
    ordered = sorted(values)
    middle = len(ordered) // 2
    return ordered[middle] if len(ordered) % 2 else (ordered[middle - 1] + ordered[middle]) / 2


def _index_of(segmented: SegmentedLog, entry: Entry) -> int | None:
    """Where the entry stands: by its number, or by what it says where it has none yet. The latest of twins."""

    def same(other: Entry) -> bool:
        if entry.id is not None:
            return other.id == entry.id
        return (other.date, other.odometer_km, other.energy) == (entry.date, entry.odometer_km, entry.energy)

    return next((index for index in range(len(segmented.entries) - 1, -1, -1) if same(segmented.entries[index])), None)


def _with_consumption(segment: Segment, vehicle: Vehicle) -> list[str]:
    figure = consumption_text(segment.energy / segment.distance_km, in_total(vehicle))
    last = segment.legs[-1].entry
    driven = math.fsum(leg.distance_km for leg in segment.legs if leg.entry == last)
    since = f"{distance_text(driven, vehicle)} since the last entry"
    entries = 1 + last - segment.legs[0].entry
    if entries == 1:
        return [f"{since}: {figure}"]
    return [since, f"{distance_text(segment.distance_km, vehicle)} since the last known level: {figure}"]


def _without_consumption(segmented: SegmentedLog, vehicle: Vehicle, index: int) -> list[str]:
    entry = segmented.entries[index]
    store, filling = ("charge", "charge") if vehicle.unit == "kWh" else ("tank", "fill")
    if vehicle.second_carrier is not None:
        store, filling = "tank", "fill"
    if index == 0:
        return [f"first entry: consumption follows with the next full {store}"]
    driven = segmented.positions[index] - segmented.positions[index - 1]
    since = [f"{distance_text(driven, vehicle)} since the last entry"] if driven > 0 and not entry.missed else []
    void = next((span for span in segmented.void if span.entry == index), None)
    if void is not None and (entry.full or entry.level_percent is not None):
        return [*since, f"no consumption: {WHY_VOID[void.reason]}"]
    if vehicle.second_carrier is not None and entry.kind == "charge":
        return [*since, "charge added up: consumption follows with the next full tank"]
    return [*since, f"partial {filling}: consumption follows with the next full {store}"]


def _compared(
    segmented: SegmentedLog,
    which: int,
    vehicle: Vehicle,
    kept: Sequence[Mapping[str, Any]],
    rows: Sequence[Modification],
) -> list[str]:
    """How the segment compares with what was expected, and a flag where it is unusual."""
    segment = segmented.segments[which]
    others = [*segmented.segments[:which], *segmented.segments[which + 1 :]]
    figure = segment.energy / segment.distance_km
    expected, sd, basis = None, math.nan, "at these conditions"
    latest = _latest_expectation(kept)
    if latest is not None:
        expected = _expected(segmented, which, latest, rows)
        sd = latest["expectation"]["sd_percent"]
    elif len(others) >= FEWEST_SEGMENTS:
        expected, _, spread = _record(others)
        sd, basis = 100 * spread / expected, "from its recent record"
    if expected is None or expected <= 0:
        return far_from_usual(figure, vehicle)
    percent = 100 * (figure / expected - 1)
    scatter = WITHIN_SD * sd / _relative_length(segment, others)
    verdict = "within" if abs(percent) <= scatter else "outside"
    lines = [
        f"expected {basis}: {consumption_text(expected, in_total(vehicle))}",
        f"{abs(percent):.1f} % {'more' if percent >= 0 else 'less'} than expected, "
        f"{verdict} the usual scatter (± {scatter:.0f} %)",
    ]
    if unusual(segmented.segments)[which]:
        lines.append("unusual for this vehicle: kept; check the amount and the odometer")
        lines += map(str, slips_of(segmented, [which], vehicle)[which])
    return lines


def _latest_expectation(kept: Sequence[Mapping[str, Any]]) -> Mapping[str, Any] | None:
    told = [answer for answer in kept if answer.get("expectation")]
    return max(told, key=lambda answer: answer.get("at_km") or 0.0, default=None)


def _expected(
    segmented: SegmentedLog, which: int, answer: Mapping[str, Any], rows: Sequence[Modification]
) -> float | None:
    """Energy per km the kept model expects of a segment; a condition that is unknown counts as the reference one."""
    expectation = answer["expectation"]
    percent = 0.0
    for name, slope in expectation["terms"].items():
        value = condition_in(segmented, which, condition_of(name))
        if value is not None:
            percent += slope * (term(name, value) - expectation["centres"][name])
    own = [row for row in rows if row.name == answer.get("modification")]
    try:
        by_level = (answer.get("response") or {}).get("levels", ())
        shifts = {effect["level"]: effect["shift_percent"] for effect in by_level}
        whatever = expectation["shift_percent"] or 0.0
        percent += shares(segmented, [replace(row, level=shifts.get(row.level, whatever)) for row in own])[which]
    except ConsumptionError:
        return None  # the rows of the modification contradict each other; said under what is left to go
    return float(expectation["consumption"] * (1 + percent / 100))


def condition_in(segmented: SegmentedLog, which: int, name: str) -> float | None:
    """Distance-weighted condition of a segment, None where unknown on more than half of its distance."""
    segment = segmented.segments[which]
    if name == ELECTRIC:
        return 100 * segmented.electric[which] / segment.distance_km if segmented.electric else None
    if name == "season":
        return (segment.start_day + segment.end_day) / 2
    total = known = 0.0
    for leg in segment.legs:
        entry = segmented.entries[leg.entry]
        value = getattr(entry, name) if name in ("temperature_c", "speed_kmh") else entry.extra.get(name)
        if value is not None:
            total += value * leg.distance_km
            known += leg.distance_km
    return total / known if known > 0 and known >= segment.distance_km / 2 else None


def _still_to_go(
    segmented: SegmentedLog,
    vehicle: Vehicle,
    index: int,
    kept: Sequence[Mapping[str, Any]],
    rows: Sequence[Modification],
) -> list[str]:
    answers = {answer.get("modification"): answer for answer in kept}
    lines = []
    for name in dict.fromkeys(row.name for row in rows if row.removed_km is None and row.removed_date is None):
        answer = answers.get(name)
        if answer is None:
            lines.append(f"{name}: run `energytrack enough` to see how far there is to go")
        elif answer.get("verdict") in ("not-yet", "out-of-reach", "no-baseline"):
            own = [row for row in rows if row.name == name]
            lines.append(f"{name}: {_left(segmented, vehicle, index, answer, own)}")
    return lines


def _left(
    segmented: SegmentedLog, vehicle: Vehicle, index: int, answer: Mapping[str, Any], rows: Sequence[Modification]
) -> str:
    """What is left of the distance to go, less what was driven with the part fitted since that answer was kept."""
    target = f"the {answer['target_percent']:g} % target"
    to_go, at = answer.get("distance_to_go_km"), answer.get("at_km")
    if to_go is None:
        why = "no baseline yet" if answer["verdict"] == "no-baseline" else f"{target} is out of reach as it is driven"
        return f"{why}: `energytrack enough` says what would help"
    if at is None:
        return f"about {_about(to_go, vehicle)} to go at {target} when last looked at"
    here = segmented.positions[index]
    try:
        periods = fitted_periods(segmented, rows)
    except ConsumptionError as contradiction:
        return str(contradiction)
    driven = math.fsum(max(0.0, min(removed, here) - max(fitted, at)) for fitted, removed, _ in periods)
    if driven >= to_go:
        return f"the distance asked for at {target} is covered"
    return f"about {_about(to_go - driven, vehicle)} to go at {target}"


def _about(km: float, vehicle: Vehicle) -> str:
    """Rounded up to tens of the vehicle's distance unit."""
    tens = math.ceil(from_base(km, vehicle.distance_unit) / 10) * 10
    return distance_text(to_base(tens, vehicle.distance_unit), vehicle)
