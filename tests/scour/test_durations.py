from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.special import gamma as gamma_function

from tidescour.errors import DomainError
from tidescour.scour.chain import chain_place
from tidescour.scour.curves import depth_after, equilibrium_ratio
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS
from tidescour.scour.records import CycleSet, RowDurations

HOUR = 3600.0
TIDE = 12.42 * HOUR
HALF_H = 6.21
RULES = ("integral", "flow-mean", "cycle-mean")
EXPLICIT = LAWS["explicit"].function(1.65)


def tides(count, step=60.0):
    """Time and phase of whole tides, each beginning with the flood."""
    time = np.arange(0.0, count * TIDE + step / 2.0, step)
    return time, 2.0 * np.pi * time / TIDE


def whole(count):
    edges = TIDE * np.arange(count + 1)
    return CycleSet(start_s=edges[:-1], end_s=edges[1:])


def one_layer(*durations):
    return tuple(RowDurations(layers=(duration,)) for duration in durations)


def total(duration, rule="integral"):
    return float(np.sum(duration.hours(rule)))


def own_depth(duration, law, hours):
    """Depth from a flat bed by the law itself, from what is printed of a row."""
    velocity, critical = duration.reference_velocity_m_s, duration.critical_velocity_m_s
    attack = duration.alpha * velocity
    ratio = float(equilibrium_ratio(law.equilibrium, attack, velocity, duration.turbulence, critical))
    return float(depth_after(law, max(attack - critical, 0.0), duration.reference_depth_m, hours, ratio))


def test_a_sine_tide_gives_the_table(bed_row, published):
    time, phase = tides(4, step=27.0)
    for row in published("breusers_1967_sine_tide.csv"):
        bed = bed_row(time, 1.5 * np.sin(phase), critical=max(row["k"], 1e-12) * 2.5 * 1.5)
        found = effective_duration(bed, whole(4), EXPLICIT, None)
        share = found.integral_h / HALF_H
        np.testing.assert_allclose(share, row["effective_share"], atol=1e-5)
        # Hours of one rule over those of the other, to the power 0.4, are the ratio of depths.
        np.testing.assert_allclose((found.flow_mean_h / found.integral_h) ** 0.4, row["half_ratio"], atol=6e-5)
        np.testing.assert_allclose((found.cycle_mean_h / found.integral_h) ** 0.4, row["full_ratio"], atol=6e-5)
        np.testing.assert_allclose((found.flow_mean_h / HALF_H) ** 0.4, row["mean_share"], atol=6e-5)
        np.testing.assert_allclose((found.peak_held_h / found.integral_h) ** 0.4, row["peak_held_ratio"], atol=6e-4)
        np.testing.assert_allclose((found.mean_held_h / found.integral_h) ** 0.4, row["mean_held_ratio"], atol=6e-4)
        np.testing.assert_allclose(found.peak_held_h, found.flow_h, rtol=1e-5)
        np.testing.assert_allclose(found.flow_h, HALF_H, rtol=1e-9)
        assert found.mean_velocity_m_s == pytest.approx(1.5 * 2.0 / np.pi, rel=1e-5)


def test_another_law_has_its_own_shares_of_a_sine(bed_row, law_of):
    # Time scale with exponent 0.4 (p = 4.3, q = 1.72) at k = 0.2: duration 0.32326 of the half tide, depth with its
    # mean 0.7365 of that with the tide chained. The exponent of the explicit law would give 0.32492 and 0.7381.
    time, phase = tides(2, step=27.0)
    found = effective_duration(
        bed_row(time, 1.5 * np.sin(phase), critical=0.2 * 2.5 * 1.5), whole(2), law_of("time-scale"), None
    )
    np.testing.assert_allclose(found.integral_h / HALF_H, 0.32326, atol=1e-5)
    np.testing.assert_allclose((found.flow_mean_h / found.integral_h) ** 0.4, 0.7365, atol=6e-5)


