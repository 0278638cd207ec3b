"""One look at the end of a log with a known shift: does the 95 % range hold it, is the estimate off, how widely?"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.special import stdtrit

from energytrack.inference.bounds import mixture_quantile
from energytrack.inference.looks import take_looks
from tests.evidence import goals, oracle
from tests.evidence.block import Block
from tests.evidence.goals import Promise
from tests.evidence.logs import QUESTION, Job, by_kind, drawn, sample
from tests.evidence.measure import Measured, middle, proportion, rate, rms
from tests.uses import DELIVERY_VAN, DRIFTING, TRIP_KM, Use

FIRST_SEED, FIRST_SEED_OF_DRIFT = 10_000, 20_000
USUAL_TANK_KM, EXPECTED_DRIFT = 500.0, 0.3  # docs/method.md: median of the prior, relative to a usual tank's noise
CELLS = (
    "range by the mixture",
    "range by Student's t",
    "range by the normal",
    "look-proof range",
    "bias, %",
    "RMSE, %",
    "mean standard error, %",
    "median freedom",
)
HEADING = ("kind of use", CELLS[0], "goal", "verdict", *CELLS[1:])
DRIFT_HEADING = ("kind of use", "drift, times the expected", *CELLS)
DRIFT_FACTORS = (0.4, 1.0, 2.0)  # of the drift that tests/uses.py gives these two kinds


@dataclass(frozen=True)
class Estimate:
    """One look's estimate against the truth. Percentages of consumption."""

    use: str
    error: float
    standard_error: float
    freedom: float
    look_proof: bool  # the range shown, as wide as the looks so far ask for, holds the truth
    oracle_error: float
    oracle_standard_error: float

    def within(self, quantile: float) -> bool:
        return abs(self.error) <= quantile * self.standard_error


def estimate(job: Job) -> Estimate:
    observed = drawn(job)
    state = take_looks(observed, QUESTION, every=False)[-1]
    known = oracle.with_noise_known(observed, job.use, state)
    truth, shift = job.use.shift_percent, state.shift
    return Estimate(
        job.use.vehicle,
        100 * shift.ratio - truth,
        100 * shift.standard_error,
        shift.freedom,
        state.interval is None or state.interval[0] <= truth / 100 <= state.interval[1],
        100 * known.ratio - truth,
        100 * known.standard_error,
    )


def promises(results: Sequence[Estimate], uses: tuple[Use, ...]) -> list[Promise]:
    covered = {name: _covered(of_kind) for name, of_kind in by_kind(results, uses).items()}
    return [Promise("the 95 % range of a single look holds the truth", goals.COVERAGE, covered)]


def block(results: Sequence[Estimate], uses: tuple[Use, ...], logs: int) -> Block:
    rows = tuple((name, *_judged(of_kind)) for name, of_kind in by_kind(results, uses).items())
    return Block("coverage", "", sample(uses, logs, FIRST_SEED), HEADING, rows)


def _judged(results: Sequence[Estimate]) -> tuple[str, ...]:
    first, *others = _cells(results)
    return first, goals.COVERAGE.words, goals.COVERAGE.verdict(_covered(results)), *others


def _covered(results: Sequence[Estimate]) -> Measured | None:
    return proportion(one.within(mixture_quantile(0.025, one.freedom)) for one in results)


def drifting_uses() -> tuple[Use, ...]:
    """The two kinds that drift more than the prior expects, with less and with more drift."""
    return tuple(_with_drift(use, factor) for use in (DRIFTING, DELIVERY_VAN) for factor in DRIFT_FACTORS)


def drift_block(results: Sequence[Estimate], uses: tuple[Use, ...], logs: int) -> Block:
    rows = []
    for use in uses:
        name = use.vehicle.partition(" ")[0]
        rows.append((name, f"{_excess(use):.1f}", *_cells([one for one in results if one.use == use.vehicle])))
    return Block("drift", "", sample(uses, logs, FIRST_SEED_OF_DRIFT), DRIFT_HEADING, tuple(rows))


def _with_drift(use: Use, factor: float) -> Use:
    return replace(
        use,
        vehicle=f"{use.vehicle} {factor:g}",
        drift_weeks_percent=factor * use.drift_weeks_percent,
        drift_seasons_percent=factor * use.drift_seasons_percent,
    )


def _excess(use: Use) -> float:
    """Drift of weeks relative to the prior's median for this trip noise."""
    return use.drift_weeks_percent / (EXPECTED_DRIFT * use.trip_percent * float(np.sqrt(TRIP_KM / USUAL_TANK_KM)))


def _cells(results: Sequence[Estimate]) -> tuple[str, ...]:
    errors = np.array([one.error for one in results])
    off = errors.std(ddof=1) / np.sqrt(len(errors)) if len(errors) > 1 else np.nan
    return (
        rate(one.within(mixture_quantile(0.025, one.freedom)) for one in results),
        rate(one.within(-float(stdtrit(one.freedom, 0.025))) for one in results),
        rate(one.within(1.96) for one in results),
        rate(one.look_proof for one in results),
        f"{errors.mean():+.2f} ± {1.96 * off:.2f}",
        f"{rms(errors):.2f}",
        f"{np.mean([one.standard_error for one in results]):.2f}",
        middle(one.freedom for one in results),
    )
