"""How far a month's consumption stands from what the vehicle's own record expects of it, in standard errors.

The month enters the regression as a part that was fitted for just that month. Its coefficient by generalised least
squares is the month's consumption less what the rest of the log predicts for it (the deletion residual), and its
standard error counts trips, levels and both drifts. Whatever else was fitted or driven in is allowed for.

What is odd is set aside in the record, and kept in the month: a month that stands out is what is looked for.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside
from energytrack.inference import bounds
from energytrack.inference.fleet.month import Month
from energytrack.inference.fleet.results import Deviation
from energytrack.inference.graded import averaged
from energytrack.inference.looks import FEWEST_BASELINE
from energytrack.inference.model import fit_model
from energytrack.inference.noise import Array
from energytrack.inference.shift import shift_of

_ITSELF = "the month itself"
_CONFOUNDED = 0.98  # correlation of the month with a modification's shares


def shares_of(observed: Observations, month: Month) -> Array:
    """Share of the days of each segment (n,) that lie in the month; of one within a day, whether that day does."""
    end = observed.end_day
    start = 2 * observed.mid_day - end
    inside = np.minimum(end, month.last) - np.maximum(start, month.first - 1)
    whole = end - start
    at_once = ((end >= month.first) & (end <= month.last)).astype(np.float64)
    shares: Array = np.where(whole > 0, np.clip(inside / np.maximum(whole, 1e-9), 0.0, 1.0), at_once)
    return shares


def until(observed: Observations, month: Month) -> Observations:
    """The log up to the end of the month: no segment that began after it."""
    began = 2 * observed.mid_day - observed.end_day
    return observed.head(int((began <= month.last).sum()))


def deviation_of(observed: Observations, month: Month) -> tuple[Deviation | None, str, int]:
    """The month against the record; why there is none, where there is none; how many of its segments are odd."""
    known = until(observed, month)
    inside = shares_of(known, month) > 0
    odd = sum(bool(inside[each.segment]) for each in set_aside(known).odd)
    kept = set_aside(replace(known, confirmed=known.confirmed | inside)).kept
    shares = shares_of(kept, month)
    reason = _missing(kept, shares)
    if reason:
        return None, reason, odd
    model = fit_model(averaged(kept.adding(_ITSELF, shares)), _ITSELF)
    shift = shift_of(model.fit)
    measured = float(kept.energy @ shares / (kept.distance_km @ shares))
    base = shift.base * model.scale.consumption
    p_value = min(1.0, 2 * bounds.mixture_tail(abs(shift.z), shift.freedom))
    return (
        Deviation(
            measured=measured,
            expected=measured - shift.ratio * base,
            deviation_percent=100 * shift.ratio,
            standard_error_percent=100 * shift.standard_error,
            degrees_of_freedom=shift.freedom,
            z=shift.z,
            p_value=p_value,
        ),
        "",
        odd,
    )


def _missing(kept: Observations, shares: Array) -> str:
    if not (shares > 0).any():
        return "nothing closed between known levels"
    if (shares == 0).sum() < FEWEST_BASELINE:
        return f"its own record has fewer than {FEWEST_BASELINE} segments outside the month"
    for name, column in zip(kept.names, kept.fitted.T, strict=True):
        if np.ptp(column) > 0 and abs(np.corrcoef(column, shares)[0, 1]) > _CONFOUNDED:
            return f"the month and {name} cannot be told apart"
    return ""
