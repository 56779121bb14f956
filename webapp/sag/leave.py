"""May we leave: the answer in a sentence, what is missing, the trade's rule beside it, and the close-out list."""

from dataclasses import dataclass

import numpy as np

from calc.brackets import bracket_check
from calc.leaving import FLAT, HELD, OPEN_ABOVE, OPEN_BELOW, Answer, verdict
from webapp.display import signed
from webapp.meters.words import BUTTONS
from webapp.sag.evidence import visits_of
from webapp.sag.words import interval_words, plainly, stretch

TITLES = {
    HELD: "Held",
    OPEN_ABOVE: "Open above",
    OPEN_BELOW: "Open below",
    FLAT: "Flat",
    "not yet": "Not yet",
}
_ANCHOR_MG_L = 0.3
CHECK_YOURSELF = (
    ("unsent", "Nothing waits on any phone: every crew has sent its readings."),
    ("bottles", "Bottles are counted against the list, on ice, and their custody has begun."),
    ("copy", "A second copy exists: on the server, a second phone, or as a file."),
    ("people", "Everybody is off the water and accounted for, and the call-in is done."),
)


@dataclass(frozen=True)
class Item:
    """A line of the close-out list that the records themselves can show.

    meter and kind open the form for the check that it asks for; empty where it asks for none.
    """

    done: bool
    says: str
    meter: str = ""
    kind: str = ""

    @property
    def button(self):
        """Return what the link to that form says."""
        return BUTTONS.get(self.kind, "")


@dataclass(frozen=True)
class Leave:
    """May we leave: word is calc's, headline the answer in a sentence, missing what lacks for "held"."""

    answer: Answer
    word: str
    title: str
    headline: str
    missing: tuple[str, ...]
    fit: str
    trade: tuple
    trade_asks: tuple[str, ...]
    disagreement: str
    closing: tuple[Item, ...]

    @property
    def settled(self):
        """Return whether leaving needs no reason."""
        return self.word in (HELD, FLAT)


def may_we_leave(show, plan_version, today, readings, meters=()):
    """Return the Leave of Today; readings are all of the survey, meters the meters.closing.Closings."""
    stations = plan_version.tables.get("stations") or []
    codes = [(row["distance_km"], row["code"]) for row in stations]
    estimate = today.estimate
    visits = visits_of(readings, {code for _, code in codes})
    answer = verdict(
        estimate.plan,
        [],
        [],
        estimate=estimate,
        access_km=_access_km(plan_version, estimate),
        bracket=_bracket(today, visits),
    )
    fit = f"The estimate {_FIT[estimate.fit.word]}. {plainly(show, estimate.fit.reason, codes)}".strip()
    return Leave(
        answer=answer,
        word=answer.word,
        title=TITLES[answer.word],
        headline=_headline(show, today, answer, codes, stations),
        missing=tuple(plainly(show, one, codes) for one in answer.missing),
        fit=fit,
        trade=answer.bracket.clauses,
        trade_asks=tuple(plainly(show, one, codes) for one in answer.bracket.add),
        disagreement=answer.disagreement,
        closing=closing_list(visits, stations, meters),
    )


_FIT = {"fits": "fits the readings", "strained": "is strained", "does not fit": "does not fit the readings"}


def _access_km(plan_version, estimate):
    """Return where a further station could be; anywhere where the crew has a boat. [km]"""
    day = (plan_version.tables.get("day") or [{}])[0]
    if day.get("reachable_anywhere"):
        return np.linspace(estimate.outfall_km, estimate.plan.to_km, 61)[1:]
    return [row["distance_km"] for row in plan_version.tables.get("access") or []]


def _bracket(today, visits):
    """Return the trade's bracket rule with what is known of replicates and sections."""
    evidence, estimate = today.estimate.evidence, today.estimate
    lowest = lowest_station(today)
    there = [one for one in visits if one.code == lowest]
    spreads = [
        max(one.do_mg_l for one in here) - min(one.do_mg_l for one in here)
        for visit in visits
        for here in visit.by_position.values()
        if len(here) > 1
    ]
    predicted = today.prediction.along(evidence.distance_km.tolist())
    return bracket_check(
        estimate.plan,
        evidence.distance_km,
        evidence.do_mg_l,
        replicate_spread_mg_l=max(spreads, default=0.0),
        section_checked=any(visit.is_section for visit in there),
        replicated=any(visit.is_replicated for visit in there),
        predicted_mg_l=[np.nan if one is None else one.do_mg_l for one in predicted],
    )


