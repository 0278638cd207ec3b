"""Changes nobody declared, held against a verdict: one inside the test may be what the modification gets credit for.

The search runs beside the modifications, as further columns of the same regression, so that what they account for is
not found again. It asks for more certainty than a report of regimes does: it reads every log, and must not stand in
the way of answers that are right.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.shares import shares
from energytrack.errors import InferenceError
from energytrack.inference.coincidence import coincident
from energytrack.inference.graded import averaged
from energytrack.inference.looks import State
from energytrack.inference.model import Model
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.regimes.breaks import find_breaks
from energytrack.inference.regimes.describe import breaks_of
from energytrack.inference.regimes.find import missing
from energytrack.inference.regimes.results import Break
from energytrack.logbook.records import Event, Modification

CONFIDENCE = 0.99  # to stand against a verdict
_TO_AGREE = 0.95
_MOST = 2  # enough to stop a verdict


@dataclass(frozen=True)
class Logged:
    """What was declared of a vehicle, and may explain a break."""

    modifications: Sequence[Modification]
    events: Sequence[Event]


def undeclared(model: Model, question: Question, logged: Logged) -> tuple[Break, ...]:
    """Breaks that nothing logged explains, in the log of a fitted model; in driving order."""
    found = _breaks(model.observed, question, logged, declared=True, start=model.fit.theta)
    return tuple(each for each in found if not each.matches)


def inside(breaks: Sequence[Break], settled: State) -> bool:
    """Whether any lies in the test, up to the look that settled it: whatever came later is another matter."""
    return any(each.odometer_km <= settled.model.observed.end_km[-1] for each in breaks)


def agreeing(model: Model, question: Question, logged: Logged) -> Break | None:
    """The break that a search blind to all modifications finds where the one asked about was fitted or removed."""
    blind = _breaks(model.observed, question, logged, declared=False, start=model.fit.theta, confidence=_TO_AGREE)
    for found in blind:
        if any(match.what == question.modification and match.kind != "event" for match in found.matches):
            return found
    return None


def with_events(
    observed: Observations, segmented: SegmentedLog, question: Question, logged: Logged
) -> tuple[Observations, tuple[str, ...]]:
    """The log with a column for each event at which consumption changed, and a sentence for each.

    An event at the modification's own fitting or removal cannot be told from it and gets none; nor does one at which
    nothing changed, for a column costs distance.
    """
    events = [event for event in logged.events if not coincident(event, logged.modifications, question.modification)]
    if not events:
        return observed, ()
    notes = []
    for found in _breaks(averaged(observed), question, Logged((), events), declared=True, start=None):
        event = next((event for event in events if event.what == found.explained_by), None)
        if event is not None and event.what not in observed.names:
            row = Modification("", event.what, event.date, event.odometer_km)
            observed = observed.adding(event.what, np.array(shares(segmented, [row])))
            notes.append(
                f"consumption changed by {found.shift_percent:+.1f} % at {event.what} ({event.date}): it is counted "
                f"apart from the modification"
            )
    return observed, tuple(notes)


def _breaks(
    observed: Observations,
    question: Question,
    logged: Logged,
    *,
    declared: bool,
    start: Array | None,
    confidence: float = CONFIDENCE,
) -> tuple[Break, ...]:
    if missing(observed) is not None:
        return ()
    try:
        found = find_breaks(
            observed,
            declared=declared,
            covariates=question.covariates,
            max_breaks=_MOST,
            confidence=confidence,
            temporary=False,
            start=start,
        )
    except InferenceError:  # no room for another column beside those asked for
        return ()
    return breaks_of(found, logged.modifications, logged.events, confidence)
