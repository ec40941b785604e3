"""Cases at the edges of relations and routing, each of which once gave a wrong number."""

import numpy as np
import pytest

from tidescour.gap.forcing import even_steps, with_points_between
from tidescour.gap.openings import opening_set
from tidescour.gap.relations import opening_discharge
from tidescour.gap.routing import Forcing, basin_levels
from tidescour.gap.section import trapezoid_section
from tidescour.gap.storage import storage_from_area
from tidescour.plan.models import Opening

GRAVITY = 9.81


def flow(relation, section, sea, basin, **numbers):
    levels = np.array([float(sea)]), np.array([float(basin)])
    return opening_discharge(relation, numbers, section, *levels)[0]


@pytest.mark.parametrize(("sea", "basin"), [(1.91, 1.5), (2.4, -5.0), (1.0, 0.99)])
def test_water_that_does_not_touch_the_lintel_is_not_contracted(sea, basin):
    section = trapezoid_section(-6.0, 40.0)
    gate = flow("orifice", section, sea, basin, height_m=8.5, coefficient=0.9)
    assert gate == pytest.approx(flow("broad-crest", section, sea, basin, coefficient=0.9), rel=1e-12)


def test_discharge_under_a_lintel_has_no_step_where_the_water_touches_it():
    section = trapezoid_section(-6.0, 40.0)
    below, above = (flow("orifice", section, 2.5 + step, 1.0, height_m=8.5, coefficient=0.9) for step in (-1e-7, 1e-7))
    assert above == pytest.approx(below, rel=1e-6)


@pytest.mark.parametrize("width", [500.0, 640.0, 660.0, 1000.0])
def test_an_open_gap_near_or_over_its_channel_has_no_value(width):
    channels = {"channel_area_sea_m2": 6000.0, "channel_area_basin_m2": 6000.0}
    section = trapezoid_section(-10.0, width)
    assert np.isnan(flow("open-gap", section, 0.2, 0.0, coefficient=0.9, **channels))
    assert np.isfinite(flow("open-gap", trapezoid_section(-10.0, 300.0), 0.2, 0.0, coefficient=0.9, **channels))


def test_the_opening_head_of_a_flap_works_in_free_outfall_too():
    section = trapezoid_section(0.0, 5.0)
    flap = {"height_m": 2.0, "coefficient": 1.0, "opening_head_m": 0.5}
    # The tailwater cannot be lower than the sill: the head left is 0.5 m, depth 0.5 m, over 5 m of width.
    expected = -5.0 * (2.0 / 3.0) ** 1.5 * np.sqrt(GRAVITY)
    assert flow("ebb-flap", section, -10.0, 1.0, **flap) == pytest.approx(expected, rel=1e-12)
    assert flow("ebb-flap", section, -10.0, 1.0, **(flap | {"opening_head_m": 0.9})) > expected
    assert flow("ebb-flap", section, -10.0, 1.0, **(flap | {"opening_head_m": 9.0})) == 0.0


@pytest.mark.parametrize(("length", "roughness", "tail"), [(40.0, 0.014, 1.5), (80.0, 0.02, 0.5)])
def test_a_culvert_passes_no_less_when_its_barrel_fills(length, roughness, tail):
    section = trapezoid_section(0.0, 3.0)
    levels = np.linspace(1.6, 4.0, 481)
    barrel = {"height_m": 2.5, "length_m": length, "manning_s_m13": roughness}
    rows = opening_discharge("culvert", barrel, section, levels, np.full(levels.size, tail))
    assert np.all(np.diff(rows) >= -1e-9)


def test_a_river_through_a_tiny_basin_is_no_fault_of_balance():
    # What runs through is a hundred thousand times what the basin holds: its sum is rounded by more than 1e-9 of that.
    instants = with_points_between(even_steps(0.0, 30.0 * 86400.0))
    sea = 1.5 * np.sin(2.0 * np.pi * instants / 44712.0)[:, None]
    drive = Forcing(
        step_s=60.0,
        sea_level_m=np.ascontiguousarray(sea[0::2]),
        sea_level_between_m=np.ascontiguousarray(sea[1::2]),
        given_discharge_m3_s=np.full(sea[0::2].size, 200.0),
        given_discharge_between_m3_s=np.full(sea[1::2].size, 200.0),
    )
    gap = Opening(name="gap", crest_level_m=-4.0, width_m=40.0, relation="broad-crest", parameters={"coefficient": 0.9})
    storage = storage_from_area(np.array([-3.0, 3.0]), np.array([1000.0, 1000.0]))
    routed = basin_levels(opening_set([gap]), drive, storage, 0.0)
    assert np.all(np.isfinite(routed.level_m))
    assert -routed.passed_volume_m3[0] == pytest.approx(200.0 * 30.0 * 86400.0, rel=1e-5)
