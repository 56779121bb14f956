"""A row of a plan's table from a form or a whole table from a file; and a row as somebody would type it."""

from dataclasses import dataclass, field, replace

from webapp.forms import whole_number
from webapp.plan.rows import next_codes, refused_code, refused_rows, row_title, with_row
from webapp.plan.tables import PLAN_TABLES, STATIONS
from webapp.tablecell import BadText, read_cell
from webapp.tablefile import BadCell, read_table
from webapp.tablehead import WORDS, shown_head

LONGEST_REASON = 400
MOST_PROPOSALS = 20
NOT_CHOSEN = "–"
FOLDED = {
    "ks20_per_day",
    "kn20_per_day",
    "sod20_g_m2_per_day",
    "respiration_mg_l_per_day",
    "photosynthesis_mg_l_per_day",
    "latitude",
    "longitude",
    "contact",
}


@dataclass(frozen=True)
class RowForm:
    """A row as typed: row holds what could be read, with the old value where a text could not; errors by column key."""

    row: dict
    errors: dict = field(default_factory=dict)


def typed_row(row, table, show):
    """Return a row's values as texts in the units shown."""
    return {column.key: _typed(column, row.get(column.key), show) for column in table.columns}


def _typed(column, value, show):
    if value is None:
        return ""
    return str(value) if column.quantity in ("text", "choice") else show.typed(column.quantity, value)


def parse_row(source, table, show, rows, index):
    """Return the RowForm of a form. rows are those of the table, index that of the row, None for a new one."""
    old = rows[index] if index is not None else {}
    before = typed_row(old, table, show)
    row, errors = {}, {}
    for column in table.columns:
        text = str(source.get(column.key) or "").replace("\x00", "").strip()
        value = old.get(column.key)
        # A number that nobody touched stays to its last digit.
        if text != before[column.key] or (column.required and not text):
            try:
                value = read_cell(shown_head(column, show), text, show)
            except BadText as bad:
                errors[column.key] = str(bad)
        if value is not None:
            row[column.key] = value
    position = len(rows) if index is None else index
    without = {refusal[1:] for refusal in refused_rows(table.key, rows[:position] + rows[position + 1 :])}
    for at, key, message in refused_rows(table.key, with_row(rows, index, row)):
        # Of two rows that clash the later is refused, even where it is the earlier that changes.
        if at == position or (key, message) not in without:
            errors.setdefault(key, message)
    return RowForm(row, errors)


def with_access_place(source, table, tables, show):
    """Return a station's form with the place of its access point where only that was given."""
    source = dict(source)
    if table.key == "stations" and not str(source.get("distance_km") or "").strip():
        place = next((one for one in tables["access"] if one.get("name") == source.get("access")), None)
        if place is not None:
            source["distance_km"] = show.typed("place", place["distance_km"])
    return source


def parse_reason(source, needed):
    """Return (reason, {}) or (None, {"reason": message}); needed says whether there must be one."""
    reason = str(source.get("version_reason") or "").replace("\x00", "").strip()
    if needed and not reason:
        return None, {"version_reason": "Say why the plan changes: readings were taken on it."}
    if len(reason) > LONGEST_REASON:
        return None, {"version_reason": f"Shorten it to {LONGEST_REASON} characters or fewer; it has {len(reason)}."}
    return reason, {}


def parse_based_on(source):
    """Return the number of the version that a form was made from; 0 where it does not say."""
    return whole_number(source.get("based_on"), 0)


def parse_file(text, key, show):
    """Return the TableFile of a text for a plan's table; a row that clashes with another is a bad cell too."""
    table = PLAN_TABLES[key]
    read = read_table(text, table, show)
    if not read.header_errors and not read.rows:
        return replace(read, header_errors=("There is no row below the names.",))
    if key == "basis" and len(read.rows) > 1:
        return replace(read, header_errors=(*read.header_errors, "This table has one row; leave one."))
    bad = {(error.row, error.column_label) for error in read.errors}
    more = []
    for position, column_key, message in refused_rows(key, read.rows):
        label, number = table.column(column_key).label, read.numbers[position]
        if (number, label) not in bad:
            more.append(BadCell(number, label, read.cells[position].get(column_key, "")[:100], message))
    return replace(read, errors=tuple(sorted((*read.errors, *more), key=lambda error: error.row)))


