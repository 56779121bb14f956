import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from calc.errors import OutOfRangeError
from calc.river import Reach, River, Water
from calc.travel import (
    arrival_times,
    changing_velocity_time_h,
    depth_at_flow_m,
    distance_at_travel_time_km,
    jobson_fastest_velocity_m_s,
    jobson_peak_velocity_m_s,
    mean_velocity_from_float_m_s,
    travel_time_h,
    velocity_at_flow_m_s,
    velocity_from_flow_m_s,
    width_at_flow_m,
)
from tests.calc.rows import inputs, rows

TABLE = rows("travel.csv")
HEAD = Water(2.0, 8.0, 18.0)


def river(*velocities_m_s, from_km=-2.0, reach_km=5.0):
    edges = [from_km + reach_km * place for place in range(len(velocities_m_s) + 1)]
    reaches = tuple(
        Reach(low, high, velocity, 1.0, 0.3, 1.0)
        for low, high, velocity in zip(edges, edges[1:], velocities_m_s, strict=False)
    )
    return River(HEAD, reaches)


def jobson_arguments(row):
    given_values = inputs(row["inputs"])
    return given_values["Q"], given_values["Qa"], given_values["Da"], given_values.get("S")


@pytest.mark.parametrize("row", [row for row in TABLE if row["quantity"] == "vp_most_probable_m_s"])
def test_peak_velocity_agrees_with_published_regression(row):
    assert jobson_peak_velocity_m_s(*jobson_arguments(row)) == pytest.approx(row["value"], rel=1e-3)


@pytest.mark.parametrize("row", [row for row in TABLE if row["quantity"] == "vmp_max_probable_m_s"])
def test_fastest_velocity_agrees_with_published_regression(row):
    assert jobson_fastest_velocity_m_s(*jobson_arguments(row)) == pytest.approx(row["value"], rel=1e-3)


@pytest.mark.parametrize("row", [row for row in TABLE if "t_leading_h" in row["quantity"]])
def test_leading_edge_comes_before_the_peak_as_published(row):
    velocity = float(jobson_peak_velocity_m_s(*jobson_arguments(row)))
    reach = River(HEAD, (Reach(0.0, 20.0, velocity, 1.0, 0.3, 1.0),))
    arrival = arrival_times(reach, 20.0)
    peak_h, leading_h = (float(text) for text in row["value"].split("/"))
    assert arrival.peak_h == pytest.approx(peak_h, rel=1e-3)
    assert arrival.leading_edge_h == pytest.approx(leading_h, rel=1e-3)


def test_float_at_the_surface_agrees_with_published_number():
    (row,) = [row for row in TABLE if row["inputs"].startswith("surface float")]
    assert mean_velocity_from_float_m_s(2.62) == pytest.approx(row["value"], abs=row["tolerance"])


def test_velocity_at_another_flow_agrees_with_published_exponents():
    at_station, downstream = [row for row in TABLE if row["quantity"] == "V2 m/s"]
    assert velocity_at_flow_m_s(0.3, 2.0, 0.5) == pytest.approx(at_station["value"], abs=at_station["tolerance"])
    assert velocity_at_flow_m_s(0.2, 1.0, 3.0, exponent=0.1) == pytest.approx(
        downstream["value"], abs=downstream["tolerance"]
    )


def test_linear_change_of_velocity_agrees_with_its_integral():
    (row,) = [row for row in TABLE if row["inputs"].startswith("reach end velocities")]
    assert changing_velocity_time_h(5.0, 0.2, 0.4) == pytest.approx(row["value"], abs=row["tolerance"])
    assert changing_velocity_time_h(5.0, 0.3, 0.3) == pytest.approx(5.0 / (3.6 * 0.3))
    assert changing_velocity_time_h(5.0, 0.3, 0.3 + 1e-12) == pytest.approx(5.0 / (3.6 * 0.3), rel=1e-9)


def test_velocity_depth_and_width_at_another_flow_carry_that_flow():
    velocity = velocity_at_flow_m_s(0.3, 2.0, 5.0)
    assert velocity_from_flow_m_s(5.0, width_at_flow_m(8.0, 2.0, 5.0), depth_at_flow_m(0.7, 2.0, 5.0)) == pytest.approx(
        velocity * velocity_from_flow_m_s(2.0, 8.0, 0.7) / 0.3
    )


def test_travel_time_counts_from_the_outfall_and_is_negative_above_it():
    assert travel_time_h(river(0.5, 0.25), [-2.0, 0.0, 3.0, 8.0]) == pytest.approx(
        [-2 / 1.8, 0.0, 3 / 1.8, 3 / 1.8 + 5 / 0.9]
    )


def test_travel_time_counts_from_the_nearest_end_where_the_outfall_is_outside():
    assert travel_time_h(river(0.5, from_km=3.0), [3.0, 8.0]) == pytest.approx([0.0, 5 / 1.8])
    assert travel_time_h(river(0.5, from_km=-9.0), [-9.0, -4.0]) == pytest.approx([-5 / 1.8, 0.0])


