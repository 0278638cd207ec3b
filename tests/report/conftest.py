from __future__ import annotations

from pathlib import Path

import pytest

from energytrack.inference.report.results import MonthReport
from energytrack.logbook.records import Vehicle
from energytrack.presentation.report.html import html
from tests.report import logs


@pytest.fixture(scope="session")
def found(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[Vehicle, MonthReport]]:
    path = tmp_path_factory.mktemp("report") / "mischief.logbook"
    logs.make(path).close()
    return logs.reported(path)


@pytest.fixture(scope="session")
def text(found: list[tuple[Vehicle, MonthReport]]) -> str:
    return html(logs.page(found))


@pytest.fixture(scope="session")
def file(text: str, tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("page") / "report.html"
    path.write_text(text, encoding="utf-8")
    return path
