"""The noise model against textbook processes: covariance, variance, correlation time, holes."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.signal import lfilter

from tidescour.gap.calibration_noise import (
    Noise,
    correlation_time_s,
    even_grid,
    fit_noise,
    predictors,
    tidal_excess,
    whitening,
)

STEP_S = 600.0
M2_S = 12.4206012 * 3600.0


def grid_of(count, missing=()):
    known = np.ones(count, dtype=bool)
    known[list(missing)] = False
    return even_grid(np.arange(count) * STEP_S, known)


def first_order(part, deviation):
    """AR(1) with the given correlation from step to step: its one reflection coefficient is the negative of that."""
    return Noise(reflection=[-part], innovation_variance=deviation**2 * (1.0 - part**2))


@settings(max_examples=25, deadline=None)
@given(st.floats(-0.9, 0.98), st.floats(0.01, 3.0), st.sets(st.integers(1, 38), max_size=25))
def test_whitened_rows_give_the_inverse_of_the_covariance_also_across_holes(part, deviation, missing):
    # AR(1): covariance deviation^2 part^|i - j| between whatever samples there are.
    grid = grid_of(40, missing)
    covariance = deviation**2 * part ** np.abs(grid.cell[:, None] - grid.cell[None, :])
    rows = whitening(first_order(part, deviation), grid)(np.eye(grid.cell.size))
    np.testing.assert_allclose(rows.T @ rows @ covariance, np.eye(grid.cell.size), atol=1e-8)


def test_a_single_row_is_whitened_as_a_column_is():
    grid = grid_of(30, {4, 5, 20})
    values = np.cos(np.arange(27.0))
    whiten = whitening(first_order(0.7, 1.0), grid)
    np.testing.assert_allclose(whiten(values), whiten(values[:, None])[:, 0])


def test_second_order_process_has_its_textbook_variance_and_filter():
    # Box and Jenkins, Time Series Analysis, section 3.2.4 (from memory): x_t = a x_(t-1) + b x_(t-2) + e_t has
    # variance (1 - b) s2 / ((1 + b) ((1 - b)^2 - a^2)), first correlation a / (1 - b), second partial correlation b.
    a, b, innovation = 1.2, -0.5, 0.3
    noise = Noise(reflection=[-a / (1.0 - b), -b], innovation_variance=innovation)
    assert noise.variance == pytest.approx((1 - b) * innovation / ((1 + b) * ((1 - b) ** 2 - a**2)), rel=1e-12)
    np.testing.assert_allclose(predictors(noise.reflection)[-1], [1.0, -a, -b], rtol=1e-12)


def test_correlation_time_is_the_sum_of_the_autocorrelation():
    # Sum of part^|k| over all lags is (1 + part) / (1 - part).
    part = 0.9
    noise = first_order(part, 2.0)
    assert correlation_time_s(noise, STEP_S) == pytest.approx(0.5 * STEP_S * (1 + part) / (1 - part), rel=1e-12)
    assert correlation_time_s(Noise(reflection=[], innovation_variance=1.0), STEP_S) == 0.5 * STEP_S


@pytest.mark.parametrize("missing", [(), range(0, 20000, 17)])
def test_a_first_order_process_is_found_again(missing):
    part, count = 0.8, 20000
    samples = lfilter([1.0], [1.0, -part], np.random.default_rng(3).standard_normal(count))
    grid = grid_of(count, missing)
    noise = fit_noise(grid, samples[grid.sample], 0)
    # Standard error of the correlation from step to step is sqrt((1 - part^2) / n), n less where samples are missing.
    correlation = -noise.reflection[0]
    assert abs(correlation - part) < 4.0 * np.sqrt((1 - part**2) / count)
    assert noise.innovation_variance == pytest.approx(1.0, abs=4.0 * np.sqrt(2.0 / count))


def test_noise_times_three_has_nine_times_the_variance_and_the_same_memory():
    samples = lfilter([1.0], [1.0, -0.6], np.random.default_rng(5).standard_normal(2000))
    grid = grid_of(2000)
    once, thrice = fit_noise(grid, samples, 2), fit_noise(grid, 3.0 * samples, 2)
    np.testing.assert_allclose(once.reflection, thrice.reflection, rtol=1e-9)
    assert thrice.innovation_variance == pytest.approx(9.0 * once.innovation_variance, rel=1e-9)


def test_no_residual_at_all_is_still_a_noise():
    noise = fit_noise(grid_of(300), np.zeros(300), 1)
    assert noise.innovation_variance > 0.0
    assert noise.reflection.size == 0


def test_fine_records_are_thinned_and_holes_stay_holes():
    time_s = np.arange(0.0, 12 * 3600.0, 60.0)
    known = (time_s < 3600.0) | (time_s > 2 * 3600.0 + 300.0)
    grid = even_grid(time_s, known)
    assert grid.step_s == 600.0
    np.testing.assert_allclose(time_s[grid.sample], grid.cell * 600.0, atol=300.0)
    assert set(np.diff(grid.cell)) == {1, 7}
    assert known[grid.sample].all()


def test_a_cell_takes_the_nearest_sample_only():
    time_s = np.array([0.0, 600.0, 1000.0, 1210.0, 1800.0, 2400.0])
    grid = even_grid(time_s, np.ones(6, dtype=bool))
    np.testing.assert_array_equal(grid.cell, [0, 1, 2, 3, 4])
    np.testing.assert_array_equal(grid.sample, [0, 1, 3, 4, 5])


def test_a_tide_left_in_the_residual_is_measured():
    # White noise of unit variance and a wave of amplitude a: mean square on r directions is 1 + n a^2 / (2 r).
    count, amplitude = 4000, 0.4
    grid = grid_of(count)
    time_s = np.arange(count) * STEP_S
    white = np.random.default_rng(8).standard_normal(count)
    whiten = whitening(Noise(reflection=[], innovation_variance=1.0), grid)
    change = np.ones((count, 1))
    assert tidal_excess(whiten, time_s, change, white) == (1.0, 0)
    wave = amplitude * np.cos(2.0 * 2.0 * np.pi * time_s / M2_S + 0.3)
    factor, directions = tidal_excess(whiten, time_s, change, white + wave)
    assert directions == 6
    assert factor == pytest.approx(1.0 + count * amplitude**2 / (2.0 * 6), rel=0.2)


def test_what_a_parameter_takes_up_is_no_tidal_excess():
    count = 4000
    time_s = np.arange(count) * STEP_S
    waves = [np.cos(2.0 * np.pi * time_s / M2_S), np.sin(2.0 * np.pi * time_s / M2_S)]
    whiten = whitening(Noise(reflection=[], innovation_variance=1.0), grid_of(count))
    assert tidal_excess(whiten, time_s, np.stack(waves, axis=1), 5.0 * waves[0]) == (1.0, 0)


def test_a_noise_that_grows_without_end_is_refused():
    with pytest.raises(ValueError, match="within -1 and 1"):
        Noise(reflection=[-1.0], innovation_variance=1.0)
