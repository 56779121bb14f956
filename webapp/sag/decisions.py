"""Decisions on site: where to read next and whether to leave, each kept with what was on the screen and why."""

from webapp.errors import Conflict
from webapp.models import Decision
from webapp.plan.queries import current_plan, stations_of
from webapp.plan.service import save_tables
from webapp.sag import queries
from webapp.sag.where_next import key_of
from webapp.surveys.service import remember

STATION, DECLINED, OFFERED, LEAVING = "station", "declined", "offered", "leave"
LEFT, STAYED = "left", "stayed"


class LookAgain(Conflict):
    """What was on the screen is no longer so: readings or the plan changed since."""


def declined_places(decisions):
    """Return the names of places that were declined and not offered again since, in the order they were declined."""
    declined = {}
    for one in decisions:
        if one.kind == DECLINED:
            declined[one.chosen] = None
        elif one.kind in (OFFERED, STATION):
            declined.pop(one.screen.get("place", one.chosen), None)
    return tuple(declined)


def choose_station(db, survey, sag, asked, by_id):
    """Store the choice of a place, and add its station to the plan where it has none; return its code.

    asked is a forms.Choice. Sent twice it is one choice. Raises LookAgain, or Conflict where the place is none to read.
    """
    if (stored := _stored(db, survey, asked)) is not None:
        return stored.chosen
    offer = sag.where.find(asked.place) if sag.where else None
    if offer is None:
        raise LookAgain("This place is no longer among those to choose. Look at the page as it is now.")
    _same_screen(sag, asked)
    why = asked.reason or offer.why
    decision = _decide(db, survey, sag, asked, STATION, offer.code, by_id, {"place": key_of(offer)})
    if offer.planned:
        db.commit()
        return decision.chosen
    stations = current_plan(db, survey.id).tables["stations"]
    rows = [one for one in stations if one["code"] != offer.code]
    dropped = next((one for one in stations if one["code"] == offer.code), {})
    row = {"code": offer.code, "distance_km": offer.distance_km, "access": offer.place, **dropped}
    row |= {"state": "added", "reason": _reason(offer, asked)}
    save_tables(db, survey, {"stations": [*rows, row]}, f"{offer.code} added: {why}"[:200], by_id, sag.plan.number)
    return decision.chosen


def _reason(offer, asked):
    if asked.reason:
        return f"chosen on site: {asked.reason}"[:200]
    return f"where next: {offer.why[:1].lower()}{offer.why[1:]}"[:200] if offer.why else "chosen on site"


def decline(db, survey, sag, asked, by_id):
    """Store that a place is not to be offered; no reason is asked."""
    if _stored(db, survey, asked) is None:
        _decide(db, survey, sag, asked, DECLINED, asked.place, by_id)
        db.commit()


def offer_again(db, survey, sag, asked, by_id):
    """Store that a declined place may be offered again."""
    if _stored(db, survey, asked) is None:
        _decide(db, survey, sag, asked, OFFERED, asked.place, by_id)
        db.commit()


def leave_or_stay(db, survey, sag, asked, by_id):
    """Store that the crew leaves or stays; asked is a forms.Leaving. Raises LookAgain."""
    if _stored(db, survey, asked) is None:
        _same_screen(sag, asked)
        _decide(db, survey, sag, asked, LEAVING, asked.choice, by_id, {"ticked": list(asked.ticked)})
        db.commit()


def assign(db, survey, code, crew, by_id):
    """Put a crew on a station's row of the plan, as a new version. Raises Conflict where there is no such station."""
    plan = current_plan(db, survey.id)
    rows = plan.tables["stations"] if plan else []
    if code not in stations_of(db, survey.id) or all(row["code"] != code for row in rows):
        raise Conflict(f"There is no station {code} in the plan any more.")
    if any(row["code"] == code and row.get("crew") == crew for row in rows):
        return
    rows = [{**row, "crew": crew} if row["code"] == code else row for row in rows]
    save_tables(db, survey, {"stations": rows}, f"{code} is for {crew}", by_id)


def _stored(db, survey, asked):
    """Return the decision of this id, or None. Raises Conflict where it is another survey's."""
    stored = queries.find_decision(db, asked.id)
    if stored is not None and stored.survey_id != survey.id:
        raise Conflict("This form is of another survey. Open the page again.")
    return stored


def _same_screen(sag, asked):
    if asked.shown != sag.mark:
        raise LookAgain("Readings or the plan changed since this page was shown. Look at it as it is now, then decide.")


def _decide(db, survey, sag, asked, kind, chosen, by_id, more=None):
    if sag.plan is None:
        raise LookAgain("There is no plan yet, so there is nothing to decide. Make the plan first.")
    decision = Decision(
        id=asked.id,
        survey_id=survey.id,
        plan_version_id=sag.plan.id,
        kind=kind,
        chosen=chosen,
        reason=asked.reason,
        screen={**sag.screen, **(more or {})},
        made_by_id=by_id,
    )
    db.add(decision)
    particulars = {"kind": kind, "chosen": chosen, "reason": asked.reason}
    remember(db, survey.id, by_id, "decided", "decision", decision.id, particulars)
    return decision
