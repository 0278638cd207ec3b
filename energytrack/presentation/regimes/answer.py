"""What the search for undeclared changes found, as text: sentence, drawing, tables, where to look, what to do next."""

from __future__ import annotations

from collections.abc import Sequence

from rich.text import Text

from energytrack.inference.regimes.results import Break, RegimeReport
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures, undeclared
from energytrack.presentation.plain import plain_text
from energytrack.presentation.regimes import drawing, tables
from energytrack.presentation.regimes.marks import Mark, named
from energytrack.presentation.text import HARD_SPACE, bullets, join, wrap

_TIMES = {1: "once", 2: "twice"}


def render(
    report: RegimeReport, vehicle: Vehicle, marks: Sequence[Mark] = (), *, width: int = 80, title: bool = False
) -> list[Text]:
    """Lines of at most `width` cells. `vehicle`: whose units are shown; `marks`: what was logged along the way."""
    lines = [Text(line, style="underline") for line in wrap(plain_text(report.vehicle), width)] if title else []
    lines += [Text(line, style="bold") for line in wrap(sentence(report, vehicle.distance_unit), width)]
    for block in _blocks(report, vehicle, marks, width):
        if block:
            lines += [Text(), *map(Text, block)]
    return lines


def _blocks(report: RegimeReport, vehicle: Vehicle, marks: Sequence[Mark], width: int) -> list[list[str]]:
    unit = vehicle.distance_unit
    return [
        drawing.lines(report, vehicle, marks, width),
        tables.changes(report, unit, width),
        tables.levels(report, vehicle),
        tables.decision(report, unit, width),
        bullets(_cautions(report), "! ", width),
        bullets(next_steps(report, unit), "> ", width),
    ]


def _cautions(report: RegimeReport) -> list[str]:
    unseen = "a small change can hide in the scatter: that none was found does not show that there was none"
    return [*map(plain_text, report.warnings), *([unseen] if report.note is None and not report.breaks else [])]


def sentence(report: RegimeReport, unit: str = "km") -> str:
    """How often consumption changed, by how much, where, and whether what was logged agrees."""
    if report.note is not None:
        return f"No answer yet: {plain_text(report.note)}."
    if report.breaks:
        times = _TIMES.get(len(report.breaks), f"{len(report.breaks)} times")
        return f"Consumption shifted {times}: {', '.join(_shift(found, unit) for found in report.breaks)}."
    assert report.judged_km is not None
    low, high = (figures.driven(end, unit) for end in report.judged_km)
    return f"No lasting change found between {low.split(HARD_SPACE)[0]} and {high}."


def _shift(found: Break, unit: str) -> str:
    agrees = f"agrees with {named(found.matches[0])}" if found.matches else "nothing logged there"
    size = figures.percent(found.shift_percent, signed=True)
    return f"{size} at about {figures.distance(found.odometer_km, unit)} ({agrees})"


def next_steps(report: RegimeReport, unit: str = "km") -> list[str]:
    """What the answer says to do."""
    if report.note is not None:
        return []
    unexplained = [found for found in report.breaks if not found.matches]
    steps = [step for found in unexplained for step in _about(found, unit, several=len(report.breaks) > 1)]
    steps += _about_modifications(report)
    if report.later_km is not None:
        far = figures.distance(report.later_km, unit, digits=2)
        steps.append(f"A change that happens now can be told after about {far} more at the earliest.")
    return steps


def _about(found: Break, unit: str, *, several: bool) -> list[str]:
    where = f"At {figures.distance(found.odometer_km, unit)}: "
    return [(where if several else "") + plain_text(step) for step in undeclared.steps(found, unit)]


def _about_modifications(report: RegimeReport) -> list[str]:
    """A break beside a modification is no verdict on it: that allows for looking often, and for what else changed."""
    names = dict.fromkeys(
        match.what for found in report.breaks for match in found.matches[:1] if match.kind in ("fitted", "removed")
    )
    return [f"For the verdict on it: {join('energytrack enough')} {join(_quoted(name))}" for name in names]


def _quoted(name: str) -> str:
    return f'"{plain_text(name)}"'
