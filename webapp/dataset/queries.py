"""How much of each thing a survey holds. Whoever asks has shown that they are on the survey."""

from sqlalchemy import func, select

from webapp.models import History, PlanVersion, Reading, ReadingEvent


def count_of_each(db, survey_id):
    """Return how many readings, decisions about them, plan versions and history lines a survey holds, by name."""
    counted = {
        "readings": select(func.count()).select_from(Reading).where(Reading.survey_id == survey_id),
        "decisions": select(func.count()).select_from(ReadingEvent).join(Reading).where(Reading.survey_id == survey_id),
        "versions": select(func.count()).select_from(PlanVersion).where(PlanVersion.survey_id == survey_id),
        "changes": select(func.count()).select_from(History).where(History.survey_id == survey_id),
        "last_change": select(func.max(History.at)).where(History.survey_id == survey_id),
    }
    columns = [query.scalar_subquery().label(name) for name, query in counted.items()]
    return dict(db.execute(select(*columns)).mappings().one())
