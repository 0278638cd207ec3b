"""Terms on floats and on arrays."""

from __future__ import annotations

import math

import numpy as np
import pytest

from energytrack.consumption.terms import TERMS, condition_of, term


@pytest.mark.parametrize(
    ("name", "value", "expected"),
    [
        ("heating", 5.0, 13.0),
        ("heating", 18.5, 0.0),
        ("cooling", 30.0, 8.0),
        ("cooling", 22.0, 0.0),
        ("speed", 80.0, 80.0),
        ("speed_squared", 80.0, 6400.0),
        ("speed_inverse", 80.0, 0.0125),
        ("season_cos1", 0.0, 1.0),
        ("season_sin1", 365.2425 / 4, 1.0),
        ("season_cos2", 365.2425 / 2, 1.0),
        ("season_sin2", 365.2425 / 8, 1.0),
        ("payload_kg", 350.0, 350.0),
    ],
)
def test_value(name: str, value: float, expected: float):
    assert term(name, value) == pytest.approx(expected)


@pytest.mark.parametrize("name", [*TERMS, "payload_kg"])
def test_arrays_give_what_floats_give(name: str):
    values = np.array([3.0, 18.0, 20.0, 25.0, 90.0])
    assert np.asarray(term(name, values)) == pytest.approx([term(name, float(value)) for value in values])


def test_unknown_stays_unknown():
    assert math.isnan(term("heating", math.nan))
    assert math.isnan(term("cooling", math.nan))


def test_season_repeats_after_400_gregorian_years():
    # The Gregorian calendar repeats after 400 years of 146,097 days (its own definition).
    assert term("season_cos1", 738_000 + 146_097) == pytest.approx(term("season_cos1", 738_000), abs=1e-9)


def test_condition_behind_a_term():
    assert condition_of("cooling") == "temperature_c"
    assert condition_of("season_sin2") == "season"
    assert condition_of("payload_kg") == "payload_kg"
