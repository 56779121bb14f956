"""Reviewed, approved and opened again: the state of a survey."""

from flask import Blueprint

bp = Blueprint("approval", __name__)
