"""`regimes`: where did consumption change, whatever was declared?"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from energytrack.cli import options
from energytrack.cli import questions as asking
from energytrack.cli.context import readable, say, say_json

if TYPE_CHECKING:
    from energytrack.inference.regimes.results import RegimeReport
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle
    from energytrack.presentation.regimes.marks import Mark


def regimes(
    context: typer.Context,
    vehicle: Annotated[str | None, typer.Option(help="The vehicle; all of them if left out.")] = None,
    slopes: Annotated[
        bool, typer.Option("--slopes", help="Let the responses to temperature and speed change as well.")
    ] = False,
    max_breaks: Annotated[int, typer.Option(help="Changes looked for at most, 1 to 10.")] = 5,
    confidence: Annotated[float, typer.Option(help="Of the tests and the ranges.")] = 0.95,
    figure: Annotated[
        Path | None, typer.Option(metavar="FILE.svg|.png", help="Draw one vehicle's answer to a file as well.")
    ] = None,
    force: Annotated[bool, typer.Option("--force", help="Replace the file of an earlier figure.")] = False,
    watch: Annotated[
        bool, typer.Option("--watch", help="Say instead where the watch stands that goes on with every entry.")
    ] = False,
    false_alarm_every: Annotated[
        float, typer.Option(metavar="KM", help="Of the watch: average distance between false alarms.")
    ] = 50_000.0,
    json: options.Json = False,
) -> None:
    """Find lasting changes of consumption. Where, when, how large, and whether something logged agrees.

    What was fitted takes no part in the search: a change is found without it, and then compared.
    """
    logbook = readable(context)
    vehicles = asking.vehicles_asked(logbook, vehicle)
    if watch:
        from energytrack.cli.watch import watch as told

        told(logbook, vehicles, false_alarm_every_km=false_alarm_every, as_json=json)
        return
    if figure is not None:
        _check_figure(figure, vehicles, force)
    answers, refusals = _found(logbook, vehicles, slopes, max_breaks, confidence)
    _print_json(answers) if json else _print(logbook, answers)
    if figure is not None:
        for one, report in answers:
            _draw(report, one, _marks(logbook, report), figure, force)
            say([] if json else ["", f"drawn to {figure}"])
    asking.leave(refusals)


_Answer = tuple["Vehicle", "RegimeReport"]


def _found(
    logbook: Logbook, vehicles: list[Vehicle], slopes: bool, max_breaks: int, confidence: float
) -> tuple[list[_Answer], list[str]]:
    from energytrack.inference.regimes.find import find_regimes
    from energytrack.presentation.progress import progress

    by_name = {each.name: each for each in vehicles}
    done = iter(range(1, len(by_name) + 1))
    with progress("regimes") as tell:
        tell(0, len(by_name))

        def answer(name: str) -> _Answer:
            tables = asking.tables(logbook, by_name[name])
            report = find_regimes(**tables, slopes=slopes, max_breaks=max_breaks, confidence=confidence)
            tell(next(done), len(by_name))
            return by_name[name], replace(report, vehicle=name)

        return asking.answered(by_name, answer)


def _marks(logbook: Logbook, report: RegimeReport) -> tuple[Mark, ...]:
    from energytrack.presentation.regimes.marks import marks_of

    name = report.vehicle
    return marks_of(logbook.modifications(name), logbook.events(name), report.points)


def _print_json(answers: list[_Answer]) -> None:
    from energytrack.presentation.as_json import without_nan

    say_json(without_nan({"reports": [report.to_dict() for _, report in answers]}))


def _print(logbook: Logbook, answers: list[_Answer]) -> None:
    from energytrack.logbook.carriers import in_total
    from energytrack.presentation import terminal
    from energytrack.presentation.regimes.answer import render

    screen = terminal.console()
    for place, (vehicle, report) in enumerate(answers):
        if place:
            screen.print()
        shown, marks = in_total(vehicle), _marks(logbook, report)
        terminal.show(render(report, shown, marks, width=screen.width, title=len(answers) > 1), screen)


def _check_figure(path: Path, vehicles: list[Vehicle], force: bool) -> None:
    """Before anything is computed: what would keep the figure from being drawn."""
    from energytrack.presentation.graphics.writing import check

    if len(vehicles) > 1:
        raise typer.BadParameter("--figure draws one vehicle: name it with --vehicle")
    check(path, force=force)


def _draw(report: RegimeReport, vehicle: Vehicle, marks: tuple[Mark, ...], path: Path, force: bool) -> None:
    from energytrack.logbook.carriers import in_total
    from energytrack.presentation.graphics.writing import write
    from energytrack.presentation.regimes.figure import draw

    write(draw(report, in_total(vehicle), marks), path, force=force)
