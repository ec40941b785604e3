"""Builders shared by the tests of this folder."""

from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models import Opening, Stage
from tidescour.plan.models_bed import PlaceBed

START = datetime(2027, 4, 1, tzinfo=UTC)


@pytest.fixture(scope="session")
def sine_stage():
    """One opening with a sine discharge over two tides, basin level 0.5 m over the datum, one minute steps."""

    def build(discharge=4000.0, sea=0.5, basin=0.5, width=400.0, crest=(-6.0, -6.0), covered=None, velocity=None):
        time = START.timestamp() + 60.0 * np.arange(1491)
        phase = 2.0 * np.pi * (time - time[0]) / 44712.0 - 0.01
        n = time.size
        flow = np.full(n, np.nan) if velocity is not None else discharge * np.sin(phase)
        opening = OpeningFlow(
            name="main gap",
            level_sea_m=np.broadcast_to(sea, n),
            crest_level_m=np.linspace(*crest, n),
            width_m=np.full(n, width),
            discharge_m3_s=flow,
            gap_velocity_m_s=np.full(n, np.nan),
            flow_width_m=np.full(n, np.nan if velocity is not None else width),
            given_end_velocity_m_s=None if velocity is None else velocity * np.sin(phase),
            given=velocity is not None,
        )
        return StageFlow(
            stage="sill",
            time_s=time,
            level_sea_m=np.broadcast_to(sea, n),
            level_basin_m=np.broadcast_to(basin, n),
            covered=np.ones(n, dtype=bool) if covered is None else covered,
            measured=False,
            routed=False,
            openings=(opening,),
            inflow_m3_s=np.zeros(n),
        )

    return build


@pytest.fixture(scope="session")
def stage_plan():
    """The stage of `sine_stage` as the plan has it."""

    def build(**alphas):
        opening = Opening(name="main gap", crest_level_m=-6.0, width_m=400.0, **alphas)
        return Stage(name="sill", start=START, end=START + timedelta(minutes=1490), opening=(opening,))

    return build


@pytest.fixture(scope="session")
def place():
    """The place of `sine_stage` on one side."""

    def build(side="basin", **changes):
        values = {
            "opening": "main gap",
            "side": side,
            "length_m": 90.0,
            "bed_level_m": -9.5,
            "chezy_m05_s": 40.0,
            "widening": 0.0,
            "alpha": None,
            "alpha_basis": "integral",
            "local_velocity_factor": 1.0,
            "failure_slope_cot": 6.0,
            "start_depth_m": 0.0,
            "d50_mm": None,
        }
        return PlaceBed(**(values | changes))

    return build
