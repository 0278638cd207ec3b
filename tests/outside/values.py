"""Check values computed by other packages, kept beside the name and version of the package that made them."""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import pandas as pd

FOLDER = Path(__file__).parent / "reference"


@dataclass(frozen=True)
class Reference:
    """One record: what was computed, from which inputs, by which package, and how closely to agree."""

    id: str
    quantity: str
    inputs: Any
    values: Any
    tolerance: float
    source: str
    computed_with: str
    note: str = ""


@cache
def references() -> dict[str, Reference]:
    """All records by id."""
    records = json.loads((FOLDER / "values.json").read_text(encoding="utf-8"))["records"]
    return {record["id"]: Reference(**record) for record in records}


def reference(id: str) -> Reference:
    """One record, such as "gls.tridiag.REML"."""
    return references()[id]


def table(name: str) -> pd.DataFrame:
    """A series made for this project: tridiag_logbook, ma1_logbook or synthetic_logbook."""
    return pd.read_csv(FOLDER / f"{name}.csv")
