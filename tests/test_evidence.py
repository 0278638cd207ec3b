"""The evidence document holds what its scripts measure: same blocks, same columns, every one filled."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import bootstrap

from energytrack.inference.looks import take_looks
from energytrack.inference.noise import Scatter
from tests.dense import dense_covariance
from tests.documents import ROOT
from tests.evidence import goals
from tests.evidence.block import Block
from tests.evidence.coverage import estimate
from tests.evidence.document import DOCUMENT, measured, put
from tests.evidence.goals import Goal, Promise
from tests.evidence.logs import QUESTION, Job, drawn, jobs
from tests.evidence.measure import Measured, median, rate, resampled, rms
from tests.evidence.oracle import true_theta, with_noise_known
from tests.simulation import simulate
from tests.uses import ELECTRIC, HOUSEHOLD, STEADY_COMMUTE, USES, Use

SHAM_COLUMNS = {"energy": "energy_litres", "speed_kmh": "mean_speed_kmh"}


def blocks_of_document() -> dict[str, str]:
    return measured(DOCUMENT.read_text(encoding="utf-8"))


def empty_copy(folder: Path) -> Path:
    """The document with nothing between its markers."""
    path = folder / "evidence.md"
    text = DOCUMENT.read_text(encoding="utf-8")
    path.write_text(re.sub(r"(<!-- measured: .+ -->\n)(?:.|\n)*?(?=<!-- end -->)", r"\1", text), encoding="utf-8")
    return path


def run(*arguments: str) -> str:
    command = [sys.executable, "-m", "tests.evidence", *arguments]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, encoding="utf-8", timeout=600, check=False)
    assert done.returncode == 0, done.stderr
    return done.stdout


@pytest.fixture(scope="module")
def tried(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    """The blocks as the scripts write them from one simulated log, which also stands in for the real ones."""
    folder = tmp_path_factory.mktemp("evidence")
    path = empty_copy(folder)
    assert set(measured(path.read_text(encoding="utf-8")).values()) == {""}
    log = simulate(STEADY_COMMUTE, np.random.default_rng(3)).entries.iloc[:90]
    log["distance_km"] = log["odometer_km"].diff()
    sham = log[["date", "distance_km", *SHAM_COLUMNS, "temperature_c"]].rename(columns=SHAM_COLUMNS)
    sham.iloc[1:].to_csv(folder / "invented.csv", index=False)
    run("--logs", "1", "--kind", "steady-commute", "--sham", str(folder), "--write", "--document", str(path))
    return measured(path.read_text(encoding="utf-8"))


def test_the_scripts_fill_every_block_of_the_document(tried: dict[str, str]) -> None:
    assert [name for name, content in tried.items() if not content] == []


def test_the_documents_columns_are_those_of_the_scripts(tried: dict[str, str]) -> None:
    first_lines = {name: content.splitlines()[:2] for name, content in blocks_of_document().items()}
    assert first_lines == {name: content.splitlines()[:2] for name, content in tried.items()}


def test_every_block_of_the_document_is_measured() -> None:
    blocks = blocks_of_document()
    assert len(blocks) >= 10
    for name, content in blocks.items():
        *table, _, source = content.splitlines()
        assert len(table) > 3, name
        assert source.startswith("`python -m tests.evidence"), name


def test_quantiles_are_those_the_program_uses_now(tried: dict[str, str]) -> None:
    assert blocks_of_document()["quantiles"] == tried["quantiles"]


def test_a_table_stands_between_markers_only() -> None:
    outside = re.sub(r"<!-- measured: .+ -->\n(?:.|\n)*?<!-- end -->", "", DOCUMENT.read_text(encoding="utf-8"))
    assert [line for line in outside.splitlines() if line.startswith("|")] == []


def test_an_unknown_block_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "a.md"
    path.write_text("<!-- measured: one -->\n<!-- end -->\n", encoding="utf-8")
    put(Block("one", "x", "none", ("a",), (("1",),)), path)
    assert "| a |\n| --- |\n| 1 |" in measured(path.read_text(encoding="utf-8"))["one"]
    with pytest.raises(ValueError, match="no block 'two'"):
        put(Block("two", "x", "none", ("a",), (("1",),)), path)


def test_sampling_range_of_a_rate() -> None:
    """Wilson's interval by hand (Brown, Cai and DasGupta, 2001, eq. 4): (2 + 1.92 -/+ 3.26) / (20 + 3.84)."""
    assert rate([True] * 2 + [False] * 18) == "10 % [3, 30]"
    assert rate([True, False] * 20, independent=4) == "50 % [15, 85]"
    assert rate([]) == "-"


