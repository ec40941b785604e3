"""Flags and the checks on one record."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError
from tidescour.gauge.checks import CHECKS, check_record
from tidescour.gauge.flags import rolled_up
from tidescour.gauge.records import FLAGS, GaugeRecord
from tidescour.gauge.spikes import spike_flags
from tidescour.gauge.stuck import slack_time, stuck_flags

M2_1_S = 2.0 * np.pi / (12.4206012 * 3600.0)
STEP_S = 600.0
TIME_S = STEP_S * np.arange(144 * 20)
TIDE_M = 1.2 * np.sin(M2_1_S * TIME_S)
HOUR_S = 3600.0


def record(level_m, side="sea", flag=None, time_s=TIME_S):
    flag = np.where(np.isnan(level_m), 9, 2) if flag is None else flag
    return GaugeRecord(side=side, time_s=time_s, level_m=level_m, flag=flag, step_s=STEP_S, files=())


def codes(found):
    return [finding.code for finding in found.findings]


@pytest.mark.parametrize(
    ("first", "second", "worst"),
    [(2, 2, 2), (2, 1, 1), (1, 3, 3), (3, 4, 4), (4, 9, 9), (2, 3, 3), (2, 9, 9), (1, 1, 1)],
)
def test_the_worse_flag_wins_and_not_evaluated_hides_nothing(first, second, worst):
    one, two = np.array([first], dtype=np.int8), np.array([second], dtype=np.int8)
    assert rolled_up(one, two).tolist() == [worst]
    assert rolled_up(two, one).tolist() == [worst]


@given(st.lists(st.tuples(*[st.sampled_from(FLAGS)] * 3), min_size=1, max_size=20))
@settings(max_examples=30, deadline=None)
def test_rolling_up_does_not_depend_on_the_order(flags):
    one, two, three = np.array(flags, dtype=np.int8).T
    np.testing.assert_array_equal(rolled_up(rolled_up(one, two), three), rolled_up(one, rolled_up(two, three)))
    np.testing.assert_array_equal(rolled_up(one, one), one)


def test_unknown_flags_and_other_shapes_are_refused():
    with pytest.raises(DomainError, match="1, 2, 3, 4 or 9"):
        rolled_up(np.array([0], dtype=np.int8), np.array([1], dtype=np.int8))
    with pytest.raises(DomainError, match="cannot be rolled up"):
        rolled_up(np.array([1, 1], dtype=np.int8), np.array([1], dtype=np.int8))


@pytest.mark.parametrize("amplitude_m", [0.05, 0.25, 1.0, 3.0])
def test_slack_time_is_the_time_within_3_cm_of_high_water(amplitude_m):
    # Closed form: half the slack time after high water the tide has fallen by 0.03 m.
    half_s = 0.5 * slack_time(amplitude_m)
    assert amplitude_m * (1.0 - np.cos(M2_1_S * half_s)) == pytest.approx(0.03, rel=1e-9)


def test_slack_time_falls_with_the_root_of_the_amplitude():
    # 2 arccos(1 - x) tends to 2 sqrt(2 x) for small x, with an error of x / 12.
    assert slack_time(40.0) / slack_time(10.0) == pytest.approx(0.5, rel=3e-4)


def test_slack_time_of_next_to_no_tide_is_the_whole_period():
    np.testing.assert_allclose(slack_time(np.array([0.0, 0.01, 0.015])), 12.4206012 * 3600.0)


@pytest.mark.parametrize("amplitude_m", [-0.1, np.nan])
def test_slack_time_of_no_amplitude_is_refused(amplitude_m):
    with pytest.raises(DomainError, match="must not be negative"):
        slack_time(amplitude_m)


@pytest.mark.parametrize("length", [1, 2, 3])
def test_spikes_of_up_to_three_samples_are_flagged(length):
    residual_m = np.zeros(TIME_S.size)
    residual_m[100 : 100 + length] = 0.15
    residual_m[200 : 200 + length] = -0.25
    flag = spike_flags(TIME_S, residual_m, residual_m, HOUR_S).flag
    assert np.flatnonzero(flag == 3).tolist() == list(range(100, 100 + length))
    assert np.flatnonzero(flag == 4).tolist() == list(range(200, 200 + length))


@pytest.mark.parametrize(("hours", "step_h"), [(3.0, 1.0 / 6.0), (4.0, 1.0), (8.0, 1.0)])
def test_a_surge_of_hours_is_no_spike(hours, step_h):
    at_h = step_h * np.arange(1000)
    surge_m = 1.5 * np.exp(-0.5 * ((at_h - 50.0) / hours) ** 2)
    assert set(spike_flags(at_h * HOUR_S, surge_m, surge_m, 3.0 * HOUR_S).flag.tolist()) == {1}


def test_a_step_that_stays_is_no_spike():
    residual_m = np.where(TIME_S[500] < TIME_S, 0.8, 0.0)
    assert set(spike_flags(TIME_S, residual_m, residual_m, HOUR_S).flag.tolist()) == {1}


@pytest.mark.parametrize("every", [1, 2, 3, 6])
def test_the_sharp_turn_of_a_gated_basin_is_no_spike(every):
    falling_and_rising = np.abs((TIME_S / 22357.0) % 2.0 - 1.0)
    saw_m = 0.4 * 22357.0 / HOUR_S * falling_and_rising  # 0.4 m an hour, down and up
    assert set(spike_flags(TIME_S[::every], saw_m[::every], saw_m[::every], 3.0 * HOUR_S).flag.tolist()) == {1}


def test_spikes_beside_a_gap_are_judged_by_their_own_piece():
    time_s = np.where(np.arange(TIME_S.size) < 100, TIME_S, TIME_S + 1e6)
    residual_m = np.where(np.arange(TIME_S.size) < 100, 0.0, 2.0)
    residual_m[[99, 100]] += 0.5
    flag = spike_flags(time_s, residual_m, residual_m, HOUR_S).flag
    assert np.flatnonzero(flag != 1).tolist() == [99, 100]


def test_the_threshold_of_spikes_scales_with_the_noise():
    noise_m = np.random.default_rng(1).normal(0.0, 0.1, TIME_S.size)
    noise_m[100] = 3.0
    once, twice = (spike_flags(TIME_S, k * noise_m, k * noise_m, HOUR_S) for k in (1.0, 2.0))
    assert twice.threshold_m == pytest.approx(2.0 * once.threshold_m, rel=1e-12)
    np.testing.assert_array_equal(once.flag, twice.flag)
    assert once.flag[100] == 4


def test_spikes_want_finite_residuals():
    with pytest.raises(DomainError, match="finite levels and residuals"):
        spike_flags(TIME_S[:3], np.zeros(3), np.array([0.0, np.nan, 0.0]), HOUR_S)
    with pytest.raises(DomainError, match="finite levels and residuals"):
        spike_flags(TIME_S[:3], np.array([0.0, np.nan, 0.0]), np.zeros(3), HOUR_S)


def test_a_gate_that_the_prediction_does_not_know_makes_no_spike():
    # Rounded from the inside of a tide gate (22 June 2021, tests/data/README.md) and a fit of eleven constituents to
    # it: the gate opens, the level falls without a break, the residual has a corner of 0.2 m. A quiet day before.
    quiet_s = STEP_S * np.arange(144)
    time_s = np.concatenate([quiet_s, 1e6 + 60.0 * np.cumsum([0, 45, 15, 15, 45, 15, 30, 30, 30])])
    level_m = np.concatenate([0.0 * quiet_s, [1.30, 1.32, 1.33, 1.34, 1.36, 1.19, 0.80, 0.43, 0.20]])
    residual_m = np.concatenate([0.0 * quiet_s, [-0.11, -0.02, 0.02, 0.07, 0.28, 0.20, -0.01, -0.20, -0.25]])
    spikes = spike_flags(time_s, level_m, residual_m, HOUR_S)
    assert spikes.threshold_m == 0.10
    assert set(spikes.flag.tolist()) == {1}
    # The same residual under a level that leaves and returns: 0.26 m over the median of 0.02 m, over twice 0.10 m.
    level_m[144:] = [1.30, 1.32, 1.33, 1.34, 1.60, 1.60, 1.34, 1.33, 1.32]
    assert spike_flags(time_s, level_m, residual_m, HOUR_S).flag[148] == 4


@pytest.mark.parametrize("at", range(20, 28))
def test_an_hourly_spike_is_found_at_every_phase_of_the_tide(at):
    time_s, tide_m = TIME_S[::6], TIDE_M[::6]
    for height_m in (0.5, -0.5):
        level_m = tide_m.copy()
        level_m[at] += height_m
        flag = spike_flags(time_s, level_m, level_m - tide_m, 3.0 * HOUR_S).flag
        assert np.flatnonzero(flag == 4).tolist() == [at]


@pytest.mark.parametrize("size", [0, 1, 2])
def test_few_samples_have_no_spike(size):
    assert spike_flags(TIME_S[:size], np.zeros(size), np.arange(float(size)), HOUR_S).flag.tolist() == [1] * size


@pytest.mark.parametrize("amplitude_m", [0.05, 0.3, 1.2, 4.0])
@pytest.mark.parametrize("step_s", [60.0, 600.0, 3600.0])
def test_slack_water_to_the_millimetre_is_not_stuck(amplitude_m, step_s):
    time_s = np.arange(0.0, 20.0 * 86400.0, step_s)
    level_m = np.round(amplitude_m * np.sin(M2_1_S * time_s + 0.4), 3)
    assert set(stuck_flags(time_s, level_m, 3.0 * HOUR_S, may_fail=True).flag.tolist()) == {1}


def stuck_from(hour, hours):
    level_m = TIDE_M.copy()
    run = (hour * HOUR_S <= TIME_S) & ((hour + hours) * HOUR_S >= TIME_S)
    level_m[run] = level_m[np.argmax(run)]
    return level_m, run


def test_a_stuck_sensor_is_suspect_and_from_twice_the_threshold_failed():
    # 1.2 m of tide: 1.5 times 0.89 h of slack is 1.33 h.
    for hours, sea, basin in ((1.2, 1, 1), (2.0, 3, 3), (5.0, 4, 3), (100.0, 4, 3)):
        level_m, run = stuck_from(100.0, hours)
        for may_fail, expected in ((True, sea), (False, basin)):
            flag = stuck_flags(TIME_S, level_m, HOUR_S, may_fail=may_fail).flag
            assert set(flag[run].tolist()) == {expected}
            assert set(flag[~run].tolist()) == {1}


def test_a_dying_tide_is_measured_by_itself():
    # A basin that dies away to centimetres, read to the centimetre: flat for hours around slack, but not stuck.
    level_m = np.round(1.2 * np.exp(-TIME_S / (3.0 * 86400.0)) * np.sin(M2_1_S * TIME_S), 2)
    early = TIME_S < 10.0 * 86400.0
    assert set(stuck_flags(TIME_S, level_m, HOUR_S, may_fail=False).flag[early].tolist()) == {1}


def test_the_still_hours_after_a_closure_are_not_stuck():
    # From 100 h on the gap is shut: level for 5 h, then a tide of 2 cm. Measured by the 1.2 m before, 5 h would be
    # stuck; a tide of 2 cm stays within 3 cm for 8.3 h, and 1.5 times that is 12.5 h.
    level_m = np.where(TIME_S < 100.0 * HOUR_S, TIDE_M, 0.02 * np.sin(M2_1_S * (TIME_S - 105.0 * HOUR_S)))
    level_m[(TIME_S >= 100.0 * HOUR_S) & (TIME_S <= 105.0 * HOUR_S)] = 0.0
    assert set(stuck_flags(TIME_S, level_m, HOUR_S, may_fail=True).flag.tolist()) == {1}


def test_equal_levels_on_both_sides_of_a_gap_are_not_stuck():
    time_s = np.concatenate([TIME_S[:100], TIME_S[400:500]])
    level_m = np.concatenate([TIDE_M[:100], TIDE_M[400:500]])
    level_m[98:102] = 0.5
    assert set(stuck_flags(time_s, level_m, HOUR_S, may_fail=True).flag.tolist()) == {1}


def test_stuck_thresholds_scale_with_time():
    # The same curve twice as slow, a stretch twice as long: flagged at both, since the test knows the tide by its
    # range alone.
    level_m, run = stuck_from(100.0, 5.0)
    flag = stuck_flags(2.0 * TIME_S, level_m, 2.0 * HOUR_S, may_fail=True).flag
    assert set(flag[run].tolist()) == {4}


def test_stuck_values_want_finite_levels():
    with pytest.raises(DomainError, match="finite levels"):
        stuck_flags(TIME_S[:3], np.array([0.0, np.nan, 0.0]), HOUR_S, may_fail=True)


def test_a_sound_record_passes_throughout_without_a_finding():
    checked = check_record(record(TIDE_M + 0.3), TIDE_M)
    assert set(checked.flag.tolist()) == {1}
    assert checked.findings == ()


def test_without_a_prediction_spikes_are_not_evaluated_but_stuck_values_are():
    level_m, run = stuck_from(100.0, 2.0)
    level_m[10] += 3.0
    checked = check_record(record(level_m), None)
    assert codes(checked) == ["check-not-evaluated", "stuck"]
    assert checked.flag[10] == 1
    assert set(checked.flag[run].tolist()) == {3}


def test_checks_flag_and_report_but_never_alter():
    level_m, run = stuck_from(100.0, 5.0)
    level_m[[10, 40]] += [0.15, 3.0]
    level_m[60] = np.nan
    level_m[70] = 50.0
    flag = np.where(np.isnan(level_m), 9, 2)
    flag[70] = 4
    read = record(level_m, flag=flag)
    checked = check_record(read, TIDE_M)
    np.testing.assert_array_equal(checked.level_m, level_m)
    assert checked.flag[[10, 40, 60, 70]].tolist() == [3, 4, 9, 4]
    assert set(checked.flag[run].tolist()) == {4}
    assert codes(checked) == ["spike", "stuck"]
    spike, stuck = (finding.message for finding in checked.findings)
    assert spike.startswith("1 sample suspect and 1 failed of 2880, from 1970-01-01T01:40:00Z, 1970-01-01T06:40:00Z:")
    assert "over 0.100 m" in spike
    assert f"0 samples suspect and {run.sum()} failed" in stuck


def test_checking_twice_flags_the_same():
    level_m, _ = stuck_from(100.0, 2.0)
    once = check_record(record(level_m), TIDE_M)
    np.testing.assert_array_equal(check_record(once, TIDE_M).flag, once.flag)


def test_stuck_values_of_the_basin_are_suspect_at_most():
    level_m, run = stuck_from(100.0, 50.0)
    checked = check_record(record(level_m, side="basin"), None)
    assert set(checked.flag[run].tolist()) == {3}


@pytest.mark.parametrize("predicted_m", [TIDE_M[:-1], np.where(TIME_S == 0.0, np.nan, TIDE_M)])
def test_a_prediction_that_does_not_fit_is_refused(predicted_m):
    with pytest.raises(DomainError, match="one finite level a stamp"):
        check_record(record(TIDE_M), predicted_m)


def test_every_check_has_its_name_and_flags_each_sample():
    for name, entry in CHECKS.items():
        assert entry.name == name
        assert entry.source
        outcome = entry.function(record(TIDE_M), TIDE_M)
        assert outcome.flag.shape == TIME_S.shape
        assert set(outcome.flag.tolist()) == {1}
