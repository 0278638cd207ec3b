"""Weather files: a table of days, or the daily files of the public GHCN-Daily format (NOAA).

GHCN-Daily comes in three layouts, told apart by their first line: fixed width (`.dly`, one month of one element a
line), one value a row (ID, YYYYMMDD, ELEMENT, VALUE, three flags, ...), and one day a row with a column an element
(STATION, DATE, TAVG, TMAX, TMIN, ...). Temperatures are tenths of a degree Celsius, -9999 where missing; values with a
quality flag are left out. The mean of a day is TAVG, else the mean of TMAX and TMIN.
Source: readme of GHCN-Daily (NOAA National Centers for Environmental Information).
"""

from __future__ import annotations

import datetime as dt
import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from itertools import pairwise
from pathlib import Path
from typing import Any

from energytrack.logbook.cells import CellError, date_reader
from energytrack.logbook.columns import Form, weather_readers
from energytrack.logbook.csvfile import LINE_LIMIT, BoundedLines, UnreadableTableError, open_csv
from energytrack.logbook.quantities import celsius, in_short
from energytrack.logbook.records import Problem, Weather
from energytrack.logbook.tables import Reading, read_rows, without_repeats

MEAN, HIGHEST, LOWEST = ELEMENTS = ("TAVG", "TMAX", "TMIN")
EXTREMES = ("minimum_c", "maximum_c")
MISSING = -9999
_COLDEST, _HOTTEST = -90.0, 60.0  # outside temperatures met on Earth
_FIXED = re.compile(r"([A-Za-z0-9_-]{11})(\d{4})(0[1-9]|1[0-2])([A-Z0-9]{4})")
_LONG = re.compile(r"[A-Za-z0-9_-]{11}")
_VALUE_WIDTH, _FIRST_VALUE = 8, 21  # a value of 5 characters and its three flags, for each of 31 days


@dataclass(slots=True)
class _Days:
    """Values gathered from a file of one station: element and day -> degrees Celsius."""

    reading: Reading[Weather]
    wanted: str | None  # station asked for
    station: str | None = None  # station found
    values: dict[tuple[str, dt.date], float] = field(default_factory=dict)
    lines: dict[tuple[str, dt.date], int] = field(default_factory=dict)
    flagged: int = 0

    def concerns(self, station: str) -> bool:
        """Whether a row is of the station meant. Raises UnreadableTableError where that is not clear."""
        if self.wanted is not None:
            return station == self.wanted
        if self.station not in (None, station):
            advice = f"holds several stations, {self.station} and {station} among them; say which with --station"
            raise UnreadableTableError(Problem(advice, self.reading.file))
        self.station = station
        return True

    def take(self, line: int, element: str, day: dt.date, degrees: float, quality: str) -> None:
        """Take in one value. Raises CellError for one that stands there twice or cannot be."""
        if quality.strip():
            self.flagged += 1
            return
        if not _COLDEST <= degrees <= _HOTTEST:
            raise CellError(f"{element} of {day}: {degrees:g} is no outside temperature in degrees Celsius")
        if (element, day) in self.values:
            before = self.lines[element, day]
            raise CellError(f"{element} of {day} stands in line {before} already; keep one of the two")
        self.values[element, day], self.lines[element, day] = degrees, line

    def means(self) -> Iterator[tuple[int, Weather]]:
        """Mean temperature of each day that has one."""
        for day in sorted({day for _, day in self.values}):
            found = {element: self.values.get((element, day)) for element in ELEMENTS}
            low, high, mean = found[LOWEST], found[HIGHEST], found[MEAN]
            if mean is None and low is not None and high is not None:
                mean = (low + high) / 2
            if mean is not None:
                line = next(self.lines[name, day] for name in ELEMENTS if found[name] is not None)
                yield line, Weather(day, round(mean, 2))


