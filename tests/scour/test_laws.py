import numpy as np
import pytest

from tidescour.errors import DomainError
from tidescour.plan.models_bed import Scour
from tidescour.scour.curves import depth_after, growth_rate
from tidescour.scour.laws import LAWS, GrowthLaw

POWER_LAWS = ("explicit", "time-scale")


@pytest.mark.parametrize(
    ("name", "column", "numbers"),
    [
        ("explicit", "explicit", {}),
        ("time-scale", "time_scale", {}),
        ("time-scale", "time_scale_38", {"time_exponent": 0.38}),
    ],
)
def test_laws_give_the_depths_of_the_check(published, law_of, name, column, numbers):
    table = published("breusers_1967_growth.csv")
    found = depth_after(law_of(name, 1.65, **numbers), 2.5 * 1.2 - 0.45, 10.0, table["hours"])
    np.testing.assert_allclose(found, table[column], atol=5.1e-6)


def test_explicit_law_and_time_scale_are_a_few_per_cent_apart(published):
    # The table holds at any depth and time: both laws have the same powers of them.
    explicit, by_scale = (LAWS[name].function(1.65) for name in POWER_LAWS)
    for row in published("breusers_1967_law_ratio.csv"):
        for depth, hours in ((10.0, 1.0), (4.0, 300.0)):
            ratio = depth_after(explicit, row["excess"], depth, hours) / depth_after(
                by_scale, row["excess"], depth, hours
            )
            assert float(ratio) == pytest.approx(row["ratio"], abs=5.1e-4)


def test_the_explicit_law_is_a_time_scale_of_316_hours_with_other_rounding():
    # 10^2.5 = 316.228 in the place of 330, and exponents 1.7 and 0.7 in the place of 1.72 and 0.68.
    one = LAWS["explicit"].function(1.0)
    other = LAWS["time-scale"].function(1.0, Scour(time_constant=10.0**2.5))
    assert float(depth_after(one, 1.0, 7.0, 40.0)) == pytest.approx(float(depth_after(other, 1.0, 7.0, 40.0)))


def test_constant_and_exponent_of_the_time_scale_are_inputs():
    # h = h0 (t / t1)^gamma: at t1 = K h0^2 Delta^1.7 / E^4.3 it is h0 whatever the exponent; by hand 200 x 36 / 2^4.3.
    for gamma in (0.34, 0.4, 0.8):
        law = LAWS["time-scale"].function(1.0, Scour(time_constant=200.0, time_exponent=gamma))
        scale_h = 200.0 * 36.0 / 2.0**4.3
        assert float(depth_after(law, 2.0, 6.0, scale_h)) == pytest.approx(6.0, rel=1e-12)
        assert float(depth_after(law, 2.0, 6.0, 0.1 * scale_h)) == pytest.approx(6.0 * 0.1**gamma, rel=1e-12)
        assert law.integral_exponent == pytest.approx(4.3)
        assert f"^{gamma:g}" in law.text
        assert "t1 = 200 h0^2" in law.text


def test_the_hole_is_as_deep_as_the_water_after_the_time_scale():
    # t1 = 330 x 10^2 x 1.65^1.7 / 2.55^4.3 = 1380.746 h, worked out by separate code.
    found = depth_after(LAWS["time-scale"].function(1.65), 2.55, 10.0, 1380.746)
    assert float(found) == pytest.approx(10.0, rel=2e-7)


def test_an_older_time_exponent_is_a_power_law_too():
    # Exponent 0.38 in the first tests: 3.68771 m after 100 h of the check, worked out by separate code.
    law = GrowthLaw(
        name="older",
        text="",
        coefficient=330.0**-0.38 * 1.65 ** (-1.7 * 0.38),
        velocity_exponent=4.3 * 0.38,
        depth_exponent=1.0 - 2.0 * 0.38,
        time_exponent=0.38,
    )
    assert float(depth_after(law, 2.55, 10.0, 100.0)) == pytest.approx(3.68771, abs=5.1e-6)


@pytest.mark.parametrize("name", LAWS)
def test_entries_are_named_as_in_the_plan(law_of, name):
    entry = LAWS[name]
    law = law_of(name)
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
    minutes = depth_after(law, 2.0, 9.0, 60.0) / depth_after(law, 2.0, 9.0, 1.0)
    # 60^0.4.
    assert float(minutes) == pytest.approx(5.144, abs=5e-4)


@pytest.mark.parametrize("name", ["saturating", "model-curve"])
@pytest.mark.parametrize("gamma", [0.34, 0.4, 0.6])
def test_growth_rate_of_a_bent_law_is_that_of_its_time_scale(law_of, name, gamma):
    law, straight = (law_of(each, time_exponent=gamma, time_constant=250.0) for each in (name, "time-scale"))
    assert float(growth_rate(law, 2.0, 9.0)) == pytest.approx(float(growth_rate(straight, 2.0, 9.0)), rel=1e-14)
    assert law.integral_exponent == straight.integral_exponent


@pytest.mark.parametrize("name", POWER_LAWS)
def test_growth_rate_is_the_power_of_the_depth_that_adds_up(name):
    law = LAWS[name].function(1.6)
    assert float(growth_rate(law, 2.0, 9.0)) == pytest.approx(float(depth_after(law, 2.0, 9.0, 1.0)) ** 2.5)
    assert float(growth_rate(law, 4.0, 9.0) / growth_rate(law, 2.0, 9.0)) == pytest.approx(2.0**law.integral_exponent)


def test_nothing_grows_without_excess_or_time_and_nan_passes():
    law = LAWS["explicit"].function(1.6)
    found = depth_after(law, np.array([0.0, 2.0, np.nan]), 9.0, np.array([10.0, 0.0, 10.0]))
    np.testing.assert_array_equal(found, [0.0, 0.0, np.nan])


@pytest.mark.parametrize("name", LAWS)
def test_what_is_negative_is_refused(law_of, name):
    law = law_of(name)
    with pytest.raises(DomainError, match="must not be negative"):
        growth_rate(law, -0.1, 9.0)
    with pytest.raises(DomainError, match="must not be negative"):
        growth_rate(law, 1.0, np.array([9.0, -1.0]))
    with pytest.raises(DomainError, match="time must not be negative"):
        depth_after(law, 1.0, 9.0, -1.0)
    with pytest.raises(DomainError, match="density 0 must be positive"):
        law_of(name, 0.0)
