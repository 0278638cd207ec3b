"""The tables of a logbook file, as the steps that lead from one version to the next.

What was logged is never overwritten. A correction is a further row that supersedes the earlier one; striking an entry
is such a row with `struck` set. `supersedes` is unique, so that each row has one successor at most. `origin` names the
first row of such a chain: the number its entry keeps. What was recorded in one go shares a row of `change`, whose
number gives the order of recording, whatever the clock said.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterator

from energytrack.errors import LogbookError

APPLICATION_ID = 0x656E7472  # "entr", in the file's header: tells a logbook from any other SQLite file


def _append_only(table: str) -> str:
    """The rows that stand, and guards: no UPDATE, no DELETE, no INSERT in the place of an earlier row."""
    refuse = f"BEGIN SELECT RAISE(ABORT, 'rows of {table} are never changed: add one that supersedes it'); END;"
    return f"""
CREATE VIEW standing_{table} AS
    SELECT * FROM {table} AS this
    WHERE struck = 0 AND NOT EXISTS (SELECT 1 FROM {table} AS later WHERE later.supersedes = this.id);
CREATE TRIGGER {table}_kept_as_written BEFORE UPDATE ON {table} {refuse}
CREATE TRIGGER {table}_kept BEFORE DELETE ON {table} {refuse}
CREATE TRIGGER {table}_not_replaced BEFORE INSERT ON {table}
    WHEN EXISTS (SELECT 1 FROM {table} WHERE id = NEW.id OR supersedes = NEW.supersedes) {refuse}
"""


_VERSION_1 = f"""
CREATE TABLE vehicle (
    id INTEGER PRIMARY KEY,
    name TEXT NOT NULL UNIQUE CHECK (name <> ''),
    carrier TEXT NOT NULL,
    unit TEXT NOT NULL CHECK (unit IN ('L', 'kg', 'kWh')),
    capacity REAL CHECK (capacity > 0),
    distance_unit TEXT NOT NULL CHECK (distance_unit IN ('km', 'mi')),
    display TEXT,
    note TEXT NOT NULL,
    typed_unit TEXT,
    recorded_at TEXT NOT NULL
) STRICT;

CREATE TABLE entry (
    id INTEGER PRIMARY KEY,
    vehicle_id INTEGER NOT NULL REFERENCES vehicle (id),
    date TEXT NOT NULL,
    odometer_km REAL,
    distance_km REAL,
    energy REAL,                 -- in the vehicle's unit; null: the receipt has no amount
    kind TEXT NOT NULL CHECK (kind IN ('fill-up', 'charge')),
    full INTEGER NOT NULL CHECK (full IN (0, 1)),
    level_percent REAL CHECK (level_percent BETWEEN 0 AND 100),
    missed INTEGER NOT NULL CHECK (missed IN (0, 1)),
    cost REAL,
    currency TEXT,
    temperature_c REAL,
    speed_kmh REAL,
    place TEXT NOT NULL,
    note TEXT NOT NULL,
    extra TEXT NOT NULL,         -- JSON: further numeric columns
    typed TEXT NOT NULL,         -- JSON: what was typed, values with their units
    source TEXT NOT NULL,        -- where it came from: the terminal, or the name of a file
    recorded_at TEXT NOT NULL,   -- UTC
    supersedes INTEGER UNIQUE REFERENCES entry (id),
    struck INTEGER NOT NULL DEFAULT 0 CHECK (struck IN (0, 1)),
    CHECK (struck = 0 OR supersedes IS NOT NULL)
) STRICT;

CREATE INDEX entry_in_driving_order ON entry (vehicle_id, date, odometer_km, id);
CREATE INDEX entry_by_odometer ON entry (vehicle_id, odometer_km, date);

{_append_only("entry")}

CREATE TABLE switch (
    id INTEGER PRIMARY KEY,
    vehicle_id INTEGER NOT NULL REFERENCES vehicle (id),
    modification TEXT NOT NULL CHECK (modification <> ''),
    action TEXT NOT NULL CHECK (action IN ('fitted', 'removed')),
    date TEXT,
    odometer_km REAL,
    level REAL,
    target_percent REAL,
    note TEXT NOT NULL,
    recorded_at TEXT NOT NULL,
    supersedes INTEGER UNIQUE REFERENCES switch (id),
    struck INTEGER NOT NULL DEFAULT 0 CHECK (struck IN (0, 1)),
    CHECK (date IS NOT NULL OR odometer_km IS NOT NULL),
    CHECK (struck = 0 OR supersedes IS NOT NULL)
) STRICT;

CREATE INDEX switch_of_vehicle ON switch (vehicle_id, modification);

{_append_only("switch")}

CREATE TABLE event (
    id INTEGER PRIMARY KEY,
    vehicle_id INTEGER NOT NULL REFERENCES vehicle (id),
    date TEXT NOT NULL,
    odometer_km REAL,
    what TEXT NOT NULL,
    odometer_factor REAL CHECK (odometer_factor > 0),
    note TEXT NOT NULL,
    recorded_at TEXT NOT NULL,
    supersedes INTEGER UNIQUE REFERENCES event (id),
    struck INTEGER NOT NULL DEFAULT 0 CHECK (struck IN (0, 1)),
    CHECK (struck = 0 OR supersedes IS NOT NULL)
) STRICT;

