"""`datapackage.json`: what an exported folder holds, by the Data Package standard, version 2 (Frictionless, 2024)."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from energytrack.errors import LogbookError
from energytrack.logbook.export_tables import Column, Table

FILE = "datapackage.json"
PROFILE = "https://datapackage.org/profiles/2.0/datapackage.json"
LARGEST = 10_000_000  # bytes
_ABOUT = "Text that begins with = + - @ tab, carriage return or apostrophe has an apostrophe before it."


def descriptor(tables: Sequence[Table], written: Mapping[str, tuple[int, str]], version: int) -> str:
    """The text of the file. `written`: bytes and SHA-256 of each table, by its file name."""
    package = {
        "$schema": PROFILE,
        "name": "energytrack-logbook",
        "description": _ABOUT,
        "logbook_version": version,
        "resources": [_resource(table, *written[table.file]) for table in tables],
    }
    return json.dumps(package, indent=2) + "\n"


def read_descriptor(folder: Path) -> dict[str, Any] | None:
    """The descriptor of an exported folder; None for any other folder. Raises LogbookError."""
    path = folder / FILE
    if not path.is_file() or path.stat().st_size > LARGEST:
        return None
    try:
        found = json.loads(path.read_text(encoding="utf-8"))
    except (ValueError, RecursionError):
        return None
    except OSError as error:
        raise LogbookError(f"{path} cannot be read: {error.strerror}") from None
    return found if isinstance(found, dict) and isinstance(found.get("logbook_version"), int) else None


def digests(package: Mapping[str, Any]) -> dict[str, str]:
    """SHA-256 of each table by its file name, as the descriptor states it."""
    resources = package.get("resources")
    stated = [each for each in resources if isinstance(each, dict)] if isinstance(resources, list) else []
    return {str(each.get("path")): str(each.get("hash")).removeprefix("sha256:") for each in stated}


def _resource(table: Table, size: int, digest: str) -> dict[str, Any]:
    return {
        "name": table.file.removesuffix(".csv").replace("/", "-"),
        "type": "table",
        "path": table.file,
        "format": "csv",
        "mediatype": "text/csv",
        "encoding": "utf-8",
        "bytes": size,
        "hash": f"sha256:{digest}",
        "schema": {"fields": [_field(column) for column in table.columns], "missingValues": [""]},
    }


def _field(column: Column) -> dict[str, Any]:
    field: dict[str, Any] = {"name": column.name, "type": column.type}
    if column.type == "boolean":
        field |= {"trueValues": ["yes"], "falseValues": ["no"]}
    if column.required and column.type != "string":  # a text that must be there may be empty
        field["constraints"] = {"required": True}
    return field
