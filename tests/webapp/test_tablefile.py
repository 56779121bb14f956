import csv
import io
from datetime import UTC, datetime

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from webapp.display import Show
from webapp.plan.tables import ACCESS, PLAN_TABLES, REACHES, STATIONS, WATERS, WEIRS
from webapp.readings.columns import READINGS
from webapp.tablefile import BadCell, decode, letters, read_table, write_table

SI = Show()
US = Show(unit_system="us")
MILES = Show(unit_system="us", distance_rule="river_mile", outfall_mark=41.2)
KM_UP = Show(distance_rule="river_km", outfall_mark=66.3)
SHOWS = [SI, US, MILES, KM_UP]
TABLES = [*PLAN_TABLES.values(), READINGS]


def read_weirs(text, show=SI):
    table = read_table(text, WEIRS, show)
    assert table.good, (table.errors, table.header_errors)
    return list(table.rows)


@pytest.mark.parametrize(
    "text",
    [
        "Name,Where,Drop\nMill weir,3.2,1.1\n",
        "name;where;drop\nMill weir;3,2;1,1\n",
        "NAME\tWhere\tDrop\r\nMill weir\t3.2\t1.1\r\n",
        "Name\tWhere\tDrop\rMill weir\t3,2\t1,1\r",
        '\ufeff"Name","Where","Drop"\n\n"Mill weir","3,2","1,1"\n\n',
        "sep=;\nName;Distance;Fall\nMill weir;3.2;1.1",
        "Drop, Where ,Name\n 1.1 , 3.2 , Mill weir \n",
    ],
)
def test_the_same_table_is_read_however_a_spreadsheet_writes_it(text):
    assert read_weirs(text) == [{"name": "Mill weir", "distance_km": 3.2, "drop_m": 1.1}]


@pytest.mark.parametrize(
    ("header", "show", "drop_m"),
    [
        ("Drop", SI, 2.0),
        ("Drop", US, 0.6096),
        ("drop_m", US, 2.0),
        ("Drop m", US, 2.0),
        ("Drop (m)", US, 2.0),
        ("Drop (ft)", SI, 0.6096),
        ("Drop [feet]", SI, 0.6096),
        ('"drop, ft"', SI, 0.6096),
        ("drop in feet", SI, 0.6096),
        ("drop_ft", SI, 0.6096),
        ("FALL ([ft_i])", SI, 0.6096),
    ],
)
def test_unit_in_the_header_is_honoured(header, show, drop_m):
    table = read_table(f"Name,distance_km,{header}\nMill weir,3.2,2\n", WEIRS, show)
    assert table.good and table.rows[0]["drop_m"] == drop_m


def test_every_unit_of_flow_and_temperature_that_the_trade_writes_is_known():
    text = "What it is,Flow (Mgal/d),Temp (°F),DO (%),BOD5 (mg/L)\noutfall,2.5,68,45,18\n"
    row = read_table(text, WATERS, SI).rows[0]
    assert row["flow_m3_s"] == pytest.approx(2.5 * 0.0438126364)
    assert row["water_temp_c"] == pytest.approx(20.0)
    assert row["do_percent"] == 45 and "do_mg_l" not in row


@pytest.mark.parametrize(
    ("header", "typed", "show", "distance_km"),
    [
        ("distance_km", "3.2", MILES, 3.2),
        ("Where", "3.2", SI, 3.2),
        ("km", "3.2", SI, 3.2),
        ("km", "2", US, 2.0),
        ("Where", "2", US, 3.218688),
        ("Where", "40.2", MILES, 1.609344),
        ("River mile", "40.2", MILES, 1.609344),
        ("Where (river mile)", "40.2", MILES, 1.609344),
        ("Where (km below the outfall)", "2", MILES, 2.0),
        ("River km", "63.1", KM_UP, 3.2),
        ("km", "63.1", KM_UP, 3.2),
        ("miles", "-1", SI, -1.609344),
    ],
)
def test_places_follow_the_rule_their_header_or_the_survey_names(header, typed, show, distance_km):
    rows = read_weirs(f"Name,{header},drop_m\nMill weir,{typed},1\n", show)
    assert rows[0]["distance_km"] == pytest.approx(distance_km, abs=1e-9)


