"""Which reference the hours of a row get, hours by asked rules alone, and what is counted of them at one place."""

from dataclasses import replace

import numpy as np
import pytest

from tidescour.scour.chain import chain_place
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS
from tidescour.scour.length import length_curve
from tidescour.scour.records import RULES, CycleSet, RowDurations

HOUR = 3600.0
TIDE = 12.42 * HOUR
CRITICAL, WATER_M = 0.45, 10.0


def whole(count):
    edges = TIDE * np.arange(count + 1)
    return CycleSet(start_s=edges[:-1], end_s=edges[1:])


def steady(count, alpha, velocity=1.0):
    """Steady flow for some tides, with an alpha for each."""
    time = np.arange(0.0, count * TIDE + 27.0, 54.0)
    at = np.minimum((time / TIDE).astype(int), count - 1)
    return time, np.full(time.size, velocity), np.array(alpha)[at]


def limit_m(alpha):
    """Equilibrium depth at 1 m/s by half alpha."""
    return WATER_M * (0.5 * alpha - CRITICAL) / CRITICAL


def grown_m(alpha, hours, constant=330.0):
    """Depth in steady flow of 1 m/s on the published curve, h_e over h0."""
    t1_h = constant * WATER_M**2 * 1.65**1.7 / (alpha - CRITICAL) ** 4.3
    return -limit_m(alpha) * np.expm1(np.log1p(-WATER_M / limit_m(alpha)) * (hours / t1_h) ** 0.4)


def test_a_reference_that_is_deep_enough_is_kept_however_full_its_curve(bed_row, law_of):
    # Alpha of the mean crest brings 1.9 times the water depth at 1 m/s; a fortnight at it digs over half of that, and
    # the last tide with a larger alpha does not dig beyond it.
    alpha_ref = 2.61
    law = law_of("saturating", 1.65, time_constant=5.0)
    time, velocity, alpha = steady(27, [alpha_ref] * 26 + [2.8])
    bed = bed_row(time, velocity, alpha=alpha, alpha_ref=alpha_ref)
    found = effective_duration(bed, whole(27), law, None)
    assert (found.alpha, found.reference_velocity_m_s) == (alpha_ref, 1.0)
    assert found.scale_m == pytest.approx(limit_m(alpha_ref), rel=1e-12)
    depth_m = chain_place([RowDurations(layers=(found,))], law, 0.0, "integral")[0].end_depth_m
    assert 0.5 * found.scale_m < depth_m < found.scale_m
    assert depth_m > grown_m(alpha_ref, 26 * 12.42, constant=5.0)
    # Until alpha grows the flow is that of the reference: its hours are the clock's.
    assert found.integral_h[:25] == pytest.approx([12.42] * 25, rel=1e-6)


@pytest.mark.parametrize("too_deep", [1.05, 4.0])
def test_a_rule_that_is_asked_alone_finds_a_reference_deep_enough_for_it(bed_row, law_of, too_deep):
    # The mean crest's alpha has an equilibrium too small by this factor; the larger one digs deeper by each rule.
    time, velocity, alpha = steady(4, [1.0, 1.0, 4.0, 4.0])
    depth_m = grown_m(4.0, 2.0 * 12.42)
    alpha_ref = 2.0 * CRITICAL * (1.0 + depth_m / too_deep / WATER_M)
    assert depth_m == pytest.approx(too_deep * limit_m(alpha_ref))
    bed = bed_row(time, velocity, alpha=alpha, alpha_ref=alpha_ref)
    law = law_of("saturating", 1.65)
    for rule in ("integral", "flow-mean", "cycle-mean"):
        found = effective_duration(bed, whole(4), law, None, (rule,))
        assert (found.alpha, found.scale_m) == (4.0, pytest.approx(limit_m(4.0), rel=1e-12))
        end_m = chain_place([RowDurations(layers=(found,))], law, 0.0, rule)[0].end_depth_m
        # The two small tides leave a hole of a metre that counts for minutes on the larger curve.
        assert end_m == pytest.approx(depth_m, rel=2e-2)


