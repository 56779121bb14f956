"""A crew at a station: arrival, stage, width, flow, weather."""

from flask import Blueprint

bp = Blueprint("visits", __name__)
