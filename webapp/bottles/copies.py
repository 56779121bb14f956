"""A bottle out of a phone's copy."""

from webapp.answers import show_of_form
from webapp.bottles import forms, queries, service
from webapp.display import Show


def take(db, survey, copied, now):
    """Store the bottle of a Copied record without a commit; return (whether it was there already, errors).

    Raises NotFound, Conflict.
    """
    show = show_of_form(copied.form, Show.of(survey))
    new, errors = forms.parse_bottle(copied.form, show, copied.code, now)
    if new is None:
        return False, errors
    there = queries.find_bottle(db, new.id) is not None
    service.put_bottle(db, survey, new, copied.author_id, now)
    return there, {}
