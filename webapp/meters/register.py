"""What the pages about meters show: how each meter stands, its checks, one check with what to do next."""

from dataclasses import dataclass

from webapp.meters import asking, queries
from webapp.meters.new import find_meter
from webapp.meters.service import expected_of
from webapp.meters.state import LATELY, MeterState, in_order, meter_states, unregistered
from webapp.meters.steps import Step, next_step
from webapp.meters.verdicts import JudgedCheck, judged_checks
from webapp.meters.words import KINDS, MADE_WITH_AIR, PARAMETERS, value_text
from webapp.plan.queries import current_plan
from webapp.readings.asking import thresholds
from webapp.readings.check import PRESSURE_FROM
from webapp.readings.expected import prediction_or_reasons
from webapp.readings.service import station_pressure_of
from webapp.surveys.queries import current_settings


@dataclass(frozen=True)
class Register:
    """Every meter as it stands, every JudgedCheck newest first, and the names that readings use but nobody entered."""

    states: list[MeterState]
    checks: list[JudgedCheck]
    unregistered: list[str]


@dataclass(frozen=True)
class SeenCheck:
    """One check by today's settings, what to do next, and what was said when it was saved, where that was different."""

    judged: JudgedCheck
    step: Step
    then: str
    pressure_from: str
    with_air: bool

    @property
    def asked(self):
        """Return what was asked before it was saved, and kept, in the words that were read."""
        return [one["says"] for one in self.judged.check.judged.get("kept") or []]


def register_of(db, survey, show, now):
    """Return the Register of a survey at an instant."""
    meters, judged, settings = _known(db, survey)
    states = _states(db, survey, show, meters, judged, settings, now)
    return Register(states, judged[::-1], unregistered(meters, queries.names_read_with(db, survey.id)))


def _known(db, survey):
    settings = thresholds(current_settings(db, survey.id))
    judged = in_order(judged_checks(queries.checks_of(db, survey.id), settings))
    return queries.meters_of(db, survey.id), judged, settings


def _states(db, survey, show, meters, judged, settings, now):
    readings = queries.latest_readings(db, survey.id, LATELY)
    return meter_states(show, meters, judged, readings, settings, now, lowest_expected(db, survey))


def _state_of(states, name):
    return next(one for one in states if one.meter.name.casefold() == name.casefold())


def lowest_expected(db, survey):
    """Return the lowest oxygen that the plan expects, None without a prediction. [mg/L]"""
    prediction, _ = prediction_or_reasons(survey, current_plan(db, survey.id))
    return prediction.critical.do_mg_l if prediction else None


def proposed(db, survey, show, now, asked, last=None):
    """Return (meter id, kind, parameter) that a fresh form begins with: as asked, else what comes next.

    Without a meter it is the only one in service, or that of the person's last check, or none.
    """
    meters, judged, settings = _known(db, survey)
    in_service = [one for one in meters if not one.out_of_service]
    usual = in_service[0].id if len(in_service) == 1 else last.meter_id if last else ""
    meter = find_meter(meters, asked["meter"]) or find_meter(in_service, usual)
    parameter = asked["parameter"] if asked["parameter"] in PARAMETERS else "do"
    kind = asked["kind"] if asked["kind"] in KINDS else ""
    if meter is not None and not kind and parameter == "do":
        states = _states(db, survey, show, meters, judged, settings, now)
        kind = _state_of(states, meter.name).next_kind
    return meter.id if meter else "", kind or "as_found", parameter


def asks_of(db, survey, show, new, now, saved_at):
    """Return the findings to ask about before a NewCheck is stored."""
    _, judged, settings = _known(db, survey)
    return asking.asks(survey, show, settings, new, judged, now, saved_at)


def expected_words(survey, show, standard):
    """Return what a meter should show in a Standard, as a sentence; empty where that can't be told yet."""
    if standard.standard not in MADE_WITH_AIR:
        return ""
    expected = expected_of(standard, survey.elevation_m)
    if expected is None:
        return ""
    pressure = show.text("pressure", station_pressure_of(standard, survey.elevation_m))
    return (
        f"It should show {value_text(show, 'do', expected)} at {show.text('temperature', standard.water_temp_c)} and "
        f"{pressure} ({PRESSURE_FROM[standard.pressure_source]})."
    )


def check_of(db, survey, show, check, now):
    """Return the SeenCheck of a stored check at an instant."""
    meters, known, settings = _known(db, survey)
    judged = next(one for one in known if one.check.id == check.id)
    states = _states(db, survey, show, meters, known, settings, now)
    zero_due = any(one.name == "zero_check_due" for one in _state_of(states, check.meter.name).due)
    says = check.judged.get("says") or ""
    return SeenCheck(
        judged=judged,
        step=next_step(show, judged, zero_due),
        then=says if says != judged.verdict.says else "",
        pressure_from=PRESSURE_FROM.get(check.pressure_source, ""),
        with_air=check.standard in MADE_WITH_AIR,
    )
