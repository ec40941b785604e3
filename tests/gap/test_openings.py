"""Openings of a plan as the kernels want them: geometry in time, profiles, sea levels and what is refused."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError
from tidescour.gap.openings import NO_RELATION, has_own_sea, opening_rows, opening_section, opening_set
from tidescour.gap.relations import CODES
from tidescour.plan.models import Opening

GRAVITY = 9.81
VALLEY = ((0.0, 4.0), (30.0, -1.0), (60.0, -1.0), (70.0, -4.0), (90.0, -3.0), (140.0, 1.0), (180.0, 5.0))


def opening(name="gap", **changes):
    values = {"name": name, "crest_level_m": -6.0, "width_m": 40.0, "relation": "broad-crest"}
    return Opening.model_validate({**values, "parameters": {"coefficient": 0.9}, **changes})


def surveyed(points=VALLEY, **changes):
    lowest = min(level for _, level in points)
    return opening(
        profile="valley.csv", profile_points=points, **({"crest_level_m": lowest, "width_m": None} | changes)
    )


def rows(planned, sea, basin, discharge=None):
    return opening_rows(opening_set([planned]), 0, np.array(sea, float), np.array(basin, float), discharge)


def test_crest_and_width_are_linear_in_time_from_the_start_to_the_end():
    # Drowned: A = (b + s y) y, b and crest by hand at a quarter and three quarters of the stage.
    moving = opening(crest_level_end_m=-2.0, width_end_m=20.0, side_slope=1.5)
    area = rows(moving, [1.0] * 5, [0.8] * 5)[1]
    for share, found in zip((0.0, 0.25, 0.5, 0.75, 1.0), area, strict=True):
        depth, width = 0.8 - (-6.0 + 4.0 * share), 40.0 - 20.0 * share
        assert found == pytest.approx((width + 1.5 * depth) * depth, rel=1e-12)


def test_a_geometry_held_at_its_start_does_not_move():
    moving = opening(crest_level_end_m=-2.0, width_end_m=20.0)
    held = opening_set([moving], fixed_at_start=True)
    assert held.crest_level_m.tolist() == [[-6.0, -6.0]]
    assert held.width_m.tolist() == [[40.0, 40.0]]


def test_the_fill_of_a_profile_rises_in_time_and_the_walls_stand():
    # 20 m of bed at -6 m between walls, 50 m at -3 m beside it; fill from -6 to -2 m, water at 0.8 m.
    walled = ((0.0, 2.0), (0.0, -3.0), (50.0, -3.0), (50.0, -6.0), (70.0, -6.0), (70.0, 2.0))
    area = rows(surveyed(walled, crest_level_end_m=-2.0), [1.0] * 5, [0.8] * 5)[1]
    expected = [20.0 * 3.0 + 70.0 * 3.8, 20.0 * 2.0 + 70.0 * 3.8, 20.0 + 70.0 * 3.8, 70.0 * 3.8, 70.0 * 2.8]
    np.testing.assert_allclose(area, expected, rtol=1e-12)


def test_profiles_of_different_length_and_trapezoids_do_not_disturb_each_other():
    short = surveyed(((0.0, 2.0), (20.0, -5.0), (50.0, 3.0)), name="short")
    planned = [surveyed(), opening("sill"), short, opening("moving", crest_level_end_m=0.0)]
    levels = np.array([1.5, 0.2, -3.0, 2.0]), np.array([1.0, 0.9, -6.0, -1.0])
    together = opening_set(planned)
    for k, each in enumerate(planned):
        np.testing.assert_array_equal(opening_rows(together, k, *levels), opening_rows(opening_set([each]), 0, *levels))


@given(level=st.floats(-3.9, 4.9), head=st.floats(0.001, 3.0), factor=st.floats(0.2, 5.0))
@settings(max_examples=50, deadline=None)
def test_a_profile_in_scale_passes_five_halves_as_much(level, head, factor):
    def scaled(size):
        planned = surveyed(tuple((distance * size, ground * size) for distance, ground in VALLEY))
        return rows(planned, [(level + head) * size], [level * size])

    small, large = scaled(1.0), scaled(factor)
    np.testing.assert_allclose(large[:, 0], small[:, 0] * factor ** np.array([2.5, 2.0, 1.0]), rtol=1e-9)


def test_each_opening_meets_its_own_sea_or_that_of_the_stage():
    planned = [
        opening("gap"),
        opening("late", sea_lag_s=600.0),
        opening("given", relation=None, parameters={}, discharge_series="q"),
        opening("larger", sea_factor=1.1),
        opening("higher", sea_shift_m=-0.05),
    ]
    assert [has_own_sea(each) for each in planned] == [False, True, False, True, True]
    openings = opening_set(planned)
    assert openings.sea_row.tolist() == [0, 1, 0, 2, 3]
    assert openings.code[2] == NO_RELATION
    assert openings.code[0] == CODES["broad-crest"]


def test_a_given_discharge_is_critical_or_drowned_in_the_section_of_its_time():
    # From the sea at 3 m over the crest: y = max(h2, 2 m); against a head: that of the side it comes from.
    planned = opening(crest_level_m=0.0, crest_level_end_m=1.0, relation=None, parameters={}, discharge_series="q")
    given_rows = rows(planned, [3.0, 3.5, 4.0], [1.0, 3.0, 5.0], np.array([60.0, -60.0, 60.0]))
    assert given_rows[0].tolist() == [60.0, -60.0, 60.0]
    np.testing.assert_allclose(given_rows[1], [40.0 * 2.0, 40.0 * 3.0, 40.0 * 4.0], rtol=1e-12)
    np.testing.assert_allclose(given_rows[2], 40.0, rtol=1e-12)


def test_a_missing_level_is_a_missing_area_and_a_dry_crest_has_no_width():
    area, width = rows(opening(crest_level_m=2.0), [1.0, 1.9], [0.5, -3.0])[1:]
    assert area.tolist() == [0.0, 0.0]
    assert np.isnan(width).all()
    # Water over the foot of a wall, yet under all bed that has a width.
    foot = surveyed(((0.0, -9.0), (0.0, -3.0), (50.0, -3.0)), crest_level_m=-9.0)
    assert np.isnan(rows(foot, [-5.0], [-6.0])[2]).all()


def test_sections_are_those_of_the_start_and_the_end():
    moving = opening(crest_level_end_m=-2.0, width_end_m=20.0, side_slope=2.0)
    assert opening_section(moving).layers.tolist() == [[-6.0, 0.0, 40.0, 4.0]]
    assert opening_section(moving, at_end=True).layers.tolist() == [[-2.0, 0.0, 20.0, 4.0]]
    filled = surveyed(crest_level_end_m=-2.5)
    assert [opening_section(filled, at_end).crest_level_m for at_end in (False, True)] == [-4.0, -2.5]


def test_what_no_kernel_can_use_is_refused_by_name():
    bed = {"coefficient": 0.9, "approach_width_basin_m": 90.0, "approach_bed_basin_m": -5.0}
    with pytest.raises(DomainError, match=r"opening 'gap': approach_bed_basin_m = -5 lies over the crest at -6 m"):
        opening_set([opening(parameters=bed)])
    # Dredged in the stage, its crest ends under the bed.
    with pytest.raises(DomainError, match=r"lies over the crest at -5\.5 m"):
        opening_set([opening(parameters=bed, crest_level_m=-3.0, crest_level_end_m=-5.5)])
    line = surveyed(((3.0, 1.0), (3.0, -2.0)))
    with pytest.raises(DomainError, match=r"opening 'gap', profile valley.csv: the profile has no width"):
        opening_set([line])
    with pytest.raises(DomainError, match="relation broad-crest: coefficient = nan"):
        opening_set([opening(parameters={})])
