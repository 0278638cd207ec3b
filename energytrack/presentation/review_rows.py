"""Parts of a month's review as rows for a table: tests, money, CO2, changes, records."""

from __future__ import annotations

from energytrack.inference.review.carbon import total
from energytrack.inference.review.results import Price, RegimeChange, Review, UnderTest, Worth
from energytrack.logbook.quantities import rounded
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures
from energytrack.presentation.plain import plain_text
from energytrack.presentation.set_aside import IN_WORDS
from energytrack.presentation.text import join

Row = tuple[str, str]
NO_FACTOR = "not stated: give --grid-factor (g of CO2 per kWh of the grid you charge from)"


def amount(value: float, currency: str | None) -> str:
    """Money that was paid, to the hundredth."""
    return f"{value:,.2f} {plain_text(currency or '')}".rstrip()


def about(value: float, currency: str | None) -> str:
    """Money that was estimated, to two digits."""
    return join(f"{figures.significant(value, 2)} {plain_text(currency or '')}".rstrip())


def tests(found: Review, vehicle: Vehicle) -> list[Row]:
    """How the test of each modification stands."""
    return [(f"  {plain_text(each.name)}", _test(each, vehicle)) for each in found.modifications]


def _test(each: UnderTest, vehicle: Vehicle) -> str:
    said = IN_WORDS[each.verdict]
    if each.settled_on is not None:
        said += f" (settled on {each.settled_on})"
    elif each.information_fraction is not None:
        said += f", {int(100 * min(each.information_fraction, 1.0))} % of the evidence for {each.target_percent:g} %"
    if each.withheld:
        said += ", held back by a change nobody logged"
    if each.is_open and each.distance_to_go_km:
        said += f", about {figures.foretold(each.distance_to_go_km, None, vehicle.distance_unit)} to go"
        said += "" if each.days_to_go is None else f" ({figures.days(each.days_to_go)})"
    if each.shift_percent is not None:
        span = figures.bounded(each.interval_percent)
        within = "" if span is None else f", look-proof range {figures.percent_range(span)}"
        said += f"; {figures.percent(each.shift_percent, signed=True)}{within}"
    return said


def money(found: Review, vehicle: Vehicle) -> list[Row]:
    """A year's cost, and what each modification saves or loses of it."""
    price = found.price
    if price is None:
        return [("  none", found.price_note or "")]
    far = figures.distance(price.yearly_km, vehicle.distance_unit)
    scaled = f", scaled from the log since {price.since}" if price.scaled else ""
    rows = [("  energy", f"about {about(price.yearly_cost, price.currency)} for {far}{scaled}")]
    for each in found.modifications:
        if each.worth is not None:
            rows.append((f"  {plain_text(each.name)}", _worth(each.worth, price, vehicle)))
    return rows


def _worth(worth: Worth, price: Price, vehicle: Vehicle) -> str:
    if not worth.resolved or worth.interval is None:
        between = "" if worth.interval is None else f": {_span(worth.interval, price.currency)}"
        paid = "" if worth.part_cost is None else "; payback not resolved yet"
        return f"not resolved yet{between}{paid}"
    low, high = sorted(map(abs, worth.interval))
    verb = "saves" if worth.yearly > 0 else "costs"
    size, ends = about(abs(worth.yearly), price.currency), (figures.significant(low, 2), about(high, price.currency))
    said = f"{verb} about {size} ({ends[0]} to {ends[1]})"
    if worth.part_cost is None:
        return said
    if worth.payback_km is None or worth.payback_interval_km is None:
        return f"{said}; never paid back"
    unit = vehicle.distance_unit
    span = figures.distance_range(*worth.payback_interval_km, unit)
    paid = about(worth.part_cost, price.currency)
    return f"{said}; {paid} paid back after {figures.distance(worth.payback_km, unit, 2)} ({span})"


def _span(ends: tuple[float, float], currency: str | None) -> str:
    """From a loss to a saving, in words."""
    low, high = (f"{about(abs(end), currency)} {'lost' if end < 0 else 'saved'}" for end in ends)
    return f"{low} to {high}"


def carbon(found: Review) -> list[Row]:
    """CO2 of each carrier, and of all together."""
    rows = []
    for each in found.carbon:
        if each.kg is None:
            why = NO_FACTOR if each.carrier == "electricity" else "not stated: give --co2"
            rows.append((f"  {each.carrier}", why))
            continue
        factor = "" if each.kg_per_unit is None else f"{rounded(each.kg_per_unit, 3)} kg per {each.unit}"
        rows.append((f"  {each.carrier}", f"{join(f'{rounded(each.kg, 3)} kg')} ({factor}; {each.source})"))
    whole = total(found.carbon)
    if len(found.carbon) > 1 and whole is not None:
        rows.append(("  together", join(f"{rounded(whole, 3)} kg")))
    return rows


def changes(found: Review, vehicle: Vehicle) -> list[Row]:
    """Lasting changes, those that are news marked."""
    return [(f"  {each.found.date}", _change(each, vehicle)) for each in found.regimes]


def _change(each: RegimeChange, vehicle: Vehicle) -> str:
    low, high = (figures.driven(end, vehicle.distance_unit) for end in each.found.interval_km)
    size = figures.percent(each.found.shift_percent, signed=True)
    new = "new this month: " if each.new else ""
    why = plain_text(each.found.explained_by or "nothing logged there")
    return f"{new}{size} between {low} and {high}, {why}"


def quality(found: Review, vehicle: Vehicle) -> list[Row]:
    """What is good and what is lacking in the month's records."""
    own = found.quality
    counts = (
        (own.partial, "without a known level"),
        (own.missed, "with one missing before"),
        (own.without_temperature, "without a temperature (filled in)"),
        (own.without_speed, "without a speed (filled in)"),
        (own.without_cost, "without a cost"),
        (len(found.set_aside), "set aside as odd"),
    )
    lacking = [f"{count} {what}" for count, what in counts if count]
    rows = [("  entries", f"{own.entries}: {', '.join(lacking) or 'all whole'}")]
    if found.counted_until is not None:
        rows.append(("  counted", f"until {found.counted_until}, the last entry"))
    if own.unmeasured_km >= 0.5:
        rows.append(("  not measured", f"{figures.driven(own.unmeasured_km, vehicle.distance_unit)}, no known level"))
    return rows
