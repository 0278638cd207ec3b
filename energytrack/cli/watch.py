"""The watch: whether consumption has moved since, and how soon it would be seen if it did."""

from __future__ import annotations

import sys
from collections.abc import Iterable
from typing import TYPE_CHECKING, Any

from energytrack.cli import questions as asking
from energytrack.cli.context import say, say_json
from energytrack.errors import EnergytrackError, InferenceError
from energytrack.logbook.quantities import distance_text
from energytrack.logbook.store import Store

if TYPE_CHECKING:
    from energytrack.inference.watch.kept import Watch
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle

USUAL_EVERY_KM = 50_000.0
WIDTH = 80


def watch(logbook: Logbook, vehicles: Iterable[Vehicle], *, false_alarm_every_km: float, as_json: bool) -> None:
    """Print the state of each vehicle's monitor. Raises InferenceError for a distance that is none."""
    if not 1_000 <= false_alarm_every_km <= 10_000_000:
        raise InferenceError(
            f"a false alarm every {false_alarm_every_km:g} km cannot be had: ask for 1,000 to 10,000,000"
        )
    found, refusals = asking.answered(
        list(vehicles), lambda vehicle: (vehicle, begun(logbook, vehicle, false_alarm_every_km, with_delays=True))
    )
    if false_alarm_every_km == USUAL_EVERY_KM:
        for vehicle, one in found:
            _keep(logbook, vehicle, one)
    if as_json:
        say_json({"watches": [columns(vehicle, one) for vehicle, one in found]})
    else:
        for place, (vehicle, one) in enumerate(found):
            say([*([""] if place else []), *lines(vehicle, one)])
    asking.leave(refusals)


def keep_watch(logbook: Logbook, vehicle: Vehicle) -> None:
    """Begin the vehicle's monitor anew and keep it for the echo; for commands that load what it takes anyway.

    A refusal never hides their answer.
    """
    if isinstance(logbook, Store) and logbook.writable:
        try:
            _keep(logbook, vehicle, begun(logbook, vehicle, USUAL_EVERY_KM))
        except EnergytrackError as refusal:
            print(f"energytrack: the watch was not kept: {refusal}", file=sys.stderr)


def begun(logbook: Logbook, vehicle: Vehicle, every_km: float, *, with_delays: bool = False) -> Watch | None:
    """The monitor after all that is logged; None where too little is."""
    from energytrack.consumption.frames import observe_log
    from energytrack.consumption.shares import fitted_position
    from energytrack.inference.watch.begin import begin

    observed, _, segmented = observe_log(**asking.tables(logbook, vehicle))
    events = logbook.events(vehicle.name)
    places = [fitted_position(segmented, event.date, event.odometer_km) for event in events]
    known = [place for place in places if place is not None]
    return begin(observed, known, false_alarm_every_km=every_km, with_delays=with_delays)


def columns(vehicle: Vehicle, one: Watch | None) -> dict[str, Any]:
    """The state for JSON."""
    from energytrack.inference.watch.monitor import alarm

    if one is None:
        return {"vehicle": vehicle.name, "watching": False}
    monitor, found = one.monitor, alarm(one.monitor)
    return {
        "vehicle": vehicle.name,
        "watching": True,
        "rise": monitor.rise.value,
        "fall": monitor.fall.value,
        "threshold": monitor.threshold,
        "alarm": found is not None,
        "shift_percent": None if found is None else 100 * found[1],
        "since_km": None if found is None else found[0].since_km,
        "since_date": None if found is None else found[0].since_date,
        "segments": one.segments,
        "end_km": one.end_km,
        "false_alarm_every_km": one.false_alarm_every_km,
        "delays_km": {f"{shift:g}": far for shift, far in one.delays},
    }


def lines(vehicle: Vehicle, one: Watch | None) -> list[str]:
    """The state in words."""
    from textwrap import wrap

    from energytrack.inference.regimes.places import FEWEST
    from energytrack.inference.watch.kept import alarm_lines

    if one is None:
        return wrap(f"{vehicle.name}: nothing to watch yet; {FEWEST} segments between known levels are needed", WIDTH)
    monitor = one.monitor
    parts = [f"{vehicle.name}: watched up to {distance_text(one.end_km, vehicle)} ({one.end_date})"]
    for line in alarm_lines(one, vehicle) or ["consumption is as expected"]:
        parts += wrap(line, WIDTH, initial_indent="  ", subsequent_indent="  ")
    for name, total in (("rise", monitor.rise), ("fall", monitor.fall)):
        since = "" if total.since_km is None else f", adding up since {distance_text(total.since_km, vehicle)}"
        parts.append(f"  {name}: {total.value:.1f} of {monitor.threshold:.1f}{since}")
    every = distance_text(one.false_alarm_every_km, vehicle)
    parts.append(f"  false alarms: about one every {every}, if the fit holds")
    for shift, far in one.delays:
        told = "hidden by drift" if far is None else (
            f"told after about {distance_text(_two_digits(far), vehicle)}, "
            f"{max(1, round(far / one.recent_km))} segments, on average"
        )  # fmt: skip
        parts.append(f"  +{shift:g} %: {told}")
    return parts


def _keep(logbook: Logbook, vehicle: Vehicle, one: Watch | None) -> None:
    from energytrack.inference.watch.kept import as_json

    if isinstance(logbook, Store) and logbook.writable:
        logbook.keep_watch(vehicle.name, None if one is None else as_json(one))


def _two_digits(km: float) -> float:
    """An average delay deserves no more."""
    return float(f"{km:.2g}")
