import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.bed.shields import SHIELDS
from tidescour.bed.threshold import (
    PROFILES,
    closed_form_critical_velocity,
    critical_shear_velocity,
    critical_velocity,
    dimensionless_grain_size,
)
from tidescour.bed.water import kinematic_viscosity, submerged_relative_density
from tidescour.errors import DomainError
from tidescour.units import GRAVITY_M_S2

FINE_SAND = {"grain_size_m": 0.25e-3, "submerged_relative_density": 1.60, "kinematic_viscosity_m2_s": 1.3e-6}


def test_the_chain_from_the_grain_to_the_critical_velocity(published):
    (row,) = published("soulsby_1997_threshold_chain.csv")
    assert dimensionless_grain_size(*FINE_SAND.values()) == pytest.approx(row["grain_size"], abs=5.1e-6)
    parameter = SHIELDS["soulsby"].function(np.array([row["grain_size"]]))
    np.testing.assert_allclose(parameter, row["shields"], atol=5.6e-7)
    shear_velocity = critical_shear_velocity("soulsby", **FINE_SAND)
    assert shear_velocity == pytest.approx(row["shear_velocity_m_s"], abs=5.1e-7)
    chezy = PROFILES["chezy"].function(10.0, 3.0 * 0.25e-3) * np.sqrt(GRAVITY_M_S2)
    assert chezy == pytest.approx(row["chezy_m05_s"], abs=5.1e-5)
    for name in SHIELDS:
        found = critical_velocity(name, "chezy", depth_m=10.0, roughness_d50=3.0, **FINE_SAND)
        assert found == pytest.approx(row[name.replace("-", "_")], abs=5.1e-6)
    found = critical_velocity("soulsby", "log-law", depth_m=10.0, roughness_d50=3.0, **FINE_SAND)
    assert found == pytest.approx(row["log_law"], abs=5.1e-6)


def test_shear_velocity_scales_with_the_root_of_the_grain_at_one_grain_reynolds_number():
    # The dimensionless grain size stays where the viscosity grows with the grain to the power 1.5.
    for name in SHIELDS:
        one = critical_shear_velocity(name, 0.25e-3, 1.6, 1.3e-6)
        assert critical_shear_velocity(name, 1e-3, 1.6, 8.0 * 1.3e-6) == pytest.approx(2.0 * one)


@pytest.mark.parametrize("name", ["soulsby", "brownlie"])
def test_a_grain_without_weight_moves_at_once(name):
    found = [critical_shear_velocity(name, 0.25e-3, 1.6 * 10.0**-power, 1.3e-6) for power in range(6)]
    assert np.all(np.diff(found) < 0.0)
    assert found[-1] < 0.03 * found[0]


@pytest.mark.parametrize("name", PROFILES)
def test_profiles_know_no_scale_and_are_named_as_in_the_plan(name):
    assert PROFILES[name].name == name
    assert PROFILES[name].function(30.0, 3e-3) == pytest.approx(PROFILES[name].function(10.0, 1e-3))


@given(st.floats(3.0, 7.0))
@settings(max_examples=30, deadline=None)
def test_both_profiles_agree_over_smooth_enough_beds(power):
    # At h / ks = 1000 by hand: 23.4429 and 23.2725, 0.73 % apart; nearer over smoother beds.
    chezy, log_law = (PROFILES[name].function(10.0**power, 1.0) for name in ("chezy", "log-law"))
    assert log_law == pytest.approx(chezy, rel=0.0074)


def test_critical_velocity_is_near_the_power_law():
    # Soulsby 1997, Dynamics of Marine Sands, equation 71 (from memory): 7 (h / d50)^(1/7) u*_c; 0.3897 m/s for sand of
    # 0.2 mm at 5 m in sea water of 10 degrees C and 35 g/kg, worked out by separate code.
    water = submerged_relative_density(10.0, 35.0, 2650.0), kinematic_viscosity(10.0, 35.0)
    power_law = 7.0 * (5.0 / 0.2e-3) ** (1.0 / 7.0) * critical_shear_velocity("soulsby", 0.2e-3, *water)
    assert power_law == pytest.approx(0.3897, abs=5.1e-5)
    for profile in PROFILES:
        assert critical_velocity("soulsby", profile, 0.2e-3, 5.0, *water, 2.5) == pytest.approx(power_law, rel=0.05)


def test_critical_velocity_rises_as_the_seventh_root_of_the_depth_over_a_rough_bed():
    # The slope of log10(12 h / ks) on logarithmic axes is 1 / ln(12 h / ks): 1/7 where h / ks = e^7 / 12 = 91.4.
    function = PROFILES["chezy"].function
    depth = np.exp(7.0) / 12.0
    assert np.log(function(1.001 * depth, 1.0) / function(depth / 1.001, 1.0)) / np.log(1.001**2) == pytest.approx(
        1.0 / 7.0, rel=1e-5
    )