@pytest.mark.parametrize("name", LAWS)
def test_without_a_threshold_the_share_of_a_sine_is_closed(bed_row, law_of, name):
    # Also where the equilibrium is so deep, without a threshold, that it cannot be told from none.
    time, phase = tides(2, step=54.0)
    law = law_of(name, 1.65)
    p = law.integral_exponent
    wanted = gamma_function((p + 1.0) / 2.0) / (np.sqrt(np.pi) * gamma_function(p / 2.0 + 1.0))
    found = effective_duration(bed_row(time, 1.5 * np.sin(phase), critical=1e-12), whole(2), law, None)
    np.testing.assert_allclose(found.integral_h, wanted * HALF_H, rtol=1e-5)


def test_the_reference_changes_the_hours_and_not_the_depth(bed_row):
    # Per flood 2.12046 h at the peak of 1.5 m/s, 16.0384 h at 1.0 m/s; 1.1476427 m after one: worked out by separate
    # code by quadrature.
    time, phase = tides(1, step=6.0)
    bed = bed_row(time, 1.5 * np.sin(phase))
    by_peak = effective_duration(bed, whole(1), EXPLICIT, None)
    by_one = effective_duration(bed, whole(1), EXPLICIT, 1.0)
    assert total(by_peak) == pytest.approx(2.12046, rel=3e-6)
    assert total(by_one) == pytest.approx(16.0384, rel=4e-6)
    for row in (by_peak, by_one):
        assert own_depth(row, EXPLICIT, total(row)) == pytest.approx(1.1476427, rel=1e-6)
        assert own_depth(row, EXPLICIT, 1000.0 * total(row)) == pytest.approx(18.18891, rel=1e-6)


def test_exponents_of_two_laws_would_give_two_depths_and_cannot_be_mixed(bed_row, law_of):
    # The exponent 4.3 of the time scale under the integral, and 1.7 of the explicit law outside, would give 18.151 m at
    # a reference of 1.5 m/s and 18.325 m at 1.0 m/s after 1000 floods, by quadrature of E^4.3. Nothing here takes an
    # exponent of its own: hours and depth follow from one record of a law, whose p is q / gamma and has no place to be
    # written, so that every law gives one depth at both.
    time, phase = tides(1, step=6.0)
    bed = bed_row(time, 1.5 * np.sin(phase))
    excess = np.clip(2.5 * bed.velocity_m_s - 0.45, 0.0, None)
    mixed = []
    for reference in (1.5, 1.0):
        unit = 2.5 * reference - 0.45
        hours = np.trapezoid((excess / unit) ** 4.3, time / HOUR)
        mixed.append(float(depth_after(EXPLICIT, unit, 10.0, 1000.0 * hours)))
    assert mixed == pytest.approx([18.151, 18.325], abs=6e-4)
    for name in ("explicit", "time-scale"):
        law = law_of(name, 1.65)
        depths = [
            own_depth(row, law, 1000.0 * total(row))
            for row in (effective_duration(bed, whole(1), law, reference) for reference in (1.5, 1.0))
        ]
        assert depths[0] == pytest.approx(depths[1], rel=1e-9)
        with pytest.raises(TypeError, match="integral_exponent"):
            replace(law, integral_exponent=4.3)


def test_the_depth_of_the_water_stays_inside_the_integral(bed_row):
    # h0 = 10 + 1.5 sin(w t + 0.6): 1.17264 m against 1.1476427 m at 10 m, and 1.16519 m at the mean depth of the flood,
    # 10 + 3 cos(0.6) / pi, worked out by separate code. Own reference depth: 10 m, the mean over the whole tide.
    time, phase = tides(1, step=6.0)
    bed = bed_row(time, 1.5 * np.sin(phase), depth=10.0 + 1.5 * np.sin(phase + 0.6), reference_depth=10.0)
    found = effective_duration(bed, whole(1), EXPLICIT, None)
    assert own_depth(found, EXPLICIT, total(found)) == pytest.approx(1.17264, abs=1e-5)
    outside = bed_row(time, 1.5 * np.sin(phase), depth=10.0 + 3.0 * np.cos(0.6) / np.pi)
    held = effective_duration(outside, whole(1), EXPLICIT, None)
    assert own_depth(held, EXPLICIT, total(held)) == pytest.approx(1.16519, abs=1e-5)


