import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.bed.end_velocity import end_velocity
from tidescour.bed.spreading import SPREADINGS, spread_width, velocity_share


def test_velocity_behind_a_flow_that_widens_at_a_fixed_rate(published):
    for row in published("closure_practice_spreading.csv"):
        width = spread_width("fixed-rate", np.array([200.0]), 150.0, row["widening"])
        found = end_velocity(np.array([4000.0]), width, np.array([10.0]), 1.0)
        np.testing.assert_allclose(found, row["velocity_m_s"], atol=5.1e-6)


def test_velocity_on_the_centre_line_of_a_plane_jet(published):
    for row in published("rajaratnam_1976_plane_jet.csv"):
        found = velocity_share("plane-jet", np.array([200.0]), 200.0 * row["distance"], 0.0)
        np.testing.assert_allclose(found, row["share"], atol=5.1e-4)


def test_a_plane_jet_keeps_its_velocity_over_six_widths():
    # 3.5 / sqrt(2 x / B) is 1 at x = 6.125 B.
    found = [float(velocity_share("plane-jet", np.array([100.0]), length, 0.0)[0]) for length in (0.0, 612.5, 613.0)]
    assert found[:2] == pytest.approx([1.0, 1.0])
    assert 0.999 < found[2] < 1.0


@pytest.mark.parametrize("name", SPREADINGS)
def test_spreadings_are_named_as_in_the_plan_know_no_scale_and_pass_nan_on(name):
    assert SPREADINGS[name].name == name
    width = np.array([20.0, np.nan, 300.0])
    found = spread_width(name, width, 400.0, 0.1)
    np.testing.assert_allclose(spread_width(name, 3.0 * width, 1200.0, 0.1), 3.0 * found)
    assert np.isnan(found).tolist() == [False, True, False]


@pytest.mark.parametrize("name", SPREADINGS)
@given(width=st.floats(1.0, 1e3), length=st.floats(0.0, 1e4), more=st.floats(0.0, 1e4), widening=st.floats(0.0, 0.2))
@settings(max_examples=40, deadline=None)
def test_velocity_never_rises_with_the_length_nor_over_that_without_spreading(name, width, length, more, widening):
    near, far = (velocity_share(name, np.array([width]), x, widening)[0] for x in (length, length + more))
    assert 0.0 < far <= near * (1.0 + 1e-12)
    assert near <= 1.0


@given(st.floats(1.0, 1e3), st.floats(0.0, 1e4), st.floats(0.021, 0.2))
@settings(max_examples=40, deadline=None)
def test_a_plane_jet_is_more_cautious_than_a_fixed_rate_in_use(width, length, widening):
    # 1 + 2 w x stays over sqrt(2 x) / 3.5 for every x where w is over 1 / (4 x 3.5^2) = 0.0204.
    jet, fixed = (velocity_share(name, np.array([width]), length, widening)[0] for name in ("plane-jet", "fixed-rate"))
    assert jet >= fixed
