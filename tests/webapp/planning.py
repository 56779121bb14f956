"""What the tests of the plan's pages share: a form of a reach, and two helpers."""

import re

from webapp.models import Survey

REACH = {
    "name": "Willow glides",
    "from_km": "0",
    "to_km": "7.2",
    "depth_m": "1.1",
    "velocity_m_s": "0.26",
    "width_m": "13",
    "slope": "0.0005",
    "kd20_per_day": "0.75",
    "based_on": "1",
}


def set_survey(app, survey, **facts):
    with app.extensions["bankside_database"].writing() as db:
        row = db.get(Survey, survey.id)
        for name, value in facts.items():
            setattr(row, name, value)
        db.commit()


def message_beside(answer, field):
    found = re.search(rf'id="{field}-error">([^<]*)<', answer.text)
    return found and found.group(1)
