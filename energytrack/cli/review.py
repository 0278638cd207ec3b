"""`review`: a vehicle's month, or a fleet's."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from typing import TYPE_CHECKING, Annotated

import typer

from energytrack.cli import options
from energytrack.cli import questions as asking
from energytrack.cli.context import readable, say_json
from energytrack.errors import EntryError
from energytrack.logbook.quantities import parse_number

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
    """Review a month: distance, energy, cost, CO2, and consumption with weather and speed taken out.

    By the log up to the end of that month. Against the month before, the same month a year ago and the baseline.
    """
    logbook = readable(context)
    vehicles = asking.vehicles_asked(logbook, vehicle)
    stated, costs = factors(grid_factor, co2), named_amounts(part_cost, "--part-cost")
    found, refusals = asking.answered(
        vehicles, lambda each: (each, _review(logbook, each, month, stated, costs, one=len(vehicles) == 1))
    )
    _print_json([one for _, one in found]) if json else _print(found)
    asking.leave(refusals)


def _review(
    logbook: Logbook,
    vehicle: Vehicle,
    month: str | None,
    factors: Mapping[str, float],
    costs: Mapping[str, float],
    *,
    one: bool,
) -> Review:
    from energytrack.inference.review.review import review as reviewed

    own = {row.name for row in logbook.modifications(vehicle.name)}
    return reviewed(
        **asking.tables(logbook, vehicle),
        month=month,
        carrier=vehicle.carrier,
        co2_kg_per_unit=factors,
        part_costs={name: cost for name, cost in costs.items() if one or name in own},
        typed_in=(vehicle.distance_unit, vehicle.typed_unit),
        today=dt.date.today(),
    )


def factors(grid: str | None, typed: list[str] | None) -> dict[str, float]:
    """kg of CO2 per unit of each carrier stated. Raises EntryError."""
    found = named_amounts(typed, "--co2")
    if grid is not None:
        found["electricity"] = parse_number(grid, "grid factor") / 1000
    return found


def named_amounts(typed: list[str] | None, option: str) -> dict[str, float]:
    """NAME=NUMBER as typed, by name. Raises EntryError."""
    found = {}
    for each in typed or ():
        name, mark, value = each.rpartition("=")
        if not mark or not name.strip():
            raise EntryError(f"{option} {each!r} is not written as NAME=NUMBER, such as {_EXAMPLES[option]}")
        found[name.strip()] = parse_number(value, f"{option} of {name.strip()}")
    return found


_EXAMPLES = {"--co2": "diesel=2.62", "--part-cost": '"side skirts=350"'}


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
