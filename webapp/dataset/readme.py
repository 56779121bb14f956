"""README.txt of a dataset: what a person reads first."""

import textwrap

from webapp.dataset.about import BANKS, LIMITS, ROUNDING, ZERO
from webapp.dataset.equations import EQUATION_SET
from webapp.dataset.recipes import BY_TOOL

_WIDTH = 88


def readme(about, survey, tables):
    """Return README.txt as bytes; about is what datapackage.json says of itself."""
    parts = [
        about["title"],
        f"Version {about['version']}, {about['state']}; last change {about['as_of'] or 'none'}.",
        f"River: {survey.river}. Time zone: {survey.time_zone}. Criterion: {_criterion(survey)}.",
        survey.purpose.replace("\r\n", "\n"),
        "What it is",
        *(f"  {line}" for line in _facts(about)),
        "Versions",
        *(f"  {_version(one)}" for one in about["version_history"] or ({},)),
        "Files",
        *(f"  {table.name}.csv: {table.title}, {_rows(table)}. {table.says}" for table in tables),
        "  datapackage.json: the same as a Frictionless Data Package: types, units, limits and keys of every column.",
        "  checksums.txt: the SHA-256 of every file; check with: sha256sum -c checksums.txt",
        "How it is written",
        *(f"  {line}" for line in _CONVENTIONS),
        "How to open it",
        *(line for tool, lines in BY_TOOL for line in (f"  {tool}:", *(f"    {one}" for one in lines))),
        "Not in here",
        "  left_out.csv lists what was left out on purpose. Notes and reasons are as people wrote them: read them "
        "before you publish.",
        "What it is good for",
        *(f"  {line}" for line in LIMITS),
    ]
    return ("\n\n".join(_wrapped(part) for part in parts if part) + "\n").encode("utf-8")


def _facts(about):
    box, times = about["bounding_box"], about["temporal"]
    yield f"Readings: {times['start']} to {times['end']}." if times else "Readings: none."
    if box:
        yield f"Where: {box['south']} to {box['north']} north, {box['west']} to {box['east']} east, WGS 84."
    yield ZERO
    yield BANKS
    yield " ".join(about["methods"])
    yield f"Meters: {'; '.join(', '.join(one.values()) for one in about['meters']) or 'none registered'}."
    people = "; ".join(f"{one['title']} ({one['role']})" for one in about["contributors"])
    yield f"Who: {people or 'nobody yet'}."
    yield f"Contact: {about['contact']}. Licence: {about['licence']}."
    yield f"To cite it: {about['citation']}"


def _version(event):
    if not event:
        return "Never marked as reviewed or approved."
    why = f" {event['why']}" if event["why"] else ""
    return f"{event['at']}: {event['what']} by {event['by']}, version {event['version']}.{why}"


_CONVENTIONS = (
    "CSV as in RFC 4180: UTF-8, comma, decimal point, a header; an empty cell is a missing value.",
    'Yes and no are true and false in small letters; R reads them as text: compare with "true".',
    "Units are SI and stand in every column's name; dictionary.csv gives them as UCUM codes.",
    "Times are ISO 8601 with the offset of the survey's time zone at that time.",
    "Raw is what was recorded and never changes; corrected, drift_corrected and final stand beside it; "
    "corrections.csv says who, when and why.",
    "A value below the reporting limit has no number in its final column: see do_censor and do_reporting_limit_mg_l.",
    "Text that a spreadsheet would take for a formula has an apostrophe before it, and so has text that begins with an "
    "apostrophe itself: take one away to have it as it was written. Numbers never have.",
    "Stored numbers have the digits that read back as the same number.",
    ROUNDING,
    "People stand by the label of people.csv, stations by their code, versions of the plan by their number.",
    "quality is good, not_checked, questionable, bad or missing; reasons.csv says what the reasons mean.",
    f"Computed numbers use the set of equations called {EQUATION_SET}: see equations.csv, and settings.csv for every "
    "threshold.",
    "The same version exported twice is the same bytes. A Bankside that does not have the survey can take it back from "
    "the zip, without what was left out.",
)


def _rows(table):
    return "1 row" if len(table.rows) == 1 else f"{len(table.rows)} rows"


def _criterion(survey):
    if survey.do_criterion_mg_l is None:
        return "none given"
    return f"{survey.do_criterion_mg_l:g} mg/L of oxygen {survey.criterion_basis}".strip()


def _wrapped(paragraph):
    if paragraph.startswith("    "):  # a line to copy
        return paragraph
    hang = "    " if paragraph.startswith("  ") else ""
    return "\n".join(
        textwrap.fill(line, _WIDTH, subsequent_indent=hang, break_long_words=False, break_on_hyphens=False)
        for line in paragraph.split("\n")
    )
