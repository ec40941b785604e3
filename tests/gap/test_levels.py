"""Levels of a stage: splines between holes, bridges, and what is refused."""

import numpy as np
import pytest

from tidescour.errors import FitError, PlanError, RecordError
from tidescour.gap.levels import Waters, given_values, own_sea_levels, side_levels, splined, tide_levels
from tidescour.gauge.records import GaugeRecord, GivenSeries, InputFile
from tidescour.plan.models import Opening
from tidescour.tide.fit import fit_from_table
from tidescour.tide.predict import predicted_level

START = 1_800_000_000.0
FILE = InputFile(path="invented.csv", sha256="0" * 64)
M2 = fit_from_table(("M2", "M4"), np.array([1.5, 0.1]), np.array([40.0, 10.0]), 0.2, 53.0)


def curve(time_s):
    return 1.5 * np.sin(1.405e-4 * time_s) + 0.3


def record(time_s, level_m, side="sea", flag=None):
    return GaugeRecord(
        side=side,
        time_s=time_s,
        level_m=level_m,
        flag=np.ones(time_s.size) if flag is None else flag,
        step_s=600.0,
        files=(FILE,),
    )


def series(time_s, value, quantity="level"):
    return GivenSeries(name="storm", quantity=quantity, time_s=time_s, value=value, file=FILE)


def steps(hours, step=60.0):
    return START + np.arange(0.0, hours * 3600.0 + 1.0, step)


def test_a_smooth_curve_comes_back_between_its_samples():
    samples = steps(48, 600.0)
    inside = steps(47) + 1800.0
    assert np.abs(splined(inside, samples, curve(samples)) - curve(inside)).max() < 2e-6


def test_halving_the_sample_step_reduces_the_error_sixteenfold():
    inside = steps(40) + 4.0 * 3600.0
    errors = []
    for step in (3600.0, 1800.0):
        samples = steps(48, step)
        errors.append(np.abs(splined(inside, samples, curve(samples)) - curve(inside)).max())
    assert errors[0] / errors[1] == pytest.approx(16.0, rel=0.2)


def test_an_hour_between_samples_is_bridged_and_more_is_a_hole():
    samples = np.array([0.0, 600.0, 1200.0, 1200.0 + 3600.0, 5400.0, 5400.0 + 3660.0, 9600.0]) + START
    wanted = np.array([900.0, 3000.0, 7000.0, 9300.0, 20000.0]) + START
    assert np.isfinite(splined(wanted, samples, curve(samples))).tolist() == [True, True, False, True, False]


def test_a_piece_between_holes_is_splined_alone():
    first, second = steps(6, 600.0), steps(6, 600.0) + 12 * 3600.0
    both = np.concatenate([first, second])
    values = np.concatenate([curve(first), np.full(second.size, 50.0)])
    inside = first[:-1] + 300.0
    np.testing.assert_array_equal(splined(inside, both, values), splined(inside, first, curve(first)))


def test_one_sample_alone_holds_at_its_own_instant():
    assert splined(np.array([START]), np.array([START]), np.array([1.5]))[0] == 1.5


def test_the_tide_through_nodes_is_the_tide():
    wanted = steps(24, 47.0)
    exact = predicted_level(M2.constants, wanted, 1.1, 0.25)
    assert np.abs(tide_levels(M2, wanted, 1.1, 0.25) - exact).max() < 1e-5


def test_factor_and_set_up_change_the_sea_and_not_the_basin():
    waters = Waters(sea_fit=M2, basin_fit=M2, series={}, sea_factor=1.2, set_up_m=0.5)
    wanted = steps(12)
    sea = side_levels("tide", "sea", waters, wanted, "a", bridge=False).level_m
    basin = side_levels("tide", "basin", waters, wanted, "a", bridge=False).level_m
    np.testing.assert_allclose(sea - 0.2, 1.2 * (basin - 0.2) + 0.5, atol=1e-12)


def test_only_good_samples_count():
    samples = steps(12, 600.0)
    flag = np.ones(samples.size)
    flag[30:34], flag[40] = 4, 3
    level = curve(samples)
    level[30:34] = 99.0
    level[40] = -99.0
    waters = Waters(sea_record=record(samples, level, flag=flag), series={})
    history = side_levels("measured", "sea", waters, samples, "a", bridge=False)
    assert history.covered.all()
    assert np.abs(history.level_m - curve(samples)).max() < 0.01