def test_the_deepest_reference_is_sought_outside_holes_of_the_record(bed_row, law_of):
    # By turbulence: r0 is largest in the second tide, which is a hole of the record.
    time, velocity, alpha = steady(4, [1.5, 4.5, 4.0, 1.5])
    covered = (time < TIDE) | (time >= 2.0 * TIDE)
    edges = TIDE * np.array([0.0, 1.0, 2.0, 3.0, 4.0])
    cycles = CycleSet(start_s=edges[[0, 2, 3]], end_s=edges[[1, 3, 4]])
    turbulence = np.array([0.1, 0.6, 0.5, 0.1])[np.minimum((time / TIDE).astype(int), 3)]
    plain = bed_row(time, 0.4 * velocity, alpha=alpha, alpha_ref=1.5, covered=covered)
    bed = replace(plain, turbulence=turbulence, turbulence_ref=0.1)
    law = law_of("saturating", 1.65, equilibrium="turbulence", time_constant=1.0)
    found = effective_duration(bed, cycles, law, None)
    assert (found.alpha, found.turbulence) == (4.0, 0.5)
    # (1 + 3 x 0.5) 0.4 = 1 m/s.
    assert found.scale_m == pytest.approx(WATER_M * (1.0 - CRITICAL) / CRITICAL, rel=1e-12)
    assert np.isfinite(found.integral_h).all()


@pytest.mark.parametrize("name", LAWS)
def test_hours_of_rules_that_are_not_asked_are_no_numbers_and_the_others_the_same(bed_row, law_of, name):
    time = np.arange(0.0, 3.0 * TIDE + 27.0, 54.0)
    bed, law = bed_row(time, 1.4 * np.sin(2.0 * np.pi * time / TIDE)), law_of(name, 1.65)
    every = effective_duration(bed, whole(3), law, None)
    for asked in ((rule,) for rule in RULES):
        found = effective_duration(bed, whole(3), law, None, asked)
        for rule in RULES:
            expected = every.hours(rule) if rule in asked else np.full(3, np.nan)
            np.testing.assert_array_equal(found.hours(rule), expected)
        assert found.growth_rate == every.growth_rate
        np.testing.assert_array_equal(found.flow_h, every.flow_h)
    still = effective_duration(bed_row(time, np.zeros_like(time)), whole(3), law, None, ("integral",))
    assert still.integral_h.tolist() == [0.0] * 3
    assert np.isnan(still.cycle_mean_h).all()


def test_shares_of_a_saturating_law_are_those_of_its_power_part(bed_row, law_of):
    # t_eff E^(q / gamma) h0^(r / gamma) with 1.72, 0.2 and 0.4: E^4.3 h0^0.5; steady flow counts by the clock. The rate
    # of the bent curve would shift it by the bends of 1.2 and of 4 times the water depth.
    law = law_of("saturating", 1.65)
    flows = ((2.0, 8.0, 2), (4.5, 14.0, 3))
    rows = []
    for alpha, depth, count in flows:
        time, velocity, alphas = steady(count, [alpha] * count)
        bed = bed_row(time, velocity, depth=depth, alpha=alphas)
        rows.append(RowDurations(layers=(effective_duration(bed, whole(count), law, None),)))
    parts = np.array([count * 12.42 * (alpha - CRITICAL) ** 4.3 * depth**0.5 for alpha, depth, count in flows])
    found = [step.share for step in chain_place(rows, law, 0.0, "integral")]
    assert found == pytest.approx((parts / np.sum(parts)).tolist(), rel=1e-5)


@pytest.mark.parametrize("name", ["explicit", "time-scale"])
def test_a_growth_factor_makes_a_hole_deeper_and_its_hours_no_more(place, duration_row, law_of, name):
    # 60 and 40 hours at one velocity, on the curve of that velocity.
    law = law_of(name, 1.65)
    rows = [duration_row(law, 1.2, hours, start=1e6 * hours) for hours in (40.0, 60.0)]
    one, two = (
        length_curve(
            place(growth_factor=factor), np.array([60.0, 90.0]), lambda _: rows, law, "integral", rows[0].layers[0]
        )
        for factor in (1.0, 2.0)
    )
    assert two.effective_duration_h == pytest.approx([100.0, 100.0], rel=1e-12)
    assert one.effective_duration_h == pytest.approx([100.0, 100.0], rel=1e-12)
    assert two.final_depth_m == pytest.approx((2.0 * one.final_depth_m).tolist(), rel=1e-12)
