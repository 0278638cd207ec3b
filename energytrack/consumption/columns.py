"""One column of a data frame as a list of plain values; an absent column is an empty one."""

from __future__ import annotations

import datetime as dt
import math
from collections.abc import Callable
from types import MappingProxyType
from typing import Any, TypeVar

import numpy as np
import pandas as pd

from energytrack.errors import ConsumptionError
from energytrack.logbook.records import KINDS

FLAGS = MappingProxyType(
    {"yes": True, "y": True, "true": True, "1": True, "no": False, "n": False, "false": False, "0": False}
)

Value = TypeVar("Value")


def numbers(frame: pd.DataFrame, name: str) -> list[float | None]:
    """Numbers, None where empty or infinite. Raises ConsumptionError."""
    if name not in frame:
        return [None] * len(frame)
    try:
        values = pd.to_numeric(frame[name]).to_numpy(dtype=np.float64, na_value=math.nan)
    except (ValueError, TypeError) as problem:
        raise ConsumptionError(f"column {name!r} has a value that is not a number: {problem}") from problem
    return [value if math.isfinite(value) else None for value in values.tolist()]


def texts(frame: pd.DataFrame, name: str, default: str) -> list[str]:
    """Text, the default where empty."""
    return _converted(frame, name, lambda value: value if isinstance(value, str) else str(value), default)


def dates(frame: pd.DataFrame, name: str, *, required: bool = False) -> list[Any]:
    """Dates of ISO 8601 text, dates or timestamps; None where empty, unless required. Raises ConsumptionError."""
    values = _converted(frame, name, _date, None)
    if required and None in values:
        row = frame.index[values.index(None)]
        raise ConsumptionError(f"row {row} has no {name}; every row needs one, written as 2026-05-03")
    return values


def flags(frame: pd.DataFrame, name: str, default: bool) -> list[bool]:
    """yes/no, true/false or 1/0, the default where empty. Raises ConsumptionError."""
    return _converted(frame, name, _flag, default)


def kinds(frame: pd.DataFrame) -> list[str]:
    """fill-up or charge; fill-up where empty. Raises ConsumptionError."""
    found = texts(frame, "kind", KINDS[0])
    wrong = set(found) - set(KINDS)
    if wrong:
        raise ConsumptionError(f"kind {min(wrong)!r} is unknown; write {' or '.join(KINDS)}")
    return found


def _converted(frame: pd.DataFrame, name: str, convert: Callable[[Any], Value], default: Value) -> list[Value]:
    """Convert a column value by value; an absent column or an empty value gives the default."""
    if name not in frame:
        return [default] * len(frame)
    column = frame[name]
    empty = (column.isna() | (column == "")).tolist()
    try:
        return [
            default if missing else convert(value) for missing, value in zip(empty, column.tolist(), strict=True)
        ]
    except (ValueError, TypeError) as problem:
        raise ConsumptionError(f"column {name!r}: {problem}") from problem


def _date(value: Any) -> dt.date:
    if isinstance(value, dt.datetime):  # a pandas Timestamp is one
        return value.date()
    if isinstance(value, dt.date):
        return value
    text = str(value).strip()
    return dt.date.fromisoformat(text) if len(text) <= 10 else dt.datetime.fromisoformat(text).date()


def _flag(value: Any) -> bool:
    if isinstance(value, bool):
        return value
    text = f"{value:g}" if isinstance(value, (int, float)) else str(value).strip().lower()
    if text not in FLAGS:
        raise ValueError(f"{value!r} is neither yes nor no")
    return FLAGS[text]
