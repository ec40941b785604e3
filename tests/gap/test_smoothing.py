"""Smoothing of levels: what it keeps, what it takes away, and where it stops."""

import numpy as np
import pytest

from tidescour.gap.smoothing import smoothed_level

TIMES = np.arange(0.0, 4.0 * 86400.0, 600.0)
SPEED = 2.0 * np.pi / 44712.0


def test_a_parabola_in_time_stays_what_it_is():
    level = 0.3 + 2e-5 * TIMES - 1e-10 * TIMES**2
    np.testing.assert_allclose(smoothed_level(TIMES, level), level, atol=1e-9)


def test_a_tide_loses_less_than_a_ten_thousandth():
    tide = np.sin(SPEED * TIMES)
    assert np.abs(smoothed_level(TIMES, tide) - tide)[6:-6].max() < 1e-4


def test_white_noise_is_lessened_as_the_weights_of_seven_points_say():
    # Weights of a parabola through seven points: (-2, 3, 6, 7, 6, 3, -2) / 21, sum of squares 1/3 (Savitzky and Golay
    # 1964, table I).
    noise = np.random.default_rng(5).standard_normal(40000)
    times = 600.0 * np.arange(noise.size)
    assert smoothed_level(times, noise).std() == pytest.approx(np.sqrt(7.0 / 21.0), rel=0.01)


def test_a_hole_is_not_smoothed_over():
    level = np.where(TIMES < 2.0 * 86400.0, 0.0, 1.0)
    known = (TIMES < 1.98 * 86400.0) | (TIMES > 2.02 * 86400.0)
    np.testing.assert_allclose(smoothed_level(TIMES[known], level[known]), level[known], atol=1e-12)


@pytest.mark.parametrize("step", [1800.0, 3600.0])
def test_coarse_and_short_records_stay_as_they_are(step):
    times = np.arange(0.0, 86400.0, step)
    level = np.random.default_rng(3).standard_normal(times.size)
    np.testing.assert_array_equal(smoothed_level(times, level), level)
    np.testing.assert_array_equal(smoothed_level(TIMES[:4], level[:4]), level[:4])
