"""A reading out of a phone's copy."""

from webapp.answers import show_of_form
from webapp.display import Show
from webapp.plan.queries import current_plan
from webapp.readings import forms, queries, service


def take(db, survey, copied, now):
    """Store the reading of a Copied record without a commit; return (whether it was there already, errors).

    Raises NotFound, Conflict.
    """
    show = show_of_form(copied.form, Show.of(survey))
    new, errors = forms.parse_reading(copied.form, show, copied.code, now)
    if errors or new is None:
        return False, errors
    there = queries.find_reading(db, new.id) is not None
    service.put_reading(db, survey, new, copied.author_id, current_plan(db, survey.id), now)
    return there, {}
