"""Which depth of a sounded hole is held against the evidence of the growth laws."""

import types

import numpy as np
import pytest

from tidescour.bed.records import BedHistory
from tidescour.pipeline.sounding import _depth_findings
from tidescour.plan.models_bed import Scour
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS
from tidescour.scour.records import CycleSet, RowDurations
from tidescour.study.growth_factor import DepthBand, Hole

LAW = LAWS["explicit"].function(1.65, Scour())
DAY_S, VELOCITY_M_S, ALPHA, CRITICAL_M_S = 86400.0, 1.2, 2.5, 0.45
WATER_M = (4.0, 9.0)
DAYS = 10.0


def steady(stage, water_m, first_day):
    """Ten days of steady flow, in one cycle."""
    time_s = DAY_S * np.linspace(first_day, first_day + DAYS, 241)

    def held(value):
        return np.full(time_s.size, value)

    bed = BedHistory(
        stage=stage,
        opening="gap",
        side="basin",
        time_s=time_s,
        covered=np.ones(time_s.size, dtype=bool),
        signed_velocity_m_s=held(VELOCITY_M_S),
        depth_m=held(water_m),
        alpha=held(ALPHA),
        alpha_ref=ALPHA,
        turbulence=held(0.2),
        turbulence_ref=0.2,
        critical_velocity_m_s=CRITICAL_M_S,
        reference_depth_m=water_m,
        protection_length_m=90.0,
        submerged_relative_density=1.65,
    )
    cycles = CycleSet(start_s=time_s[:1], end_s=time_s[-1:])
    return RowDurations(layers=(effective_duration(bed, cycles, LAW, None),))


@pytest.fixture
def hole():
    """Ten days over 4 m of water and ten over 9 m."""
    return Hole(
        rows=tuple(steady(f"{water_m:g} m", water_m, DAYS * at) for at, water_m in enumerate(WATER_M)),
        law=LAW,
        rule="integral",
        start_s=0.0,
        end_s=2.0 * DAYS * DAY_S,
        start_depth_m=0.0,
        growth_factor=1.0,
    )


def told(hole, factors, from_day, depths_m):
    band = DepthBand(time_s=DAY_S * np.array([from_day, 2.0 * DAYS]), depth_m=np.transpose(depths_m))
    place = types.SimpleNamespace(growth_factor=np.array(factors), forecast=types.SimpleNamespace(band=band))
    return _depth_findings(hole, place)


def test_before_the_forecast_the_law_with_the_median_factor_counts(hole):
    # Depth after ten days over 4 m: the middle of the three factors times the law.
    excess = ALPHA * VELOCITY_M_S - CRITICAL_M_S
    law_m = excess**1.7 * 4.0**0.2 * 240.0**0.4 / (10.0 * 1.65**0.7)
    (finding,) = told(hole, (0.9, 1.7, 2.8), 15.0, [(1.0, 2.0, 3.0), (1.0, 2.0, 3.0)])
    assert f"{1.7 * law_m:.2f} m deep in stage '4 m', {1.7 * law_m / 4.0:.2f} times" in finding.message
    # The same law with a smaller median: 0.9 of it, whatever the upper end.
    assert 0.9 * law_m < 1.5 * 4.0 < 1.7 * law_m
    assert told(hole, (0.3, 0.9, 2.8), 15.0, [(1.0, 2.0, 3.0), (1.0, 2.0, 3.0)]) == ()


@pytest.mark.parametrize(("median_m", "severity"), [(13.4, None), (14.0, "warning"), (18.5, "error")])
def test_in_the_forecast_its_median_counts(hole, median_m, severity):
    # 1.5 times 9 m are 13.5 m, twice 18 m.
    found = told(hole, (0.1, 0.2, 0.3), 15.0, [(1.0, 2.0, 3.0), (9.0, median_m, 30.0)])
    assert [each.severity for each in found] == ([] if severity is None else [severity])
    assert all(f"{median_m:.2f} m deep in stage '9 m'" in each.message for each in found)
