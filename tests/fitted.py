"""Parts put on a simulated log after the fact: entries whose energy is raised or lowered while a part is fitted."""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from tests.simulation import SimulatedLog


@dataclass(frozen=True)
class Period:
    """Entries `first` to `last` were driven with a part; `effect` is its true shift, 0.01 being one percent."""

    name: str
    first: int
    last: int
    effect: float
    level: float | None = None


def fit_parts(log: SimulatedLog, periods: list[Period]) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Entries and modifications of a log without shift, with parts fitted and removed right at entries."""
    entries = log.entries.reset_index(drop=True).copy()
    rows = []
    for period in periods:
        driven = slice(period.first + 1, period.last)
        entries.loc[driven, "energy"] *= 1 + period.effect
        removed = entries["odometer_km"].iloc[period.last] if period.last < len(entries) - 1 else None
        rows.append(
            {
                "vehicle": entries["vehicle"].iloc[0],
                "name": period.name,
                "fitted_km": entries["odometer_km"].iloc[period.first],
                "removed_km": removed,
                "level": period.level,
            }
        )
    return entries, pd.DataFrame(rows)