def test_steady_flow_counts_hour_by_hour(bed_row):
    time = 60.0 * np.arange(601)
    cycles = CycleSet(start_s=[0.0, 18000.0], end_s=[18000.0, 36000.0])
    found = effective_duration(bed_row(time, np.full(601, 1.2)), cycles, EXPLICIT, None)
    for rule in RULES:
        np.testing.assert_allclose(found.hours(rule), [5.0, 5.0], rtol=1e-12)
    assert found.peak_velocity_m_s == found.reference_velocity_m_s == 1.2
    assert found.reference_excess_m_s == pytest.approx(2.55)


@pytest.mark.parametrize("sign", [1.0, -1.0])
@pytest.mark.parametrize("residue", [1e-16, 0.0, -1e-16])
def test_a_zero_on_a_step_counts_no_step_too_many(bed_row, sign, residue):
    # Flow in one of two hours, the sample between them zero but for rounding.
    time = np.array([0.0, HOUR, 2.0 * HOUR]) + 1.8e9
    bed = bed_row(time, np.array([-sign, residue, sign]))
    found = effective_duration(bed, CycleSet(start_s=time[:1], end_s=time[2:]), EXPLICIT, None)
    assert total(found, "flow-mean") / total(found, "cycle-mean") == pytest.approx(2.0**1.5, rel=1e-9)


def test_zeros_and_ends_of_cycles_are_placed_between_steps(bed_row):
    # u = t - 1.5 h in m/s by steps of an hour, no threshold to speak of, mean of E^1.7 over the hours with u > 0:
    # (2.5^2.7 / 2.7) / 2.5 in the limit of small steps; here only the time counted is looked at, 2.5 h of 4.
    time = HOUR * np.arange(5)
    bed = bed_row(time, np.array([-1.5, -0.5, 0.5, 1.5, 2.5]), critical=1e-9, alpha=1.0)
    cycles = CycleSet(start_s=[0.0], end_s=[4.0 * HOUR])
    found = effective_duration(bed, cycles, EXPLICIT, None)
    ratio = total(found, "flow-mean") / total(found, "cycle-mean")
    # [M / 2.5]^2.5 2.5 over [M / 4]^2.5 4.
    assert ratio == pytest.approx((4.0 / 2.5) ** 1.5, rel=1e-9)
    halves = effective_duration(bed, CycleSet(start_s=[0.0, 8000.0], end_s=[8000.0, 14400.0]), EXPLICIT, None)
    # 8000 s lie in the flow: 2600 s of it before, 6400 s after; both parts positive, both counted.
    assert np.all(halves.integral_h > 0.0)
    flow_h = (halves.flow_mean_h / halves.cycle_mean_h) ** (-1.0 / 1.5) * np.array([8000.0, 6400.0]) / HOUR
    np.testing.assert_allclose(flow_h, np.array([2600.0, 6400.0]) / HOUR, rtol=1e-9)


def test_velocity_under_the_threshold_counts_for_nothing(bed_row):
    time, phase = tides(3)
    for velocity in (0.1 * np.sin(phase), np.zeros(time.size), -np.abs(np.sin(phase))):
        found = effective_duration(bed_row(time, velocity), whole(3), EXPLICIT, None)
        assert found.reference_excess_m_s == found.growth_rate == 0.0
        assert [total(found, rule) for rule in RULES] == [0.0, 0.0, 0.0]
        (step,) = chain_place(one_layer(found), EXPLICIT, 1.5, "integral")
        assert (step.stage_depth_m, step.end_depth_m) == (0.0, 1.5)
        assert np.isnan(step.equivalent_start_h)


def test_a_row_without_flow_has_no_reference(bed_row):
    time, phase = tides(1)
    bed = bed_row(time, -np.abs(np.sin(phase)), alpha=np.nan, critical=np.nan)
    found = effective_duration(bed, whole(1), EXPLICIT, 1.5)
    assert np.isnan([found.reference_velocity_m_s, found.alpha]).all()
    assert found.peak_velocity_m_s == total(found) == 0.0


