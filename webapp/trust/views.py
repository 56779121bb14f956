"""The page that walks a phone through trusting this machine's certificate authority, also without signing in."""

from flask import Blueprint, Response, current_app, render_template, request

from webapp.errors import NotFound
from webapp.trust.service import Connection, code

bp = Blueprint("trust", __name__)


@bp.get("/trust")
def page():
    """Say what this connection can't do and how to get it, step by step for each kind of phone."""
    config, authority = current_app.config["BANKSIDE"], current_app.config.get("AUTHORITY")
    here = Connection(request.scheme, request.host)
    secure = plain = None
    if authority is not None:
        secure = here.for_phones("https", config.port, config.host)
        plain = here.for_phones("http", current_app.config["PLAIN_PORT"], config.host) + "/trust"
    return render_template(
        "trust/page.html",
        here=here,
        authority=authority,
        secure=secure,
        plain=plain,
        plain_code=code(plain) if plain and here.is_this_machine else None,
    )


@bp.get("/trust/bankside.crt")
def certificate():
    """Give the authority's certificate in the form that phones install. No attachment: iOS would only file it away."""
    if (authority := current_app.config.get("AUTHORITY")) is None:
        raise NotFound("This Bankside was started without --https and has no certificate authority of its own.")
    disposition = {"Content-Disposition": 'inline; filename="bankside.crt"', "Cache-Control": "no-store"}
    return Response(authority.der, mimetype="application/x-x509-ca-cert", headers=disposition)
