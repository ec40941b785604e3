"""Values that stand for "nothing measured"."""

import numpy as np
import pytest

from tidescour.gauge.missing import unlisted_missing_values

TIDE = np.round(1.5 * np.sin(np.arange(500) * 0.1), 3)


def with_values(values, at):
    series = TIDE.copy()
    series[list(at)] = values
    return series


@pytest.mark.parametrize("sentinel", [-9999.0, 9999.0, 99.99, -99.9999, 999.0])
def test_a_number_of_nines_far_outside_is_a_candidate(sentinel):
    assert unlisted_missing_values(with_values(sentinel, [50]), nines_only=False) == [sentinel]


@pytest.mark.parametrize("sentinel", [-32768.0, 1e6, -100.0])
def test_a_repeated_number_far_outside_is_a_candidate(sentinel):
    series = with_values(sentinel, [50, 51, 200])
    assert unlisted_missing_values(series, nines_only=False) == [sentinel]
    assert unlisted_missing_values(series, nines_only=True) == []


def test_two_candidates_are_both_found():
    series = with_values([-9999.0, 9999.0], [50, 60])
    assert sorted(unlisted_missing_values(series, nines_only=False)) == [-9999.0, 9999.0]


def test_a_single_spike_is_no_candidate():
    assert unlisted_missing_values(with_values(57.3, [50]), nines_only=False) == []


def test_a_tide_has_no_candidate():
    assert unlisted_missing_values(TIDE, nines_only=False) == []


def test_a_flood_that_stays_at_its_peak_is_no_candidate():
    quiet = np.round(0.02 * np.sin(np.arange(1000) * 0.1), 3)
    flood = np.concatenate([np.linspace(0.0, 1.0, 20), np.full(6, 1.0), np.linspace(1.0, 0.0, 20)])
    series = np.concatenate([quiet, flood, quiet])
    assert unlisted_missing_values(series, nines_only=False) == []


def test_candidates_scale_with_the_unit():
    series = with_values(-100.0, [50, 51, 200])
    assert unlisted_missing_values(1000.0 * series, nines_only=False) == [-100000.0]


def test_missing_values_are_passed_over():
    series = with_values(-9999.0, [50])
    series[100:200] = np.nan
    assert unlisted_missing_values(series, nines_only=False) == [-9999.0]
    assert unlisted_missing_values(np.full(5, np.nan), nines_only=False) == []