def test_a_given_reference_under_the_threshold_is_refused_with_what_to_write(bed_row):
    time, phase = tides(1)
    message = r"'sill', opening 'main gap', basin side: scour.reference_velocity_m_s = 0.18 .* more than 0.180, or"
    with pytest.raises(DomainError, match=message):
        effective_duration(bed_row(time, np.sin(phase)), whole(1), EXPLICIT, 0.18)


def test_where_only_a_high_alpha_passes_the_threshold_it_becomes_the_reference(bed_row):
    time, phase = tides(2)
    alpha = np.linspace(1.0, 4.0, time.size)
    velocity = 0.2 * np.sin(phase)
    found = effective_duration(bed_row(time, velocity, alpha=alpha, critical=0.52), whole(2), EXPLICIT, None)
    worst = np.argmax(alpha * velocity)
    assert found.alpha == alpha[worst] > 2.5
    assert found.reference_velocity_m_s == velocity[worst]
    assert found.integral_h[0] == 0.0 < found.integral_h[1] < HALF_H
    assert found.peak_velocity_m_s == pytest.approx(0.2, rel=1e-5)


def test_holes_count_for_nothing(bed_row):
    time, phase = tides(2)
    covered = (time <= TIDE) | (time >= 1.25 * TIDE)
    velocity = np.where(covered, 1.5 * np.sin(phase), 99.0)
    depth = np.where(covered, 10.0, -5.0)
    bed = bed_row(time, velocity, depth=depth, covered=covered, reference_depth=10.0)
    edge = time[covered][time[covered] >= 1.25 * TIDE][0]
    cycles = CycleSet(start_s=[0.0, edge], end_s=[time[time <= TIDE][-1], time[-1]])
    found = effective_duration(bed, cycles, EXPLICIT, None)
    assert found.peak_velocity_m_s == pytest.approx(1.5, rel=1e-4)
    assert found.integral_h[0] == pytest.approx(2.12046, rel=1e-4)
    assert found.integral_h[1] == pytest.approx(2.12046 / 2.0, rel=1e-2)


def test_a_higher_excess_counts_by_the_power_of_the_law(bed_row):
    time, phase = tides(2)
    for law in (EXPLICIT, LAWS["time-scale"].function(1.65)):
        one, three = (
            effective_duration(bed_row(time, k * np.sin(phase), critical=k * 0.45), whole(2), law, reference)
            for k, reference in ((1.0, 0.8), (3.0, (3.0 * 0.45 + (0.8 * 2.5 - 0.45)) / 2.5))
        )
        assert one.reference_excess_m_s == pytest.approx(three.reference_excess_m_s)
        for rule in RULES:
            assert total(three, rule) / total(one, rule) == pytest.approx(3.0**law.integral_exponent, rel=1e-9)


def test_time_stretched_stretches_the_hours(bed_row):
    time, phase = tides(2)
    one = effective_duration(bed_row(time, np.sin(phase)), whole(2), EXPLICIT, None)
    edges = 3.0 * TIDE * np.arange(3)
    slow = effective_duration(
        bed_row(3.0 * time, np.sin(phase)), CycleSet(start_s=edges[:-1], end_s=edges[1:]), EXPLICIT, None
    )
    for rule in RULES:
        np.testing.assert_allclose(slow.hours(rule), 3.0 * one.hours(rule), rtol=1e-9)


two_tides = st.tuples(
    st.floats(0.3, 2.0), st.floats(0.0, 1.0), st.floats(0.0, 6.28), st.floats(0.2, 0.8), st.floats(0.0, 3.0),
    st.sampled_from(("explicit", "time-scale")),
)  # fmt: skip
bent_laws = st.sampled_from([("saturating", "half-alpha"), ("saturating", "turbulence"), ("model-curve", "half-alpha")])


def mixed_row(bed_row, sample, part=slice(None)):
    """A mixed tide over a moving depth; `part` takes a piece of the stage with its own reference depth."""
    peak, ratio, lag, critical, swing, _ = sample
    time, phase = tides(6, step=120.0)
    velocity = peak * (np.sin(phase) + ratio * np.sin(0.5 * phase + lag))
    depth = 8.0 + swing * np.sin(phase + lag)
    return bed_row(time[part], velocity[part], depth=depth[part], critical=critical)


