"""`report`: a month as a page to keep, print or hand on."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from energytrack.cli import month as asked_with
from energytrack.cli import options
from energytrack.cli import questions as asking
from energytrack.cli.cautions import CAUTIONS
from energytrack.cli.context import readable, say, say_json, the_date
from energytrack.errors import ReportError

if TYPE_CHECKING:
    from energytrack.inference.report.results import MonthReport
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle
    from energytrack.presentation.report.page import Page

_FORMS = ("html", "md")


def report(
    context: typer.Context,
    path: Annotated[
        Path | None, typer.Argument(metavar="[PATH]", help="New file; report.html if left out.", show_default=False)
    ] = None,
    month: Annotated[
        str | None, typer.Option(metavar="YYYY-MM", help="The month; that of the newest entry if left out.")
    ] = None,
    vehicle: Annotated[str | None, typer.Option(help="The vehicle; each in turn if left out.")] = None,
    format: Annotated[
        str | None, typer.Option(metavar="html|md", help="By the file's ending if left out.")
    ] = None,
    figures: Annotated[
        Path | None, typer.Option(metavar="FOLDER", help="Write the figures to SVG files there as well.")
    ] = None,
    force: Annotated[bool, typer.Option("--force", help="Replace an earlier report and its figures.")] = False,
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
    date: options.Date = None,
    json: options.Json = False,
) -> None:
    """Write a month's report to a file.

    The review, the test of each modification, and figures, as one HTML file that needs nothing beside itself, or as
    Markdown with its figures in a folder.
    """
    from energytrack.presentation.report.writing import check, check_folder

    form = _form(path, format)
    target = path or Path(f"report.{form}")
    folder = figures if figures is not None or form == "html" else target.with_name(f"{target.stem}-figures")
    check(target, form, force=force)
    if folder is not None:
        check_folder(folder)
    _need(form)
    logbook, today = readable(context), the_date(date)
    factors, costs = asked_with.factors(grid_factor, co2), asked_with.named_amounts(part_cost, "--part-cost")
    vehicles = asking.vehicles_asked(logbook, vehicle)
    asked_with.check_parts(costs, logbook, vehicles)
    found, refusals = _found(logbook, vehicles, month, factors, costs, today)
    if found:
        drawn = _write(_page(logbook, found, month, today), target, form, folder, force)
        _told(target, folder, drawn, json=json)
    asking.leave(refusals)


def _form(path: Path | None, typed: str | None) -> str:
    if typed is not None and typed not in _FORMS:
        raise typer.BadParameter(f"--format {typed!r} is not one of: {', '.join(_FORMS)}")
    if typed is not None or path is None:
        return typed or "html"
    return "md" if path.suffix.lower() in (".md", ".markdown") else "html"


def _need(form: str) -> None:
    """Before anything is computed: what a report needs beside the program."""
    from energytrack.presentation.graphics.canvas import need_matplotlib
    from energytrack.presentation.report.html import need_jinja

    need_matplotlib()
    if form == "html":
        need_jinja()


_Found = tuple["Vehicle", "MonthReport"]


def _found(
    logbook: Logbook,
    vehicles: list[Vehicle],
    month: str | None,
    factors: Mapping[str, float],
    costs: Mapping[str, float],
    today: dt.date,
) -> tuple[list[_Found], list[str]]:
    from energytrack.inference.report.month_report import month_report
    from energytrack.presentation.progress import progress

    by_name = {each.name: each for each in vehicles}
    done = iter(range(1, len(by_name) + 1))
    with progress("report") as tell:
        tell(0, len(by_name))

        def answer(name: str) -> _Found:
            one = by_name[name]
            made = month_report(**asked_with.asked(logbook, one, month, factors, costs, today))
            tell(next(done), len(by_name))
            return one, made

        return asking.answered(by_name, answer)


def _page(logbook: Logbook, found: list[_Found], month: str | None, today: dt.date) -> Page:
    """With all vehicles together first, where there are several."""
    from energytrack.presentation.report.report import page_of

    if len(found) == 1:
        return page_of(found, today, CAUTIONS)
    from energytrack.inference.fleet.assess_fleet import assess_fleet
    from energytrack.inference.fleet.logs import fleet_logs

    together = assess_fleet(fleet_logs(logbook, [vehicle for vehicle, _ in found]), month=month)
    return page_of(found, today, CAUTIONS, together)


def _write(page: Page, target: Path, form: str, folder: Path | None, force: bool) -> list[Path]:
    from energytrack.presentation.report.figures import write_figures
    from energytrack.presentation.report.writing import write

    text = _text(page, form, target, folder)
    drawn = [] if folder is None else write_figures(page, folder, force=force)
    write(text, target, form, force=force)
    return drawn


def _text(page: Page, form: str, target: Path, folder: Path | None) -> str:
    if form == "html":
        from energytrack.presentation.report.html import html

        return html(page)
    from energytrack.presentation.report.markdown import markdown

    if folder is None:
        raise ReportError("figures of a Markdown report need a folder: name one with --figures")
    return markdown(page, _link(target, folder))


def _link(target: Path, folder: Path) -> str:
    """From the file to the folder."""
    import os

    try:
        return Path(os.path.relpath(folder.absolute(), target.absolute().parent)).as_posix()
    except ValueError:  # another drive
        return folder.absolute().as_posix()


def _told(target: Path, folder: Path | None, drawn: list[Path], *, json: bool) -> None:
    if json:
        say_json({"report": str(target), "bytes": target.stat().st_size, "figures": [str(each) for each in drawn]})
        return
    say([f"report written to {target}"])
    if folder is not None:
        say([f"{len(drawn)} figures in {folder}"])
