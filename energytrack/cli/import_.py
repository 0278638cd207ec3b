"""`import`: bring a table of another program into the logbook."""

from __future__ import annotations

import datetime as dt
from enum import Enum
from pathlib import Path
from typing import Annotated

import typer

from energytrack.cli.app import app


class Table(str, Enum):
    """What the rows of the file are."""

    entries = "entries"
    modifications = "modifications"
    events = "events"
    weather = "weather"


@app.command("import")
def import_table(
    context: typer.Context,
    file: Annotated[Path, typer.Argument(help="CSV file, or a folder of tables as `export` writes it.")],
    vehicle: Annotated[str | None, typer.Option(help="Whose rows these are. Otherwise the file's column tells.")] = None,
    column: Annotated[list[str] | None, typer.Option(help="Our column = theirs, such as energy=Litres.")] = None,
    table: Annotated[Table, typer.Option(help="What the rows are.")] = Table.entries,
    skip_bad: Annotated[
        Path | None, typer.Option(metavar="FILE", help="Write bad rows to this new file, import the rest.")
    ] = None,
    odometer_unit: Annotated[str, typer.Option(metavar="km|mi", help="Of odometer and distance.")] = "km",
    energy_unit: Annotated[
        str | None, typer.Option(metavar="UNIT", help="L, gal-us, gal-imp, kg, lb, kWh or MJ. Otherwise the vehicle's.")
    ] = None,
    speed_unit: Annotated[str, typer.Option(metavar="km/h|mph", help="Of the mean speed.")] = "km/h",
    temperature_unit: Annotated[str, typer.Option(metavar="C|F", help="Of temperatures.")] = "C",
    day_first: Annotated[bool, typer.Option("--day-first", help="03/04/2026 is the third of April.")] = False,
    date_format: Annotated[str | None, typer.Option(help="How dates are written, such as %m/%d/%y.")] = None,
    decimal_comma: Annotated[bool, typer.Option("--decimal-comma", help="Numbers are written 41,32.")] = False,
    thousands: Annotated[str | None, typer.Option(metavar="MARK", help="Mark between thousands.")] = None,
    delimiter: Annotated[str | None, typer.Option(help="Of cells; `tab` for a tab. Otherwise detected.")] = None,
    encoding: Annotated[str | None, typer.Option(help="Otherwise UTF-8, else Windows-1252.")] = None,
    currency: Annotated[str | None, typer.Option(help="Of costs without one.")] = None,
    kind: Annotated[str | None, typer.Option(metavar="fill-up|charge", help="Of rows that do not say.")] = None,
    again: Annotated[bool, typer.Option("--again", help="Several entries at one odometer value are meant.")] = False,
    carrier: Annotated[str | None, typer.Option(help="Add the vehicle, with this carrier, if it is new.")] = None,
    capacity: Annotated[float | None, typer.Option(help="Tank or usable battery capacity of a new vehicle.")] = None,
    json: Annotated[bool, typer.Option("--json", help="Print the result as JSON.")] = False,
) -> None:
    """Bring a CSV table into the logbook: all of it or, if any row is bad, none of it.

    The same file twice adds nothing; a longer export of the same log adds its new rows.
    """
    from energytrack.cli import import_options as options
    from energytrack.logbook.bringing import Source, bring

    form = options.form(
        columns=options.columns(column or []),
        odometer_unit=options.one_of("--odometer-unit", odometer_unit, ("km", "mi")),
        energy_unit=options.one_of("--energy-unit", energy_unit, options.ENERGY_UNITS),
        speed_unit=options.one_of("--speed-unit", speed_unit, ("km/h", "mph")),
        temperature_unit=options.one_of("--temperature-unit", temperature_unit, ("C", "F")),
        day_first=day_first,
        date_format=date_format,
        decimal_comma=decimal_comma,
        thousands=thousands,
        delimiter="\t" if delimiter == "tab" else delimiter,
        encoding=encoding,
        currency=currency,
    )
    new = options.new_vehicle(vehicle, carrier, capacity, odometer_unit, energy_unit)
    kind = options.one_of("--kind", kind, ("fill-up", "charge"))
    source = Source(file, form, table.value, vehicle, kind, energy_unit, again, skip_bad)
    outcome = bring(source, options.logbook_path(context), new, dt.date.today())
    options.tell(outcome, json)
