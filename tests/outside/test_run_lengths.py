"""Cumulative sums against published run lengths, and the monitor's errors against statsmodels' recursive residuals."""

from __future__ import annotations

from math import sqrt

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.stats.diagnostic import recursive_olsresiduals

from energytrack.inference.watch.monitor import Segment, learn, predict, start
from energytrack.inference.watch.runs import average_run_length, chances_to_run, threshold_for

# Montgomery, Introduction to statistical quality control: two-sided cumulative sum with reference value 0.5 and
# threshold 4 and 5. Shift in sd -> average run length. From memory.
PRINTED = {4: {0.0: 168.0, 1.0: 8.38}, 5: {0.0: 465.0, 1.0: 10.4}}

REC_CUSUM_OF_NILE = 2.06692088890315  # R 4.2.2, strucchange 1.5.3: sctest(efp(Nile ~ 1, type = "Rec-CUSUM"))


@pytest.mark.parametrize("threshold", PRINTED)
@pytest.mark.parametrize("shift", [0.0, 1.0])
def test_run_lengths_as_printed(threshold: int, shift: float) -> None:
    both = [average_run_length(0.5, threshold, sign * shift) for sign in (1, -1)]
    assert 1 / sum(1 / length for length in both) == pytest.approx(PRINTED[threshold][shift], rel=0.005)


def test_run_length_near_the_approximation_of_siegmund() -> None:
    """Siegmund (1985): (exp(2 k b) - 2 k b - 1) / (2 k^2) with b = h + 1.166, good to a few percent."""
    for reference, threshold in ((0.25, 6.0), (0.5, 4.0)):
        b = threshold + 1.166
        approximate = (np.exp(2 * reference * b) - 2 * reference * b - 1) / (2 * reference**2)
        assert average_run_length(reference, threshold) == pytest.approx(approximate, rel=0.05)


def test_threshold_gives_the_run_length_asked_for_and_doubt_raises_it() -> None:
    sure = threshold_for(0.5, 168.0)
    assert sure == pytest.approx(4.0, abs=0.02)
    assert threshold_for(0.5, 168.0, doubt=0.15) > sure + 0.05


def test_chances_add_up_to_the_mean() -> None:
    running = chances_to_run(0.5, 4.0, [1.0] * 400)
    assert running.sum() == pytest.approx(average_run_length(0.5, 4.0, 1.0), rel=1e-3)


def test_prediction_errors_are_recursive_residuals() -> None:
    """Brown, Durbin and Evans (1975); statsmodels on its own Nile series, independent errors and a flat start."""
    flow = sm.datasets.nile.load_pandas().data["volume"].to_numpy() / 200  # so that every error is believed
    oracle = recursive_olsresiduals(sm.OLS(flow, np.ones(len(flow))).fit(), skip=1)[4]
    filtered, errors = start((1.0, 1e-9, 1e-9, 1e-9), [0.0], [1e7]), []
    for place, volume in enumerate(flow):
        step = Segment(1.0, volume, float(place), [1.0], 0.0, False, 0.0, 0.0, 0.0, "")
        moved, error, variance, reached = predict(filtered, step)
        errors.append(error / sqrt(variance))
        filtered = learn(moved, error, variance, reached)
    np.testing.assert_allclose(errors[1:], oracle[1:], rtol=1e-4, atol=1e-5)
    assert rec_cusum(200 * np.array(errors[1:])) == pytest.approx(REC_CUSUM_OF_NILE, rel=1e-4)


def rec_cusum(errors: np.ndarray) -> float:
    """Largest cumulative sum of standardised errors, relative to the line 1 + 2 t (Brown, Durbin and Evans, 1975)."""
    sums = np.cumsum(errors) / (errors.std(ddof=1) * sqrt(len(errors)))
    return float(np.max(np.abs(sums) / (1 + 2 * np.arange(1, len(errors) + 1) / len(errors))))
