"""Light or dark pages, by a cookie: light in the sun, dark for work before dawn. Also the address of each asset."""

import hashlib
from functools import lru_cache
from importlib.resources import files
from pathlib import Path
from urllib.parse import urlsplit

from flask import current_app, redirect, request, url_for

LOOKS = ("light", "dark")


def register(app):
    """Add the switch, and what every page needs to draw itself."""
    app.add_url_rule("/look", "look", _switch, methods=["POST"])
    app.context_processor(lambda: {"look": _look(), "asset": asset})


def asset(name):
    """Return a static file's address with a mark of its content, so that a new version is fetched at once."""
    if name == "htmx.js":
        return url_for("htmx", v=_mark(str(files("js_lib_htmx") / "static/htmx/htmx.min.js")))
    return url_for("static", filename=name, v=_mark(str(Path(current_app.static_folder) / name)))


@lru_cache(maxsize=64)
def _mark(path):
    return hashlib.sha256(Path(path).read_bytes()).hexdigest()[:10]


def _look():
    cookie = request.cookies.get("look", "light")
    return cookie if cookie in LOOKS else "light"


def _switch():
    back = urlsplit(request.form.get("back") or "/")
    here = back.path if back.path.startswith("/") and not back.path.startswith(("//", "/\\")) else "/"
    response = redirect(here, code=303)
    other = "light" if _look() == "dark" else "dark"
    response.set_cookie("look", other, max_age=31536000, samesite="Lax", secure=request.is_secure, httponly=True)
    return response
