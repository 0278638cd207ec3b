"""When to believe a look: the rules a user may choose, as bounds on |z| for noise that is known.

A rule is asked at each look in order, with the share of the information then. bounds.widened makes its answer one for
noise that is estimated.
"""

from __future__ import annotations

from collections.abc import Callable
from math import sqrt
from typing import get_args

from energytrack.errors import InferenceError
from energytrack.inference import bounds, open_ended
from energytrack.inference.results import Rule
from energytrack.inference.spending import Counted

Watch = Callable[[float], float | None]  # share of the information at a look -> bound on |z|; None beyond any number


def check_rule(rule: str) -> None:
    """Raises InferenceError for a rule there is not."""
    if rule not in get_args(Rule):
        raise InferenceError(f"no rule {rule!r} for looks: use one of {', '.join(get_args(Rule))}")


def watch(rule: Rule, alpha: float) -> Watch:
    """A rule at work, before its first look."""
    if rule == "counted":
        return Counted(alpha).bound
    if rule == "open-ended":
        return lambda share: open_ended.bound(share, alpha)
    return lambda share: bounds.level(alpha) / sqrt(min(share, 1.0)) if share > 0 else None


def drift(rule: Rule, alpha: float, power: float) -> float:
    """Standardised true shift found with this power once the information is complete.

    With counted looks it is found a little more often than stated: the bound for looks at every moment is the highest.
    """
    least = bounds.drift(alpha, power)  # refuses a confidence or power outside its range
    return open_ended.drift(alpha, power) if rule == "open-ended" else least
