"""How each way of running a test is called, and what costs it the most."""

from __future__ import annotations

import datetime as dt

from energytrack.inference.results import Design
from energytrack.presentation.text import join

_WORTH_SAYING = 0.25  # share of the variance
_CONDITIONS = {"temperature_c": "temperature", "speed_kmh": "speed", "season": "time of year"}
_COSTS = _CONDITIONS | {
    "trip": "trip to trip",
    "filling": "filling",
    "drift-weeks": "drift over weeks",
    "drift-seasons": "drift over seasons",
    "unknown-noise": "scatter not well known yet",
}
_REMEDIES = {
    "filling": "Fill to the first click at the same pump, or read the level: filling costs it most.",
    "drift-weeks": "Swap more often where that is quick: drift over weeks costs it most.",
    "drift-seasons": "Taking it off and on again within a season helps: drift over seasons costs it most.",
    "temperature_c": "Drive in temperatures that both have seen: temperature costs it most.",
    "speed_kmh": "Keep to the same roads and speeds: speed costs it most.",
    "season": "Record temperatures: the time of year stands in for them, and costs it most.",
    "unknown-noise": "Log more before the start: the scatter is not well known yet, which costs it most.",
}
_TAKING_IT_OFF = ("drift-weeks", "drift-seasons")


def name(design: Design) -> str:
    """One way of running a test, in a few words."""
    if design.name == "best-date" and design.start is not None:
        return f"one switch in {dt.date.fromisoformat(design.start):%b %Y}"
    if design.name == "on-off-on":
        on, off = design.phases
        return f"on {on}, off {off}, on (fill-ups)"
    if design.name == "longer-baseline":
        return f"one switch after {design.phases[0]} fill-ups"
    if design.name == "alternate-weekly":
        return "off and on every week"
    every = design.every_fillups
    if every is None:
        return "one switch"
    return "off and on at every fill-up" if every == 1 else f"off and on every {every} fill-ups"


def phrase(design: Design) -> str:
    """The same in a sentence."""
    if design.name == "on-off-on":
        on, off = design.phases
        return f"{join(f'{on} fill-up' + 's' * (on > 1))} on, {off} off and on again"
    if design.name == "longer-baseline":
        return f"one switch after {join(f'{design.phases[0]} more fill-ups')}"
    return name(design)


def cost(design: Design, unit: str) -> tuple[str, str]:
    """What costs a way the most, and its share of the variance."""
    if design.costliest is None or design.costliest_share is None:
        return "-", "-"
    source = "charge level" if design.costliest == "filling" and unit == "kWh" else design.costliest
    said = _COSTS.get(source, source)
    moving = max(design.cost_shares.keys() & _CONDITIONS, key=design.cost_shares.__getitem__, default=None)
    if moving is not None and moving != source and design.cost_shares[moving] >= _WORTH_SAYING:
        said += f"; {_CONDITIONS[moving]} {100 * design.cost_shares[moving]:.0f} %"
    return said, join(f"{100 * design.costliest_share:.0f} %")


def remedy(design: Design, reversible: bool) -> str | None:
    """What would make a way shorter, where something would."""
    if design.costliest in _TAKING_IT_OFF and not reversible:
        return None
    return _REMEDIES.get(design.costliest or "")
