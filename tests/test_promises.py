"""docs/promises.md names tests that exist, and every fault that is tested."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
TEXT = (ROOT / "docs" / "promises.md").read_text(encoding="utf-8")
ROWS = [line.strip("|").rsplit("|", 1) for line in TEXT.splitlines() if line.startswith("| ") and "| Test" not in line]
_PROOF = re.compile(r"(tests/\S+\.py) ((?:`\w+`(?:, )?)+)")


def named(proof: str) -> list[tuple[str, str]]:
    """File and function of each test in a cell."""
    return [(file, name) for file, names in _PROOF.findall(proof) for name in re.findall(r"`(\w+)`", names)]


def names_in(file: Path) -> set[str]:
    tree = ast.parse(file.read_text(encoding="utf-8"))
    return {node.name for node in tree.body if isinstance(node, ast.FunctionDef) and node.name.startswith("test_")}


@pytest.mark.parametrize(("promise", "proof"), ROWS, ids=[row[0].strip()[:40] for row in ROWS])
def test_a_promise_has_tests_that_exist(promise: str, proof: str) -> None:
    assert promise.strip()
    tests = named(proof)
    assert tests
    assert _PROOF.sub("", proof).strip(" ,") == "", "nothing but tests stands here"
    assert [(file, name) for file, name in tests if name not in names_in(ROOT / file)] == []


def test_every_test_of_a_fault_stands_for_a_promise() -> None:
    promised = {name for _, proof in ROWS for _, name in named(proof)}
    found = {name for file in (ROOT / "tests" / "faults").glob("test_*.py") for name in names_in(file)}
    assert found - promised == set()
    assert len(ROWS) > 15
