"""The tables of a dataset that keep what else was recorded: meters, checks, visits, bottles, reviews, decisions."""

from dataclasses import replace

from webapp.bottles import words as bottle_words
from webapp.dataset.fields import number, text, whole, yes_no
from webapp.dataset.keeping import kept_rows, kept_table
from webapp.dataset.line import rounded_off
from webapp.meters import words as meter_words
from webapp.visits.words import NUMBERS as FACTS_WITH_NUMBERS

# What a check is told in. pH has no unit.
UNIT_OF = {"do": "mg/L", "temperature": "Cel", "conductance": "uS/cm", "ph": "[pH]"}
_FACT_UNITS = {
    "stage_m": "m",
    "width_m": "m",
    "wading_depth_m": "m",
    "wading_velocity_m_s": "m/s",
    "float_distance_m": "m",
    "float_time_s": "s",
    "surface_velocity_m_s": "m/s",
    "velocity_m_s": "m/s",
    "flow_m3_s": "m3/s",
    "flow_uncertainty_percent": "%",
    "air_temp_c": "Cel",
    "cloud_oktas": "",
    "rain_mm": "mm",
}
_FACT_TITLES = {
    "float_distance_m": "Run of the float",
    "float_time_s": "Time of the float",
    "surface_velocity_m_s": "Velocity at the surface",
    "velocity_m_s": "Mean velocity",
}
_FACT_TEXTS = {
    "platform": "How they read",
    "flow_method": "How the flow was measured",
    "weather": "Weather",
    "water_look": "Look of the water",
    "crew": "Crew",
    "status": "Complete or partial",
    "partial_reason": "Why it is partial",
    "note": "Note",
}
_NOW = "By today's settings."


def _with_choices(table, **choices):
    """Return a table whose named fields are held to these choices."""
    fields = tuple(replace(one, choices=choices.get(one.name, one.choices)) for one in table.fields)
    return replace(table, fields=fields)


def meters_table(rows, names):
    """Return the register of meters."""
    says = "Meters and sensors. Readings and checks know them by their name."
    made = kept_table("meter", "Meters", says, kept_rows("meter", rows, names))
    return _with_choices(made, method=meter_words.METHODS, percent_basis=meter_words.PERCENT_BASES)


def meter_checks_table(rows, names, judged):
    """Return every check of a meter, as judged when it was saved and as judged today."""
    meters = {one.check.id: one.check.meter.name for one in judged}
    now = {one.check.id: one for one in judged}
    told = [
        {
            **row,
            "meter": meters[row["check_id"]],
            "unit": UNIT_OF[row["parameter"]],
            **_judged_cells(now[row["check_id"]]),
        }
        for row in kept_rows("meter_check", rows, names)
    ]
    further = (
        text("meter", "Meter"),
        text("unit", "Unit of shown, expected, compared, error and limit", "UCUM code."),
        number("error_then", "Error, as judged then"),
        yes_no("passes_then", "It passed then"),
        text("grade_then", "Grade then"),
        text("says_then", "What was said then"),
        number("expected_now", "It should have shown", says="By today's equations."),
        number("error", "Error", says="What it showed less what it should have shown."),
        number("error_percent", "Error as a share of what it should have shown", "%"),
        number("limit", "Largest error that passes", says=_NOW),
        yes_no("passes", "It passes", f"{_NOW} Empty where it can't be told."),
        text("grade", "Grade", f"{_NOW} Of checks that end a day: excellent, good, fair, poor or do not report."),
        yes_no("closes", "Readings before it stand as they are", _NOW),
        yes_no("correctable", "Readings before it are to be corrected for drift", _NOW),
        yes_no("reportable", "Readings before it can be reported", _NOW),
        yes_no("set_aside", "Set aside"),
        text("set_aside_reason", "Why it is set aside"),
    )
    says = "Every check of a meter: what it showed and should have shown, as judged then and as judged today."
    made = kept_table("meter_check", "Meter checks", says, told, further)
    words = {name: one.words for name, one in meter_words.PARAMETERS.items()}
    return _with_choices(made, kind=meter_words.KINDS, parameter=words, standard=meter_words.STANDARDS)


def _judged_cells(judged):
    verdict, then = judged.verdict, judged.check.judged or {}
    return {
        "error_then": rounded_off(then.get("error")),
        "passes_then": then.get("passes"),
        "grade_then": then.get("grade"),
        "says_then": then.get("says"),
        "expected_now": rounded_off(judged.expected),
        "error": rounded_off(verdict.error),
        "error_percent": rounded_off(verdict.error_percent),
        "limit": rounded_off(verdict.limit),
        "passes": verdict.passes,
        "grade": verdict.grade,
        "closes": verdict.closes,
        "correctable": verdict.correctable,
        "reportable": verdict.reportable,
        "set_aside": judged.set_aside,
        "set_aside_reason": judged.reason,
    }


def check_decisions_table(rows, names):
    """Return what was decided about checks afterwards."""
    says = "Checks set aside, or used again."
    return kept_table("meter_check_event", "Decisions about checks", says, kept_rows("meter_check_event", rows, names))


