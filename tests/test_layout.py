"""The house keeps its order: imports go only up the list of layers, and the light parts stay light."""

from __future__ import annotations

import ast
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parent.parent / "energytrack"
LAYERS = ["errors", "logbook", "consumption", "inference", "presentation", "cli"]
LIGHT = [
    "inference.results",
    "inference.rehearsal_results",
    "inference.regimes.results",
    *(f"inference.watch.{name}" for name in ("monitor", "kept", "echo")),
    *(f"inference.review.{name}" for name in ("results", "month", "cut", "driven")),
    *(f"inference.fleet.{name}" for name in ("results", "logs")),
    *(f"consumption.{name}" for name in ("positions", "segments", "shares", "slips", "meaning", "terms")),
    *("consumption.two_carriers", "consumption.energy_content"),
]
MODULES = {
    ".".join(path.relative_to(PACKAGE).with_suffix("").parts).removesuffix(".__init__"): path
    for path in sorted(PACKAGE.rglob("*.py"))
}


def imported(tree: ast.AST) -> Iterator[str]:
    """Every module named in an import statement, inside functions too."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are absolute"
            yield node.module or ""
            yield from (f"{node.module}.{alias.name}" for alias in node.names if node.module == "energytrack")


def at_import(tree: ast.Module) -> Iterator[str]:
    """Modules imported when this one is: not those inside functions or for type checking only."""
    for node in tree.body:
        if isinstance(node, (ast.Import, ast.ImportFrom)):
            yield from imported(node)


def layer(module: str) -> int | None:
    """Place of an energytrack module in the list of layers."""
    parts = module.split(".")
    return LAYERS.index(parts[1]) if parts[0] == "energytrack" and len(parts) > 1 and parts[1] in LAYERS else None


def tree_of(module: str) -> ast.Module:
    return ast.parse(MODULES[module].read_text(encoding="utf-8"))


def wrong_way(module: str, tree: ast.AST) -> list[str]:
    own = layer(f"energytrack.{module}")
    places = [(name, layer(name)) for name in imported(tree)]
    return [name for name, place in places if own is not None and place is not None and place > own]


def foreign(names: Iterator[str]) -> list[str]:
    roots = {name.split(".")[0] for name in names}
    return sorted(roots - set(sys.stdlib_module_names) - {"energytrack"})


@pytest.mark.parametrize("module", MODULES)
def test_imports_go_up_the_list_only(module: str):
    assert wrong_way(module, tree_of(module)) == []


def test_an_import_the_wrong_way_would_be_seen():
    tree = ast.parse("def f():\n    from energytrack.inference.assess import assess\n")
    assert wrong_way("consumption.segments", tree) == ["energytrack.inference.assess"]
    assert wrong_way("presentation.tables", tree) == []
    assert wrong_way("errors", ast.parse("from energytrack import cli")) == ["energytrack.cli"]


@pytest.mark.parametrize("module", [name for name in MODULES if name.split(".")[0] in ("errors", "logbook")])
def test_logbook_needs_the_standard_library_only(module: str):
    assert foreign(imported(tree_of(module))) == []


@pytest.mark.parametrize("module", LIGHT)
def test_light_modules_load_the_standard_library_only(module: str):
    seen, waiting = set(), [module]
    while waiting:
        name = waiting.pop()
        if name in seen or name not in MODULES:
            continue
        seen.add(name)
        names = list(at_import(tree_of(name)))
        assert foreign(iter(names)) == [], name
        waiting += [found.removeprefix("energytrack.") for found in names if found.startswith("energytrack.")]
    assert module in seen


@pytest.mark.parametrize("name", LAYERS[1:])
def test_subpackage_init_is_empty(name: str):
    assert (PACKAGE / name / "__init__.py").read_text(encoding="utf-8") == ""


def test_every_module_has_its_layer():
    outside = [name for name in MODULES if layer(f"energytrack.{name}") is None]
    assert outside == ["__init__", "__main__"]


def test_matplotlib_is_loaded_in_one_place_and_only_to_draw():
    using = [name for name in MODULES if any(each.split(".")[0] == "matplotlib" for each in imported(tree_of(name)))]
    loading = [name for name in using if any(each.startswith("matplotlib") for each in at_import(tree_of(name)))]
    assert "presentation.graphics.canvas" in using
    assert loading == []
