"""What loads the stone in an ebb stage: the same numbers as in the flood, from the other side."""

import math

import numpy as np
import pytest

from tidescour.bed.records import BedHistory
from tidescour.bed.stone_loads import stone_loads
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models import Opening

SEA_M, BASIN_M, CREST_M = -1.0, 2.0, -1.5
"""The basin stands 3.5 m over the crest, the sea 0.5 m: free flow out, 7/3 m deep at the crest."""


@pytest.fixture
def loads(stage_plan):
    """Loads of an ebb of 3 m of head through 80 m, and of a weaker one before it."""
    critical_m = 2.0 / 3.0 * 3.5
    unit = critical_m * math.sqrt(2.0 * 9.81 * 3.5 / 3.0)
    levels = {"level_sea_m": np.array([0.5, SEA_M]), "crest_level_m": np.full(2, CREST_M)}
    depth_m = np.array([2.0, critical_m])
    opening = OpeningFlow(
        name="main gap",
        width_m=np.full(2, 80.0),
        flow_width_m=np.full(2, 80.0),
        discharge_m3_s=-80.0 * np.array([4.0, unit]),
        gap_velocity_m_s=-np.array([4.0, unit]) / depth_m,
        **levels,
    )
    flow = StageFlow(
        stage="sill",
        time_s=np.array([0.0, 600.0]),
        level_sea_m=levels["level_sea_m"],
        level_basin_m=np.array([0.8, BASIN_M]),
        covered=np.ones(2, dtype=bool),
        measured=False,
        routed=False,
        openings=(opening,),
        inflow_m3_s=np.zeros(2),
    )
    planned = Opening(
        name="main gap", crest_level_m=CREST_M, width_m=80.0, relation="broad-crest", parameters={"coefficient": 1.0}
    )
    sea = BedHistory(
        stage="sill",
        opening="main gap",
        side="sea",
        time_s=flow.time_s,
        covered=flow.covered,
        signed_velocity_m_s=np.array([0.5, 1.5]),
        depth_m=levels["level_sea_m"] + 9.0,
        alpha=np.full(2, 2.5),
        alpha_ref=2.5,
        turbulence=np.full(2, 0.2),
        turbulence_ref=0.2,
        critical_velocity_m_s=0.45,
        reference_depth_m=8.0,
        protection_length_m=90.0,
        submerged_relative_density=1.6,
    )
    stage = stage_plan().model_copy(update={"opening": (planned,)})
    return stone_loads(stage, flow, {("main gap", "sea"): sea})


def test_the_head_of_an_ebb_is_no_negative_number_and_its_slope_has_all_of_it(loads):
    assert [(load.direction, load.location) for load in loads] == [
        ("ebb", "crest"),
        ("ebb", "downstream slope"),
        ("ebb", "end of protection"),
    ]
    assert {load.head_m for load in loads} == {3.0}
    assert {load.time_s for load in loads} == {600.0}
    crest, slope, end = loads
    # A third of the energy over the crest, and the whole head of 3 m down the slope.
    assert crest.velocity_m_s == pytest.approx(math.sqrt(2.0 * 9.81 * 3.5 / 3.0), rel=1e-12)
    assert crest.depth_m == pytest.approx(7.0 / 3.0, rel=1e-12)
    assert slope.velocity_m_s == pytest.approx(math.sqrt(2.0 * 9.81 * 3.0), rel=1e-12)
    assert slope.depth_m == pytest.approx(crest.unit_discharge_m2_s / slope.velocity_m_s, rel=1e-12)
    assert (end.velocity_m_s, end.depth_m, end.unit_discharge_m2_s) == (1.5, 8.0, 12.0)
