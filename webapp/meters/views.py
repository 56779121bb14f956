"""The register of meters, and the checks on them."""

from flask import Blueprint

bp = Blueprint("meters", __name__)
