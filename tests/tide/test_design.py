"""Condition number of a fit against closed forms."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import FitError
from tidescour.tide.design import design_condition
from tidescour.tide.library import constituent_frequencies


def test_constituents_over_whole_beats_are_told_apart_completely():
    # Over a whole number of days S1 of 24 h, S2 of 12 h and S4 of 6 h are orthogonal. S1 here runs with the perigee of
    # the sun, 2e-6 degrees an hour off.
    time_s = 1.7e9 + np.arange(0.0, 30.0 * 86400.0, 3600.0)
    assert design_condition(time_s, ["S2", "S4", "S1"]).number == pytest.approx(1.0, abs=1e-3)


@pytest.mark.parametrize("days", [20.0, 30.0, 60.0])
def test_two_neighbours_have_the_closed_condition_number(days):
    # Two complex oscillations at a distance df over T correlate by r = sin(pi df T) / (pi df T); the condition number
    # of unit columns is sqrt((1 + r) / (1 - r)).
    low, high = constituent_frequencies(["S2", "K2"])
    correlation = np.sinc((high - low) * 24.0 * days)
    time_s = 1.7e9 + np.arange(0.0, days * 86400.0, 600.0)
    condition = design_condition(time_s, ["S2", "K2"])
    assert condition.number == pytest.approx(np.sqrt((1.0 + correlation) / (1.0 - correlation)), rel=0.03)
    assert set(condition.pair) == {"S2", "K2"}


def test_the_pair_that_is_hardest_to_tell_apart_is_named():
    time_s = 1.7e9 + np.arange(0.0, 40.0 * 86400.0, 3600.0)
    assert set(design_condition(time_s, ["M2", "K1", "P1", "O1", "M4"]).pair) == {"K1", "P1"}


def test_holes_make_a_fit_worse():
    time_s = 1.7e9 + np.arange(0.0, 60.0 * 86400.0, 3600.0)
    hole = (time_s > time_s[200]) & (time_s < time_s[-200])
    whole, holed = (design_condition(part, ["M2", "S2", "N2"]).number for part in (time_s, time_s[~hole]))
    assert holed > 1.5 * whole


def test_one_and_the_same_in_the_samples_has_no_bound():
    # At 12 h steps S2 and S4 are constants like the mean.
    time_s = 1.7e9 + np.arange(0.0, 60.0 * 86400.0, 43200.0)
    assert design_condition(time_s, ["M2", "S2", "S4"]).number > 1e6


@settings(max_examples=15, deadline=None)
@given(shift_s=st.floats(-1e9, 1e8), days=st.floats(15.0, 60.0))
def test_the_number_does_not_depend_on_the_date(shift_s, days):
    time_s = 1.7e9 + np.arange(0.0, days * 86400.0, 3600.0)
    here, there = (design_condition(each, ["M2", "S2", "O1"]).number for each in (time_s, time_s + shift_s))
    assert here >= 1.0
    assert there == pytest.approx(here, rel=1e-5)


def test_an_unknown_name_is_refused():
    with pytest.raises(FitError, match="no constituent is called"):
        design_condition(np.arange(100.0) * 3600.0, ["M2", "xyz"])
