-- The tables of version 3 of a logbook file, as they were released. Never changed.

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
, second_carrier TEXT, second_unit TEXT CHECK (second_unit IN ('L', 'kg', 'kWh')), second_capacity REAL CHECK (second_capacity > 0), change_id INTEGER REFERENCES change (id)) STRICT;
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
    struck INTEGER NOT NULL DEFAULT 0 CHECK (struck IN (0, 1)), change_id INTEGER REFERENCES change (id), origin INTEGER REFERENCES entry (id),
    CHECK (struck = 0 OR supersedes IS NOT NULL)
) STRICT;
CREATE INDEX entry_by_odometer ON entry (vehicle_id, odometer_km, date);
CREATE VIEW standing_entry AS
    SELECT * FROM entry AS this
    WHERE struck = 0 AND NOT EXISTS (SELECT 1 FROM entry AS later WHERE later.supersedes = this.id);
CREATE TRIGGER entry_kept BEFORE DELETE ON entry BEGIN SELECT RAISE(ABORT, 'rows of entry are never changed: add one that supersedes it'); END;
CREATE TRIGGER entry_not_replaced BEFORE INSERT ON entry
    WHEN EXISTS (SELECT 1 FROM entry WHERE id = NEW.id OR supersedes = NEW.supersedes) BEGIN SELECT RAISE(ABORT, 'rows of entry are never changed: add one that supersedes it'); END;
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
    struck INTEGER NOT NULL DEFAULT 0 CHECK (struck IN (0, 1)), known_low_percent REAL, known_high_percent REAL
    CHECK ((known_low_percent IS NULL) = (known_high_percent IS NULL) AND
           (known_low_percent IS NULL OR known_low_percent <= known_high_percent)), reversible INTEGER NOT NULL DEFAULT 1 CHECK (reversible IN (0, 1)), change_id INTEGER REFERENCES change (id),
    CHECK (date IS NOT NULL OR odometer_km IS NOT NULL),
    CHECK (struck = 0 OR supersedes IS NOT NULL)
) STRICT;
CREATE INDEX switch_of_vehicle ON switch (vehicle_id, modification);
CREATE VIEW standing_switch AS
    SELECT * FROM switch AS this
    WHERE struck = 0 AND NOT EXISTS (SELECT 1 FROM switch AS later WHERE later.supersedes = this.id);
CREATE TRIGGER switch_kept BEFORE DELETE ON switch BEGIN SELECT RAISE(ABORT, 'rows of switch are never changed: add one that supersedes it'); END;
CREATE TRIGGER switch_not_replaced BEFORE INSERT ON switch
    WHEN EXISTS (SELECT 1 FROM switch WHERE id = NEW.id OR supersedes = NEW.supersedes) BEGIN SELECT RAISE(ABORT, 'rows of switch are never changed: add one that supersedes it'); END;
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
    struck INTEGER NOT NULL DEFAULT 0 CHECK (struck IN (0, 1)), change_id INTEGER REFERENCES change (id),
    CHECK (struck = 0 OR supersedes IS NOT NULL)
) STRICT;
CREATE INDEX event_of_vehicle ON event (vehicle_id, date);
CREATE VIEW standing_event AS
    SELECT * FROM event AS this
    WHERE struck = 0 AND NOT EXISTS (SELECT 1 FROM event AS later WHERE later.supersedes = this.id);
CREATE TRIGGER event_kept BEFORE DELETE ON event BEGIN SELECT RAISE(ABORT, 'rows of event are never changed: add one that supersedes it'); END;
CREATE TRIGGER event_not_replaced BEFORE INSERT ON event
    WHEN EXISTS (SELECT 1 FROM event WHERE id = NEW.id OR supersedes = NEW.supersedes) BEGIN SELECT RAISE(ABORT, 'rows of event are never changed: add one that supersedes it'); END;
CREATE TABLE assessment (
    id INTEGER PRIMARY KEY,
    vehicle_id INTEGER NOT NULL REFERENCES vehicle (id),
    modification TEXT NOT NULL,
    result TEXT NOT NULL,        -- JSON, without its looks
    recorded_at TEXT NOT NULL
) STRICT;
CREATE INDEX assessment_latest ON assessment (vehicle_id, modification, id);
CREATE TABLE look (
    id INTEGER PRIMARY KEY,
    vehicle_id INTEGER NOT NULL REFERENCES vehicle (id),
    modification TEXT NOT NULL,
    at_km REAL NOT NULL,         -- end of the newest closed segment, on the log's own scale
    date TEXT NOT NULL,          -- end of that segment
    recorded_at TEXT NOT NULL
) STRICT;
CREATE INDEX look_of_modification ON look (vehicle_id, modification, at_km);
CREATE TRIGGER look_kept_as_written BEFORE UPDATE ON look BEGIN SELECT RAISE(ABORT, 'rows of look are never changed'); END;
CREATE TRIGGER look_kept BEFORE DELETE ON look BEGIN SELECT RAISE(ABORT, 'rows of look are never changed'); END;
CREATE TRIGGER look_not_replaced BEFORE INSERT ON look
    WHEN EXISTS (SELECT 1 FROM look WHERE id = NEW.id) BEGIN SELECT RAISE(ABORT, 'rows of look are never changed'); END;
