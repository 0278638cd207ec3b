"""Text that means mischief to a terminal, a page, a database, a spreadsheet or a reader, and a logbook full of it."""

from __future__ import annotations

import datetime as dt
import math
import random
from pathlib import Path

from energytrack.logbook.records import Entry, Event, Vehicle
from energytrack.logbook.store import Store

MISCHIEF = (
    "=1+1 \x1b]0;title\x07\x1b[31m\x1b[2J [red]{{7*7}} $\\frac{$ <script>alert(1)</script> "
    "\u202eright to left\u2066\u200b '; DROP TABLE entry; -- | `x` [l](javascript:y) ../../x \0\x85\u2028\r\n end"
)


def hostile_logbook(path: Path) -> Path:
    """A van with a part on and off again, every text of it mischief."""
    name, rng, store = f"van {MISCHIEF}", random.Random(3), Store.create(path)
    store.add_vehicle(Vehicle(name, "diesel", "L", 70.0, note=MISCHIEF))
    logged = []
    for tank in range(60):
        day, km = dt.date(2024, 1, 6) + dt.timedelta(5 * tank), 10_500.0 + 500 * tank
        litres = 40 * (0.92 if 30 <= tank < 50 else 1) * math.exp(rng.gauss(0, 0.02))
        logged.append(Entry(name, day, litres, km, cost=60.0, currency="EUR", place=MISCHIEF, note=MISCHIEF))
    store.add_entries([(entry, {"note": MISCHIEF}) for entry in logged], source=MISCHIEF)
    store.fit(name, MISCHIEF, logged[29].date, logged[29].odometer_km, 3.0, None, MISCHIEF)
    store.remove(name, MISCHIEF, logged[49].date, logged[49].odometer_km)
    store.add_event(Event(name, logged[9].date, MISCHIEF, logged[9].odometer_km, None, MISCHIEF))
    store.close()
    return path
