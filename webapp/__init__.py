"""create_app(): configuration, database, blueprints, error pages. Everything else is in the features."""

import logging
from importlib import import_module
from importlib.resources import files

from flask import Flask, send_file
from flask_limiter import Limiter
from flask_limiter.util import get_remote_address
from flask_wtf.csrf import CSRFError, CSRFProtect
from werkzeug.middleware.proxy_fix import ProxyFix

from webapp import compress, db, display, errors, look, secret, spoken
from webapp.config import SHIPPED, read_config

csrf = CSRFProtect()
limiter = Limiter(get_remote_address, default_limits=[], storage_uri="memory://")

FEATURES = (
    "people",
    "surveys",
    "plan",
    "fieldsheet",
    "readings",
    "meters",
    "visits",
    "bottles",
    "review",
    "sag",
    "settings",
    "approval",
    "dataset",
    "surveyfile",
    "fieldpack",
    "trust",
    "invitations",
)
HEADERS = {
    "Content-Security-Policy": "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self' data:; "
    "connect-src 'self'; manifest-src 'self'; worker-src 'self'; form-action 'self'; base-uri 'none'; "
    "frame-ancestors 'none'",
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "same-origin",
    "Permissions-Policy": "geolocation=(self), camera=(), microphone=()",
    "Cross-Origin-Opener-Policy": "same-origin",
}


def create_app(config=None, **flask_settings):
    """Return the application for a Config (by default that of the environment) whose database is up to date."""
    config = config or read_config()
    app = Flask(__name__, template_folder=str(SHIPPED / "templates"), static_folder=str(SHIPPED / "static"))
    app.config.update(
        BANKSIDE=config,
        SECRET_KEY=secret.read_or_make(config.data_dir),
        MAX_CONTENT_LENGTH=5 * 1024 * 1024,
        MAX_FORM_MEMORY_SIZE=5 * 1024 * 1024,
        SESSION_COOKIE_HTTPONLY=True,
        SESSION_COOKIE_SAMESITE="Lax",
        SESSION_COOKIE_SECURE=config.secure_cookies,
        SEND_FILE_MAX_AGE_DEFAULT=31536000,
        WTF_CSRF_TIME_LIMIT=None,  # a form opened at dawn must still save at dusk; the token ends with the session
        RATELIMIT_HEADERS_ENABLED=True,
        RATELIMIT_ENABLED=True,
    )
    app.config.update(flask_settings)
    app.extensions["bankside_database"] = db.Database(db.make_engine(config.database_url, pool_size=config.threads))
    if config.proxies:
        app.wsgi_app = ProxyFix(app.wsgi_app, x_for=config.proxies, x_proto=config.proxies, x_host=config.proxies)
    app.jinja_env.trim_blocks = app.jinja_env.lstrip_blocks = True
    csrf.init_app(app)
    limiter.init_app(app)
    app.teardown_appcontext(db.close_db)
    app.after_request(compress.compress)
    app.after_request(_add_headers)
    errors.register(app)
    app.register_error_handler(CSRFError, errors.stale_form)
    display.register(app)
    spoken.register(app)
    look.register(app)
    app.add_url_rule("/htmx.js", "htmx", _htmx)
    _register_features(app)
    logging.getLogger("waitress.queue").setLevel(logging.ERROR)
    return app


def _register_features(app):
    from webapp.people.access import keep_to_its_survey, login_manager

    login_manager.init_app(app)
    app.before_request(keep_to_its_survey)
    for name in FEATURES:
        app.register_blueprint(import_module(f"webapp.{name}.views").bp)


def _add_headers(response):
    for name, value in HEADERS.items():
        response.headers.setdefault(name, value)
    if response.mimetype == "text/html":
        response.headers.setdefault("Cache-Control", "no-store")
    return response


def _htmx():
    return send_file(
        str(files("js_lib_htmx") / "static/htmx/htmx.min.js"), mimetype="text/javascript", max_age=31536000
    )
