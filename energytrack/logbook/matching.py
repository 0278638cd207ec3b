"""Which column of a table is which of ours: by name, as told, or by holding nothing but numbers."""

from __future__ import annotations

from collections.abc import Mapping

from energytrack.logbook.cells import CellError, number_reader
from energytrack.logbook.columns import Form, Reader
from energytrack.logbook.csvfile import CsvFile, UnreadableTableError
from energytrack.logbook.quantities import in_short
from energytrack.logbook.records import Problem


def match_columns(
    table: CsvFile, form: Form, readers: Mapping[str, Reader], required: tuple[str, ...], notes: list[str]
) -> list[tuple[str, int, Reader]]:
    """Our column, its place in a row and its reader; a further column of numbers is named with a leading "+".

    Columns left out are told in `notes`. Raises UnreadableTableError where a needed column is missing.
    """
    places = _places(table)
    by_name = {title.casefold(): place for title, place in places.items()} | places
    matched = {name: by_name[name] for name in readers if name in by_name and name not in form.columns}
    for ours, theirs in form.columns.items():
        place = by_name.get(theirs, by_name.get(theirs.casefold()))
        if place is None:
            raise _refused(table, f"has no column {in_short(theirs)}; it has {_titles(table)}")
        matched[ours] = place
    entries = "energy" in readers
    lacking = [name for name in required if name not in matched]
    if entries and not matched.keys() & {"odometer_km", "distance_km"}:
        lacking.append("odometer_km")  # or distance_km
    if lacking:
        forms = " ".join(f"--column {name}=..." for name in lacking)
        either = " (odometer_km or distance_km)" if "odometer_km" in lacking else ""
        raise _refused(table, f"has no {', '.join(lacking)}{either}; it has {_titles(table)}. Name them: {forms}")
    if "vehicle" in readers and "vehicle" not in matched and form.vehicle is None:
        raise _refused(table, "has no column vehicle; say with --vehicle whose rows these are")
    further = [name for name in matched if name not in readers]
    if further and not entries:
        raise _refused(table, f"{', '.join(further)}: no such column here; known are {', '.join(readers)}")
    number = number_reader(form.decimal_comma, form.thousands)
    found = [(name, place, readers[name]) for name, place in matched.items() if name in readers]
    found += [("+" + name, matched[name], number) for name in further]
    others = {title: place for title, place in places.items() if place not in matched.values()}
    if others and entries:
        found += [("+" + title, place, number) for title, place in _numeric(table, others, number, notes).items()]
    elif others:
        notes.append(f"columns left out: {', '.join(others)}")
    return found


def _places(table: CsvFile) -> dict[str, int]:
    places: dict[str, int] = {}
    for place, title in enumerate(table.header):
        if title in places:
            raise _refused(table, f"names the column {in_short(title)} twice; give each its own name")
        if title:
            places[title] = place
    return places


def _numeric(table: CsvFile, others: dict[str, int], number: Reader, notes: list[str]) -> dict[str, int]:
    """The columns holding nothing but numbers, found by one pass over the file; the rest are left out with a note."""
    left = dict(others)
    filled: set[str] = set()
    for line, cells in table.rows():
        for title, place in list(left.items()):
            if place < len(cells) and (text := cells[place].strip()):
                filled.add(title)
                try:
                    number(text)
                except CellError:
                    del left[title]
                    notes.append(f"column {title} left out: {in_short(text)} in line {line} is not a number")
        if not left:
            break
    return {title: place for title, place in left.items() if title in filled}


def _titles(table: CsvFile) -> str:
    titles = [in_short(title) for title in table.header if title]
    return ", ".join(titles[:20]) + (f" and {len(titles) - 20} more" if len(titles) > 20 else "") or "no named column"


def _refused(table: CsvFile, message: str) -> UnreadableTableError:
    return UnreadableTableError(Problem(message, str(table.path), 1))