def test_a_hole_is_uncovered_and_filled_linearly_or_by_the_tide():
    samples = steps(48, 600.0)
    surge = 0.4
    level = predicted_level(M2.constants, samples) + surge
    hole = (samples > START + 20 * 3600.0) & (samples < START + 26 * 3600.0)
    waters = Waters(sea_record=record(samples[~hole], level[~hole]), sea_fit=M2, series={})
    bridged = side_levels("measured", "sea", waters, samples, "a", bridge=True)
    without_tide = Waters(sea_record=record(samples[~hole], level[~hole]), series={})
    linear = side_levels("measured", "sea", without_tide, samples, "a", bridge=False)
    assert np.array_equal(bridged.covered, ~hole)
    assert np.array_equal(linear.covered, ~hole)
    assert np.abs(bridged.level_m - level).max() < 1e-3
    assert np.abs(linear.level_m - level).max() > 0.5
    ends = np.interp(samples[hole], samples[~hole], level[~hole])
    np.testing.assert_allclose(linear.level_m[hole], ends, atol=1e-12)


@pytest.mark.parametrize("bridge", [True, False])
def test_a_hole_over_a_stage_border_keeps_the_residual(bridge):
    samples = steps(48, 600.0)
    surge = 0.8 * np.linspace(0.0, 1.0, samples.size)
    level = predicted_level(M2.constants, samples) + surge
    hole = (samples > START + 20 * 3600.0) & (samples < START + 30 * 3600.0)
    waters = Waters(sea_record=record(samples[~hole], level[~hole]), sea_fit=M2, series={})
    border = START + 25 * 3600.0
    before = side_levels("measured", "sea", waters, samples[samples <= border], "a", bridge=bridge).level_m
    after = side_levels("measured", "sea", waters, samples[samples >= border], "b", bridge=bridge).level_m
    assert before[-1] == pytest.approx(after[0], abs=1e-9)
    assert np.abs(np.concatenate([before, after[1:]]) - level).max() < 1e-3


def test_before_a_measured_sea_begins_the_tide_serves():
    samples = steps(24, 600.0)
    waters = Waters(sea_record=record(samples, curve(samples)), sea_fit=M2, series={})
    before = START - 7200.0 + np.arange(0.0, 3600.0, 60.0)
    history = side_levels("measured", "sea", waters, before, "a", bridge=True)
    assert not history.covered.any()
    np.testing.assert_allclose(history.level_m, tide_levels(M2, before), atol=1e-9)


def test_missing_sources_are_refused_by_name():
    empty = Waters(series={})
    with pytest.raises(FitError, match="stage 'a': sea = \"tide\" needs a fitted tide"):
        side_levels("tide", "sea", empty, steps(1), "a", bridge=False)
    with pytest.raises(PlanError, match=r"needs \[records.basin\]"):
        side_levels("measured", "basin", empty, steps(1), "a", bridge=False)
    lonely = Waters(sea_record=record(steps(2, 600.0) - 90000.0, curve(steps(2, 600.0))), series={})
    with pytest.raises(RecordError, match="no good sample between"):
        side_levels("measured", "sea", lonely, steps(1), "a", bridge=False)
    with pytest.raises(FitError, match="no fitted tide to bridge it"):
        side_levels("measured", "sea", lonely, steps(1), "a", bridge=True)


def test_a_given_series_must_cover_the_stage_without_a_hole():
    samples = steps(10, 600.0)
    with pytest.raises(RecordError, match="does not cover stage 'a'"):
        given_values(series(samples, curve(samples)), steps(11), "a")
    holed = np.delete(samples, slice(20, 28))
    with pytest.raises(RecordError, match=r"hole of 1.5 h after 2027-01-15T11:10:00Z"):
        given_values(series(holed, curve(holed)), steps(10), "a")


def test_given_flows_are_linear_and_given_levels_are_splined():
    samples = steps(10, 600.0)
    between = samples[:-1] + 300.0
    flows = given_values(series(samples, curve(samples), "discharge"), between, "a")
    np.testing.assert_allclose(flows, 0.5 * (curve(samples)[1:] + curve(samples)[:-1]), atol=1e-12)
    levels = given_values(series(samples, curve(samples)), between, "a")
    assert np.abs(levels - curve(between)).max() < 1e-4 < np.abs(flows - curve(between)).max()


def place(**changes):
    values = {"name": "far", "crest_level_m": -6.0, "width_m": 40.0, "relation": "broad-crest"}
    return Opening.model_validate({**values, "parameters": {"coefficient": 0.9}, **changes})


def sine(time_s):
    """Mean 0.3 m, amplitude 1.5 m, whole periods of 12.4 h in the series below."""
    return 0.3 + 1.5 * np.sin(2.0 * np.pi * (time_s - START) / 44640.0)


