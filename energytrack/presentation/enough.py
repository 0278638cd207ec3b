"""The whole answer for one modification: sentence, bar, table, warnings, what to do next."""

from __future__ import annotations

from collections.abc import Iterable
from math import isfinite

from rich.text import Text

from energytrack.inference.results import Assessment
from energytrack.presentation import advice, bar, conditions, figures, picture, scatter, set_aside, several, undeclared
from energytrack.presentation.answer import count, named, sentence, so_far
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import bullets, labelled, wrap

Row = tuple[str, str]
_LOOKED = {
    "every-look": "however often you look",
    "counted": "at the looks taken so far",
    "open-ended": "however often and however long you look",
}
_AHEAD = 1.05  # an expected end is worth saying while it lies ahead


def render(
    a: Assessment, *, unit: str = "km", width: int = 80, title: bool = False, draw: bool = False
) -> list[Text]:
    """Lines of at most `width` cells; distances in `unit` (km or mi); `draw` adds the picture of all looks."""
    lines: list[Text] = []
    if title:
        heading = f"{plain_text(a.vehicle)}: {named(a)}"
        lines += [Text(line, style="underline") for line in wrap(heading, width)]
    lines += [Text(line, style="bold") for line in wrap(sentence(a, unit), width)]
    for block in _blocks(a, unit, width, draw):
        if block:
            lines += [Text(), *map(Text, block)]
    return lines


def repeats(a: Assessment, shown: Iterable[Assessment]) -> bool:
    """Whether one of those shown is this answer already: for parts never apart there is one answer, for all of them."""
    return any(
        other.modification in a.never_apart
        and a.modification in other.never_apart
        and (other.vehicle, other.target_percent, other.known_percent) == (a.vehicle, a.target_percent, a.known_percent)
        and (other.verdict, other.response) == (a.verdict, a.response)
        for other in shown
    )


def _blocks(a: Assessment, unit: str, width: int, draw: bool) -> list[list[str]]:
    return [
        bar.lines(a, width),
        picture.lines(a, unit, width) if draw else [],
        labelled(_distances(a, unit) + _shift(a), width),
        _headed("scatter of one segment, from one known level to the next", labelled(scatter.rows(a), width)),
        _headed(
            "what the conditions do",
            labelled([("  " + label, value) for label, value in conditions.rows(a.covariates, unit)], width),
        ),
        _headed("parts side by side", labelled(several.side_by_side(a.together), width) if a.together else []),
        _headed("by level", labelled(several.levels(a.response), width) if a.response else []),
        bullets([*undeclared.told(a, unit), *set_aside.told(a, unit), *map(plain_text, a.warnings)], "! ", width),
        bullets(advice.next_steps(a, unit), "> ", width),
    ]


def _headed(heading: str, body: list[str]) -> list[str]:
    return [heading, *body] if body else []


def _distances(a: Assessment, unit: str) -> list[Row]:
    rows = [
        ("without it", _covered(a.distance_baseline_km, a.segments_baseline, unit)),
        ("with it fitted", _covered(a.distance_modified_km, a.segments_modified, unit)),
    ]
    if a.distance_needed_km is not None:
        label = "needed" if a.is_open else "answered after"
        needed = _foretold(a, a.distance_needed_km, unit) if a.is_open else figures.distance(a.distance_needed_km, unit)
        rows.append((label, f"{needed} with it fitted"))
    if a.distance_to_go_km and a.verdict == "not-yet":
        rows.append(("still to go", _to_go(a, unit)))
    ahead = a.distance_expected_km is not None and a.distance_expected_km > _AHEAD * a.distance_modified_km
    if ahead and a.distance_expected_km is not None and a.verdict == "not-yet":
        sooner, target = _foretold(a, a.distance_expected_km, unit), figures.target(a.target_percent)
        rows.append(("sooner, perhaps", f"{sooner} with it fitted, if the shift is truly {target}"))
    return rows


def _covered(km: float, segments: int, unit: str) -> str:
    return f"{figures.driven(km, unit)} in {count(segments, 'segment')}"


def _to_go(a: Assessment, unit: str) -> str:
    assert a.distance_to_go_km is not None
    said = _foretold(a, a.distance_to_go_km, unit)
    if a.distance_to_go_interval_km is not None:
        said += f" (80 % range {figures.distance_range(*a.distance_to_go_interval_km, unit)})"
    return said if a.days_to_go is None else f"{said}, about {figures.days(a.days_to_go)}"


def _foretold(a: Assessment, km: float, unit: str) -> str:
    """A distance that ends where the test does, or may: its range is as wide as that of the distance still to go."""
    if a.distance_to_go_km is None or a.distance_to_go_interval_km is None:
        return figures.foretold(km, None, unit)
    driven, (low, high) = km - a.distance_to_go_km, a.distance_to_go_interval_km
    return figures.foretold(km, (driven + low, None if high is None else driven + high), unit)


def _shift(a: Assessment) -> list[Row]:
    if a.shift_percent is None:
        return []
    sure = figures.target(100 * a.confidence)
    looked = _LOOKED[a.rule] if a.is_open else "when it was settled; figures since then are follow-up"
    rows = [("shift", f"{so_far(a)} ({sure} confidence, {looked})")]
    if a.standard_error_percent is not None:
        error = a.standard_error_percent
        freedom = a.degrees_of_freedom
        free = "" if freedom is None or not isfinite(freedom) else f", {count(round(freedom), 'degree')} of freedom"
        rows.append(("standard error", figures.percent(error, error) + free))
    now, best = a.resolvable_now_percent, a.resolvable_at_best_percent
    limits = ((now, "now"), (best, "at best"))
    known = [f"{figures.percent(value, value)} {when}" for value, when in limits if value is not None]
    if known:
        power = figures.target(100 * a.power)
        rows.append(("resolvable shift", f"from {', '.join(known)} ({power} chance to show it)"))
    return rows
