"""Corrections that keep what they correct: a further row supersedes the earlier one, and both stay."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from energytrack.errors import EntryError, LogbookError
from energytrack.logbook import rows
from energytrack.logbook.records import Entry
from energytrack.logbook.store import TYPED, Store

CHAINED = ("entry", "switch", "event")  # tables whose rows supersede one another
_MEASURED = ("date", "odometer_km", "distance_km", "energy", "full", "level_percent", "missed")
_OF_THE_ROW = ("id", "supersedes", "struck", "origin", "change_id", "recorded_at")  # not of what it says


def amend(store: Store, amended: Entry, typed: Mapping[str, Any], why: str = "") -> int:
    """Let the entry of this number say `amended` from now on; the number of the change.

    An entry that was confirmed stays so unless what was measured is amended. Raises UnknownNameError, and EntryError
    where nothing would change.
    """
    number = _number(amended)
    with store.transaction():
        row = store.standing_row(number)
        before = store.entry(amended.vehicle, number)
        sure = before.confirmed and all(getattr(before, name) == getattr(amended, name) for name in _MEASURED)
        if replace(before, confirmed=sure) == replace(amended, confirmed=sure):
            raise EntryError("nothing to amend: the entry says so already")
        change = store.change("amended", why)
        content = {**rows.entry_values(amended), "typed": json.dumps(dict(typed)), "source": TYPED}
        _supersede(store, "entry", row, row, content, confirmed=sure)
    return change


def strike(store: Store, entry: Entry, why: str = "") -> int:
    """Let an entry count no more; it stays in the history. The number of the change. Raises UnknownNameError."""
    with store.transaction():
        row = store.standing_row(_number(entry))
        change = store.change("struck", why)
        _supersede(store, "entry", row, row, {"struck": 1})
    return change


def undo(store: Store, why: str = "") -> int:
    """Take back the newest change that is not taken back yet, by rows that restore what stood before it.

    The number of this change. Vehicles stay. Raises LogbookError where nothing can be taken back.
    """
    with store.transaction():
        taken = "SELECT undoes FROM change WHERE undoes IS NOT NULL"
        found = store.query(f"SELECT max(id) FROM change WHERE undoes IS NULL AND id NOT IN ({taken})")[0][0]
        if found is None:
            raise LogbookError("nothing is left to undo: `history` lists what was done")
        change = store.change("undone", why, undoes=found)
        undone = sum(_restore(store, table, found) for table in CHAINED)
        undone += _unconfirm(store, found) + _restore_weather(store, found)
        if not undone:
            what = store.query("SELECT what FROM change WHERE id = ?", found)[0][0]
            raise LogbookError(f"change {found} ({what}) is not undone: a vehicle stays once it is added")
    return change


def _number(entry: Entry) -> int:
    if entry.id is None:
        raise EntryError("only an entry of a logbook file can be corrected: it has no number")
    return entry.id


def _restore(store: Store, table: str, change: int) -> int:
    """Supersede the rows of a change by what stood before them; how many they are."""
    struck_at_once = _strike_new(store, table, change)
    left = f"NOT EXISTS (SELECT 1 FROM {table} AS later WHERE later.supersedes = this.id AND later.change_id = ?)"
    select = f"SELECT id, supersedes FROM {table} AS this WHERE change_id = ? AND {left} ORDER BY id DESC"
    found = store.query(select, change, store.last_change())
    for row, earlier in found:
        head = _head(store, table, row)
        struck = earlier is None or store.query(f"SELECT struck FROM {table} WHERE id = ?", earlier)[0][0]
        sure = table == "entry" and earlier is not None and _is_confirmed(store, earlier)
        _supersede(store, table, head, row if earlier is None else earlier, {"struck": int(struck)}, confirmed=sure)
    return struck_at_once + len(found)


def _strike_new(store: Store, table: str, change: int) -> int:
    """Strike the rows that a change added and nothing corrected since, all at once: an import may have added many."""
    columns = _columns(store, table)
    kept = ", ".join(name for name in columns if name not in _OF_THE_ROW)
    own, numbers = (", origin", ", id") if "origin" in columns else ("", "")
    moment = "(SELECT recorded_at FROM change WHERE id = ?)"
    alone = f"supersedes IS NULL AND NOT EXISTS (SELECT 1 FROM {table} AS later WHERE later.supersedes = this.id)"
    return store.write(
        f"INSERT INTO {table} ({kept}, supersedes, struck{own}, change_id, recorded_at) "
        f"SELECT {kept}, id, 1{numbers}, ?, {moment} FROM {table} AS this WHERE change_id = ? AND {alone} ORDER BY id",
        *(store.last_change(), store.last_change(), change),
    )


def _columns(store: Store, table: str) -> list[str]:
    return [name for (name,) in store.query("SELECT name FROM pragma_table_info(?)", table)]


def _unconfirm(store: Store, change: int) -> int:
    """Take back confirmations that came alone; those that came with their entry went with it."""
    alone = "SELECT 1 FROM entry WHERE entry.id = entry_id AND entry.change_id = confirmation.change_id"
    select = f"SELECT entry_id FROM confirmation WHERE change_id = ? AND NOT EXISTS ({alone})"
    found = store.query(select, change)
    for (row,) in found:
        head = _head(store, "entry", row)
        _supersede(store, "entry", head, head, {})
    return len(found)


def _restore_weather(store: Store, change: int) -> int:
    before = "SELECT temperature_c FROM weather AS old WHERE old.date = this.date AND old.id < this.id"
    select = f"SELECT date, ({before} ORDER BY id DESC LIMIT 1) FROM weather AS this WHERE change_id = ?"
    found = store.query(f"{select} ORDER BY id DESC", change)
    for date, temperature in found:
        store.append("weather", {"date": date, "temperature_c": temperature})
    return len(found)


def _head(store: Store, table: str, row: int) -> int:
    """The last row of a chain."""
    while later := store.query(f"SELECT id FROM {table} WHERE supersedes = ?", row):
        row = later[0][0]
    return row


def _is_confirmed(store: Store, row: int) -> bool:
    return bool(store.query("SELECT 1 FROM confirmation WHERE entry_id = ?", row))


def _supersede(
    store: Store, table: str, row: int, like: int, content: Mapping[str, Any], *, confirmed: bool = False
) -> None:
    """Put a row in the place of `row` that says what `like` says, but for `content`."""
    columns = _columns(store, table)
    kept = [name for name in columns if name not in _OF_THE_ROW]
    values = dict(zip(kept, store.query(f"SELECT {', '.join(kept)} FROM {table} WHERE id = ?", like)[0], strict=True))
    if "origin" in columns:
        values["origin"] = store.query(f"SELECT coalesce(origin, id) FROM {table} WHERE id = ?", row)[0][0]
    number = store.append(table, {**values, "supersedes": row, **content})
    if confirmed:
        store.append("confirmation", {"entry_id": number})
