"""Where did consumption change, whatever was declared? Decided only here."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal

import numpy as np

from energytrack.consumption.frames import events_from_frame, modifications_from_frame, observe_log
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside as sort_out
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.errors import InferenceError
from energytrack.inference.regimes import places as where
from energytrack.inference.regimes.breaks import Found, find_breaks
from energytrack.inference.regimes.counting import criteria
from energytrack.inference.regimes.describe import breaks_of, points_of, regimes_of
from energytrack.inference.regimes.results import BreakTest, Criterion, RegimeReport
from energytrack.inference.regimes.supf import p_value
from energytrack.logbook.records import Event, Modification

if TYPE_CHECKING:
    import pandas as pd

MOST_BREAKS = 10
_SAME = 1e-9  # relative spread of consumption below which it does not scatter at all


def find_regimes(
    entries: pd.DataFrame,
    *,
    modifications: pd.DataFrame | None = None,
    events: pd.DataFrame | None = None,
    max_breaks: int = 5,
    confidence: float = 0.95,
    capacity: float | None = None,
    unit: str = "L",
    covariates: Sequence[str] | None = None,
    weather: pd.DataFrame | None = None,
    two_carriers: TwoCarriers | None = None,
    slopes: bool = False,
    trimming: float = 0.15,
    set_aside: Literal["odd", "none"] = "odd",
) -> RegimeReport:
    """Find lasting changes of consumption in one vehicle's log: where, when, how large, and what was logged there.

    Tables as for `assess`. Modifications and events take no part in the search: a break is found without them and then
    compared. `slopes`: the responses to temperature, speed and covariates may break along with the level. No regime is
    shorter than `trimming` of the segments or twelve of them, whichever is less. A log in which nothing can be looked
    for gives a report without breaks and a `note` that says what is missing.

    Raises ConsumptionError for tables that cannot be read, InferenceError for a confidence, trimming or number of
    breaks outside its range, or covariates that cannot be told apart.
    """
    _check(max_breaks, confidence, trimming)
    observed, notes, _ = observe_log(
        entries,
        None,
        events=events,
        weather=weather,
        capacity=capacity,
        unit=unit,
        covariates=covariates,
        two_carriers=two_carriers,
    )
    vehicle = str(entries["vehicle"].iloc[0]) if "vehicle" in entries and len(entries) else ""
    if set_aside == "odd":
        observed = sort_out(observed, covariates or ()).kept
    note = missing(observed)
    if note is not None:
        return _blank(vehicle, observed.unit, confidence, note, notes)
    found = find_breaks(
        observed,
        declared=False,
        covariates=covariates or (),
        slopes=slopes,
        max_breaks=max_breaks,
        confidence=confidence,
        trimming=trimming,
    )
    rows = [] if modifications is None else modifications_from_frame(modifications, vehicle or None)
    happened = [] if events is None else events_from_frame(events, vehicle or None)
    return report(vehicle, found, rows, happened, confidence=confidence, most=max_breaks, notes=notes)


def report(
    vehicle: str,
    found: Found,
    modifications: Sequence[Modification],
    events: Sequence[Event],
    *,
    confidence: float,
    most: int,
    notes: tuple[str, ...] = (),
) -> RegimeReport:
    """All that is said about the breaks found in a log."""
    observed, search = found.observed, found.search
    count, first = len(observed), found.trials[0]
    numbers = criteria(search, found.model.fit.scatter, most)
    reach = (where.odometer(observed, search.shortest), where.odometer(observed, count - search.shortest))
    return RegimeReport(
        vehicle=vehicle,
        unit=observed.unit,
        confidence=confidence,
        statistic=first.statistic,
        p_value=[trial for trial in found.trials if trial.breaks == 0][-1 if found.places else 0].p_value,
        p_value_asymptotic=p_value(first.statistic, search.width, min(search.shortest / count, 0.45)),
        decided_by=_decided_by(len(found.places), numbers),
        breaks=breaks_of(found, modifications, events, confidence),
        regimes=regimes_of(found, confidence),
        tests=tuple(BreakTest(trial.breaks, trial.more, trial.statistic, trial.p_value) for trial in found.trials),
        criteria=numbers,
        points=points_of(found),
        judged_km=reach,
        later_km=search.shortest * float(observed.distance_km[-10:].mean()),
        note=None,
        warnings=notes,
    )


def missing(observed: Observations) -> str | None:
    """What a log lacks for breaks to be looked for, and how far to drive for it; None where nothing is."""
    count = len(observed)
    if count == 0:
        return (
            f"no two known levels in a row, so no consumption is known: {where.FEWEST} segments between fills to the "
            f"full mark or level readings are needed"
        )
    if count < where.FEWEST:
        short = where.FEWEST - count
        far = short * float(observed.distance_km.mean())
        return (
            f"{count} segments between known levels are too few to look for a change: {where.FEWEST} are needed, "
            f"{short} more fill-ups to the full mark or readings, about {_about(far)} km"
        )
    consumption = observed.energy / observed.distance_km
    if float(np.ptp(consumption)) <= _SAME * float(consumption.mean()):
        return (
            f"all {count} segments have the same consumption: nothing scatters, so no change can be "
            f"told from chance; check that amounts are what was bought"
        )
    return None


def _about(km: float) -> str:
    return f"{round(km, -2 if km >= 1000 else -1):,.0f}"


def _decided_by(breaks: int, numbers: Sequence[Criterion]) -> str:
    """The tests decide, because their rate of false alarms is known; the criterion is named beside them."""
    best = min(numbers, key=lambda criterion: criterion.bic).breaks
    agrees = "BIC agrees" if best == breaks else f"BIC alone would say {best}"
    return f"sequential sup-F tests ({agrees})"


def _check(max_breaks: int, confidence: float, trimming: float) -> None:
    if not 1 <= max_breaks <= MOST_BREAKS:
        raise InferenceError(f"at most {max_breaks} breaks cannot be looked for: ask for 1 to {MOST_BREAKS}")
    if not 0.5 <= confidence < 1:
        raise InferenceError(f"confidence must lie between 0.5 and 1, not {confidence:g}: 0.95 is usual")
    if not 0 < trimming < 0.5:
        raise InferenceError(f"trimming must lie between 0 and 0.5, not {trimming:g}: 0.15 is usual")


def _blank(vehicle: str, unit: str, confidence: float, note: str, notes: tuple[str, ...]) -> RegimeReport:
    return RegimeReport(
        vehicle=vehicle,
        unit=unit,
        confidence=confidence,
        statistic=None,
        p_value=None,
        p_value_asymptotic=None,
        decided_by=None,
        breaks=(),
        regimes=(),
        tests=(),
        criteria=(),
        points=(),
        judged_km=None,
        later_km=None,
        note=note,
        warnings=notes,
    )
