"""One vehicle's month as a chapter: answer, what to do, figures, tables."""

from __future__ import annotations

from energytrack.consumption.terms import ELECTRIC
from energytrack.inference.report.results import Curve, MonthReport, Tried
from energytrack.inference.review.results import Difference, Review
from energytrack.logbook.quantities import consumption, consumption_text, consumption_unit, rounded
from energytrack.logbook.records import Vehicle
from energytrack.presentation import conditions, figures, review_rows, undeclared
from energytrack.presentation.answer import named, sentence
from energytrack.presentation.graphics import funnel, noise, response
from energytrack.presentation.graphics.canvas import NARROW
from energytrack.presentation.plain import plain_text
from energytrack.presentation.regimes import answer as regimes
from energytrack.presentation.regimes import figure
from energytrack.presentation.regimes.marks import lettered, marks_of
from energytrack.presentation.report.page import Chapter, Picture, Section, Table
from energytrack.presentation.review import month_rows
from energytrack.presentation.review import sentence as month_sentence
from energytrack.presentation.review_steps import next_steps
from energytrack.presentation.scatter import Source, sources_of
from energytrack.presentation.text import join

_TEMPERATURE, _SPEED = "temperature_c", "speed_kmh"
_AGAINST = {"month-before": "month before", "year-ago": "a year ago", "baseline": "baseline"}


def chapter_of(found: MonthReport, vehicle: Vehicle, name: str) -> Chapter:
    """`vehicle`: as its whole consumption is shown; `name`: stands before the names of its pictures."""
    review = found.review
    sections = (
        Section("What to do next", items=tuple(next_steps(review, vehicle))),
        _month(review, vehicle),
        _odometer(found, vehicle, name),
        *(_tried(each, vehicle, f"{name}-test-{k}") for k, each in enumerate(found.tried, start=1)),
        _money(review, vehicle),
        _conditions(found, vehicle, name),
        _noise(found, vehicle, name),
        _records(found, vehicle),
    )
    heading = f"{plain_text(review.vehicle) or 'Vehicle'}, {review.month}"
    kept = tuple(each for each in sections if each.texts or each.items or each.pictures or each.tables)
    return Chapter(name, heading, month_sentence(review, vehicle), kept)


def _month(found: Review, vehicle: Vehicle) -> Section:
    head, *rows = month_rows(found, vehicle)
    sure = figures.target(100 * found.confidence)
    rows = [tuple(_joined(cell) for cell in row) for row in rows]
    tables = [Table("The month, the one before it, and the same month a year ago", head, tuple(rows), figures=True)]
    if found.differences:
        heads = ("against", "difference", f"{sure} range", "told apart", "as measured")
        caption = f"{found.month} against others, at reference conditions; below zero less is used"
        rows = [_difference(each, vehicle) for each in found.differences]
        tables.append(Table(caption, heads, tuple(rows), figures=True))
    if len(found.levels) > 1:
        unit = consumption_unit(vehicle).label
        rows = [(each.month, *_level(each.consumption, each.interval, vehicle)) for each in found.levels]
        caption = f"Consumption at reference conditions, month by month, in {unit}"
        tables.append(Table(caption, ("month", "level", f"{sure} range"), tuple(rows), figures=True))
    return Section("The month", _reference(found, vehicle), tables=tuple(tables))


def _difference(each: Difference, vehicle: Vehicle) -> tuple[str, ...]:
    span = figures.bounded(each.interval_percent)
    reference = f", {_joined(consumption_text(each.reference, vehicle))}" if each.against == "baseline" else ""
    return (
        _AGAINST[each.against] + reference,
        figures.percent(each.percent, signed=True),
        "wide open" if span is None else figures.percent_range(span),
        "yes" if span is not None and not span[0] <= 0 <= span[1] else "no",
        "-" if each.measured_percent is None else figures.percent(each.measured_percent, signed=True),
    )


def _joined(cell: str) -> str:
    """A distance that a price or consumption is for stays on one line."""
    return cell.replace("100 km", join("100 km"))


def _reference(found: Review, vehicle: Vehicle) -> tuple[str, ...]:
    """What the reference conditions are, in words."""
    values, unit = found.reference_conditions, vehicle.distance_unit
    said = [join(f"{values[name]:.0f} °C") for name in (_TEMPERATURE,) if name in values]
    said += [join(f"{figures.in_unit(values[name], unit):.0f} {unit}/h") for name in (_SPEED,) if name in values]
    means = [f"{' and '.join(said)}, the means over this log"] if said else []
    fuel = ["driving on fuel alone"] if ELECTRIC in values else []
    return (f"Reference conditions: {'; '.join([*means, *fuel])}.",) if means or fuel else ()


def _level(value: float, span: tuple[float, float] | None, vehicle: Vehicle) -> tuple[str, str]:
    shown = rounded(consumption(value, vehicle), 3)
    if span is None or span[0] <= 0:
        return shown, "wide open"
    low, high = sorted(consumption(end, vehicle) for end in span)
    return shown, join(f"{rounded(low, 3)} to {rounded(high, 3)}")


