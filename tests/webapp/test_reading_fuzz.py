import html
from datetime import UTC, datetime

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.webapp.plans import put_plan
from webapp.readings.columns import READINGS

NUMBERS = [column.key for column in READINGS.columns if column.quantity not in ("text", "choice", "yes_no", "time")]
FIELDS = [*NUMBERS, "taken_at", "submission_id", "pressure_unit", "pressure_source", "position", "percent_basis",
          "velocity_method", "float_distance", "float_time_s", "meter", "meter_other", "values", "soak_s",
          "unstable_reason", "note", "replicate", "kept", "keep", "use",
          "units"]  # fmt: skip
NASTY = st.sampled_from(
    ["", " ", "0", "-0", "1e999", "nan", "inf", "-inf", "1,234", "8,1", "٣", "9" * 400, "\x00", "\u202e7", "=1+1", "[]",
     "[[", '{"a":1}', "[1]", "[" * 5000, "5,", ".5", "2026-08-12T05:40", "0001-01-01T00:00", "2026-03-29T02:30", "air",
     "762", "1013", "29.9", "101.3", "68", "44.9", "30", "meter", "weather", "float", "temperature_unit", "us",
     "6.1 6.3 6.2 6.2 6.2", "6.1@75/20 6.9@80", "6@@", "5.8;6.4 5.8 6.4 5.8"]
)  # fmt: skip
TEXTS = st.one_of(NASTY, NASTY, st.floats(-50, 450).map(str), st.text(max_size=30))


@pytest.fixture
def save(db, survey, people, browser_as):
    """A function that posts a form at D2."""
    put_plan(db, survey, people["lead"])
    crew = browser_as("crew")
    return lambda form, htmx: crew.post(f"/surveys/{survey.id}/stations/D2/reading", form, htmx=htmx)


@settings(max_examples=80, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture], derandomize=True)
@given(
    odd=st.dictionaries(st.sampled_from(FIELDS), TEXTS, max_size=5),
    good=st.booleans(),
    htmx=st.booleans(),
    id=st.uuids(),
)
def test_nothing_typed_breaks_the_form_or_is_lost(save, odd, good, htmx, id):
    now = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M")
    form = {"submission_id": str(id), "taken_at": now, "do_mg_l": "6.1", "water_temp_c": "19.8"} if good else {}
    form |= odd
    answer = save(form, htmx)
    assert answer.status_code in (200, 303, 409, 422)
    if answer.status_code in (409, 422) and "use" not in odd:
        shown = html.unescape(answer.text)
        for name in ("do_mg_l", "water_temp_c", "depth_m", "note"):
            assert form.get(name, "").replace("\r", "") in shown.replace("\r", "")
    else:
        assert answer.headers.get("X-Stored-Id", str(id)) == str(id) or "use" in odd