def own_of_a_sine(**changes):
    """Return the instants, the stage's sea and that of an opening with these keys, from a series of a sine."""
    samples = START - 44640.0 + np.arange(74 * 20) * (44640.0 / 74)
    waters = Waters(series={"storm": series(samples, sine(samples))})
    wanted = steps(36)
    sea = side_levels("storm", "sea", waters, wanted, "a", bridge=True)
    return wanted, sea, own_sea_levels(place(**changes), "storm", waters, wanted, "a", True, sea)


@pytest.mark.parametrize("lag", [-5400.0, -7.5, 420.0, 10800.0])
def test_a_lag_moves_a_sine_by_its_exact_phase(lag):
    wanted, _, own = own_of_a_sine(sea_lag_s=lag)
    np.testing.assert_allclose(own.level_m, sine(wanted - lag), atol=1e-6)


def test_factor_and_shift_act_about_the_mean_of_the_sea():
    wanted, sea, own = own_of_a_sine(sea_factor=1.2, sea_shift_m=-0.15)
    np.testing.assert_allclose(own.level_m, 0.3 + 1.2 * (sine(wanted) - 0.3) - 0.15, atol=1e-6)
    _, _, all_three = own_of_a_sine(sea_factor=1.2, sea_shift_m=-0.15, sea_lag_s=900.0)
    np.testing.assert_allclose(all_three.level_m[15:], own.level_m[:-15], atol=1e-6)
    assert np.array_equal(own.covered, sea.covered)


def test_the_mean_of_an_openings_own_sea_holds_the_set_up_and_not_the_factor():
    # Predicted sea: 0.2 + 0.5 + 1.2 x tide; at the opening its swing about 0.7 m is 0.9 of that, half a metre higher.
    waters = Waters(sea_fit=M2, series={}, sea_factor=1.2, set_up_m=0.5)
    wanted = steps(25)
    sea = side_levels("tide", "sea", waters, wanted, "a", bridge=True)
    own = own_sea_levels(place(sea_factor=0.9, sea_shift_m=0.5), "tide", waters, wanted, "a", True, sea)
    tide = predicted_level(M2.constants, wanted) - 0.2
    np.testing.assert_allclose(own.level_m, 0.7 + 0.9 * 1.2 * tide + 0.5, atol=1e-5)


def test_a_measured_sea_swings_about_the_fitted_mean_or_its_own():
    samples = steps(48, 600.0)
    gauge = record(samples, curve(samples))
    wanted = steps(12) + 12.0 * 3600.0
    for waters, mean in (
        (Waters(sea_record=gauge, sea_fit=M2, series={}, set_up_m=0.5), 0.2),
        (Waters(sea_record=gauge, series={}), curve(samples).mean()),
    ):
        sea = side_levels("measured", "sea", waters, wanted, "a", bridge=True)
        own = own_sea_levels(place(sea_factor=1.3), "measured", waters, wanted, "a", True, sea)
        np.testing.assert_allclose(own.level_m, mean + 1.3 * (sea.level_m - mean), atol=1e-12)


def test_an_opening_without_a_sea_of_its_own_meets_that_of_the_stage():
    _, sea, own = own_of_a_sine()
    np.testing.assert_allclose(own.level_m, sea.level_m, atol=1e-15)


def test_a_lag_into_a_hole_is_bridged_with_the_residual_of_the_earlier_time():
    samples = steps(48, 600.0)
    level = predicted_level(M2.constants, samples) + 0.4
    hole = (samples > START + 20 * 3600.0) & (samples < START + 26 * 3600.0)
    waters = Waters(sea_record=record(samples[~hole], level[~hole]), sea_fit=M2, series={})
    wanted = steps(24) + 16.0 * 3600.0
    sea = side_levels("measured", "sea", waters, wanted, "a", bridge=True)
    own = own_sea_levels(place(sea_lag_s=7200.0), "measured", waters, wanted, "a", True, sea)
    np.testing.assert_allclose(own.level_m, predicted_level(M2.constants, wanted - 7200.0) + 0.4, atol=1e-3)
    assert (~own.covered).sum() == (~sea.covered).sum()
    first, later = np.argmin(sea.covered), np.argmin(own.covered)
    assert wanted[later] - wanted[first] == pytest.approx(7200.0)


def test_a_lag_needs_the_sea_before_the_stage():
    samples = steps(24, 600.0)
    waters = Waters(series={"storm": series(samples, curve(samples))})
    sea = side_levels("storm", "sea", waters, steps(12), "a", bridge=True)
    with pytest.raises(RecordError, match="does not cover stage 'a'"):
        own_sea_levels(place(sea_lag_s=60.0), "storm", waters, steps(12), "a", True, sea)
