"""What a crew types into the forms, as rows of CSV: the columns are the names of a form's fields."""

import csv
import io
from datetime import datetime

# How many decimals a meter, a tape or a gauge shows.
DIGITS = {"do_mg_l": 2, "water_temp_c": 1, "depth_m": 2, "sensor_depth_m": 2}
# What is known of a visit only when the crew leaves.
ON_LEAVING = ("status", "partial_reason", "note")


def typed(row):
    """Return the texts of a form's fields; what is empty is left out."""
    texts = {name: _text(name, value) for name, value in row.items()}
    return {name: text for name, text in texts.items() if text}


def _text(name, value):
    if value is None or value is False:
        return ""
    if value is True:
        return "yes"
    if isinstance(value, datetime):
        return value.strftime("%Y-%m-%dT%H:%M")
    if isinstance(value, float) and name in DIGITS:
        return f"{value:.{DIGITS[name]}f}"
    return f"{value:g}" if isinstance(value, float) else str(value)


def table(rows):
    """Return rows of texts as CSV, with every column that one of them has."""
    columns = list(dict.fromkeys(name for row in rows for name in row))
    text = io.StringIO()
    writer = csv.DictWriter(text, columns, restval="")
    writer.writeheader()
    writer.writerows(rows)
    return text.getvalue()


def facts(survey):
    """Return the facts of a survey as CSV, one a line."""
    return table([{"fact": name, "value": value} for name, value in survey.items()])


def numbered(kind, rows):
    """Return the rows with what makes each form's id: its kind and which of its file it is."""
    return [{"submission_id": f"{kind} {number}", **row} for number, row in enumerate(rows, 1)]


def visits(told):
    """Return two entries for each visit: one on arrival, and one on leaving that saw the first.

    told holds station, arrival, leaving and what else the crew entered.
    """
    rows = []
    for number, (code, arrived, left, more) in enumerate(told, 1):
        name, on_leaving = f"visit {number}", {one: more[one] for one in ON_LEAVING if one in more}
        first = {"weather": "dry", "crew": "Cleo Banks, Ruben Ash"} | {
            one: text for one, text in more.items() if one not in on_leaving
        }
        rows.append({"submission_id": name, "station": code, "arrived_at": arrived, **first})
        last = {"submission_id": f"{name}, left", "visit_id": name, "seen": name, "station": code, "left_at": left}
        rows.append(last | {"status": "complete"} | on_leaving)
    return [typed(row) for row in rows]
