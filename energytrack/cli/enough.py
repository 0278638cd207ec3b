"""`enough`: has the modification shifted consumption, and was the distance enough to say so?"""

from __future__ import annotations

import datetime as dt
import sys
from dataclasses import replace
from typing import TYPE_CHECKING, Annotated

import typer

from energytrack.cli import options
from energytrack.cli import questions as asking
from energytrack.cli.app import ExitStatus
from energytrack.cli.context import readable_as_of, say, say_json
from energytrack.cli.controlled import controlled
from energytrack.cli.watch import keep_watch
from energytrack.errors import EnergytrackError, LogbookError
from energytrack.logbook.store import Store

if TYPE_CHECKING:
    from energytrack.inference.results import Assessment, Rule
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle


USUAL_CERTAINTY = (0.95, 0.80)  # confidence and power; other questions are asked in passing and not kept


def enough(
    context: typer.Context,
    name: Annotated[str | None, typer.Argument(help="The modification; all of them if left out.")] = None,
    vehicle: Annotated[str | None, typer.Option(help="The vehicle; all of them if left out.")] = None,
    target: Annotated[
        float | None, typer.Option(help="Smallest shift worth knowing about, in percent. Otherwise as logged, or 3.")
    ] = None,
    confidence: Annotated[float, typer.Option(help="Of the range and the verdict.")] = USUAL_CERTAINTY[0],
    power: Annotated[float, typer.Option(help="Chance that a shift of the target size is found.")] = USUAL_CERTAINTY[1],
    covariate: Annotated[
        list[str] | None, typer.Option(metavar="COLUMN", help="A further numeric column to allow for; repeatable.")
    ] = None,
    compare: Annotated[
        bool, typer.Option("--compare", help="Hold the vehicle's modifications against each other, pair by pair.")
    ] = False,
    looks: Annotated[
        str, typer.Option(metavar="every|counted", help="Allow for a look at every moment, or count those taken.")
    ] = "every",
    open_ended: Annotated[
        bool, typer.Option("--open-ended", help="Watch without an end: only a shift closes the question.")
    ] = False,
    keep_all: Annotated[
        bool, typer.Option("--keep-all", help="Set nothing aside, however far it stands from its neighbours.")
    ] = False,
    energy_content: Annotated[
        str | None, typer.Option(metavar="FUEL=KWH", help="kWh in a L or kg of the fuel, of a plug-in hybrid.")
    ] = None,
    control: Annotated[
        list[str] | None, typer.Option(metavar="VEHICLE", help="A vehicle of the same run without it; repeatable.")
    ] = None,
    picture: Annotated[bool, typer.Option("--picture", help="Draw how the range narrowed with distance.")] = False,
    as_of: options.AsOf = None,
    json: options.Json = False,
    exit_code: Annotated[bool, typer.Option("--exit-code", help='Exit with 10 while an answer is "not yet".')] = False,
) -> None:
    """Say whether a modification shifted consumption. By how much, and how far is still to go to be sure."""
    rule = _rule(looks, open_ended)
    logbook = readable_as_of(context, as_of)
    vehicles = asking.vehicles_asked(logbook, vehicle)
    if control:
        if compare or covariate or rule != "every-look" or keep_all or energy_content or picture or as_of or exit_code:
            raise typer.BadParameter("--control takes no option but --vehicle, --target, --confidence, --power, --json")
        controlled(
            *(logbook, vehicles, name),
            controls=control,
            target=target,
            confidence=confidence,
            power=power,
            as_json=json,
        )
        return
    if compare and (name is not None or rule != "every-look" or picture or exit_code):
        raise typer.BadParameter("--compare takes no modification, --looks, --open-ended, --picture or --exit-code")
    if compare:
        _compare(vehicles, logbook, target, confidence, covariate, json, keep_all)
        return
    if rule == "counted" and as_of is not None:
        raise typer.BadParameter("--as-of takes no look: leave --looks counted out")
    if rule == "counted" and not isinstance(logbook, Store):
        raise LogbookError(f"{logbook.path} is a folder of tables and keeps no looks: use --looks every, or import it")
    contents = asking.energy_content(energy_content, vehicles)
    asked = [replace(each, contents=contents) for each in asking.questions(logbook, vehicles, name, target)]
    answers, refusals = asking.answered(
        asked, lambda question: (question, _assess(logbook, question, confidence, power, covariate, rule, keep_all))
    )
    in_passing = target is not None or covariate or contents or keep_all or (confidence, power) != USUAL_CERTAINTY
    for question, answer in answers:  # first: a reader such as `head` may end the command while it prints
        (_write_look_down if in_passing else keep)(logbook, question, answer)
    if not in_passing:
        for vehicle_name in dict.fromkeys(question.vehicle.name for question, _ in answers):
            keep_watch(logbook, logbook.vehicle(vehicle_name))
    if json:
        _print_json([a for _, a in answers])
    else:
        say(asking.as_of_lines(as_of))
        _print(answers, picture)
    waiting = exit_code and any(answer.verdict == "not-yet" for _, answer in answers)
    asking.leave(refusals, ExitStatus.NOT_YET if waiting else ExitStatus.DONE)