def test_river_miles_are_refused_where_the_survey_has_no_mark_for_them():
    table = read_table("Name,River mile,Drop\nMill weir,40.2,1\n", WEIRS, SI)
    assert table.header_errors == (
        "“River mile”: this survey does not count its distances by River mile; see the survey's facts.",
    )


def test_a_unit_of_another_kind_is_refused_with_what_fits():
    table = read_table("Name,km,Drop (°C)\nMill weir,3.2,1\n", WEIRS, SI)
    assert table.header_errors == (
        "“Drop (°C)”: “°C” is no unit that Bankside can take here; use m, or leave the unit out.",
    )


def test_each_bad_cell_is_named_by_row_and_column_with_what_to_do():
    text = "Name,Where,Drop,Shape\n\nMill weir,3.2,high,flat\n,4.1,99,oval\n"
    table = read_table(text, WEIRS, SI)
    shapes = "flat broad crest; sharp crest, straight slope face; sharp crest, vertical face; submerged gate"
    assert table.errors == (
        BadCell(3, "Drop", "high", "Enter a number, for example 12.4."),
        BadCell(4, "Name", "", "It is empty; fill it in."),
        BadCell(4, "Drop", "99", "It must lie between 0.05 and 4.5 m; check it."),
        BadCell(4, "Shape", "oval", f"Write one of: {shapes}."),
    )
    assert table.numbers == (3, 4)
    assert table.cells[0]["drop_m"] == "high"


def test_range_is_told_in_the_unit_of_the_header():
    table = read_table("Name,Where (river mile),Drop (ft)\nMill weir,2000,99\n", WEIRS, MILES)
    assert [bad.message for bad in table.errors] == [
        "It must lie between -1201.54 and 351.886 mi; check it.",
        "It must lie between 0.164042 and 14.7638 ft; check it.",
    ]


def test_the_end_of_a_range_passes_in_any_unit():
    table = read_table("What it is,Flow,Temperature (°F)\nupstream,1,104\n", WATERS, SI)
    assert table.good and table.rows[0]["water_temp_c"] == 40.0


def test_missing_columns_stop_and_unknown_ones_are_named_as_ignored():
    table = read_table("Name,Colour,Drop\nMill weir,red,1\n", WEIRS, SI)
    assert table.header_errors == ("The column “Where” is missing.",)
    assert table.ignored == ("Colour",)


def test_a_table_without_its_names_is_told_to_bring_them():
    table = read_table("Mill weir\t3.2\t1.1\n", WEIRS, SI)
    assert table.header_errors == (
        "Its first row must name the columns; Bankside knows here: Name, Where, Drop, Water quality, Shape.",
    )


def test_one_column_given_twice_is_asked_about():
    table = read_table("Name,Where,Drop,Fall\nMill weir,3.2,1,1\n", WEIRS, SI)
    assert table.header_errors == ("“Drop” and “Fall” both mean Drop; take one away.",)


def test_a_cell_without_a_name_above_it_is_reported_and_not_dropped():
    table = read_table("Name,Where,Drop\nMill weir,3.2,1,left bank\n", WEIRS, SI)
    assert table.errors == (
        BadCell(2, "column D", "left bank", "No column name stands above this cell. Name its column, or empty it."),
    )


def test_two_decimal_marks_in_one_file_are_a_conflict():
    table = read_table("Name;Where;Drop\nMill weir;3,25;1,1\nLow weir;4.5;1\n", WEIRS, SI)
    said = "Numbers are written with a comma (3,25 in row 2) and with a dot (4.5 in row 3)."
    assert table.header_errors == (f"{said} Use one decimal mark throughout.",)


@pytest.mark.parametrize(
    ("first", "second", "conductance", "trouble"),
    [
        ("0,5", "1,234", 1.234, None),
        ("0.5", "1,234", 1234.0, None),
        ("0,5", "1.234,5", 1234.5, None),
        ("1", "1,234", None, "Say which you mean: 1,234 can be read in two ways: write 1.234 or 1234."),
    ],
)
def test_grouped_thousands_are_read_by_what_the_file_shows_elsewhere(first, second, conductance, trouble):
    table = read_table(f"Type;Flow;SC\noutfall;{first};{second}\n", WATERS, SI)
    assert table.rows[0].get("conductance_us_cm") == conductance
    assert [bad.message for bad in table.errors] == ([trouble] if trouble else [])


