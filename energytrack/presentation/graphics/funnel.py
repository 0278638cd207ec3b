"""How the estimate of a shift and its look-proof range narrowed as distance was driven with the modification."""

from __future__ import annotations

from collections.abc import Sequence
from math import ceil
from typing import TYPE_CHECKING

from energytrack.inference.results import Assessment, Look
from energytrack.presentation import figures
from energytrack.presentation.answer import so_far
from energytrack.presentation.graphics.canvas import BLACK, BLUE, GREEN, NARROW, Drawing
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import HARD_SPACE

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_TARGETS_SHOWN = 4  # at most so many times the target to either side, unless the shift itself lies further
_TICKS = 5  # intervals at most, so that long distances stay apart
_FEW = 12  # looks up to which each range is drawn by itself as well


def draw(a: Assessment, driven_km: Sequence[float], unit: str) -> Drawing:
    """The drawing of at least one look; `driven_km`: with the modification at each, `unit`: km or mi."""
    return Drawing(lambda axes: _draw(axes, a, driven_km, unit), alternative(a, driven_km, unit), 3.6, NARROW)


def alternative(a: Assessment, driven_km: Sequence[float], unit: str) -> str:
    """What the drawing shows, in words."""
    looks = "1 look" if len(a.looks) == 1 else f"{len(a.looks)} looks"
    said = (
        f"Shift of consumption with {plain_text(a.modification)} against distance driven with it, {looks} over "
        f"{figures.driven(driven_km[-1], unit)}. At the last: {so_far(a)}. Target {figures.target(a.target_percent)}."
    )
    return said.replace(HARD_SPACE, " ")


def _draw(axes: Axes, a: Assessment, driven_km: Sequence[float], unit: str) -> None:
    reach, place = reach_of(a), [figures.in_unit(km, unit) for km in driven_km]
    ends = [_ends(look, reach) for look in a.looks]
    low, high = [end[0] for end in ends], [end[1] for end in ends]
    target = figures.target(a.target_percent).replace(HARD_SPACE, " ")
    axes.axhspan(-a.target_percent, a.target_percent, color=GREEN, alpha=0.15, linewidth=0, label=f"target, ± {target}")
    axes.axhline(0, color=BLACK, linewidth=1)
    axes.fill_between(place, low, high, color=BLUE, alpha=0.25, linewidth=0, label=f"look-proof {_sure(a)} range")
    if len(a.looks) <= _FEW:
        axes.vlines(place, low, high, color=BLUE, linewidth=1)
    axes.plot(place, [look.shift_percent for look in a.looks], "o-", color=BLUE, markersize=3, label="estimate")
    settled = next((at for at, look in zip(place, a.looks, strict=True) if _settles(look, a)), None)
    if settled is not None:
        axes.axvline(settled, color=BLACK, linestyle="--", linewidth=1, label="settled")
    axes.set_ylim(-reach, reach)
    axes.set_xlim(left=0.0)
    axes.set_xlabel(f"distance driven with it, {unit}")
    axes.set_ylabel("shift of consumption, %")
    axes.locator_params(axis="x", nbins=_TICKS)
    axes.xaxis.set_major_formatter(lambda value, _: f"{value:,.0f}")
    axes.yaxis.set_major_formatter(lambda value, _: f"{value:+g}" if value else "0")
    axes.figure.legend(loc="outside lower center", ncols=2, frameon=False, fontsize="small")


def reach_of(a: Assessment) -> float:
    """Percent to either side: the present range, but never so far that the target is lost to sight."""
    last = a.looks[-1]
    ends = [abs(end) for end in figures.bounded(last.interval_percent) or (0.0,)]
    near = max(_TARGETS_SHOWN * a.target_percent, abs(last.shift_percent))
    return float(ceil(1.4 * min(max(a.target_percent, abs(last.shift_percent), *ends), near)))


def _ends(look: Look, reach: float) -> tuple[float, float]:
    """Of the range, as far as it is seen; a range without ends fills the drawing."""
    low, high = figures.bounded(look.interval_percent) or (-reach, reach)
    return max(low, -reach), min(high, reach)


def _settles(look: Look, a: Assessment) -> bool:
    return a.settled_at_km is not None and abs(look.odometer_km - a.settled_at_km) < 0.5


def _sure(a: Assessment) -> str:
    return figures.target(100 * a.confidence).replace(HARD_SPACE, " ")
