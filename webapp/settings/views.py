"""Every threshold of a survey, in versions."""

from flask import Blueprint

bp = Blueprint("settings", __name__)
