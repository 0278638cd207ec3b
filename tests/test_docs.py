"""The documents say what the program does: outputs, commands, columns and fields are compared with the code."""

from __future__ import annotations

import re
import sys
from collections.abc import Iterator
from dataclasses import fields
from pathlib import Path
from typing import Any

import pytest
import typer

from energytrack.cli.app import LOGBOOK_VARIABLE, ExitStatus, app
from energytrack.inference import rehearsal_results as rehearsed
from energytrack.inference import results
from energytrack.inference.fleet import results as fleet
from energytrack.inference.regimes import results as regimes
from energytrack.inference.review import results as reviewed
from energytrack.logbook import columns
from tests.documents import DOCUMENTS, ROOT, WIDTH, FailedCommandError, commands_of, console_lines, replay

REFERENCE = "docs/reference.md"
TABLES = {
    "entries": columns.ENTRIES,
    "vehicles": columns.VEHICLES,
    "modifications": columns.MODIFICATIONS,
    "events": columns.EVENTS,
    "weather": columns.WEATHER,
}
ONE_LINE = re.compile(r"\$ |energytrack: |note: |next: |\S+:\d+: ")
RESULTS = (
    *(results.Assessment, results.Noise, results.Covariate, results.Look, results.Expectation, results.Remedy),
    *(results.Plan, results.Design, results.Confounder, results.Advice, results.Together, results.Effect),
    *(results.Response, results.LevelEffect, results.Comparison, results.PairwiseShift, results.Standing),
    *(results.SetAside, results.WithAll),
    *(rehearsed.Rehearsal, rehearsed.Scenario, rehearsed.Rate, rehearsed.Settled, rehearsed.Placebo),
    *(regimes.RegimeReport, regimes.Break, regimes.Match, regimes.Regime, regimes.BreakTest, regimes.Criterion),
    regimes.Point,
    *(reviewed.Review, reviewed.Driven, reviewed.Level, reviewed.Difference, reviewed.Carbon, reviewed.Price),
    *(reviewed.UnderTest, reviewed.Worth, reviewed.RegimeChange, reviewed.Quality),
    *(fleet.FleetAssessment, fleet.VehicleReview, fleet.Deviation, fleet.BriefAnswer, fleet.PooledShift),
    *(fleet.Contribution, fleet.Heterogeneity, fleet.ControlledShift, fleet.Alone),
)


def text_of(name: str) -> str:
    return (ROOT / name).read_text(encoding="utf-8")


def section(title: str) -> str:
    """The part of the reference under a heading, up to the next heading."""
    parts = re.split(r"^#+ (.+)$", text_of(REFERENCE), flags=re.MULTILINE)
    return dict(zip(parts[1::2], parts[2::2], strict=True))[title]


def rows_of(title: str) -> list[str]:
    """First cells, without the back-ticks, of the table under a heading."""
    return re.findall(r"^\| `([^`]+)`", section(title), flags=re.MULTILINE)


def every_command(command: Any, name: str) -> Iterator[str]:
    """A command's name and those of all below it; commands may be built only when asked for."""
    yield name
    for part in command.list_commands(None) if hasattr(command, "list_commands") else ():
        yield from every_command(command.get_command(None, part), f"{name} {part}")


@pytest.mark.skipif(sys.platform == "win32", reason="the documents show a POSIX shell")
@pytest.mark.parametrize("name", DOCUMENTS)
def test_outputs_are_what_the_commands_print(name: str, tmp_path: Path) -> None:
    assert replay(text_of(name), tmp_path) == text_of(name), "run: python -m tests.refresh_docs"


@pytest.mark.parametrize("name", DOCUMENTS)
def test_outputs_fit_eighty_columns(name: str) -> None:
    """All but refusals and notes, which are one line each, however long, and a command to copy."""
    lines = console_lines(text_of(name))
    assert [line for line in lines if len(line) > WIDTH and not ONE_LINE.match(line)] == []


@pytest.mark.parametrize("name", DOCUMENTS)
def test_links_lead_somewhere(name: str) -> None:
    links = re.findall(r"\]\((?!https?://)([^)#]+)", text_of(name))
    broken = [link for link in links if not ((ROOT / name).parent / link).exists()]
    assert broken == []


def test_every_command_has_its_help_in_the_reference() -> None:
    shown = commands_of(console_lines(text_of(REFERENCE)))
    missing = [name for name in every_command(typer.main.get_command(app), "energytrack")
               if f"{name} --help" not in shown]  # fmt: skip
    assert missing == []


def test_commands_exist() -> None:
    assert len(list(every_command(typer.main.get_command(app), "energytrack"))) > 10  # a walk that finds nothing


@pytest.mark.parametrize("table", TABLES)
def test_every_column_is_explained(table: str) -> None:
    assert tuple(rows_of(f"Table {table}")) == TABLES[table]


@pytest.mark.parametrize("result", RESULTS, ids=lambda result: result.__name__)
def test_every_field_is_explained(result: type) -> None:
    assert rows_of(f"Object {result.__name__}") == [field.name for field in fields(result)]


def test_every_exit_status_is_explained() -> None:
    assert [int(status) for status in rows_of("Exit status")] == [status.value for status in ExitStatus]


def test_environment_variable_is_explained() -> None:
    assert rows_of("Environment") == [LOGBOOK_VARIABLE]


def test_replay_shows_what_a_command_prints(tmp_path: Path) -> None:
    asked = "```text a.txt\nyes\n```\n```console\n$ cat a.txt\nno\n$ export B=c\n$ echo $B\n```\nEnd\n"
    assert replay(asked, tmp_path) == asked.replace("no\n", "yes\n").replace("$B\n", "$B\nc\n")


def test_replay_refuses_a_command_that_fails(tmp_path: Path) -> None:
    with pytest.raises(FailedCommandError, match="status 3"):
        replay("```console\n$ exit 3\n```\n", tmp_path)
