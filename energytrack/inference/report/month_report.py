"""All that a month's report shows of one vehicle, by the log up to the end of that month."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from energytrack.consumption.frames import (
    MODIFICATION_COLUMNS,
    entries_to_frame,
    events_from_frame,
    modifications_from_frame,
    observe_log,
    records_to_frame,
)
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside
from energytrack.consumption.terms import ELECTRIC
from energytrack.inference.assess import assess
from energytrack.inference.describe import covariates_of, noise_of
from energytrack.inference.graded import averaged
from energytrack.inference.model import Model, fit_model
from energytrack.inference.regimes.find import find_regimes
from energytrack.inference.regimes.places import FEWEST
from energytrack.inference.report.curves import curves_of
from energytrack.inference.report.results import MonthReport, Scatter, Tried
from energytrack.inference.results import Assessment
from energytrack.inference.review.cut import entries_until, fitted_until
from energytrack.inference.review.month import Month, month_of
from energytrack.inference.review.review import review
from energytrack.logbook.records import Event

if TYPE_CHECKING:
    import pandas as pd

_TABLES = ("capacity", "unit", "weather", "two_carriers")
_SAME_PLACE_KM = 0.5  # no odometer shows less


def month_report(
    entries: pd.DataFrame,
    modifications: pd.DataFrame | None = None,
    *,
    events: pd.DataFrame | None = None,
    confidence: float = 0.95,
    typed_in: tuple[str, str | None] = ("km", None),
    **asked: Any,
) -> MonthReport:
    """The review of a month, lasting changes, the test of each modification look by look, and what conditions do.

    Takes and raises what `review` does; `find_regimes` and `assess` are asked by the same entries.
    """
    reviewed = review(entries, modifications, events=events, confidence=confidence, typed_in=typed_in, **asked)
    month, vehicle = month_of(reviewed.month), reviewed.vehicle or None
    own: dict[str, Any] = {name: asked[name] for name in _TABLES if name in asked}
    kept = entries_until(observe_log(entries, None, events=events, **own)[2], month)
    rows = fitted_until([] if modifications is None else modifications_from_frame(modifications, vehicle), kept, month)
    tables: dict[str, Any] = {
        "entries": entries_to_frame(kept),
        "modifications": records_to_frame(rows, MODIFICATION_COLUMNS),
        "events": events,
        **own,
    }
    observed = set_aside(observe_log(**tables)[0]).kept
    model = fit_model(averaged(observed), None) if len(observed) >= FEWEST else None
    targets = {each.name: each.target_percent for each in reviewed.modifications}
    answers = [
        assess(**tables, name=name, target_percent=target, confidence=confidence, typed_in=typed_in)
        for name, target in targets.items()
    ]
    return MonthReport(
        review=reviewed,
        regimes=find_regimes(**tables, confidence=confidence),
        tried=tuple(Tried(answer, driven_with(observed, answer)) for answer in answers),
        curves=() if model is None else curves_of(model, confidence),
        covariates={} if model is None else covariates_of(model),
        scatter=None if model is None else _scatter(model),
        modifications=tuple(rows),
        events=_until([] if events is None else events_from_frame(events, vehicle), month),
    )


def driven_with(observed: Observations, answer: Assessment) -> tuple[float, ...]:
    """Distance with the modification fitted by each look (km)."""
    fitted = observed.distance_km * observed.fitted[:, observed.names.index(answer.modification)]
    so_far = np.append(0.0, np.cumsum(fitted))
    places = np.array([look.odometer_km for look in answer.looks], dtype=np.float64)
    counts = np.searchsorted(observed.end_km, places + _SAME_PLACE_KM, side="right")
    return tuple(so_far[counts].tolist())


def _scatter(model: Model) -> Scatter:
    electric_only = model.observed.unit == "kWh" and ELECTRIC not in model.terms.names
    level = float(model.fit.coefficients[0])
    return Scatter(noise_of(model), level * model.scale.energy, electric_only)


def _until(events: Sequence[Event], month: Month) -> tuple[Event, ...]:
    return tuple(event for event in events if event.date.toordinal() <= month.last)
