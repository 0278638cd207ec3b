"""Several parts in one log: separate where they were apart, one answer where they never were, variants compared."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import studentized_range

import energytrack as et
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference.comparison import compare, equicoordinate_quantile
from tests.fitted import Period, fit_parts
from tests.simulation import SimulatedLog, simulate
from tests.uses import DELIVERY_VAN


def plain_log(seed: int = 1, fillings: int = 120) -> SimulatedLog:
    quiet = replace(DELIVERY_VAN, shift_percent=0.0, drift_weeks_percent=0.3, drift_seasons_percent=0.2)
    return simulate(replace(quiet, fillings=fillings), np.random.default_rng(seed))


def test_overlapping_parts_are_separated_and_added_up() -> None:
    log = plain_log()
    entries, parts = fit_parts(log, [Period("skirts", 30, 119, -0.05), Period("tyres", 60, 119, 0.04)])
    skirts, tyres = (et.assess(entries, parts, name, capacity=75.0) for name in ("skirts", "tyres"))
    assert skirts.verdict == tyres.verdict == "shifted"
    assert skirts.interval_percent[0] < -5 < skirts.interval_percent[1] < 0
    assert 0 < tyres.interval_percent[0] < 4 < tyres.interval_percent[1]
    both = skirts.together
    assert [effect.name for effect in both.each] == ["skirts", "tyres"]
    total = (1 - 0.05) * (1 + 0.04) - 1
    low, high = both.all_at_once.interval_percent
    assert low < 100 * total < high
    assert both.all_at_once.shift_percent == pytest.approx(sum(e.shift_percent for e in both.each), abs=1e-6)


def test_parts_never_apart_get_one_answer_for_both() -> None:
    log = plain_log(2)
    entries, parts = fit_parts(log, [Period("skirts", 50, 119, -0.07), Period("tyres", 50, 119, 0.0)])
    answer = et.assess(entries, parts, "skirts", capacity=75.0)
    assert answer.never_apart == ("tyres",)
    assert answer.verdict == "shifted"
    assert "never apart" in answer.warnings[0]
    assert "only one of them" in answer.warnings[0]
    assert answer.together is None
    alone = et.assess(entries, parts.head(1), "skirts", capacity=75.0)
    assert answer.shift_percent == pytest.approx(alone.shift_percent, abs=1e-9)


def test_parts_once_apart_are_not_lumped() -> None:
    log = plain_log(3)
    entries, parts = fit_parts(log, [Period("skirts", 50, 119, -0.07), Period("tyres", 50, 80, 0.0)])
    answer = et.assess(entries, parts, "skirts", capacity=75.0)
    assert answer.never_apart == ()
    assert answer.interval_percent[0] < -7 < answer.interval_percent[1]


VARIANTS = [Period("dam A", 20, 45, -0.02), Period("dam B", 45, 80, -0.08), Period("dam C", 80, 119, -0.02)]


def test_three_variants_pair_by_pair() -> None:
    entries, parts = fit_parts(plain_log(4), VARIANTS)
    found = compare(entries, parts, capacity=75.0)
    assert len(found.pairs) == 6
    pairs = {(pair.one, pair.other): pair for pair in found.pairs}
    ab, bc = pairs["dam A", "dam B"], pairs["dam B", "dam C"]
    assert ab.differs
    assert ab.interval_percent[0] < 6 < ab.interval_percent[1]
    assert bc.differs
    assert bc.interval_percent[0] < -6 < bc.interval_percent[1]
    assert not pairs["dam A", "dam C"].differs
    assert found.standings[0].name == "dam B"
    assert found.standings[0].chance_best > 0.95
    assert sum(standing.chance_best for standing in found.standings) == pytest.approx(1.0)


def test_simultaneous_ranges_are_wider_than_single_ones() -> None:
    entries, parts = fit_parts(plain_log(4), VARIANTS)
    alone = et.assess(entries, parts, "dam B", capacity=75.0)
    pair = next(p for p in compare(entries, parts, capacity=75.0).pairs if p.one == "dam B" and p.other != "dam C")
    width = pair.interval_percent[1] - pair.interval_percent[0]
    assert width > 1.05 * (alone.interval_percent[1] - alone.interval_percent[0])


@pytest.mark.parametrize("groups", [3, 4, 6])
def test_quantile_over_pairs_is_that_of_the_studentized_range(groups: int) -> None:
    """Equal lengths, known noise: Tukey's q / sqrt(2) (scipy.stats.studentized_range, infinite degrees of freedom)."""
    pairs = [(i, j) for i in range(groups) for j in range(i)]
    contrasts = np.array([np.eye(groups)[i] - np.eye(groups)[j] for i, j in pairs])
    ours = equicoordinate_quantile(contrasts @ contrasts.T, 0.05)
    assert ours == pytest.approx(studentized_range.ppf(0.95, groups, np.inf) / np.sqrt(2), rel=0.005)


def test_comparisons_that_cannot_be_made_are_refused() -> None:
    entries, parts = fit_parts(plain_log(5, 60), [Period("A", 20, 59, 0.0), Period("B", 20, 59, 0.0)])
    with pytest.raises(InferenceError, match="never apart"):
        compare(entries, parts, capacity=75.0)
    with pytest.raises(InferenceError, match="at least two"):
        compare(entries, parts, ["A"], capacity=75.0)
    with pytest.raises(UnknownNameError, match="A, B"):
        compare(entries, parts, ["A", "X"], capacity=75.0)


def test_variants_never_on_together_have_no_effect_all_at_once() -> None:
    log = plain_log(3)
    entries, parts = fit_parts(log, [Period("short", 30, 60, -0.02), Period("long", 60, 119, -0.05)])
    both = et.assess(entries, parts, "long", capacity=75.0, every_look=False).together
    assert [effect.name for effect in both.each] == ["long", "short"]
    assert both.all_at_once is None
