"""Options that several commands share, each described once."""

from __future__ import annotations

import re
from typing import Annotated, Any

import typer
import typer.core

from energytrack.logbook.quantities import CONSUMPTION, DISTANCE, ENERGY, in_any_case

_OTHERS = ("km/h", "mph", "C", "F")

def any_case(typed: str | None) -> str | None:
    """A typed unit as it is written: `l` is L, `KWH` is kWh. What is no unit stays, for the command to refuse."""
    return None if typed is None else in_any_case(typed, (*ENERGY, *DISTANCE, *CONSUMPTION, *_OTHERS))


VehicleName = Annotated[str | None, typer.Option("--vehicle", help="Which vehicle; may be left out when there is one.")]
Date = Annotated[str | None, typer.Option("--date", metavar="YYYY-MM-DD", help="Day; today if left out.")]
OdometerUnit = Annotated[
    str | None,
    typer.Option(
        "--odometer-unit",
        metavar="km|mi",
        help="Unit of the odometer, if not the vehicle's own.",
        callback=any_case,
    ),
]
Note = Annotated[str, typer.Option("--note", help="Anything worth remembering.")]
AsOf = Annotated[
    str | None, typer.Option("--as-of", metavar="YYYY-MM-DD", help="By what had been recorded by the end of that day.")
]
Json = Annotated[bool, typer.Option("--json", help="Print JSON.")]


class NegativeNumbers(typer.core.TyperCommand):
    """A command to which -5 is a number, for its checks to refuse, and any other unknown `-x` a wrong option."""

    def parse_args(self, ctx: Any, args: list[str]) -> list[str]:
        ctx.ignore_unknown_options = any(re.match(r"-\.?[0-9]", text) for text in args)
        return super().parse_args(ctx, args)