def test_dimensionless_grain_size_scales():
    one = dimensionless_grain_size(1e-3, 1.6, 1e-6)
    assert dimensionless_grain_size(2e-3, 1.6, 1e-6) == pytest.approx(2.0 * one)
    assert dimensionless_grain_size(1e-3, 1.6 * 8.0, 1e-6) == pytest.approx(2.0 * one)
    assert dimensionless_grain_size(1e-3, 1.6, 8e-6) == pytest.approx(one / 4.0)


def test_roughness_matters_little():
    # ks / d50 = 1, 2, 2.5, 3, 5 for sand of 0.25 mm at 10 m, worked out by separate code; 3 is the check above.
    found = [
        critical_velocity("soulsby", "chezy", depth_m=10.0, roughness_d50=k, **FINE_SAND)
        for k in (1.0, 2.0, 2.5, 3.0, 5.0)
    ]
    np.testing.assert_allclose(found, [0.441, 0.418, 0.410, 0.404, 0.387], atol=5.1e-4)


def test_critical_velocity_by_grain(published):
    density = submerged_relative_density(10.0, 32.0, 2650.0)
    viscosity = kinematic_viscosity(10.0, 32.0)
    for row in published("soulsby_1997_velocity_by_grain.csv"):
        found = critical_velocity("soulsby", "chezy", row["d50_mm"] / 1000.0, 10.0, density, viscosity, 2.5)
        assert found == pytest.approx(row["critical_velocity_m_s"], abs=5.1e-4)


@pytest.mark.parametrize("name", SHIELDS)
def test_critical_velocity_has_the_size_of_a_published_example(published, name):
    density, viscosity = submerged_relative_density(15.0, 0.0, 2650.0), kinematic_viscosity(15.0, 0.0)
    for row in published("soulsby_1997_critical_velocity.csv"):
        found = critical_velocity(name, "chezy", row["d50_mm"] / 1000.0, row["depth_m"], density, viscosity, 2.5)
        assert found == pytest.approx(row["critical_velocity_m_s"], rel=0.06)


def test_critical_velocity_scales_with_depth_as_the_logarithm():
    def shallow(depth):
        return critical_velocity("soulsby", "chezy", depth_m=depth, roughness_d50=2.5, **FINE_SAND)

    # Ten times the depth adds 18 u*c / sqrt g.
    shields = float(SHIELDS["soulsby"].function(np.array([dimensionless_grain_size(*FINE_SAND.values())]))[0])
    shear_velocity = np.sqrt(shields * GRAVITY_M_S2 * 1.60 * 0.25e-3)
    assert shallow(20.0) - shallow(2.0) == pytest.approx(18.0 * shear_velocity / np.sqrt(GRAVITY_M_S2))


@pytest.mark.parametrize("depth", [2.5 * 0.25e-3 / 12.0, 0.0, -1.0, float("nan")])
@pytest.mark.parametrize("profile", PROFILES)
def test_a_depth_within_the_roughness_is_refused(profile, depth):
    with pytest.raises(DomainError, match="not over a twelfth of the bed's roughness"):
        critical_velocity("soulsby", profile, depth_m=depth, roughness_d50=2.5, **FINE_SAND)


@pytest.mark.parametrize("key", FINE_SAND)
def test_what_is_not_positive_is_refused(key):
    with pytest.raises(DomainError, match="must be positive"):
        dimensionless_grain_size(**(FINE_SAND | {key: 0.0}))


def test_the_closed_form_gives_the_handbook_example():
    # Soulsby 1997, Dynamics of Marine Sands, worked example for h 5 m, d50 0.2 mm, d90 0.3 mm: 0.391 m/s (from memory).
    assert closed_form_critical_velocity(0.2e-3, 0.3e-3, 5.0) == pytest.approx(0.391, abs=5.1e-4)


def test_the_closed_form_scales_with_the_grain_and_its_branches_meet():
    def form(d50_mm, factor=1.0):
        return closed_form_critical_velocity(d50_mm * 1e-3, factor * 0.4e-3, factor * 5.0)

    assert form(0.4) / form(0.2) == pytest.approx(2.0**0.1, rel=1e-12)
    assert form(1.6) / form(0.8) == pytest.approx(2.0**0.6, rel=1e-12)
    assert form(0.4, 3.0) == pytest.approx(form(0.4), rel=1e-12)
    assert form(0.5 + 1e-9) == pytest.approx(form(0.5), rel=1e-3)


def test_the_closed_form_is_refused_outside_its_sand():
    with pytest.raises(DomainError, match=r"d50 = 0.05 mm must lie in 0.1 to 2 mm"):
        closed_form_critical_velocity(0.05e-3, 0.1e-3, 5.0)
    with pytest.raises(DomainError, match=r"must be over a quarter of d90"):
        closed_form_critical_velocity(0.2e-3, 0.3e-3, 0.0)
