"""The conditions of driving as regression terms: chosen by what the log holds, never by what they do to the answer.

Temperature enters as heating below 18 and cooling above 22 degrees Celsius (the change-point form of energy baselines,
ASHRAE Guideline 14); speed as v^2, drag per distance, and 1/v, accessory power per distance. A log without
temperatures gets two annual harmonics. A missing value is replaced by what the vehicle's own record suggests, and how
wrong that may be is passed on as a variance.

Every term has a wide normal prior centred on no effect. It decides nothing where the log speaks, and keeps a term the
log says little about from being called certain either way.

With tank and battery one more term counts: the energy from the plug per distance. At a given need at the wheels, a kWh
from the plug replaces about three of fuel, so the total falls by about two: that is the centre of its prior. It is
stated against driving on fuel alone, where a shift of the need at the wheels is the same shift of the energy bought.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from energytrack.consumption.observations import Observations
from energytrack.consumption.terms import ELECTRIC, YEAR_DAYS, condition_of, term

Array = NDArray[np.float64]

TEMPERATURE, SPEED, SEASON = "temperature_c", "speed_kmh", "season"
_FEW = 4  # segments a branch needs
_KNOWN = 6  # segments with a known value before a condition is used
_FEWEST_TO_AVERAGE = 2
_STILL = 0.005  # spread of the speed, relative to its mean, below which it explains nothing
_TWO_SPEED_TERMS = (25, 0.10)  # segments and relative spread from which v^2 and 1/v can be told apart
_HARMONICS = ("season_cos1", "season_sin1", "season_cos2", "season_sin2")
_SEASON_SWING = {"kWh": (0.15, 0.06)}  # prior sd of the two harmonics, as a share of consumption; batteries feel winter
_USUAL_SWING = (0.08, 0.03)
_DEGREE = 0.05  # prior sd of the response to one degree
_ELECTRIC = (-2.0, 1.0)  # prior mean and sd of the total's response to a kWh from the plug; common practice, no source
_TEMPERATURE_SWING = 10.0  # prior sd of the yearly swing of the temperature itself, K


@dataclass(frozen=True)
class Pattern:
    """A condition over the year: mean and first harmonic, and the spread of single segments around it."""

    coefficients: Array  # (3,)
    variance: float

    def at(self, day: Array) -> Array:
        values: Array = _yearly(day) @ self.coefficients
        return values


@dataclass(frozen=True)
class Conditions:
    """Conditions of n segments without gaps."""

    day: Array  # (n,) middle of each segment
    values: dict[str, Array]  # (n,) each
    variances: dict[str, Array]  # (n,) of filled-in values, 0 where known
    patterns: dict[str, Pattern]
    filled: dict[str, int]  # segments whose value was filled in

    def values_of(self, name: str) -> Array:
        """A term at each segment (n,)."""
        condition = condition_of(name)
        return np.asarray(term(name, self.day if condition == SEASON else self.values[condition]), dtype=float)

    def variance_of(self, name: str) -> Array:
        """Variance of a term that comes from filled-in conditions (n,)."""
        condition = condition_of(name)
        if condition == SEASON or not self.variances[condition].any():
            return np.zeros(len(self.day))
        value, spread = self.values[condition], np.sqrt(self.variances[condition])
        slope = (np.asarray(term(name, value + 0.5 * spread)) - np.asarray(term(name, value - 0.5 * spread))) ** 2
        return np.asarray(slope, dtype=float)


@dataclass(frozen=True)
class Terms:
    """The terms used, how they are centred and scaled, and the width of their priors; arrays of shape (k,)."""

    names: tuple[str, ...]
    centres: Array
    scales: Array
    prior_mean: Array  # of the response to one scale, as a share of consumption
    prior_sd: Array

    def columns(self, conditions: Conditions) -> Array:
        """Centred and scaled terms (n, k)."""
        if not self.names:
            return np.zeros((len(conditions.day), 0))
        raw = np.column_stack([conditions.values_of(name) for name in self.names])
        return np.asarray((raw - self.centres) / self.scales)

    def variances(self, conditions: Conditions) -> Array:
        """Variance of the scaled terms that comes from filled-in conditions (n, k)."""
        if not self.names:
            return np.zeros((len(conditions.day), 0))
        raw = np.column_stack([conditions.variance_of(name) for name in self.names])
        return np.asarray(raw / self.scales**2)


def fill(observed: Observations) -> Conditions:
    """Conditions known well enough to use, their gaps filled from the vehicle's own yearly pattern or mean."""
    values, variances, patterns, filled = {}, {}, {}, {}
    for name, raw in observed.conditions.items():
        known = ~np.isnan(raw)
        if known.sum() < (_FEWEST_TO_AVERAGE if name == ELECTRIC else _KNOWN):
            continue
        pattern = _pattern(observed.mid_day[known], raw[known], yearly=name == TEMPERATURE)
        whole = bool(known.all())
        values[name] = raw if whole else np.where(known, raw, pattern.at(observed.mid_day))
        variances[name] = np.where(known, 0.0, pattern.variance)
        patterns[name] = pattern
        filled[name] = 0 if whole else int((~known).sum())
    return Conditions(observed.mid_day, values, variances, patterns, filled)


