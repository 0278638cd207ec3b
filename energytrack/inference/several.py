"""Several modifications in one log: those never apart are one, those that were are estimated side by side."""

from __future__ import annotations

from collections.abc import Collection, Sequence

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference import bounds
from energytrack.inference.graded import parts
from energytrack.inference.model import Model
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.results import Effect, Together
from energytrack.inference.shift import SHIFT, Shift, shift_along

_NEVER_APART = 0.98  # correlation of two modifications' shares
_THROUGHOUT = 0.999  # of a segment's distance


def never_apart(observed: Observations, name: str) -> tuple[str, ...]:
    """Modifications that were on whenever this one was, and off whenever it was off."""
    own = _on(observed, observed.names.index(name))
    if not len(own) or np.ptp(own) == 0:
        return ()
    return tuple(
        other
        for k, other in enumerate(observed.names)
        if other != name and _correlation(own, _on(observed, k)) > _NEVER_APART
    )


def refusal(name: str, partners: Sequence[str]) -> str:
    """Why there is no answer for one part alone, and which entries would give it."""
    others = " and ".join(partners)
    return (
        f"{name} and {others} were never apart in this log, so it cannot say which of them did what: the answer is "
        f"for them together. To tell them apart, drive some full tanks with only one of them fitted"
    )


def together(model: Model, question: Question, declared: Collection[str]) -> Together | None:
    """Each modification's shift beside the others; None where there is only one of those declared.

    With all at once, where two were ever on together.
    """
    columns = {str(model.modification): SHIFT}
    own = [name for name in parts((*columns, *model.others)) if name in declared]
    columns |= {name: model.term_columns.stop + k for k, name in enumerate(model.others) if name in own}
    if len(columns) < 2:
        return None
    size = len(model.fit.coefficients)
    each = {name: effect_of(name, shift_along(model.fit, np.eye(size)[k]), question) for name, k in columns.items()}
    whole = np.zeros(size)
    whole[list(columns.values())] = 1.0
    names = " + ".join(columns)
    all_at_once = effect_of(names, shift_along(model.fit, whole), question) if _ever_together(model, own) else None
    return Together(tuple(each.values()), all_at_once)


def _ever_together(model: Model, names: Sequence[str]) -> bool:
    """At least one segment was driven with two of them on throughout; variants of one part never are."""
    fitted = model.observed.keeping(names).fitted
    return bool(((fitted >= _THROUGHOUT).sum(axis=1) > 1).any())


def effect_of(name: str, shift: Shift, question: Question) -> Effect:
    """A shift with the look-proof range of its own share of the information."""
    priced = shift.standard_error * bounds.price(shift.freedom, question.alpha)
    share = min(1.0, 1 / priced**2 / question.information)
    interval = shift.interval(bounds.critical(share, shift.freedom, question.alpha))
    return Effect(
        name,
        100 * shift.ratio,
        None if interval is None else (100 * interval[0], 100 * interval[1]),
        100 * shift.standard_error,
        shift.freedom,
    )


def _on(observed: Observations, column: int) -> Array:
    """The share driven with it; of one that always has a level, its level."""
    fitted = observed.fitted[:, column]
    on: Array = fitted if len(fitted) and np.ptp(fitted) > 0 else observed.shares[:, column]
    return on


def _correlation(one: Array, other: Array) -> float:
    return float(np.corrcoef(np.abs(one), np.abs(other))[0, 1]) if np.ptp(other) > 0 else 0.0
