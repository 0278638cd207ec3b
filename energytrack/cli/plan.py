"""`plan`: how far each way of running a test would take, from a logbook or from stated noise."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING, Annotated, Any

import typer

from energytrack.cli import options, stated
from energytrack.cli import questions as asking
from energytrack.cli.context import readable, say_json, the_date
from energytrack.errors import LogbookError

if TYPE_CHECKING:
    from energytrack.inference.results import Plan
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle


def plan(
    context: typer.Context,
    vehicle: Annotated[str | None, typer.Option(help="The vehicle; all of them if left out.")] = None,
    target: Annotated[float, typer.Option(help="Smallest shift worth knowing about, in percent.")] = 3.0,
    confidence: Annotated[float, typer.Option(help="Of the range and the verdict.")] = 0.95,
    power: Annotated[float, typer.Option(help="Chance that a shift of the target size is found.")] = 0.80,
    not_reversible: Annotated[
        bool, typer.Option("--not-reversible", help="The part cannot be taken off again.")
    ] = False,
    trip_noise: stated.TripNoise = None,
    drift: stated.Drift = None,
    season_drift: stated.SeasonDrift = None,
    filling: stated.Filling = None,
    capacity: stated.Capacity = None,
    consumption: stated.Consumption = None,
    unit: stated.Unit = None,
    distance_per_fill: stated.DistancePerFill = None,
    days_per_fill: stated.DaysPerFill = None,
    baseline: stated.Baseline = None,
    temperature_range: stated.TemperatureRange = None,
    date: stated.Date = None,
    json: options.Json = False,
) -> None:
    """Say how far each way of testing a modification would take.

    From the logbook's own noise; or, with --trip-noise, from stated figures and no logbook.
    """
    figures = stated.stated(
        trip_noise=trip_noise, drift=drift, season_drift=season_drift, filling=filling, capacity=capacity,
        consumption=consumption, unit=unit, km_per_fill=distance_per_fill, days_per_fill=days_per_fill,
        baseline_km=baseline, temperature_range=temperature_range, date=date,
    )  # fmt: skip
    asked: dict[str, Any] = {"target_percent": target, "confidence": confidence, "power": power}
    asked["reversible"] = not not_reversible
    if figures is None:
        _from_logbook(context, vehicle, asked | {"today": the_date(date)}, json)
        return
    if vehicle is not None:
        raise typer.BadParameter("--trip-noise plans without a logbook: leave --vehicle out")
    from energytrack.inference.designs import plan_from

    found = plan_from(figures, **asked)
    _print_json([found]) if json else _print([found], lambda _: ("km", []))


def _from_logbook(context: typer.Context, vehicle: str | None, asked: dict[str, Any], json: bool) -> None:
    if context.obj is None:
        raise LogbookError(
            "no logbook named, and no noise stated: put --logbook PATH before the command, "
            "or state the noise, such as --trip-noise 2 --drift 0.5"
        )
    logbook = readable(context)
    by_name = {each.name: each for each in asking.vehicles_asked(logbook, vehicle)}
    answers, refusals = asking.answered(by_name, lambda name: _plan(logbook, by_name[name], asked))
    _print_json(answers) if json else _print(answers, lambda found: _shown_with(logbook, by_name[found.vehicle]))
    asking.leave(refusals)


def _plan(logbook: Logbook, vehicle: Vehicle, asked: dict[str, Any]) -> Plan:
    from energytrack.inference.designs import plan as compare

    return replace(compare(**asking.tables(logbook, vehicle), **asked), vehicle=vehicle.name)


def _shown_with(logbook: Logbook, vehicle: Vehicle) -> tuple[str, list[str]]:
    """The unit of distances, and the periods in which something was fitted already."""
    from energytrack.presentation.plan import periods

    return vehicle.distance_unit, periods(logbook.modifications(vehicle.name), vehicle.distance_unit)


def _print_json(plans: list[Plan]) -> None:
    from energytrack.presentation.as_json import without_nan

    say_json(without_nan({"plans": [found.to_dict() for found in plans]}))


def _print(plans: list[Plan], shown_with: Callable[[Plan], tuple[str, list[str]]]) -> None:
    from energytrack.presentation import terminal
    from energytrack.presentation.plan import render

    screen = terminal.console()
    for place, found in enumerate(plans):
        unit, fitted = shown_with(found)
        if place:
            screen.print()
        terminal.show(render(found, unit=unit, width=screen.width, title=len(plans) > 1, fitted=fitted), screen)
