"""Options that several commands share, each described once."""

from __future__ import annotations

from typing import Annotated

import typer

VehicleName = Annotated[str | None, typer.Option("--vehicle", help="Which vehicle; may be left out when there is one.")]
Date = Annotated[str | None, typer.Option("--date", metavar="YYYY-MM-DD", help="Day; today if left out.")]
OdometerUnit = Annotated[
    str | None, typer.Option("--odometer-unit", metavar="km|mi", help="Unit of the odometer, if not the vehicle's own.")
]
Note = Annotated[str, typer.Option("--note", help="Anything worth remembering.")]
Json = Annotated[bool, typer.Option("--json", help="Print JSON.")]

NUMBERS_MAY_BE_NEGATIVE = {"ignore_unknown_options": True}  # so that -5 reaches the checks and is not read as an option
