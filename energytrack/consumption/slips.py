"""Slips of the pen, recognised by the value that would fit, and named. Nothing is ever corrected unasked.

Standard library only: the echo of an entry names them too.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from math import hypot, inf

from energytrack.consumption.segments import Segment, SegmentedLog
from energytrack.logbook.quantities import (
    KM_PER_MILE,
    LITRES_PER_IMPERIAL_GALLON,
    LITRES_PER_US_GALLON,
    distance_text,
    energy_text,
    from_base,
    to_base,
)
from energytrack.logbook.records import Entry, Vehicle

FITS_SD = 2.0  # a corrected segment lies this close to what was expected of it
_PARTNER_SD = 2.0  # least deviation of the other half of a pair
_MERGED_SD = 2.5  # a pair taken together
_OVERFULL = 1.3  # of capacity: no amount is larger
_NEAR = 20  # segments on each side that tell what amount is usual
_MISSING = ("an entry missing", "two entries missing", "three entries missing")
_USUAL_AMOUNT = 0.6  # of the median amount: what a tank after a forgotten entry holds at least


Fit = tuple[float, str, str]  # gap in sd, what is said of it, the option that would say so


@dataclass(frozen=True, slots=True)
class Slip:
    """What may have happened, what would fit, and what to type after `energytrack amend` to say so."""

    what: str
    suggestion: str
    amend: str

    def __str__(self) -> str:
        return f"{self.what}? {self.suggestion}"


@dataclass(frozen=True, slots=True)
class Case:
    """A segment under suspicion, and what was expected of every segment: consumption and its sd, energy per km."""

    segmented: SegmentedLog
    which: int
    expected: Sequence[float]
    sd: Sequence[float]
    vehicle: Vehicle

    @property
    def segment(self) -> Segment:
        return self.segmented.segments[self.which]

    @property
    def entry(self) -> Entry:
        return self.segmented.entries[self.segment.legs[-1].entry]

    @property
    def amount_is_possible(self) -> bool:
        return self.segmented.capacity is None or self.entry.energy <= _OVERFULL * self.segmented.capacity

    def gap(self, which: int, distance: float, energy: float) -> float:
        """Distance from what was expected of segment `which`, in sd, if it had this distance and energy."""
        if distance <= 0 or energy <= 0:
            return inf
        return abs(energy / distance - self.expected[which]) / self.sd[which]


def find_slips(case: Case) -> list[Slip]:
    """At most two explanations of one segment, the more specific one first."""
    found: list[Slip] = []
    for find in (_swapped_digits, _doubled_digit, _unmarked_partial, _other_unit, _missing_digit, _missing_entry):
        found += find(case)
    return found[:2]


def _swapped_digits(case: Case) -> list[Slip]:
    return _retyped(case, "two digits swapped", swapped)


def _doubled_digit(case: Case) -> list[Slip]:
    return _retyped(case, "a digit doubled", undoubled)


def _missing_digit(case: Case) -> list[Slip]:
    return _retyped(case, "a digit missing", completed)


def _retyped(case: Case, what: str, variants: Callable[[str], Iterable[str]]) -> list[Slip]:
    """The retyped odometer value, distance or amount that fits best, if one does; else the odometer value before it."""
    entry, vehicle = case.entry, case.vehicle
    fits = _odometer_fits(case, variants)
    if entry.odometer_km is None and entry.distance_km is not None and case.amount_is_possible:
        for typed in variants(_typed(from_base(entry.distance_km, vehicle.distance_unit))):
            fits.append(_other_distance(case, to_base(float(typed), vehicle.distance_unit)))
    unit = vehicle.typed_unit or vehicle.unit
    for typed in variants(f"{from_base(entry.energy, unit):.2f}"):
        fits.append(_other_amount(case, to_base(float(typed), unit)))
    found = _best(case, what, fits)
    if found or case.which == 0 or not case.segment.linked:
        return found
    before = replace(case, which=case.which - 1)
    return _best(before, what, _odometer_fits(before, variants))


def _odometer_fits(case: Case, variants: Callable[[str], Iterable[str]]) -> list[Fit]:
    """Every retyped odometer value at the end of the segment."""
    odometer_km, vehicle = case.entry.odometer_km, case.vehicle
    if odometer_km is None or not case.amount_is_possible:
        return []
    fits = []
    for typed in variants(_typed(from_base(odometer_km, vehicle.distance_unit))):
        moved = to_base(float(typed), vehicle.distance_unit) - odometer_km
        old, new = distance_text(odometer_km, vehicle), distance_text(odometer_km + moved, vehicle)
        fits.append((_moved_gap(case, moved), f"odometer {_number(old)} -> {new} fits", f"--odometer {typed}"))
    return fits


def _moved_gap(case: Case, moved: float) -> float:
    """Worst gap of this segment and the next, if the odometer value between them is moved (km)."""
    segment = case.segment
    if segment.legs[-1].end_km + moved <= segment.legs[-1].start_km:
        return inf
    gap = case.gap(case.which, segment.distance_km + moved, segment.energy)
    if case.which + 1 < len(case.segmented.segments):
        following = case.segmented.segments[case.which + 1]
        if following.linked:
            gap = max(gap, case.gap(case.which + 1, following.distance_km - moved, following.energy))
    return gap


def _other_distance(case: Case, km: float) -> Fit:
    old = case.entry.distance_km or 0.0
    said = f"distance {_number(distance_text(old, case.vehicle))} -> {distance_text(km, case.vehicle)} fits"
    option = f"--distance {_typed(from_base(km, case.vehicle.distance_unit))}"
    return case.gap(case.which, case.segment.distance_km + km - old, case.segment.energy), said, option


def _other_amount(case: Case, amount: float) -> Fit:
    old, capacity = case.entry.energy, case.segmented.capacity
    if capacity is not None and amount > _OVERFULL * capacity:
        return inf, "", ""
    said = f"amount {_number(energy_text(old, case.vehicle))} -> {energy_text(amount, case.vehicle)} fits"
    option = f"--amount {from_base(amount, case.vehicle.typed_unit or case.vehicle.unit):.2f}"
    return case.gap(case.which, case.segment.distance_km, case.segment.energy + amount - old), said, option


def _best(case: Case, what: str, fits: Iterable[Fit]) -> list[Slip]:
    gap, said, option = min(fits, default=(inf, "", ""))
    return [_slip(what, said, case.entry, case.vehicle, option)] if gap <= FITS_SD else []


def _slip(what: str, said: str, entry: Entry, vehicle: Vehicle, option: str) -> Slip:
    return Slip(what, said, f"{named(entry, vehicle)} {option}")


def _unmarked_partial(case: Case) -> list[Slip]:
    """One segment low and the next high by the same energy, or the other way round: the level between is wrong."""
    segments = case.segmented.segments
    for first in (case.which, case.which - 1):
        if first < 0 or first + 1 >= len(segments) or not segments[first + 1].linked:
            continue
        excess = [segments[k].energy - case.expected[k] * segments[k].distance_km for k in (first, first + 1)]
        scatter = [case.sd[k] * segments[k].distance_km for k in (first, first + 1)]
        opposite = excess[0] * excess[1] < 0 and all(
            abs(each) >= _PARTNER_SD * sd for each, sd in zip(excess, scatter, strict=True)
        )
        if opposite and abs(sum(excess)) <= _MERGED_SD * hypot(*scatter):
            between = case.segmented.entries[segments[first].legs[-1].entry]
            what = "partial fill not marked" if excess[0] < 0 else "filled beyond the usual mark"
            said = f"mark the entry {place(between, case.vehicle)} as partial"
            return [_slip(what, said, between, case.vehicle, "--partial")]
    return []


def _other_unit(case: Case) -> list[Slip]:
    return [*_miles(case), *_gallons(case)]


def _miles(case: Case) -> list[Slip]:
    """Only where distances are typed: an odometer in other units would go back, or leap."""
    entry = case.entry
    if entry.odometer_km is not None or entry.distance_km is None:
        return []
    miles = case.vehicle.distance_unit == "km"
    other = entry.distance_km * (KM_PER_MILE if miles else 1 / KM_PER_MILE)
    return _best(case, "miles typed for km" if miles else "km typed for miles", [_other_distance(case, other)])


def _gallons(case: Case) -> list[Slip]:
    typed = case.vehicle.typed_unit or case.vehicle.unit
    amount = case.entry.energy
    if typed == "L":
        gallons = {"US gallons": LITRES_PER_US_GALLON, "imperial gallons": LITRES_PER_IMPERIAL_GALLON}
        fits = [(*_other_amount(case, amount * factor), name) for name, factor in gallons.items()]
        gap, said, option, name = min(fits)
        what = f"{name} typed for litres"
        return [_slip(what, said, case.entry, case.vehicle, option)] if gap <= FITS_SD else []
    factor = {"gal-us": LITRES_PER_US_GALLON, "gal-imp": LITRES_PER_IMPERIAL_GALLON}.get(typed)
    return [] if factor is None else _best(case, "litres typed for gallons", [_other_amount(case, amount / factor)])


def _missing_entry(case: Case) -> list[Slip]:
    """A multiple of the distance on a usual amount: the fraction of the consumption that fits best tells how many."""
    segment, segments = case.segment, case.segmented.segments
    near = segments[max(0, case.which - _NEAR) : case.which + _NEAR + 1]
    usual = sorted(other.energy for other in near)[len(near) // 2]
    gaps = {
        missing: case.gap(case.which, segment.distance_km / (count + 1), segment.energy)
        for count, missing in enumerate(_MISSING, start=1)
    }
    what = min(gaps, key=gaps.__getitem__)
    if segment.energy < _USUAL_AMOUNT * usual or gaps[what] > FITS_SD:
        return []
    said = f"say that entries are missing before the one {place(case.entry, case.vehicle)}"
    return [_slip(what, said, case.entry, case.vehicle, "--missed")]


def place(entry: Entry, vehicle: Vehicle) -> str:
    """Which entry: its odometer value, else its day."""
    if entry.odometer_km is not None:
        return f"at {distance_text(entry.odometer_km, vehicle)}"
    return f"of {entry.date}"


def named(entry: Entry, vehicle: Vehicle) -> str:
    """How a command names an entry: its odometer value, else its day."""
    if entry.odometer_km is None:
        return entry.date.isoformat()
    return f"{from_base(entry.odometer_km, vehicle.distance_unit):.0f}"


def swapped(typed: str) -> Iterator[str]:
    """All numbers that differ from `typed` by one swap of neighbouring digits."""
    digits = [at for at, sign in enumerate(typed) if sign.isdigit()]
    for left, right in pairwise(digits):
        if typed[left] != typed[right]:
            letters = list(typed)
            letters[left], letters[right] = letters[right], letters[left]
            yield "".join(letters)


def undoubled(typed: str) -> Iterator[str]:
    """All numbers that come from `typed` by striking one of two equal neighbouring digits before the point."""
    whole, point, rest = typed.partition(".")
    for left in range(len(whole) - 1):
        if whole[left] == whole[left + 1]:
            yield whole[:left] + whole[left + 1 :] + point + rest


def completed(typed: str) -> Iterator[str]:
    """All numbers that become `typed` by leaving out one digit before the point."""
    whole, point, rest = typed.partition(".")
    for at in range(len(whole) + 1):
        for digit in "0123456789":
            if at > 0 or digit != "0":
                yield whole[:at] + digit + whole[at:] + point + rest


def _typed(value: float) -> str:
    """An odometer value or distance as it may have been typed."""
    return f"{value:.0f}" if abs(value - round(value)) < 0.05 else f"{value:.1f}"


def _number(text: str) -> str:
    return text.split("\u00a0")[0].split(" ")[0]