def choose(observed: Observations, conditions: Conditions, further: Sequence[str] = ()) -> Terms:
    """The terms this log supports."""
    share = observed.distance_km / observed.distance_km.sum()
    names = [*_temperature_terms(conditions), *_speed_terms(conditions)]
    names += _electric_term(conditions)
    own = {TEMPERATURE, SPEED, ELECTRIC, *names}  # these have their terms already
    named = [name for name in dict.fromkeys(further) if name in conditions.values and name not in own]
    names += [name for name in named if np.ptp(conditions.values[name]) > 0]
    centres, scales, means, priors = [], [], [], []
    usual = float(observed.energy.sum() / observed.distance_km.sum())
    for name in names:
        value = conditions.values_of(name)
        centre = 0.0 if name == ELECTRIC else float(share @ value)
        scale = float(np.sqrt(share @ (value - centre) ** 2))
        centres.append(0.0 if condition_of(name) == SEASON else centre)
        scales.append(1.0 if condition_of(name) == SEASON else scale)
        one_kwh = scales[-1] / 100 / usual  # of the electric term: one kWh for each kWh, as a share of consumption
        means.append(_ELECTRIC[0] * one_kwh if name == ELECTRIC else 0.0)
        usual_sd = _prior_sd(name, scales[-1], conditions, observed.unit)
        priors.append(_ELECTRIC[1] * one_kwh if name == ELECTRIC else usual_sd)
    return Terms(tuple(names), np.array(centres), np.array(scales), np.array(means), np.array(priors))


def _electric_term(conditions: Conditions) -> list[str]:
    electric = conditions.values.get(ELECTRIC)
    return [] if electric is None or not electric.any() else [ELECTRIC]


def _temperature_terms(conditions: Conditions) -> tuple[str, ...]:
    temperature = conditions.values.get(TEMPERATURE)
    if temperature is None:
        return _HARMONICS
    branches = {"heating": temperature < 18, "cooling": temperature > 22}
    return tuple(name for name, on in branches.items() if on.sum() >= _FEW and np.ptp(temperature[on]) > 0)


def _speed_terms(conditions: Conditions) -> tuple[str, ...]:
    speed = conditions.values.get(SPEED)
    if speed is None or speed.min() <= 0:
        return ()
    spread = float(speed.std() / speed.mean())
    if spread < _STILL:
        return ()
    enough, wide = _TWO_SPEED_TERMS
    return ("speed_squared", "speed_inverse") if len(speed) >= enough and spread >= wide else ("speed",)


def _prior_sd(name: str, scale: float, conditions: Conditions, unit: str) -> float:
    condition = condition_of(name)
    if condition == SEASON:
        first, second = _SEASON_SWING.get(unit, _USUAL_SWING)
        return first if name.endswith("1") else second
    if condition == TEMPERATURE:
        return _DEGREE * scale
    if condition == SPEED:  # at most the whole of consumption is drag, at most half of it accessories
        mean = float(conditions.values[SPEED].mean())
        return scale * {"speed_squared": 1.0 / mean**2, "speed_inverse": 0.5 * mean, "speed": 2.0 / mean}[name]
    return 0.3  # an unknown influence: its usual swing moves consumption by some tens of percent at most


def _pattern(day: Array, value: Array, *, yearly: bool) -> Pattern:
    """Mean and, for temperature, yearly harmonic; the harmonic is held near nothing until a season has been seen."""
    columns = _yearly(day)
    if not yearly:
        return Pattern(np.array([value.mean(), 0.0, 0.0]), float(value.var(ddof=1)))
    noise = max(float(value.var()) / 4, 1.0)
    held = np.diag([0.0, *([noise / _TEMPERATURE_SWING**2] * 2)])
    coefficients: Array = np.linalg.solve(columns.T @ columns + held, columns.T @ value).astype(np.float64)
    residual = value - columns @ coefficients
    return Pattern(coefficients, float((residual**2).sum() / max(len(value) - 3, 1)))


def _yearly(day: Array) -> Array:
    angle = 2 * np.pi * day / YEAR_DAYS
    return np.column_stack([np.ones(len(day)), np.cos(angle), np.sin(angle)])
