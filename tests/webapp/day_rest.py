"""What a survey may hold besides readings and meters, for tests that open every page: a visit in dispute, a bottle,
other surveys that were reviewed and approved."""

import uuid
from datetime import UTC, datetime

from tests.conftest import SURVEY_FORM
from tests.webapp.sheets import put_readings
from webapp.approval import queries as approval_queries
from webapp.approval import service as approval
from webapp.approval.forms import Asked
from webapp.bottles import service as bottles
from webapp.bottles.new import NewBottle
from webapp.meters import service as meters
from webapp.meters.new import NewMeter
from webapp.models import Visit, VisitEntry, new_id
from webapp.people.access import SignedIn
from webapp.plan.queries import stations_of
from webapp.surveys import service as survey_service
from webapp.surveys.forms import parse_survey

AT = datetime(2026, 8, 12, 6, tzinfo=UTC)


def put_rest(db, survey, people):
    """Store all that and return the addresses of the pages that it is on."""
    here = f"/surveys/{survey.id}"
    visit = put_dispute(db, survey, people)
    bottle = NewBottle(str(uuid.uuid4()), station_code="D3", code="B1", analysis="bod5", collected_at=AT)
    bottles.add_bottle(db, survey, bottle, people["crew"].id, AT)
    reviewed, approved = (put_other(db, people, name) for name in ("Reviewed brook", "Approved brook"))
    meters.add_meter(db, reviewed, NewMeter(str(uuid.uuid4()), "Meter of the brook"), people["lead"].id)
    for other in (reviewed, approved):
        approval.mark_reviewed(db, other, asked(db, other), SignedIn(people["lead"]))
    approval.approve(db, approved, asked(db, approved), SignedIn(people["office"]))
    return [
        f"{here}/about",
        f"{here}/visits/{visit}",
        f"{here}/bottles/{bottle.id}/result",
        f"{here}/bottles/import",
        f"{here}/settings",
        *(f"/surveys/{other.id}/approval" for other in (reviewed, approved)),
    ]


def put_dispute(db, survey, people):
    """Store a visit of which two phones said different things, and return its id."""
    visit = Visit(id=new_id(), survey_id=survey.id, station_id=stations_of(db, survey.id)["D3"].id,
                  opened_by_id=people["crew"].id)  # fmt: skip
    said = ((people["crew"], 0.43), (people["lead"], 0.52))
    entries = [
        VisitEntry(id=new_id(), visit_id=visit.id, author_id=one.id, made_at=AT, facts={"stage_m": stage})
        for one, stage in said
    ]
    entries[0].facts = {**entries[0].facts, "arrived_at": AT.isoformat()}
    db.add_all([visit, *entries])
    db.commit()
    return visit.id


def put_other(db, people, name):
    """Store another survey with readings, and the lead on it."""
    facts, errors = parse_survey({**SURVEY_FORM, "name": name})
    assert not errors
    other = survey_service.create_survey(db, facts, people["office"].id)
    survey_service.add_member(db, other.id, people["lead"].id, people["office"].id)
    put_readings(db, other, people)
    return other


def asked(db, survey):
    """Return what somebody asks who looks at the survey as it is now."""
    return Asked(str(uuid.uuid4()), approval_queries.mark_of(db, survey.id), "looked through")
