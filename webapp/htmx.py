"""Chooses whole page or fragment."""

from flask import make_response, render_template, request


def wants_fragment():
    """Return whether htmx asked for a part of the page (and not for a page it lost from its history)."""
    return "HX-Request" in request.headers and "HX-History-Restore-Request" not in request.headers


def page_or_part(page, part, status=200, **context):
    """Return the part where htmx asked for one, else the page; both are rendered from the same context."""
    response = make_response(render_template(part if wants_fragment() else page, **context), status)
    response.headers["Vary"] = "HX-Request"
    return response
