"""Storing entries about visits, each once; choosing between two that disagree."""

import math
from types import SimpleNamespace

from sqlalchemy.exc import IntegrityError

from calc.travel import mean_velocity_from_float_m_s
from webapp.errors import Conflict, NotFound
from webapp.models import Visit, VisitEntry
from webapp.readings.queries import get_station
from webapp.surveys.service import remember
from webapp.visits import queries
from webapp.visits.layers import TIMES, final_visit
from webapp.visits.words import GROUPS, LABELS, group_of


def add_entry(db, survey, new, by_id, received_at):
    """Store the entry once, however often it is sent, with the visit that it begins; return the stored one.

    Raises NotFound for a station the survey never had, Conflict where the id is that of another entry.
    """
    for last_try in (False, True):
        entry = put_entry(db, survey, new, by_id, received_at)
        try:
            db.commit()
            break
        except IntegrityError:  # two processes took this entry, or began this visit, at once
            db.rollback()
            if last_try:
                raise
    return entry


def put_entry(db, survey, new, by_id, received_at):
    """Do what add_entry does, without the commit: for a caller that stores many or none."""
    if (stored := queries.find_entry(db, new.id)) is not None:
        return _the_same(db, stored, survey, new)
    station = get_station(db, survey.id, new.station_code)
    visit = queries.find_visit(db, new.visit_id)
    if visit is None:
        visit = Visit(id=new.visit_id, survey_id=survey.id, station_id=station.id, opened_by_id=by_id, entries=[])
        visit.station = station
        db.add(visit)
    elif visit.survey_id != survey.id or visit.station_id != station.id:
        raise Conflict("This form belongs to a visit of another station. Open the form again.")
    if new.id == visit.id:  # what was added later may have come first
        visit.opened_by_id = by_id
    entry = VisitEntry(
        id=new.id,
        author_id=by_id,
        made_at=min(new.saved_at or received_at, received_at),
        received_at=received_at,
        seen=list(new.seen),
        facts=_said_anew(visit, _with_mean(new.facts), new),
        entered=new.entered,
        reason=new.reason,
    )
    visit.entries.append(entry)
    what = "visit begun" if new.id == visit.id else "visit entry saved"
    told = {"station": new.station_code, "says": sorted(entry.facts)}
    remember(db, survey.id, by_id, what, "visit", visit.id, told)
    return entry


def _with_mean(facts):
    """Return the facts with the mean velocity that follows from a float's."""
    surface = facts.get("surface_velocity_m_s")
    return facts if surface is None else {**facts, "velocity_m_s": float(mean_velocity_from_float_m_s(surface))}


def _said_anew(visit, facts, new):
    """Return the facts that differ from what was on the screen: repeating it must not outvote another phone.

    Raises Conflict where it settles what others disagree about without a reason.
    """
    shown = _of_entries(visit, [one for one in visit.entries if one.id in new.seen]) if new.seen else None
    said = {}
    for group in GROUPS:
        known = {name: _plain(name, shown.facts.get(name)) for name in group} if shown else {}
        told = {name: facts[name] for name in group if name in facts}
        if all(_same(name, value, known.get(name)) for name, value in told.items()):
            continue
        if shown and set(group) & set(shown.disputes) and not new.reason:
            raise Conflict(
                f"Two entries disagree about this visit's {LABELS[group[0]].lower()}. Choose between them on the "
                "visit's page, with the reason; the rest can be saved here."
            )
        said |= {name: value for name, value in told.items() if value is not None or known.get(name) is not None}
    return said


def _of_entries(visit, entries):
    """Return the FinalVisit that some of a visit's entries make."""
    nobody = SimpleNamespace(name="")
    station = SimpleNamespace(code="")
    return final_visit(
        SimpleNamespace(id=visit.id, station=station, opened_by=nobody, opened_by_id="", entries=entries)
    )


def _plain(name, value):
    return value.isoformat() if name in TIMES and value is not None else value


def _same(name, one, other):
    if one is None or other is None:
        return one is other
    if name in TIMES:  # a form shows whole minutes
        return one[:16] == other[:16]
    if isinstance(one, float) or isinstance(other, float):
        return math.isclose(one, other, rel_tol=1e-6, abs_tol=1e-9)
    return one == other


def _the_same(db, stored, survey, new):
    """Return the stored entry if the new one repeats it. Raises Conflict."""
    visit = queries.find_visit(db, stored.visit_id)
    if visit.survey_id != survey.id:
        raise Conflict("Another survey holds a visit with this form's id. Open the form again.")
    if (stored.visit_id, stored.entered, stored.reason) != (new.visit_id, new.entered, new.reason):
        raise Conflict(
            "This form's entry is stored already, with other values. It was not changed. To add to the visit, open it "
            "and go on from there."
        )
    return stored


def settle(db, survey, visit_id, choice, by_id):
    """Store which of the entries that disagree holds, and return that entry; the same choice sent twice is one.

    What the chooser had not seen stays in dispute. Raises NotFound, Conflict.
    """
    visit = queries.get_visit(db, survey.id, visit_id)
    if (stored := queries.find_entry(db, choice.id)) is not None:
        if stored.visit_id == visit.id and stored.reason == choice.reason:
            return stored
        raise Conflict("This choice was stored already, with another reason. Open the visit again.")
    chosen = next((one for one in visit.entries if one.id == choice.entry_id), None)
    group = group_of(choice.name)
    if chosen is None or not set(group) & set(chosen.facts):
        raise NotFound("This visit has no such entry to choose.")
    if not set(group) & set(final_visit(visit).disputes):
        raise Conflict("Somebody has chosen meanwhile. See what holds now, then choose again if you must.")
    entry = VisitEntry(
        id=choice.id,
        author_id=by_id,
        seen=list(choice.seen),
        facts={name: chosen.facts[name] for name in group if name in chosen.facts},
        entered={},
        reason=choice.reason,
    )
    visit.entries.append(entry)
    told = {"station": visit.station.code, "says": sorted(entry.facts), "reason": choice.reason}
    remember(db, survey.id, by_id, "visit entries compared, one chosen", "visit", visit.id, told)
    db.commit()
    return entry
