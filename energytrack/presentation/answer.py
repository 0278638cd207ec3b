"""The answer in one or two plain sentences, said before anything else."""

from __future__ import annotations

from energytrack.inference.results import Assessment, Look, Remedy
from energytrack.presentation import figures
from energytrack.presentation.known import known_sentence
from energytrack.presentation.plain import plain_text
from energytrack.presentation.set_aside import follow_up
from energytrack.presentation.text import join
from energytrack.presentation.undeclared import agreeing_sentence, withheld_sentence

USUAL_BASELINE_KM = 3200.0  # four working weeks of a 160 km commute; common practice, no source
NO_LEVELS = "nothing can be measured, as no two entries tell how full the tank or battery was after them"
TELL_LEVELS = f"Log the level with each entry ({join('--level 80')}), or fill or charge to full (no --partial)."


def sentence(a: Assessment, unit: str = "km") -> str:
    """The answer to "has it shifted consumption, and was the distance enough?"; distances in `unit` (km or mi)."""
    say = {
        "shifted": _shifted,
        "no-shift-of-target-size": _no_shift,
        "not-yet": _not_yet,
        "out-of-reach": _out_of_reach,
        "no-baseline": _no_baseline,
        "closed-unclear": _unclear,
    }[a.verdict]
    said = withheld_sentence(a, named(a), so_far(a), unit) if a.withheld else say(a, unit)
    more = (_at_level(a, unit), agreeing_sentence(a, unit), known_sentence(a), follow_up(a))
    return " ".join(filter(None, (said, *more)))


def named(a: Assessment) -> str:
    """What the answer is for: the modification, or with it those that were never apart from it."""
    if not a.never_apart:
        return plain_text(a.modification)
    *others, last = map(plain_text, (a.modification, *a.never_apart))
    return f"{', '.join(others)} and {last} together"


def _at_level(a: Assessment, unit: str) -> str:
    """Of a part driven at several levels: which the answer is for, or the average of, and which of them uses least."""
    if a.response is None:
        return ""
    reference = a.response.reference_level
    against = f" against level {reference:g}" if reference else ""
    driven = [effect for effect in a.response.levels if effect.level != reference]
    if len(driven) < 2:
        return f"That is level {driven[0].level:g}{against}." if driven and against else ""
    best = min(driven, key=lambda effect: effect.shift_percent)
    shift = figures.percent(best.shift_percent, signed=True)  # its range would not allow for having picked it
    least = f"by the fitted curve, level {best.level:g} uses least: {shift}."
    *lower, highest = (f"{effect.level:g}" for effect in driven)
    levels = f"{', '.join(lower)} and {highest}"
    if a.level is None or a.level_since_km is None:
        return f"That is the average over the levels driven ({levels}){against}; of these, {least}"
    since = figures.driven(a.level_since_km, unit)
    which = f"That is at level {a.level:g}, driven since {since}{against}"
    return f"{which}; of all driven ({levels}; see by level), {least}"


def contradicted(a: Assessment) -> bool:
    """What was settled does not hold with what was driven since: a shift's range spans zero or its sign has turned,
    or a shift below the target has grown past it.
    """
    span = a.interval_percent
    if a.verdict == "no-shift-of-target-size" and span is not None:
        return span[1] < -a.target_percent or span[0] > a.target_percent
    if a.verdict != "shifted" or a.shift_percent is None:
        return False
    spans_zero = span is None or span[0] <= 0 <= span[1]
    settled = settling_look(a)
    return spans_zero or (settled is not None and settled.shift_percent * a.shift_percent < 0)


def settling_look(a: Assessment) -> Look | None:
    """The look that settled the verdict, where the looks are at hand."""
    if a.settled_at_km is None:
        return None
    return next((look for look in a.looks if abs(look.odometer_km - a.settled_at_km) < 0.5), None)


def so_far(a: Assessment) -> str:
    """The present estimate with its range, or that there is none."""
    if a.shift_percent is None:
        return "no figure yet"
    shift = figures.percent(a.shift_percent, a.standard_error_percent, signed=True)
    span = figures.bounded(a.interval_percent)
    if span is None:
        return f"{shift}, {_range_name(a)} still wide open"
    return f"{shift}, {_range_name(a)} {figures.percent_range(span, a.standard_error_percent)}"


def _range_name(a: Assessment) -> str:
    """Look-proof is the range up to the look that closed the test; what is driven later is follow-up."""
    closing = bool(a.looks) and settling_look(a) == a.looks[-1]
    was_open = all(look.information_fraction < 1 for look in a.looks[:-1])
    return "look-proof range" if a.is_open or (closing and was_open) else "range"


def remedy(r: Remedy, unit: str) -> str:
    """One way to bring the target within reach, with its distance."""
    detail = plain_text(r.detail)
    target = figures.target(r.target_percent)
    what = {
        "larger-target": f"be content with a target of {target}",
        "alternate": f"take it off and on {detail}".rstrip(),
        "longer-baseline": f"a longer baseline: {detail}" if detail else "a longer baseline",
    }[r.what]
    goal = "" if r.what == "larger-target" else f" for {target}"
    if r.distance_km is None:
        return f"{what}, though{goal} even that takes longer than can be foreseen"
    if r.distance_km < 1:
        asked = join(f"energytrack enough --target {r.target_percent:g}")
        return f"{what}{goal}, for which the distance is driven already ({asked}); a target chosen late counts for less"
    return f"{what}, about {figures.foretold(r.distance_km, None, unit)} more{goal}"


