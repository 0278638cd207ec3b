"""Kinds of use: vehicles, how they are driven and how they are logged, for simulated logbooks."""

from __future__ import annotations

from dataclasses import dataclass

TRIP_KM = 50.0  # trip_percent is the sd of one trip of this length


@dataclass(frozen=True)
class Use:
    """A vehicle, how it is used and how it is logged. Percentages are of consumption unless said otherwise."""

    vehicle: str
    unit: str = "L"
    capacity: float = 50.0
    b0: float = 6.5  # unit per 100 km at the log's mean conditions, nothing fitted
    fillings: int = 100
    shift_percent: float = -3.0
    switches: tuple[float, ...] = (0.5,)  # share of the driving days after which it is fitted, removed, fitted, ...
    target_percent: float = 3.0
    # how it is driven
    km_per_day: float = 90.0
    km_spread: float = 0.08  # relative sd from day to day
    days_per_fill: tuple[int, int] = (4, 6)  # driving days, least and most
    weekdays_only: bool = True
    speed_kmh: float = 65.0
    speed_spread: float = 0.04  # relative sd, half of its variance from tank to tank, half from day to day
    # what consumption answers to
    heating: float = 0.6  # % per K below 18 degrees
    cooling: float = 0.8  # % per K above 22 degrees
    drag_share: float = 0.35  # of consumption at speed_kmh: grows with v^2
    accessory_share: float = 0.08  # of consumption at speed_kmh: grows with 1/v
    # noise
    trip_percent: float = 7.0  # one trip of TRIP_KM; a tank of ten trips has 1/sqrt(10) of it
    drift_weeks_percent: float = 0.6
    drift_seasons_percent: float = 0.4
    level_error_percent: float = 1.2  # of capacity, of each filling or reading
    # how it is logged
    readings: bool = False  # charged to a chosen level which is read off, instead of filled to the full mark
    reading_share: float = 1.0  # of charges whose reading is written down
    partial_share: float = 0.0  # of fillings, where the tank is not too low for one
    missed_share: float = 0.0
    temperature_logged: bool = True
    speed_logged: bool = True
    temperature_missing_share: float = 0.03


STEADY_COMMUTE = Use("steady-commute")
DRIFTING = Use("drifting", trip_percent=10.0, drift_weeks_percent=2.5, drift_seasons_percent=1.8)
SLOPPY_FILLS = Use("sloppy-fills", level_error_percent=3.0, days_per_fill=(2, 4), fillings=150)
PARTIAL_AND_MISSED = Use(
    "partial-and-missed", days_per_fill=(2, 3), fillings=180, partial_share=0.25, missed_share=0.05, trip_percent=8.0
)
ELECTRIC = Use(
    "electric",
    unit="kWh",
    capacity=62.0,
    b0=17.0,
    fillings=150,
    days_per_fill=(1, 2),
    heating=1.3,
    cooling=1.0,
    drag_share=0.5,
    accessory_share=0.05,
    level_error_percent=0.7,
    readings=True,
    reading_share=0.95,
)
HOUSEHOLD = Use(
    "household",
    capacity=55.0,
    b0=7.8,
    km_per_day=38.0,
    km_spread=0.4,
    days_per_fill=(6, 9),
    weekdays_only=False,
    speed_kmh=42.0,
    speed_spread=0.12,
    drag_share=0.15,
    accessory_share=0.15,
    heating=0.8,
    trip_percent=28.0,
    drift_weeks_percent=4.0,
    drift_seasons_percent=3.0,
    level_error_percent=2.0,
    temperature_logged=False,
    speed_logged=False,
)
DELIVERY_VAN = Use(
    "delivery-van",
    capacity=75.0,
    b0=9.5,
    fillings=150,
    km_per_day=265.0,
    days_per_fill=(1, 2),
    speed_kmh=72.0,
    trip_percent=6.0,
    drift_weeks_percent=0.9,
    drift_seasons_percent=0.7,
)
USES: tuple[Use, ...] = (
    STEADY_COMMUTE,
    DRIFTING,
    SLOPPY_FILLS,
    PARTIAL_AND_MISSED,
    ELECTRIC,
    HOUSEHOLD,
    DELIVERY_VAN,
)
