"""Answers as values every JSON reader accepts: a figure that does not exist is null."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any


def without_nan(value: Any) -> Any:
    """The same value with null in the place of what JSON has no number for."""
    if isinstance(value, Mapping):
        return {str(key): without_nan(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [without_nan(item) for item in value]
    return None if isinstance(value, float) and not math.isfinite(value) else value