def _shifted(a: Assessment, unit: str) -> str:
    name = named(a)
    at = _when_settled(a, unit)
    if contradicted(a):
        look = settling_look(a)
        size = "" if look is None else f" of {figures.percent(look.shift_percent, signed=True)}"
        return (
            f"Doubtful: a shift{size} from {name} was settled{at}, but with what was driven since "
            f"{_what_changed(a)}: now {so_far(a)}."
        )
    shift, error, span = a.shift_percent or 0.0, a.standard_error_percent, figures.bounded(a.interval_percent)
    verb = "lowered" if shift < 0 else "raised"
    within = ""
    if span is not None:
        low, high = sorted(abs(end) for end in span)
        within = f" ({_range_name(a)} {figures.percent_range((low, high), error, signed=False)})"
    settled = f", settled{at}" if at else ""
    return f"Yes: {name} {verb} consumption by {figures.percent(abs(shift), error)}{within}{settled}."


def _when_settled(a: Assessment, unit: str) -> str:
    """Date and odometer value, or the distance counted by a log without one."""
    if a.settled_at_km is None:
        return ""
    on = "" if a.settled_on is None else f" on {a.settled_on}"
    return f"{on} at {figures.driven(a.settled_at_km, unit)}"


def _what_changed(a: Assessment) -> str:
    span = a.interval_percent
    return "its range reaches zero again" if span is None or span[0] <= 0 <= span[1] else "it points the other way"


def _no_shift(a: Assessment, unit: str) -> str:
    name, target = named(a), figures.target(a.target_percent)
    if contradicted(a):
        return (
            f"Doubtful: a shift of {target} from {name} was ruled out{_when_settled(a, unit)}, "
            f"but what was driven since shows one: now {so_far(a)}."
        )
    span, bound = a.interval_percent, a.target_percent
    if span is not None and (span[0] < -bound or span[1] > bound) and a.settled_at_km is not None:
        return (
            f"No: a shift of {target} from {name} was ruled out{_when_settled(a, unit)}. "
            f"Measured now {so_far(a)}, which reaches past the target again."
        )
    return (
        f"No: any shift from {name} is smaller than the target of {target}. "
        f"Measured {so_far(a)}, after {figures.driven(a.distance_modified_km, unit)} with it."
    )


def _not_yet(a: Assessment, unit: str) -> str:
    if a.rule == "open-ended" and a.distance_to_go_km == 0:
        go = f"the distance for a shift from {named(a)} is driven, none has shown, the watch goes on"
    elif a.distance_to_go_km is None:
        go = f"how much further with {named(a)} cannot be foreseen yet"
    else:
        far = figures.foretold(a.distance_to_go_km, a.distance_to_go_interval_km, unit)
        go = f"about {far} more with {named(a)}"
        go += "" if a.days_to_go is None else f", about {figures.days(a.days_to_go)} of your driving"
    now = "Nothing measured with it so far" if a.shift_percent is None else f"So far {so_far(a)}"
    return f"Not yet: {go}, at the target of {figures.target(a.target_percent)}. {now}."


def _out_of_reach(a: Assessment, unit: str) -> str:
    name, target = named(a), figures.target(a.target_percent)
    if a.resolvable_at_best_percent is None:
        limit = f"this log of {name} cannot show a shift of {target}, however far you drive on like this."
    else:
        best = figures.percent(a.resolvable_at_best_percent)
        limit = f"driving on with {name} can show a shift of {best} at best, not {target}, however far."
    within = _best_remedy(a)
    hint = "" if within is None else f" Within reach: {remedy(within, unit)}."
    now = "" if a.shift_percent is None else f" So far {so_far(a)}."
    return f"Out of reach: {limit}{hint}{now}"


def _best_remedy(a: Assessment) -> Remedy | None:
    """The shortest way that keeps the target; only without one, a larger target."""
    within = [(r.what == "larger-target", r.distance_km, r) for r in a.remedies if r.distance_km is not None]
    return min(within, key=lambda way: way[:2])[2] if within else None


def _no_baseline(a: Assessment, unit: str) -> str:
    name = named(a)
    if not a.levels_known:
        return f"No baseline: {NO_LEVELS}. {TELL_LEVELS}"
    have = f"only {figures.driven(a.distance_baseline_km, unit)} in {count(a.segments_baseline, 'segment')}"
    have = have if a.segments_baseline else "nothing measured"
    return (
        f"No baseline: there is {have} without {name}, too little to compare with. "
        f"Drive about {figures.distance(baseline_to_drive(a), unit)} without it, then ask again."
    )


def baseline_to_drive(a: Assessment) -> float:
    """Kilometres of baseline to drive: what the assessment says, else what is usual less what is there."""
    if a.distance_to_go_km is not None:
        return a.distance_to_go_km
    return max(USUAL_BASELINE_KM - a.distance_baseline_km, USUAL_BASELINE_KM / 4)


def _unclear(a: Assessment, unit: str) -> str:
    return (
        f"Unclear: the distance for a target of {figures.target(a.target_percent)} is driven, yet a shift of that size "
        f"from {named(a)} is neither shown nor ruled out. Measured {so_far(a)}."
    )


def count(number: int, noun: str) -> str:
    """A number of things."""
    return join(f"{number:,} {noun}") + ("" if number == 1 else "s")
