"""What to do next after a month's review, in at most three lines."""

from __future__ import annotations

import shlex

from energytrack.inference.review.results import Review, UnderTest
from energytrack.logbook.records import Vehicle
from energytrack.presentation import figures
from energytrack.presentation.plain import plain_text
from energytrack.presentation.text import join

MOST = 3


def next_steps(found: Review, vehicle: Vehicle) -> list[str]:
    """The most urgent first: safety, doubtful entries, more used than before, open tests, better records."""
    steps = [*_cautions(found), *_odd(found), *_unlogged(found, vehicle), *_more_used(found)]
    steps += [*_tests(found, vehicle), *_records(found)]
    usual = "Nothing stands out: drive on and log every entry."
    young = "Drive on, fill or charge to full as a habit, and log every entry."
    return steps[:MOST] or [usual if found.level else young]


def _cautions(found: Review) -> list[str]:
    return [each.found.caution for each in found.regimes if each.new and each.found.caution is not None]


def _odd(found: Review) -> list[str]:
    if not found.set_aside:
        return []
    worst = max(found.set_aside, key=lambda each: abs(each.deviation_sd))
    if worst.amend:
        command = join(plain_text(f"energytrack amend {worst.amend[0]} --vehicle {shlex.quote(found.vehicle)}"))
        return [f"The entry of {worst.date} looks wrong ({worst.suspicion}); if so: {command}"]
    return [f"The entry of {worst.date} stands out: {plain_text(worst.suggestion)}."]


def _unlogged(found: Review, vehicle: Vehicle) -> list[str]:
    """Changes that are news and that nothing logged explains."""
    steps = []
    for each in found.regimes:
        if each.new and not each.found.matches:
            at = f"{figures.in_unit(each.found.odometer_km, vehicle.distance_unit):.0f}"
            whose = f"--vehicle {shlex.quote(plain_text(found.vehicle))}"
            command = join(f'energytrack event "WHAT HAPPENED" {at} {whose}')
            steps.append(f"If something happened at about {at} {vehicle.distance_unit}, log it: {command}")
    return steps


def _more_used(found: Review) -> list[str]:
    """Where the month is told apart from another, upwards."""
    for each in found.differences:
        span = each.interval_percent
        if span is not None and span[0] > 0:
            asked = {"month-before": each.what, "year-ago": each.what, "baseline": "its baseline"}[each.against]
            size = figures.percent(each.percent)
            return [f"It used {size} more than {asked}: check tyre pressures, brakes and load, when parked."]
    return []


def _tests(found: Review, vehicle: Vehicle) -> list[str]:
    return [step for each in found.modifications if each.is_open for step in [_test(each, found, vehicle)] if step]


def _test(each: UnderTest, found: Review, vehicle: Vehicle) -> str:
    name, whose = plain_text(each.name), f"--vehicle {shlex.quote(plain_text(found.vehicle))}"
    if each.verdict == "not-yet" and each.distance_to_go_km:
        far = figures.foretold(each.distance_to_go_km, None, vehicle.distance_unit)
        return f"Keep {name} as it is and drive on as usual, about {far} more."
    if each.verdict == "out-of-reach":
        asked = join(f"energytrack plan {whose} --target {each.target_percent:g}")
        return f"Driving on cannot settle {name}: see other ways with {asked}"
    return f"See what {name} still needs: " + join(f"energytrack enough {shlex.quote(name)} {whose}")


def _records(found: Review) -> list[str]:
    own, steps = found.quality, []
    if own.missed:
        steps.append("An entry is missing: log the forgotten receipt, and its tank counts again.")
    if own.partial > 1 and 2 * own.partial >= own.entries:
        steps.append("Fill to full or log the level: most entries of the month tell none.")
    if own.without_temperature:
        steps.append(f"Write down the outside temperature ({join('--temperature 12')}): a guess stands in for it.")
    if own.without_cost:
        steps.append(f"Log what was paid ({join('--cost 70.20')}): without it costs are too low.")
    return steps
