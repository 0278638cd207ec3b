"""What is packed, what lies where, and what must not stand in any file."""

from __future__ import annotations

import re
import shutil
import subprocess
import sys
import sysconfig
import tomllib
import zipfile
from importlib.metadata import PackageNotFoundError, version
from importlib.util import find_spec
from pathlib import Path

import pytest

from tests.documents import ROOT

PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
TOP_LEVEL = {"README.md", "DEVELOPERS.md", "pyproject.toml", "energytrack", "tests", "demo_logbook", "docs"}
MACHINE_PATHS = re.compile(r"(?<![\w.])/(?:work|root|home|Users|tmp)/\w")
LIMITED = re.compile(r"""^\s*"[\w.-]+[<>=~!]""")  # a requirement with a version limit


def tracked() -> list[Path]:
    """Files of the repository, deleted ones left out."""
    if shutil.which("git") is None or not (ROOT / ".git").exists():
        pytest.skip("not a git checkout")
    listed = subprocess.run(["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, text=True, check=True).stdout
    return [ROOT / name for name in listed.split("\0") if name and (ROOT / name).exists()]


def test_top_level_holds_only_what_belongs_there() -> None:
    names = {path.relative_to(ROOT).parts[0] for path in tracked()}
    assert {name for name in names if not name.startswith(".")} == TOP_LEVEL


def test_no_file_names_a_place_on_one_machine() -> None:
    found = []
    for path in tracked():
        for number, line in enumerate(path.read_bytes().decode("utf-8", errors="replace").splitlines(), start=1):
            if MACHINE_PATHS.search(line):
                found.append(f"{path.relative_to(ROOT)}:{number}: {line.strip()}")
    assert found == []


def test_licence_is_an_spdx_expression_with_its_text() -> None:
    # Identifier: SPDX licence list; field: the packaging standard for licence expressions (PEP 639)
    assert PROJECT["project"]["license"] == "MIT"
    texts = [path for pattern in PROJECT["project"]["license-files"] for path in ROOT.glob(pattern)]
    assert texts
    assert all("Permission is hereby granted" in path.read_text(encoding="utf-8") for path in texts)


def test_every_version_limit_has_its_reason() -> None:
    lines = (ROOT / "pyproject.toml").read_text(encoding="utf-8").splitlines()
    limits = [line for line in lines if LIMITED.match(line)]
    assert len(limits) >= len(PROJECT["project"]["dependencies"])
    assert [line for line in limits if not re.search(r"#\s*\w", line)] == []


def test_console_script_answers() -> None:
    try:
        version("energytrack")
    except PackageNotFoundError:
        pytest.skip("not installed here: the README's test command installs it")
    script = shutil.which("energytrack", path=sysconfig.get_path("scripts"))
    assert script is not None
    done = subprocess.run([script, "--help"], capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")
    assert "fillup" in done.stdout


@pytest.mark.skipif(find_spec("pip") is None, reason="pip is not installed")
def test_wheel_holds_every_module_and_runs(tmp_path: Path) -> None:
    """Built from the tracked files alone, with the environment's own build tool, so that no network is needed."""
    if tuple(int(part) for part in version("setuptools").split(".")[:1]) < (77,):
        pytest.skip("setuptools is older than 77: the README's test command brings a newer one")
    source = tmp_path / "source"
    for path in tracked():
        copy = source / path.relative_to(ROOT)
        copy.parent.mkdir(parents=True, exist_ok=True)
        shutil.copyfile(path, copy)
    build = [*(sys.executable, "-m", "pip", "wheel", "-q", "--no-deps", "--no-build-isolation"), "-w", str(tmp_path)]
    subprocess.run([*build, str(source)], check=True, capture_output=True, text=True)
    unpacked = tmp_path / "unpacked"
    with zipfile.ZipFile(next(tmp_path.glob("energytrack-*.whl"))) as wheel:
        wheel.extractall(unpacked)
    files = {path.relative_to(ROOT) for path in tracked() if path.is_relative_to(ROOT / "energytrack")}
    assert {path.relative_to(unpacked) for path in (unpacked / "energytrack").rglob("*") if path.is_file()} == files
    assert [path for path in files if path.suffix != ".py"], "a page's template and style"
    assert not (unpacked / "tests").exists()
    done = subprocess.run(
        [sys.executable, "-m", "energytrack", "--help"], cwd=unpacked, capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stderr) == (0, "")
