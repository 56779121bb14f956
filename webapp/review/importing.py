"""Readings from a paper sheet: checked as the form checks them, then stored together or not at all."""

import json
import uuid
from collections import Counter
from dataclasses import dataclass
from datetime import UTC, datetime
from statistics import median

from webapp.display import QUANTITIES, Show, plain_digits
from webapp.errors import Conflict
from webapp.forms import FURTHEST_AHEAD
from webapp.models import Reading, Station
from webapp.plan.queries import stations_of
from webapp.readings.asking import findings_on_new, to_ask
from webapp.readings.columns import READINGS
from webapp.readings.day import Day
from webapp.readings.layers import NUMBERS, final
from webapp.readings.new import NewReading
from webapp.readings.service import oxygen_of, put_reading, station_pressure_of, velocity_of
from webapp.readings.surroundings import Neighbourhood
from webapp.readings.values import BadValues, read_values
from webapp.review.queries import stored_ids
from webapp.surveys.service import remember
from webapp.tablefile import BadCell, read_table, write_table
from webapp.tablehead import written_head
from webapp.tablepreview import Preview, in_table_order

_IMPORTED = uuid.UUID("6f1d0a5e-3c0b-5d0f-9a43-6a2f1c7be0d4")
_MEASURED = ("do_mg_l", "values", "water_temp_c", "depth_m", "do_percent", "conductance_us_cm", "ph", "pressure",
             "velocity_m_s")  # fmt: skip
_WORDS = {"percent_basis": "local", "position": "", "meter": "", "replicate": False, "note": "", "unstable_reason": ""}
_PLAIN = ("do_mg_l", "water_temp_c", "depth_m", "do_percent", "conductance_us_cm", "ph", "sensor_depth_m",
          "distance_left_m", "latitude", "longitude", "position_radius_m")  # fmt: skip
# A sheet may hold the median beside its values, rounded by hand.
_ROUNDED_MG_L = 0.05


def checked(db, survey, text):
    """Return the Preview of a readings table as text, with its bad cells and not yet with its readings."""
    file = read_table(text, READINGS, Show.of(survey))
    errors = list(file.errors)
    if not file.header_errors:
        codes = set(stations_of(db, survey.id))
        latest = datetime.now(UTC) + FURTHEST_AHEAD
        for number, row, typed in zip(file.numbers, file.rows, file.cells, strict=True):
            errors += [*_impossible(number, row, typed, codes, latest), *_unreadable(number, row, Show.of(survey))]
    return Preview(file, in_table_order(errors, READINGS))


def preview(db, survey, text):
    """Return the Preview of a readings table as text: what is wrong or, where nothing is, what would be stored."""
    seen = checked(db, survey, text)
    if not seen.good:
        return seen
    new, known = _new_readings(db, survey, seen.file.rows, entered_of(seen.file))
    return Preview(seen.file, (), tuple(new), known)


@dataclass(frozen=True)
class Prepared:
    """The readings of a sheet with what is odd about each, computed and not yet stored; known are here already."""

    day: Day
    new: tuple
    known: int


def prepare(db, survey, rows, entered=None):
    """Return the Prepared of the rows of a sheet: all that takes time and needs no place in the writers' line.

    rows are dictionaries by the column keys of READINGS, in SI; entered, where known, is what was typed for each: a
    dictionary from column key to {"text", "unit"}.

    Raises
    ------
    Conflict
        If the survey has no plan: a reading belongs to one.
    """
    day = Day(db, survey)
    if day.plan is None:
        raise Conflict("There is no plan yet, so there are no stations to read at. Make the plan first.")
    new, known = _new_readings(db, survey, rows, entered or [_in_si(row) for row in rows], day)
    return Prepared(day, tuple(new), known)


def store(db, survey, prepared, by_id):
    """Store the prepared readings in one transaction and return (added, known); what came meanwhile is known.

    Raises NotFound where a reading is of a station that the survey never had.
    """
    held = stored_ids(db, survey.id, [one.id for one in prepared.new])
    new = [one for one in prepared.new if one.id not in held]
    known = prepared.known + len(held)
    with db.no_autoflush:  # the ids are known to be new and unlike each other: one flush for all of them
        for one in new:
            put_reading(db, survey, one, by_id, prepared.day.plan, prepared.day.now)
    if new:
        remember(db, survey.id, by_id, "readings imported", particulars={"added": len(new), "known": known})
    db.commit()
    return len(new), known


def import_readings(db, survey, rows, by_id, entered=None):
    """Prepare and store the rows of a sheet; return (added, known). The same rows imported twice are stored once."""
    return store(db, survey, prepare(db, survey, rows, entered), by_id)


def columns_in_words(show):
    """Return (name with unit, words of its choices) of each column an import understands."""
    return [
        (written_head(column, show), [words for words in column.choices.values() if words])
        for column in READINGS.columns
    ]


def empty_sheet(show):
    """Return an empty table as CSV, with the column names and units that an import understands."""
    return write_table([], READINGS, show)


def entered_of(file):
    """Return what was typed for the numbers of each row of a TableFile, as a reading keeps it."""
    return [
        {
            key: {"text": text, "unit": units.get(key) or "mg/L"}
            for key, text in cells.items()
            if text and (units.get(key) or key == "values")
        }
        for cells, units in zip(file.cells, file.units, strict=True)
    ]


