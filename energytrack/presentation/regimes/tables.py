"""Tables of changes, of the regimes between them, and of how their number was decided."""

from __future__ import annotations

from energytrack.inference.regimes.results import Break, BreakTest, RegimeReport
from energytrack.inference.results import Range
from energytrack.logbook.quantities import consumption, consumption_unit, rounded
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures
from energytrack.presentation.columns import aligned
from energytrack.presentation.plain import plain_text
from energytrack.presentation.regimes.marks import named
from energytrack.presentation.text import HARD_SPACE, labelled, wrap

_SMALL = 0.001  # p-values below are not told apart
_HINT = "  "


def changes(report: RegimeReport, unit: str, width: int) -> list[str]:
    """Each change in two rows, its place above the range of its place, and below what was logged there."""
    if not report.breaks:
        return []
    rows = [("shift", f"{100 * report.confidence:g} % range", f"at, {unit}", "on")]
    for found in report.breaks:
        rows += _rows(found, unit)
    table = aligned(rows)
    lines = table[:1]
    for number, found in enumerate(report.breaks):
        lines += [*table[1 + 2 * number : 3 + 2 * number], *(_HINT + line for line in _explained(found, unit, width))]
    return lines


def _rows(found: Break, unit: str) -> list[tuple[str, str, str, str]]:
    span = figures.bounded(found.interval_percent)
    size, ends = figures.percent(found.shift_percent, signed=True), figures.percent_range(span) if span else "open"
    place, low, high = (
        figures.significant(figures.in_unit(km, unit), 3) for km in (found.odometer_km, *found.interval_km)
    )
    return [
        (_plain(size), _plain(ends), place, found.date),
        (f"p {_p(found.p_value)}", "", f"{low} to {high}", " to ".join(found.interval_dates)),
    ]


def _explained(found: Break, unit: str, width: int) -> list[str]:
    """What was logged inside the range, in the unit shown."""
    if not found.matches:
        return ["unexplained: nothing was logged in that range"]
    said = []
    for match in found.matches:
        at = f"on {match.date}" if match.odometer_km is None else f"at {figures.driven(match.odometer_km, unit)}"
        said.append(f"{named(match)} {at}")
    return wrap(f"agrees with {'; and with '.join(said)}", width - len(_HINT))


def levels(report: RegimeReport, vehicle: Vehicle) -> list[str]:
    """The regimes, with their consumption at the reference conditions."""
    if not report.regimes:
        return []
    unit = vehicle.distance_unit
    rows = [("from", f"to, {unit}", "dates", "segments", "level", f"{100 * report.confidence:g} % range")]
    for regime in report.regimes:
        start, end = (_plain(figures.driven(km, unit)).split(" ")[0] for km in (regime.start_km, regime.end_km))
        dates = f"{regime.start_date} to {regime.end_date}"
        level = rounded(consumption(regime.consumption, vehicle), 3)
        rows.append((start, end, dates, f"{regime.segments:,}", level, _interval(regime.interval, vehicle)))
    return [f"regimes, in {consumption_unit(vehicle).label}", *aligned(rows, right=(0, 1, 3, 4))]


def _interval(span: Range, vehicle: Vehicle) -> str:
    low, high = sorted(consumption(end, vehicle) for end in span)
    return f"{rounded(low, 3)} to {rounded(high, 3)}"


def decision(report: RegimeReport, unit: str, width: int) -> list[str]:
    """Tests and criteria behind the number of changes, and which of them decided."""
    if report.decided_by is None or report.judged_km is None:
        return []
    best = min(report.criteria, key=lambda criterion: criterion.bic)
    criteria = ", ".join(f"{one.bic:.1f}" for one in report.criteria)
    low, high = (figures.driven(end, unit) for end in report.judged_km)
    rows = [(_tried(test), f"sup-F {rounded(test.statistic, 3)}, p {_p(test.p_value)}") for test in report.tests]
    rows += [
        ("BIC", f"{criteria} for 0 to {report.criteria[-1].breaks} changes, least for {best.breaks}"),
        ("decided by", plain_text(report.decided_by)),
        ("looked for", f"from {low.split(HARD_SPACE)[0]} to {high}"),
    ]
    return ["how their number was decided", *labelled([(_HINT + label, value) for label, value in rows], width)]


def _tried(test: BreakTest) -> str:
    if test.more == 2:
        return "two at once" if test.breaks == 0 else "two more at once"
    return "a change" if test.breaks == 0 else "one more"


def _p(value: float) -> str:
    return f"< {_SMALL:g}" if value < _SMALL else f"{min(value, 1.0):.2g}"


def _plain(figure: str) -> str:
    return figure.replace(HARD_SPACE, " ")
