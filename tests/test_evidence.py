"""The evidence document holds what its scripts measure: same blocks, same columns, every one filled."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from tests.documents import ROOT
from tests.evidence.block import Block, rate
from tests.evidence.document import DOCUMENT, measured, put
from tests.simulation import simulate
from tests.uses import STEADY_COMMUTE

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
    run("simulated", "--logs", "1", "--kind", "steady-commute", "--write", "--document", str(path))
    run("sham", str(folder), "--write", "--document", str(path))
    return measured(path.read_text(encoding="utf-8"))


def test_the_scripts_fill_every_block_of_the_document(tried: dict[str, str]) -> None:
    assert [name for name, content in tried.items() if not content] == []


def test_the_documents_columns_are_those_of_the_scripts(tried: dict[str, str]) -> None:
    first_lines = {name: content.splitlines()[:2] for name, content in blocks_of_document().items()}
    assert first_lines == {name: content.splitlines()[:2] for name, content in tried.items()}


def test_every_block_of_the_document_is_measured() -> None:
    blocks = blocks_of_document()
    assert len(blocks) >= 7
    for name, content in blocks.items():
        *table, _, source = content.splitlines()
        assert len(table) > 3, name
        assert source.startswith("`python -m tests.evidence "), name


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
