"""What averaging a tide does to the depth: one case in closed form, from the bed to the hole."""

import numpy as np
import pytest
from scipy.integrate import quad

from tidescour.bed.history import bed_history
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models import Opening, Stage, Water
from tidescour.plan.models_bed import Bed, PlaceBed
from tidescour.scour.chain import chain_place
from tidescour.scour.cycles import stage_cycles
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS
from tidescour.scour.records import RowDurations

TIDES, PERIOD_H, PEAK, ALPHA, CRITICAL, DEPTH = 60, 12.42, 1.5, 2.5, 0.375, 10.0


def mean_of_power(power):
    """Mean of E^p over the half tide with flow, by quadrature."""
    begin = np.arcsin(CRITICAL / (ALPHA * PEAK))
    area, _ = quad(lambda x: (ALPHA * PEAK * np.sin(x) - CRITICAL) ** power, begin, np.pi - begin, epsrel=1e-12)
    return area / np.pi


@pytest.fixture(scope="module")
def flow():
    time = 1.8e9 + 60.0 * np.arange(round(TIDES * PERIOD_H * 60.0) + 1)
    n = time.size
    opening = OpeningFlow(
        name="main gap",
        level_sea_m=np.zeros(n),
        crest_level_m=np.full(n, -6.0),
        width_m=np.full(n, 400.0),
        discharge_m3_s=np.full(n, np.nan),
        gap_velocity_m_s=np.full(n, np.nan),
        flow_width_m=np.full(n, np.nan),
        given_end_velocity_m_s=PEAK * np.sin(2.0 * np.pi * (time - time[0]) / (PERIOD_H * 3600.0)),
        given=True,
    )
    return StageFlow(
        stage="sixty tides",
        time_s=time,
        level_sea_m=np.zeros(n),
        level_basin_m=np.zeros(n),
        covered=np.ones(n, dtype=bool),
        measured=False,
        routed=False,
        openings=(opening,),
        inflow_m3_s=np.zeros(n),
    )


@pytest.mark.parametrize("side", ["basin", "sea"])
def test_three_rules_give_three_depths_a_factor_two_apart(flow, side):
    law = LAWS["explicit"].function(1.65)
    place = PlaceBed(
        opening="main gap",
        side=side,
        length_m=90.0,
        bed_level_m=-DEPTH,
        chezy_m05_s=None,
        widening=0.0,
        alpha=ALPHA,
        alpha_basis="integral",
        local_velocity_factor=1.0,
        failure_slope_cot=6.0,
        start_depth_m=0.0,
        d50_mm=None,
    )
    stage = Stage(
        name="sixty tides",
        start="2027-01-15T08:00:00Z",
        end="2027-02-15T09:12:00Z",
        opening=(Opening(name="main gap", crest_level_m=-6.0, width_m=400.0),),
    )
    bed = bed_history(stage, flow, flow.openings[0], place, Bed(critical_velocity_m_s=CRITICAL), Water())
    cycles = stage_cycles(flow, flow.openings[0])
    row = RowDurations(layers=(effective_duration(bed, cycles, law, None),))
    found = [chain_place((row,), law, 0.0, rule)[0].end_depth_m for rule in ("integral", "flow-mean", "cycle-mean")]
    # c h0^r [mean of E^4.25 x half the time]^0.4; c h0^r x mean of E^1.7 x half the time^0.4; the same with half the
    # mean and the whole time.
    strength, half_h = 0.1 * 1.65**-0.7 * DEPTH**0.2, 0.5 * TIDES * PERIOD_H
    wanted = [
        strength * (mean_of_power(4.25) * half_h) ** 0.4,
        strength * mean_of_power(1.7) * half_h**0.4,
        strength * 0.5 * mean_of_power(1.7) * (2.0 * half_h) ** 0.4,
    ]
    assert cycles.start_s.size == TIDES
    assert found == pytest.approx(wanted, rel=1e-5)
    assert [round(depth, 2) for depth in found] == [6.16, 4.73, 3.12]
    # Ratios of the table at k = 0.1.
    assert found[1] / found[0] == pytest.approx(0.7677, abs=5.1e-5)
    assert found[2] / found[0] == pytest.approx(0.5065, abs=5.1e-5)
