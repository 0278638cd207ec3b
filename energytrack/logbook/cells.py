"""One cell of a table: text to number, date or yes/no. A CellError says what to write instead."""

from __future__ import annotations

import datetime as dt
import re
import unicodedata
from collections.abc import Callable
from functools import lru_cache

from energytrack.logbook.checks import LONGEST_TEXT
from energytrack.logbook.formulas import restored
from energytrack.logbook.quantities import LARGEST, in_short

_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?")
_ISO = re.compile(r"([0-9]{4})-([0-9]{2})-([0-9]{2})(?:[T ][0-9]{2}:[0-9]{2}\S*)?")
_PARTS = re.compile(r"([0-9]{1,2})([./-])([0-9]{1,2})\2([0-9]{4})(?:[T ][0-9]{1,2}:[0-9]{2}\S*)?")
_YES = frozenset(("yes", "y", "true", "1"))
_NO = frozenset(("no", "n", "false", "0"))


class CellError(ValueError):
    """What is wrong with the text of a cell and what to write instead."""


def text_of(text: str) -> str:
    """Free text without control characters and line breaks, and without the mark that made it inert."""
    text = restored(text)
    if len(text) > LONGEST_TEXT:
        raise CellError(f"has {len(text):,} characters; shorten it to {LONGEST_TEXT:,}")
    if text.isprintable():
        return text
    return "".join(" " if unicodedata.category(c) in ("Cc", "Zl", "Zp") else c for c in text).strip()


def yes_or_no(text: str) -> bool:
    """yes/no, y/n, true/false, 1/0."""
    word = text.lower()
    if word in _YES:
        return True
    if word in _NO:
        return False
    raise CellError(f"{in_short(text)} is neither yes nor no; write yes or no")


def number(text: str) -> float:
    """A finite number with a decimal point."""
    if _NUMBER.fullmatch(text) is None:
        raise CellError(_number_advice(text))
    value = float(text)
    if abs(value) > LARGEST:
        raise CellError(f"{in_short(text)} is beyond anything measured on a vehicle; correct it")
    return value


def _number_advice(text: str) -> str:
    if re.fullmatch(r"[+-]?[0-9]+,[0-9]+", text):
        return f"{in_short(text)} has a comma; write {text.replace(',', '.')}, or import with --decimal-comma"
    if re.fullmatch(r"[+-]?[0-9]{1,3}([, '.\u00a0\u202f][0-9]{3})+([.,][0-9]*)?", text):
        return f"{in_short(text)} has thousands separators; write the plain number, or name the mark with --thousands"
    return f"{in_short(text)} is not a number; write digits with a decimal point and no unit, such as 41.32"


def number_reader(decimal_comma: bool = False, thousands: str | None = None) -> Callable[[str], float]:
    """A reader of numbers written with the given marks; without any, `number` itself."""
    if not decimal_comma and thousands is None:
        return number
    mark = "," if decimal_comma else "."
    spaces = thousands == " "
    group = "[ \u00a0\u202f]" if spaces else re.escape(thousands or "")
    whole = rf"[0-9]+|[0-9]{{1,3}}(?:{group}[0-9]{{3}})+" if thousands else "[0-9]+"
    form = re.compile(rf"[+-]?(?:(?:{whole})(?:{re.escape(mark)}[0-9]*)?|{re.escape(mark)}[0-9]+)(?:[eE][+-]?[0-9]+)?")
    drop = re.compile(group) if thousands else None

    def read(text: str) -> float:
        if form.fullmatch(text) is None:
            stated = f"decimal mark {mark!r}" + (f", thousands mark {thousands!r}" if thousands else "")
            raise CellError(f"{in_short(text)} is not a number as stated for this file ({stated})")
        plain = drop.sub("", text) if drop else text
        return number(plain.replace(",", ".") if decimal_comma else plain)

    return read


def date_reader(day_first: bool = False, date_format: str | None = None) -> Callable[[str], dt.date]:
    """A reader of dates: ISO 8601 always; with day and month in another order where that is stated or beyond doubt."""
    if date_format is not None:
        _check_format(date_format)

    @lru_cache(maxsize=4096)
    def read(text: str) -> dt.date:
        if date_format is not None:
            try:
                return dt.datetime.strptime(text, date_format).date()
            except (ValueError, re.error):
                raise CellError(f"{in_short(text)} is not a date of the form {date_format}") from None
        if iso := _ISO.fullmatch(text):
            return _date(text, int(iso[1]), int(iso[2]), int(iso[3]))
        if parts := _PARTS.fullmatch(text):
            return _date(text, int(parts[4]), *_month_and_day(text, int(parts[1]), int(parts[3]), day_first))
        raise CellError(f"{in_short(text)} is not a date; write it as 2026-05-03, or import with --date-format")

    return read


def _month_and_day(text: str, first: int, second: int, day_first: bool) -> tuple[int, int]:
    if day_first:
        return second, first
    if first <= 12 and second <= 12 and first != second:
        raise CellError(
            f"{in_short(text)} can be read two ways; import with --day-first, or with --date-format %m/%d/%Y"
        )
    return (first, second) if first <= 12 else (second, first)


def _date(text: str, year: int, month: int, day: int) -> dt.date:
    try:
        return dt.date(year, month, day)
    except ValueError:
        read = f"year {year}, month {month}, day {day}"
        raise CellError(f"{in_short(text)} is not a day of the calendar (read as {read})") from None


def _check_format(date_format: str) -> None:
    """A usable format brings any date back. Raises CellError."""
    probe = dt.date(2026, 12, 31)
    try:
        fits = dt.datetime.strptime(probe.strftime(date_format), date_format).date() == probe
    except (ValueError, re.error):
        fits = False
    if not fits:
        wrong = f"{in_short(date_format)} does not describe a date"
        raise CellError(f"{wrong}; write one like %d.%m.%Y, %m/%d/%y or %Y%m%d")
