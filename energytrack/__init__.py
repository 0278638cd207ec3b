"""Did a vehicle modification shift energy use, by how much, and is the distance covered enough to say so?

The Python interface: open_logbook, assess, plan, plan_from Stated figures, compare, respond, rehearse, find_regimes,
review, assess_fleet, assess_with_controls, fleet_logs, TwoCarriers.
Each is loaded when it is first used, so that importing the package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOMES = {
    "open_logbook": "energytrack.consumption.frames",
    "assess": "energytrack.inference.assess",
    "plan": "energytrack.inference.designs",
    "compare": "energytrack.inference.comparison",
    "respond": "energytrack.inference.response",
    "rehearse": "energytrack.inference.rehearsal",
    "find_regimes": "energytrack.inference.regimes.find",
    "review": "energytrack.inference.review.review",
    "plan_from": "energytrack.inference.designs",
    "Stated": "energytrack.inference.stated",
    "TwoCarriers": "energytrack.consumption.two_carriers",
    "assess_fleet": "energytrack.inference.fleet.assess_fleet",
    "assess_with_controls": "energytrack.inference.fleet.controls",
    "fleet_logs": "energytrack.inference.fleet.logs",
}


def __getattr__(name: str) -> Any:
    home = _HOMES.get(name)
    if home is None:
        raise AttributeError(f"module 'energytrack' has no attribute {name!r}; it offers {', '.join(_HOMES)}")
    return getattr(import_module(home), name)


def __dir__() -> list[str]:
    return sorted([*globals(), *_HOMES])
