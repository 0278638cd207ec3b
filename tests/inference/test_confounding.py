"""What moved with the part is named, and only that."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

import energytrack as et
from energytrack.inference.confounding import in_words
from energytrack.inference.results import Advice, Confounder
from tests.inference.test_several import plain_log


def assessed(temperature: np.ndarray, target: float = 1.5):  # type: ignore[no-untyped-def]
    """A steady log of 44 tanks, the part on for the last 14, with temperatures put in its place."""
    log = plain_log(9, 44)
    entries = log.entries.assign(
        temperature_c=temperature,
        energy=log.entries["energy"] / (1 + 0.006 * np.maximum(0, 18 - log.entries["temperature_c"]))
        * (1 + 0.006 * np.maximum(0, 18 - temperature)),
    )  # fmt: skip
    parts = pd.DataFrame({"name": ["part"], "fitted_km": [entries["odometer_km"].iloc[29]]})
    log = replace(log, entries=entries)
    return et.assess(log.entries, parts, "part", capacity=75.0, target_percent=target)


def test_weather_that_turned_with_the_part_is_named() -> None:
    rng = np.random.default_rng(1)
    turned = np.where(np.arange(44) < 30, 4.0, 14.0) + rng.normal(0, 1.0, 44)
    answer = assessed(turned)
    assert answer.confounders[0].condition == "temperature_c"
    assert answer.confounders[0].inflation > 1.5
    assert any("temperature changed together" in warning for warning in answer.warnings)
    if answer.verdict == "not-yet":
        assert answer.confounders[0].cost_km > 0


def test_weather_that_came_and_went_is_not() -> None:
    rng = np.random.default_rng(1)
    mixed = rng.uniform(2, 16, 44)
    answer = assessed(mixed)
    assert "temperature_c" not in [confounder.condition for confounder in answer.confounders]


def test_inflation_is_the_ratio_of_two_fits() -> None:
    """Checked by pretending the response is known: its prior made a thousand times as tight."""
    from energytrack.consumption.frames import observe_frames
    from energytrack.inference.confounding import confounders
    from energytrack.inference.likelihood import evaluate
    from energytrack.inference.model import fit_model
    from energytrack.inference.shift import contrast_variance

    rng = np.random.default_rng(2)
    log = plain_log(9, 44)
    turned = np.where(np.arange(44) < 30, 4.0, 12.0) + rng.normal(0, 2.0, 44)
    parts = pd.DataFrame({"name": ["part"], "fitted_km": [log.entries["odometer_km"].iloc[29]]})
    observed, _ = observe_frames(log.entries.assign(temperature_c=turned), parts, capacity=75.0)
    model = fit_model(observed, "part")
    found = next(c for c in confounders(model) if c.condition == "temperature_c")
    column = 2 + model.terms.names.index("heating")
    tight = model.problem.precision.copy()
    tight[column] = 1e12
    base, ratio = model.fit.coefficients[0], model.fit.coefficients[1] / model.fit.coefficients[0]
    free = evaluate(model.problem, model.fit.theta).covariance
    known = evaluate(replace(model.problem, precision=tight), model.fit.theta).covariance
    expected = contrast_variance(free, base, ratio) / contrast_variance(known, base, ratio)
    assert found.inflation == pytest.approx(expected, rel=1e-6)


def test_an_event_that_came_with_the_part_is_named() -> None:
    log = plain_log(9, 44)
    fitted = log.entries["odometer_km"].iloc[29]
    parts = pd.DataFrame({"name": ["part"], "fitted_km": [fitted]})
    days = log.entries["date"]
    events = pd.DataFrame(
        {
            "date": [days.iloc[29], days.iloc[10]],
            "odometer_km": [fitted + 300, np.nan],
            "what": ["new driver", "service"],
        }
    )
    answer = et.assess(log.entries, parts, "part", capacity=75.0, events=events)
    assert answer.warnings[0].startswith("new driver")
    assert not any("service" in warning for warning in answer.warnings)


def test_in_words_a_share_has_its_space_and_a_charging_habit_its_name() -> None:
    said = in_words(
        Confounder("electric_kwh_per_100km", 4.3, 250.0), 1000.0, Advice("electric_kwh_per_100km", -0.2, False, 3.5)
    )
    assert said.startswith("the charging changed together with the modification")
    assert "25 % of the distance still to go" in said
    assert said.endswith("A segment without it at about 0 kWh/100 km from the plug tells 3.5 times as much as usual")
