"""The coefficient that parts of a record ask for, on models that are linear in it: one step finds it exactly."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.gap.calibration_records import Simulated
from tidescour.gap.drift import APART, drift_findings, weekly_coefficients

DAY_S = 86400.0
TIME_S = np.arange(0.0, 21.0 * DAY_S, 600.0)
SHAPE = 0.6 * np.sin(2.0 * np.pi * TIME_S / 44714.0) + 0.1 * np.cos(2.0 * np.pi * TIME_S / 86164.0)
WEEK = np.minimum(TIME_S // (TIME_S[-1] / 3.0), 2).astype(int)


def linear(shape):
    """Levels = coefficient x shape - offset: the second number of the parameters is the offset of the datum."""
    return lambda parameters: Simulated(level_m=parameters[0] * shape - parameters[1], discharge_m3_s=np.empty(0))


def asked(level_m, shape=SHAPE, time_s=TIME_S, parameters=(1.0, 0.0), place=0):
    return weekly_coefficients(time_s, level_m, linear(shape), np.array(parameters), place)


def test_each_week_gives_back_its_own_coefficient():
    truth = np.array([0.81, 1.03, 0.85])
    np.testing.assert_allclose(asked(truth[WEEK] * SHAPE), truth, rtol=1e-9)
    # Whatever the fit of the whole was: the model is linear.
    np.testing.assert_allclose(asked(truth[WEEK] * SHAPE, parameters=(0.9, 0.2)), truth, rtol=1e-9)


def test_a_week_of_high_water_levels_asks_for_nothing():
    # Weather lifts each week by another height: that is not the gap's.
    np.testing.assert_allclose(asked(SHAPE + np.array([0.1, -0.3, 0.2])[WEEK]), 1.0, rtol=1e-9)


def test_noise_gives_the_textbook_slope_of_each_week():
    # Least squares with an intercept: c = cov(shape, level) / var(shape).
    level = SHAPE + 0.05 * np.random.default_rng(5).standard_normal(TIME_S.size)
    weeks = [np.flatnonzero(np.isin(WEEK, week)) for week in range(3)]
    expected = [np.cov(SHAPE[week], level[week])[0, 1] / np.var(SHAPE[week], ddof=1) for week in weeks]
    np.testing.assert_allclose(asked(level), expected, rtol=1e-9)


@settings(max_examples=20, deadline=None)
@given(st.floats(0.01, 100.0))
def test_levels_times_a_factor_ask_for_a_coefficient_times_that_factor(factor):
    level = np.array([0.9, 1.0, 1.2])[WEEK] * SHAPE
    np.testing.assert_allclose(asked(factor * level), factor * asked(level), rtol=1e-6)


@pytest.mark.parametrize(("days", "parts"), [(3.0, 1), (5.9, 1), (6.1, 2), (10.0, 2), (11.0, 2), (14.0, 2), (25.0, 4)])
def test_parts_are_about_a_week_and_at_least_three_days(days, parts):
    time_s = np.arange(0.0, days * DAY_S, 600.0)
    shape = np.sin(2.0 * np.pi * time_s / 44714.0)
    assert asked(1.1 * shape, shape, time_s) == pytest.approx([1.1] * parts)


def test_a_week_without_levels_is_left_out():
    kept = WEEK != 1
    truth = np.array([0.9, 0.0, 1.1])[WEEK]
    found = asked((truth * SHAPE)[kept], SHAPE[kept], TIME_S[kept])
    np.testing.assert_allclose(found, [0.9, 1.1], rtol=1e-9)


def test_a_week_with_less_than_two_tides_of_levels_is_left_out():
    first = np.flatnonzero(WEEK == 1)[0]
    few = (WEEK != 1) | ((np.arange(TIME_S.size) >= first) & (np.arange(TIME_S.size) < first + 130))
    more = (WEEK != 1) | ((np.arange(TIME_S.size) >= first) & (np.arange(TIME_S.size) < first + 170))
    assert asked(SHAPE[few], SHAPE[few], TIME_S[few]).size == 2
    assert asked(SHAPE[more], SHAPE[more], TIME_S[more]).size == 3


def test_a_week_in_which_nothing_passes_is_left_out():
    shape = np.where(WEEK == 2, 0.0, SHAPE)
    assert asked(1.1 * shape, shape) == pytest.approx([1.1, 1.1])


def test_weeks_that_differ_are_listed_and_those_that_agree_are_not():
    assert drift_findings(np.array([1.0 - APART + 0.01, 1.0 + APART - 0.01]), 1.0) == ()
    (finding,) = drift_findings(np.array([0.81, 1.03, 0.85]), 0.88)
    assert (finding.severity, finding.code) == ("warning", "basin-drifts")
    assert "3 equal parts" in finding.message
    assert "0.81, 1.03, 0.85, all together for 0.88" in finding.message
    # Only the share counts: ten times as large is as far apart.
    assert len(drift_findings(10.0 * np.array([0.81, 1.03, 0.85]), 8.8)) == 1


@pytest.mark.parametrize("weekly", [[], [2.0]])
def test_less_than_two_parts_show_no_drift(weekly):
    assert drift_findings(np.array(weekly), 1.0) == ()


def test_parameters_are_not_written_to():
    parameters = np.array([1.0, 0.2])
    weekly_coefficients(TIME_S, SHAPE, linear(SHAPE), parameters, 0)
    assert parameters.tolist() == [1.0, 0.2]
