"""A fleet's month, as `review --fleet` asks it."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import nullcontext
from typing import TYPE_CHECKING

from energytrack.cli.context import say_json
from energytrack.cli.workers import workers
from energytrack.inference.fleet.logs import fleet_logs

if TYPE_CHECKING:
    from energytrack.inference.fleet.results import FleetAssessment
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle

_FEW = 24  # vehicles that one process has reviewed before another has started


def fleet(logbook: Logbook, vehicles: Sequence[Vehicle], *, month: str | None, as_json: bool) -> None:
    """Review these vehicles in a month (YYYY-MM; otherwise that of the newest entry). Raises InferenceError."""
    logs = fleet_logs(logbook, vehicles)
    with workers() if len(logs) > _FEW else nullcontext() as executor:  # before numpy is imported
        from energytrack.inference.fleet.assess_fleet import assess_fleet
        from energytrack.presentation.progress import progress

        with progress("vehicles") as tell:
            found = assess_fleet(logs, month=month, executor=executor, progress=tell)
    _print_json(found) if as_json else _print(found, {each.name: each for each in vehicles})


def _print_json(found: FleetAssessment) -> None:
    from energytrack.presentation.as_json import without_nan

    say_json(without_nan(found.to_dict()))


def _print(found: FleetAssessment, vehicles: dict[str, Vehicle]) -> None:
    from energytrack.presentation import terminal
    from energytrack.presentation.fleet import render

    screen = terminal.console()
    terminal.show(render(found, vehicles, screen.width), screen)