CREATE INDEX event_of_vehicle ON event (vehicle_id, date);

{_append_only("event")}

CREATE TABLE weather (
    date TEXT PRIMARY KEY,
    temperature_c REAL NOT NULL
) STRICT, WITHOUT ROWID;

CREATE TABLE assessment (
    id INTEGER PRIMARY KEY,
    vehicle_id INTEGER NOT NULL REFERENCES vehicle (id),
    modification TEXT NOT NULL,
    result TEXT NOT NULL,        -- JSON, without its looks
    recorded_at TEXT NOT NULL
) STRICT;

CREATE INDEX assessment_latest ON assessment (vehicle_id, modification, id);
"""


def _kept_for_good(table: str, key: str) -> str:
    """Guards of a table whose rows nothing supersedes."""
    refuse = f"BEGIN SELECT RAISE(ABORT, 'rows of {table} are never changed'); END;"
    return f"""
CREATE TRIGGER {table}_kept_as_written BEFORE UPDATE ON {table} {refuse}
CREATE TRIGGER {table}_kept BEFORE DELETE ON {table} {refuse}
CREATE TRIGGER {table}_not_replaced BEFORE INSERT ON {table}
    WHEN EXISTS (SELECT 1 FROM {table} WHERE {key} = NEW.{key}) {refuse}
"""


_VERSION_2 = f"""
ALTER TABLE switch ADD COLUMN known_low_percent REAL;
ALTER TABLE switch ADD COLUMN known_high_percent REAL
    CHECK ((known_low_percent IS NULL) = (known_high_percent IS NULL) AND
           (known_low_percent IS NULL OR known_low_percent <= known_high_percent));
ALTER TABLE switch ADD COLUMN reversible INTEGER NOT NULL DEFAULT 1 CHECK (reversible IN (0, 1));

ALTER TABLE vehicle ADD COLUMN second_carrier TEXT;
ALTER TABLE vehicle ADD COLUMN second_unit TEXT CHECK (second_unit IN ('L', 'kg', 'kWh'));
ALTER TABLE vehicle ADD COLUMN second_capacity REAL CHECK (second_capacity > 0);

CREATE TABLE look (
    id INTEGER PRIMARY KEY,
    vehicle_id INTEGER NOT NULL REFERENCES vehicle (id),
    modification TEXT NOT NULL,
    at_km REAL NOT NULL,         -- end of the newest closed segment, on the log's own scale
    date TEXT NOT NULL,          -- end of that segment
    recorded_at TEXT NOT NULL
) STRICT;

CREATE INDEX look_of_modification ON look (vehicle_id, modification, at_km);

{_kept_for_good("look", "id")}

CREATE TABLE confirmation (      -- an entry that looks odd and is right
    entry_id INTEGER PRIMARY KEY REFERENCES entry (id),
    recorded_at TEXT NOT NULL
) STRICT;

{_kept_for_good("confirmation", "entry_id")}
"""

_DATED = ("entry", "switch", "event", "vehicle", "confirmation")  # rows that were recorded at a moment


def _written_again(table: str, advice: str) -> tuple[str, str]:
    """Take the guard against UPDATE away, and put it back."""
    refuse = f"BEGIN SELECT RAISE(ABORT, 'rows of {table} are never changed{advice}'); END;"
    return (
        f"DROP TRIGGER {table}_kept_as_written;",
        f"CREATE TRIGGER {table}_kept_as_written BEFORE UPDATE ON {table} {refuse}",
    )


def _recorded(table: str) -> str:
    """Number and moment of recording of each row; where the clock was set back, the latest moment before."""
    key = "entry_id" if table == "confirmation" else "id"
    return f"SELECT {key} AS number, max(recorded_at) OVER (ORDER BY {key}) AS moment FROM {table}"


def _ascribe(table: str) -> str:
    """Give the rows that are there the change of their moment."""
    key = "entry_id" if table == "confirmation" else "id"
    return f"""
ALTER TABLE {table} ADD COLUMN change_id INTEGER REFERENCES change (id);
UPDATE {table} SET change_id = (SELECT id FROM change WHERE recorded_at = seen.moment)
    FROM ({_recorded(table)}) AS seen WHERE {key} = seen.number;
"""


_lines = "\n".join
_GUARDED = [_written_again(table, ": add one that supersedes it") for table in ("entry", "switch", "event")]
_GUARDED += [_written_again("confirmation", "")]

_VERSION_3 = f"""
CREATE TABLE change (            -- what was recorded in one go; numbered in the order of recording
    id INTEGER PRIMARY KEY,
    what TEXT NOT NULL CHECK (what <> ''),
    why TEXT NOT NULL,
    undoes INTEGER UNIQUE REFERENCES change (id),
    recorded_at TEXT NOT NULL    -- UTC
) STRICT;

