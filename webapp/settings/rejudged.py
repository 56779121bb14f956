"""What changed settings do to what is said of the readings. Nothing judged is stored, so this is told once and kept."""

from calc.settings import Settings
from webapp.plan.queries import current_plan
from webapp.readings.judging import judge, judgement_of


def judged_otherwise(db, survey, values):
    """Return (how many readings have another quality or other reasons under the values, how many there are).

    values holds every setting by key; what they are compared with are the survey's settings as they are stored.
    """
    now = judgement_of(db, survey)
    before = now.by_id
    if not before:
        return 0, 0
    finals = [one.reading for one in before.values()]
    after = judge(survey, current_plan(db, survey.id), Settings.from_dict(values), *now.rows, finals).by_id
    moved = [
        one for one in before if (before[one].quality, before[one].reasons) != (after[one].quality, after[one].reasons)
    ]
    return len(moved), len(before)
