"""Rules for looks: bounds against published boundaries, and false alarms of simulated paths and logs."""

from __future__ import annotations

from concurrent.futures import ProcessPoolExecutor
from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import binom, norm

import energytrack as et
from energytrack.errors import InferenceError
from energytrack.inference import bounds, open_ended, rules
from energytrack.inference.results import Rule
from energytrack.inference.spending import SAME_LOOK, Counted, log_spent
from tests.outside.values import Reference, reference, references
from tests.simulation import SimulatedLog, simulate
from tests.uses import DELIVERY_VAN, DRIFTING, STEADY_COMMUTE, USES, Use

SPENDING = [id for id in references() if id.startswith("ld.asOF.") and id != "ld.asOF.firstlook"]
TINY = 2e-5  # cumulative error below which the reference's two-sided root is noisy: its one-sided one is taken there


def counted(shares: list[float], alpha: float = 0.05) -> list[float | None]:
    looks = Counted(alpha)
    return [looks.bound(share) for share in shares]


# Counted looks


@pytest.mark.parametrize("id", SPENDING)
def test_counted_looks_against_published_boundaries(id: str) -> None:
    """Lan and DeMets (1983), O'Brien-Fleming type, two-sided 5 %: 2 to 10 equal looks and unequal ones (R rpact)."""
    record = reference(id)
    found = counted(record.inputs["info"])
    columns = (record.values[name] for name in ("z_two_sided", "z_one_sided_.025", "cum_alpha"))
    for ours, two_sided, one_sided, spent in zip(found, *columns, strict=True):
        assert ours == pytest.approx(one_sided if spent < TINY else two_sided, abs=1e-6)


def test_the_first_look_is_exact() -> None:
    record: Reference = reference("ld.asOF.firstlook")
    for row in record.values:
        assert counted([row["t"]]) == [pytest.approx(row["first_look_z"], abs=record.tolerance)]
        assert np.exp(log_spent(row["t"], 0.05)) == pytest.approx(row["cum_alpha"], rel=1e-9)


def test_one_look_at_complete_information_is_a_single_test() -> None:
    assert counted([1.0]) == [pytest.approx(norm.ppf(0.975), abs=1e-9)]
    assert counted([1.7], alpha=0.1) == [pytest.approx(norm.ppf(0.95), abs=1e-9)]


def test_many_looks_approach_the_bound_for_looks_at_every_moment() -> None:
    last = [counted([k / n for k in range(1, n + 1)])[-1] for n in (10, 40, 160)]
    gaps = [bounds.level(0.05) - bound for bound in last if bound is not None]
    assert gaps == sorted(gaps, reverse=True)
    assert 0 < gaps[-1] < 0.06


def test_a_look_that_adds_nothing_is_the_one_before() -> None:
    first, again, back, later = counted([0.4, 0.4 + SAME_LOOK / 2, 0.3, 0.8])
    assert first == again == back
    assert later == counted([0.4, 0.8])[1]
    assert counted([0.0, 1e-4, 1e-3]) == [None, None, None]  # beyond any number


# Open-ended


def test_the_mixture_bound_against_its_closed_form() -> None:
    record = reference("robbins.bound")
    for row in record.values:
        assert open_ended.boundary(row["v"], row["rho"], row["alpha"]) == pytest.approx(
            row["bound"], rel=record.tolerance
        )


def test_the_best_rho_against_its_closed_form_and_a_numeric_minimum() -> None:
    record = reference("robbins.best_rho")
    for row in record.values:
        rho = open_ended.best_rho(row["v"], row["alpha"])
        assert rho == pytest.approx(row["rho"], rel=record.tolerance)
        assert rho == pytest.approx(row["rho_numeric"], rel=1e-6)


def test_the_mixture_bound_as_a_confidence_sequence() -> None:
    record = reference("robbins.asympCS")
    for row in record.values:
        half = open_ended.boundary(row["t"], 1 / row["r2"], row["alpha"]) / row["t"]
        assert half == pytest.approx(row["half"], rel=record.tolerance)


def test_the_open_ended_bound_is_tightest_on_the_path_at_the_information_needed() -> None:
    rho = open_ended.best_rho(1.0, 0.05)
    here = open_ended.boundary(1.0, rho, 0.05)
    assert open_ended.bound(1.0, 0.05) == here
    assert all(open_ended.boundary(1.0, rho * factor, 0.05) > here for factor in (0.8, 1.25))
    assert open_ended.bound(0.0, 0.05) is None


# Paths


def crossings(rule: Rule, shares: np.ndarray, theta: float, count: int, seed: int) -> float:
    """Share of Brownian paths with drift theta that ever leave the rule's bounds at these looks."""
    rng = np.random.default_rng(seed)
    watch = rules.watch(rule, 0.05)
    path, out, before = np.zeros(count), np.zeros(count, dtype=bool), 0.0
    for share in shares:
        path += theta * (share - before) + rng.standard_normal(count) * np.sqrt(share - before)
        bound, before = watch(share), share
        out |= np.abs(path) > (np.inf if bound is None else bound * np.sqrt(share))
    return float(out.mean())


@pytest.mark.parametrize("looks", [1, 3, 12])
def test_counted_looks_spend_the_whole_error_and_no_more(looks: int) -> None:
    shares = np.sort(np.append(np.random.default_rng(looks).uniform(0.05, 0.97, looks - 1), 1.0))
    assert crossings("counted", shares, 0.0, 200_000, seed=looks) == pytest.approx(0.05, abs=0.0017)  # 3.5 sd


