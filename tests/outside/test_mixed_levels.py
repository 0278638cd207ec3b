"""The insulated house in stretches of whole, half and no insulation (MASS `whiteside`; see whiteside.py).

Ten pairs of a week before and a week after become stretches of two weeks, half of them insulated. Once they are logged
as what they are, insulated from the middle of the stretch on; once as a graded part, at level 50 throughout and at
level 100 afterwards. Ordinary least squares on the same stretches (statsmodels) is the oracle; no published figure.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf

import energytrack as et
from tests.outside.whiteside import KM_PER_WEEK, whiteside

PAIRS = 10


def stretches() -> pd.DataFrame:
    """Weeks without, pairs, weeks with: gas, temp and insulated share of each; colder, then warmer."""
    weeks = {phase: whiteside().query("Insul == @phase").sort_values("Temp") for phase in ("Before", "After")}
    chosen = {phase: np.linspace(1, len(own) - 2, PAIRS).astype(int) for phase, own in weeks.items()}
    first, second = (weeks[phase].iloc[chosen[phase]].reset_index() for phase in ("Before", "After"))
    paired = pd.DataFrame(
        {"gas": first["Gas"] + second["Gas"], "temp": (first["Temp"] + second["Temp"]) / 2, "share": 0.5, "weeks": 2}
    )
    single = {
        phase: own.drop(own.index[chosen[phase]])
        .rename(columns={"Gas": "gas", "Temp": "temp"})
        .assign(share=float(phase == "After"), weeks=1)
        for phase, own in weeks.items()
    }
    phases = [_there_and_back(phase) for phase in (single["Before"], paired, single["After"])]
    return pd.concat(phases, ignore_index=True)[["gas", "temp", "share", "weeks"]]


def _there_and_back(phase: pd.DataFrame) -> pd.DataFrame:
    ordered = phase.sort_values("temp", ascending=False)
    return pd.concat([ordered.iloc[0::2], ordered.iloc[1::2].iloc[::-1]])


def as_entries(found: pd.DataFrame) -> pd.DataFrame:
    weeks = np.concatenate([[0], found["weeks"].cumsum()])
    return pd.DataFrame(
        {
            "vehicle": "house",
            "date": pd.Timestamp("1960-10-02") + pd.to_timedelta(7 * weeks, unit="D"),
            "odometer_km": KM_PER_WEEK * weeks,
            "energy": np.concatenate([[np.nan], found["gas"]]),
            "temperature_c": np.concatenate([[np.nan], found["temp"]]),
        }
    )


def least_squares(found: pd.DataFrame, formula: str) -> dict[str, float]:
    """Percent of the level at the mean temperature without insulation, by term; weighted by weeks."""
    found = found.assign(use=found["gas"] / found["weeks"], half=1.0 * (found["share"] == 0.5),
                         whole=1.0 * (found["share"] == 1.0))  # fmt: skip
    fit = smf.wls(formula, found, weights=found["weeks"]).fit()
    level = fit.params["Intercept"] + fit.params["temp"] * np.average(found["temp"], weights=found["weeks"])
    return {name: float(100 * value / level) for name, value in fit.params.items()}


def fitted(rows: list[tuple[float, float, float]]) -> pd.DataFrame:
    frame = pd.DataFrame(rows, columns=["fitted_km", "removed_km", "level"])
    return frame.assign(vehicle="house", name="insulation")


def test_half_insulated_stretches_count_by_their_share() -> None:
    found = stretches()
    ends = KM_PER_WEEK * found["weeks"].cumsum()
    halves = found.index[found["share"] == 0.5]
    rows = [(ends[k] - KM_PER_WEEK, ends[k], np.nan) for k in halves] + [(ends[halves[-1]], np.nan, np.nan)]
    answer = et.assess(as_entries(found), fitted(rows), "insulation", target_percent=10.0, unit="kWh")
    oracle = least_squares(found, "use ~ temp + share")["share"]
    assert answer.verdict == "shifted"
    assert answer.shift_percent == pytest.approx(oracle, abs=2.0)
    assert oracle == pytest.approx(-31.9, abs=2.0)  # all weeks one by one: see test_whiteside.py
    assert answer.distance_modified_km == KM_PER_WEEK * (PAIRS + (found["share"] == 1).sum())


def test_insulation_as_a_graded_part() -> None:
    found = stretches()
    ends = KM_PER_WEEK * found["weeks"].cumsum()
    begin, change = ends[found.index[found["share"] == 0][-1]], ends[found.index[found["share"] == 0.5][-1]]
    graded = fitted([(begin, change, 50.0), (change, np.nan, 100.0)])
    oracle = least_squares(found, "use ~ temp + half + whole")
    answer = et.assess(as_entries(found), graded, "insulation", target_percent=10.0, unit="kWh")
    assert (answer.verdict, answer.level) == ("shifted", 100.0)
    assert answer.shift_percent == pytest.approx(oracle["whole"], abs=2.0)
    low, high = answer.interval_percent
    assert low < oracle["whole"] < high < 0
    by_level = {effect.level: effect for effect in answer.response.levels}
    for level, name in ((50.0, "half"), (100.0, "whole")):
        low, high = by_level[level].interval_percent
        assert low < oracle[name] < high < 0
