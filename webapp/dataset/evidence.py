"""The tables of a dataset that its quality rests on: drift, replicates, sections, completeness, deviations."""

from calc.findings import exceeds
from calc.quality_bottle import bottle_replicate
from calc.quality_day import completeness
from calc.quality_oxygen import replicate_conductance, replicate_spread, replicate_temperature
from webapp.bottles.words import UNITS
from webapp.dataset.fields import DataTable, moment, number, text, whole, yes_no
from webapp.dataset.line import rounded_off


def drift_table(lines, pairs):
    """Return each pair of checks that readings lie between: what the second shows, and whether drift was corrected."""
    fields = (
        text("check_before", "Check before", "Id of the meter check; empty where there is none."),
        text("check_after", "Check after", constraints={"required": True}),
        text("meter", "Meter"),
        moment("started_at", "From"),
        moment("ended_at", "To"),
        number("expected_mg_l", "It should have shown", "mg/L"),
        number("shown_mg_l", "It showed", "mg/L"),
        number("error_mg_l", "Error", "mg/L"),
        number("error_percent", "Error", "%"),
        text("grade", "Grade", "excellent, good, fair, poor or do not report."),
        text("method", "Way of correcting", "ratio or two_point; empty where nothing is to be corrected."),
        whole("readings", "Readings between"),
        whole("corrected", "Of these corrected for drift"),
        text(
            "state", "What came of it", "not_needed, offered, partly, applied, changed, impossible or not_reportable."
        ),
    )
    asked = {pair.check_ids: pair for pair in pairs}
    between = {}
    for line in lines:
        if line.judged.check_after is not None:
            ids = tuple(
                "" if one is None else one.check.id for one in (line.judged.check_before, line.judged.check_after)
            )
            between.setdefault(ids, []).append(line)
    rows = [_drift_row(ids, some, asked.get(ids)) for ids, some in between.items()]
    rows.sort(key=lambda row: (row["ended_at"], row["check_after"], row["check_before"]))
    says = "Every two checks of a meter that readings lie between: its drift, its grade, and whether it was corrected."
    foreign = {"check_before": ("meter_checks", "check_id"), "check_after": ("meter_checks", "check_id")}
    return DataTable("drift", "Drift", says, fields, ("check_before", "check_after"), rows, foreign)


def _drift_row(ids, lines, pair):
    before, after = lines[0].judged.check_before, lines[0].judged.check_after
    return {
        "check_before": ids[0],
        "check_after": ids[1],
        "meter": after.check.meter.name,
        "started_at": before.check.checked_at if before is not None else None,
        "ended_at": after.check.checked_at,
        "expected_mg_l": rounded_off(after.expected),
        "shown_mg_l": after.check.value,
        "error_mg_l": rounded_off(after.verdict.error),
        "error_percent": rounded_off(after.verdict.error_percent),
        "grade": pair.grade if pair is not None else after.verdict.grade,
        "method": pair.correction.method if pair is not None and pair.correction is not None else "",
        "readings": len(lines),
        "corrected": sum(line.final.drift is not None for line in lines),
        "state": pair.state if pair is not None else "not_needed",
    }


_PAIRED = (
    ("do_mg_l", "mg/L", replicate_spread),
    ("water_temp_c", "Cel", replicate_temperature),
    ("conductance_us_cm", "uS/cm", replicate_conductance),
)


def replicates_table(lines, bottles, settings):
    """Return each value that was repeated, beside what it repeats."""
    fields = (
        text("first_id", "First", "Id of the reading or bottle.", constraints={"required": True}),
        text("second_id", "Repeat", "Id of the reading or bottle.", constraints={"required": True}),
        text("what", "What", "A number of readings, or the analysis of bottles.", constraints={"required": True}),
        number("first", "First value"),
        number("second", "Repeated value"),
        number("difference", "Difference", says="Repeated less first."),
        text("unit", "Unit", "UCUM code."),
        number("limit", "Should agree within"),
        text("limit_unit", "Unit of the limit", "UCUM code; % is of the first value, for bottles of the mean."),
        yes_no("agrees", "They agree"),
    )
    finals = {line.reading.id: line.final for line in lines}
    rows = []
    for line in lines:
        if (first := finals.get(line.judged.repeats_id)) is not None:
            rows += _reading_rows(first, line.final, settings)
    rows += _bottle_rows(bottles, settings)
    says = "What was read or filled twice, and how far the two differ."
    return DataTable("replicates", "Replicates", says, fields, ("first_id", "second_id", "what"), rows)