def test_an_open_ended_watch_stays_below_its_error_far_beyond_the_information_needed() -> None:
    shares = np.geomspace(1e-3, 50.0, 400)
    alarms = crossings("open-ended", shares, 0.0, 20_000, seed=5)
    assert 0.02 < alarms < 0.05
    assert crossings("every-look", shares, 0.0, 20_000, seed=5) > 0.15  # the bound with an end, watched past its end


def test_an_open_ended_watch_finds_the_target_with_the_stated_power() -> None:
    theta = rules.drift("open-ended", 0.05, 0.80)
    assert theta == pytest.approx(3.8767, abs=5e-5)
    assert 0.80 < crossings("open-ended", np.linspace(0.005, 1.0, 200), theta, 20_000, seed=6) < 0.88


def test_counted_looks_find_the_target_at_least_with_the_stated_power() -> None:
    theta = rules.drift("counted", 0.05, 0.80)
    assert crossings("counted", np.linspace(0.1, 1.0, 10), theta, 40_000, seed=7) > 0.80


def test_unknown_rules_are_refused() -> None:
    log = drawn(STEADY_COMMUTE, 1)
    with pytest.raises(InferenceError, match="every-look, counted, open-ended"):
        et.assess(log.entries, log.modifications, "part", rule="sometimes")  # type: ignore[arg-type]


# Logs


def drawn(use: Use, seed: int, **changes: object) -> SimulatedLog:
    return simulate(replace(use, **changes), np.random.default_rng(seed))  # type: ignore[arg-type]


def asked(log: SimulatedLog, rule: Rule, taken: tuple[float, ...] = ()) -> et.Assessment:
    use = log.truth.use
    return et.assess(
        log.entries, log.modifications, "part", unit=use.unit, capacity=use.capacity, rule=rule, looks_taken=taken
    )


def every_third(log: SimulatedLog) -> tuple[float, ...]:
    fitted = log.modifications["fitted_km"].iloc[0]
    odometer = log.entries["odometer_km"]
    return tuple(odometer[odometer > fitted].iloc[2::3])


def alarm(case: tuple[str, Rule, int]) -> bool:
    name, rule, seed = case
    log = drawn(next(use for use in USES if use.vehicle == name), seed, shift_percent=0.0)
    return asked(log, rule, every_third(log)).verdict == "shifted"


@pytest.mark.parametrize("rule", ["counted", "open-ended"])
def test_no_shift_is_claimed_where_there_is_none(rule: Rule) -> None:
    """A tool that errs at its nominal 5 % exceeds the limit with a chance of one in a thousand."""
    cases = [(use.vehicle, rule, seed) for use in (STEADY_COMMUTE, DRIFTING) for seed in range(8)]
    with ProcessPoolExecutor(2) as pool:
        alarms = sum(pool.map(alarm, cases, chunksize=4))
    assert alarms <= binom.isf(1e-3, len(cases), 0.05)


def test_only_looks_that_were_taken_count() -> None:
    log = drawn(DELIVERY_VAN, 3, shift_percent=-2.0)
    taken = every_third(log)
    alone, thirds, every = asked(log, "counted"), asked(log, "counted", taken), asked(log, "every-look")
    assert (alone.rule, every.rule) == ("counted", "every-look")
    assert len(alone.looks) == 1
    assert len(thirds.looks) == len([km for km in taken if km >= thirds.looks[0].odometer_km - 0.5]) + (
        taken[-1] < every.looks[-1].odometer_km
    )
    by_place = {look.odometer_km: look for look in every.looks}
    for look in thirds.looks:
        one, other = look.bound, by_place[look.odometer_km].bound
        assert one is None or (other is not None and one < other)  # fewer looks, a lower bound


def test_looks_taken_elsewhere_belong_to_the_segment_closed_by_then() -> None:
    log = drawn(DELIVERY_VAN, 3)
    end = asked(log, "every-look").looks[20].odometer_km
    looks = asked(log, "counted", (end + 40.0, end + 55.0, 1.0)).looks
    assert [look.odometer_km for look in looks[:-1]] == [end]


def test_an_open_ended_watch_never_closes_without_a_shift() -> None:
    """The same log closes under the rule with an end."""
    log = drawn(DELIVERY_VAN, 6, shift_percent=0.0, fillings=300)
    closed, watched = asked(log, "every-look"), asked(log, "open-ended")
    assert closed.settled_at_km is not None
    assert watched.rule == "open-ended"
    assert watched.verdict == "not-yet"
    assert watched.settled_at_km is None
    assert watched.distance_to_go_km is not None
    assert watched.distance_expected_km is None
    assert watched.information_fraction < closed.information_fraction or watched.information_fraction == 1.0
    wider = (watched.interval_percent[1] - watched.interval_percent[0]) / watched.standard_error_percent
    assert wider > (closed.interval_percent[1] - closed.interval_percent[0]) / closed.standard_error_percent


def test_an_open_ended_watch_settles_a_large_shift() -> None:
    answer = asked(drawn(DELIVERY_VAN, 4, shift_percent=-9.0), "open-ended")
    assert answer.verdict == "shifted"
    assert answer.interval_percent[0] < -9.0 < answer.interval_percent[1] < 0


def test_an_open_ended_watch_of_a_hopeless_target_is_not_yet() -> None:
    log = drawn(DRIFTING, 2)
    use = log.truth.use
    answer = et.assess(
        log.entries, log.modifications, "part", capacity=use.capacity, target_percent=0.3, rule="open-ended"
    )
    assert answer.verdict == "not-yet"
    assert answer.distance_to_go_km is None
