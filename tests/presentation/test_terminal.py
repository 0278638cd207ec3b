"""What reaches a pipe and a terminal: real processes."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
PRINT = """
from energytrack.presentation import terminal
from energytrack.presentation.enough import render
from tests.presentation.samples import NOT_YET
screen = terminal.console()
terminal.show(render(NOT_YET, width=screen.width), screen)
"""


def clean_environment(**more: str) -> dict[str, str]:
    unset = ("NO_COLOR", "FORCE_COLOR", "TTY_COMPATIBLE", "TTY_INTERACTIVE", "COLUMNS")
    return {key: value for key, value in os.environ.items() if key not in unset} | more


def piped(**environment: str) -> bytes:
    done = subprocess.run(
        [sys.executable, "-c", PRINT], cwd=ROOT, env=clean_environment(**environment), capture_output=True, check=True
    )
    return done.stdout


def on_a_terminal(**environment: str) -> str:
    pexpect = pytest.importorskip("pexpect", reason="a real terminal needs pexpect")
    if sys.platform == "win32":
        pytest.skip("no pseudo-terminal on Windows")
    child = pexpect.spawn(
        sys.executable,
        ["-c", PRINT],
        cwd=str(ROOT),
        env=clean_environment(TERM="xterm-256color", **environment),
        dimensions=(50, 90),
        encoding="utf-8",
    )
    child.expect(pexpect.EOF)
    return str(child.before)


def test_a_pipe_gets_plain_80_columns_whatever_the_terminal_is() -> None:
    text = piped(COLUMNS="200", PYTHONIOENCODING="utf-8").decode("utf-8")
    assert "\x1b" not in text
    expected = (Path(__file__).parent / "expected" / "not-yet.txt").read_text(encoding="utf-8")
    assert text.replace(os.linesep, "\n") == expected


def test_a_terminal_gets_weight_and_no_color_turns_colours_off() -> None:
    assert "\x1b[1mNot yet" in on_a_terminal()
    assert "\x1b[3" not in on_a_terminal(NO_COLOR="1")