def visits_table(rows, names, occasions):
    """Return one row per visit with what is known of it, the sum of its entries."""
    of = {one.visit.id: one for one in occasions if one.visit is not None}
    told = [{**row, **_known(of.get(row["visit_id"]))} for row in kept_rows("visit", rows, names)]
    told.sort(key=lambda row: (row["station_code"], row["visit_no"] or 0, row["visit_id"]))
    further = (
        whole("visit_no", "Visit", "Counts the occupations of the station."),
        _MOMENTS[0],
        _MOMENTS[1],
        *(number(name, _fact_title(name), unit) for name, unit in _FACT_UNITS.items()),
        *(text(name, title) for name, title in _FACT_TEXTS.items()),
        whole("readings", "Readings"),
        text(
            "disputed", "Left open", "Facts about which entries disagree, separated by semicolons; the last is shown."
        ),
    )
    says = "One row for each visit of a station by a crew: what is known of it, the sum of its entries."
    return kept_table("visit", "Visits", says, told, further)


_MOMENTS = (
    replace(text("arrived_at", "Arrived"), type="datetime"),
    replace(text("left_at", "Left"), type="datetime"),
)


def _fact_title(name):
    if name in _FACT_TITLES:
        return _FACT_TITLES[name]
    label = FACTS_WITH_NUMBERS[name].label
    return label[:1].upper() + label[1:]


def _known(occasion):
    if occasion is None:
        return {"visit_no": None}
    visit = occasion.visit
    wanted = ("arrived_at", "left_at", *_FACT_UNITS, *_FACT_TEXTS)
    return {
        "visit_no": occasion.visit_no,
        **{name: visit.facts.get(name) for name in wanted},
        "readings": len(occasion.readings),
        "disputed": ";".join(sorted(visit.disputes)),
    }


def visit_entries_table(rows, names):
    """Return every entry about a visit."""
    says = "Every save of a visit's form, as it was: nothing of it is ever changed."
    return kept_table("visit_entry", "Entries of visits", says, kept_rows("visit_entry", rows, names))


def bottles_table(rows, names, judged):
    """Return every bottle, how long it waited, and what it was found to hold."""
    of = {one.bottle.id: one for one in judged}
    told = [{**row, **_result(of[row["bottle_id"]])} for row in kept_rows("bottle", rows, names)]
    further = (
        text("unit", "Unit of the result", "UCUM code."),
        text("censor", "The result is", choices=bottle_words.CENSORS),
        number("value", "Result", says="In the unit of unit; empty where it is below or above a limit."),
        number("reporting_limit", "Limit", says="In the unit of unit."),
        number("hold_hours", "Waited", "h", "From filling to the beginning of the analysis."),
        number("hold_limit_h", "May wait", "h"),
        text("hold_state", "Hold time", "ok, soon or past; empty where it can't be told."),
        text("quality", "Quality", choices=bottle_words.QUALITIES),
        text("reasons", "Reasons", "Separated by semicolons."),
    )
    says = (
        "Every bottle with the result that holds, the latest. A late result is told all the same, and said to be late."
    )
    made = kept_table("bottle", "Bottles", says, told, further)
    return _with_choices(made, analysis=bottle_words.ANALYSES, kind=bottle_words.KINDS)


def _result(judged):
    result = judged.result
    return {
        "unit": bottle_words.UNITS[judged.bottle.analysis],
        "censor": result.censor if result is not None else None,
        "value": result.value if result is not None else None,
        "reporting_limit": result.limit_value if result is not None else None,
        "hold_hours": rounded_off(judged.hold.hours),
        "hold_limit_h": rounded_off(judged.hold.limit_h),
        "hold_state": judged.hold.state,
        "quality": judged.quality,
        "reasons": ";".join(judged.reasons),
    }


def hand_overs_table(rows, names, bottles):
    """Return every hand-over of bottles."""
    codes = {row["id"]: row["code"] for row in bottles}
    told = [
        {**row, "bottle_codes": ";".join(codes.get(one, one) for one in row["bottles"] or ())}
        for row in kept_rows("hand_over", rows, names)
    ]
    says = "Who passed which bottles to whom."
    further = (text("bottle_codes", "Bottles", "Their codes, separated by semicolons."),)
    return kept_table("hand_over", "Hand-overs", says, told, further)


def lab_results_table(rows, names, bottles):
    """Return every result of a laboratory, also those that later ones replaced."""
    analyses = {row["id"]: (row["code"], row["analysis"]) for row in bottles}
    latest = {}
    told = kept_rows("lab_result", rows, names)
    for row in told:
        latest[row["bottle_id"]] = row["result_id"]
        row["bottle_code"], analysis = analyses[row["bottle_id"]]
        row["unit"] = bottle_words.UNITS[analysis]
    for row in told:
        row["holds"] = latest[row["bottle_id"]] == row["result_id"]
    further = (
        text("bottle_code", "Bottle"),
        text("unit", "Unit", "UCUM code."),
        yes_no("holds", "It holds", "The latest of a bottle does."),
    )
    says = "Every result of a laboratory. A result below a limit has no value, and says which limit."
    made = kept_table("lab_result", "Laboratory results", says, told, further)
    return _with_choices(made, censor=bottle_words.CENSORS)


def reviews_table(rows, names):
    """Return when the survey was reviewed, approved and opened again."""
    says = "When the survey was marked as reviewed, approved or opened again, by whom and why."
    return kept_table("survey_event", "Reviews and approvals", says, kept_rows("survey_event", rows, names))


def decisions_table(rows, names):
    """Return what was decided on site, with what was on the screen."""
    says = "What was decided on site, in the order it was."
    return kept_table("decision", "Decisions on site", says, kept_rows("decision", rows, names))


def audit_table(rows, names):
    """Return every change to the survey, in the order it happened."""
    says = "Every change to the survey, in the order it happened."
    return kept_table("history", "History", says, kept_rows("history", rows, names))
