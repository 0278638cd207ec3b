"""The insulated house: the data as loaded give the published lines, and the frames made of them keep the data."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.formula.api as smf

from tests.outside.whiteside import KM_PER_WEEK, whiteside, whiteside_entries, whiteside_modifications

# Venables and Ripley, Modern Applied Statistics with S, chapter on linear models: gas = intercept + slope x
# temperature, one line before and one after. Figures from memory, verified here against the data.
PUBLISHED = {"Before": (6.854, -0.393), "After": (4.724, -0.278)}


@pytest.mark.parametrize("phase", PUBLISHED)
def test_data_give_the_published_lines(phase: str) -> None:
    fit = smf.ols("Gas ~ Temp", whiteside().query("Insul == @phase")).fit()
    np.testing.assert_allclose(fit.params, PUBLISHED[phase], atol=0.0005)


def test_level_at_the_mean_temperature_drops_by_about_a_third() -> None:
    """31.8 % from separate lines, 31.9 % from parallel ones: our own arithmetic on the data, no published figure."""
    data = whiteside()
    before, after = (np.poly1d(np.polyfit(*data.query("Insul == @phase")[["Temp", "Gas"]].to_numpy().T, 1))
                     for phase in PUBLISHED)  # fmt: skip
    mean = data["Temp"].mean()
    assert 100 * (after(mean) / before(mean) - 1) == pytest.approx(-31.76, abs=0.01)
    parallel = smf.ols("Gas ~ Temp + after", data.assign(after=1.0 * (data["Insul"] == "After"))).fit().params
    level = parallel["Intercept"] + parallel["Temp"] * mean
    assert 100 * parallel["after"] / level == pytest.approx(-31.88, abs=0.01)


def test_entries_hold_every_week_of_the_data_once() -> None:
    entries = whiteside_entries()
    weeks = entries.dropna(subset="energy")
    assert (len(entries), len(weeks)) == (58, 56)
    drawn = weeks[["temperature_c", "energy"]].sort_values(["temperature_c", "energy"]).to_numpy()
    np.testing.assert_array_equal(drawn, whiteside()[["Temp", "Gas"]].sort_values(["Temp", "Gas"]).to_numpy())


def test_insulation_lies_between_the_seasons_and_the_gap_is_flagged() -> None:
    entries, fitted_km = whiteside_entries(), whiteside_modifications()["fitted_km"].iloc[0]
    assert (entries["odometer_km"] < fitted_km).sum() == 27
    assert entries.index[entries["missed"]].tolist() == [27]
    within = entries["odometer_km"].diff()[~entries["missed"]].dropna()
    assert (within == KM_PER_WEEK).all()
