"""How much of each thing a survey holds. Whoever asks has shown that they are on the survey."""

from sqlalchemy import func, select

from webapp.models import Bottle, History, LabResult, MeterCheck, PlanVersion, Reading, ReadingEvent, Visit

_TABLES = {
    "readings": Reading,
    "checks": MeterCheck,
    "visits": Visit,
    "bottles": Bottle,
    "results": LabResult,
    "versions": PlanVersion,
    "changes": History,
}


def count_of_each(db, survey_id):
    """Return how many readings, decisions, checks, visits, bottles and versions a survey holds, by name."""
    counted = {
        **{name: _of(table, survey_id) for name, table in _TABLES.items()},
        "decisions": select(func.count()).select_from(ReadingEvent).join(Reading).where(Reading.survey_id == survey_id),
        "last_change": select(func.max(History.at)).where(History.survey_id == survey_id),
    }
    columns = [query.scalar_subquery().label(name) for name, query in counted.items()]
    return dict(db.execute(select(*columns)).mappings().one())


def _of(table, survey_id):
    return select(func.count()).select_from(table).where(table.survey_id == survey_id)
