"""Ways to run a test, compared in distance: sentence, tables, what to do next."""

from __future__ import annotations

import datetime as dt
import io
from collections.abc import Iterable, Sequence
from typing import Literal

from rich.console import Console
from rich.table import Table
from rich.text import Text

from energytrack.inference.results import Design, Plan
from energytrack.logbook.records import Modification
from energytrack.presentation import figures, ways
from energytrack.presentation.answer import NO_LEVELS, TELL_LEVELS, USUAL_BASELINE_KM, count
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import bullets, join, labelled, wrap

_ABOUT_AS_SHORT = 1.1
_LARGEST_TARGET = 50.0  # percent


def render(
    p: Plan, *, unit: str = "km", width: int = 80, title: bool = False, fitted: Sequence[str] = ()
) -> list[Text]:
    """Lines of at most `width` cells; `fitted`: where entries of modified periods lie, a phrase each."""
    lines = [Text(line, style="underline") for line in wrap(plain_text(p.vehicle), width)] if title else []
    lines += [Text(line, style="bold") for line in wrap(sentence(p, unit), width)]
    for block in _blocks(p, unit, width, fitted):
        if block:
            lines += [Text(), *map(Text, block)]
    return lines


def sentence(p: Plan, unit: str = "km") -> str:
    """Which way is shorter, and by how much; distances in `unit` (km or mi)."""
    target = figures.target(p.target_percent)
    if not p.levels_known:
        return f"No plan yet: {NO_LEVELS}. {TELL_LEVELS}"
    if not p.designs:
        missing = max(USUAL_BASELINE_KM - p.distance_baseline_km, USUAL_BASELINE_KM / 4)
        segments = count(p.segments_baseline, "segment")
        return (
            f"No plan yet: {segments} between known levels tell too little about the scatter. "
            f"Drive about {figures.distance(missing, unit)} as usual first, logging every entry."
        )
    one, other = _one_switch(p), _best_other(p)
    whose = "such noise" if p.stated else "this log"
    if one is None and other is None:
        return f"Out of reach: no way of testing shows {target} with {whose}, however far you drive."
    if one is None or one.distance_km is None:
        return f"One switch now cannot show {target} with {whose}, however far you drive; {_takes(other, unit)}."
    if other is None or other.distance_km is None:
        return f"To show {target}, {_takes(one, unit)}; no other way gets there."
    second = _takes(other, unit).replace(" takes", "", 1)
    return f"To show {target}, {_takes(one, unit)}, {second}: {_difference(one, other, unit)}."


def _difference(one: Design, other: Design, unit: str) -> str:
    saved = (one.distance_km or 0.0) - (other.distance_km or 0.0)
    if abs(saved) < 0.02 * (one.distance_km or 0.0):
        return "no difference to speak of"
    said = join(f"{figures.significant(figures.in_unit(abs(saved), unit), 1)} {unit}")
    return f"about {said} {'less' if saved > 0 else 'more'}"


def _takes(design: Design | None, unit: str) -> str:
    assert design is not None
    assert design.distance_km is not None
    far = figures.foretold(design.distance_km, design.distance_interval_km, unit)
    time = "" if design.days is None else f" ({figures.days(design.days)})"
    return f"{ways.phrase(design)} takes about {far}{time}"


def periods(modifications: Iterable[Modification], unit: str) -> list[str]:
    """Where each modification already logged was on: a phrase for each period."""
    said = []
    for m in modifications:
        still_on = m.removed_km is None and m.removed_date is None
        end = "still on" if still_on else f"to {_moment(m.removed_km, m.removed_date, unit)}"
        said.append(f"{m.name}: from {_moment(m.fitted_km, m.fitted_date, unit)}, {end}")
    return said


def _moment(km: float | None, date: dt.date | None, unit: str) -> str:
    if km is not None:
        return figures.driven(km, unit)
    return "the start" if date is None else date.isoformat()


def _one_switch(p: Plan) -> Design | None:
    return next((d for d in p.designs if d.name == "one-switch" and d.distance_km is not None), None)


def _best_other(p: Plan) -> Design | None:
    """The way with the fewest swaps among those about as short as the shortest, one switch now left out."""
    within = [(d.distance_km, d) for d in p.designs if d.name != "one-switch" and d.distance_km is not None]
    if not within:
        return None
    limit = _ABOUT_AS_SHORT * min(km for km, _ in within)
    return min((d for km, d in within if km <= limit), key=lambda d: (d.swaps or 0, d.distance_km))


def _blocks(p: Plan, unit: str, width: int, fitted: Sequence[str]) -> list[list[str]]:
    tables = [_distances(p, unit), _resolvable(p, unit), _costs(p)] if p.designs else []
    return [
        *(_lines(table, width) for table in tables),
        labelled(_baseline(p, unit, fitted), width),
        bullets(_cautions(p), "! ", width),
        bullets(_next_steps(p), "> ", width),
    ]


