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
from energytrack.inference.fleet.results import Deviation
from energytrack.inference.graded import averaged
from energytrack.inference.looks import FEWEST_BASELINE
from energytrack.inference.model import fit_model
from energytrack.inference.noise import Array
from energytrack.inference.shift import shift_of

_ITSELF = "the month itself"
_CONFOUNDED = 0.98  # correlation of the month with a modification's shares


def deviation_of(known: Observations, shares: Array) -> tuple[Deviation | None, str, int]:
    """The month against the record; why there is none, where there is none; how many of its segments are odd.

    known: the log up to the end of the month. shares (n,): of each segment's distance, driven in the month.
    """
    inside = shares > 0
    odd = sum(bool(inside[each.segment]) for each in set_aside(known).odd)
    kept = set_aside(replace(known.adding(_ITSELF, shares), confirmed=known.confirmed | inside)).kept
    reason = _missing(kept)
    if reason:
        return None, reason, odd
    model = fit_model(averaged(kept), _ITSELF)
    shift = shift_of(model.fit)
    measured = float(known.energy @ shares / (known.distance_km @ shares))
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


def _missing(kept: Observations) -> str:
    *names, _ = kept.names
    *columns, shares = kept.fitted.T
    if not (shares > 0).any():
        return "nothing closed between known levels"
    if (shares == 0).sum() < FEWEST_BASELINE:
        return f"its own record has fewer than {FEWEST_BASELINE} segments outside the month"
    for name, column in zip(names, columns, strict=True):
        if np.ptp(column) > 0 and abs(np.corrcoef(column, shares)[0, 1]) > _CONFOUNDED:
            return f"the month and {name} cannot be told apart"
    return ""