def read_weather_file(path: Path, form: Form, station: str | None = None) -> Reading[Weather]:
    """The days of a weather file, whichever way it is written; whatever is wrong as Problems.

    station: identifier of the one meant, for files that hold several.
    """
    reading: Reading[Weather] = Reading(str(path))
    try:
        gather = _layout(path, form)
        if gather is None:
            reading = _plain(path, form)
        else:
            _from_ghcn(gather, path, form, _Days(reading, station))
    except UnreadableTableError as error:
        reading.problems.append(error.problem)
        reading.whole = False
    if reading.whole and not reading.rows and not reading.problems:
        where = f" of station {station}" if station else ""
        reading.problems.append(Problem(f"has no day with a temperature{where}", str(path)))
        reading.whole = False
    reading.notes += _gaps([weather.date for _, weather in reading.rows])
    return reading


Gather = Callable[[Path, Form, _Days], None]


def _layout(path: Path, form: Form) -> Gather | None:
    """How a GHCN-Daily file is laid out; None for any other table."""
    table = open_csv(path, delimiter=form.delimiter, encoding=form.encoding)
    first = [cell.upper() for cell in table.header]
    if _FIXED.match(table.header[0]):
        return _fixed_width
    if {"STATION", "DATE"} <= set(first) and set(ELEMENTS) & set(first) and not form.columns:
        return _one_day_a_row
    if first[:3] == ["ID", "DATE", "ELEMENT"] or (len(first) >= 4 and _is_long(table.header)):
        return _one_value_a_row
    return None


def _is_long(cells: tuple[str, ...]) -> bool:
    return bool(_LONG.fullmatch(cells[0]) and re.fullmatch(r"\d{8}", cells[1]) and re.fullmatch(r"\w{4}", cells[2]))


def _from_ghcn(gather: Gather, path: Path, form: Form, days: _Days) -> None:
    gather(path, form, days)
    days.reading.rows = list(days.means())
    if days.flagged:
        what = "value" if days.flagged == 1 else "values"
        days.reading.notes.append(f"{days.flagged} {what} with a quality flag left out")


def _fixed_width(path: Path, form: Form, days: _Days) -> None:
    with path.open(encoding="ascii", errors="replace") as file:
        lines = BoundedLines(file, path)
        for number, line in enumerate(lines, 1):
            lines.left = LINE_LIMIT
            text = line.rstrip("\r\n")
            if not text.strip():
                continue
            head = _FIXED.match(text)
            if head is None:
                days.reading.problems.append(Problem("is no line of this format", str(path), number))
            elif head[4] in ELEMENTS and days.concerns(head[1]):
                _month(days, number, text, head)


def _month(days: _Days, number: int, text: str, head: re.Match[str]) -> None:
    """The values of one line; a day that the month does not have is missing in it."""
    for day in range(31):
        at = _FIRST_VALUE + day * _VALUE_WIDTH
        value, quality = text[at : at + 5].strip(), text[at + 6 : at + 7]
        if value in ("", str(MISSING)):
            continue
        with _told(days, number):
            days.take(number, head[4], _day(f"{head[2]}{head[3]}{day + 1:02d}"), _tenths(value), quality)


def _one_value_a_row(path: Path, form: Form, days: _Days) -> None:
    table = open_csv(path, delimiter=form.delimiter, encoding=form.encoding)
    if _is_long(table.header):
        _value_row(days, 1, list(table.header))
    for line, cells in table.rows():
        _value_row(days, line, cells)


def _value_row(days: _Days, line: int, cells: list[str]) -> None:
    row = [cell.strip() for cell in cells]
    if len(row) < 4:
        days.reading.problems.append(
            Problem(f"has {len(row)} cells; a row has station, day, element, value", days.reading.file, line)
        )
    elif row[2] in ELEMENTS and days.concerns(row[0]) and row[3] not in ("", str(MISSING)):
        with _told(days, line):
            days.take(line, row[2], _day(row[1]), _tenths(row[3]), row[5] if len(row) > 5 else "")