@pytest.mark.parametrize(
    "typed", ["1_000", "\u0661\u0662", "nan", "inf", "1e999", "0x1F", "1,2,3", "--1", "\uff11", "1 000", "#REF!"]
)
def test_what_only_a_lenient_reader_takes_for_a_number_is_refused(typed):
    table = read_table(f"Type\tFlow\noutfall\t{typed}\n", WATERS, SI)
    assert len(table.errors) == 1 and not table.rows[0].keys() & {"flow_m3_s"}


def test_small_numbers_in_the_form_spreadsheets_give_them_are_read():
    text = "Name;From;To;Depth;Slope\nUpper;-1;5;1,2;8,00E-05\n"
    assert read_table(text, REACHES, SI).rows[0]["slope"] == 0.00008


@pytest.mark.parametrize(
    ("typed", "key"),
    [("added", "added"), ("Added on site", "added"), ("ADDED", "added"), ("dropped", "dropped"), ("pla", "planned")],
)
def test_choices_are_taken_as_key_or_words(typed, key):
    assert read_table(f"Code,km,State\nD1,1,{typed}\n", STATIONS, SI).rows[0]["state"] == key


@pytest.mark.parametrize(
    "typed",
    [
        "2026-08-12 06:05",
        "2026-08-12T06:05:00",
        "2026-08-12T04:05Z",
        "2026-08-12T06:05+02:00",
        "12.08.2026 06:05",
        "12.8.2026 6:05",
    ],
)
def test_times_are_read_in_the_given_zone(typed):
    table = read_table(f"Station,Time,Replicate\nD1,{typed},Yes\n", READINGS, SI, "Europe/Vienna")
    assert table.rows == ({"station": "D1", "taken_at": datetime(2026, 8, 12, 4, 5, tzinfo=UTC), "replicate": True},)


@pytest.mark.parametrize(
    "typed", ["2026-08-12", "08/12/2026 06:05", "06:05", "2026-13-01 06:05", "46246.25", "0001-01-01 00:00"]
)
def test_other_times_are_refused(typed):
    assert len(read_table(f"Station,Time\nD1,{typed}\n", READINGS, SI).errors) == 1


def test_a_unit_beside_a_number_says_what_the_number_is_in():
    text = (
        "Station,Time,Air pressure,Unit of the air pressure\nD1,2026-08-12 06:05,1000,hPa\nD1,2026-08-12 07:05,751,\n"
    )
    rows = read_table(text, READINGS, SI).rows
    assert [row["pressure"] for row in rows] == [pytest.approx(750.062, abs=0.001), 751]
    again = read_table(write_table(rows, READINGS, SI), READINGS, SI)
    assert again.good and [row["pressure"] for row in again.rows] == pytest.approx([row["pressure"] for row in rows])


def test_too_many_rows_and_too_long_cells_are_refused():
    assert "at most 2000" in read_table("Code,km\n" + "D1,1\n" * 2001, STATIONS, SI).header_errors[0]
    assert "Shorten it to 2000" in read_table(f"Code,km\n{'D' * 2001},1\n", STATIONS, SI).errors[0].message
    assert "Shorten it to 12" in read_table("Code,km\nD123456789012,1\n", STATIONS, SI).errors[0].message


def test_an_open_quotation_mark_is_found_and_its_row_named():
    table = read_table('Name,Where,Drop\nMill weir,3.2,1\n"Low weir,4,1\nHigh weir,5,1\n', WEIRS, SI)
    assert table.header_errors == ("The quotation marks from row 3 on do not pair up; nothing below it was read.",)


def test_a_quotation_mark_within_pasted_cells_is_only_a_mark():
    assert read_weirs('Name\tkm\tDrop\n12" sill\t3.2\t1\n')[0]["name"] == '12" sill'


