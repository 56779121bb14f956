"""The refusals a service may raise, and the page each one becomes."""

from flask import abort, render_template, request
from sqlalchemy.exc import IntegrityError
from werkzeug.exceptions import HTTPException


class Refusal(Exception):
    """A refusal with words for the person; the status is that of the page."""

    status = 400
    title = "That did not work"

    def __init__(self, message):
        super().__init__(message)
        self.message = message


class NotFound(Refusal):
    """It does not exist, or the person may not know that it does."""

    status, title = 404, "Not found"


class NotAllowed(Refusal):
    """The person's role does not do this."""

    status, title = 403, "Not for your role"


class Conflict(Refusal):
    """Somebody was quicker, or the same id came with other content."""

    status, title = 409, "Changed meanwhile"


_UNIQUE_VIOLATION = "23505"  # as PostgreSQL numbers it
WORDS = {
    400: ("That did not work", "The page sent something Bankside could not read. Go back and try again."),
    403: ("Not for your role", "Ask your office if you need this page."),
    404: ("Not found", "There is no such page, or it belongs to a survey you are not on."),
    405: ("That did not work", "This address does not take that request."),
    413: ("Too large", "Bankside takes at most 5 MB at once. Split the file and try again."),
    429: ("Too many tries", "Wait a minute, then try again."),
    500: (
        "Something broke here",
        "It was our fault, and it is written in the server's log. What you saved before is kept.",
    ),
}


def register(app):
    """Turn refusals and HTTP errors into pages."""
    app.before_request(_no_nul_in_address)
    app.register_error_handler(Refusal, lambda error: _page(error.status, error.title, error.message))
    app.register_error_handler(HTTPException, _http_page)
    app.register_error_handler(IntegrityError, _saved_twice_at_once)


def _no_nul_in_address():
    if "\x00" in request.path or "\x00" in request.query_string.decode("latin-1") or "%00" in request.full_path:
        abort(404)  # no database takes it as text


def _http_page(error):
    if error.code is None or error.code < 400:
        return error
    title, message = WORDS.get(error.code, WORDS[400])
    return _page(error.code, title, getattr(error, "bankside_message", message))


def _saved_twice_at_once(error):
    """Answer the slower of two requests that made the same row on one PostgreSQL; any other fault stays one."""
    if getattr(error.orig, "sqlstate", None) != _UNIQUE_VIOLATION:
        raise error
    message = "The same was saved at this moment, perhaps by your own second tap. Open the page again to see it."
    return _page(Conflict.status, Conflict.title, message)


def _page(status, title, message):
    return render_template("error.html", title=title, message=message), status


def stale_form(_error):
    """Answer a form whose token does not fit this session."""
    return _page(
        400,
        "This form is out of date",
        "You signed in or out since it was opened. Open the page again; the Back button keeps what you typed.",
    )
