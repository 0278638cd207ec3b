"""What was aimed at, and whether a measured number meets it: worked out, never written by hand."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from tests.evidence.block import Block
from tests.evidence.measure import Measured

ALL = "all"
MET, MISSED, PERHAPS = "met", "missed", "missed, within sampling"
HEADING = ("what", "goal", "measured", "verdict", "kinds that miss it")


@dataclass(frozen=True)
class Goal:
    """Ends of what is aimed at: shares where they are percentages, plain ratios otherwise."""

    words: str
    low: float
    high: float
    of_ratios: bool = False

    def verdict(self, measured: Measured | None) -> str:
        """The number itself is held against the goal; a miss that the sampling range could undo is called that."""
        if measured is None:
            return "-"
        if self.low <= measured.value <= self.high:
            return MET
        return MISSED if measured.high < self.low or measured.low > self.high else PERHAPS

    def shown(self, measured: Measured | None) -> str:
        if measured is None:
            return "-"
        return measured.ratio() if self.of_ratios else measured.percent()

    def figure(self, measured: Measured) -> str:
        return f"{measured.value:.2f}" if self.of_ratios else f"{100 * measured.value:.0f} %"


FALSE_ALARMS = Goal("at most 5 %", 0.0, 0.05)
COVERAGE = Goal("94 to 98 %", 0.94, 0.98)
FOUND = Goal("at least 80 %", 0.80, 1.0)
ERROR = Goal("at most 1.10", 0.0, 1.10, of_ratios=True)
FORETOLD = Goal("0.85 to 1.15", 0.85, 1.15, of_ratios=True)
RANGE = Goal("70 to 90 %", 0.70, 0.90)


@dataclass(frozen=True)
class Promise:
    """One goal and what was measured of it, for each kind of use and for `all` of them."""

    what: str
    goal: Goal
    measured: Mapping[str, Measured | None]

    def row(self) -> tuple[str, ...]:
        overall = self.measured[ALL]
        return self.what, self.goal.words, self.goal.shown(overall), self.goal.verdict(overall), self._missed_by()

    def _missed_by(self) -> str:
        kinds = {name: one for name, one in self.measured.items() if name != ALL and one is not None}
        if not kinds:
            return "-"
        missed = [f"{name} ({self.goal.figure(one)})" for name, one in kinds.items() if self._is(MISSED, one)]
        perhaps = [f"{name} ({self.goal.figure(one)})" for name, one in kinds.items() if self._is(PERHAPS, one)]
        said = [", ".join(missed), "within sampling: " + ", ".join(perhaps) if perhaps else ""]
        return "; ".join(part for part in said if part) or "none"

    def _is(self, verdict: str, measured: Measured) -> bool:
        return self.goal.verdict(measured) == verdict


def block(name: str, options: str, sample: str, promises: Sequence[Promise]) -> Block:
    return Block(name, options, sample, HEADING, tuple(promise.row() for promise in promises))