def _odometer(found: MonthReport, vehicle: Vehicle, name: str) -> Section:
    """Lasting changes, found without a word about modifications, and what was logged along the way."""
    report, unit = found.regimes, vehicle.distance_unit
    told = regimes.sentence(report, unit)
    if not report.points:
        return Section("Along the odometer", texts=(told,))
    marks = marks_of(found.modifications, found.events, report.points)
    drawing = figure.draw(report, vehicle, marks, width=NARROW, spelled_out=False)
    caption = (
        f"Consumption of {plain_text(found.review.vehicle) or 'the vehicle'} at the log's reference conditions, with "
        f"lasting changes found by a search that knows no modification"
    )
    letters = lettered(marks)
    caption += "; letters stand for what was logged." if letters else "."
    rows = tuple((each.letter, each.mark.what, figures.driven(each.mark.km, unit)) for each in letters)
    tables = [Table("What was logged along the way", ("letter", "what", "odometer"), rows)] if rows else []
    unit_label = consumption_unit(vehicle).label
    levels = tuple(
        (
            join(f"{figures.driven(each.start_km, unit).split(join(' '))[0]} to {figures.driven(each.end_km, unit)}"),
            *_level(each.consumption, each.interval, vehicle),
        )
        for each in report.regimes
    )
    heads = ("odometer", f"level, {unit_label}", f"{figures.target(100 * report.confidence)} range")
    if levels:
        tables.append(Table("Levels between the changes, at reference conditions", heads, levels, figures=True))
    return Section(
        "Along the odometer", (told,), (), (Picture(f"{name}-odometer", drawing, caption),), tuple(tables)
    )


def _tried(tried: Tried, vehicle: Vehicle, name: str) -> Section:
    """The test of one modification."""
    a, unit = tried.answer, vehicle.distance_unit
    pictures = []
    if a.looks:
        caption = (
            f"Estimated shift with {named(a)} against distance driven with it; the range holds however often one looks."
        )
        pictures.append(Picture(name, funnel.draw(a, tried.driven_km, unit), caption))
    warnings = (*undeclared.told(a, unit), *map(plain_text, a.warnings))
    return Section(f"Test of {named(a)}", (sentence(a, unit),), warnings, tuple(pictures))


def _money(found: Review, vehicle: Vehicle) -> Section:
    money, carbon = review_rows.money(found, vehicle), review_rows.carbon(found)
    tables = [Table("Money, a year", ("", "amount"), _pairs(money))]
    if carbon:
        tables.append(Table(f"CO2 of {found.month}, tank to wheel", ("", "mass"), _pairs(carbon)))
    return Section("Money and CO2", tables=tuple(tables))


def _conditions(found: MonthReport, vehicle: Vehicle, name: str) -> Section:
    pictures = tuple(
        Picture(f"{name}-{response.NAMES[curve.condition]}", response.draw(curve, vehicle), _curve_caption(curve))
        for curve in found.curves
    )
    rows = conditions.rows(found.covariates, vehicle.distance_unit)
    tables = (Table("What the conditions do to consumption", ("", "effect"), tuple(rows)),) if rows else ()
    return Section("Weather and speed", pictures=pictures, tables=tables)


def _curve_caption(curve: Curve) -> str:
    said = (
        f"Consumption against {response.NAMES[curve.condition]}. What other conditions and modifications did, by the "
        f"fitted model, is taken out of each dot (partial residuals)."
    )
    if curve.filled_in:
        said += f" {curve.filled_in} segments without a logged value are left out."
    return said


def _noise(found: MonthReport, vehicle: Vehicle, name: str) -> Section:
    if found.scatter is None:
        return Section("Scatter")
    own = found.scatter
    sources = sources_of(own.noise, own.segment_energy, vehicle.unit, charges_only=own.charges_only)
    rows = tuple(_source(each) for each in sources)
    heads = ("source", "sd, of a segment", "share of the variance", "detail")
    table = Table("Scatter of one segment, from one known level to the next", heads, rows, figures=True)
    if any(each.share is None for each in sources):
        return Section("Scatter", tables=(table,))
    caption = "Where the scatter of one segment comes from."
    return Section("Scatter", (), (), (Picture(f"{name}-noise", noise.draw(sources), caption),), (table,))


def _source(each: Source) -> tuple[str, ...]:
    size = "-" if each.percent is None else join(f"{each.percent:.1f} %")
    share = "-" if each.share is None else join(f"{100 * each.share:.0f} %")
    return each.label, size, share, each.detail


def _records(found: MonthReport, vehicle: Vehicle) -> Section:
    review = found.review
    rows = _pairs(review_rows.quality(review, vehicle))
    table = Table(f"Records of {review.month}", ("", "count"), rows)
    return Section("Records", items=tuple(map(plain_text, review.warnings)), tables=(table,))


def _pairs(rows: list[tuple[str, str]]) -> tuple[tuple[str, str], ...]:
    return tuple((label.strip(), value) for label, value in rows)