def cuts(*hours):
    edges = HOUR * np.array(hours)
    return CycleSet(start_s=edges[:-1], end_s=edges[1:])


@given(two_tides)
@settings(max_examples=40, deadline=None)
def test_means_never_exceed_the_integral(bed_row, sample):
    law = LAWS[sample[-1]].function(1.6)
    found = effective_duration(mixed_row(bed_row, sample), whole(6), law, None)
    slack = 1e-9 * found.integral_h
    assert np.all(found.cycle_mean_h <= found.flow_mean_h + slack)
    assert np.all(found.flow_mean_h <= found.integral_h + slack)
    assert np.all(found.cycle_mean_h >= 0.0)


@given(two_tides, bent_laws)
@settings(max_examples=40, deadline=None)
def test_depths_with_means_never_exceed_the_chained_tide_for_bent_laws_either(bed_row, law_of, sample, bent):
    # For a power law this is the inequality of power means. For the others no proof is known; no tide was found that
    # breaks it, and the ratios keep well under 1.
    law = law_of(bent[0], equilibrium=bent[1])
    row = one_layer(effective_duration(mixed_row(bed_row, sample), whole(6), law, None))
    integral, flow_mean, cycle_mean = (chain_place(row, law, 0.0, rule)[0].end_depth_m for rule in RULES)
    assert 0.0 <= cycle_mean <= flow_mean <= integral


@given(two_tides, bent_laws, st.floats(0.3, 3.0))
@settings(max_examples=40, deadline=None)
def test_depth_of_a_bent_law_does_not_depend_on_the_reference(bed_row, law_of, sample, bent, more):
    law = law_of(bent[0], equilibrium=bent[1])
    bed = mixed_row(bed_row, sample)
    own = effective_duration(bed, whole(6), law, None)
    assume(own.growth_rate > 0.0)
    # Twice the peak is never refused; less may be.
    given_one = effective_duration(bed, whole(6), law, (2.0 + more) * float(np.max(bed.velocity_m_s)))
    for rule in RULES:
        steps = [chain_place(one_layer(row), law, 0.0, rule)[0] for row in (own, given_one)]
        assert steps[1].end_depth_m == pytest.approx(steps[0].end_depth_m, rel=1e-9)
        for row, step in zip((own, given_one), steps, strict=True):
            assert own_depth(row, law, total(row, rule)) == pytest.approx(step.stage_depth_m, rel=1e-9)


@given(two_tides, st.floats(1.0, 4.0))
@settings(max_examples=40, deadline=None)
def test_depth_does_not_depend_on_the_reference(bed_row, sample, reference):
    law = LAWS[sample[-1]].function(1.6)
    bed = mixed_row(bed_row, sample)
    own, given_one = (effective_duration(bed, whole(6), law, r) for r in (None, reference))
    for rule in RULES:
        steps = [chain_place(one_layer(row), law, 0.0, rule)[0] for row in (own, given_one)]
        assert steps[1].end_depth_m == pytest.approx(steps[0].end_depth_m, rel=1e-9)
        for row, step in zip((own, given_one), steps, strict=True):
            assert own_depth(row, law, total(row, rule)) == pytest.approx(step.stage_depth_m, rel=1e-9)


@given(two_tides, st.integers(100, 2000))
@settings(max_examples=40, deadline=None)
def test_a_stage_cut_in_two_digs_as_deep(bed_row, sample, cut):
    law = LAWS[sample[-1]].function(1.6)
    end_h = tides(6, step=120.0)[0][-1] / HOUR
    one = effective_duration(mixed_row(bed_row, sample), cuts(0.0, 30.0, end_h), law, None)
    cut_h = cut * 120.0 / HOUR
    before = effective_duration(mixed_row(bed_row, sample, slice(0, cut + 1)), cuts(0.0, cut_h), law, None)
    after = effective_duration(mixed_row(bed_row, sample, slice(cut, None)), cuts(cut_h, end_h), law, None)
    whole_depth = chain_place(one_layer(one), law, 0.3, "integral")[-1].end_depth_m
    parts = chain_place(one_layer(before, after), law, 0.3, "integral")[-1].end_depth_m
    assert parts == pytest.approx(whole_depth, rel=1e-6)