def _reading_rows(first, second, settings):
    rows = []
    for name, unit, differs in _PAIRED:
        one, two = getattr(first, name), getattr(second, name)
        if None not in (one, two):
            found = differs(two, one, settings)
            limit = _limit(name, one, two, settings)
            rows.append(_pair_row((first.id, second.id, name), (one, two), unit, limit, not found))
    return rows


def _limit(name, one, two, settings):
    """Return (how far two values may differ, its unit)."""
    if name == "water_temp_c":
        return settings.replicate_c, "Cel"
    if name == "conductance_us_cm":
        return settings.replicate_conductance_percent, "%"
    return repeat_limit_mg_l((one + two) / 2, settings), "mg/L"


def repeat_limit_mg_l(do_mg_l, settings):
    """Return how far a repeat of oxygen may differ. [mg/L]"""
    low = do_mg_l is not None and exceeds(settings.replicate_low_below_mg_l, do_mg_l)
    return settings.replicate_low_mg_l if low else settings.replicate_mg_l


def _pair_row(key, values, unit, limit, agrees):
    return {
        **dict(zip(("first_id", "second_id", "what"), key, strict=True)),
        "first": rounded_off(values[0]),
        "second": rounded_off(values[1]),
        "difference": rounded_off(values[1] - values[0]),
        "unit": unit,
        "limit": limit[0],
        "limit_unit": limit[1],
        "agrees": agrees,
    }


def _bottle_rows(bottles, settings):
    by_code = {(one.bottle.code.casefold(), one.bottle.analysis): one for one in bottles}
    rows = []
    for second in bottles:
        code = second.bottle.replicate_of.casefold()
        first = by_code.get((code, second.bottle.analysis)) if code else None
        results = [one.result for one in (first, second)] if first not in (None, second) else [None]
        if any(one is None or one.censor != "none" or one.value is None for one in results):
            continue
        values = [one.value for one in results]
        found = bottle_replicate(*values, results[1].limit_value or results[0].limit_value, settings)
        key = (first.bottle.id, second.bottle.id, second.bottle.analysis)
        limit = (settings.bottle_rpd_percent, "%")
        rows.append(_pair_row(key, values, UNITS[second.bottle.analysis], limit, not found))
    return rows


def sections_table(occasions):
    """Return the verdict on each occupation of a station: mixed or not, layered or not."""
    fields = (
        text("station_code", "Station", constraints={"required": True}),
        whole("visit_no", "Visit", constraints={"required": True}),
        text("visit_id", "Visit's id", "Empty where nobody opened one."),
        moment("started_at", "From"),
        moment("ended_at", "To"),
        whole("readings", "Readings"),
        whole("positions", "Positions across the river"),
        yes_no("mixed", "Mixed", "Empty where too little is known."),
        number("do_spread_mg_l", "Spread of oxygen across", "mg/L", "Highest less lowest."),
        number("water_temp_spread_c", "Spread of temperature across", "Cel"),
        number("conductance_spread_percent", "Spread of conductance across", "%", "Of the mean."),
        text("mixed_says", "Mixed, in words"),
        yes_no("stratified", "Layered", "Empty where too little is known."),
        number("do_difference_mg_l", "Oxygen, upper less lower", "mg/L"),
        number("water_temp_difference_c", "Temperature, upper less lower", "Cel"),
        text("stratified_says", "Layered, in words"),
    )
    rows = [_section_row(one) for one in occasions]
    says = "One row for each occupation of a station: whether its water was mixed from bank to bank, and layered."
    foreign = {"station_code": ("stations", "code"), "visit_id": ("visits", "visit_id")}
    return DataTable("sections", "Sections", says, fields, ("station_code", "visit_no"), rows, foreign)


def _section_row(occasion):
    section, layers = occasion.section, occasion.layers
    return {
        "station_code": occasion.station_code,
        "visit_no": occasion.visit_no,
        "visit_id": occasion.visit.id if occasion.visit is not None else "",
        "started_at": occasion.started_at,
        "ended_at": occasion.ended_at,
        "readings": len(occasion.readings),
        "positions": section.points,
        "mixed": section.mixed,
        "do_spread_mg_l": rounded_off(section.do_spread),
        "water_temp_spread_c": rounded_off(section.temp_spread),
        "conductance_spread_percent": rounded_off(section.conductance_spread_percent),
        "mixed_says": section.says,
        "stratified": layers.stratified,
        "do_difference_mg_l": rounded_off(layers.do_difference),
        "water_temp_difference_c": rounded_off(layers.temp_difference),
        "stratified_says": layers.says,
    }


