"""`review`: a vehicle's month, or a fleet's."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from typing import TYPE_CHECKING, Annotated

import typer

from energytrack.cli import options
from energytrack.cli import questions as asking
from energytrack.cli.context import readable, say_json
from energytrack.errors import EntryError, UnknownNameError
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
    stated, costs = factors(grid_factor, co2), named_amounts(part_cost, "--part-cost")
    check_parts(costs, logbook, vehicles)
    found, refusals = asking.answered(
        vehicles, lambda each: (each, _review(logbook, each, month, stated, costs))
    )
    _print_json([one for _, one in found]) if json else _print(found)
    asking.leave(refusals)


def _review(
    logbook: Logbook,
    vehicle: Vehicle,
    month: str | None,
    stated: Mapping[str, float],
    costs: Mapping[str, float],
) -> Review:
    from energytrack.inference.review.review import review as reviewed

    own = {row.name for row in logbook.modifications(vehicle.name)}
    return reviewed(
        **asking.tables(logbook, vehicle),
        month=month,
        carrier=vehicle.carrier,
        co2_kg_per_unit={**own_factors(vehicle), **stated},
        part_costs={name: cost for name, cost in costs.items() if name in own},
        typed_in=(vehicle.distance_unit, vehicle.typed_unit),
        today=dt.date.today(),
    )


def check_parts(costs: Mapping[str, float], logbook: Logbook, vehicles: list[Vehicle]) -> None:
    """Raises UnknownNameError for a modification that none of the vehicles has."""
    names = {row.name for each in vehicles for row in logbook.modifications(each.name)}
    unknown = next((name for name in costs if name not in names), None)
    if unknown is not None:
        raise UnknownNameError(f"no modification named {unknown!r}; logged: {', '.join(sorted(names)) or 'none'}")


def own_factors(vehicle: Vehicle) -> dict[str, float]:
    """kg of CO2 per unit of each carrier, as the logbook states them for this vehicle."""
    stated = {vehicle.carrier: vehicle.co2_kg, vehicle.second_carrier: vehicle.second_co2_kg}
    return {carrier: kg for carrier, kg in stated.items() if carrier is not None and kg is not None}


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