@pytest.mark.parametrize(
    ("data", "text"),
    [
        ("Mühlwehr".encode(), "Mühlwehr"),
        ("Mühlwehr".encode("utf-8-sig"), "Mühlwehr"),
        ("Mühlwehr".encode("cp1252"), "Mühlwehr"),
        ("Mühlwehr".encode("utf-16"), "\ufeffMühlwehr"),
        (b"\x81\x8d", "\x81\x8d"),
        (b"\xff\xfe\x00", "\ufffd"),
    ],
)
def test_uploaded_bytes_are_read_in_the_encoding_they_come_in(data, text):
    assert decode(data).removeprefix("\ufeff") == text.removeprefix("\ufeff")


@pytest.mark.parametrize(
    "name", ["=1+1", "+43 1 234", "-left bank", "@home", "'=quoted", "'plain", 'He said "7"', "two\nlines", "a;b,c\td"]
)
def test_text_that_looks_like_a_formula_is_defused_and_read_back(name):
    written = write_table([{"name": name, "distance_km": -1.5}], ACCESS, SI)
    cell = next(csv.DictReader(io.StringIO(written, newline="")))
    assert not cell["Name"].startswith(("=", "+", "-", "@"))
    assert cell["Where (km below the outfall)"] == "-1.5"
    assert read_table(written, ACCESS, SI).rows == ({"name": name, "distance_km": -1.5},)


def test_spreadsheet_letters_run_past_z():
    assert [letters(position) for position in (0, 25, 26, 51, 52, 701, 702)] == [
        "A",
        "Z",
        "AA",
        "AZ",
        "BA",
        "ZZ",
        "AAA",
    ]


def _value(column):
    if column.quantity == "text":
        texts = st.text(
            st.characters(codec="utf-8", exclude_characters="\x00\ufeff"), min_size=1, max_size=column.longest
        )
        return texts.map(str.strip).filter(bool)
    if column.quantity == "choice":
        return st.sampled_from([key for key in column.choices if key])
    if column.quantity == "yes_no":
        return st.booleans()
    if column.quantity == "time":
        return st.integers(1_000_000_000, 4_000_000_000).map(lambda second: datetime.fromtimestamp(second, UTC))
    return (
        st.floats(column.low, column.high)
        .map(lambda value: float(f"{value:.9g}"))
        .filter(lambda value: column.low <= value <= column.high and (value == 0 or abs(value) > 1e-4))
    )


def _row(table):
    required = {column.key: _value(column) for column in table.columns if column.required}
    others = {column.key: _value(column) for column in table.columns if not column.required}
    return st.fixed_dictionaries(required, optional=others).filter(bool)


@pytest.mark.parametrize("table", TABLES, ids=lambda table: table.key)
@settings(max_examples=30, deadline=None)
@given(data=st.data())
def test_what_is_written_reads_back_as_the_same_rows(table, data):
    show = data.draw(st.sampled_from(SHOWS))
    rows = data.draw(st.lists(_row(table), min_size=1, max_size=3))
    read = read_table(write_table(rows, table, show), table, show)
    assert read.good, (read.errors, read.header_errors)
    assert len(read.rows) == len(rows)
    for row, again in zip(rows, read.rows, strict=True):
        assert again == {key: _nearly(value) for key, value in row.items()}


def _nearly(value):
    return pytest.approx(value, rel=1e-8, abs=1e-6) if isinstance(value, float) else value


PIECES = st.one_of(
    st.text(max_size=20),
    st.sampled_from(
        ["Name", "Where", "Drop", "km", "(ft)", ";", ",", "\t", "\n", "\r", '"', "'", "1,234", "0.5", "-", "=", "\x00"]
    ),
)


@settings(max_examples=150, deadline=None)
@given(text=st.lists(PIECES, max_size=25).map("".join), table=st.sampled_from(TABLES), show=st.sampled_from(SHOWS))
def test_no_text_breaks_the_reader(text, table, show):
    read = read_table(text, table, show)
    assert len(read.rows) == len(read.cells) == len(read.numbers)


@settings(max_examples=60, deadline=None)
@given(st.binary(max_size=60))
def test_no_bytes_break_the_reader(data):
    read_table(decode(b"Name,Where,Drop\n" + data), WEIRS, SI)


@pytest.mark.parametrize("table", TABLES, ids=lambda table: table.key)
def test_every_header_means_one_column(table):
    for show in SHOWS:
        read = read_table(write_table([], table, show), table, show)
        assert [column.key for column in read.columns_found] == [column.key for column in table.columns]
