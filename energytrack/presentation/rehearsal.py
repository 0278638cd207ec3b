"""A rehearsal as text: sentence, table of the drawn logs, table of pretended changes, what to do next."""

from __future__ import annotations

from rich.text import Text

from energytrack.inference.rehearsal_results import Ends, Rate, Rehearsal, Scenario
from energytrack.presentation import figures
from energytrack.presentation.answer import count
from energytrack.presentation.columns import aligned
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import bullets, join, labelled, wrap

_TOO_OFTEN = 1.5  # times the promised rate, from which the placebo is worth a word
_USUAL_RUNS = 200
_MANY = 100  # logs, from which a tenth of a percent is worth showing near 0 and 100


def render(r: Rehearsal, *, unit: str = "km", width: int = 80, title: bool = False) -> list[Text]:
    """Lines of at most `width` cells; distances in `unit` (km or mi)."""
    heading = f"{r.vehicle}: {r.modification}" if r.modification else r.vehicle
    lines = [Text(line, style="underline") for line in wrap(plain_text(heading), width)] if title else []
    lines += [Text(line, style="bold") for line in wrap(sentence(r, unit), width)]
    for block in _blocks(r, unit, width):
        if block:
            lines += [Text(), *map(Text, block)]
    return lines


def sentence(r: Rehearsal, unit: str = "km") -> str:
    """How often the test was fooled, and how often it found what was there."""
    alarms, found = r.no_shift.called_shifted, r.target_shift.called_shifted
    logs = "log" if r.runs == 1 else "logs"
    was = "was" if alarms.count == 1 else "were"
    return (
        f"On {r.runs:,} {logs} like yours without any shift, {alarms.count:,} {was} called one "
        f"({_percent(alarms)}, {_span(alarms)}); a shift of {figures.target(r.target_percent)} was found in "
        f"{_percent(found)} ({_span(found)}){_after(r, unit)}."
    )


def _after(r: Rehearsal, unit: str) -> str:
    settled = r.target_shift.settled
    if settled is None or settled.median_km is None:
        return ""
    return f"; half of these were settled within {figures.distance(settled.median_km, unit, digits=2)} with it fitted"


def _percent(rate: Rate) -> str:
    return join(f"{_share(rate.percent, rate.of)} %")


def _span(rate: Rate) -> str:
    return join(f"{_ends_of(rate)} %")


def _ends_of(rate: Rate) -> str:
    low, high = rate.interval_percent
    return f"{_share(low, rate.of)} to {_share(high, rate.of)}"


def _share(percent: float, of: int) -> str:
    """Whole percents; one decimal near 0 and 100, where enough logs were drawn for it to be worth one."""
    fine = of >= _MANY and (0 < percent < 10 or 90 < percent < 100)
    return f"{percent:.1f}" if fine else f"{percent:.0f}"


def _blocks(r: Rehearsal, unit: str, width: int) -> list[list[str]]:
    return [
        labelled(_log(r, unit), width),
        _drawn(r, unit),
        _placebo(r),
        bullets(map(plain_text, r.warnings), "! ", width),
        bullets(next_steps(r, unit), "> ", width),
    ]


def _log(r: Rehearsal, unit: str) -> list[tuple[str, str]]:
    driven = figures.driven(r.distance_modified_km, unit)
    where = "pretended from the middle of your log on" if r.pretended else "fitted where your log has it"
    return [
        ("each log", f"{count(r.segments_baseline, 'segment')} without it, {r.segments_modified:,} with it ({driven})"),
        ("the modification", where),
        ("looks", f"{r.looks:,} at each log, as its entries come in"),
    ]


def _drawn(r: Rehearsal, unit: str) -> list[str]:
    both = (r.no_shift, r.target_shift)
    rates = (
        ("called shifted", [s.called_shifted for s in both]),
        ("called no shift of that size", [s.called_no_shift for s in both]),
        ("not settled by the end", [s.not_settled for s in both]),
        ("range held the truth all along", [s.covered for s in both]),
        ("range held it at the end", [s.covered_at_end for s in both]),
    )
    spans = [(None, None) if s.settled is None else (s.settled.median_interval_km, s.settled.range_km) for s in both]
    rows = [
        (f"of {r.runs:,} logs (95 % range)", "without a shift", f"shift of -{r.target_percent:g} %"),
        *((label, *map(_cell, pair)) for label, pair in rates),
        ("settled within, median", *(_median(s, unit) for s in both)),
        ("  95 % range of the median", *(_ends(of_median, unit) for of_median, _ in spans)),
        ("  middle 80 % of the logs", *(_ends(of_logs, unit) for _, of_logs in spans)),
    ]
    return aligned(rows, right=(1, 2))


