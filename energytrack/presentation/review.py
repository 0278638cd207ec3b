"""One vehicle's month: sentence, figures, differences, months as bars, tests, money, CO2, what to do next."""

from __future__ import annotations

from rich.text import Text

from energytrack.inference.review.results import Difference, Driven, Review
from energytrack.logbook.quantities import DISTANCE, consumption_text, energy_text
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures, months, review_rows
from energytrack.presentation.columns import aligned, cells_wide
from energytrack.presentation.plain import plain_text
from energytrack.presentation.review_steps import next_steps
from energytrack.presentation.text import bullets, join, labelled, wrap

Row = tuple[str, ...]
_TOLD = 1.5  # percent between two differences, from which the conditions are worth a sentence


def render(found: Review, vehicle: Vehicle, width: int = 80) -> list[Text]:
    """Lines of at most `width` cells. vehicle: as its whole consumption is shown."""
    lines = [Text(line, style="bold") for line in wrap(sentence(found, vehicle), width)]
    for block in _blocks(found, vehicle, width):
        if block:
            lines += [Text(), *map(Text, block)]
    return lines


def sentence(found: Review, vehicle: Vehicle) -> str:
    """The answer: how far, how much, and whether it used more or less than it would have been expected to."""
    this, name = found.this, plain_text(found.vehicle) or "the vehicle"
    driven = figures.driven(this.distance_km, vehicle.distance_unit)
    if this.consumption is None:
        return f"{name} in {found.month}: {driven} driven, consumption not known yet. {_note(found)}".strip()
    said = f"{name} in {found.month}: {driven} at {join(consumption_text(this.consumption, vehicle))} as measured."
    if found.level is None:
        return f"{said} {_note(found)}"
    level = join(consumption_text(found.level.consumption, vehicle))
    return " ".join(filter(None, (said, f"At reference conditions {level}{_verdict(found)}.", _conditions(found))))


def _note(found: Review) -> str:
    return "" if found.level_note is None else f"Too early for more: {found.level_note}."


def _verdict(found: Review) -> str:
    """Against the baseline, in words."""
    against = next((each for each in found.differences if each.against == "baseline"), None)
    if against is None:
        return ""
    size, span = against.percent, figures.bounded(against.interval_percent)
    if span is None or span[0] <= 0 <= span[1]:
        within = "its range wide open" if span is None else f"range {figures.percent_range(span)}"
        return f", not told from its baseline ({figures.percent(size, signed=True)}, {within})"
    way = "below" if size < 0 else "above"
    return f", {figures.percent(abs(size))} {way} its baseline (range {figures.percent_range(span)})"


def _conditions(found: Review) -> str:
    """What weather and speed did to the difference from the month before, where that is worth saying."""
    before = next((each for each in found.differences if each.against == "month-before"), None)
    if before is None or before.measured_percent is None or abs(before.measured_percent - before.percent) < _TOLD:
        return ""
    measured, left = (figures.percent(value, signed=True) for value in (before.measured_percent, before.percent))
    odd = " and what stands out" if found.set_aside else ""
    return f"Against {before.what} it is {measured} as measured, {left} once the conditions{odd} are taken out."


def _blocks(found: Review, vehicle: Vehicle, width: int) -> list[list[str]]:
    return [
        _table(found, vehicle, width),
        _headed("this month against, at reference conditions", _differences(found, vehicle, width), width),
        months.lines(found, vehicle, width),
        _headed("modifications", labelled(review_rows.tests(found, vehicle), width), width),
        _headed("money, a year", labelled(review_rows.money(found, vehicle), width), width),
        _headed("CO2, tank to wheel", labelled(review_rows.carbon(found), width), width),
        _headed("changes of the last 12 months", labelled(review_rows.changes(found, vehicle), width), width),
        _headed("records of the month", labelled(review_rows.quality(found, vehicle), width), width),
        bullets([plain_text(each) for each in found.warnings], "! ", width),
        bullets(next_steps(found, vehicle), "> ", width),
    ]


def _headed(heading: str, body: list[str], width: int) -> list[str]:
    return [*wrap(heading, width), *body] if body else []


def _table(found: Review, vehicle: Vehicle, width: int) -> list[str]:
    """Months side by side, or one below the other where the columns do not fit."""
    rows = month_rows(found, vehicle)
    lines = aligned(rows, right=range(1, len(rows[0])))
    if max(map(cells_wide, lines)) <= width:
        return lines
    folded: list[str] = []
    for number in range(1, len(rows[0])):
        folded += labelled([(row[0] or "month", row[number]) for row in rows], width)
    return folded


def month_rows(found: Review, vehicle: Vehicle) -> list[Row]:
    """The names of the months, and a row for each figure that one of them has."""
    every = [each for each in (found.this, found.month_before, found.year_ago) if each is not None]
    columns = [_column(each, found, vehicle) for each in every]
    rows: list[Row] = [tuple(cells) for cells in zip(_LABELS, *columns, strict=True)]
    return [row for row in rows if any(cell not in ("", "-") for cell in row[1:])]


_LABELS = (
    "",
    "distance",
    "energy used",
    "energy bought",
    "cost",
    "cost per distance",
    "consumption as measured",
    "at reference conditions",
)


def _column(month: Driven, found: Review, vehicle: Vehicle) -> Row:
    currency = "" if found.price is None else found.price.currency
    far = 100.0 if vehicle.distance_unit == "km" else DISTANCE["mi"]
    distance = "100 km" if vehicle.distance_unit == "km" else "mi"
    level = next((each for each in found.levels if each.month == month.month), None)
    per = None if month.cost_per_km is None else month.cost_per_km * far
    return (
        month.month,
        figures.driven(month.distance_km, vehicle.distance_unit).replace("\u00a0", " "),
        "-" if month.energy is None else energy_text(month.energy, vehicle),
        energy_text(month.bought, vehicle) if month.entries else "-",
        "-" if month.cost is None else review_rows.amount(month.cost, currency),
        "-" if per is None else f"{review_rows.amount(per, currency)}/{distance}",
        "-" if month.consumption is None else consumption_text(month.consumption, vehicle),
        "-" if level is None else consumption_text(level.consumption, vehicle),
    )


def _differences(found: Review, vehicle: Vehicle, width: int) -> list[str]:
    names = {"month-before": "month before", "year-ago": "a year ago", "baseline": "baseline"}
    rows = [(f"  {names[each.against]}", _difference(each, vehicle)) for each in found.differences]
    return labelled(rows, width)


def _difference(each: Difference, vehicle: Vehicle) -> str:
    span = figures.bounded(each.interval_percent)
    within = "range wide open" if span is None else f"range {figures.percent_range(span)}"
    told = "told apart" if span is not None and not span[0] <= 0 <= span[1] else "not told apart"
    measured = "" if each.measured_percent is None else (
        f"; as measured {figures.percent(each.measured_percent, signed=True)}"
    )  # fmt: skip
    reference = join(consumption_text(each.reference, vehicle))
    what = f" ({reference}, {each.what})" if each.against == "baseline" else ""
    return f"{figures.percent(each.percent, signed=True)}, {within}: {told}{measured}{what}"

