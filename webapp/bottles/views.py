"""Bottles, hand-overs and laboratory results."""

from flask import Blueprint

bp = Blueprint("bottles", __name__)
