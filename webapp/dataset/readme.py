"""README.txt of a dataset: what a person reads first."""

import textwrap

from webapp.dataset.equations import EQUATION_SET

_WIDTH = 88


def readme(about, survey, tables, as_of):
    """Return README.txt as bytes; about is what datapackage.json says of itself."""
    parts = [
        about["title"],
        f"Version {about['version']}; last change {as_of or 'none'}.",
        f"River: {survey.river}. Time zone: {survey.time_zone}. Criterion: {_criterion(survey)}.",
        survey.purpose.replace("\r\n", "\n"),
        "Files",
        *(f"  {table.name}.csv: {table.title}, {_rows(table)}. {table.says}" for table in tables),
        "  datapackage.json: the same as a Frictionless Data Package: types, units, limits and keys of every column.",
        "  checksums.txt: the SHA-256 of every file; check with: sha256sum -c checksums.txt",
        "How it is written",
        *(f"  {line}" for line in _CONVENTIONS),
        "Not in here",
        "  left_out.csv lists what was left out on purpose. Notes and reasons are as people wrote them: read them "
        "before you publish.",
        "What it is good for",
        "  Readings are as recorded in the field; quality says what was checked and how. The results support, and "
        "do not replace, the judgement of a licensed professional.",
    ]
    return ("\n\n".join(_wrapped(part) for part in parts if part) + "\n").encode("utf-8")


_CONVENTIONS = (
    "CSV as in RFC 4180: UTF-8, comma, decimal point, a header; an empty cell is a missing value.",
    "Units are SI and stand in every column's name; dictionary.csv gives them as UCUM codes.",
    "Times are ISO 8601 with the offset of the survey's time zone at that time.",
    "Distances are km downstream of the outfall, negative above it. Left and right are as one looks downstream.",
    "Raw is what was recorded and never changes; corrected and final stand beside it; corrections.csv says who, "
    "when and why.",
    "A value below the reporting limit has no number in its final column: see do_censor and do_reporting_limit_mg_l.",
    "Text that a spreadsheet would take for a formula has an apostrophe before it. Numbers never have.",
    "quality is good, not_checked, questionable, bad or missing; reasons are plain words.",
    f"Computed numbers use the set of equations called {EQUATION_SET}: see equations.csv, and settings.csv for every "
    "threshold.",
    "The same version exported twice is the same bytes.",
)


def _rows(table):
    return "1 row" if len(table.rows) == 1 else f"{len(table.rows)} rows"


def _criterion(survey):
    if survey.do_criterion_mg_l is None:
        return "none given"
    return f"{survey.do_criterion_mg_l:g} mg/L of oxygen {survey.criterion_basis}".strip()


def _wrapped(paragraph):
    hang = "    " if paragraph.startswith("  ") else ""
    return "\n".join(
        textwrap.fill(line, _WIDTH, subsequent_indent=hang, break_long_words=False, break_on_hyphens=False)
        for line in paragraph.split("\n")
    )
