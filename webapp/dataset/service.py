"""Gathers a survey into the files of its dataset."""

import re
import unicodedata
from dataclasses import dataclass

from calc.settings import SETTINGS
from webapp.dataset import package, queries, tables
from webapp.dataset.equations import EQUATION_SET, equations_table
from webapp.dataset.fields import iso
from webapp.dataset.readings import corrections_table, readings_table, summary_table
from webapp.dataset.readme import readme
from webapp.dataset.reasons import findings_of
from webapp.dataset.tables import LEFT_OUT as LEFT_OUT
from webapp.people.queries import people
from webapp.plan import queries as plan_queries
from webapp.plan.day import today_of
from webapp.plan.prediction import prediction_of
from webapp.readings.layers import FinalReading, final
from webapp.readings.queries import readings_of
from webapp.review.derived import Derived, derive
from webapp.sag.queries import decisions_of
from webapp.surveys.queries import current_settings, history_of

_DEFAULTS = {one.key: one.default for one in SETTINGS}


@dataclass(frozen=True)
class Line:
    """A reading with all that the dataset says of it."""

    reading: object
    final: FinalReading
    derived: Derived
    plan_number: int | None
    findings: tuple
    censor: str
    limit_mg_l: float


@dataclass(frozen=True)
class Dataset:
    """The files of a dataset by name, and what it is called."""

    name: str
    version: str
    files: dict

    @property
    def file_name(self):
        """Return what the zip is called."""
        return f"{self.name}-{self.version}.zip"


def dataset_of(db, survey):
    """Return the survey's Dataset: the same survey gives the same files, byte by byte."""
    history = history_of(db, survey.id)
    made = _tables(db, survey, history)
    made.append(tables.dictionary_table(made))
    files = {f"{table.name}.csv": package.csv_bytes(table, survey.time_zone) for table in made}
    version = f"{len(history)}-{package.content_mark(files)}"
    as_of = iso(history[-1].at, survey.time_zone) if history else ""
    about = {
        "name": slug(survey.name),
        "title": f"{survey.name}: dissolved oxygen in {survey.river}",
        "description": survey.purpose or f"A survey of dissolved oxygen in {survey.river}.",
        "version": version,
        "as_of": as_of,
        "time_zone": survey.time_zone,
        "equation_set": EQUATION_SET,
    }
    files["datapackage.json"] = package.descriptor(about, made, files)
    files["README.txt"] = readme(about, survey, made, as_of)
    files["checksums.txt"] = package.checksums(files)
    return Dataset(about["name"], version, files)


def counts_of(db, survey):
    """Return how many readings, decisions, plan versions and changes the dataset would hold."""
    return queries.count_of_each(db, survey.id)


def zip_of(dataset):
    """Return the dataset as one zip."""
    return package.zipped(dataset.files)


def slug(name):
    """Return a name of letters, digits and hyphens, as a data package and every file system take it."""
    plain = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode().lower()
    return re.sub(r"[^a-z0-9]+", "-", plain).strip("-")[:60] or "survey"


def _tables(db, survey, history):
    who = {person.id: person.name for person in people(db)}
    versions = plan_queries.plan_versions(db, survey.id)
    plan = versions[0] if versions else None
    settings = current_settings(db, survey.id)
    lines = _lines(db, survey, versions, _predicted(today_of, survey, plan), settings)
    zone_says = f"With the offset of {survey.time_zone}."
    return [
        tables.survey_table(survey, who, plan, settings),
        tables.plan_version_table(versions),
        *tables.plan_tables(plan, plan_queries.stations_of(db, survey.id)),
        readings_table(lines, zone_says),
        corrections_table(lines, zone_says),
        summary_table(lines, zone_says),
        tables.prediction_table(plan, _predicted(prediction_of, survey, plan)),
        tables.settings_table(settings),
        equations_table(),
        tables.decisions_table(decisions_of(db, survey.id), {version.id: version.number for version in versions}),
        tables.audit_table(history, who),
        tables.left_out_table(),
    ]


def _predicted(by, survey, plan):
    """Return the plan's Prediction, as planned or with what the day showed, or None where it is not complete."""
    found = by(survey, plan) if plan else None
    return None if found is None or hasattr(found, "missing") else found


def _lines(db, survey, versions, prediction, settings):
    readings = readings_of(db, survey.id)
    finals = [final(reading) for reading in readings]
    stations = (versions[0].tables.get("stations") or []) if versions else []
    numbers = {version.id: version.number for version in versions}
    limit = float({**_DEFAULTS, **settings.thresholds}["oxygen_low_mg_l"])
    return [
        Line(
            reading=reading,
            final=one,
            derived=derived,
            plan_number=numbers.get(reading.plan_version_id),
            findings=findings_of(reading),
            censor="less_than" if one.do_mg_l is not None and one.do_mg_l < limit else "none",
            limit_mg_l=limit,
        )
        for reading, one, derived in zip(readings, finals, derive(survey, stations, prediction, finals), strict=True)
    ]
