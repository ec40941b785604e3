import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.scour.cycles import stage_cycles, turns_to_flood
from tidescour.units import M2_PERIOD_H

HOUR = 3600.0
TIDE = M2_PERIOD_H * HOUR


def minutes(hours):
    return 1.8e9 + 60.0 * np.arange(round(60 * hours) + 1)


def sine(time, amplitude=0.5, lag=0.0):
    return amplitude * np.sin(2.0 * np.pi * (time - time[0]) / TIDE - lag)


def cycles_of(flow):
    return stage_cycles(flow, flow.openings[0])


def assert_covers(cycles, start, end):
    assert cycles.start_s[0] == start
    assert cycles.end_s[-1] == end
    np.testing.assert_array_equal(cycles.start_s[1:], cycles.end_s[:-1])


def test_a_sine_tide_is_cut_at_its_upward_zeros(head_stage):
    time = minutes(60.0)
    # Upward zeros at the lag of a quarter, and every period after it.
    cycles = cycles_of(head_stage(time, sine(time, lag=np.pi / 2.0)))
    zeros = time[0] + TIDE * (0.25 + np.arange(5))
    np.testing.assert_allclose(cycles.start_s[1:] - time[0], zeros - time[0], atol=0.1)
    assert_covers(cycles, time[0], time[-1])
    assert not cycles.findings


def test_turns_do_not_depend_on_the_size_of_the_curve_or_the_start_of_the_clock():
    time = minutes(60.0)
    curve = sine(time, lag=1.0)
    turns = turns_to_flood(time, curve, 0.02)
    np.testing.assert_allclose(turns_to_flood(time, 3.0 * curve, 0.06), turns)
    np.testing.assert_allclose(turns_to_flood(time - 1000.0, curve, 0.02), turns - 1000.0)


def test_a_zero_is_placed_by_linear_interpolation():
    # -3 to 1 over an hour: 45 minutes after the first sample; a sample of 0 is its own zero.
    time = HOUR * np.arange(4)
    np.testing.assert_allclose(turns_to_flood(time, np.array([-3.0, 1.0, 2.0, 3.0]), 0.5), [0.75 * HOUR])
    np.testing.assert_allclose(turns_to_flood(time, np.array([-3.0, 0.0, 0.0, 3.0]), 0.5), [2.0 * HOUR])


def test_of_several_zeros_the_last_before_the_pass_counts():
    time = HOUR * np.arange(7)
    curve = np.array([-1.0, 0.1, -0.1, 0.1, -0.1, 1.0, 1.0])
    np.testing.assert_allclose(turns_to_flood(time, curve, 0.2), [(4.0 + 1.0 / 11.0) * HOUR])


@pytest.mark.parametrize(
    "curve",
    [
        [-0.2, 1.0, 1.0],  # never below the threshold
        [-1.0, 0.2, 0.1],  # never passes it
        [1.0, 0.5, -1.0],  # downward only
    ],
)
def test_what_stays_within_the_threshold_is_no_turn(curve):
    assert turns_to_flood(HOUR * np.arange(3), np.array(curve), 0.2).size == 0


def test_a_turn_within_six_hours_of_the_last_is_left_out():
    time = HOUR * np.arange(13)
    curve = np.array([-1.0, 1.0, -1.0, 1.0, 1.0, -1.0, 1.0, 1.0, 1.0, -1.0, 1.0, 1.0, 1.0])
    # Zeros at 0.5, 2.5, 5.5 and 9.5 h: the second and third follow the first within 6 h.
    np.testing.assert_allclose(turns_to_flood(time, curve, 0.2), np.array([0.5, 9.5]) * HOUR)


def test_a_curve_stays_armed_through_a_turn_that_came_too_early():
    time = HOUR * np.arange(10)
    curve = np.array([-1.0, 1.0, -1.0, 1.0, 1.0, 1.0, 1.0, -0.1, 1.0, 1.0])
    # The zero at 7.1 h counts: the curve was below -0.2 since the turn at 0.5 h.
    np.testing.assert_allclose(turns_to_flood(time, curve, 0.2) / HOUR, [0.5, 7.0 + 1.0 / 11.0])


