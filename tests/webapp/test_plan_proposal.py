import copy

import pytest

from tests.webapp.plans import PLAN
from webapp.plan.prediction import predict_plan
from webapp.plan.proposal import MULTIPLES, propose
from webapp.plan.rows import next_codes


def proposed_for(**changes):
    tables = {**copy.deepcopy(PLAN), "stations": [], **changes}
    prediction = predict_plan(tables, 210.0)
    assert prediction.ready
    return propose(tables, prediction), prediction


def test_without_access_points_the_wanted_places_are_proposed():
    proposed, prediction = proposed_for(access=[])
    whys = [why for one in proposed.proposals for why in one.whys]
    critical_h = prediction.critical.travel_time_h
    assert whys[0] == "above the outfall" and "at complete mixing" in whys
    for one in proposed.proposals:
        assert one.moved_km == 0 and one.access == ""
        for why in one.whys:
            if "×" in why:
                multiple = float(why.split(" ")[0])
                assert one.travel_time_h == pytest.approx(multiple * critical_h, rel=1e-9)


def test_multiples_below_the_last_reach_are_named_and_not_proposed():
    proposed, prediction = proposed_for(access=[])
    reached = [
        multiple
        for multiple in MULTIPLES
        if any(f"{multiple:g} ×" in why for one in proposed.proposals for why in one.whys)
    ]
    beyond = [multiple for multiple in MULTIPLES if multiple not in reached]
    assert beyond == [2.0]
    assert [note.pattern.format(*(text for _, text in note.values)) for note in proposed.notes] == [
        "2 × the travel time to the low point lies below the last reach: add a reach there to plan it."
    ]


def test_places_go_to_the_nearest_access_point_and_say_how_far():
    proposed, _ = proposed_for()
    names = {row["name"]: row["distance_km"] for row in PLAN["access"]}
    for one in proposed.proposals:
        assert one.distance_km == names[one.access]
        assert one.moved_km == pytest.approx(one.distance_km - one.wanted_km)
    at_critical = next(one for one in proposed.proposals if "1 × the travel time to the low point" in one.whys)
    assert abs(at_critical.moved_km) == min(abs(place - at_critical.wanted_km) for place in names.values())


def test_the_station_above_the_outfall_never_moves_below_it():
    proposed, _ = proposed_for(access=[{"name": "Works fence", "distance_km": 0.1}])
    above = proposed.proposals[0]
    assert above.whys == ("above the outfall",) and above.distance_km < 0 and above.access == ""
    assert all(one.distance_km > 0 for one in proposed.proposals[1:])


def test_two_places_at_one_access_point_become_one_station():
    proposed, _ = proposed_for(access=[{"name": "Only bridge", "distance_km": 5.0}])
    below = [one for one in proposed.proposals if one.distance_km > 0]
    assert len(below) == 1 and len(below[0].whys) == 7
    assert abs(below[0].moved_km) < 1.0


def test_complete_mixing_goes_downstream_where_there_is_a_way_to_the_water():
    access = [{"name": "Too early", "distance_km": 0.3}, {"name": "Late enough", "distance_km": 0.9}]
    proposed, prediction = proposed_for(access=access)
    assert 0.3 < prediction.mix_km.best_km < 0.5
    at_mixing = next(one for one in proposed.proposals if "at complete mixing" in one.whys)
    assert at_mixing.access == "Late enough"


def test_a_place_that_has_a_station_is_told_so():
    tables = copy.deepcopy(PLAN)
    proposed = propose(tables, predict_plan(tables, 210.0))
    assert {one.access: one.station for one in proposed.proposals}["Cattle bridge"] == "U1"


def test_a_river_that_begins_at_the_outfall_has_no_station_above_it():
    reaches = [row for row in PLAN["reaches"] if row["from_km"] >= 0]
    proposed, _ = proposed_for(reaches=reaches)
    assert all(one.distance_km > 0 for one in proposed.proposals)
    assert proposed.notes[0].name == "nothing above"


def test_next_codes_skip_every_code_the_survey_ever_had():
    assert next_codes(["s01", "D1", "S03"], 3) == ["S02", "S04", "S05"]
