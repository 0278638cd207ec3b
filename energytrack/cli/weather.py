"""`weather`: bring in daily temperatures, for entries that have none of their own."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.context import say, say_json, writable

_ADVICE = "nothing was imported; mend the file, or leave bad rows out with --skip-bad"


def weather(
    context: typer.Context,
    file: Annotated[
        Path, typer.Argument(help="CSV table of days, or a GHCN-Daily file: .dly, or CSV by station, year or day.")
    ],
    column: Annotated[
        list[str] | None,
        typer.Option(help="Our column = theirs: date, temperature_c, or minimum_c and maximum_c for their mean."),
    ] = None,
    station: Annotated[str | None, typer.Option(help="Identifier of the station meant, where a file has many.")] = None,
    skip_bad: Annotated[bool, typer.Option("--skip-bad", help="Leave bad rows out, import the rest.")] = False,
    temperature_unit: Annotated[
        str, typer.Option(metavar="UNIT", help="C or F.", callback=options.any_case)
    ] = "C",
    day_first: Annotated[bool, typer.Option("--day-first", help="03/04/2026 is the third of April.")] = False,
    date_format: Annotated[str | None, typer.Option(help="How dates are written, such as %m/%d/%y.")] = None,
    decimal_comma: Annotated[bool, typer.Option("--decimal-comma", help="Numbers are written 41,32.")] = False,
    delimiter: Annotated[
        str | None, typer.Option(help="Between cells; `tab` for a tab. Otherwise detected.")
    ] = None,
    json: options.Json = False,
) -> None:
    """Bring in daily temperatures; they fill in what entries lack. The same file twice adds nothing."""
    from energytrack.cli import import_options
    from energytrack.logbook.columns import Form
    from energytrack.logbook.weather_import import import_weather

    import_options.one_of("--temperature-unit", temperature_unit, ("C", "F"))
    form = Form(
        columns=import_options.columns(column or []),
        delimiter="\t" if delimiter in ("tab", "\\t") else delimiter,
        decimal_comma=decimal_comma,
        day_first=day_first,
        date_format=date_format,
        fahrenheit=temperature_unit == "F",
    )
    store = writable(context)
    with import_options.bad_rows_told():
        outcome = import_weather(store, file, form, station, skip_bad=skip_bad, advice=_ADVICE)
    if json:
        say_json(outcome.to_dict())
    else:
        say(outcome.lines())
