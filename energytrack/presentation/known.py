"""What a known change says: whether the log can see anything, and why to try one."""

from __future__ import annotations

from energytrack.inference.results import Assessment
from energytrack.presentation import figures
from energytrack.presentation.text import join


def known_sentence(a: Assessment) -> str:
    """Whether the log saw the known change, and what that says about smaller ones; empty where none was expected."""
    if a.known_change is None:
        return ""
    expected = _expected(a)
    if a.known_change == "seen":
        return f"A known change, {expected}, was seen{_smallest(a, ': this log can show')}."
    if a.known_change == "seen-otherwise":
        return f"That is not the known change, {expected}: smaller shifts from this log are not to be trusted yet."
    yet = " yet" if a.is_open else ""
    return f"The known change, {expected}, has not been seen{yet}{_smallest(a, ': this log can only show')}."


def known_step(a: Assessment) -> str | None:
    """What a known change asks for next; None where there is nothing to do."""
    if a.known_change == "seen":
        removed = join("energytrack mod removed")
        off = f"It has shown what it was for: take it off when parked and log that ({removed})."
        return off if a.fitted_now else None
    if a.known_change == "seen-otherwise":
        return "Find out why: check the log around it for slips, and what else changed then (tyres, load, route)."
    if a.known_change == "not-seen-yet" and not a.is_open:
        return "A log that misses a known change would miss smaller ones: check it for slips, or expect less."
    if a.is_open and not a.known_change_logged:
        command = join("energytrack mod fitted NAME ODOMETER --known 4:9")
        return (
            "See first that this log can show anything: make a known change for a while, such as open windows (10-15 % "
            f"more drag on most cars), only where it is safe, with nothing loose, and log it: {command}"
        )
    return None


def _expected(a: Assessment) -> str:
    assert a.known_percent is not None
    low, high = a.known_percent
    return join(f"{low:+g} to {high:+g} %") + " expected"


def _smallest(a: Assessment, words: str) -> str:
    if a.resolvable_now_percent is None:
        return ""
    return f"{words} a shift of {figures.percent(a.resolvable_now_percent, a.resolvable_now_percent)} or more now"