@pytest.mark.parametrize("name", LAWS)
def test_hours_add_up_however_the_cycles_are_cut(bed_row, law_of, name):
    time, phase = tides(6)
    bed = bed_row(time, 1.5 * np.sin(phase))
    end_h = time[-1] / HOUR
    law = law_of(name, 1.65)
    fine = effective_duration(bed, cuts(0.0, 1.23, 9.87, 33.3, end_h), law, None)
    coarse = effective_duration(bed, cuts(0.0, end_h), law, None)
    assert total(fine) == pytest.approx(total(coarse), rel=1e-7)


def test_a_saturating_tide_is_chained_step_by_step(bed_row, law_of):
    # Own loop: equivalent time from step to step on h_e (1 - exp(ln(1 - h0 / h_e) (t / t1)^0.4)), or the form for a
    # small h_e; velocity in the middle of a step.
    for form in ("half-alpha", "turbulence"):
        time, phase = tides(2, step=30.0)
        bed = bed_row(time, 1.2 * np.sin(phase), depth=10.0)
        found = effective_duration(bed, whole(2), law_of("saturating", 1.65, equilibrium=form), None)
        attack_share = 1.25 if form == "half-alpha" else 1.6
        depth = 0.0
        for velocity in 0.5 * (bed.velocity_m_s[1:] + bed.velocity_m_s[:-1]):
            equilibrium = 10.0 * (attack_share * velocity - 0.45) / 0.45
            excess = 2.5 * velocity - 0.45
            if equilibrium <= depth or excess <= 0.0:
                continue
            scale_h = 330.0 * 100.0 * 1.65**1.7 / excess**4.3
            bend = -np.log1p(-10.0 / equilibrium) if equilibrium > 10.0 else 10.0 / equilibrium
            start = scale_h * (-np.log1p(-depth / equilibrium) / bend) ** 2.5
            depth = -equilibrium * np.expm1(-bend * ((start + 30.0 / HOUR) / scale_h) ** 0.4)
        law = law_of("saturating", 1.65, equilibrium=form)
        assert own_depth(found, law, total(found)) == pytest.approx(depth, rel=3e-3)


def test_a_given_reference_that_is_not_deep_enough_is_refused_naming_the_row(bed_row, law_of):
    time, phase = tides(4)
    law = law_of("saturating", 1.65)
    bed = bed_row(time, 1.5 * np.sin(phase))
    # 0.5 x 2.5 u - 0.45 is 0.05 at 0.4 m/s: an equilibrium of 0.05 / 0.45 x 10 = 1.11 m.
    message = (
        r"stage 'sill', opening 'main gap', basin side: scour.reference_velocity_m_s = 0.4 has an equilibrium depth of "
        r"1\.11 m, but the tide digs \d\.\d\d m from a flat bed: write a higher one, or leave the key out"
    )
    with pytest.raises(DomainError, match=message):
        effective_duration(bed, whole(4), law, 0.4)
    # The same reference serves a law without an equilibrium.
    assert effective_duration(bed, whole(4), law_of("time-scale", 1.65), 0.4).reference_velocity_m_s == 0.4


def test_an_own_reference_that_is_not_deep_enough_is_replaced_by_the_deepest(bed_row, law_of):
    # Alpha of the mean crest is far under the alpha that digs: the row's peak with it has hardly an equilibrium.
    time, phase = tides(4)
    alpha = np.where(phase < 2.0 * np.pi, 1.0, 4.0)
    bed = bed_row(time, np.abs(np.sin(phase)), alpha=alpha, alpha_ref=1.0)
    found = effective_duration(bed, whole(4), law_of("saturating", 1.65), None)
    assert found.alpha == 4.0
    assert found.scale_m == pytest.approx(10.0 * (0.5 * 4.0 - 0.45) / 0.45, rel=1e-4)
    assert np.isfinite(found.integral_h).all()


