"""All vehicles of a report as its first chapter: a row a vehicle, and what was fitted to several of them."""

from __future__ import annotations

from collections.abc import Mapping

from energytrack.inference.fleet.results import FleetAssessment
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures, fleet
from energytrack.presentation.report.page import Chapter, Section, Table

NAME = "all-vehicles"
_HEAD = ("vehicle", "driven", "used", "expected", "off by", "SE")


def chapter_of(found: FleetAssessment, vehicles: Mapping[str, Vehicle]) -> Chapter:
    """`vehicles`: by name, for their units."""
    sections = [_held(found, vehicles)]
    others, alone = fleet.not_held(found), fleet.alone_of(found)
    if others:
        sections.append(Section("Not held against their record", items=tuple(others)))
    if found.pooled:
        tables = (
            Table(fleet.pooled_title(one), ("", "answer"), _pairs(fleet.pooled_rows(one, found, vehicles)))
            for one in found.pooled
        )
        sections.append(Section("Fitted to several vehicles", tables=tuple(tables)))
    if alone:
        sections.append(Section("Fitted to one vehicle", items=tuple(alone)))
    lead = f"{fleet.first(found)} {fleet.attention(found)}"
    kept = tuple(each for each in sections if each.tables or each.items)
    return Chapter(NAME, f"All vehicles, {found.month}", lead, kept)


def _held(found: FleetAssessment, vehicles: Mapping[str, Vehicle]) -> Section:
    rows = []
    for each in found.vehicles:
        if each.deviation is not None:
            called, name, driven, used, expected, unit, off, errors = fleet.cells_of(each, vehicles[each.vehicle])
            off = f"{off}, called" if called else off
            rows.append((name, driven, used, f"{expected} {unit}", off, errors))
    if not rows:
        return Section("")
    rate = figures.target(100 * found.false_discovery_rate)
    caption = "Consumption of the month against what each vehicle's own record expects of that month's driving"
    note = (
        f"Furthest from their record first, in standard errors (SE). Of those called, at most {rate} are expected to "
        f"be called by chance."
    )
    return Section("Against their own record", (note,), tables=(Table(caption, _HEAD, tuple(rows), figures=True),))


def _pairs(rows: list[tuple[str, str]]) -> tuple[tuple[str, str], ...]:
    return tuple((label.strip(), value) for label, value in rows)