def _rule(looks: str, open_ended: bool) -> Rule:
    if looks not in ("every", "counted"):
        raise typer.BadParameter(f"--looks {looks!r} is not one of: every, counted")
    if open_ended:
        if looks == "counted":
            raise typer.BadParameter("--open-ended holds however often someone looks: leave --looks counted out")
        return "open-ended"
    return "counted" if looks == "counted" else "every-look"


def _assess(
    logbook: Logbook,
    question: asking.Question,
    confidence: float,
    power: float,
    covariates: list[str] | None,
    rule: Rule,
    keep_all: bool,
) -> Assessment:
    from energytrack.inference.assess import assess

    answer = assess(
        **asking.tables(logbook, question.vehicle, question.contents),
        name=question.modification,
        target_percent=question.target_percent,
        confidence=confidence,
        power=power,
        covariates=covariates or None,
        rule=rule,
        looks_taken=logbook.looks(question.vehicle.name, question.modification),
        set_aside="none" if keep_all else "odd",
        typed_in=(question.vehicle.distance_unit, question.vehicle.typed_unit),
    )
    return replace(answer, vehicle=question.vehicle.name)


def usual_answer(logbook: Logbook, question: asking.Question) -> Assessment:
    """The answer that `enough` gives and keeps when nothing but the target is asked for."""
    return _assess(logbook, question, *USUAL_CERTAINTY, None, "every-look", False)


def _compare(
    vehicles: list[Vehicle],
    logbook: Logbook,
    target: float | None,
    confidence: float,
    covariates: list[str] | None,
    json: bool,
    keep_all: bool,
) -> None:
    from energytrack.inference.comparison import compare
    from energytrack.presentation import several, terminal

    found, refusals = asking.answered(
        vehicles,
        lambda vehicle: compare(
            **asking.tables(logbook, vehicle),
            target_percent=asking.USUAL_TARGET if target is None else target,
            confidence=confidence,
            covariates=covariates or None,
            set_aside="none" if keep_all else "odd",
        ),
    )
    if json:
        say_json({"comparisons": [one.to_dict() for one in found]})
    else:
        screen = terminal.console()
        for one in found:
            terminal.show(several.compared(one, screen.width, title=len(found) > 1), screen)
    asking.leave(refusals)


def _print_json(answers: list[Assessment]) -> None:
    from energytrack.presentation.as_json import without_nan

    say_json(without_nan({"assessments": [answer.to_dict() for answer in answers]}))


def _print(answers: list[tuple[asking.Question, Assessment]], picture: bool) -> None:
    from energytrack.presentation import terminal
    from energytrack.presentation.enough import render, repeats

    screen = terminal.console()
    shown: list[tuple[asking.Question, Assessment]] = []
    for each in answers:
        shown += [] if repeats(each[1], (answer for _, answer in shown)) else [each]
    for place, (question, answer) in enumerate(shown):
        unit, several = question.vehicle.distance_unit, len(shown) > 1
        if place:
            screen.print()
        terminal.show(render(answer, unit=unit, width=screen.width, title=several, draw=picture), screen)


def keep(logbook: Logbook, question: asking.Question, answer: Assessment) -> None:
    """Keep the answer for the echo of later entries, and that someone looked; a refusal never hides the answer."""
    from energytrack.presentation.as_json import without_nan

    if not isinstance(logbook, Store) or not logbook.writable:
        return
    result = without_nan(answer.to_dict())
    del result["looks"]
    try:
        last = logbook.last_entries(question.vehicle.name, 1)
        result["at_km"] = last[0].odometer_km if last else None
        logbook.keep_assessment(question.vehicle.name, question.modification, result)
    except EnergytrackError as refusal:
        print(f"energytrack: the answer was not kept: {refusal}", file=sys.stderr)
        return
    _write_look_down(logbook, question, answer)


def _write_look_down(logbook: Logbook, question: asking.Question, answer: Assessment) -> None:
    """That someone looked, whatever target or confidence was asked for: the shift shown is the same."""
    if not isinstance(logbook, Store) or not logbook.writable or not answer.looks:
        return
    newest = answer.looks[-1]
    date = dt.date.fromisoformat(newest.date)
    try:
        logbook.record_look(question.vehicle.name, question.modification, newest.odometer_km, date)
    except EnergytrackError as refusal:
        print(f"energytrack: the look was not written down: {refusal}", file=sys.stderr)