def test_the_threshold_of_a_small_head_depends_on_where_it_comes_from(head_stage):
    # A head of 15 mm lies within the 2 cm of noise where it is measured; computed, it counts from 1/20 of it.
    time = minutes(60.0)
    head = sine(time, 0.015, lag=0.1)
    assert cycles_of(head_stage(time, head, measured=False)).start_s.size == 6
    assert [f.code for f in cycles_of(head_stage(time, head, measured=True)).findings] == ["no-turn"]


def test_a_given_series_makes_its_own_turns(head_stage):
    time = minutes(60.0)
    given_lag = head_stage(time, sine(time, lag=1.0), given=4000.0 * sine(time, lag=2.0))
    np.testing.assert_allclose(
        cycles_of(given_lag).start_s - time[0], cycles_of(head_stage(time, sine(time, lag=2.0))).start_s - time[0]
    )
    # 1/20 of the largest: ripples of 4 % do not count.
    ripples = 4000.0 * np.where(np.abs(sine(time, 1.0, 2.0)) < 0.06, 0.04 * np.cos(time / 100.0), sine(time, 1.0, 2.0))
    assert cycles_of(head_stage(time, sine(time), given=ripples)).start_s.size == 6


@given(st.integers(0, 10_000), st.floats(0.05, 1.0), st.floats(0.0, 6.28))
@settings(max_examples=40, deadline=None)
def test_a_centimetre_of_noise_around_slack_changes_no_count(head_stage, seed, amplitude, lag):
    # Whole tides from high head to high head, so that the ends of the record decide nothing.
    time = minutes(8.0 * M2_PERIOD_H)
    head = sine(time, amplitude, lag)
    if min(abs(head[0]), abs(head[-1])) < 0.04:
        return
    noise = np.random.default_rng(seed).uniform(-0.01, 0.01, time.size)
    still = cycles_of(head_stage(time, head, measured=True))
    noisy = cycles_of(head_stage(time, head + noise, measured=True))
    assert noisy.start_s.size == still.start_s.size


def test_a_hole_cuts_and_is_left_out(head_stage):
    time = minutes(60.0)
    covered = np.ones(time.size, dtype=bool)
    covered[1201:1500] = False
    cycles = cycles_of(head_stage(time, sine(time, lag=0.1), covered=covered))
    hole = (cycles.start_s[1:] - cycles.end_s[:-1]).nonzero()[0]
    assert hole.tolist() == [2]
    assert cycles.end_s[2] == time[1200]
    assert cycles.start_s[3] == time[1500]
    assert np.sum(cycles.end_s - cycles.start_s) == pytest.approx(time[-1] - time[0] - 300.0 * 60.0)


@pytest.mark.parametrize(("hours", "parts"), [(30.5, 3), (37.0, 3), (43.5, 4), (124.2, 10), (30.0, 1)])
def test_a_stretch_without_a_turn_is_cut_into_equal_parts(head_stage, hours, parts):
    # 30.5 / 3 = 10.17 is nearer to 12.42 than 30.5 / 2 = 15.25, and 43.5 / 4 = 10.88 than 43.5 / 3 = 14.5.
    time = minutes(hours)
    cycles = cycles_of(head_stage(time, np.full(time.size, 0.3)))
    np.testing.assert_allclose((cycles.end_s - cycles.start_s) / HOUR, [hours / parts] * parts)
    assert_covers(cycles, time[0], time[-1])
    assert [f.code for f in cycles.findings] == (["no-turn"] if hours > 30.0 else [])


def test_a_stretch_without_a_turn_is_told_with_its_hours_and_time(head_stage):
    time = minutes(100.0)
    head = np.where(time - time[0] < 60.0 * HOUR, sine(time, lag=0.1), 0.3)
    (finding,) = cycles_of(head_stage(time, head)).findings
    assert finding.severity == "warning"
    assert "1 stretch" in finding.message
    assert finding.where == "stage 'sill'"


def test_no_head_at_all_is_cut_by_time_alone(head_stage):
    time = minutes(49.68)
    cycles = cycles_of(head_stage(time, np.zeros(time.size)))
    assert cycles.start_s.size == 4