def _in_si(row):
    entered = {}
    for column in READINGS.columns:
        if column.quantity not in QUANTITIES or row.get(column.key) is None:
            continue
        unit = row.get(f"{column.key}_unit") or QUANTITIES[column.quantity][0]
        value = Show().shown(column.quantity, row[column.key], unit)
        entered[column.key] = {"text": plain_digits(value), "unit": unit}
    if row.get("values"):
        entered["values"] = {"text": row["values"], "unit": "mg/L"}
    return entered


def _impossible(number, row, typed, codes, latest):
    """Return a BadCell for whatever in a row can't be, as the form refuses it."""

    def bad(key, message):
        return BadCell(number, READINGS.column(key).label, typed.get(key, "")[:100], message)

    if row.get("station") and row["station"] not in codes:
        known = ", ".join(sorted(codes)) or "none yet: make the plan first"
        yield bad("station", f"This survey has no such station. It has: {known}.")
    if row.get("taken_at") and row["taken_at"] > latest:
        yield bad("taken_at", "That time is still to come; check the date and the hour.")
    if not any(row.get(key) is not None or typed.get(key) for key in _MEASURED):
        yield bad("do_mg_l", "Nothing was measured in this row. Fill it in, or take the row out.")
    if (row.get("sensor_depth_m") or 0) > (row["depth_m"] if row.get("depth_m") is not None else 1000):
        yield bad("sensor_depth_m", "The sensor would be under the bed. Check this and the depth of the water.")
    if row.get("pressure") is not None and row.get("pressure_source", "standard") == "standard":
        yield bad("pressure_source", "Say where the air pressure comes from: a weather report's is converted.")
    if row.get("velocity_m_s") is not None and not row.get("velocity_method"):
        yield bad("velocity_method", "Say how the velocity was measured: a float runs faster than the water.")


def _unreadable(number, row, show):
    """Return a BadCell for several values that can't be read, or that are not those of the oxygen beside them."""
    text, oxygen = row.get("values"), row.get("do_mg_l")
    if not text:
        return
    label = READINGS.column("values").label
    try:
        middle = median(one["do_mg_l"] for one in read_values(text, show))
    except BadValues as bad:
        yield BadCell(number, label, text[:100], str(bad))
        return
    if oxygen is not None and abs(oxygen - middle) > _ROUNDED_MG_L:
        says = f"Their median is {middle:.2f} mg/L, and the oxygen beside them is {oxygen:g}. Put one of them right."
        yield BadCell(number, label, text[:100], says)


def _new_readings(db, survey, rows, entered, day=None):
    """Return the NewReadings that the survey does not hold yet, with what is odd about each, and how many it does."""
    made = _identified(survey, rows, entered)
    held = stored_ids(db, survey.id, [one.id for one in made])
    new = [one for one in made if one.id not in held]
    return (_looked_at(survey, new, day or Day(db, survey)) if new else []), len(held)


def _identified(survey, rows, entered):
    """Return a NewReading for each row; its id follows from what it says, and from how many like it came before."""
    made, seen, show = [], Counter(), Show.of(survey)
    for row, typed in zip(rows, entered, strict=True):
        content = json.dumps([survey.id, row], sort_keys=True, default=_content)
        made.append(_new(row, typed, str(uuid.uuid5(_IMPORTED, f"{content}#{seen[content]}")), show))
        seen[content] += 1
    return made


def _content(value):
    return value.astimezone(UTC).isoformat()


def _new(row, typed, reading_id, show):
    by_float = row.get("velocity_method") == "float"
    return NewReading(
        id=reading_id,
        station_code=row["station"],
        taken_at=row["taken_at"],
        pressure_mmhg=row.get("pressure"),
        pressure_source=row.get("pressure_source") or "standard",
        velocity_m_s=None if by_float else row.get("velocity_m_s"),
        surface_velocity_m_s=row.get("velocity_m_s") if by_float else None,
        velocity_method=row.get("velocity_method") or "",
        **{key: row.get(key) for key in _PLAIN},
        **{key: row[key] if row.get(key) is not None else empty for key, empty in _WORDS.items()},
        series=read_values(row["values"], show) if row.get("values") else (),
        entered=typed,
    )


def _looked_at(survey, new, day):
    """Return the readings with what the form would have asked about, each beside all the others."""
    settled = [day.settled(one) for one in new]
    beside = Neighbourhood(survey, day.plan, [*day.readings, *(_as_stored(survey, one) for one in settled)])
    return [one.keeping(_findings(survey, one, beside, day)) for one in settled]


def _findings(survey, new, beside, day):
    around = beside.around(new.station_code, new.taken_at, new.id, new.replicate)
    return to_ask(findings_on_new(survey, day.settings, new, around, day.now, day.meters), new, day.now)


def _as_stored(survey, new):
    """Return the FinalReading it would be, for the others to be compared with; no session ever sees it."""
    numbers = {name: getattr(new, name) for name in NUMBERS}
    numbers |= {
        "do_mg_l": oxygen_of(new, survey.elevation_m),
        "pressure_mmhg": station_pressure_of(new, survey.elevation_m),
        "velocity_m_s": velocity_of(new),
    }
    return final(
        Reading(id=new.id, taken_at=new.taken_at, station=Station(code=new.station_code), events=[], **numbers)
    )