def _one_day_a_row(path: Path, form: Form, days: _Days) -> None:
    """Whole numbers are tenths of a degree; with a decimal point, or in degrees Fahrenheit, they are degrees."""
    table = open_csv(path, delimiter=form.delimiter, encoding=form.encoding)
    names = [name.upper() for name in table.header]
    places = {name: names.index(name) for name in ELEMENTS if name in names}
    flags = {name: names.index(f"{name}_ATTRIBUTES") for name in places if f"{name}_ATTRIBUTES" in names}
    in_degrees = form.fahrenheit or any(
        "." in cells[place] for _, cells in table.rows() for place in places.values() if place < len(cells)
    )
    date = date_reader(form.day_first, form.date_format)
    for line, cells in table.rows():
        if len(cells) != len(names):
            said = f"has {len(cells)} cells where the header has {len(names)}"
            days.reading.problems.append(Problem(said, str(path), line))
            continue
        if not days.concerns(cells[names.index("STATION")].strip()):
            continue
        for element, place in places.items():
            text = cells[place].strip()
            if text not in ("", str(MISSING)):
                with _told(days, line):
                    attributes = cells[flags[element]].split(",") if element in flags else []
                    value = _degrees(text, form) if in_degrees else _tenths(text)
                    day = date(cells[names.index("DATE")].strip())
                    days.take(line, element, day, value, attributes[1] if len(attributes) > 1 else "")


def _plain(path: Path, form: Form) -> Reading[Weather]:
    """A table with date and temperature_c, or with minimum_c and maximum_c, whose mean counts."""
    readers = weather_readers(form)
    readers |= dict.fromkeys(EXTREMES, readers["temperature_c"])
    header = {title.casefold() for title in open_csv(path, delimiter=form.delimiter, encoding=form.encoding).header}
    has_extremes = set(EXTREMES) <= header | form.columns.keys()

    def build(values: dict[str, Any]) -> Weather | None:
        if "date" not in values:
            raise CellError("has no date; write the day")
        mean = values.get("temperature_c")
        if mean is None and "minimum_c" in values and "maximum_c" in values:
            if values["minimum_c"] > values["maximum_c"]:
                raise CellError("has a minimum_c above its maximum_c; correct one of the two")
            mean = round((values["minimum_c"] + values["maximum_c"]) / 2, 2)
        return None if mean is None else Weather(values["date"], mean)

    required = ("date",) if has_extremes else ("date", "temperature_c")
    return without_repeats(read_rows(path, form, readers, required, build), lambda weather: weather.date)


class _told:
    """What is wrong with a value becomes a Problem of its line."""

    def __init__(self, days: _Days, line: int) -> None:
        self.days, self.line = days, line

    def __enter__(self) -> None:
        return None

    def __exit__(self, kind: Any, error: BaseException | None, trace: Any) -> bool:
        if not isinstance(error, CellError):
            return False
        self.days.reading.problems.append(Problem(str(error), self.days.reading.file, self.line))
        return True


def _day(text: str) -> dt.date:
    try:
        if not re.fullmatch(r"\d{8}", text):
            raise ValueError
        return dt.date(int(text[:4]), int(text[4:6]), int(text[6:]))
    except ValueError:
        raise CellError(f"{in_short(text)} is no day; it is written as 20260503") from None


def _tenths(text: str) -> float:
    if not re.fullmatch(r"[+-]?\d{1,5}", text):
        raise CellError(f"{in_short(text)} is no temperature in tenths of a degree")
    return int(text) / 10


def _degrees(text: str, form: Form) -> float:
    if not re.fullmatch(r"[+-]?\d{1,3}(\.\d*)?", text):
        raise CellError(f"{in_short(text)} is no temperature in degrees")
    return celsius(float(text)) if form.fahrenheit else float(text)


def _gaps(days: list[dt.date]) -> list[str]:
    ordered = sorted(days)
    gaps = [(one, other) for one, other in pairwise(ordered) if (other - one).days > 1]
    if not gaps:
        return []
    missing = sum((other - one).days - 1 for one, other in gaps)
    longest = max(gaps, key=lambda gap: gap[1] - gap[0])
    count = "1 day is" if missing == 1 else f"{missing} days are"
    first, last = longest[0] + dt.timedelta(1), longest[1] - dt.timedelta(1)
    span = f"{first}" if first == last else f"{first} to {last}"
    return [
        f"{count} missing between {ordered[0]} and {ordered[-1]}, such as {span}: an entry without a day of its own "
        f"there is filled in from the vehicle's other temperatures"
    ]