def test_a_goal_is_met_by_the_figure_and_missed_for_sure_only_beyond_sampling() -> None:
    goal = Goal("94 to 98 %", 0.94, 0.98)
    assert goal.verdict(Measured(0.95, 0.90, 0.99)) == "met"
    assert goal.verdict(Measured(0.93, 0.90, 0.95)) == "missed, within sampling"
    assert goal.verdict(Measured(0.90, 0.86, 0.93)) == "missed"
    assert goal.verdict(Measured(0.995, 0.985, 1.0)) == "missed"
    assert goal.verdict(None) == "-"


def test_a_promise_names_the_kinds_that_miss_it_though_all_together_meet_it() -> None:
    measured = {
        "calm": Measured(0.96, 0.93, 0.98),
        "restless": Measured(0.88, 0.82, 0.91),
        "short": Measured(0.92, 0.88, 0.95),
        "all": Measured(0.94, 0.92, 0.95),
    }
    assert Promise("range", goals.COVERAGE, measured).row() == (
        "range",
        "94 to 98 %",
        "94 % [92, 95]",
        "met",
        "restless (88 %); within sampling: short (92 %)",
    )


def test_verdicts_of_the_document_are_those_of_its_figures() -> None:
    """Read back from the table: a rate over its goal is not called met, one inside is; a rounded 5 % is either."""
    table = blocks_of_document()["goals on simulated logs"].splitlines()[2:-2]
    rows = [[cell.strip() for cell in line.strip("|").split("|")] for line in table]
    checked = 0
    for _, goal, figure, verdict, _ in rows:
        if goal == "at most 5 %":
            shown = int(figure.split()[0])
            assert verdict in ("met", "missed", "missed, within sampling")
            assert shown == 5 or (verdict == "met") == (shown < 5)
            checked += 1
    assert checked > 0


def test_sampling_range_of_a_median_against_scipy() -> None:
    values = np.random.default_rng(1).lognormal(size=60)
    ours = resampled(median, values)
    theirs = bootstrap((values,), np.median, method="percentile", n_resamples=4_000, rng=np.random.default_rng(2))
    assert ours is not None
    assert ours.value == np.median(values)
    np.testing.assert_allclose([ours.low, ours.high], theirs.confidence_interval, rtol=0.05)


def test_an_estimate_that_equals_the_oracles_has_a_ratio_of_one_without_doubt() -> None:
    errors = np.random.default_rng(1).standard_normal(20)
    assert resampled(lambda a, b: rms(a) / rms(b), errors, errors) == Measured(1.0, 1.0, 1.0)


@pytest.mark.parametrize("use", [STEADY_COMMUTE, ELECTRIC, HOUSEHOLD], ids=lambda use: use.vehicle)
def test_the_oracle_is_dense_generalised_least_squares_at_the_true_noise(use: Use) -> None:
    """Aitken (1935) on the covariance written down cell by cell."""
    observed = drawn(Job(use, 5))
    state = take_looks(observed, QUESTION, every=False, odd=False)[-1]
    problem = state.model.problem
    scatter = Scatter(*np.exp(true_theta(use, state.model.scale)).tolist())
    inverse = np.linalg.inv(dense_covariance(problem.shape, scatter, observed.mid_day))
    normal = problem.columns.T @ inverse @ problem.columns + np.diag(problem.precision)
    base, effect = np.linalg.solve(normal, problem.columns.T @ inverse @ problem.energy)[:2]
    assert with_noise_known(observed, use, state).ratio == pytest.approx(effect / base, rel=1e-6)


def test_the_oracle_errs_as_much_as_it_believes() -> None:
    """42 squared standardised errors: their mean lies between 0.62 and 1.47 in 95 % of samples (chi-square)."""
    found = [estimate(job) for job in jobs(USES, 6, 60_000)]
    standardised = np.array([one.oracle_error / one.oracle_standard_error for one in found])
    assert 0.62 < np.mean(standardised**2) < 1.47