CREATE INDEX change_by_moment ON change (recorded_at);

INSERT INTO change (what, why, recorded_at)
    SELECT DISTINCT 'logged', '', moment FROM ({" UNION ".join(f"SELECT moment FROM ({_recorded(t)})" for t in _DATED)})
    ORDER BY moment;

{_lines(off for off, _ in _GUARDED)}
{_lines(_ascribe(table) for table in _DATED)}
ALTER TABLE entry ADD COLUMN origin INTEGER REFERENCES entry (id);  -- null: the first row of its chain
UPDATE entry SET origin = (
    WITH RECURSIVE back (id, supersedes) AS (
        SELECT entry.id, entry.supersedes
        UNION ALL SELECT earlier.id, earlier.supersedes FROM entry AS earlier JOIN back ON earlier.id = back.supersedes
    ) SELECT id FROM back WHERE supersedes IS NULL
) WHERE supersedes IS NOT NULL;
{_lines(on for _, on in _GUARDED)}
{_kept_for_good("change", "id")}
{_kept_for_good("vehicle", "name")}

DROP INDEX entry_in_driving_order;
CREATE INDEX entry_in_driving_order ON entry (vehicle_id, date, odometer_km, coalesce(origin, id));
CREATE INDEX entry_revisions ON entry (origin) WHERE origin IS NOT NULL;

ALTER TABLE weather RENAME TO weather_before;
CREATE TABLE weather (
    id INTEGER PRIMARY KEY,
    date TEXT NOT NULL,
    temperature_c REAL,          -- null: what was given is taken back
    change_id INTEGER REFERENCES change (id),
    recorded_at TEXT NOT NULL    -- empty: before version 3
) STRICT;
INSERT INTO weather (date, temperature_c, recorded_at) SELECT date, temperature_c, '' FROM weather_before ORDER BY date;
DROP TABLE weather_before;
CREATE INDEX weather_by_date ON weather (date, id);
CREATE VIEW standing_weather AS
    SELECT * FROM weather AS this
    WHERE temperature_c IS NOT NULL
    AND NOT EXISTS (SELECT 1 FROM weather AS later WHERE later.date = this.date AND later.id > this.id);
{_kept_for_good("weather", "id")}
"""

_VERSION_4 = """
CREATE TABLE watch (             -- how far the monitor of a vehicle's consumption has come; made anew at any time
    vehicle_id INTEGER PRIMARY KEY REFERENCES vehicle (id),
    state TEXT NOT NULL,         -- JSON
    entry_row INTEGER NOT NULL,  -- the newest rows it knows of
    switch_row INTEGER NOT NULL,
    event_row INTEGER NOT NULL,
    recorded_at TEXT NOT NULL
) STRICT;

ALTER TABLE vehicle ADD COLUMN co2_kg REAL CHECK (co2_kg >= 0);
ALTER TABLE vehicle ADD COLUMN second_co2_kg REAL CHECK (second_co2_kg >= 0);
"""

# step n leads from version n to n + 1; never change one that was released
MIGRATIONS: tuple[str, ...] = (_VERSION_1, _VERSION_2, _VERSION_3, _VERSION_4)


def version_of(connection: sqlite3.Connection) -> int:
    """The version of the tables in this file; 0 for none."""
    version: int = connection.execute("PRAGMA user_version").fetchone()[0]
    return version


def migrate(
    connection: sqlite3.Connection,
    steps: tuple[str, ...] | None = None,
    before: Callable[[int], object] | None = None,
) -> None:
    """Bring the tables to the newest version, wholly or not at all.

    `before` is called with the version of older tables, once nobody else can write and nothing is changed yet. Raises
    LogbookError where the file was written by a newer version of this program.
    """
    steps = MIGRATIONS if steps is None else steps
    version = version_of(connection)
    if version > len(steps):
        raise LogbookError(
            f"the logbook has tables of version {version}, this program knows versions up to {len(steps)}: "
            "install the newer energytrack"
        )
    if version < len(steps):
        _apply(connection, steps, before)


def _apply(
    connection: sqlite3.Connection, steps: tuple[str, ...], before: Callable[[int], object] | None
) -> None:
    """All missing steps in one transaction; the version is read again under the lock, another process may be first."""
    connection.execute("BEGIN IMMEDIATE")
    try:
        version = version_of(connection)
        if before is not None and version < len(steps):
            before(version)
        for step in steps[version:]:
            for statement in _statements(step):
                connection.execute(statement)
        connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
        connection.execute(f"PRAGMA user_version = {len(steps)}")
        connection.execute("COMMIT")
    except BaseException:
        if connection.in_transaction:
            connection.execute("ROLLBACK")
        raise


def _statements(script: str) -> Iterator[str]:
    """The statements of a script one by one: `executescript` would commit before it starts."""
    statement = ""
    for line in script.splitlines(keepends=True):
        statement += line
        if sqlite3.complete_statement(statement):
            yield statement
            statement = ""