def shown_rows(key, rows, show):
    """Return (title, [(label, text)]) for each row: what has a value, in the units shown."""
    table = PLAN_TABLES[key]
    shown = []
    for number, row in enumerate(rows, start=1):
        facts = [
            (column.label, _shown(column, row[column.key], show))
            for column in table.columns
            if row.get(column.key) not in (None, "") and column.key != table.key_column
        ]
        shown.append((row_title(key, row, number), facts))
    return shown


def _shown(column, value, show):
    if column.quantity == "choice":
        return column.choices.get(value, value)
    if column.quantity == "text":
        return value
    if column.quantity == "place":
        return show.text("place", value) if show.distance_rule == "downstream" else show.place(value)
    if column.quantity == "plain":
        return show.typed("plain", value)
    return show.text(column.quantity, value)


@dataclass(frozen=True)
class RowField:
    """One field of a row's form. folded ones show only when asked to; options are those of a choice."""

    key: str
    label: str
    unit: str
    required: bool
    help: str
    options: tuple = ()
    is_number: bool = False
    negative: bool = False
    folded: bool = False


def row_fields(table, show, form, access):
    """Return the RowFields of a table; access are the names of the access points a station may be at."""
    return [_row_field(column, table, show, str(form.get(column.key) or ""), access) for column in table.columns]


def _row_field(column, table, show, typed, access):
    label, help_text, options = column.label, column.help, ()
    if column.quantity == "place":
        downstream = show.distance_rule == "downstream"
        label = f"{column.label}, {'below the outfall' if downstream else show.place_label().lower()}"
        help_text = help_text or ("Above the outfall with a minus." if downstream else "")
    if column.quantity == "choice":
        options = tuple(column.choices.items()) if column.required else (("", NOT_CHOSEN), *column.choices.items())
    elif (table.key, column.key) == ("stations", "access") and access:
        names = dict.fromkeys([*access, *([typed] if typed else [])])
        options = (("", NOT_CHOSEN), *((name, name) for name in names))
        help_text = "Its place is taken where you enter none."
    words = column.quantity in WORDS
    return RowField(
        key=column.key,
        label=label,
        unit="" if words else show.unit_label(column.quantity),
        required=column.required,
        help=help_text,
        options=options,
        is_number=not words,
        negative=column.low < 0,
        folded=column.key in FOLDED,
    )


def read_lines(read, show):
    """Return (row number, [(text, message)]) for a table as read: what will be stored as shown, else what was typed."""
    wrong = {(bad.row, bad.column_label): bad.message for bad in read.errors}
    lines = []
    for number, row, cells in zip(read.numbers, read.rows, read.cells, strict=True):
        line = []
        for column in read.columns_found:
            message = wrong.get((number, column.label), "")
            value = row.get(column.key)
            line.append((cells[column.key] if message or value is None else _shown(column, value, show), message))
        lines.append((number, line))
    return lines


def typed_proposal(proposed, known, show):
    """Return the form of proposals: ticked where no station is yet, with a code that the survey never had."""
    form = {}
    codes = iter(next_codes(known, len(proposed.proposals)))
    for number, one in enumerate(proposed.proposals):
        form[f"code_{number}"] = "" if one.station else next(codes)
        form[f"take_{number}"] = "" if one.station else "yes"
        form[f"distance_km_{number}"] = show.number("place", one.distance_km, 3)
        form[f"access_{number}"] = one.access
    return form


def parse_proposal(source, show, known, on_site):
    """Return (station rows, {}) or (rows, messages by field). known are all codes the survey ever had."""
    rows, errors = [], {}
    taken = {code.casefold() for code in known}
    for number in range(MOST_PROPOSALS):
        if not source.get(f"take_{number}"):
            continue
        row = {"state": "added" if on_site else "planned"}
        for key in ("code", "distance_km", "access"):
            text = str(source.get(f"{key}_{number}") or "").replace("\x00", "").strip()
            try:
                row[key] = read_cell(shown_head(STATIONS.column(key), show), text, show)
            except BadText as bad:
                errors[f"{key}_{number}"] = str(bad)
        code = str(row.get("code") or "").casefold()
        if code and code in taken:
            errors[f"code_{number}"] = "The survey has or had a station of this code; choose another."
        if (refusal := refused_code(code)) is not None:
            errors[f"code_{number}"] = refusal
        taken.add(code)
        rows.append(row)
    if not rows:
        errors["take"] = "Tick at least one place to add it as a station."
    return rows, errors
