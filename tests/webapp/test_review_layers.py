"""Layers over a reading, whatever they are: raw stays, and the order in which events arrive changes nothing."""

from datetime import UTC, datetime, timedelta

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from webapp.models import Reading, ReadingEvent, Station
from webapp.readings.layers import NUMBERS, final

BEGAN = datetime(2026, 8, 12, 6, tzinfo=UTC)
VALUES = st.none() | st.floats(-0.5, 30, allow_nan=False)
KINDS = st.sampled_from(["corrected", "set_aside", "restored", "kept", "asked", "answered", "drift", "drift_undone"])
PEOPLE = st.sampled_from(["author", "office", "lead"])


@st.composite
def events(draw):
    """Events of every kind, each with an id of its own; some were made at the same moment."""
    made = []
    for number in range(draw(st.integers(0, 8))):
        kind = draw(KINDS)
        line = {"scale": draw(st.floats(0.5, 2)), "shift": draw(st.floats(-1, 1))}
        made.append(
            ReadingEvent(
                id=f"{number:03}",
                kind=kind,
                field=draw(st.sampled_from(NUMBERS)) if kind == "corrected" else "",
                new_value=draw(VALUES) if kind == "corrected" else None,
                reason=f"reason {number}",
                particulars=line if kind == "drift" else {},
                made_by_id=draw(PEOPLE),
                made_at=BEGAN + timedelta(minutes=draw(st.integers(0, 5))),
            )
        )
    return made


def reading(numbers, some):
    recorded = dict(zip(NUMBERS, numbers, strict=True))
    return Reading(
        id="one", taken_at=BEGAN, author_id="author", station=Station(code="D3"), events=list(some), **recorded
    )


RECORDED = st.lists(VALUES, min_size=len(NUMBERS), max_size=len(NUMBERS))


@settings(max_examples=60)
@given(RECORDED, events())
def test_no_layer_loses_or_changes_a_raw_value(numbers, some):
    one = reading(numbers, some)
    now = final(one)
    assert list(now.raw.values()) == numbers
    assert [getattr(one, name) for name in NUMBERS] == numbers
    touched = {event.field for event in some if event.kind == "corrected"}
    drifted = {"do_mg_l"} if now.drift else set()
    for name, value in now.raw.items():
        assert name in touched | drifted or getattr(now, name) == value


@settings(max_examples=60)
@given(RECORDED, events(), st.randoms(use_true_random=False))
def test_events_in_any_order_give_the_same_reading(numbers, some, random):
    shuffled = list(some)
    random.shuffle(shuffled)
    assert final(reading(numbers, shuffled)) == final(reading(numbers, some))


@given(st.floats(0, 20), st.floats(0, 20), st.floats(0.5, 2), st.floats(-1, 1), st.booleans())
def test_drift_moves_whatever_the_number_was_corrected_to_before_or_after_it(raw, corrected, scale, shift, after):
    first, second = BEGAN, BEGAN + timedelta(hours=1)
    drift = {"kind": "drift", "particulars": {"scale": scale, "shift": shift}, "made_at": first if after else second}
    correction = {
        "kind": "corrected",
        "field": "do_mg_l",
        "new_value": corrected,
        "made_at": second if after else first,
    }
    shared = {"id": "a", "reason": "why", "made_by_id": "office"}
    now = final(reading([raw, *[None] * (len(NUMBERS) - 1)], [_event(**shared, **one) for one in (drift, correction)]))
    assert now.do_mg_l == pytest.approx(scale * corrected + shift)
    assert (now.before_drift_mg_l, now.raw["do_mg_l"]) == (corrected, raw)


def _event(**facts):
    return ReadingEvent(**{"field": "", "new_value": None, "particulars": {}, **facts})
