"""What a correction does to the answers that were given: each asked again, before it and after it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from energytrack.errors import EnergytrackError, LogbookError
from energytrack.logbook.records import Vehicle
from energytrack.logbook.store import Store

if TYPE_CHECKING:
    from energytrack.cli.questions import Question
    from energytrack.inference.results import Assessment


def reanswered(store: Store, vehicles: Sequence[Vehicle], change: int) -> list[dict[str, Any]]:
    """For each modification that was ever asked about: its answer without the change, and with it, which is kept."""
    answers = []
    for vehicle in vehicles:
        for kept in store.assessments(vehicle.name):  # without any, nothing heavy is loaded
            answers.append(_asked_again(store, vehicle, str(kept["modification"]), kept["target_percent"], change))
    return answers


def answer_lines(answers: Sequence[dict[str, Any]]) -> list[str]:
    """Each answer before and now, those whose verdict changed marked."""
    return [line for each in answers for line in _lines(each)]


def _asked_again(store: Store, vehicle: Vehicle, modification: str, target: float, change: int) -> dict[str, Any]:
    from energytrack.cli.enough import keep
    from energytrack.cli.questions import Question
    from energytrack.logbook.as_of import EarlierStore

    question = Question(vehicle, modification, target)
    earlier = EarlierStore(store.path, change - 1)
    try:
        before = _answer(earlier, question)
    finally:
        earlier.close()
    after = _answer(store, question)
    if not isinstance(after, str):
        keep(store, question, after)
    was, became = _columns(before), _columns(after)
    return {
        "vehicle": vehicle.name,
        "modification": modification,
        "before": was,
        "after": became,
        "verdict_changed": was["verdict"] != became["verdict"],
    }


def _answer(store: Store, question: Question) -> Assessment | str:
    """The answer at the usual certainty; where there is none, why."""
    from energytrack.cli.enough import usual_answer

    try:
        if all(period.name != question.modification for period in store.modifications(question.vehicle.name)):
            raise LogbookError("it is not fitted")
        return usual_answer(store, question)
    except EnergytrackError as refusal:
        return str(refusal)


def _columns(answer: Assessment | str) -> dict[str, Any]:
    from energytrack.presentation.as_json import without_nan

    if isinstance(answer, str):
        return {"verdict": None, "shift_percent": None, "interval_percent": None, "why_not": answer}
    interval = None if answer.interval_percent is None else list(answer.interval_percent)
    found = {"verdict": answer.verdict, "shift_percent": answer.shift_percent, "interval_percent": interval}
    return {**without_nan(found), "why_not": None}


def _lines(each: dict[str, Any]) -> list[str]:
    title = f"{each['vehicle']}, {each['modification']}: the verdict"
    title = f"! {title} changes" if each["verdict_changed"] else f"{title} stays"
    return [title, f"    before  {_said(each['before'])}", f"    now     {_said(each['after'])}"]


def _said(answer: dict[str, Any]) -> str:
    from energytrack.presentation.set_aside import IN_WORDS

    if answer["verdict"] is None:
        return f"none ({answer['why_not']})"
    shift = answer["shift_percent"]
    words: str = IN_WORDS[answer["verdict"]]
    return words + ("" if shift is None else f", {shift:+.1f} %")
