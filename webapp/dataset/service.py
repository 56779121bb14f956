"""Gathers a survey into the files of its dataset."""

import re
import unicodedata
from dataclasses import dataclass
from types import SimpleNamespace

from webapp.approval.queries import APPROVED, state_of
from webapp.bottles.judged import judged_bottles
from webapp.bottles.queries import bottles_of, results_of
from webapp.bottles.words import REASONS as BOTTLE_REASONS
from webapp.dataset import evidence, keeping, package, queries, records, tables
from webapp.dataset.about import about
from webapp.dataset.equations import equations_table
from webapp.dataset.line import Line
from webapp.dataset.private import LEFT_OUT as LEFT_OUT
from webapp.dataset.readings import corrections_table, readings_table, reasons_table
from webapp.dataset.readme import readme
from webapp.dataset.summary import summary_table
from webapp.plan import queries as plan_queries
from webapp.plan.day import today_of
from webapp.plan.prediction import prediction_of
from webapp.readings.asking import thresholds
from webapp.readings.judging import judgement_of
from webapp.readings.layers import KEPT
from webapp.readings.quality_words import REASONS
from webapp.review.derived import derive
from webapp.review.drift import drift_pairs
from webapp.surveyfile.queries import rows_of
from webapp.surveys.queries import current_settings


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


@dataclass(frozen=True)
class Gathered:
    """A survey with everything that its dataset is made of; rows are all its stored ones by table."""

    survey: object
    rows: dict
    names: keeping.Names
    versions: list
    settings: object
    state: str
    judgement: object
    lines: list
    bottles: list

    @property
    def plan(self):
        """Return the newest version of the plan, or None."""
        return self.versions[0] if self.versions else None


def dataset_of(db, survey):
    """Return the survey's Dataset: the same survey gives the same files, byte by byte, on whatever server."""
    found = _gathered(db, survey)
    made = _tables(found)
    made.append(tables.dictionary_table(made))
    files = {f"{table.name}.csv": package.csv_bytes(table, survey.time_zone) for table in made}
    version = f"{found.state}-{len(found.rows['history'])}-{package.content_mark(files)}"
    name = slug(survey.name)
    says = about(survey, name, version, found.state, found.rows, found.names, found.lines, found.plan)
    files["datapackage.json"] = package.descriptor(says, made, files)
    files["README.txt"] = readme(says, survey, made)
    files["checksums.txt"] = package.checksums(files)
    return Dataset(name, version, files)


def counts_of(db, survey):
    """Return how many of each thing the dataset would hold."""
    return queries.count_of_each(db, survey.id)


def zip_of(dataset):
    """Return the dataset as one zip."""
    return package.zipped(dataset.files)


def slug(name):
    """Return a name of letters, digits and hyphens, as a data package and every file system take it."""
    plain = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode().lower()
    return re.sub(r"[^a-z0-9]+", "-", plain).strip("-")[:60] or "survey"


def _gathered(db, survey):
    rows = rows_of(db, survey.id)
    names = keeping.Names.of(rows)
    versions = plan_queries.plan_versions(db, survey.id)
    settings, judgement = current_settings(db, survey.id), judgement_of(db, survey)
    state, plan = state_of(db, survey.id).kind, versions[0] if versions else None
    return Gathered(
        survey=survey,
        rows=rows,
        names=names,
        versions=versions,
        settings=settings,
        state=state,
        judgement=judgement,
        lines=_lines(survey, plan, judgement, rows, names, thresholds(settings), state),
        bottles=judged_bottles(bottles_of(db, survey.id), results_of(db, survey.id), thresholds(settings)),
    )


