"""`import`: bring a table of another program into the logbook."""

from __future__ import annotations

import datetime as dt
from pathlib import Path
from typing import Annotated

import typer

from energytrack.cli.context import logbook_path
from energytrack.cli.options import any_case

Text = str | None


def import_table(
    context: typer.Context,
    file: Annotated[Path, typer.Argument(help="CSV file, or a folder of tables (CSV).")],
    vehicle: Annotated[Text, typer.Option(help="Whose rows these are. Otherwise the file's column tells.")] = None,
    column: Annotated[list[str] | None, typer.Option(help="Our column = theirs, such as energy=Litres.")] = None,
    table: Annotated[
        str, typer.Option(metavar="TABLE", help="What the rows are: entries, modifications, events or weather.")
    ] = "entries",
    skip_bad: Annotated[
        Path | None, typer.Option(metavar="FILE", help="Write bad rows to this new file, import the rest.")
    ] = None,
    odometer_unit: Annotated[
        Text,
        typer.Option(metavar="UNIT", help="Of odometer and distance, km or mi. Otherwise km.", callback=any_case),
    ] = None,
    energy_unit: Annotated[
        Text,
        typer.Option(
            metavar="UNIT", help="L, gal-us, gal-imp, kg, lb, kWh or MJ. Otherwise the vehicle's.", callback=any_case
        ),
    ] = None,
    speed_unit: Annotated[
        Text,
        typer.Option(metavar="UNIT", help="Of speeds, km/h or mph. Otherwise km/h.", callback=any_case),
    ] = None,
    temperature_unit: Annotated[
        Text, typer.Option(metavar="UNIT", help="C or F. Otherwise C.", callback=any_case)
    ] = None,
    day_first: Annotated[bool, typer.Option("--day-first", help="03/04/2026 is the third of April.")] = False,
    date_format: Annotated[Text, typer.Option(help="How dates are written, such as %m/%d/%y.")] = None,
    decimal_comma: Annotated[bool, typer.Option("--decimal-comma", help="Numbers are written 41,32.")] = False,
    thousands: Annotated[Text, typer.Option(metavar="MARK", help="Mark between thousands, if any.")] = None,
    delimiter: Annotated[Text, typer.Option(help="Between cells; `tab` for a tab. Otherwise detected.")] = None,
    encoding: Annotated[Text, typer.Option(help="Otherwise UTF-8, else Windows-1252.")] = None,
    currency: Annotated[Text, typer.Option(help="Of costs without one.")] = None,
    kind: Annotated[Text, typer.Option(metavar="KIND", help="fill-up or charge, for rows that do not say.")] = None,
    again: Annotated[bool, typer.Option("--again", help="Several entries at one odometer value are meant.")] = False,
    carrier: Annotated[Text, typer.Option(help="Add the vehicle, with this carrier, if it is new.")] = None,
    capacity: Annotated[Text, typer.Option(help="Tank or battery capacity of a new vehicle.")] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print the result as JSON.")] = False,
) -> None:
    """Bring a CSV table into the logbook.

    All of it or, if any row is bad, none of it. The same file twice adds nothing; a longer export of the same log adds
    its new rows.
    """
    from energytrack.cli import import_options as options
    from energytrack.logbook.columns import Form
    from energytrack.logbook.importing import Request, run_import
    from energytrack.logbook.quantities import to_base

    options.check_words(table, odometer_unit, energy_unit, speed_unit, temperature_unit, kind)
    form = Form(
        columns=options.columns(column or []),
        delimiter="\t" if delimiter in ("tab", "\\t") else delimiter,
        encoding=encoding,
        decimal_comma=decimal_comma,
        thousands=thousands,
        day_first=day_first,
        date_format=date_format,
        fahrenheit=temperature_unit == "F",
        typed_units=options.units(odometer_unit, energy_unit, speed_unit, temperature_unit),
        currency=currency,
        km=to_base(1.0, odometer_unit or "km"),
        energy=to_base(1.0, energy_unit or "L"),
        kmh=to_base(1.0, "mi" if speed_unit == "mph" else "km"),
    )
    new = options.new_vehicle(vehicle, carrier, capacity, odometer_unit, energy_unit)
    request = Request(file, form, table, vehicle, new, kind, energy_unit, again, skip_bad)
    with options.bad_rows_told():
        outcome = run_import(request, logbook_path(context), dt.date.today())
    options.tell(outcome, as_json)