@pytest.mark.parametrize("velocity", [0.2, 0.3, 0.36])
@pytest.mark.parametrize("reference", [None, 0.3, 0.36, 1.0])
def test_a_moving_bed_without_equilibrium_depth_digs_nothing(bed_row, law_of, velocity, reference):
    # u_c / alpha is 0.18 and twice that 0.36 m/s: between them grains move, and h_e = (0.5 alpha u - u_c) / u_c <= 0.
    time, phase = tides(2)
    law = law_of("saturating")
    found = effective_duration(bed_row(time, velocity * np.sin(phase)), whole(2), law, reference)
    for rule in ("integral", "flow-mean", "cycle-mean", "peak-held", "mean-held"):
        assert found.hours(rule).tolist() == [0.0, 0.0]
        assert chain_place(one_layer(found), law, 1.0, rule)[0].end_depth_m == 1.0


@pytest.mark.parametrize("more", [1e-9, 1e-5, 1e-3])
def test_a_hole_that_fills_its_curve_to_the_last_digit_has_hours(bed_row, law_of, more):
    # Steady flow little over the velocity at which h_e begins: h_e = 10 (0.5 x 2.5 u / 0.45 - 1), reached in minutes.
    time, _ = tides(3)
    law = law_of("saturating")
    found = effective_duration(bed_row(time, np.full(time.size, 0.36 * (1.0 + more))), whole(3), law, None)
    for rule in ("integral", "flow-mean", "cycle-mean", "peak-held"):
        assert 0.0 < total(found, rule) <= 3.0 * 12.42 * (1.0 + 1e-9)
        assert chain_place(one_layer(found), law, 0.0, rule)[0].end_depth_m == pytest.approx(10.0 * more, rel=1e-5)


def test_an_own_reference_that_hardly_passes_the_threshold_is_told(bed_row):
    # Steady 1 m/s for a tide: alpha from 2 to 3 digs, while that of the mean crest, 2.5, hardly passes the threshold.
    time, _ = tides(1)
    alpha = np.linspace(2.0, 3.0, time.size)
    weak = bed_row(time, np.ones_like(time), alpha=alpha, alpha_ref=2.5, critical=2.49)
    (finding,) = effective_duration(weak, whole(1), EXPLICIT, None).findings
    assert (finding.severity, finding.code) == ("note", "weak-reference")
    assert "in 12 h" in finding.message
    assert not effective_duration(weak, whole(1), EXPLICIT, 1.2).findings
    assert not effective_duration(bed_row(time, np.ones_like(time)), whole(1), EXPLICIT, None).findings


@given(two_tides, st.sampled_from(["half-alpha", "turbulence"]), st.integers(1, 5))
@settings(max_examples=40, deadline=None)
def test_a_saturating_stage_cut_in_two_digs_a_little_deeper_at_most(bed_row, law_of, sample, form, tides_before):
    # Hours of a stage are counted from a flat bed on one curve, also where the hole is there already. A power law does
    # not feel that; a saturating one digs up to a few per cent deeper where a stage is cut, never less.
    law = law_of("saturating", equilibrium=form)
    step, cut = 72.0, 621 * tides_before
    time, phase = tides(6, step=step)
    velocity = sample[0] * (np.sin(phase) + sample[1] * np.sin(0.5 * phase + sample[2]))

    def row(part):
        edges = np.arange(time[part][0], time[part][-1] + 1.0, TIDE)
        bed = bed_row(time[part], velocity[part], depth=8.0, critical=sample[3])
        return effective_duration(bed, CycleSet(start_s=edges[:-1], end_s=edges[1:]), law, None)

    whole_depth = chain_place(one_layer(row(slice(None))), law, 0.0, "integral")[-1].end_depth_m
    parts = chain_place(one_layer(row(slice(0, cut + 1)), row(slice(cut, None))), law, 0.0, "integral")
    assert whole_depth * (1.0 - 1e-6) <= parts[-1].end_depth_m <= 1.03 * whole_depth
