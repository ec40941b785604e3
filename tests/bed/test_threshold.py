import numpy as np
import pytest

from tidescour.bed.threshold import (
    SHIELDS,
    closed_form_critical_velocity,
    critical_velocity,
    dimensionless_grain_size,
)
from tidescour.bed.water import kinematic_viscosity, submerged_relative_density
from tidescour.errors import DomainError
from tidescour.units import GRAVITY_M_S2

FINE_SAND = {"grain_size_m": 0.25e-3, "submerged_relative_density": 1.60, "kinematic_viscosity_m2_s": 1.3e-6}


@pytest.mark.parametrize("name", SHIELDS)
def test_curves_give_the_values_of_their_formulas(published, name):
    table = published("soulsby_1997_shields.csv")
    found = SHIELDS[name].function(table["grain_size"])
    np.testing.assert_allclose(found, table[name.replace("-", "_")], atol=5.1e-6)


@pytest.mark.parametrize("name", SHIELDS)
def test_entries_are_named_as_in_the_plan_and_pass_nan_on(name):
    entry = SHIELDS[name]
    assert entry.name == name
    found = entry.function(np.array([5.0, np.nan, 50.0]))
    assert np.isnan(found).tolist() == [False, True, False]


@pytest.mark.parametrize(("name", "outside"), [("soulsby", 0.1), ("van-rijn", 0.99), ("brownlie", 0.0)])
def test_curves_refuse_grains_outside_their_range(name, outside):
    with pytest.raises(DomainError, match=r"dimensionless grain size .* must be"):
        SHIELDS[name].function(np.array([5.0, outside]))


def test_dimensionless_grain_size_of_the_chain_of_checks():
    # 0.25e-3 (9.81 x 1.60 / 1.3e-6^2)^(1/3), worked out by separate code.
    assert dimensionless_grain_size(*FINE_SAND.values()) == pytest.approx(5.25502, abs=5e-6)


def test_dimensionless_grain_size_scales():
    one = dimensionless_grain_size(1e-3, 1.6, 1e-6)
    assert dimensionless_grain_size(2e-3, 1.6, 1e-6) == pytest.approx(2.0 * one)
    assert dimensionless_grain_size(1e-3, 1.6 * 8.0, 1e-6) == pytest.approx(2.0 * one)
    assert dimensionless_grain_size(1e-3, 1.6, 8e-6) == pytest.approx(one / 4.0)


@pytest.mark.parametrize(("name", "expected"), [("soulsby", 0.40421), ("van-rijn", 0.41222), ("brownlie", 0.42117)])
def test_critical_velocity_of_the_chain_of_checks(name, expected):
    # h 10 m, ks 3 d50; worked out by separate code to 5 decimals.
    found = critical_velocity(name, depth_m=10.0, roughness_d50=3.0, **FINE_SAND)
    assert found == pytest.approx(expected, abs=5.1e-6)


def test_roughness_matters_little():
    # ks / d50 = 1, 2, 2.5, 3, 5 for sand of 0.25 mm at 10 m, worked out by separate code; 3 is the check above.
    found = [
        critical_velocity("soulsby", depth_m=10.0, roughness_d50=k, **FINE_SAND) for k in (1.0, 2.0, 2.5, 3.0, 5.0)
    ]
    np.testing.assert_allclose(found, [0.441, 0.418, 0.410, 0.404, 0.387], atol=5.1e-4)


def test_critical_velocity_by_grain(published):
    density = submerged_relative_density(10.0, 32.0, 2650.0)
    viscosity = kinematic_viscosity(10.0, 32.0)
    for row in published("soulsby_1997_velocity_by_grain.csv"):
        found = critical_velocity("soulsby", row["d50_mm"] / 1000.0, 10.0, density, viscosity, 2.5)
        assert found == pytest.approx(row["critical_velocity_m_s"], abs=5.1e-4)


@pytest.mark.parametrize("name", SHIELDS)
def test_critical_velocity_has_the_size_of_a_published_example(published, name):
    density, viscosity = submerged_relative_density(15.0, 0.0, 2650.0), kinematic_viscosity(15.0, 0.0)
    for row in published("soulsby_1997_critical_velocity.csv"):
        found = critical_velocity(name, row["d50_mm"] / 1000.0, row["depth_m"], density, viscosity, 2.5)
        assert found == pytest.approx(row["critical_velocity_m_s"], rel=0.06)


def test_critical_velocity_scales_with_depth_as_the_logarithm():
    def shallow(depth):
        return critical_velocity("soulsby", depth_m=depth, roughness_d50=2.5, **FINE_SAND)

    # Ten times the depth adds 18 u*c / sqrt g.
    shields = float(SHIELDS["soulsby"].function(np.array([dimensionless_grain_size(*FINE_SAND.values())]))[0])
    shear_velocity = np.sqrt(shields * GRAVITY_M_S2 * 1.60 * 0.25e-3)
    assert shallow(20.0) - shallow(2.0) == pytest.approx(18.0 * shear_velocity / np.sqrt(GRAVITY_M_S2))


@pytest.mark.parametrize("depth", [2.5 * 0.25e-3 / 12.0, 0.0, -1.0, float("nan")])
def test_a_depth_within_the_roughness_is_refused(depth):
    with pytest.raises(DomainError, match="not over a twelfth of the bed's roughness"):
        critical_velocity("soulsby", depth_m=depth, roughness_d50=2.5, **FINE_SAND)


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
