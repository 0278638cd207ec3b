"""Logbooks drawn from a stated truth, for tests: the frames `assess` takes, and beside them what really happened.

A vehicle is driven day by day; energy used on a day is

    km x b0 x (1 + conditions - their mean + drift of weeks + drift of seasons + shift x fitted) + trip noise

Conditions are temperature and speed. They are centred over the whole log, so b0 is the consumption at the log's mean
conditions and the shift is a share of it. Energy bought is energy used plus the change of level, so an over-full
tank is paid back by the next one.
"""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt
import pandas as pd
from scipy.signal import lfilter

from tests.uses import TRIP_KM, Use

Floats = npt.NDArray[np.float64]
Days = npt.NDArray[np.datetime64]

HALF_LIFE_WEEKS, HALF_LIFE_SEASONS, HALF_LIFE_WEATHER = 21.0, 180.0, 5.0  # days
FULL_MARK = 97.0  # the usual full mark, in percent of capacity: room is left for an over-full tank


@dataclass(frozen=True)
class Truth:
    """What really happened. fillings: one row each, logged or not: date, odometer_km, bought, used, level, logged."""

    use: Use
    shift_percent: float
    b0: float  # unit per km
    level_error: float  # sd, unit
    trip_percent_per_fill: float  # sd of the trip noise of an average interval between fillings
    level_at_start: float
    fillings: pd.DataFrame = field(repr=False)


@dataclass(frozen=True)
class SimulatedLog:
    """Frames with the columns of `entries` and `modifications`, and the truth behind them."""

    entries: pd.DataFrame
    modifications: pd.DataFrame
    truth: Truth


@dataclass(frozen=True)
class CommonDrift:
    """Drift that several vehicles of one run share: `share` of the variance of each one's own."""

    share: float
    first: dt.date
    weeks: Floats  # of standard deviation 1, day by day from `first`
    seasons: Floats

    @classmethod
    def drawn(cls, share: float, first: dt.date, days: int, rng: np.random.Generator) -> CommonDrift:
        dates = np.datetime64(first, "D") + np.arange(days)
        paths = [ornstein_uhlenbeck(dates, half_life, 1.0, rng) for half_life in (HALF_LIFE_WEEKS, HALF_LIFE_SEASONS)]
        return cls(share, first, *paths)

    def on(self, dates: Days) -> tuple[Floats, Floats]:
        """Both drifts on these days, at the common part's own standard deviation."""
        day = (dates - np.datetime64(self.first, "D")).astype(np.int64)
        return np.sqrt(self.share) * self.weeks[day], np.sqrt(self.share) * self.seasons[day]


def simulate(
    kind: Use, rng: np.random.Generator, *, start: dt.date | None = None, common: CommonDrift | None = None
) -> SimulatedLog:
    """Draw a logbook. start: the first driving day; None draws one, so that seasons differ from log to log.

    common: drift this vehicle shares with others of its run.
    """
    first = start or dt.date(2023, 1, 2) + dt.timedelta(days=int(rng.integers(365)))
    lengths = rng.integers(kind.days_per_fill[0], kind.days_per_fill[1] + 1, kind.fillings)
    tank = np.repeat(np.arange(kind.fillings), lengths)
    starts = np.concatenate([[0], np.cumsum(lengths)[:-1]])
    dates = _driving_days(kind, first, len(tank))
    km = np.maximum(5.0, np.rint(kind.km_per_day * (1 + kind.km_spread * rng.standard_normal(len(tank)))))
    temperature = _temperature(dates, rng)
    speed = _speed(kind, tank, rng)
    odometer = 20_000.0 + np.cumsum(km)
    switches = [int(share * len(tank)) for share in kind.switches]
    fitted = np.searchsorted(switches, np.arange(len(tank)), side="right") % 2
    used = np.add.reduceat(_energy_of_days(kind, dates, km, temperature, speed, fitted, rng, common), starts)

    ends = starts + lengths - 1
    distance = np.add.reduceat(km, starts)
    fillings = _fill(kind, used, rng)
    fillings.insert(0, "date", pd.to_datetime(dates[ends]))
    fillings.insert(1, "odometer_km", odometer[ends])
    fillings["temperature_c"] = np.rint(np.add.reduceat(km * temperature, starts) / distance)
    fillings["speed_kmh"] = np.rint(distance / np.add.reduceat(km / speed, starts))
    truth = Truth(
        use=kind,
        shift_percent=kind.shift_percent,
        b0=kind.b0 / 100,
        level_error=kind.level_error_percent / 100 * kind.capacity,
        trip_percent_per_fill=kind.trip_percent * float(np.sqrt(TRIP_KM / distance.mean())),
        level_at_start=FULL_MARK / 100 * kind.capacity,
        fillings=fillings[["date", "odometer_km", "bought", "used", "level", "logged"]],
    )
    before = np.concatenate([[20_000.0], odometer])
    return SimulatedLog(_entries(kind, fillings, rng), _modifications(kind, switches, dates, before), truth)