def _cell(rate: Rate) -> str:
    return f"{_share(rate.percent, rate.of)} %  ({_ends_of(rate)})"


def _median(scenario: Scenario, unit: str) -> str:
    settled = scenario.settled
    if settled is None or settled.median_km is None:
        return "not within this log"
    return f"{_km(settled.median_km, unit)} {unit}"


def _ends(ends: Ends | None, unit: str) -> str:
    low, high = ends or (None, None)
    if low is None:
        return "-"
    return f"{_km(low, unit)} {unit} or more" if high is None else f"{_km(low, unit)} to {_km(high, unit)} {unit}"


def _km(km: float, unit: str) -> str:
    return figures.significant(figures.in_unit(km, unit), 2)


def _placebo(r: Rehearsal) -> list[str]:
    if not r.placebo:
        return []
    methods = (
        ("this test, looking at every entry", [p.called_every_look for p in r.placebo]),
        ("this test, looking once", [p.called_one_look for p in r.placebo]),
        ("two averages, looking at every entry", [p.averages_every_look for p in r.placebo]),
        ("two averages, looking once", [p.averages_one_look for p in r.placebo]),
    )
    rows = [
        ("segments before and after", *(f"{p.segments_each_side}" for p in r.placebo)),
        ("places tried", *(f"{p.places:,}" for p in r.placebo)),
        ("  that share no segment", *(f"{p.separate:,}" for p in r.placebo)),
        *(
            (label, *(f"{_share(100 * n / p.places, p.places)} %" for n, p in zip(called, r.placebo, strict=True)))
            for label, called in methods
        ),
    ]
    heading = "pretended changes called a shift, where nothing was fitted or removed"
    return [heading, *aligned(rows, right=range(1, len(r.placebo) + 1))]


def next_steps(r: Rehearsal, unit: str = "km") -> list[str]:
    """What the figures say to do."""
    steps = [*_about_alarms(r), *_about_power(r), *_about_placebo(r, unit)]
    if not r.placebo:
        steps.append("Log on without a change: 20 segments in a row are the least a placebo needs.")
    return steps


def _about_alarms(r: Rehearsal) -> list[str]:
    promised = 100 * (1 - r.confidence)
    low, high = r.no_shift.called_shifted.interval_percent
    said = join(f"{promised:.2g} %")
    if low > promised:
        return [
            f"More false alarms than the {said} promised: before you trust a verdict on this log, see whether it "
            "stands when the part is taken off and fitted again."
        ]
    if high > 2 * promised:
        return [f"More runs tell the false alarms better: {join(f'energytrack rehearse --runs {_more(r.runs)}')}"]
    return [f"As far as {r.runs:,} runs can tell, false alarms are no more frequent than the {said} promised."]


def _more(runs: int) -> int:
    return max(_USUAL_RUNS, 5 * runs)


def _about_power(r: Rehearsal) -> list[str]:
    low, high = r.target_shift.called_shifted.interval_percent
    target, power = figures.target(r.target_percent), join(f"{100 * r.power:g} %")
    if high < 100 * r.power:
        return [
            f"Within this log, finding {target} falls short of a chance of {power}. Drive on, or see which way is "
            f"shorter: {join(f'energytrack plan --target {r.target_percent:g}')}"
        ]
    if low >= 100 * r.power:
        return [f"This log is long enough to find {target} with a chance of {power}."]
    return []


def _about_placebo(r: Rehearsal, unit: str) -> list[str]:
    fooled = [p for p in r.placebo if p.called_every_look > max(_TOO_OFTEN * (1 - r.confidence) * p.places, 1)]
    if not fooled:
        return []
    at = sorted(km for p in fooled for km in p.called_at_km)
    return [
        f"Pretended changes between {figures.driven(at[0], unit)} and {figures.driven(at[-1], unit)} were called "
        "shifts more often than promised. Chance, or something happened there (service, tyres, another driver): "
        f"if so, log it with {join('energytrack mod fitted')} to have it allowed for."
    ]