CREATE TABLE confirmation (      -- an entry that looks odd and is right
    entry_id INTEGER PRIMARY KEY REFERENCES entry (id),
    recorded_at TEXT NOT NULL
, change_id INTEGER REFERENCES change (id)) STRICT;
CREATE TRIGGER confirmation_kept BEFORE DELETE ON confirmation BEGIN SELECT RAISE(ABORT, 'rows of confirmation are never changed'); END;
CREATE TRIGGER confirmation_not_replaced BEFORE INSERT ON confirmation
    WHEN EXISTS (SELECT 1 FROM confirmation WHERE entry_id = NEW.entry_id) BEGIN SELECT RAISE(ABORT, 'rows of confirmation are never changed'); END;
CREATE TABLE change (            -- what was recorded in one go; numbered in the order of recording
    id INTEGER PRIMARY KEY,
    what TEXT NOT NULL CHECK (what <> ''),
    why TEXT NOT NULL,
    undoes INTEGER UNIQUE REFERENCES change (id),
    recorded_at TEXT NOT NULL    -- UTC
) STRICT;
CREATE INDEX change_by_moment ON change (recorded_at);
CREATE TRIGGER entry_kept_as_written BEFORE UPDATE ON entry BEGIN SELECT RAISE(ABORT, 'rows of entry are never changed: add one that supersedes it'); END;
CREATE TRIGGER switch_kept_as_written BEFORE UPDATE ON switch BEGIN SELECT RAISE(ABORT, 'rows of switch are never changed: add one that supersedes it'); END;
CREATE TRIGGER event_kept_as_written BEFORE UPDATE ON event BEGIN SELECT RAISE(ABORT, 'rows of event are never changed: add one that supersedes it'); END;
CREATE TRIGGER confirmation_kept_as_written BEFORE UPDATE ON confirmation BEGIN SELECT RAISE(ABORT, 'rows of confirmation are never changed'); END;
CREATE TRIGGER change_kept_as_written BEFORE UPDATE ON change BEGIN SELECT RAISE(ABORT, 'rows of change are never changed'); END;
CREATE TRIGGER change_kept BEFORE DELETE ON change BEGIN SELECT RAISE(ABORT, 'rows of change are never changed'); END;
CREATE TRIGGER change_not_replaced BEFORE INSERT ON change
    WHEN EXISTS (SELECT 1 FROM change WHERE id = NEW.id) BEGIN SELECT RAISE(ABORT, 'rows of change are never changed'); END;
CREATE TRIGGER vehicle_kept_as_written BEFORE UPDATE ON vehicle BEGIN SELECT RAISE(ABORT, 'rows of vehicle are never changed'); END;
CREATE TRIGGER vehicle_kept BEFORE DELETE ON vehicle BEGIN SELECT RAISE(ABORT, 'rows of vehicle are never changed'); END;
CREATE TRIGGER vehicle_not_replaced BEFORE INSERT ON vehicle
    WHEN EXISTS (SELECT 1 FROM vehicle WHERE name = NEW.name) BEGIN SELECT RAISE(ABORT, 'rows of vehicle are never changed'); END;
CREATE INDEX entry_in_driving_order ON entry (vehicle_id, date, odometer_km, coalesce(origin, id));
CREATE INDEX entry_revisions ON entry (origin) WHERE origin IS NOT NULL;
CREATE TABLE weather (
    id INTEGER PRIMARY KEY,
    date TEXT NOT NULL,
    temperature_c REAL,          -- null: what was given is taken back
    change_id INTEGER REFERENCES change (id),
    recorded_at TEXT NOT NULL    -- empty: before version 3
) STRICT;
CREATE INDEX weather_by_date ON weather (date, id);
CREATE VIEW standing_weather AS
    SELECT * FROM weather AS this
    WHERE temperature_c IS NOT NULL
    AND NOT EXISTS (SELECT 1 FROM weather AS later WHERE later.date = this.date AND later.id > this.id);
CREATE TRIGGER weather_kept_as_written BEFORE UPDATE ON weather BEGIN SELECT RAISE(ABORT, 'rows of weather are never changed'); END;
CREATE TRIGGER weather_kept BEFORE DELETE ON weather BEGIN SELECT RAISE(ABORT, 'rows of weather are never changed'); END;
CREATE TRIGGER weather_not_replaced BEFORE INSERT ON weather
    WHEN EXISTS (SELECT 1 FROM weather WHERE id = NEW.id) BEGIN SELECT RAISE(ABORT, 'rows of weather are never changed'); END;
PRAGMA application_id = 1701737586;
PRAGMA user_version = 3;
