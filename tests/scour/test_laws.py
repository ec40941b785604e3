import numpy as np
import pytest

from tidescour.errors import DomainError
from tidescour.scour.laws import LAWS, PowerLaw, depth_after, growth_rate


@pytest.mark.parametrize("name", LAWS)
def test_laws_give_the_depths_of_the_check(published, name):
    table = published("breusers_1967_growth.csv")
    law = LAWS[name].function(1.65)
    found = depth_after(law, 2.5 * 1.2 - 0.45, 10.0, table["hours"])
    np.testing.assert_allclose(found, table[name.replace("-", "_")], atol=5.1e-6)


def test_the_hole_is_as_deep_as_the_water_after_the_time_scale():
    # t1 = 330 x 10^2 x 1.65^1.7 / 2.55^4.3 = 1380.746 h, worked out by separate code.
    found = depth_after(LAWS["time-scale"].function(1.65), 2.55, 10.0, 1380.746)
    assert float(found) == pytest.approx(10.0, rel=2e-7)


def test_an_older_time_exponent_is_a_power_law_too():
    # Exponent 0.38 in the first tests: 3.68771 m after 100 h of the check, worked out by separate code.
    law = PowerLaw(
        name="older",
        text="",
        coefficient=330.0**-0.38 * 1.65 ** (-1.7 * 0.38),
        velocity_exponent=4.3 * 0.38,
        depth_exponent=1.0 - 2.0 * 0.38,
        time_exponent=0.38,
    )
    assert float(depth_after(law, 2.55, 10.0, 100.0)) == pytest.approx(3.68771, abs=5.1e-6)


@pytest.mark.parametrize("name", LAWS)
def test_entries_are_named_as_in_the_plan(name):
    entry = LAWS[name]
    law = entry.function(1.6)
    assert entry.name == law.name == name
    assert law.text.startswith("h = ")


@pytest.mark.parametrize(("name", "power"), [("explicit", 4.25), ("time-scale", 4.3)])
def test_the_exponent_under_the_integral_is_that_of_the_same_law(name, power):
    assert LAWS[name].function(1.6).integral_exponent == pytest.approx(power)


@pytest.mark.parametrize(("name", "q", "r", "delta"), [("explicit", 1.7, 0.2, -0.7), ("time-scale", 1.72, 0.2, -0.68)])
def test_depth_scales_with_its_powers(name, q, r, delta):
    law = LAWS[name].function(1.6)
    one = float(depth_after(law, 2.0, 9.0, 50.0))
    assert float(depth_after(law, 6.0, 9.0, 50.0)) == pytest.approx(one * 3.0**q)
    assert float(depth_after(law, 2.0, 27.0, 50.0)) == pytest.approx(one * 3.0**r)
    assert float(depth_after(law, 2.0, 9.0, 150.0)) == pytest.approx(one * 3.0**0.4)
    assert float(depth_after(LAWS[name].function(4.8), 2.0, 9.0, 50.0)) == pytest.approx(one * 3.0**delta)


def test_hours_taken_for_seconds_would_be_found():
    law = LAWS["explicit"].function(1.6)
    ratio = depth_after(law, 2.0, 9.0, 3600.0) / depth_after(law, 2.0, 9.0, 1.0)
    # 3600^0.4.
    assert float(ratio) == pytest.approx(26.456, abs=5e-4)


@pytest.mark.parametrize("name", LAWS)
def test_growth_rate_is_the_power_of_the_depth_that_adds_up(name):
    law = LAWS[name].function(1.6)
    assert float(growth_rate(law, 2.0, 9.0)) == pytest.approx(float(depth_after(law, 2.0, 9.0, 1.0)) ** 2.5)
    assert float(growth_rate(law, 4.0, 9.0) / growth_rate(law, 2.0, 9.0)) == pytest.approx(2.0**law.integral_exponent)


def test_nothing_grows_without_excess_or_time_and_nan_passes():
    law = LAWS["explicit"].function(1.6)
    found = depth_after(law, np.array([0.0, 2.0, np.nan]), 9.0, np.array([10.0, 0.0, 10.0]))
    np.testing.assert_array_equal(found, [0.0, 0.0, np.nan])


@pytest.mark.parametrize("name", LAWS)
def test_what_is_negative_is_refused(name):
    law = LAWS[name].function(1.6)
    with pytest.raises(DomainError, match="must not be negative"):
        growth_rate(law, -0.1, 9.0)
    with pytest.raises(DomainError, match="must not be negative"):
        growth_rate(law, 1.0, np.array([9.0, -1.0]))
    with pytest.raises(DomainError, match="time must not be negative"):
        depth_after(law, 1.0, 9.0, -1.0)
    with pytest.raises(DomainError, match="density 0 must be positive"):
        LAWS[name].function(0.0)
