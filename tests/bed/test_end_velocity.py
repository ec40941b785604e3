import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.bed.end_velocity import conjugate_depth, end_velocity, froude_number
from tidescour.errors import DomainError
from tidescour.units import GRAVITY_M_S2


def test_velocity_scales():
    q, b, h = np.array([300.0, -4000.0]), np.array([200.0, 100.0]), np.array([10.0, 7.0])
    one = end_velocity(q, b, h, 1.0)
    np.testing.assert_allclose(end_velocity(2.0 * q, b, h, 1.0), 2.0 * one)
    np.testing.assert_allclose(end_velocity(q, 2.0 * b, h, 1.0), 0.5 * one)
    np.testing.assert_allclose(end_velocity(q, b, 2.0 * h, 1.0), 0.5 * one)
    np.testing.assert_allclose(end_velocity(q, b, h, 1.3), 1.3 * one)
    assert np.all(one > 0.0)


def test_without_discharge_width_and_depth_do_not_matter():
    found = end_velocity(np.array([0.0, np.nan, 5.0]), np.array([np.nan, 1.0, np.nan]), np.array([-1.0, 1.0, 1.0]), 1.0)
    assert found[0] == 0.0
    assert np.isnan(found[1:]).all()


@pytest.mark.parametrize(("width", "depth"), [(0.0, 1.0), (1.0, 0.0), (1.0, -2.0)])
def test_flow_over_no_width_or_depth_is_refused(width, depth):
    with pytest.raises(DomainError, match="must be positive where there is flow"):
        end_velocity(np.array([1.0]), np.array([width]), np.array([depth]), 1.0)


def test_shapes_must_agree():
    with pytest.raises(DomainError, match="one shape"):
        end_velocity(np.ones(2), np.ones(3), np.ones(2), 1.0)


def test_critical_flow_has_froude_number_one():
    depth = np.array([1.0, 4.0])
    np.testing.assert_allclose(froude_number(np.sqrt(GRAVITY_M_S2 * depth), depth), 1.0)
    np.testing.assert_allclose(froude_number(np.ones(2), 4.0 * depth), 0.5 * froude_number(np.ones(2), depth))
    assert np.isnan(froude_number(np.array([np.nan]), np.array([1.0]))[0])


@given(st.floats(0.05, 5.0), st.floats(1.05, 8.0))
@settings(max_examples=100, deadline=None)
def test_conjugate_depths_carry_the_same_momentum(depth, froude):
    # Closed form: from y1 and Fr1 follow q and the energy; y2 must have the same q^2 / (g y) + y^2 / 2.
    q = froude * np.sqrt(GRAVITY_M_S2 * depth**3)
    energy = depth * (1.0 + froude**2 / 2.0)
    found = float(conjugate_depth(np.array([q]), np.array([energy]))[0])
    assert found > depth
    before, after = (q**2 / (GRAVITY_M_S2 * y) + y**2 / 2.0 for y in (depth, found))
    assert after == pytest.approx(before, rel=1e-9)


def test_conjugate_depth_scales_as_a_length():
    q, energy = np.array([3.0, 10.0]), np.array([4.0, 9.0])
    found = conjugate_depth(8.0 * q, 4.0 * energy)
    np.testing.assert_allclose(found, 4.0 * conjugate_depth(q, energy))


def test_without_energy_for_so_much_water_the_flow_is_critical():
    q = np.array([8.0 * np.sqrt(GRAVITY_M_S2)] * 3)
    # (q^2 / g)^(1/3) = 4 m needs an energy of 6 m.
    np.testing.assert_allclose(conjugate_depth(q, np.array([6.0, 3.0, -1.0])), 4.0, rtol=1e-6)


def test_conjugate_depth_passes_nan_on():
    found = conjugate_depth(np.array([np.nan, 1.0, 1.0]), np.array([4.0, np.nan, 4.0]))
    assert np.isnan(found).tolist() == [True, True, False]
