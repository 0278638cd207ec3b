"""Tests run on every core at once: each keeps to one thread of linear algebra, and so do the processes it starts."""

from __future__ import annotations

from energytrack.cli.threads import one_thread

one_thread()
