"""`python -m tests.evidence`: measure the tables of docs/evidence.md, with a progress bar where a terminal is."""

from __future__ import annotations

import argparse
from pathlib import Path

from tests.evidence import parts
from tests.evidence.cores import measured
from tests.evidence.document import DOCUMENT, put
from tests.uses import USES

COLUMNS_OF_REAL_LOGS = "CSV files with date, distance_km, energy_litres or energy_kwh, and the like"


def main() -> None:
    asked = _arguments()
    uses = tuple(use for use in USES if asked.kind in (None, use.vehicle))
    chosen = [*parts.simulated(uses, asked.logs), *(parts.real(asked.sham) if asked.sham else [])]
    for block in parts.blocks(chosen, measured(chosen)):
        print(f"{block.name}\n\n{block.markdown()}\n")
        if asked.write:
            put(block, asked.document)


def _arguments() -> argparse.Namespace:
    parser = argparse.ArgumentParser(prog="python -m tests.evidence", description="Measure the tables of evidence.md.")
    parser.add_argument("--write", action="store_true", help="also put the tables between the document's markers")
    parser.add_argument("--sham", type=Path, metavar="FOLDER", help=f"also real logs: {COLUMNS_OF_REAL_LOGS}")
    parser.add_argument("--logs", type=int, metavar="N", help="at most N logs of each kind, for a try")
    parser.add_argument("--kind", choices=[use.vehicle for use in USES], help="one kind of use only, for a try")
    parser.add_argument("--document", type=Path, default=DOCUMENT, help="docs/evidence.md where not given")
    return parser.parse_args()


if __name__ == "__main__":
    main()
