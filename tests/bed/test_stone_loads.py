import dataclasses
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.bed.records import BedHistory
from tidescour.bed.stone_loads import (
    ENERGY_FROM_LEVELS,
    THROUGH_STONE,
    jet_velocity,
    stone_loads,
    turbulence_factor,
)
from tidescour.gap.openings import opening_rows, opening_set
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.relations import RELATIONS
from tidescour.plan.models import Opening

NUMBERS = {
    "broad-crest": {"coefficient": 0.9},
    "narrow-crest": {"coefficient": 1.08},
    "open-gap": {"coefficient": 0.85, "channel_area_sea_m2": 9000.0, "channel_area_basin_m2": 8000.0},
    "orifice": {"height_m": 2.0, "coefficient": 0.95},
    "culvert": {"height_m": 2.0, "length_m": 30.0, "manning_s_m13": 0.014},
    "ebb-flap": {"height_m": 2.0, "coefficient": 0.9, "leak": 0.05},
    "flood-flap": {"height_m": 2.0, "coefficient": 0.9},
}


def planned(relation="broad-crest", **parameters):
    return Opening(
        name="main gap",
        crest_level_m=-3.0,
        width_m=100.0,
        relation=relation,
        parameters=parameters or NUMBERS.get(relation, {}),
    )


def stage_flow(opening, covered=None):
    n = opening.level_sea_m.size
    return StageFlow(
        stage="sill",
        time_s=1.8e9 + 60.0 * np.arange(n),
        level_sea_m=opening.level_sea_m,
        level_basin_m=np.zeros(n),
        covered=np.ones(n, dtype=bool) if covered is None else covered,
        measured=False,
        routed=False,
        openings=(opening,),
        inflow_m3_s=np.zeros(n),
    )


def at_crest(head_m, unit_discharge, depth, **changes):
    """An opening 100 m wide, crest 3 m under the still basin, with heads, unit discharges and depths by hand."""
    unit, depth = np.array(unit_discharge), np.array(depth)
    values = {
        "name": "main gap",
        "level_sea_m": np.array(head_m),
        "crest_level_m": np.full(unit.size, -3.0),
        "width_m": np.full(unit.size, 100.0),
        "discharge_m3_s": 100.0 * unit,
        "gap_velocity_m_s": unit / depth,
        "flow_width_m": np.full(unit.size, 100.0),
    }
    return OpeningFlow(**(values | changes))


def bed(flow, side, velocity, depth, turbulence=0.2):
    n = flow.time_s.size
    return BedHistory(
        stage=flow.stage,
        opening="main gap",
        side=side,
        time_s=flow.time_s,
        covered=flow.covered,
        signed_velocity_m_s=np.broadcast_to(velocity, n),
        depth_m=np.broadcast_to(depth, n),
        alpha=np.full(n, 2.5),
        alpha_ref=2.5,
        turbulence=np.broadcast_to(turbulence, n),
        turbulence_ref=0.2,
        critical_velocity_m_s=0.45,
        reference_depth_m=8.0,
        protection_length_m=90.0,
        submerged_relative_density=1.6,
    )


def beds(flow, basin=1.0, sea=1.0):
    return {("main gap", "basin"): bed(flow, "basin", basin, 9.0), ("main gap", "sea"): bed(flow, "sea", sea, 8.0)}


@pytest.fixture(scope="session")
def stage(stage_plan):
    """Return the builder of a stage with one opening."""

    def build(opening=None):
        return stage_plan().model_copy(update={"opening": (opening or planned(),)})

    return build


def by_location(loads):
    return {load.location: load for load in loads}


def test_the_jet_on_a_broad_crest_is_that_of_its_energy_not_the_mean_reduced_by_the_coefficient(stage):
    # Energy 3 m, tailwater 2.5 m over the crest: u = 3.13209 m/s and q = 7.83023 m2/s with coefficient 1; 0.9 of it.
    opening = at_crest([0.5, 0.2], [0.9 * 7.83023, 0.1], [2.5, 2.5], crest_level_m=[-2.5, -2.5])
    flow = stage_flow(opening)
    crest, slope, _ = stone_loads(stage(planned(coefficient=0.9)), flow, beds(flow))
    assert (crest.stage, crest.opening, crest.direction, crest.location) == ("sill", "main gap", "flood", "crest")
    assert crest.velocity_m_s == pytest.approx(3.13209, abs=6e-6)
    assert crest.unit_discharge_m2_s == pytest.approx(7.04721, abs=6e-6)
    assert crest.depth_m == pytest.approx(2.5)
    assert (crest.head_m, crest.turbulence_factor) == (0.5, 1.0)
    # Drowned, the slope has the same head as the crest: the jet is 0.9 of the depth thick.
    assert slope.velocity_m_s == pytest.approx(3.13209, abs=6e-6)
    assert slope.depth_m == pytest.approx(0.9 * 2.5, rel=1e-5)
    assert slope.turbulence_factor**2 == pytest.approx(3.0)


