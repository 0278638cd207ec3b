"""The share of the evidence that has been gathered, as a bar that needs no colour."""

from __future__ import annotations

from math import floor

from energytrack.inference.results import Assessment
from energytrack.presentation import figures

_LONGEST = 32
_WORDS = 48  # columns left to what stands beside the bar


def lines(a: Assessment, width: int = 80) -> list[str]:
    """`#` gathered, `.` to come, blank: out of reach of this log; [] where the share is unknown."""
    share = a.information_fraction
    if share is None or a.verdict == "no-baseline":
        return []
    cells, share = min(_LONGEST, width - _WORDS), min(share, 1.0)
    gathered, limit = floor(cells * share), _limit(a)
    end = cells if limit is None else max(gathered, round(cells * limit))
    bar = "#" * gathered + "." * (end - gathered) + " " * (cells - end)
    said = [f"[{bar}] {_whole(share)} % of the evidence needed{_early(a, share)}"]
    if limit is not None:
        said.append(f"{'':{cells + 2}} driving on like this: {_whole(max(share, limit))} % at most")
    return said


def _whole(share: float) -> int:
    """Percent, never rounded up to done."""
    return floor(100 * share)


def _early(a: Assessment, share: float) -> str:
    return ", settled early" if a.verdict == "shifted" and share < 1 else ""


def _limit(a: Assessment) -> float | None:
    """The share one switch can ever reach: information goes with the inverse square of what can be resolved."""
    best = a.resolvable_at_best_percent
    if a.verdict != "out-of-reach" or best is None or not figures.exists(best) or best <= 0:
        return None
    return min((a.target_percent / best) ** 2, 1.0)