_COMPLETENESS = (
    whole("line", "Line", constraints={"required": True}),
    text("station_code", "Station", "Empty for the whole survey."),
    whole("planned", "Stations planned"),
    whole("readings", "Readings"),
    whole("valid", "Of these valid", "Oxygen is there, and quality is neither bad nor missing."),
    whole("covered", "Stations with a valid reading"),
    number("percent", "Of those planned", "%"),
    number("wanted_percent", "Wanted", "%"),
    yes_no("complete", "Complete", "Empty where nothing was planned."),
    text("says", "In words"),
)


def completeness_table(plan, lines, settings):
    """Return how much of what was planned became valid readings, station by station and of the whole survey."""
    planned = {row["code"] for row in _stations(plan) if (row.get("state") or "planned") != "dropped"}
    valid = {}
    for line in lines:
        valid.setdefault(line.final.station_code, []).append(line.judged.quality not in ("bad", "missing"))
    rows = [
        {
            "station_code": code,
            "planned": int(code in planned),
            "readings": len(valid.get(code, ())),
            "valid": sum(valid.get(code, ())),
            "covered": int(any(valid.get(code, ()))),
        }
        for code in sorted(planned | set(valid))
    ]
    rows.append(_whole_survey(rows, settings))
    told = [{"line": place, **row} for place, row in enumerate(rows, start=1)]
    says = "How much of what the newest plan asks for became valid readings. The last row is the whole survey."
    foreign = {"station_code": ("stations", "code")}
    return DataTable("completeness", "Completeness", says, _COMPLETENESS, ("line",), told, foreign)


def _whole_survey(rows, settings):
    planned = sum(row["planned"] for row in rows)
    covered = sum(row["covered"] for row in rows if row["planned"])
    verdict = completeness(planned, covered, 0, 0, settings)
    return {
        "planned": planned,
        "readings": sum(row["readings"] for row in rows),
        "valid": sum(row["valid"] for row in rows),
        "covered": covered,
        "percent": rounded_off(verdict.percent),
        "wanted_percent": settings.complete_percent,
        "complete": verdict.complete,
        "says": verdict.says,
    }


def _stations(plan):
    return (plan.tables.get("stations") or []) if plan else []


def deviations_table(plan, versions, lines, occasions):
    """Return where the day went another way than it was planned."""
    fields = (
        whole("line", "Line", constraints={"required": True}),
        text("kind", "What", choices=_DEVIATIONS),
        text("station_code", "Station"),
        text("says", "Why or how"),
    )
    read = {line.final.station_code for line in lines}
    stations = _stations(plan)
    rows = [
        {"kind": row["state"], "station_code": row["code"], "says": row.get("reason") or ""}
        for row in stations
        if row.get("state") in ("added", "dropped")
    ]
    rows += [
        {"kind": "not_read", "station_code": row["code"], "says": ""}
        for row in stations
        if row.get("state") != "dropped" and row["code"] not in read
    ]
    rows += [
        {"kind": "partial_visit", "station_code": one.station_code, "says": one.visit.facts.get("partial_reason") or ""}
        for one in occasions
        if one.visit is not None and one.visit.facts.get("status") == "partial"
    ]
    rows += [
        {"kind": reason, "station_code": line.final.station_code, "says": _hours(line.derived.hours_late)}
        for line in lines
        for reason in line.judged.reasons
        if reason in ("late_for_parcel", "early_for_parcel")
    ]
    rows += [
        {"kind": "plan_changed", "says": f"Version {one.number}: {one.reason}"}
        for one in sorted(versions, key=lambda one: one.number)[1:]
    ]
    told = [{"line": place, **row} for place, row in enumerate(rows, start=1)]
    says = "Where the survey went another way than it was planned."
    foreign = {"station_code": ("stations", "code")}
    return DataTable("deviations", "Deviations from the plan", says, fields, ("line",), told, foreign)


_DEVIATIONS = {
    "added": "a station was added on site",
    "dropped": "a station was dropped",
    "not_read": "a station of the plan has no reading",
    "partial_visit": "a visit was left partial",
    "late_for_parcel": "a reading came after the parcel of water",
    "early_for_parcel": "a reading came before it",
    "plan_changed": "the plan was changed",
}


def _hours(hours_late):
    return "" if hours_late is None else f"{abs(hours_late):.1f} h"
