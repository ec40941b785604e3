import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.bed.slope import COMMON_SLOPES, slide_retreat, upstream_slope_cot
from tidescour.errors import DomainError


def test_upstream_slope_of_the_checks(published):
    for row in published("hoffmans_1995_upstream_slope.csv"):
        found = upstream_slope_cot(
            np.array([row["velocity_m_s"]]), np.array([row["turbulence"]]), row["d50_mm"] / 1000.0, 1.65, None
        )
        np.testing.assert_allclose(found, row["slope_cot"], atol=5.1e-4)


def test_a_slope_over_the_natural_one_is_no_answer():
    # 61 degrees at 2.5 m/s, a sine of 1.024 at 2.8 m/s, by separate code; and an argument that is not known.
    velocity = np.array([1.0, 2.5, 2.8, np.nan, 1.0])
    turbulence = np.array([0.25, 0.25, 0.25, 0.25, np.nan])
    assert np.isnan(upstream_slope_cot(velocity, turbulence, 0.2e-3, 1.65, 40.0)).tolist() == [False, *[True] * 4]


def test_the_steepest_slope_is_the_natural_one():
    # Without flow sin beta = 0.11 + 0.75 r0: r0 for 34.99 and 35.01 degrees, cot 35 degrees = 1.42815.
    turbulence = (np.sin(np.radians([34.99, 35.01])) - 0.11) / 0.75
    found = upstream_slope_cot(np.zeros(2), turbulence, 1e-3, 1.65, None)
    assert found[0] == pytest.approx(1.4287, abs=1e-4)
    assert np.isnan(found[1])


def test_velocity_and_grain_act_as_velocity_squared_over_grain_and_roughness_on_the_rest():
    one = upstream_slope_cot(np.array([0.5]), np.array([0.1]), 0.2e-3, 1.65, 30.0)
    np.testing.assert_allclose(upstream_slope_cot(np.array([1.0]), np.array([0.1]), 0.8e-3, 1.65, 40.0), one)
    np.testing.assert_allclose(upstream_slope_cot(np.array([1.0]), np.array([0.1]), 0.2e-3, 6.6, None), one)
    # f_C = 1.5: sin beta = 1.5 (0.11 + 0.075) = 0.2775 without flow.
    smooth = upstream_slope_cot(np.zeros(1), np.array([0.1]), 0.2e-3, 1.65, 60.0)
    np.testing.assert_allclose(smooth, np.sqrt(1.0 / 0.2775**2 - 1.0))


@given(st.floats(0.0, 1.0), st.floats(0.05, 0.2), st.floats(0.2, 2.0))
@settings(max_examples=40, deadline=None)
def test_faster_and_wilder_water_makes_steeper_slopes(velocity, turbulence, d50_mm):
    velocities, turbulences = np.array([velocity, velocity + 0.1, velocity]), turbulence + np.array([0.0, 0.0, 0.05])
    found = upstream_slope_cot(velocities, turbulences, d50_mm / 1000.0, 1.65, 40.0)
    assert np.all(found[1:] < found[0])


@pytest.mark.parametrize(
    ("velocity", "turbulence", "grain", "density", "chezy", "message"),
    [
        (1.0, 0.2, 0.0, 1.65, None, "grain size and submerged relative density must be positive"),
        (1.0, 0.2, 1e-3, 0.0, None, "must be positive"),
        (-1.0, 0.2, 1e-3, 1.65, None, "velocity and relative turbulence must not be negative"),
        (1.0, -0.2, 1e-3, 1.65, None, "must not be negative"),
        (1.0, 0.2, 1e-3, 1.65, 0.0, "Chezy coefficient 0 m0.5/s must be positive"),
    ],
)
def test_numbers_outside_the_slope_formula_are_refused(velocity, turbulence, grain, density, chezy, message):
    with pytest.raises(DomainError, match=message):
        upstream_slope_cot(np.array([velocity]), np.array([turbulence]), grain, density, chezy)


def test_retreat_of_a_slide_keeps_the_area(published):
    for row in published("area_balance_slide.csv"):
        found = slide_retreat(row["height_m"], row["cot_before"], row["cot_after"])
        assert found == pytest.approx(row["retreat_m"])
        assert slide_retreat(3.0 * row["height_m"], row["cot_before"], row["cot_after"]) == pytest.approx(3.0 * found)
    assert slide_retreat(8.0, 3.0, 3.0) == 0.0


@pytest.mark.parametrize(
    ("height", "before", "after", "message"),
    [
        (-1.0, 2.0, 6.0, "height of -1 m must not be negative"),
        (float("nan"), 2.0, 6.0, "must not be negative"),
        (8.0, 0.0, 6.0, "both must be positive"),
        (8.0, 6.0, 2.0, "not steeper than before"),
    ],
)
def test_slides_that_cannot_be_are_refused(height, before, after, message):
    with pytest.raises(DomainError, match=message):
        slide_retreat(height, before, after)


def test_common_slopes_say_that_they_are_practice_and_grow_flatter_with_looser_sand():
    assert [(slope.least_cot, slope.most_cot) for slope in COMMON_SLOPES] == [(6.0, 6.0), (15.0, 20.0), (20.0, 100.0)]
    assert all("no source" in slope.source and "from memory" in slope.source for slope in COMMON_SLOPES)