def lowest_station(today):
    """Return the code of the station below the outfall that read lowest, or None."""
    below = [one for one in today.counted if one.distance_km >= today.estimate.outfall_km]
    return min(below, key=lambda one: one.do_mg_l).code if below else None


def _headline(show, today, answer, codes, stations):
    """Return the answer in one or two plain sentences."""
    estimate = today.estimate
    if not today.stations_read:
        return "Not yet: nothing that counts was read below the outfall."
    value = interval_words(show, "oxygen", estimate.critical_do_mg_l, 1)
    where = stretch(show, estimate.critical_km.low, estimate.critical_km.high)
    if answer.word == HELD:
        return f"Held: the low point, {value}, lies between {_around(today, codes, show)}, {where}."
    if answer.word == FLAT:
        return f"Flat: the lowest oxygen is settled, {value}. No reading would narrow its place, {where}."
    if answer.word in (OPEN_ABOVE, OPEN_BELOW):
        return _open(show, today, answer, stations)
    return f"Not yet: {plainly(show, answer.missing[0], codes)}"


def _open(show, today, answer, stations):
    end = -1 if answer.word == OPEN_BELOW else 0
    last_km = today.estimate.stations_km[end]
    below = [one for one in today.counted if one.distance_km >= today.estimate.outfall_km]
    lowest = min(below, key=lambda one: one.do_mg_l)
    side, which = ("below", "last") if answer.word == OPEN_BELOW else ("above", "first")
    go = "Go on downstream." if answer.word == OPEN_BELOW else "Read further up."
    if lowest.distance_km == last_km:
        oxygen = show.text("oxygen", lowest.do_mg_l, 1)
        return f"Open {side}: the lowest reading, {oxygen} at {lowest.code}, is your {which} station. {go}"
    code = next((one.code for one in below if one.distance_km == last_km), "")
    return f"Open {side}: the low point may lie {side} {code}, your {which} station. {go}"


def _around(today, codes, show):
    """Return the stations read on both sides of the critical point's interval, in words."""
    place, read = today.estimate.critical_km, today.estimate.stations_km
    names = dict(codes)
    above = max((km for km in read if km <= place.low), default=read[0])
    below = min((km for km in read if km >= place.high), default=read[-1])
    return f"{names.get(above, show.place(above))} and {names.get(below, show.place(below))}"


def closing_list(visits, stations, meters=()):
    """Return the Items of the close-out list: first station again, replicates, times, meters and their end checks."""
    order = {row["code"]: row["distance_km"] for row in stations}
    repeated = sorted({one.code for one in visits if one.is_replicated})
    missing = sorted({one.code for one in visits if not one.meter})
    noted = "Every reading has its time and meter." if visits else "No reading to have a time and a meter yet."
    return (
        _anchor(visits, order),
        Item(bool(repeated), f"Replicates at {', '.join(repeated)}." if repeated else "No replicate was read yet."),
        Item(
            not missing and bool(visits),
            f"The meter was not noted at {', '.join(missing)}." if missing else noted,
        ),
        *(Item(one.done, one.says, one.meter, one.kind) for one in meters),
    )


def _anchor(visits, order):
    """Return the Item of the first station: it is read again at the end, to tell what the day itself changed."""
    first = min(visits, key=lambda one: order.get(one.code, 0.0), default=None)
    if first is None:
        return Item(False, "Nothing was read.")
    occasions = {one.label: one for one in visits if one.code == first.code}
    if len(occasions) < 2:
        return Item(False, f"{first.code}, the first station, was not read again yet.")
    before, *_, after = occasions.values()
    change = after.readings[-1].do_mg_l - before.readings[0].do_mg_l
    says = f"{first.code}, the first station, was read again: {signed(change)} mg/L against before."
    if abs(change) > _ANCHOR_MG_L:
        says += " The day itself changed oxygen, so stations read hours apart compare poorly."
    return Item(True, says)
