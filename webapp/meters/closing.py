"""What the meters still need before the crew leaves the river."""

from dataclasses import dataclass
from datetime import UTC, datetime

from webapp.meters.queries import checks_of, meters_of
from webapp.meters.state import DAY, in_order, last_oxygen, meter_states, off, readings_by_meter
from webapp.meters.verdicts import Brackets, judged_checks


@dataclass(frozen=True)
class Closing:
    """One line of the close-out list about a meter; meter is what a form for its check is opened with, else empty."""

    done: bool
    says: str
    meter: str = ""
    kind: str = ""


def closing_of(db, survey, show, settings, readings, lowest_mg_l=None, now=None):
    """Return the Closings of every meter that was used on the last day of readings, and what is due of them."""
    meters, judged = meters_of(db, survey.id), in_order(judged_checks(checks_of(db, survey.id), settings))
    now = now or datetime.now(UTC)
    states = meter_states(show, meters, judged, readings, settings, now, lowest_mg_l)
    return end_checks(show, meters, judged, readings, settings) + [
        Closing(False, f"{state.meter.name}: {one.says} {one.do}", state.meter.id, _due_kind(one))
        for state in states
        if state.unclosed or (state.ready and state.last)
        for one in state.due
        if one.name != "thermometer_due"
    ]


def _due_kind(finding):
    return "zero" if finding.name == "zero_check_due" else "field"


def end_checks(show, meters, judged, readings, settings):
    """Return a Closing for each meter that was used: what closes its last readings, or that nothing does."""
    names, brackets = {one.name.casefold(): one for one in meters}, Brackets(judged, settings)
    latest = max((one.taken_at for one in readings), default=None)
    found = []
    for name, used in sorted(readings_by_meter(readings, names).items()):
        if not name or not used or latest - used[-1].taken_at >= DAY:
            continue
        checks = [one for one in judged if not one.set_aside and one.check.meter.name.casefold() == name]
        meter = names.get(name)
        between = [brackets.of(name, one.taken_at) for one in used]
        called = meter.name if meter else used[-1].meter
        found.append(_end_check(show, called, meter, last_oxygen(checks), between, latest))
    return found


def _end_check(show, name, meter, last, between, latest):
    """Return the Closing of a meter; between are the brackets of its readings in time order, last its latest check."""
    unclosed = sum(after is None for _, _, after in between)
    _, before, after = between[-1]
    open_as = (meter.id, "end_of_day") if meter else ("", "")
    if last is None:
        return Closing(False, f"{name} was never checked: {_questionable(unclosed, between)}.", *open_as)
    if after is not None:
        says = f"{name} was checked after its last reading, at {show.when(after.check.checked_at, latest)}"
        earlier = f" {unclosed} before that lie between no two checks." if unclosed else ""
        return Closing(True, f"{says}: {off(show, after)}, {_what(after.verdict)}.{earlier}")
    if last.check.checked_at > latest and last.check.kind in ("adjusted", "read_back", "after_cleaning"):
        done = "cleaned" if last.check.kind == "after_cleaning" else "adjusted"
        at = show.when(last.check.checked_at, latest)
        return Closing(False, f"{name} was {done} at {at} before it was checked: {_questionable(unclosed, between)}.")
    since = show.when((before or last).check.checked_at, latest)
    return Closing(False, f"{name} has no end check since {since}: {_questionable(unclosed, between)}.", *open_as)


def _questionable(unclosed, between):
    if unclosed == len(between):
        return "all its readings today count as questionable"
    if unclosed == 1:
        return "its reading since then counts as questionable"
    return f"{unclosed} of its readings count as questionable"


def _what(verdict):
    if verdict.closes:
        return "so the readings before it are closed"
    graded = f"grade {verdict.grade}, " if verdict.grade else ""
    if verdict.correctable:
        return f"{graded}so the readings before it ask for a correction"
    return f"{graded}too far off for the readings before it to be reported"
