"""The brief form says what `assess` says."""

from __future__ import annotations

import pickle

import pytest

from energytrack.consumption.frames import FramedLogbook
from energytrack.inference.assess import assess
from energytrack.inference.fleet.logs import fleet_logs, pack, unpack
from energytrack.inference.fleet.vehicle import Asked, review
from energytrack.inference.review.month import month_of
from energytrack.logbook.opening import open_logbook
from tests.documents import ROOT
from tests.fleets import fleet, write

ASKED = Asked(month_of("2024-03"), None, None, 0.03, 0.95, 0.80)


@pytest.fixture(scope="module")
def logbook(tmp_path_factory):
    store = open_logbook(tmp_path_factory.mktemp("fleet") / "fleet.logbook", create=True)
    write(store, fleet(14, entries=60, seed=100))
    return store


def test_verdicts_and_figures_of_a_drawn_fleet(logbook) -> None:
    framed = FramedLogbook(logbook)
    for log in fleet_logs(logbook):
        tables = framed.entries(log.vehicle.name), framed.modifications(log.vehicle.name)
        whole = assess(*tables, "part", capacity=log.vehicle.capacity, unit=log.vehicle.unit)
        answer = review(log, ASKED).answers[0]
        assert answer.verdict == whole.verdict, log.vehicle.name
        assert answer.shift_percent == pytest.approx(whole.shift_percent, rel=0.02, abs=0.02)
        assert answer.standard_error_percent == pytest.approx(whole.standard_error_percent, rel=0.03)
        assert answer.distance_modified_km == pytest.approx(whole.distance_modified_km)
        assert (answer.distance_to_go_km is None) == (whole.distance_to_go_km is None)
        if answer.distance_to_go_km:
            assert answer.distance_to_go_km == pytest.approx(whole.distance_to_go_km, rel=0.15)


def test_demonstration_logbook() -> None:
    found = {log.vehicle.name: review(log, ASKED) for log in fleet_logs(open_logbook(ROOT / "demo_logbook"))}
    verdicts = {name: [answer.verdict for answer in each.answers] for name, each in found.items()}
    assert verdicts == {"van": ["shifted"], "car": ["not-yet"], "electric": ["out-of-reach"]}


def test_a_packed_log_loses_nothing_that_measures(logbook) -> None:
    log = fleet_logs(logbook)[0]
    again = unpack(pickle.loads(pickle.dumps(pack(log))))
    assert review(again, ASKED) == review(log, ASKED)
    assert len(pickle.dumps(pack(log))) < 100 * len(log.entries)  # bytes


def test_a_log_that_measures_nothing_is_a_message(logbook) -> None:
    log = fleet_logs(logbook)[0]
    found = review(type(log)(log.vehicle, log.entries[:1]), ASKED)
    assert "nothing can be measured" in found.message
    assert found.answers == ()
