"""What was set aside, as it is told: which entry, how far off, and what may have happened."""

from __future__ import annotations

from energytrack.consumption.oddities import Odd, Sorted
from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.slips import Case, find_slips, named, place
from energytrack.inference.results import SetAside
from energytrack.logbook.records import Vehicle

UNEXPLAINED = "stands out"
_LOOK = "check amount and odometer; confirm the entry if it is right"


def suspects(
    segmented: SegmentedLog, found: Sorted, vehicle: Vehicle, *, as_typed: bool = True
) -> tuple[SetAside, ...]:
    """One line for each odd segment or pair, in driving order. as_typed: energies are what was typed, not converted."""
    expected, sd = found.judgement.expected.tolist(), found.judgement.sd.tolist()
    return tuple(_told(Case(segmented, odd.segment, expected, sd, vehicle), odd, as_typed) for odd in found.odd)


def _told(case: Case, odd: Odd, as_typed: bool) -> SetAside:
    entry, segment = case.entry, case.segment
    slips = find_slips(case) if as_typed else []
    if odd.is_pair and not slips:
        suspicion, suggestion = "level wrong", f"mark the entry {place(entry, case.vehicle)} as partial"
        amend: tuple[str, ...] = (f"{named(entry, case.vehicle)} --partial",)
    else:
        suspicion = slips[0].what if slips else UNEXPLAINED
        suggestion = "; or ".join(
            [slip.suggestion if slip is slips[0] else f"{slip.what}: {slip.suggestion}" for slip in slips]
        )
        amend = tuple(slip.amend for slip in slips)
    return SetAside(
        odometer_km=entry.odometer_km,
        date=entry.date.isoformat(),
        energy=entry.energy,
        deviation_sd=odd.deviation_sd,
        suspicion=suspicion,
        suggestion=suggestion or _LOOK,
        merged_with_next=odd.is_pair,
        end_km=segment.end_km,
        amend=amend,
    )
