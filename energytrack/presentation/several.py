"""Several parts side by side, variants pair by pair, and a graded part's levels: rows for a table."""

from __future__ import annotations

import math
from collections.abc import Sequence

from rich.text import Text

from energytrack.inference.results import Comparison, Effect, PairwiseShift, Range, Response, Together
from energytrack.presentation import figures
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import bullets, join, labelled, wrap

Row = tuple[str, str]


def side_by_side(together: Together) -> list[Row]:
    """Each part's own shift, and all at once."""
    rows = [("  " + plain_text(effect.name), _effect(effect)) for effect in together.each]
    whole = together.all_at_once
    return rows if whole is None else [*rows, ("  all at once", _effect(whole))]


def levels(response: Response) -> list[Row]:
    """Shift at each level driven, the level of least consumption, and the one to try next."""
    reference = "not fitted" if response.reference_level == 0 else f"level {response.reference_level:g}"
    rows = [
        (
            f"  level {effect.level:g}",
            f"{figures.percent(effect.shift_percent, signed=True)}{_range(effect.interval_percent)}",
        )
        for effect in response.levels
        if effect.level != response.reference_level
    ]
    rows.insert(0, ("  counted from", reference))
    if response.best_level is not None:
        best = _level(response, response.best_level)
        rows.append(("  least consumption", f"at level {best}{_level_range(response)}"))
    if response.next_level is not None:
        following = _level(response, response.next_level)
        rows.append(("  worth trying next", f"level {following}, if its maker and the law allow it"))
    return rows


def compared(found: Comparison, width: int = 80, *, title: bool = False) -> list[Text]:
    """The comparison of variants: sentence, pairs, standings, warnings."""
    lines: list[Text] = []
    if title:
        lines += [Text(line, style="underline") for line in wrap(plain_text(found.vehicle), width)]
    lines += [Text(line, style="bold") for line in wrap(_sentence(found), width)]
    sure = figures.target(100 * found.confidence)
    lines += [Text(), *map(Text, wrap(f"pair by pair ({sure} confidence for all pairs and however many looks)", width))]
    lines += _text(labelled([(f"  {_short(pair)}", _pair(pair)) for pair in found.pairs], width))
    lines += [Text(), Text("chance that none of the others uses less, by this look alone")]
    rows = [
        (
            f"  {plain_text(standing.name)}",
            f"{_chance(standing.chance_best)}, {figures.percent(standing.shift_percent, signed=True)}",
        )
        for standing in found.standings
    ]
    lines += _text(labelled(rows, width))
    if found.warnings:
        lines += [Text(), *_text(bullets(map(plain_text, found.warnings), "! ", width))]
    return lines


def _sentence(found: Comparison) -> str:
    best = found.standings[0]
    name = plain_text(best.name)
    beaten = [_against(pair, best.name) for pair in found.pairs if best.name in (pair.one, pair.other)]
    if all(beaten):
        return f"{name} uses least: its range lies below that of every other."
    if any(beaten):
        return f"{name} is likeliest to use least ({_chance(best.chance_best)}), but not yet told from all others."
    return f"Not yet: no variant is told from the others. Likeliest to use least: {name} ({_chance(best.chance_best)})."


def _against(pair: PairwiseShift, name: str) -> bool:
    """This variant was shown to use less than the other of the pair."""
    return pair.differs and (pair.shift_percent < 0) == (pair.one == name)


def _short(pair: PairwiseShift) -> str:
    return f"{plain_text(pair.one)} / {plain_text(pair.other)}"


def _pair(pair: PairwiseShift) -> str:
    said = "differ" if pair.differs else "not told apart yet"
    return f"{figures.percent(pair.shift_percent, signed=True)}{_range(pair.interval_percent)}: {said}"


def _effect(effect: Effect) -> str:
    return figures.percent(effect.shift_percent, effect.standard_error_percent, signed=True) + _range(
        effect.interval_percent
    )


def _range(interval: Range | None) -> str:
    return "" if interval is None else f", look-proof range {figures.percent_range(interval)}"


def _level_range(response: Response) -> str:
    if response.best_level_interval is None:
        return ""
    low, high = (_level(response, level) for level in response.best_level_interval)
    return f" (range {low} to {high})"


def _level(response: Response, level: float) -> str:
    """A computed level, in steps of at most a tenth of its range; of the levels driven, where it has none."""
    driven = [effect.level for effect in response.levels]
    low, high = response.best_level_interval or (min(driven), max(driven))
    places = max(0, 1 - math.floor(math.log10(high - low))) if high > low else 2
    return f"{round(level, places):g}"


def _chance(share: float) -> str:
    if share > 0.995:
        return join("over 99 %")
    return join("under 1 %" if share < 0.005 else f"{100 * share:.0f} %")


def _text(lines: Sequence[str]) -> list[Text]:
    return [Text(line) for line in lines]