def _baseline(p: Plan, unit: str, fitted: Sequence[str]) -> list[tuple[str, str]]:
    driven = figures.driven(p.distance_baseline_km, unit)
    if not p.stated or p.noise is None:
        rows = [("log so far", f"{driven} in {count(p.segments_baseline, 'segment')}")]
        return rows + [("modified in it" if i == 0 else "", plain_text(phrase)) for i, phrase in enumerate(fitted)]
    noise = p.noise
    sizes = [
        f"{join(f'{noise.trip_percent:.2g} %')} from trip to trip",
        f"{join(f'{noise.drift_weeks_percent:.2g} %')} over weeks",
        f"{join(f'{noise.drift_seasons_percent:.2g} %')} over seasons",
        f"{join(f'{noise.level_error:.2g} {p.unit}')} a filling",
    ]
    before = f"{driven} in {count(p.segments_baseline, 'fill-up')}; distances count from after it"
    return [("baseline, stated", before), ("scatter, stated", ", ".join(sizes))]


def _cautions(p: Plan) -> list[str]:
    kept = [] if p.reversible else ["It cannot be taken off again: ways that take it off are left out."]
    return kept + [plain_text(warning) for warning in p.warnings]


def _distances(p: Plan, unit: str) -> Table:
    table = _table([f"to show {p.target_percent:g} %", "distance", "80 % range", "days", "swaps"])
    for d in p.designs:
        reached = d.distance_km is not None
        table.add_row(
            ways.name(d),
            "out of reach" if d.distance_km is None else figures.foretold(d.distance_km, d.distance_interval_km, unit),
            _range(d, unit) if reached else "-",
            figures.days(d.days).split("\u00a0")[0] if d.days is not None else "-",
            f"{d.swaps:,}" if d.swaps is not None and reached else "-",
        )
    return table


def _range(d: Design, unit: str) -> str:
    if d.distance_interval_km is None:
        return "-"
    low, high = d.distance_interval_km
    if high is None:
        return f"{figures.distance(low, unit, digits=2)} or more"
    return figures.distance_range(low, high, unit)


def _resolvable(p: Plan, unit: str) -> Table:
    """The smallest shift each way can resolve after so much further driving."""
    distances = list(p.designs[0].resolvable_percent)  # no shift is shown finer than it is large: whole from 10 % on
    table = _table(["resolvable shift within", *(figures.distance(float(km), unit) for km in distances)])
    for d in p.designs:
        shifts = [d.resolvable_percent.get(km) for km in distances]
        table.add_row(ways.name(d), *("-" if shift is None else figures.percent(shift, shift) for shift in shifts))
    return table


def _costs(p: Plan) -> Table:
    """What each way's distance is spent on most: the share of the variance that would go with it."""
    table = _table(["what costs the most", "share", "of the variance"], left=(0, 2))
    for d in p.designs:
        source, share = ways.cost(d, p.unit)
        table.add_row(ways.name(d), share, source)
    return table


def _about_the_baseline(p: Plan) -> list[str]:
    """What a longer baseline would do for one switch that is far or out of reach; stated plans are in km."""
    longer, one = p.with_longer_baseline, _one_switch(p)
    if longer is None:
        never = "A longer baseline alone does not bring one switch within reach: such scatter is too large for it."
        return [never] if p.stated and one is None else []
    before, so_far = (figures.distance(km, "km") for km in (longer.baseline_km, p.distance_baseline_km))
    then = f"{figures.foretold(longer.distance_km, None, 'km')} ({join(f'--baseline {longer.baseline_km:.0f}')})"
    return [f"A longer baseline helps: after {before} without it, not {so_far}, one switch takes about {then}."]


def _table(headings: Sequence[str], left: Sequence[int] = (0,)) -> Table:
    """The first column folds where the screen is too narrow for all of them."""
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), show_header=True)
    for place, heading in enumerate(headings):
        justify: Literal["left", "right"] = "left" if place in left else "right"
        table.add_column(Text(heading), justify=justify, no_wrap=place > 0, overflow="fold")
    return table


def _lines(table: Table, width: int) -> list[str]:
    """A table as plain lines; what does not fit is folded, and nothing is cut."""
    out = io.StringIO()
    Console(file=out, width=width, color_system=None, markup=False, emoji=False, highlight=False).print(table)
    return [line.rstrip().replace("\u00a0", " ") for line in out.getvalue().splitlines()]


def _next_steps(p: Plan) -> list[str]:
    one, other = _one_switch(p), _best_other(p)
    if not p.designs:
        return ["Record the outside temperature with each entry: weather is the largest thing to tell apart."]
    best = min((d for d in (one, other) if d is not None), key=lambda d: d.distance_km or 0.0, default=None)
    advice = ways.remedy(best or p.designs[0], p.reversible)
    steps = [*_about_the_baseline(p), *([] if advice is None else [advice])]
    if best is None:
        larger = min(2 * p.target_percent, _LARGEST_TARGET)
        return [*steps, "Ask for a larger shift: the same with " + join(f"--target {larger:g}")]
    if (best.swaps or 0) > 1:
        steps.append("Swap only what comes off and on quickly and safely, parked, as its maker says.")
    if p.stated:
        return [*steps, f"Keep a log, and plan again from its own noise: {join('energytrack plan')}"]
    commands = f"{join('energytrack mod fitted')}, {join('energytrack mod removed')}"
    steps.append(f"Log each change at its odometer value: {commands if p.reversible else commands.split(',')[0]}")
    return [*steps, f"Then ask after any entry: {join('energytrack enough')}"]