def long_log(n: int, rng: np.random.Generator) -> SimulatedLog:
    """A log of n fillings for benchmarks, four a day (200,000 span 137 years), fitted half-way."""
    kind = Use("long-log", fillings=n)
    dates = np.datetime64("1886-01-01") + np.arange(n) // 4
    km = np.rint(500 * (1 + 0.1 * rng.standard_normal(n)))
    temperature = _temperature(dates, rng)
    speed = _speed(kind, np.arange(n), rng)
    fitted = (np.arange(n) >= n // 2).astype(np.int64)
    used = _energy_of_days(kind, dates, km, temperature, speed, fitted, rng)
    start = FULL_MARK / 100 * kind.capacity
    level = start + kind.level_error_percent / 100 * kind.capacity * rng.standard_normal(n)
    odometer = 20_000.0 + np.cumsum(km)
    fillings = pd.DataFrame(
        {
            "date": pd.to_datetime(dates),
            "odometer_km": odometer,
            "bought": np.round(used + np.diff(level, prepend=start), 2),
            "used": used,
            "level": level,
            "full": True,
            "level_percent": np.nan,
            "missed": False,
            "logged": True,
            "temperature_c": np.rint(temperature),
            "speed_kmh": np.rint(speed),
        }
    )
    truth = Truth(
        kind,
        kind.shift_percent,
        kind.b0 / 100,
        kind.level_error_percent / 100 * kind.capacity,
        kind.trip_percent * float(np.sqrt(TRIP_KM / km.mean())),
        start,
        fillings[["date", "odometer_km", "bought", "used", "level", "logged"]],
    )
    before = np.concatenate([[20_000.0], odometer])
    return SimulatedLog(_entries(kind, fillings, rng), _modifications(kind, [n // 2], dates, before), truth)


def ornstein_uhlenbeck(dates: Days, half_life_days: float, sd: float, rng: np.random.Generator) -> Floats:
    """A stationary Ornstein-Uhlenbeck process seen on sorted dates: correlation 2^(-gap / half-life)."""
    day = (dates - dates[0]).astype(np.int64)
    keep = 0.5 ** (1 / half_life_days)
    steps = rng.standard_normal(day[-1] + 1) * np.sqrt(1 - keep**2)
    steps[0] /= np.sqrt(1 - keep**2)
    path: Floats = sd * lfilter([1.0], [1.0, -keep], steps)
    return np.asarray(path[day])


def _driving_days(kind: Use, first: dt.date, count: int) -> Days:
    start = np.datetime64(first, "D")
    if kind.weekdays_only:
        return np.asarray(np.busday_offset(start, np.arange(count), roll="forward"))
    return np.asarray(start + np.arange(count))


def _temperature(dates: Days, rng: np.random.Generator) -> Floats:
    """Degrees: coldest in mid-January, 1 to 19 over the year, with weather of sd 3.5 around it."""
    season = (dates - np.datetime64("2023-01-15")).astype(np.float64) / 365.25
    return np.asarray(10 - 9 * np.cos(2 * np.pi * season) + ornstein_uhlenbeck(dates, HALF_LIFE_WEATHER, 3.5, rng))


def _speed(kind: Use, tank: npt.NDArray[np.int64], rng: np.random.Generator) -> Floats:
    of_tank = rng.standard_normal(tank[-1] + 1)[tank]
    spread = kind.speed_spread * (of_tank + rng.standard_normal(len(tank))) / np.sqrt(2)
    return np.asarray(kind.speed_kmh * np.clip(1 + spread, 0.4, 1.6))


def _energy_of_days(
    kind: Use,
    dates: Days,
    km: Floats,
    temperature: Floats,
    speed: Floats,
    fitted: npt.NDArray[np.int64],
    rng: np.random.Generator,
    common: CommonDrift | None = None,
) -> Floats:
    ratio: Floats = speed / kind.speed_kmh
    conditions = (
        kind.heating / 100 * np.maximum(0, 18 - temperature)
        + kind.cooling / 100 * np.maximum(0, temperature - 22)
        + kind.drag_share * (ratio**2 - 1)
        + kind.accessory_share * (1 / ratio - 1)
    )
    weeks = ornstein_uhlenbeck(dates, HALF_LIFE_WEEKS, kind.drift_weeks_percent / 100, rng)
    seasons = ornstein_uhlenbeck(dates, HALF_LIFE_SEASONS, kind.drift_seasons_percent / 100, rng)
    if common is not None:
        shared_weeks, shared_seasons = common.on(dates)
        weeks = np.sqrt(1 - common.share) * weeks + kind.drift_weeks_percent / 100 * shared_weeks
        seasons = np.sqrt(1 - common.share) * seasons + kind.drift_seasons_percent / 100 * shared_seasons
    relative = 1 + conditions - np.average(conditions, weights=km) + weeks + seasons + kind.shift_percent / 100 * fitted
    trips = kind.trip_percent / 100 * np.sqrt(TRIP_KM * km) * rng.standard_normal(len(km))
    return np.asarray(kind.b0 / 100 * (km * np.maximum(relative, 0.3) + trips))


def _fill(kind: Use, used: Floats, rng: np.random.Generator) -> pd.DataFrame:
    """Keep the tank's account: what was bought, the level after it, and what the log says of that level."""
    error = kind.level_error_percent / 100 * kind.capacity
    level = FULL_MARK / 100 * kind.capacity
    rows = []
    for index, burnt in enumerate(used):
        low = level - burnt
        last = index == len(used) - 1
        partial = rng.random() < kind.partial_share and low > 0.4 * kind.capacity and not last
        if kind.readings:
            goal = kind.capacity * rng.choice([0.8, 0.85, 0.9, 0.95])
        elif partial:
            goal = low + rng.uniform(0.3, 0.8) * (FULL_MARK / 100 * kind.capacity - low)
        else:
            goal = FULL_MARK / 100 * kind.capacity + error * rng.standard_normal()
        bought = round(max(0.5, goal - low), 2)
        level = low + bought
        reading = np.nan
        if kind.readings and rng.random() < kind.reading_share:
            reading = min(100.0, float(np.rint(100 * (level + error * rng.standard_normal()) / kind.capacity)))
        rows.append((bought, burnt, level, not (partial or kind.readings), reading))
    fillings = pd.DataFrame(rows, columns=["bought", "used", "level", "full", "level_percent"])
    forgotten = rng.random(len(used)) < kind.missed_share
    forgotten[[0, -1]] = False
    fillings["logged"] = ~forgotten
    fillings["missed"] = np.concatenate([[False], forgotten[:-1]])
    return fillings


def _entries(kind: Use, fillings: pd.DataFrame, rng: np.random.Generator) -> pd.DataFrame:
    logged = fillings[fillings["logged"]].reset_index(drop=True)
    entries = logged[["date", "odometer_km", "full", "level_percent", "missed", "temperature_c", "speed_kmh"]].copy()
    entries.insert(0, "vehicle", kind.vehicle)
    entries.insert(3, "energy", logged["bought"])
    entries.insert(4, "kind", "charge" if kind.readings else "fill-up")
    entries.loc[rng.random(len(entries)) < kind.temperature_missing_share, "temperature_c"] = np.nan
    unlogged = [] if kind.readings else ["level_percent"]
    unlogged += [] if kind.temperature_logged else ["temperature_c"]
    unlogged += [] if kind.speed_logged else ["speed_kmh"]
    return entries.drop(columns=unlogged)


def _modifications(kind: Use, switches: list[int], dates: Days, odometer_before: Floats) -> pd.DataFrame:
    """One row for each time the part was fitted; a switch happens in the morning, so usually in mid-tank."""
    ons, offs = switches[0::2], switches[1::2]
    rows = [
        {
            "vehicle": kind.vehicle,
            "name": "part",
            "fitted_date": pd.Timestamp(dates[on]),
            "fitted_km": odometer_before[on],
            "removed_date": pd.Timestamp(dates[offs[i]]) if i < len(offs) else pd.NaT,
            "removed_km": odometer_before[offs[i]] if i < len(offs) else np.nan,
            "level": np.nan,
            "target_percent": kind.target_percent,
        }
        for i, on in enumerate(ons)
    ]
    return pd.DataFrame(rows)
