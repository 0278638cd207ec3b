"""`review`: a vehicle's month, or a fleet's."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from typing import TYPE_CHECKING, Annotated

import typer

from energytrack.cli import month as asked_with
from energytrack.cli import options
from energytrack.cli import questions as asking
from energytrack.cli.context import readable, say_json

if TYPE_CHECKING:
    from energytrack.inference.review.results import Review
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle


def review(
    context: typer.Context,
    month: Annotated[
        str | None, typer.Option(metavar="YYYY-MM", help="The month; that of the newest entry if left out.")
    ] = None,
    vehicle: Annotated[str | None, typer.Option(help="The vehicle; each in turn if left out.")] = None,
    fleet: Annotated[
        bool, typer.Option("--fleet", help="All vehicles as one table, those to look at first, parts pooled.")
    ] = False,
    grid_factor: Annotated[
        str | None, typer.Option(metavar="GRAMS", help="CO2 in g per kWh of the grid charged from.")
    ] = None,
    co2: Annotated[
        list[str] | None, typer.Option(metavar="CARRIER=KG", help="CO2 per L or kg of a fuel; repeatable.")
    ] = None,
    part_cost: Annotated[
        list[str] | None,
        typer.Option(metavar="NAME=AMOUNT", help="What a modification cost, for its payback; repeatable."),
    ] = None,
    json: options.Json = False,
) -> None:
    """Review a month with weather and speed taken out.

    Distance, energy, cost, CO2 and consumption, by the log up to the end of that month: against the month before, the
    same month a year ago and the baseline.
    """
    logbook = readable(context)
    vehicles = asking.vehicles_asked(logbook, vehicle)
    if fleet and (vehicle is not None or grid_factor is not None or co2 or part_cost):
        raise typer.BadParameter("--fleet takes no --vehicle, --grid-factor, --co2 or --part-cost")
    if fleet:
        from energytrack.cli.fleet import fleet as reviewed_together

        reviewed_together(logbook, vehicles, month=month, as_json=json)
        return
    factors, costs = asked_with.factors(grid_factor, co2), asked_with.named_amounts(part_cost, "--part-cost")
    asked_with.check_parts(costs, logbook, vehicles)
    found, refusals = asking.answered(vehicles, lambda each: _reviewed(logbook, each, month, factors, costs))
    _print_json([one for _, one in found]) if json else _print(found)
    asking.leave(refusals)


def _reviewed(
    logbook: Logbook,
    vehicle: Vehicle,
    month: str | None,
    factors: Mapping[str, float],
    costs: Mapping[str, float],
) -> tuple[Vehicle, Review]:
    from energytrack.inference.review.review import review as reviewed

    return vehicle, reviewed(**asked_with.asked(logbook, vehicle, month, factors, costs, dt.date.today()))


def _print_json(found: list[Review]) -> None:
    from energytrack.presentation.as_json import without_nan

    say_json(without_nan({"reviews": [one.to_dict() for one in found]}))


def _print(found: list[tuple[Vehicle, Review]]) -> None:
    from energytrack.logbook.carriers import in_total
    from energytrack.presentation import terminal
    from energytrack.presentation.review import render

    screen = terminal.console()
    for place, (vehicle, one) in enumerate(found):
        if place:
            screen.print()
        terminal.show(render(one, in_total(vehicle), screen.width), screen)
