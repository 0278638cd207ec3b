"""What the driving conditions do to consumption, in a mechanic's words: one line a condition, sign and size."""

from __future__ import annotations

from collections.abc import Mapping

from energytrack.consumption.terms import COOLING_ABOVE_C, ELECTRIC, HEATING_BELOW_C
from energytrack.inference.results import Covariate
from energytrack.presentation import figures
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import join


def rows(covariates: Mapping[str, Covariate], unit: str) -> list[tuple[str, str]]:
    """A label and a sentence for each condition; speeds in km/h, or in mi/h where `unit` is mi."""
    said: dict[str, str] = {}
    for name, found in covariates.items():
        if name == "heating":
            below = min(found.high, HEATING_BELOW_C)
            said["cold"] = _branch(found, f"below {HEATING_BELOW_C:.0f} °C", found.low, below)
        elif name == "cooling":
            above = max(found.low, COOLING_ABOVE_C)
            said["heat"] = _branch(found, f"above {COOLING_ABOVE_C:.0f} °C", above, found.high)
        elif found.condition == "speed_kmh":
            said["speed"] = _speed(found, unit)
        elif name == ELECTRIC:
            said["plug"] = _plug(found)
        elif found.condition == "season":
            worth = join(f"{found.effect_percent:.0f} %")
            said["season"] = f"worth {worth} between the best and the worst time of year (by date alone)"
        else:
            said[plain_text(name)] = _column(found)
    return list(said.items())


def _branch(found: Covariate, where: str, low: float, high: float) -> str:
    """One branch of the temperature: its response, and what it makes between the temperatures met."""
    response = f"{_per_unit(found)} per degree {where}"
    if high <= low:
        return f"{response}; hardly met here"
    here = join(f"{low:z.0f} to {high:z.0f} °C")
    return f"{response}; here {here}, worth {join(f'{abs(found.estimate) * (high - low):.0f} %')}"


def _speed(found: Covariate, unit: str) -> str:
    low, high = (figures.in_unit(end, unit) for end in (found.low, found.high))
    here = join(f"{low:.0f} to {high:.0f} {unit}/h")
    return f"{join(f'{found.effect_percent:+.0f} %')} from slow to fast; here {here}"


def _plug(found: Covariate) -> str:
    here = join(f"{found.low:.3g} to {found.high:.3g} kWh/100 km")
    return f"{_per_unit(found)} for each kWh/100 km charged; here {here}"


def _column(found: Covariate) -> str:
    here = join(f"{found.low:.4g} to {found.high:.4g}")
    return f"{_per_unit(found)} per unit; here {here}, worth {join(f'{found.effect_percent:+.0f} %')}"


def _per_unit(found: Covariate) -> str:
    """The response and its standard error, to the digits the error allows."""
    places = 1
    while places < 6 and 0 < found.standard_error < 0.5 * 10.0**-places:
        places += 1
    return join(f"{found.estimate:+.{places}f} ± {found.standard_error:.{places}f} %")
