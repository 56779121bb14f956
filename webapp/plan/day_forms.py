"""The form of what the day showed: what was measured, beside what was planned, in the units shown."""

from dataclasses import dataclass
from datetime import datetime

from webapp.forms import Fields
from webapp.plan.day import day_of, day_reach
from webapp.plan.tables import DAY, DAY_REACHES

GROUPS = (
    ("The river above the outfall", ("river_flow_m3_s", "river_temp_c")),
    ("The outfall", ("outfall_flow_m3_s", "outfall_bod5_mg_l", "outfall_do_mg_l", "outfall_temp_c")),
)
OFTEN = ("crew_until", "bottles_until", "drive_to_lab_min", "reachable_anywhere")
SELDOM = ("lab_margin_min", "off_water_before_sunset_min", "closeout_min", "latitude", "longitude")
REACH_KEYS = ("velocity_m_s", "travel_time_h", "depth_m", "water_temp_c")
_PLANNED_AS = {
    "river_flow_m3_s": ("upstream", "flow_m3_s"),
    "river_temp_c": ("upstream", "water_temp_c"),
    "outfall_flow_m3_s": ("outfall", "flow_m3_s"),
    "outfall_bod5_mg_l": ("outfall", "bod5_mg_l"),
    "outfall_do_mg_l": ("outfall", "do_mg_l"),
    "outfall_temp_c": ("outfall", "water_temp_c"),
}


@dataclass(frozen=True)
class DayField:
    """One field: its column, its name in the form, its unit as shown, and what was planned, as a help text."""

    column: object
    name: str
    unit: str
    help: str


@dataclass(frozen=True)
class ReachFields:
    """The fields of one reach; unfolded where one of them holds or needs something."""

    title: str
    fields: tuple[DayField, ...]
    unfolded: bool


@dataclass(frozen=True)
class TimeFields:
    """The fields of how long the crew may stay: those asked each day, and those that seldom change."""

    often: tuple[DayField, ...]
    seldom: tuple[DayField, ...]
    unfolded: bool


def typed_day(tables, reaches, show):
    """Return the form of what is entered already; reaches are the planned ReachRates."""
    form = {column.key: _typed(column, day_of(tables).get(column.key), show) for column in DAY.columns}
    for number, reach in enumerate(reaches):
        row = day_reach(tables, reach.from_km)
        form |= {f"{key}_{number}": _typed(DAY_REACHES.column(key), row.get(key), show) for key in REACH_KEYS}
    return form


def parse_day(source, reaches, show):
    """Return ({"day": [row], "day_reaches": rows}, messages by field); what can't be read is left out of the rows."""
    fields = Fields(source, show)
    row = {column.key: _value(fields, column, column.key) for column in DAY.columns}
    if (row["latitude"] is None) != (row["longitude"] is None):
        lacking = "latitude" if row["latitude"] is None else "longitude"
        fields.refuse(lacking, f"Enter the {lacking} too, or leave both empty.")
    rows = []
    for number, reach in enumerate(reaches):
        values = {key: _value(fields, DAY_REACHES.column(key), f"{key}_{number}") for key in REACH_KEYS}
        if any(value is not None for value in values.values()):
            rows.append({"reach": reach.name, "from_km": reach.from_km, **values})
    filled = {key: value for key, value in row.items() if value is not None and value is not False}
    return {"day": [filled], "day_reaches": rows}, fields.errors


def _value(fields, column, name):
    label = column.label[0].lower() + column.label[1:]
    if column.quantity == "yes_no":
        return fields.ticked(name)
    if column.quantity == "time":
        instant = fields.local_time(name, label, required=False)
        return instant.isoformat() if instant else None
    return fields.number(name, label, column.low, column.high, column.quantity, required=False)


def _typed(column, value, show):
    if value is None or value is False:
        return ""
    if column.quantity == "yes_no":
        return "yes"
    if column.quantity == "time":
        return show.typed_time(datetime.fromisoformat(value))
    return show.typed(column.quantity, value)


def day_groups(tables, show):
    """Return [(title, DayFields)] of what was measured above the outfall and in it, with what was planned."""
    waters = {row.get("kind"): row for row in tables["waters"]}
    return [(title, tuple(_day_field(key, waters, show) for key in keys)) for title, keys in GROUPS]


def time_fields(show, form, errors):
    """Return the TimeFields of how long the crew may stay."""
    often, seldom = (
        tuple(DayField(column, column.key, _unit(column, show), column.help) for column in map(DAY.column, keys))
        for keys in (OFTEN, SELDOM)
    )
    return TimeFields(often, seldom, any(form.get(one.name) or errors.get(one.name) for one in seldom))


def reach_fields(reaches, show, form, errors):
    """Return the ReachFields of the planned reaches."""
    found = []
    for number, reach in enumerate(reaches):
        hours = (reach.to_km - reach.from_km) / (3.6 * reach.velocity_m_s)
        planned = {
            "velocity_m_s": show.text("velocity", reach.velocity_m_s),
            "travel_time_h": f"{hours:.2f} h",
            "depth_m": show.text("depth", reach.depth_m),
            "water_temp_c": show.text("temperature", reach.water_temp_c),
        }
        fields = tuple(
            DayField(
                DAY_REACHES.column(key), f"{key}_{number}", _unit(DAY_REACHES.column(key), show), f"Planned {words}"
            )
            for key, words in planned.items()
        )
        unfolded = any(form.get(one.name) or errors.get(one.name) for one in fields)
        title = f"{reach.name}, {show.number('place', reach.from_km)} to {show.number('place', reach.to_km)} "
        found.append(ReachFields(title + show.unit_label("place"), fields, unfolded))
    return found


def _day_field(key, waters, show):
    column = DAY.column(key)
    kind, planned_key = _PLANNED_AS[key]
    planned = waters.get(kind, {}).get(planned_key)
    words = f"Planned {show.text(column.quantity, planned)}" if planned is not None else column.help
    if key == "outfall_bod5_mg_l" and waters.get(kind, {}).get("cbod_ultimate_mg_l") is not None:
        ultimate = show.text("demand", waters[kind]["cbod_ultimate_mg_l"])
        words = f"Planned {ultimate} ultimate; a BOD5 entered here stands in its place."
    return DayField(column, key, _unit(column, show), words)


def _unit(column, show):
    if column.quantity in ("time", "yes_no"):
        return ""
    if column.key == "travel_time_h":
        return "h"
    if column.key.endswith("_min"):
        return "min"
    return show.unit_label(column.quantity)


def shown_day(tables, show):
    """Return [(label, text)] of what the day showed, in the units shown."""
    facts = [(column.label, _shown(column, day_of(tables).get(column.key), show)) for column in DAY.columns]
    for row in (tables or {}).get("day_reaches") or []:
        columns = map(DAY_REACHES.column, REACH_KEYS)
        facts += [
            (f"{row.get('reach', '')}: {one.label.lower()}", _shown(one, row.get(one.key), show)) for one in columns
        ]
    return [(label, text) for label, text in facts if text]


def _shown(column, value, show):
    if value is None or value is False:
        return ""
    if column.quantity == "yes_no":
        return "yes"
    if column.quantity == "time":
        return show.day_clock(datetime.fromisoformat(value))
    if column.quantity == "plain":
        unit = _unit(column, show)
        return f"{show.typed('plain', value)} {unit}".strip()
    return show.text(column.quantity, value)