def test_travel_time_is_not_distance_over_the_mean_velocity():
    two = river(0.1, 0.5, from_km=0.0)
    by_mean_h = 10.0 / (3.6 * 0.3)
    assert travel_time_h(two, 10.0) == pytest.approx(5 / 0.36 + 5 / 1.8)
    assert travel_time_h(two, 10.0) > 1.5 * by_mean_h


def test_travel_time_of_plausible_rivers_is_that_of_each():
    velocities = np.array([0.2, 0.4, 0.8])
    many = travel_time_h(river(velocities, 0.5), [-1.0, 2.0, 7.0])
    assert many.shape == (3, 3)
    for times, velocity in zip(many, velocities, strict=True):
        assert times == pytest.approx(travel_time_h(river(float(velocity), 0.5), [-1.0, 2.0, 7.0]))


def test_travel_time_of_one_place_is_a_number_and_of_a_missing_one_is_missing():
    assert np.ndim(travel_time_h(river(0.5), 1.0)) == 0
    assert np.isnan(travel_time_h(river(0.5), [np.nan, 1.0])).tolist() == [True, False]
    assert travel_time_h(river(0.5), np.ones((2, 3))).shape == (2, 3)


@given(st.lists(st.floats(0.02, 2.0), min_size=1, max_size=6), st.floats(0, 1))
def test_distance_at_a_travel_time_undoes_travel_time(velocities, share):
    plan = river(*velocities)
    distance_km = plan.from_km + share * (plan.to_km - plan.from_km)
    hours = np.clip(travel_time_h(plan, distance_km), *travel_time_h(plan, [plan.from_km, plan.to_km]))
    assert distance_at_travel_time_km(plan, hours) == pytest.approx(distance_km, abs=1e-9)


def test_parcel_released_below_the_outfall_arrives_the_difference_later():
    plan = river(0.5, 0.25)
    arrival = arrival_times(plan, [4.0, 8.0], release_km=1.0)
    assert arrival.peak_h == pytest.approx([2 / 1.8 + 1 / 0.9, 2 / 1.8 + 5 / 0.9])
    assert arrival.leading_edge_h == pytest.approx(0.89 * arrival.peak_h)


def test_arrival_in_plausible_rivers_has_a_row_for_each():
    arrival = arrival_times(river(np.array([0.25, 0.5]), 0.25), [1.0, 3.0, 8.0], release_km=1.0)
    assert arrival.peak_h.shape == (2, 3)
    assert arrival.peak_h[:, 0] == pytest.approx([0.0, 0.0])


def test_parcel_does_not_travel_upstream():
    with pytest.raises(OutOfRangeError, match="distance_km must be between 3 and 8 km, got 2 km"):
        arrival_times(river(0.5, 0.5), [4.0, 2.0], release_km=3.0)


@pytest.mark.parametrize("distance_km", [-2.1, 8.1, np.inf])
def test_travel_time_refuses_a_place_outside_the_river(distance_km):
    with pytest.raises(OutOfRangeError, match="distance_km must be between -2 and 8 km"):
        travel_time_h(river(0.5, 0.5), distance_km)


def test_distance_at_a_travel_time_refuses_what_it_cannot_know():
    with pytest.raises(OutOfRangeError, match="travel_time_h must be between"):
        distance_at_travel_time_km(river(0.5), 99.0)
    with pytest.raises(OutOfRangeError, match="river must be a single river"):
        distance_at_travel_time_km(river(np.array([0.5, 0.6])), 1.0)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: velocity_from_flow_m_s(1.0, 0.0, 1.0), "width_m must be above 0"),
        (lambda: mean_velocity_from_float_m_s(0.5, factor=8.5), "factor must be between 0.6 and 1"),
        (lambda: velocity_at_flow_m_s(0.3, 0.0, 1.0), "rated_flow_m3_s must be above 0"),
        (lambda: jobson_peak_velocity_m_s(1.0, 2.0, -1.0), "drainage_area_m2 must be between 0"),
        (lambda: changing_velocity_time_h(1.0, 0.0, 0.1), "head_velocity_m_s must be above 0"),
    ],
)
def test_velocity_equations_refuse_what_is_not_a_size(call, message):
    with pytest.raises(OutOfRangeError, match=message):
        call()


@pytest.mark.parametrize(
    ("edges", "message"),
    [
        ([(5.0, 2.0)], "to_km must be above from_km 5 km, got 2 km"),
        ([(0.0, 2.0), (3.0, 4.0)], "from_km must be 2 km, the end above, got 3 km"),
        ([(2.0, 4.0), (0.0, 2.0)], "from_km must be 4 km, the end above, got 0 km"),
    ],
)
def test_reaches_that_run_upstream_or_leave_a_gap_are_refused(edges, message):
    with pytest.raises(OutOfRangeError, match=message):
        River(HEAD, tuple(Reach(low, high, 0.3, 1.0, 0.3, 1.0) for low, high in edges))
