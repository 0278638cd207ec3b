"""A logbook as it was: what had been recorded by a day, or up to a change."""

from __future__ import annotations

import datetime as dt
from pathlib import Path

from energytrack.errors import LogbookError
from energytrack.logbook.checks import check_date
from energytrack.logbook.rows import moment_of
from energytrack.logbook.store import Store

_CHAINED = """
CREATE TEMP VIEW standing_{table} AS
    SELECT * FROM main.{table} AS this
    WHERE struck = 0 AND coalesce(change_id, 0) <= {upto}
    AND NOT EXISTS (
        SELECT 1 FROM main.{table} AS later WHERE later.supersedes = this.id AND coalesce(later.change_id, 0) <= {upto}
    )
"""
_WEATHER = """
CREATE TEMP VIEW standing_weather AS
    SELECT * FROM main.weather AS this
    WHERE temperature_c IS NOT NULL AND coalesce(change_id, 0) <= {upto}
    AND NOT EXISTS (
        SELECT 1 FROM main.weather AS later
        WHERE later.date = this.date AND later.id > this.id AND coalesce(later.change_id, 0) <= {upto}
    )
"""
_KEPT = "CREATE TEMP VIEW {table} AS SELECT * FROM main.{table} WHERE coalesce(change_id, 0) <= {upto}"
_STAMPED = """
CREATE TEMP VIEW {table} AS
    SELECT * FROM main.{table}
    WHERE recorded_at < coalesce((SELECT recorded_at FROM main.change WHERE id > {upto} ORDER BY id LIMIT 1), '~')
"""


class EarlierStore(Store):
    """A logbook file read as it stood after change `upto`. Nothing can be written through it."""

    def __init__(self, path: Path, upto: int) -> None:
        super().__init__(path)
        self.writable = False
        views = [_CHAINED.format(table=table, upto=upto) for table in ("entry", "switch", "event")]
        views += [_WEATHER.format(upto=upto)]
        views += [_KEPT.format(table=table, upto=upto) for table in ("vehicle", "confirmation")]
        views += [_STAMPED.format(table=table, upto=upto) for table in ("look", "assessment")]
        with self._guard():
            for view in views:  # found before the views and tables of the file
                self._db.execute(view)
            self._db.execute("PRAGMA query_only = ON")


def as_of(path: Path, day: dt.date) -> EarlierStore:
    """The logbook as it stood at the end of a day of local time, by what had been recorded then.

    Where the clock was set back, what was recorded next counts as recorded no earlier than what came before. Raises
    EntryError for a day to come, LogbookError for a folder of tables.
    """
    if path.is_dir():
        raise LogbookError(f"{path} is a folder of tables and does not tell when they were recorded: import it first")
    check_date(day, dt.date.today())
    end = dt.datetime.combine(day + dt.timedelta(days=1), dt.time()).astimezone()
    store = Store(path)
    try:
        first_later = store.query("SELECT min(id) FROM change WHERE recorded_at >= ?", moment_of(end))[0][0]
        upto = store.last_change() if first_later is None else first_later - 1
    finally:
        store.close()
    return EarlierStore(path, upto)
