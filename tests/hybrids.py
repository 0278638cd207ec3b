"""Logbooks of a plug-in hybrid drawn from a stated truth: kWh per km on fuel and on the battery, day by day.

A day starts on whatever the battery holds and goes on with fuel once it is empty; in the evening it is charged or not.
The need at the wheels moves from day to day and with the part under test, and both carriers pay for it alike.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

KWH_PER_L = 32.0 / 3.6  # petrol, Directive (EU) 2018/2001, Annex III
TANK_L, BATTERY_KWH = 40.0, 12.0
START = pd.Timestamp("2024-01-01")


@dataclass(frozen=True)
class HybridUse:
    days: int = 500
    fuel_kwh_per_km: float = 0.55
    electric_kwh_per_km: float = 0.18
    charge_before: float = 0.5  # chance of a charge in the evening, before the part is fitted
    charge_after: float = 0.5
    shift_percent: float = 0.0
    scatter: float = 0.08  # sd of a day's need, relative
    click_off_l: float = 0.4


def hybrid_log(use: HybridUse, rng: np.random.Generator) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Entries and modifications; the part is fitted half-way."""
    rows: list[dict[str, object]] = []
    odometer, battery, missing = 10_000.0, 0.0, 0.0

    def note(day: int, kind: str, energy: float, full: bool) -> None:
        date = START + pd.Timedelta(days=day)
        rows.append({"vehicle": "phev", "date": date, "odometer_km": round(odometer), "energy": round(energy, 2),
                     "kind": kind, "full": full, "temperature_c": 15.0})  # fmt: skip

    note(0, "fill-up", 30.0, True)
    over = 0.0
    fitted_km = 0.0
    for day in range(1, use.days):
        after = day >= use.days // 2
        if after and not fitted_km:
            fitted_km = odometer
        need = 1 + use.scatter * rng.standard_normal() + (use.shift_percent / 100 if after else 0.0)
        km = round(rng.uniform(60, 160))
        on_battery = min(km, battery / (use.electric_kwh_per_km * need))
        battery -= on_battery * use.electric_kwh_per_km * need
        missing += (km - on_battery) * use.fuel_kwh_per_km * need / KWH_PER_L
        odometer += km
        if rng.random() < (use.charge_after if after else use.charge_before):
            note(day, "charge", BATTERY_KWH - battery, True)
            battery = BATTERY_KWH
        if missing > 0.7 * TANK_L:
            error = use.click_off_l * rng.standard_normal()
            note(day, "fill-up", missing + error - over, True)
            missing, over = 0.0, error
    return pd.DataFrame(rows), pd.DataFrame({"vehicle": ["phev"], "name": ["part"], "fitted_km": [fitted_km]})
