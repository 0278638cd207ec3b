"""Data frames with the columns of the tables, into records and back; and a logbook that hands out frames."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from energytrack.consumption.columns import dates, flags, kinds, numbers, texts
from energytrack.consumption.observations import Observations, observe
from energytrack.consumption.segments import SegmentedLog, close_segments
from energytrack.consumption.two_carriers import TwoCarriers, close_two_carriers
from energytrack.errors import ConsumptionError, EntryError, UnknownNameError
from energytrack.logbook.checks import check_known
from energytrack.logbook.opening import Logbook
from energytrack.logbook.opening import open_logbook as open_plain
from energytrack.logbook.records import UNITS, Entry, Event, Modification, Vehicle, Weather

ENTRY_COLUMNS = (
    *("vehicle", "date", "odometer_km", "energy", "kind", "full", "level_percent", "missed", "distance_km"),
    *("cost", "currency", "temperature_c", "speed_kmh", "place", "note", "confirmed"),
)
MODIFICATION_COLUMNS = (
    *("vehicle", "name", "fitted_date", "fitted_km", "removed_date", "removed_km"),
    *("level", "target_percent", "known_low_percent", "known_high_percent", "reversible", "note"),
)
EVENT_COLUMNS = ("vehicle", "date", "odometer_km", "what", "odometer_factor", "note")
WEATHER_COLUMNS = ("date", "temperature_c")
VEHICLE_COLUMNS = (
    *("name", "carrier", "unit", "capacity", "distance_unit", "display", "typed_unit"),
    *("second_carrier", "second_unit", "second_capacity", "co2_kg", "second_co2_kg", "note"),
)
MOST_PROBLEMS = 5  # named one by one in the notes
DATES = ("date", "fitted_date", "removed_date")
NUMBERS = (
    *("odometer_km", "energy", "level_percent", "distance_km", "cost", "temperature_c", "speed_kmh"),
    *("fitted_km", "removed_km", "level", "target_percent", "odometer_factor", "capacity"),
    *("known_low_percent", "known_high_percent", "second_capacity", "co2_kg", "second_co2_kg"),
)

class FramedLogbook:
    """A logbook whose tables are data frames with the columns of the CSV tables."""

    def __init__(self, logbook: Logbook) -> None:
        self._logbook = logbook
        self.path = logbook.path

    def vehicles(self) -> pd.DataFrame:
        """One row a vehicle."""
        frame = records_to_frame(self._logbook.vehicles(), VEHICLE_COLUMNS)
        return frame.rename(columns={"name": "vehicle"})

    def entries(self, vehicle: str) -> pd.DataFrame:
        """Entries in driving order, further numeric columns included. Raises UnknownNameError."""
        return entries_to_frame(self._logbook.entries(self._known(vehicle)))

    def modifications(self, vehicle: str) -> pd.DataFrame:
        """One row a period in which a modification was fitted. Raises UnknownNameError."""
        return records_to_frame(self._logbook.modifications(self._known(vehicle)), MODIFICATION_COLUMNS)

    def events(self, vehicle: str) -> pd.DataFrame:
        """Raises UnknownNameError."""
        return records_to_frame(self._logbook.events(self._known(vehicle)), EVENT_COLUMNS)

    def weather(self) -> pd.DataFrame:
        """One row a day."""
        return records_to_frame(self._logbook.weather(), WEATHER_COLUMNS)

    def _known(self, vehicle: str) -> str:
        return self._logbook.vehicle(vehicle).name


def open_logbook(path: str | Path) -> FramedLogbook:
    """Open a logbook file or a folder of CSV tables; its tables come as data frames. Raises LogbookError."""
    return FramedLogbook(open_plain(Path(path)))


def entries_to_frame(entries: Sequence[Entry]) -> pd.DataFrame:
    """A frame with the columns of the entries table, and one for each further numeric column."""
    frame = records_to_frame(entries, ENTRY_COLUMNS)
    for name in dict.fromkeys(name for entry in entries for name in entry.extra):
        frame[name] = np.array([entry.extra.get(name, math.nan) for entry in entries], dtype=np.float64)
    return frame


def entries_from_frame(frame: pd.DataFrame, vehicle: str | None = None) -> list[Entry]:
    """Entries of a frame with the columns of the entries table; unknown numeric columns become `extra`.

    vehicle: only its rows, where the frame has a vehicle column. Raises ConsumptionError for a missing column, a row
    without a date, or a value that cannot be read; UnknownNameError for a vehicle without rows.
    """
    rows = _rows_of(frame, vehicle)
    if rows.empty and not frame.empty:
        names = ", ".join(sorted(map(str, frame["vehicle"].unique())))
        raise UnknownNameError(f"no entries of a vehicle {vehicle!r}; there are entries of: {names}")
    _require(rows, "entries", "date", "energy")
    if "odometer_km" not in rows and "distance_km" not in rows:
        raise ConsumptionError("entries have neither a column 'odometer_km' nor 'distance_km'; give one of them")
    columns = zip(
        texts(rows, "vehicle", vehicle or "vehicle"),
        dates(rows, "date", required=True),
        [math.nan if value is None else value for value in numbers(rows, "energy")],
        numbers(rows, "odometer_km"),
        kinds(rows),
        flags(rows, "full", True),
        numbers(rows, "level_percent"),
        flags(rows, "missed", False),
        numbers(rows, "distance_km"),
        numbers(rows, "cost"),
        [text or None for text in texts(rows, "currency", "")],
        numbers(rows, "temperature_c"),
        numbers(rows, "speed_kmh"),
        texts(rows, "place", ""),
        texts(rows, "note", ""),
        _extras(rows),
        flags(rows, "confirmed", False),
        strict=True,
    )
    return [Entry(*values) for values in columns]


def modifications_from_frame(frame: pd.DataFrame, vehicle: str | None = None) -> list[Modification]:
    """Fitting periods of a frame, only those of `vehicle` where it has a vehicle column. Raises ConsumptionError."""
    rows = _rows_of(frame, vehicle)
    _require(rows, "modifications", "name")
    columns = zip(
        texts(rows, "vehicle", vehicle or "vehicle"),
        texts(rows, "name", ""),
        dates(rows, "fitted_date"),
        numbers(rows, "fitted_km"),
        dates(rows, "removed_date"),
        numbers(rows, "removed_km"),
        numbers(rows, "level"),
        numbers(rows, "target_percent"),
        texts(rows, "note", ""),
        _known(rows),
        flags(rows, "reversible", True),
        strict=True,
    )
    return [Modification(*values) for values in columns]


def _known(rows: pd.DataFrame) -> list[tuple[float, float] | None]:
    found: list[tuple[float, float] | None] = []
    ends = zip(numbers(rows, "known_low_percent"), numbers(rows, "known_high_percent"), strict=True)
    for low, high in ends:
        if (low is None) != (high is None):
            raise ConsumptionError("a known change has one end: fill in known_low_percent and known_high_percent")
        if low is None or high is None:
            found.append(None)
            continue
        try:
            check_known(low, high)
        except EntryError as error:
            raise ConsumptionError(str(error)) from None
        found.append((low, high))
    return found


def events_from_frame(frame: pd.DataFrame, vehicle: str | None = None) -> list[Event]:
    """Events of a frame, only those of `vehicle` where it has a vehicle column. Raises ConsumptionError."""
    rows = _rows_of(frame, vehicle)
    _require(rows, "events", "date", "what")
    columns = zip(
        texts(rows, "vehicle", vehicle or "vehicle"),
        dates(rows, "date", required=True),
        texts(rows, "what", ""),
        numbers(rows, "odometer_km"),
        numbers(rows, "odometer_factor"),
        texts(rows, "note", ""),
        strict=True,
    )
    return [Event(*values) for values in columns]


def weather_from_frame(frame: pd.DataFrame) -> list[Weather]:
    """Days with a temperature. Raises ConsumptionError for a missing column or a value that cannot be read."""
    _require(frame, "weather", "date", "temperature_c")
    days = zip(dates(frame, "date", required=True), numbers(frame, "temperature_c"), strict=True)
    return [Weather(day, temperature) for day, temperature in days if temperature is not None]


def observe_frames(
    entries: pd.DataFrame,
    modifications: pd.DataFrame | None = None,
    *,
    events: pd.DataFrame | None = None,
    weather: pd.DataFrame | None = None,
    capacity: float | None = None,
    unit: str = "L",
    covariates: Sequence[str] | None = None,
    two_carriers: TwoCarriers | None = None,
) -> tuple[Observations, tuple[str, ...]]:
    """One vehicle's tables as arrays over its segments, and notes on what was estimated or is void.

    Raises as observe_log does.
    """
    observed, notes, _ = observe_log(
        entries,
        modifications,
        events=events,
        weather=weather,
        capacity=capacity,
        unit=unit,
        covariates=covariates,
        two_carriers=two_carriers,
    )
    return observed, notes


def observe_log(
    entries: pd.DataFrame,
    modifications: pd.DataFrame | None = None,
    *,
    events: pd.DataFrame | None = None,
    weather: pd.DataFrame | None = None,
    capacity: float | None = None,
    unit: str = "L",
    covariates: Sequence[str] | None = None,
    two_carriers: TwoCarriers | None = None,
) -> tuple[Observations, tuple[str, ...], SegmentedLog]:
    """One vehicle's tables as arrays over its segments, notes on what was estimated or is void, and the segments.

    two_carriers: of a vehicle with tank and battery; energies are then in kWh, and capacity and unit do not count.

    Raises ConsumptionError for missing columns, unreadable values, entries of several vehicles, or modification
    periods that contradict each other; UnknownNameError for a covariate no entry has.
    """
    if unit not in UNITS:
        raise ConsumptionError(f"unit {unit!r} is unknown; use one of {', '.join(UNITS)}")
    logged = entries_from_frame(entries)
    vehicle = the_vehicle(logged) if logged and "vehicle" in entries else None
    happened = [] if events is None else events_from_frame(events, vehicle)
    if two_carriers is None:
        segmented = close_segments(logged, happened, capacity=capacity, unit=unit)
    else:
        segmented = close_two_carriers(logged, happened, two_carriers)
    observed = observe(
        segmented,
        [] if modifications is None else modifications_from_frame(modifications, vehicle),
        tuple(covariates or ()),
        [] if weather is None else weather_from_frame(weather),
    )
    return observed, _notes(segmented), segmented


def _notes(segmented: SegmentedLog) -> tuple[str, ...]:
    notes = []
    reasons = Counter(span.reason for span in segmented.void)
    if reasons:
        counted = ", ".join(f"{reason} ({count})" for reason, count in reasons.most_common())
        spans = "1 span" if len(segmented.void) == 1 else f"{len(segmented.void)} spans"
        notes.append(f"{spans} between known levels set aside: {counted}")
    if segmented.capacity_is_estimated and any(entry.level_percent is not None for entry in segmented.entries):
        notes.append(f"capacity is not given: {segmented.capacity:.1f} {segmented.unit} estimated from the purchases")
    problems = [str(problem) for problem in segmented.problems]
    if len(problems) > MOST_PROBLEMS:
        problems[MOST_PROBLEMS:] = [f"and {len(problems) - MOST_PROBLEMS} more problems of this kind"]
    return (*notes, *problems)


def the_vehicle(entries: Sequence[Entry]) -> str:
    """The one vehicle the entries are of. Raises ConsumptionError where there are none or several."""
    names = sorted({entry.vehicle for entry in entries})
    if len(names) != 1:
        found = f"of several vehicles ({', '.join(names)})" if names else "empty"
        raise ConsumptionError(f"the entries are {found}; pass the rows of one vehicle")
    return names[0]


def records_to_frame(
    records: Sequence[Entry | Modification | Event | Weather | Vehicle], columns: Sequence[str]
) -> pd.DataFrame:
    """One row a record, in columns of the tables."""
    data: dict[str, Any] = {}
    for name in columns:
        values = [getattr(record, name) for record in records]
        if name in DATES:
            data[name] = np.array(values, dtype="datetime64[s]")
        elif name in NUMBERS:
            data[name] = np.array(values, dtype=np.float64)  # None becomes NaN
        else:
            data[name] = values
    return pd.DataFrame(data, columns=list(columns))


def _rows_of(frame: pd.DataFrame, vehicle: str | None) -> pd.DataFrame:
    if vehicle is None or "vehicle" not in frame:
        return frame
    return frame[frame["vehicle"] == vehicle]


def _require(frame: pd.DataFrame, table: str, *columns: str) -> None:
    missing = [name for name in columns if name not in frame]
    if missing:
        there = ", ".join(map(str, frame.columns)) or "none"
        raise ConsumptionError(f"{table} lack the column {missing[0]!r}; columns found: {there}")


def _extras(frame: pd.DataFrame) -> list[dict[str, float]]:
    names = [name for name in frame if name not in ENTRY_COLUMNS and pd.api.types.is_numeric_dtype(frame[name])]
    extras: list[dict[str, float]] = [{} for _ in range(len(frame))]
    for name in names:
        for extra, value in zip(extras, numbers(frame, str(name)), strict=True):
            if value is not None:
                extra[str(name)] = value
    return extras
