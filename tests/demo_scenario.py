"""The invented scenario behind the demonstration logbook: change it here to make the demonstration show another thing.

A workshop repairs and delivers furniture along fixed rounds, with a diesel van, a petrol car and an electric car.
Nobody and no place in it exists.
"""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass

FIRST, LAST = dt.date(2024, 12, 2), dt.date(2026, 11, 27)
CURRENCY = "EUR"


@dataclass(frozen=True)
class Driven:
    """One vehicle, its rounds, its response and its noise. Percentages are of consumption."""

    name: str
    seed: int
    carrier: str
    unit: str
    capacity: float
    note: str
    odometer_km: float  # on the first day
    consumption: float  # unit per 100 km at USUAL_TEMPERATURE and speed_kmh
    # the modification
    part: str
    part_note: str
    fitted: dt.date
    shift_percent: float
    target_percent: float
    # rounds: mean and sd of a day
    km_per_day: float
    km_sd: float
    speed_kmh: float
    speed_sd: float
    saturdays: bool
    # response: % per K below 18 and above 22 degrees, share of drag and of accessories
    heating: float
    cooling: float
    drag_share: float
    accessory_share: float
    # noise: sd of one day's round, of drift over weeks and over seasons; of a filling or reading in percent of capacity
    day_percent: float
    weeks_percent: float
    seasons_percent: float
    level_percent: float
    # logging
    price: float  # mean, per unit
    refill_at: tuple[float, float]  # filled up below a share of capacity between these two
    partial_share: float = 0.0
    missed_on: dt.date | None = None  # the first full entry from here on is forgotten
    tyres: tuple[dt.date, float] | None = None  # from this day true km = factor x odometer km


VAN = Driven(
    name="van", seed=11, carrier="diesel", unit="L", capacity=75.0, note="box van, delivery round",
    odometer_km=61_240, consumption=9.4,
    part="roof fairing and side skirts", part_note="fitted in our own workshop; inspected",
    fitted=dt.date(2025, 9, 17), shift_percent=-6.0, target_percent=3.0,
    km_per_day=183, km_sd=15, speed_kmh=61, speed_sd=2.5, saturdays=False,
    heating=0.5, cooling=0.5, drag_share=0.42, accessory_share=0.08,
    day_percent=5.0, weeks_percent=0.6, seasons_percent=0.5, level_percent=1.2,
    price=1.62, refill_at=(0.30, 0.46), partial_share=0.06,
    missed_on=dt.date(2025, 6, 10), tyres=(dt.date(2025, 3, 31), 1.014),
)  # fmt: skip
CAR = Driven(
    name="car", seed=12, carrier="petrol", unit="L", capacity=45.0, note="estate car, estimates and small jobs",
    odometer_km=38_915, consumption=6.6,
    part="grille blanking", part_note="upper grille only; coolant temperature watched",
    fitted=dt.date(2026, 9, 22), shift_percent=-2.5, target_percent=3.0,
    km_per_day=96, km_sd=13, speed_kmh=56, speed_sd=3.0, saturdays=False,
    heating=0.6, cooling=0.7, drag_share=0.32, accessory_share=0.10,
    day_percent=5.0, weeks_percent=0.4, seasons_percent=0.3, level_percent=1.2,
    price=1.74, refill_at=(0.20, 0.36), partial_share=0.05, missed_on=dt.date(2026, 2, 16),
)  # fmt: skip
ELECTRIC = Driven(
    name="electric", seed=13, carrier="electricity", unit="kWh", capacity=58.0,
    note="small electric car, collections in town", odometer_km=12_480, consumption=16.8,
    part="wheel covers", part_note="smooth covers on all four wheels",
    fitted=dt.date(2026, 3, 11), shift_percent=-1.0, target_percent=1.0,
    km_per_day=54, km_sd=12, speed_kmh=44, speed_sd=2.5, saturdays=True,
    heating=1.3, cooling=0.9, drag_share=0.40, accessory_share=0.06,
    day_percent=7.0, weeks_percent=1.2, seasons_percent=1.0, level_percent=0.5,
    price=0.34, refill_at=(0.26, 0.48),
)  # fmt: skip
VEHICLES = (VAN, CAR, ELECTRIC)

CLOSED = (  # first and last day of each closure
    (dt.date(2024, 12, 23), dt.date(2025, 1, 3)),
    (dt.date(2025, 4, 18), dt.date(2025, 4, 21)),
    (dt.date(2025, 5, 1), dt.date(2025, 5, 2)),
    (dt.date(2025, 8, 4), dt.date(2025, 8, 15)),
    (dt.date(2025, 12, 24), dt.date(2026, 1, 5)),
    (dt.date(2026, 4, 3), dt.date(2026, 4, 6)),
    (dt.date(2026, 5, 1), dt.date(2026, 5, 1)),
    (dt.date(2026, 8, 3), dt.date(2026, 8, 17)),
)
# Mean temperature in the middle of each month, degrees Celsius: an inland temperate year
MONTHS = (1.5, 2.6, 6.2, 10.3, 14.6, 18.0, 20.1, 19.6, 15.4, 10.6, 5.6, 2.4)
USUAL_TEMPERATURE = 10.5
MISSING_TEMPERATURE_SHARE = 0.05
CHARGE_GOALS = (0.8, 0.8, 0.85, 0.9, 1.0)  # share of capacity a session ends at, each as likely
