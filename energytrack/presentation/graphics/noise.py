"""What the scatter of one segment comes from, as shares of its variance."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from energytrack.presentation.graphics.canvas import BLUE, NARROW, Drawing
from energytrack.presentation.scatter import Source
from energytrack.presentation.text import HARD_SPACE

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_ROOM = 150.0  # percent on the axis, so that a label fits behind the longest bar


def draw(sources: Sequence[Source]) -> Drawing:
    """A bar for each source whose share is known, the first one on top."""
    shown = [(each, each.share) for each in sources if each.share is not None]
    said = ", ".join(f"{each.label} {100 * share:.0f} %" for each, share in shown)
    alternative = f"Shares of the variance of one segment: {said}."
    return Drawing(lambda axes: _draw(axes, shown), alternative, 0.9 + 0.45 * len(shown), NARROW)


def _draw(axes: Axes, shown: Sequence[tuple[Source, float]]) -> None:
    place = list(range(len(shown)))[::-1]
    bars = axes.barh(place, [100 * share for _, share in shown], height=0.6, color=BLUE)
    axes.bar_label(bars, [_said(each, share) for each, share in shown], padding=4, fontsize="small")
    axes.set_yticks(place, [each.label for each, _ in shown])
    axes.tick_params(axis="y", length=0)
    axes.set_xlim(0, _ROOM)
    axes.set_xticks([0, 50, 100])
    axes.spines["bottom"].set_bounds(0, 100)
    axes.set_xlabel("share of the variance, %")


def _said(source: Source, share: float) -> str:
    size = "" if source.percent is None else f", sd {source.percent:.1f} %"
    return f"{100 * share:.0f} %{size}".replace(HARD_SPACE, " ")