def _tables(found):
    zone_says = f"With the offset of {found.survey.time_zone}."
    rows, names, lines, plan = found.rows, found.names, found.lines, found.plan
    return [
        tables.survey_table(rows["survey"], names, plan, found.settings, found.state),
        keeping.people_table(rows, names),
        keeping.plan_versions_table(rows["plan_version"], names),
        keeping.plan_rows_table(rows["plan_version"]),
        *tables.plan_tables(plan, rows["station"], names),
        readings_table(lines, zone_says),
        keeping.values_table(rows["reading"]),
        corrections_table(rows["reading_event"], names),
        summary_table(lines, zone_says, _longitudes(plan)),
        reasons_table(readings=REASONS, bottles=BOTTLE_REASONS),
        *_record_tables(found),
        *_evidence_tables(found),
        tables.prediction_table(plan, _predicted(prediction_of, found.survey, plan)),
        tables.settings_versions_table(rows["settings_version"], names),
        tables.settings_table(rows["settings_version"]),
        equations_table(),
        records.audit_table(rows["history"], names),
        tables.left_out_table(),
    ]


def _longitudes(plan):
    """Return the longitude of each station's access point by the station's code, as far as the plan has it."""
    if plan is None:
        return {}
    access = {row.get("name"): row.get("longitude") for row in plan.tables.get("access") or []}
    return {row["code"]: access.get(row.get("access")) for row in plan.tables.get("stations") or []}


def _record_tables(found):
    rows, names, judgement = found.rows, found.names, found.judgement
    return [
        records.meters_table(rows["meter"], names),
        records.meter_checks_table(rows["meter_check"], names, judgement.checks),
        records.check_decisions_table(rows["meter_check_event"], names),
        records.visits_table(rows["visit"], names, judgement.occasions),
        records.visit_entries_table(rows["visit_entry"], names),
        records.bottles_table(rows["bottle"], names, found.bottles),
        records.hand_overs_table(rows["hand_over"], names, rows["bottle"]),
        records.lab_results_table(rows["lab_result"], names, rows["bottle"]),
        records.reviews_table(rows["survey_event"], names),
        records.decisions_table(rows["decision"], names),
    ]


def _evidence_tables(found):
    settings, lines, occasions = thresholds(found.settings), found.lines, found.judgement.occasions
    pairs, _ = drift_pairs(found.judgement.by_id.values(), found.judgement.checks, settings)
    return [
        evidence.drift_table(lines, pairs),
        evidence.replicates_table(lines, found.bottles, settings),
        evidence.sections_table(occasions),
        evidence.completeness_table(found.plan, lines, settings),
        evidence.deviations_table(found.plan, found.versions, lines, occasions),
    ]


def _predicted(by, survey, plan):
    """Return the plan's Prediction, as planned or with what the day showed, or None where it is not complete."""
    found = by(survey, plan) if plan else None
    return None if found is None or hasattr(found, "missing") else found


def _lines(survey, plan, judgement, rows, names, settings, state):
    stations, limit = (plan.tables.get("stations") or []) if plan else [], settings.oxygen_low_mg_l
    kept = keeping.kept_rows("reading", rows["reading"], names)
    readings = {row["id"]: SimpleNamespace(**row) for row in rows["reading"]}
    # The first of one name, as two servers may each have registered it.
    ordered = sorted(rows["meter"], key=lambda row: (row["made_at"], row["id"]), reverse=True)
    meters = {row["name"].casefold(): row["id"] for row in ordered}
    finals = [judgement.by_id[row["reading_id"]].reading for row in kept]
    derived = derive(survey, stations, _predicted(today_of, survey, plan), finals)
    return [
        Line(
            reading=readings[final.id],
            stored=row,
            final=final,
            derived=one,
            judged=judgement.by_id[final.id],
            censor="less_than" if final.do_mg_l is not None and final.do_mg_l < limit else "none",
            limit_mg_l=limit,
            repeat_mg_l=evidence.repeat_limit_mg_l(final.do_mg_l, settings),
            status=_status(state, final),
            # Who asks, or answers, has not reviewed it.
            reviewer=names.people.get(final.reviewer_id, "") if final.review == KEPT else "",
            meter_id=meters.get(final.meter.casefold(), ""),
        )
        for row, final, one in zip(kept, finals, derived, strict=True)
    ]


def _status(state, final):
    if state == APPROVED:
        return state
    return "reviewed" if final.review == KEPT else "draft"
