"""A meter check out of a phone's copy."""

from webapp.answers import show_of_form
from webapp.display import Show
from webapp.meters import forms, queries, service


def take(db, survey, copied, now):
    """Store the check of a Copied record without a commit; return (whether it was there already, errors).

    Raises NotFound, Conflict.
    """
    show = show_of_form(copied.form, Show.of(survey))
    new, errors = forms.parse_check(copied.form, show, queries.meters_of(db, survey.id), now)
    if new is None:
        return False, errors
    there = queries.find_check(db, new.id) is not None
    service.put_check(db, survey, new, copied.author_id, now)
    return there, {}
