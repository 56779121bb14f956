"""Light or dark pages, by a cookie: light in the sun, dark for work before dawn. Also the address of each asset."""

import hashlib
from functools import lru_cache
from importlib.resources import files
from pathlib import Path
from urllib.parse import urlsplit

from flask import current_app, redirect, request, send_from_directory, url_for

LOOKS = ("light", "dark")


def register(app):
    """Add the switch, and what every page needs to draw itself."""
    app.add_url_rule("/look", "look", _switch, methods=["POST"])
    app.add_url_rule("/scripts/<mark>/<name>", "script", _script)
    app.context_processor(lambda: {"look": _look(), "asset": asset})


def asset(name):
    """Return a static file's address with a mark of its content, so that a new version is fetched at once."""
    if name == "htmx.js":
        return url_for("htmx", v=_mark(str(files("js_lib_htmx") / "static/htmx/htmx.min.js")))
    if name.endswith(".js"):
        return url_for("script", mark=scripts_mark(current_app.static_folder), name=name)
    return url_for("static", filename=name, v=_mark(str(Path(current_app.static_folder) / name)))


@lru_cache(maxsize=4)
def scripts_mark(folder):
    """Return the mark of all scripts: they import one another, so they must be of one version."""
    whole = b"".join(path.read_bytes() for path in sorted(Path(folder).glob("*.js")))
    return hashlib.sha256(whole).hexdigest()[:10]


def script_names():
    """Return the names of the scripts that pages load; the worker's is not one of them."""
    return sorted(path.name for path in Path(current_app.static_folder).glob("*.js") if path.name != "worker.js")


def read_script(name):
    """Return the text of a script."""
    return (Path(current_app.static_folder) / name).read_text(encoding="utf-8")


def _script(mark, name):
    """Send a script; under another version's mark it is sent too, but not to be kept."""
    current = mark == scripts_mark(current_app.static_folder)
    return send_from_directory(current_app.static_folder, name, max_age=31536000 if current else 0)


@lru_cache(maxsize=64)
def _mark(path):
    return hashlib.sha256(Path(path).read_bytes()).hexdigest()[:10]


def _look():
    cookie = request.cookies.get("look", "light")
    return cookie if cookie in LOOKS else "light"


def _switch():
    response = redirect(_path_of(request.form.get("back") or "/"), code=303)
    other = "light" if _look() == "dark" else "dark"
    response.set_cookie("look", other, max_age=31536000, samesite="Lax", secure=request.is_secure, httponly=True)
    return response


def _path_of(address):
    """Return the path and query of an address when it is one of this server's, else the front page."""
    try:
        parts = urlsplit(address)
    except ValueError:  # a bracket that never closes
        return "/"
    if not parts.path.startswith("/") or parts.path.startswith(("//", "/\\")):
        return "/"
    return f"{parts.path}?{parts.query}" if parts.query else parts.path
