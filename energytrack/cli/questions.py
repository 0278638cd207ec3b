"""What a command that answers is asked about: the logbook, its vehicles, their tables."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, TypeVar

import typer

from energytrack.cli.app import ExitStatus
from energytrack.cli.context import the_vehicles
from energytrack.errors import EnergytrackError, EntryError, LogbookError, UnknownNameError
from energytrack.logbook.quantities import parse_number
from energytrack.presentation.plain import plain_text

if TYPE_CHECKING:
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle

Asked = TypeVar("Asked")
Answer = TypeVar("Answer")
USUAL_TARGET = 3.0  # percent


@dataclass(frozen=True)
class Question:
    """One modification of one vehicle, and the shift worth knowing about."""

    vehicle: Vehicle
    modification: str
    target_percent: float
    contents: Mapping[str, float] = field(default_factory=dict)  # fuel -> kWh per unit, where the usual is not meant

    def __str__(self) -> str:
        return f"{plain_text(self.vehicle.name)}, {plain_text(self.modification)}"


def vehicles_asked(logbook: Logbook, name: str | None) -> list[Vehicle]:
    """The vehicle named, or all. Raises UnknownNameError, or LogbookError where there is none."""
    vehicles = the_vehicles(logbook, name)
    if not vehicles:
        raise LogbookError("the logbook has no vehicle yet: energytrack vehicle add NAME --carrier diesel")
    return vehicles


def questions(logbook: Logbook, vehicles: Iterable[Vehicle], name: str | None, target: float | None) -> list[Question]:
    """One question for each modification, or for the one named. Raises UnknownNameError, LogbookError for none."""
    every = [question for vehicle in vehicles for question in _of_vehicle(logbook, vehicle, target)]
    if not every:
        raise LogbookError(
            'no modification is logged: say when one was fitted with energytrack mod fitted "NAME" ODOMETER'
        )
    chosen = [question for question in every if name in (None, question.modification)]
    if not chosen:
        names = ", ".join(dict.fromkeys(plain_text(question.modification) for question in every))
        raise UnknownNameError(f"no modification named {plain_text(name or '')!r}; logged: {names}")
    return chosen


def _of_vehicle(logbook: Logbook, vehicle: Vehicle, target: float | None) -> list[Question]:
    """The target asked for comes first, then the one last logged with the modification, then the usual one."""
    targets: dict[str, float] = {}
    for period in logbook.modifications(vehicle.name):
        usual = targets.get(period.name, USUAL_TARGET)
        targets[period.name] = usual if period.target_percent is None else period.target_percent
    return [Question(vehicle, name, own if target is None else target) for name, own in targets.items()]


def tables(logbook: Logbook, vehicle: Vehicle, contents: Mapping[str, float] | None = None) -> dict[str, Any]:
    """The vehicle's tables as data frames, and its own figures: what `assess` and `plan` take by name.

    contents: kWh per unit of a fuel, for a vehicle with tank and battery, where the usual figure is not meant.
    """
    from energytrack.consumption.frames import FramedLogbook
    from energytrack.consumption.two_carriers import two_carriers_of

    framed = FramedLogbook(logbook)
    weather = framed.weather()
    both = two_carriers_of(vehicle, contents)
    return {
        "entries": framed.entries(vehicle.name),
        "modifications": framed.modifications(vehicle.name),
        "events": framed.events(vehicle.name),
        "weather": None if weather.empty else weather,
        "capacity": vehicle.capacity,
        "unit": vehicle.unit,
        **({} if both is None else {"two_carriers": both}),
    }


def energy_content(typed: str | None, vehicles: Iterable[Vehicle]) -> dict[str, float]:
    """FUEL=KWH as typed, as a mapping from the fuel; {} where nothing was. Raises EntryError."""
    if typed is None:
        return {}
    fuels = [carrier for each in vehicles if each.second_carrier for carrier in (each.carrier, each.second_carrier)]
    fuels = [carrier for carrier in dict.fromkeys(fuels) if carrier != "electricity"]
    fuel, _, value = typed.partition("=")
    if fuel not in fuels:
        known = f"write one of {', '.join(f'{each}=KWH' for each in fuels)}" if fuels else "none is asked about"
        raise EntryError(f"--energy-content {typed!r} names no fuel of a vehicle with tank and battery: {known}")
    return {fuel: parse_number(value, f"energy content of {fuel}")}


def as_of_lines(as_of: str | None) -> list[str]:
    """What stands above an answer from an earlier state of the logbook."""
    return [] if as_of is None else [f"by what was recorded up to the end of {as_of}:", ""]


def answered(asked: Iterable[Asked], answer: Callable[[Asked], Answer]) -> tuple[list[Answer], list[str]]:
    """Every answer there is, and why the others have none. Raises the refusal where all are refused for one reason."""
    answers, refused = [], []
    for question in asked:
        try:
            answers.append(answer(question))
        except EnergytrackError as refusal:
            refused.append((question, refusal))
    if not answers and len({str(refusal) for _, refusal in refused}) == 1:
        raise refused[0][1]
    return answers, [f"{question}: {refusal}" for question, refusal in refused]


def leave(refusals: list[str], status: ExitStatus = ExitStatus.DONE) -> None:
    """Say what could not be answered, and end with the status that tells it."""
    for refusal in refusals:
        print(f"energytrack: {plain_text(refusal)}", file=sys.stderr)
    if refusals or status is not ExitStatus.DONE:
        raise typer.Exit(ExitStatus.REFUSED if refusals else status)
