"""Every look as a row: how the range narrowed as distance was driven, against the target."""

from __future__ import annotations

from collections.abc import Sequence
from math import ceil

from energytrack.inference.results import Assessment, Look
from energytrack.presentation import figures
from energytrack.presentation.text import wrap

ROWS = 10
_MARGIN = 13  # for the odometer
_FEWEST = 2
_TARGETS_SHOWN = 4  # at most so many times the target to either side, unless the shift itself lies further
_CLEAR = 6  # columns between no shift and the target from which both can be labelled
_LEGEND = "every look, down the road: o estimate, (---) look-proof range, : target"


def lines(a: Assessment, unit: str, width: int) -> list[str]:
    """A row for each look, `|` where there is no shift; [] with fewer than two looks."""
    if len(a.looks) < _FEWEST:
        return []
    scale = _Scale(_reach(a), width - _MARGIN - 12)
    marks = {0.0: "|", -a.target_percent: ":", a.target_percent: ":"}
    drawn = [_row(look, scale, marks) for look in _chosen(a)]
    said = [_label(look, unit) + row + _note(look, a) for look, row in zip(_chosen(a), drawn, strict=True)]
    axis = " " * _MARGIN + _axis(scale, a.target_percent)
    return [*wrap(_LEGEND, width), axis.rstrip(), *map(str.rstrip, said)]


class _Scale:
    """Percent to columns, the same reach either way."""

    def __init__(self, reach: float, columns: int) -> None:
        self.reach, self.columns = reach, columns

    def column(self, percent: float) -> int:
        place = (percent + self.reach) / (2 * self.reach)
        return round(min(max(place, 0.0), 1.0) * (self.columns - 1))


def _reach(a: Assessment) -> float:
    """Percent to either side: the present range, but never so far that the target is lost to sight."""
    last = a.looks[-1]
    ends = [abs(end) for end in figures.bounded(last.interval_percent) or (0.0,)]
    near = max(_TARGETS_SHOWN * a.target_percent, abs(last.shift_percent))
    return float(ceil(1.4 * min(max(a.target_percent, abs(last.shift_percent), *ends), near)))


def _chosen(a: Assessment) -> Sequence[Look]:
    """First, last, the one that settled it, and others spread evenly between them."""
    count = len(a.looks)
    if count <= ROWS:
        return a.looks
    kept = {round(i * (count - 1) / (ROWS - 1)) for i in range(ROWS)}
    kept |= {i for i, look in enumerate(a.looks) if _settles(look, a)}
    return [a.looks[i] for i in sorted(kept)]


def _settles(look: Look, a: Assessment) -> bool:
    return a.settled_at_km is not None and abs(look.odometer_km - a.settled_at_km) < 0.5


def _row(look: Look, scale: _Scale, marks: dict[float, str]) -> str:
    cells = [" "] * scale.columns
    for percent, mark in marks.items():
        cells[scale.column(percent)] = mark
    low, high = figures.bounded(look.interval_percent) or (-float("inf"), float("inf"))
    first, last = scale.column(low), scale.column(high)
    for column in range(first, last + 1):
        cells[column] = "-" if cells[column] == " " else cells[column]
    cells[first] = "<" if low < -scale.reach else "("
    cells[last] = ">" if high > scale.reach else ")"
    cells[scale.column(look.shift_percent)] = "o"
    return "".join(cells)


def _label(look: Look, unit: str) -> str:
    return figures.driven(look.odometer_km, unit).replace("\u00a0", " ").rjust(_MARGIN - 2) + "  "


def _note(look: Look, a: Assessment) -> str:
    return "  settled" if _settles(look, a) else ""


def _axis(scale: _Scale, target: float) -> str:
    """The ends of the picture, no shift, and the target where it stands clear of no shift."""
    cells = [" "] * (scale.columns + 6)
    labels = [(-scale.reach, f"-{scale.reach:.0f}"), (0.0, "0"), (scale.reach, f"+{scale.reach:.0f} %")]
    if scale.column(target) - scale.column(0.0) >= _CLEAR:
        labels += [(-target, f"-{target:g}"), (target, f"+{target:g}")]
    for percent, text in labels:
        start = max(0, scale.column(percent) - len(text.split(" ")[0]) + 1)
        cells[start : start + len(text)] = text
    return "".join(cells)
