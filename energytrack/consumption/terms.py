"""Terms of the consumption model: what a condition contributes. Arithmetic that takes floats and numpy arrays alike.

Heating and cooling branches: the change-point form of energy baselines (ASHRAE Guideline 14). v^2 and 1/v: drag per
distance, and accessory power per distance. Season: annual harmonics, for logs without temperatures.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Any

HEATING_BELOW_C = 18.0
COOLING_ABOVE_C = 22.0
YEAR_DAYS = 365.2425  # mean Gregorian year
ELECTRIC = "electric_kwh_per_100km"  # energy from the plug, the condition of a vehicle with tank and battery

Function = Callable[[Any], Any]  # float -> float, or array -> array of the same shape


def heating(temperature: Any) -> Any:
    """Degrees below 18 degrees Celsius, 0 above."""
    return (HEATING_BELOW_C - temperature) * (temperature < HEATING_BELOW_C)


def cooling(temperature: Any) -> Any:
    """Degrees above 22 degrees Celsius, 0 below."""
    return (temperature - COOLING_ABOVE_C) * (temperature > COOLING_ABOVE_C)


def itself(value: Any) -> Any:
    """A term that is the condition itself."""
    return value


def _harmonic(wave: str, order: int) -> Function:
    def season(day: Any) -> Any:
        angle = 2 * math.pi * order / YEAR_DAYS * day
        if isinstance(angle, float):
            return getattr(math, wave)(angle)
        import numpy  # only where an array shows that it is loaded anyway

        return getattr(numpy, wave)(angle)

    return season


TERMS: Mapping[str, tuple[str, Function]] = MappingProxyType(
    {
        "heating": ("temperature_c", heating),
        "cooling": ("temperature_c", cooling),
        "speed_squared": ("speed_kmh", lambda speed: speed * speed),
        "speed_inverse": ("speed_kmh", lambda speed: 1 / speed),
        "speed": ("speed_kmh", itself),
        "season_cos1": ("season", _harmonic("cos", 1)),
        "season_sin1": ("season", _harmonic("sin", 1)),
        "season_cos2": ("season", _harmonic("cos", 2)),
        "season_sin2": ("season", _harmonic("sin", 2)),
    }
)  # term -> the condition behind it ("season" is the day ordinal) and its function


def condition_of(name: str) -> str:
    """The condition behind a term; a name not in TERMS is a condition itself."""
    return TERMS[name][0] if name in TERMS else name


def term(name: str, value: Any) -> Any:
    """A term at a value of its condition (float, or array of any shape)."""
    return TERMS[name][1](value) if name in TERMS else value
