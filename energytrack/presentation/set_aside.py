"""Entries set aside: which, how far off, what may have happened, and whether it matters for the answer."""

from __future__ import annotations

import shlex

from energytrack.inference.results import Assessment, SetAside, Verdict
from energytrack.presentation import figures
from energytrack.presentation.plain import plain_text

MOST = 5  # told one by one; --json lists all
IN_WORDS: dict[Verdict, str] = {
    "shifted": "yes, it shifted consumption",
    "no-shift-of-target-size": "no shift of the target size",
    "not-yet": "not yet",
    "out-of-reach": "out of reach",
    "no-baseline": "no baseline",
    "closed-unclear": "unclear",
}


def follow_up(a: Assessment) -> str:
    """What the answer would be with everything kept, where it would be another one; else nothing."""
    other = a.verdict_with_all
    if other is None or other.verdict == a.verdict:
        return ""
    entries = "the odd entry" if len(a.set_aside) == 1 else f"the {len(a.set_aside)} odd entries"
    size = "" if other.shift_percent is None else f", {figures.percent(other.shift_percent, signed=True)}"
    return f"With {entries} kept the answer would be: {IN_WORDS[other.verdict]}{size}."


def told(a: Assessment, unit: str) -> list[str]:
    """One line an entry, and how to keep it."""
    if not a.set_aside:
        return []
    lines = [line for each in a.set_aside[-MOST:] for line in (_line(each, unit), *_corrections(each, a.vehicle))]
    if len(a.set_aside) > MOST:
        lines.insert(0, f"{len(a.set_aside)} entries stand out and are set aside; the newest {MOST} are:")
    which = "ODOMETER" if a.set_aside[-1].odometer_km is not None else "--date DAY"
    return [*lines, f"an entry that is right all the same: energytrack confirm {which}, or ask with --keep-all"]


def _corrections(each: SetAside, vehicle: str) -> list[str]:
    whose = f" --vehicle {shlex.quote(vehicle)}" if vehicle else ""
    return [plain_text(f"if so: energytrack amend {option}{whose}") for option in each.amend]


def _line(each: SetAside, unit: str) -> str:
    at = "" if each.odometer_km is None else f" at {figures.driven(each.odometer_km, unit)}"
    off = f"{abs(each.deviation_sd):.0f} sd {'above' if each.deviation_sd > 0 else 'below'} its neighbours"
    fate = "counted together with the next" if each.merged_with_next else "set aside"
    asked = each.suspicion if each.suspicion == "stands out" else f"{each.suspicion}?"
    said = f"{each.suggestion}" if asked == "stands out" else f"{asked} {each.suggestion}"
    return plain_text(f"entry of {each.date}{at}, {off}, {fate}: {said}")
