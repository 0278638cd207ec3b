from __future__ import annotations

from pathlib import Path

import pytest

from energytrack.inference.fleet.assess_fleet import assess_fleet
from energytrack.inference.fleet.logs import fleet_logs
from energytrack.inference.fleet.results import FleetAssessment
from energytrack.inference.report.results import MonthReport
from energytrack.logbook.records import Vehicle
from energytrack.presentation.report.html import html
from tests.report import logs


@pytest.fixture(scope="session")
def book(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("report") / "mischief.logbook"
    logs.make(path).close()
    return path


@pytest.fixture(scope="session")
def found(book: Path) -> list[tuple[Vehicle, MonthReport]]:
    return logs.reported(book)


@pytest.fixture(scope="session")
def fleet(book: Path) -> FleetAssessment:
    return assess_fleet(fleet_logs(book), month="2025-04")


@pytest.fixture(scope="session")
def text(found: list[tuple[Vehicle, MonthReport]], fleet: FleetAssessment) -> str:
    return html(logs.page(found, fleet=fleet))


@pytest.fixture(scope="session")
def file(text: str, tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("page") / "report.html"
    path.write_text(text, encoding="utf-8")
    return path
