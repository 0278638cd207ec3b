"""Driving and noise as stated on the command line, for a plan without a logbook."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from energytrack.cli.context import the_date
from energytrack.cli.options import any_case
from energytrack.errors import EntryError
from energytrack.logbook.quantities import parse_number

if TYPE_CHECKING:
    from energytrack.inference.stated import Stated

TripNoise = Annotated[
    float | None, typer.Option(metavar="PERCENT", help="Scatter of one fill-up from trip to trip: plans without a log.")
]
Drift = Annotated[float | None, typer.Option(metavar="PERCENT", help="Stated drift over weeks.")]
SeasonDrift = Annotated[float | None, typer.Option(metavar="PERCENT", help="Stated drift over seasons.")]
Filling = Annotated[float | None, typer.Option(metavar="AMOUNT", help="Stated error of one fill or level reading.")]
Capacity = Annotated[float | None, typer.Option(metavar="AMOUNT", help="Stated capacity; 50 if left out.")]
Consumption = Annotated[float | None, typer.Option(metavar="AMOUNT", help="Stated, per 100 km; 7 if left out.")]
Unit = Annotated[
    str | None,
    typer.Option(metavar="L|kg|kWh", help="Unit of stated amounts; L if left out.", callback=any_case),
]
DistancePerFill = Annotated[float | None, typer.Option(metavar="KM", help="Stated; 550 if left out.")]
DaysPerFill = Annotated[float | None, typer.Option(metavar="DAYS", help="Stated; 7 if left out.")]
Baseline = Annotated[float | None, typer.Option(metavar="KM", help="Stated, before the test; 3000 if left out.")]
TemperatureRange = Annotated[
    str | None, typer.Option(metavar="JAN:JUL", help="Stated means of January and July, C; -2:22 if left out.")
]
Date = Annotated[
    str | None, typer.Option(metavar="YYYY-MM-DD", help="Day the test could begin; today if left out.")
]


def stated(
    *, trip_noise: float | None, temperature_range: str | None, date: str | None, **figures: float | str | None
) -> Stated | None:
    """The stated figures; None where none is. Raises EntryError without the noise, InferenceError for impossible ones.

    figures: further fields of Stated by name, None where left out.
    """
    given = {name: value for name, value in figures.items() if value is not None}
    if trip_noise is None:
        if given or temperature_range:
            raise EntryError("no noise stated: a plan without a logbook needs at least --trip-noise, such as 5")
        return None
    from energytrack.inference.stated import Stated

    if temperature_range is not None:
        given["january_c"], given["july_c"] = _range(temperature_range)
    return Stated(trip_noise, date=the_date(date), **given)  # type: ignore[arg-type]


def _range(typed: str) -> tuple[float, float]:
    january, colon, july = typed.partition(":")
    if not colon:
        raise EntryError(f"--temperature-range {typed!r} is not JANUARY:JULY in degrees Celsius, such as -2:22")
    return parse_number(january, "temperature of January"), parse_number(july, "temperature of July")