def test_in_free_flow_the_slope_has_the_whole_head_and_the_crest_a_third_of_the_energy(stage):
    # Energy 3 m over the crest, free: q = 8.85889 m2/s, u = 4.42945 m/s; the basin lies 4 m under the sea.
    opening = at_crest([4.0], [8.85889], [2.0], crest_level_m=[1.0])
    flow = stage_flow(opening)
    crest, slope, _ = stone_loads(stage(planned(coefficient=1.0)), flow, beds(flow))
    assert crest.velocity_m_s == pytest.approx(4.42945, abs=6e-6)
    assert slope.velocity_m_s == pytest.approx(math.sqrt(2.0 * 9.81 * 4.0))
    assert slope.depth_m == pytest.approx(8.85889 / math.sqrt(2.0 * 9.81 * 4.0))


def test_the_jet_of_an_open_gap_is_the_gap_velocity_over_the_contraction(stage):
    # Head 0.2 m, contraction 0.9, gap of 500 m2 in channels of 6000 m2: 963.69 m3/s, so 1.92738 m/s, jet 2.14153.
    opening = at_crest([0.2], [9.6369], [5.0], crest_level_m=[-5.0])
    flow = stage_flow(opening)
    numbers = {"coefficient": 0.9, "channel_area_sea_m2": 6000.0, "channel_area_basin_m2": 6000.0}
    found = by_location(stone_loads(stage(planned("open-gap", **numbers)), flow, beds(flow)))
    assert found["crest"].velocity_m_s == pytest.approx(2.14153, abs=6e-6)
    # It is faster than the head alone would make it, as head is won back behind it; so is the slope's.
    assert found["downstream slope"].velocity_m_s == found["crest"].velocity_m_s


def test_a_coefficient_over_one_does_not_slow_the_jet(stage):
    opening = at_crest([0.2], [12.0], [5.0], crest_level_m=[-5.0])
    flow = stage_flow(opening)
    crest, *_ = stone_loads(stage(planned(coefficient=1.2)), flow, beds(flow))
    assert crest.velocity_m_s == 2.4


def test_a_given_discharge_against_the_head_has_its_own_velocity(stage):
    opening = at_crest([-0.3], [6.0], [3.0], given=True)
    flow = stage_flow(opening)
    given_flow = planned(relation=None).model_copy(update={"discharge_series": "model"})
    crest, slope, _ = stone_loads(stage(given_flow), flow, beds(flow))
    assert (crest.velocity_m_s, slope.velocity_m_s, crest.head_m) == (2.0, 2.0, -0.3)


def test_the_end_of_the_protection_has_the_velocity_of_the_side_that_receives_the_flow(stage):
    opening = at_crest([0.5, -0.5], [7.0, -6.0], [2.5, 2.5])
    flow = stage_flow(opening)
    ends = [load for load in stone_loads(stage(), flow, beds(flow, 1.5, 1.25)) if load.location == "end of protection"]
    assert [(load.direction, load.velocity_m_s, load.depth_m) for load in ends] == [
        ("flood", 1.5, 9.0),
        ("ebb", 1.25, 8.0),
    ]
    assert ends[1].unit_discharge_m2_s == 10.0
    # (1 + 3 x 0.2) / 1.3.
    assert ends[0].turbulence_factor == pytest.approx(1.2307692)
    assert "r0 = 0.200" in ends[0].assumption


def test_without_a_sill_there_is_no_slope(stage):
    # The bed at the end of the protection lies 9 m under the basin on its side, 8 m under the sea on the other.
    opening = at_crest([0.5, -0.5], [7.0, -6.0], [9.5, 9.5], crest_level_m=[-9.0, -9.0])
    flow = stage_flow(opening)
    locations = [(load.direction, load.location) for load in stone_loads(stage(), flow, beds(flow))]
    assert locations == [
        ("flood", "crest"),
        ("flood", "end of protection"),
        ("ebb", "crest"),
        ("ebb", "end of protection"),
    ]
    over = dataclasses.replace(flow, openings=(dataclasses.replace(opening, crest_level_m=np.full(2, -8.9)),))
    assert ("flood", "downstream slope") in [
        (load.direction, load.location) for load in stone_loads(stage(), over, beds(over))
    ]


