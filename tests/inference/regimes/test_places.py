"""Places in segments, and what they are on the road."""

from __future__ import annotations

import datetime as dt

import numpy as np
import pandas as pd
import pytest

from energytrack.consumption.frames import observe_frames
from energytrack.inference.regimes import places as where


def a_log() -> pd.DataFrame:
    """Ten segments of 500 km and a week, with 300 km missed after the fifth."""
    km = 500.0 * np.arange(11) + 300.0 * (np.arange(11) > 5)
    days = [dt.date(2024, 1, 1) + dt.timedelta(days=7 * k) for k in range(11)]
    return pd.DataFrame({"date": days, "odometer_km": km, "energy": 30.0, "missed": np.arange(11) == 6})


def test_kilometres_and_dates() -> None:
    observed = observe_frames(a_log())[0]
    assert len(observed) == 9  # the one with the missed entry is void
    assert where.odometer(observed, 0.0) == 0.0
    assert where.odometer(observed, 2.25) == 1_125.0
    assert where.odometer(observed, 3.0) == 1_500.0
    assert where.odometer(observed, 5.0) == pytest.approx((2_500 + 3_300) / 2)  # anywhere in the gap: its middle
    assert where.odometer(observed, 9.0) == 5_300.0
    assert where.date(observed, 3.0) == "2024-01-22"
    assert where.date(observed, 3.5) in ("2024-01-25", "2024-01-26")


def test_shares_of_a_place_inside_a_segment() -> None:
    np.testing.assert_allclose(where.shares(np.array([2.25, 4.0]), 5), np.array(
        [[0, 0], [0, 0], [0.75, 0], [1, 0], [1, 1]]
    ))  # fmt: skip


@pytest.mark.parametrize(
    ("count", "trimming", "expected"),
    [(12, 0.15, 3), (40, 0.15, 6), (60, 0.15, 9), (200, 0.15, 12), (13, 0.49, 6), (12, 0.01, 3)],
)
def test_margin(count: int, trimming: float, expected: int) -> None:
    assert where.margin(count, trimming) == expected


def test_candidates_keep_their_distance_from_breaks_found() -> None:
    free = where.candidates(50, 8, (20.5,))
    assert free.min() == 8
    assert free.max() == 42
    assert np.abs(free - 20.5).min() >= 8
    assert len(where.candidates(20_000, 12)) == 200


def test_pairs_leave_a_regime_between_them() -> None:
    pairs = where.pairs(where.candidates(100, 12), 12)
    assert (pairs[:, 1] - pairs[:, 0]).min() >= 12
    assert len(np.unique(pairs)) == 24
