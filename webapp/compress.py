"""Answers go out compressed where the browser takes gzip: a phone at the river has little signal.

Compressing pages that hold a forgery token is harmless here: session cookies are SameSite=Lax, so no other site can
make a browser fetch them and measure.
"""

import gzip
from functools import lru_cache

from flask import request

TEXTS = {"text/html", "text/css", "text/csv", "text/javascript", "image/svg+xml", "application/json"}
SMALLEST = 600
QUICK, BEST = 5, 9


def compress(response):
    """Compress the answer when that is worth it; files, which carry an entity tag, are compressed once and kept."""
    response.vary.add("Accept-Encoding")
    whole = response.status_code == 200 or response.status_code >= 400
    wanted = "gzip" in request.accept_encodings and request.method != "HEAD" and "Range" not in request.headers
    if not (whole and wanted) or response.mimetype not in TEXTS or response.headers.get("Content-Encoding"):
        return response
    response.direct_passthrough = False
    body = response.get_data()
    if len(body) < SMALLEST:
        return response
    tag = response.headers.get("ETag")
    response.set_data(_kept(tag, body) if tag else gzip.compress(body, QUICK, mtime=0))
    response.headers["Content-Encoding"] = "gzip"
    if tag:
        response.headers["ETag"] = tag.rstrip('"') + '-gzip"'
    return response


@lru_cache(maxsize=64)
def _kept(_tag, body):
    return gzip.compress(body, BEST, mtime=0)
