from itertools import pairwise

import pytest

from tidescour.bed.water import (
    dynamic_viscosity,
    kinematic_viscosity,
    submerged_relative_density,
    water_density,
)
from tidescour.errors import DomainError


def test_density_is_that_of_the_unesco_check_values(published):
    for row in published("fofonoff_1983_density.csv"):
        assert water_density(row["temperature_c"], row["salinity"]) == pytest.approx(row["density_kg_m3"], abs=5.1e-6)


def test_viscosity_is_that_of_the_formula(published):
    for row in published("sharqawy_2010_viscosity.csv"):
        found = kinematic_viscosity(row["temperature_c"], row["salinity_g_kg"]) * 1e6
        assert found == pytest.approx(row["kinematic_viscosity_1e6_m2_s"], abs=5.1e-6)


def test_viscosity_agrees_with_other_tables(published):
    for row in published("dorsey_1940_viscosity.csv"):
        found = dynamic_viscosity(row["temperature_c"], row["salinity_g_kg"])
        assert found == pytest.approx(row["dynamic_viscosity_pa_s"], rel=3e-3)
    for row in published("ittc_2011_viscosity.csv"):
        found = kinematic_viscosity(row["temperature_c"], row["salinity_g_kg"]) * 1e6
        assert found == pytest.approx(row["kinematic_viscosity_1e6_m2_s"], rel=3e-3)


def test_fresh_water_is_heaviest_at_four_degrees():
    # Textbook: 3.98 degrees C.
    densities = {t / 100.0: water_density(t / 100.0, 0.0) for t in range(300, 500)}
    assert max(densities, key=densities.get) == pytest.approx(3.98, abs=0.02)


def test_viscosity_falls_with_temperature():
    values = [kinematic_viscosity(float(t), 30.0) for t in range(-2, 41)]
    assert all(after < before for before, after in pairwise(values))


def test_submerged_relative_density_of_quartz_in_sea_water():
    # 2650 / 1027.67547 - 1, with the density of the UNESCO check value.
    assert submerged_relative_density(5.0, 35.0, 2650.0) == pytest.approx(1.5786350, abs=1e-7)
    double = submerged_relative_density(5.0, 35.0, 5300.0) + 1.0
    assert double == pytest.approx(2.0 * (submerged_relative_density(5.0, 35.0, 2650.0) + 1.0))


@pytest.mark.parametrize("function", [water_density, dynamic_viscosity, kinematic_viscosity])
@pytest.mark.parametrize(
    ("temperature", "salinity", "key"),
    [(-3.0, 30.0, "temperature_c"), (float("nan"), 30.0, "temperature_c"), (10.0, 43.0, "salinity_g_kg")],
)
def test_water_out_of_range_is_refused(function, temperature, salinity, key):
    with pytest.raises(DomainError, match=f"water.{key} = .* must be within"):
        function(temperature, salinity)


def test_a_grain_lighter_than_water_is_refused():
    with pytest.raises(DomainError, match=r"1000 kg/m3 floats: write bed\.grain_density_kg_m3"):
        submerged_relative_density(10.0, 30.0, 1000.0)
