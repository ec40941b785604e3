"""Scores of a predicted level and the guess from the sea alone, against cases built by hand."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError, FitError
from tidescour.gap.held_back import fit_lagged_sea, lagged_sea_level, level_score

PERIOD_S = 12.4206012 * 3600.0
TIME_S = np.arange(0.0, 10.0 * PERIOD_S, 600.0)


def tide(time_s, amplitude=1.5, lag_s=0.0, mean=0.0):
    angle = 2.0 * np.pi * (time_s - lag_s) / PERIOD_S
    return mean + amplitude * np.cos(angle) + 0.1 * amplitude * np.cos(2.0 * angle + 0.4)


def test_the_same_level_has_no_error():
    found = level_score(TIME_S, tide(TIME_S), tide(TIME_S))
    assert (found.rms_m, found.bias_m, found.range_error_m) == (0.0, 0.0, 0.0)
    assert found.phase_error_s == pytest.approx(0.0, abs=1e-6)
    assert found.count == TIME_S.size


def test_a_raised_stretched_late_prediction_has_these_errors():
    late_s = 420.0
    found = level_score(TIME_S, tide(TIME_S, 1.05 * 1.5, late_s, mean=0.07), tide(TIME_S))
    # A whole number of tides: the mean difference is the shift, the range is stretched by 5 %.
    assert found.bias_m == pytest.approx(0.07, abs=1e-4)
    assert found.phase_error_s == pytest.approx(late_s, abs=0.5)
    dense = tide(np.linspace(0.0, PERIOD_S, 20001))
    assert found.range_error_m == pytest.approx(0.05 * np.ptp(dense), rel=0.01)
    # rms^2 = shift^2 + half the squared amplitude of what is left of either wave.
    waves = [
        abs(1.05 * 1.5 * part * np.exp(-1j * order * 2.0 * np.pi * late_s / PERIOD_S) - 1.5 * part)
        for order, part in ((1, 1.0), (2, 0.1))
    ]
    assert found.rms_m == pytest.approx(np.sqrt(0.07**2 + 0.5 * sum(wave**2 for wave in waves)), rel=1e-3)


@settings(max_examples=20, deadline=None)
@given(st.floats(0.1, 10.0))
def test_levels_times_a_factor_have_errors_times_that_factor(factor):
    one = level_score(TIME_S, tide(TIME_S, lag_s=600.0, mean=0.1), tide(TIME_S))
    more = level_score(TIME_S, factor * tide(TIME_S, lag_s=600.0, mean=0.1), factor * tide(TIME_S))
    assert more.rms_m == pytest.approx(factor * one.rms_m, rel=1e-9)
    assert more.range_error_m == pytest.approx(factor * one.range_error_m, rel=1e-6, abs=1e-9)
    assert more.phase_error_s == pytest.approx(one.phase_error_s, rel=1e-6)


def test_instants_without_a_level_are_left_out_and_broken_tides_have_no_range():
    record = tide(TIME_S)
    record[5:30] = np.nan
    found = level_score(TIME_S, tide(TIME_S, mean=0.2), record)
    assert found.count == TIME_S.size - 25
    assert found.rms_m == pytest.approx(0.2)
    assert found.range_error_m == pytest.approx(0.0, abs=1e-12)
    short = level_score(TIME_S[:20], tide(TIME_S[:20]), tide(TIME_S[:20]))
    assert np.isnan([short.range_error_m, short.phase_error_s]).all()


def test_steps_of_two_lengths_make_whole_tides_all_the_same():
    # Six hours at 15 min and six at 30 min in turn: counted by the commoner step, every tide would seem broken.
    spells = (21600.0 * number + np.arange(0.0, 21600.0, 900.0 * (1 + number % 2)) for number in range(32))
    time_s = np.concatenate(list(spells))
    found = level_score(time_s, 1.2 * tide(time_s), tide(time_s))
    assert found.range_error_m == pytest.approx(0.2 * np.ptp(tide(TIME_S)), rel=0.02)


def test_nothing_to_compare_is_refused():
    with pytest.raises(DomainError, match="share less than two instants"):
        level_score(TIME_S, np.full(TIME_S.shape, np.nan), tide(TIME_S))
    with pytest.raises(DomainError, match="must have one length"):
        level_score(TIME_S, tide(TIME_S)[1:], tide(TIME_S))


@settings(max_examples=15, deadline=None)
@given(st.floats(-3000.0, 17000.0), st.floats(0.2, 1.2), st.floats(-1.0, 1.0))
def test_the_guess_from_the_sea_finds_level_factor_and_lag(lag_s, factor, level):
    basin = level + factor * tide(TIME_S, lag_s=lag_s)
    found = fit_lagged_sea(
        TIME_S - PERIOD_S, tide(TIME_S - PERIOD_S), TIME_S[: TIME_S.size // 2], basin[: TIME_S.size // 2]
    )
    assert found.lag_s == pytest.approx(lag_s, abs=2.0)
    assert found.factor == pytest.approx(factor, rel=1e-3)
    assert found.level_m == pytest.approx(level, abs=1e-3)
    assert found.rms_m < 1e-3


def test_noise_left_by_the_guess_is_its_rms():
    noise = 0.05 * np.random.default_rng(1).standard_normal(TIME_S.size)
    basin = 0.3 + 0.7 * tide(TIME_S, lag_s=3600.0) + noise
    found = fit_lagged_sea(TIME_S, tide(TIME_S), TIME_S, basin)
    assert found.rms_m == pytest.approx(0.05, rel=0.1)
    predicted = lagged_sea_level(found, TIME_S, tide(TIME_S), TIME_S)
    known = np.isfinite(predicted)
    # An hour of sea is missing at the start; with a lag a little over it, one instant more.
    assert np.count_nonzero(~known) in (6, 7)
    assert np.sqrt(np.mean((predicted - basin)[known] ** 2)) == pytest.approx(found.rms_m, rel=1e-9)


def test_holes_of_the_sea_stay_holes_in_the_guess():
    sea = tide(TIME_S)
    sea[300:320] = np.nan
    found = fit_lagged_sea(TIME_S, sea, TIME_S, 0.8 * tide(TIME_S, lag_s=1800.0))
    assert found.factor == pytest.approx(0.8, rel=1e-3)
    predicted = lagged_sea_level(found, TIME_S, sea, TIME_S)
    assert np.isnan(predicted[304:322]).all()
    assert np.isfinite(predicted[324:]).all()


def test_records_that_do_not_meet_are_refused():
    with pytest.raises(FitError, match="share less than 20 levels"):
        fit_lagged_sea(TIME_S, tide(TIME_S), TIME_S + 30.0 * PERIOD_S, tide(TIME_S))
