"""Which column of which table of the dataset keeps each stored value, so that an import can take every one back.

Units, types and what may be missing come from the models; here stand only names and words. A test holds that every
column of every table that a survey file carries is kept or left out for a reason.
"""

from dataclasses import dataclass
from functools import lru_cache

from sqlalchemy import JSON, Boolean, Float, Integer

from webapp.dataset.fields import Field
from webapp.models import UtcDateTime
from webapp.surveyfile.tables import carried

_KINDS = ((UtcDateTime, "datetime"), (Boolean, "boolean"), (Integer, "integer"), (Float, "number"))
_UNITS = {
    "_mg_l": "mg/L",
    "_us_cm": "uS/cm",
    "_mmhg": "mm[Hg]",
    "_percent": "%",
    "_m_s": "m/s",
    "_km": "km",
    "_ml": "mL",
    "_c": "Cel",
    "_m": "m",
    "_s": "s",
    "latitude": "deg",
    "longitude": "deg",
    "ph": "[pH]",
}
# Kept once for the whole dataset (in survey.csv), in tables of their own, or private.
NOT_HERE = {
    "survey_id": "the dataset is of one survey",
    "thresholds": "one row each in settings.csv",
    "tables": "one row each in plan_rows.csv",
    "series": "one row each in reading_values.csv",
    "safety_note": "private",
}
_AS_JSON = "As JSON."
_TYPED = "As JSON: each number as it was typed, with its unit."
_STORED = ("received_at", "Stored on the server")
_AUTHOR = ("author_id", "Who recorded it", "author")
_MADE = (("made_at", "When"), ("made_by_id", "Who", "made_by"))
_NOTE = ("note", "Note")
_AT = (("station_id", "Station", "station_code"), ("position", "Position across the river"))
# Of each stored table: its table here, what its id is called, and of each column: stored name, title, name here where
# it is another, what it says.
_TABLES = {
    "person": (
        "people",
        "person_id",
        (("name", "Name"), ("role", "What they may do")),
    ),
    "survey": (
        "survey",
        "survey_id",
        (
            ("name", "Name"),
            ("river", "River"),
            ("purpose", "What it must decide"),
            ("time_zone", "Time zone", "", "IANA name; every time in the dataset has its offset."),
            ("unit_system", "Units on screen", "", "What people saw and typed; the dataset is in SI."),
            ("distance_rule", "Distances on screen", "", "The dataset counts downstream of the outfall."),
            ("outfall_mark", "The outfall's own river kilometre or mile"),
            ("elevation_m", "Elevation of the water", "", "Above sea level."),
            ("do_criterion_mg_l", "Oxygen criterion"),
            ("criterion_basis", "Basis of the criterion"),
            ("sampling", "Way of sampling", "", "same_parcel: the water was followed down; snapshot: it was not."),
            ("release_at", "The parcel leaves the outfall"),
            ("created_at", "Survey made"),
            ("created_by_id", "Survey made by", "created_by"),
        ),
    ),
    "settings_version": (
        "settings_versions",
        "settings_version_id",
        (("number", "Settings version", "settings_version"), *_MADE, ("reason", "Reason")),
    ),
    "plan_version": (
        "plan_versions",
        "plan_version_id",
        (("number", "Plan version", "plan_version"), *_MADE, ("reason", "Reason")),
    ),
    "station": (
        "stations",
        "station_id",
        (("code", "Code", "", "Never given to another place."),),
    ),
    "reading": (
        "readings",
        "reading_id",
        (
            _AT[0],
            ("taken_at", "Time at the water"),
            _STORED,
            _AUTHOR,
            ("plan_version_id", "Plan version at the time", "plan_version"),
            *(
                (name, title, f"{name}_raw")
                for name, title in (
                    ("do_mg_l", "Oxygen, as recorded"),
                    ("water_temp_c", "Water temperature, as recorded"),
                    ("depth_m", "Depth of the water, as recorded"),
                    ("do_percent", "Saturation the meter shows, as recorded"),
                    ("conductance_us_cm", "Specific conductance, as recorded"),
                    ("pressure_mmhg", "Air pressure at the station, as recorded"),
                    ("sensor_depth_m", "Depth of the sensor, as recorded"),
                    ("velocity_m_s", "Velocity of the water, as recorded"),
                    ("ph", "pH, as recorded"),
                )
            ),
            _AT[1],
            ("distance_left_m", "Distance from the left edge", "", "Of a vertical, looking downstream."),
            ("percent_basis", "The meter's percent refers to"),
            ("pressure_source", "Where the air pressure comes from"),
            ("velocity_method", "Velocity measured with"),
            ("meter", "Meter", "", "Its name: see meters.csv."),
            ("replicate", "Replicate"),
            ("soak_s", "Time in the water before the value"),
            ("stable", "Were the values stable", "", "Empty where it was not told."),
            ("unstable_reason", "Why they were not"),
            _NOTE,
            ("latitude", "Latitude", "", "WGS 84."),
            ("longitude", "Longitude", "", "WGS 84; negative west of Greenwich."),
            ("position_radius_m", "Radius of the position"),
            ("entered", "As typed", "typed", _TYPED),
            ("kept_findings", "What checks said when it was saved", "findings_said", _AS_JSON),
        ),
    ),
    "reading_event": (
        "corrections",
        "event_id",
        (
            ("reading_id", "Reading's id"),
            ("kind", "What was decided"),
            ("field", "Number corrected"),
            ("old_value", "It was"),
            ("new_value", "It became", "", "Empty where the number was taken away."),
            ("reason", "Why"),
            *_MADE,
            ("particulars", "Particulars", "", "As JSON: of a drift correction its line and the checks it rests on."),
        ),
    ),
    "meter": (
        "meters",
        "meter_id",
        (
            ("name", "Name", "", "What readings and paper sheets know it by; two rows of one name are one meter."),
            ("method", "How it measures"),
            ("maker", "Maker"),
            ("model", "Model"),
            ("serial", "Serial number"),
            ("cap_changed_on", "Cap or membrane changed on"),
            ("serviced_on", "Serviced on"),
            ("resolution_mg_l", "Smallest step it shows"),
            ("percent_basis", "Its percent refers to"),
            ("out_of_service", "Out of service"),
            _NOTE,
            ("made_at", "Registered"),
        ),
    ),
    "meter_check": (
        "meter_checks",
        "check_id",
        (
            ("meter_id", "Meter's id"),
            ("checked_at", "When"),
            _STORED,
            _AUTHOR,
            ("kind", "What kind of check"),
            ("parameter", "What was checked"),
            ("standard", "Against what"),
            ("value", "It showed", "shown", "In the unit of unit."),
            ("expected", "It should have shown", "expected", "As computed when it was saved."),
            ("compared", "The other value", "", "Titration, second meter, thermometer or the standard's label."),
            ("water_temp_c", "Temperature of the standard"),
            ("pressure_mmhg", "Air pressure at the station"),
            ("pressure_source", "Where the air pressure comes from"),
            ("conductance_us_cm", "Specific conductance of the standard"),
            ("place", "Where"),
            ("lot", "Lot of the standard"),
            ("expires_on", "The standard expires on"),
            ("action", "What was done"),
            _NOTE,
            ("entered", "As typed", "typed", _TYPED),
            ("judged", "As judged then", "judged_then", "As JSON: what was said of it when it was saved."),
        ),
    ),
    "meter_check_event": (
        "meter_check_decisions",
        "event_id",
        (("check_id", "Check's id"), ("kind", "What was decided"), ("reason", "Why"), *_MADE),
    ),
    "visit": (
        "visits",
        "visit_id",
        (_AT[0], ("opened_by_id", "Who opened it", "opened_by")),
    ),
    "visit_entry": (
        "visit_entries",
        "entry_id",
        (
            ("visit_id", "Visit's id"),
            ("author_id", "Who said it", "author"),
            ("made_at", "When"),
            _STORED,
            ("facts", "What was said", "", "As JSON, in SI."),
            ("entered", "As typed", "typed", _TYPED),
            ("seen", "Entries they had on the screen", "", _AS_JSON),
            ("reason", "Why"),
        ),
    ),
    "bottle": (
        "bottles",
        "bottle_id",
        (
            ("code", "Code on the label"),
            _AT[0],
            ("analysis", "Analysis"),
            ("kind", "What it holds"),
            ("replicate_of", "Replicate of", "", "Code of the other bottle."),
            ("collected_at", "Filled"),
            _STORED,
            _AUTHOR,
            ("sample_depth_m", "Depth of the sample"),
            _AT[1],
            ("volume_ml", "Volume"),
            ("preservative", "Preservative"),
            ("full", "Full to the brim", "", "Empty where it was not told."),
            ("filtered", "Filtered"),
            ("on_ice_at", "On ice"),
            _NOTE,
            ("entered", "As typed", "typed", _TYPED),
        ),
    ),
    "hand_over": (
        "hand_overs",
        "hand_over_id",
        (
            ("at", "When"),
            ("gave", "Who gave them"),
            ("took", "Who took them"),
            ("place", "Where"),
            ("temperature_c", "Temperature"),
            ("seal", "Seal"),
            _NOTE,
            _AUTHOR,
            ("bottles", "Bottles' ids", "", _AS_JSON),
        ),
    ),
    "lab_result": (
        "lab_results",
        "result_id",
        (
            ("bottle_id", "Bottle's id"),
            ("laboratory", "Laboratory"),
            ("lab_number", "The laboratory's number"),
            ("method", "Method"),
            ("arrived_at", "Arrived"),
            ("arrival_temp_c", "Temperature on arrival"),
            ("started_at", "Analysis started"),
            ("finished_at", "Analysis finished"),
            ("censor", "The value is"),
            ("value", "Value", "", "In the unit of unit; empty where it is below or above a limit."),
            ("limit_value", "Limit", "", "In the unit of unit."),
            ("quality", "The run's own checks", "run_checks", _AS_JSON),
            ("analyst", "Analyst"),
            _NOTE,
            ("entered", "As typed", "typed", _TYPED),
            _AUTHOR,
            ("made_at", "Stored"),
        ),
    ),
    "survey_event": (
        "reviews",
        "event_id",
        (("kind", "What happened"), ("version", "Dataset it was about"), ("reason", "Why"), *_MADE),
    ),
    "decision": (
        "decisions",
        "decision_id",
        (
            *_MADE,
            (
                "kind",
                "What about",
                "",
                "station: where to read next; declined, offered: a place refused or offered again; leave: left or "
                "stayed.",
            ),
            ("chosen", "What was chosen", "", "A station's code, a place, or whether the crew left or stayed."),
            ("reason", "Reason"),
            ("plan_version_id", "Plan version then", "plan_version"),
            ("screen", "What was on the screen", "", "As JSON: numbers in SI, sentences as they were read."),
        ),
    ),
    "history": (
        "audit",
        "history_id",
        (
            ("at", "When"),
            ("person_id", "Who", "person"),
            ("what", "What"),
            ("entity", "Kind of thing changed"),
            ("entity_id", "Its id"),
            ("particulars", "Particulars", "", "As JSON, without private fields."),
        ),
    ),
}  # fmt: skip


@dataclass(frozen=True)
class Kept:
    """How a stored table stands in the dataset: table is its name here, fields a Field by stored column."""

    stored: str
    table: str
    fields: dict


@lru_cache(maxsize=1)
def kept():
    """Return the Kept of each stored table by its stored name."""
    return {name: Kept(name, csv, _fields(name, key, told)) for name, (csv, key, told) in _TABLES.items()}


def _fields(stored, key, told):
    columns = carried()[stored].columns
    fields = {"id": Field(key, "Id", says="The same in every export.", constraints={"required": True})}
    for name, title, *more in told:
        here, says = (*more, "", "")[:2]
        kind = "integer" if here == "plan_version" else kind_of(columns[name])
        unit = _unit(name) if kind == "number" else ""
        fields[name] = Field(here or name, title, kind, unit, says)
    return fields


def kind_of(column):
    """Return the Table Schema type of a stored column; objects and lists are kept as text in JSON."""
    return next((kind for of, kind in _KINDS if isinstance(column.type, of)), "string")


def holds_json(column):
    """Return whether a stored column holds an object or a list."""
    return isinstance(column.type, JSON)


def _unit(name):
    return next((unit for ending, unit in _UNITS.items() if name.endswith(ending)), "")
