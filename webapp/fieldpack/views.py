"""What a phone asks besides pages: who is signed in, and what waits on it."""

from flask import Blueprint, render_template
from flask_login import login_required

bp = Blueprint("fieldpack", __name__)


@bp.get("/phone/here")
def here():
    """Say who is signed in and give a token that fits, or the form to sign in over the page."""
    return render_template("fieldpack/_here.html")


@bp.get("/phone")
@login_required
def phone():
    """Show what waits on this phone; the phone itself fills it in."""
    return render_template("fieldpack/phone.html")
