import itertools
from datetime import UTC, datetime, timedelta
from types import SimpleNamespace

import pytest

from webapp.visits.layers import final_visit

START = datetime(2026, 8, 12, 6, tzinfo=UTC)


def entry(name, minute, facts, seen=()):
    return SimpleNamespace(id=name, made_at=START + timedelta(minutes=minute), facts=facts, seen=list(seen))


def visit(*entries):
    people = {"opened_by": SimpleNamespace(name="Cleo Banks"), "opened_by_id": "c"}
    return SimpleNamespace(id="v", station=SimpleNamespace(code="D1"), entries=list(entries), **people)


def test_a_later_entry_that_saw_the_first_replaces_only_what_it_says():
    one = entry("a", 0, {"stage_m": 0.41, "platform": "wade", "arrived_at": "2026-08-12T06:00:00+00:00"})
    two = entry("b", 5, {"stage_m": 0.42}, ["a"])
    found = final_visit(visit(two, one))
    assert found.facts == {"stage_m": 0.42, "platform": "wade", "arrived_at": START}
    assert found.disputes == {}


TWO_PHONES = (
    entry("a", 0, {"stage_m": 0.41}),
    entry("b", 5, {"stage_m": 0.52}, ["a"]),
    entry("c", 6, {"stage_m": 0.42, "width_m": 9.0}, ["a"]),
)


@pytest.mark.parametrize("order", list(itertools.permutations(TWO_PHONES)))
def test_two_phones_that_did_not_see_each_other_are_both_kept_whatever_comes_first(order):
    found = final_visit(visit(*order))
    assert [(one.id, value) for one, value in found.disputes["stage_m"]] == [("b", 0.52), ("c", 0.42)]
    assert found.facts == {"stage_m": 0.42, "width_m": 9.0}


def test_an_entry_that_saw_both_settles_it():
    assert final_visit(visit(*TWO_PHONES, entry("d", 9, {"stage_m": 0.52}, ["b", "c"]))).disputes == {}


def test_two_phones_that_say_the_same_agree():
    same = entry("c", 6, {"stage_m": 0.52}, ["a"])
    assert final_visit(visit(*TWO_PHONES[:2], same)).disputes == {}


def test_entries_that_claim_to_have_seen_each_other_leave_something_standing():
    one, two = entry("a", 0, {"stage_m": 0.4}, ["b"]), entry("b", 1, {"stage_m": 0.5}, ["a"])
    assert final_visit(visit(one, two)).facts == {"stage_m": 0.5}
