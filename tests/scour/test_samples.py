"""What the steps of a tide hand to the laws: means, scales, counted time, steps near the jump of a saturating one."""

import numpy as np
import pytest

from tidescour.scour.chain import chain_place
from tidescour.scour.durations import effective_duration
from tidescour.scour.records import CycleSet, RowDurations

HOUR = 3600.0
TIDE = 12.42 * HOUR
DELTA, ALPHA, CRITICAL = 1.65, 2.5, 0.45


def whole(count):
    edges = TIDE * np.arange(count + 1)
    return CycleSet(start_s=edges[:-1], end_s=edges[1:])


def depth_of(bed, cycles, law, rule):
    row = RowDurations(layers=(effective_duration(bed, cycles, law, None),))
    return chain_place([row], law, 0.0, rule)[0].end_depth_m


def test_a_saturating_tide_over_a_moving_level_bends_by_the_mean_depth(bed_row, law_of):
    # Own steps of a second: t1 and the water depth of the bend move with the level, h_e is its ratio times the mean
    # depth of 3 m. With h_e of the moving depth the hole comes out 10 % deeper or shallower.
    def felt(time):
        phase = 2.0 * np.pi * time / TIDE
        return 1.6 * np.sin(phase), 3.0 + 1.5 * np.sin(phase)

    def steps(mean_depth_m):
        depth = 0.0
        for velocity, water in zip(*felt(np.arange(0.5, 0.5 * TIDE)), strict=True):
            ratio = (0.5 * ALPHA * velocity - CRITICAL) / CRITICAL
            limit = ratio * (water if mean_depth_m is None else mean_depth_m)
            if limit <= depth:
                continue
            t1_h = 330.0 * water**2 * DELTA**1.7 / (ALPHA * velocity - CRITICAL) ** 4.3
            # k = -(h_e / h0) ln(1 - h0 / h_e) h0 t1^-0.4 with the ratio as it is, h = h_e (1 - exp(-k t^0.4 / h_e)).
            bend = -ratio * np.log1p(-1.0 / ratio) if ratio > 1.0 else 1.0
            strength = bend * water * t1_h**-0.4
            start_h = (-limit * np.log1p(-depth / limit) / strength) ** 2.5
            depth = -limit * np.expm1(-strength * (start_h + 1.0 / HOUR) ** 0.4 / limit)
        return depth

    time = np.arange(0.0, TIDE + 27.0, 54.0)
    velocity, water = felt(time)
    found = depth_of(bed_row(time, velocity, depth=water), whole(1), law_of("saturating", DELTA), "integral")
    assert found == pytest.approx(steps(3.0), rel=1e-3)
    assert steps(None) > 1.02 * found


def square(share, water=(10.0, 10.0)):
    """A tide with 1.2 m/s towards the hole for a share of it and away for the rest, turned in 0.01 s."""
    turn, end = share * TIDE, TIDE
    time = np.array([0.0, turn, turn + 0.01, end])
    return time, np.array([1.2, 1.2, -1.2, -1.2]), np.array([water[0], water[0], water[1], water[1]])


@pytest.mark.parametrize("name", ["explicit", "time-scale", "saturating", "model-curve"])
@pytest.mark.parametrize("share", [0.25, 0.6])
def test_the_mean_over_the_flow_of_a_square_tide_counts_its_hours_of_flow(bed_row, law_of, name, share):
    # One velocity as long as it flows: mean, peak and integral are the same, and so is the time.
    time, velocity, _ = square(share)
    found = effective_duration(bed_row(time, velocity), whole(1), law_of(name, DELTA), None)
    for rule in ("integral", "flow-mean", "peak-held", "mean-held"):
        assert found.total_h(rule) == pytest.approx(12.42 * share, rel=1e-5), rule
    assert found.flow_h == pytest.approx([12.42 * share], rel=1e-6)
    if law_of(name, DELTA).is_power:
        # The mean of E^q over the whole tide is that share of it, for the whole tide: share^(1 / 0.4) of its hours.
        assert found.total_h("cycle-mean") == pytest.approx(12.42 * share**2.5, rel=1e-5)


def test_a_model_curve_is_scaled_by_the_mean_depth_over_all_the_time_that_is_counted(bed_row, law_of):
    # 8 m of water while it flows, 12 m while it does not: 10 m over the whole tide, 8 m over the flow.
    law = law_of("model-curve", DELTA)
    time, velocity, water = square(0.5, (8.0, 12.0))
    bed = bed_row(time, velocity, depth=water)
    excess = ALPHA * 1.2 - CRITICAL
    strength = 8.0 * (330.0 * 64.0 * DELTA**1.7 / excess**4.3) ** -0.4
    times, depths = law.curve

    def depth(mean_strength, scale, hours):
        over_t1 = np.log(mean_strength / scale) / 0.4 + np.log(hours)
        assert times[0] < over_t1 < times[-1]
        return scale * np.exp(np.interp(over_t1, times, depths))

    assert depth_of(bed, whole(1), law, "cycle-mean") == pytest.approx(depth(0.5 * strength, 10.0, 12.42), rel=1e-5)
    assert depth_of(bed, whole(1), law, "flow-mean") == pytest.approx(depth(strength, 8.0, 6.21), rel=1e-5)


@pytest.mark.parametrize("form", ["half-alpha", "turbulence"])
@pytest.mark.parametrize("ratio", [1.05, 1.3, 2.0, 4.0])
def test_half_the_step_changes_no_duration_near_the_jump_of_a_saturating_law(bed_row, law_of, form, ratio):
    # Peak h_e over h0, from (0.5 alpha u - u_c) / u_c or ((1 + 3 r0) u - u_c) / u_c with r0 = 0.2.
    law = law_of("saturating", DELTA, equilibrium=form)
    peak = (1.0 + ratio) * CRITICAL / (0.5 * ALPHA if form == "half-alpha" else 1.6)
    hours = []
    for step in (60.0, 30.0):
        time = np.arange(0.0, 4.0 * TIDE + 0.5 * step, step)
        found = effective_duration(bed_row(time, peak * np.sin(2.0 * np.pi * time / TIDE)), whole(4), law, None)
        hours.append([found.total_h(rule) for rule in ("integral", "flow-mean", "cycle-mean")])
    assert hours[1] == pytest.approx(hours[0], rel=5e-3)
