"""`python -m tests.evidence simulated` and `python -m tests.evidence sham FOLDER`: the tables of docs/evidence.md."""

from __future__ import annotations

import argparse
from collections.abc import Iterator
from itertools import chain
from pathlib import Path

from tests.evidence import sham, simulated
from tests.evidence.block import Block
from tests.evidence.document import DOCUMENT, put
from tests.uses import USES


def main() -> None:
    asked = _arguments()
    for block in _blocks(asked):
        print(f"{block.name}\n\n{block.markdown()}\n", flush=True)
        if asked.write:
            put(block, asked.document)


def _blocks(asked: argparse.Namespace) -> Iterator[Block]:
    if asked.what == "sham":
        return sham.blocks(asked.folder)
    uses = tuple(use for use in USES if asked.kind in (None, use.vehicle))
    parts = [simulated.PARTS[name] for name in asked.only or simulated.PARTS]
    return chain.from_iterable(part(uses, asked.logs) for part in parts)


def _arguments() -> argparse.Namespace:
    parser = argparse.ArgumentParser(prog="python -m tests.evidence", description="Measure the tables of evidence.md.")
    common = argparse.ArgumentParser(add_help=False)
    common.add_argument("--write", action="store_true", help="also put the tables between the document's markers")
    common.add_argument("--document", type=Path, default=DOCUMENT, help="docs/evidence.md where not given")
    what = parser.add_subparsers(dest="what", required=True)
    drawn = what.add_parser("simulated", parents=[common], help="logs drawn from a known truth; about half an hour")
    drawn.add_argument("--only", action="append", choices=simulated.PARTS, help="one part; may be given several times")
    drawn.add_argument("--logs", type=int, help="at most so many logs of each kind, for a try")
    drawn.add_argument("--kind", choices=[use.vehicle for use in USES], help="one kind of use only, for a try")
    real = what.add_parser("sham", parents=[common], help="sham changes in real logs; minutes")
    real.add_argument("folder", type=Path, help="CSV files with date, distance_km, energy_litres and the like")
    return parser.parse_args()


if __name__ == "__main__":
    main()