def test_turbulence_of_uniform_flow_raises_nothing():
    assert turbulence_factor(0.1) == pytest.approx(1.0)


def test_turbulence_that_is_not_known_leaves_the_factor_empty(stage):
    flow = stage_flow(at_crest([0.5], [7.0], [2.5]))
    unknown = {("main gap", "basin"): bed(flow, "basin", 1.0, 9.0, turbulence=np.nan)}
    load = stone_loads(stage(), flow, unknown)[-1]
    assert math.isnan(load.turbulence_factor)
    assert "not known" in load.assumption


def test_each_location_is_looked_at_when_its_own_velocity_is_highest(stage):
    opening = at_crest([0.2, 0.5, 0.4], [4.0, 7.0, 6.0], [2.5, 2.5, 2.5])
    flow = stage_flow(opening)
    rows = beds(flow)
    rows["main gap", "basin"] = bed(flow, "basin", [0.5, 0.7, 0.9], 9.0)
    found = by_location(stone_loads(stage(), flow, rows))
    assert found["crest"].time_s == flow.time_s[1]
    assert found["end of protection"].time_s == flow.time_s[2]


def test_what_happens_in_holes_of_the_records_does_not_count(stage):
    opening = at_crest([0.5, 0.2, -0.4], [7.0, 3.0, -6.0], [2.5, 2.5, 2.5])
    flow = stage_flow(opening, covered=np.array([False, True, False]))
    loads = stone_loads(stage(), flow, beds(flow))
    assert {load.direction for load in loads} == {"flood"}
    assert {load.time_s for load in loads} == {flow.time_s[1]}


@pytest.mark.parametrize("relation", [None, THROUGH_STONE])
def test_without_a_velocity_over_the_stone_only_the_end_of_the_protection_is_looked_at(stage, relation):
    opening, plan = at_crest([0.5], [7.0], [2.5]), planned(relation)
    if relation is None:
        empty = np.full(1, np.nan)
        opening = dataclasses.replace(
            opening, discharge_m3_s=empty, gap_velocity_m_s=empty, given_end_velocity_m_s=np.array([0.8]), given=True
        )
        plan = plan.model_copy(update={"end_velocity_series": "model"})
    flow = stage_flow(opening)
    assert [load.location for load in stone_loads(stage(plan), flow, beds(flow))] == ["end of protection"]


def test_relations_that_are_treated_apart_are_in_the_table():
    assert {*ENERGY_FROM_LEVELS, THROUGH_STONE} <= set(RELATIONS)
    assert set(NUMBERS) | {THROUGH_STONE} == set(RELATIONS)


@given(
    st.sampled_from(sorted(NUMBERS)), st.floats(-2.9, 4.0), st.floats(0.001, 6.0), st.booleans(), st.floats(0.3, 1.0)
)
@settings(max_examples=150, deadline=None)
def test_the_jet_is_never_slower_than_the_gap_and_has_the_energy_of_the_levels(
    relation, lower_m, head_m, flood, coefficient
):
    plan = planned(relation, **(NUMBERS[relation] | {"coefficient": coefficient}))
    upper = np.full(2, lower_m + head_m)
    sea, basin = (upper, np.full(2, lower_m)) if flood else (np.full(2, lower_m), upper)
    rows = opening_rows(opening_set([plan]), 0, sea, basin)
    if not np.all(np.abs(rows[0]) > 0.0):
        return
    opening = OpeningFlow(
        name="main gap",
        level_sea_m=sea,
        crest_level_m=np.full(2, -3.0),
        width_m=np.full(2, 100.0),
        discharge_m3_s=rows[0],
        gap_velocity_m_s=rows[0] / rows[1],
        flow_width_m=rows[2],
    )
    flow = dataclasses.replace(stage_flow(opening), level_basin_m=basin)
    jet = jet_velocity(flow, opening, plan)
    assert np.all(jet >= np.abs(opening.gap_velocity_m_s))
    if relation == "broad-crest":
        # Free: two thirds of the energy are left as depth; drowned: the tailwater is.
        depth = max(lower_m + 3.0, 2.0 / 3.0 * (upper[0] + 3.0))
        expected = math.sqrt(2.0 * 9.81 * (upper[0] + 3.0 - depth))
        assert jet[0] == pytest.approx(expected, rel=1e-6)
    elif relation in ("orifice", "culvert"):
        # No more than the whole head could give.
        assert jet[0] <= math.sqrt(2.0 * 9.81 * head_m) * (1.0 + 1e-9)
