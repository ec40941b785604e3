"""What soundings say about a place and a programme: ways beside, dates of stops, findings and refusals."""

import runpy
from datetime import timedelta
from pathlib import Path

import numpy as np
import pytest

from tidescour.study.growth_factor import DepthBand, DepthSounding, Scatter
from tidescour.study.soundings import (
    days_late,
    depths_at,
    programme_span,
    sounded_place,
    sounding_notes,
    soundings_at,
)
from tidescour.study.stops import allowed_depth_m, stop_dates, stop_findings

INVENTED = runpy.run_path(str(Path(__file__).parent / "invented_soundings.py"))
hole_of, place_of, plan_of = INVENTED["invented_hole"], INVENTED["invented_place"], INVENTED["invented_plan"]
sounding, results_of = INVENTED["sounding"], INVENTED["invented_results"]
START, START_S, DAY_S = INVENTED["START"], INVENTED["START_S"], INVENTED["DAY_S"]
NOW, REST = 5.0**2.5, 8.0**2.5 - 5.0**2.5


def sounded(day, depth_m, slope=np.nan):
    return DepthSounding(time_s=START_S + day * DAY_S, depth_m=depth_m, standard_error_m=0.3, upper_slope_cot=slope)


def band_of(*depths, from_day=30.0):
    """Return a band whose ends and median rise in a line over ten days."""
    return DepthBand(time_s=START_S + DAY_S * np.array([from_day, from_day + 10.0]), depth_m=np.array(depths).T)


def codes(findings):
    return {finding.code: finding.severity for finding in findings}


def test_plain_ways_stand_beside_the_forecast():
    (place, other) = results_of().places
    forecast = place.forecast
    assert place.as_planned_m == pytest.approx([5.0], rel=1e-12)
    assert forecast.as_planned_m[-1] == pytest.approx(8.0, rel=1e-12)
    assert forecast.plain_ratio_m[-1] == pytest.approx(5.76, rel=1e-12)
    # 3.6**2.5 = 24.59 and 125.12 more.
    assert forecast.restart_unscaled_m[-1] == pytest.approx(149.71**0.4, abs=5e-4)
    factor = place.growth_factor[1]
    assert place.with_factor_m == pytest.approx(5.0 * factor, rel=1e-9)
    assert forecast.restart_m[-1] == pytest.approx(factor * ((3.6 / factor) ** 2.5 + REST) ** 0.4, rel=1e-9)
    assert other.soundings == ()
    assert np.all(np.isnan(other.forecast.restart_unscaled_m))
    assert other.growth_factor == pytest.approx(other.prior_factor)
    assert other.forecast.as_planned_m[-1] == pytest.approx(8.0, rel=1e-12)


def test_depths_of_the_law_are_those_of_the_sum():
    hole = hole_of((NOW, REST), cycles=5, growth_factor=0.9)
    days = np.array([7.0, 30.0, 44.0])
    states = np.array([NOW * 7.0 / 30.0, NOW, NOW + REST * 14.0 / 30.0])
    assert depths_at(hole, START_S + days * DAY_S, 1.1) == pytest.approx(0.99 * states**0.4, rel=1e-12)


def test_no_ratio_where_nothing_was_planned():
    place = sounded_place(place_of(), hole_of((0.0, REST)), [sounded(20.0, 0.2)], Scatter(prior=0.3, growth=0.1))
    assert np.all(np.isnan(place.forecast.plain_ratio_m))
    assert place.forecast.restart_unscaled_m[-1] == pytest.approx((0.2**2.5 + REST) ** 0.4, rel=1e-12)


def test_the_depth_that_a_length_allows():
    assert allowed_depth_m(place_of(length_m=90.0, failure_slope_cot=10.0, depth_margin_factor=1.5)) == 6.0


@pytest.mark.parametrize(
    ("limit_m", "state", "median_day", "early_day"),
    [
        (5.0, "expected", 35.0, 30.0 + 10.0 / 4.0),
        (7.0, "possible", np.nan, 30.0 + 30.0 / 4.0),
        (8.5, "not expected", np.nan, np.nan),
        (4.0, "reached", 30.0, 30.0),
    ],
)
def test_limits_are_met_by_the_median_and_earlier_by_the_end_of_the_band(limit_m, state, median_day, early_day):
    band = band_of((3.0, 4.0, 4.0), (4.0, 6.0, 8.0))
    (_, stop) = stop_dates(place_of(length_m=900.0, stop_depth_m=limit_m), [sounded(30.0, 3.9)], band)
    assert (stop.criterion, stop.state) == ("depth", state)
    for time_s, day in ((stop.median_s, median_day), (stop.early_s, early_day)):
        assert time_s == pytest.approx(START_S + day * DAY_S, nan_ok=True)


def test_a_sounding_at_a_limit_is_an_error_from_its_day_on():
    band = band_of((3.0, 3.5, 4.0), (4.0, 4.5, 5.0))
    place = place_of(length_m=40.0, failure_slope_cot=10.0)
    (stop,) = stop_dates(place, [sounded(10.0, 3.0), sounded(20.0, 4.1), sounded(30.0, 3.7)], band)
    assert (stop.state, stop.reached_s) == ("reached", START_S + 20.0 * DAY_S)
    (finding,) = stop_findings(place, [stop])
    assert (finding.severity, finding.code) == ("error", "stop-reached")
    assert "2027-04-21" in finding.message


@pytest.mark.parametrize(
    ("slopes", "state"),
    [
        ((np.nan,), "not sounded"),
        ((4.6, np.nan), "not reached when last sounded"),
        ((4.0, 2.5), "reached"),
        ((3.0,), "reached"),
    ],
)
def test_a_slope_is_judged_by_soundings_alone(slopes, state):
    soundings = [sounded(10.0 + number, 1.0, slope) for number, slope in enumerate(slopes)]
    place = place_of(length_m=900.0, stop_slope_cot=3.0, stop_slope_height_m=2.0)
    stop = stop_dates(place, soundings, band_of((1.0, 1.0, 1.0), (1.0, 1.0, 1.0)))[-1]
    assert (stop.criterion, stop.state) == ("slope", state)
    assert np.isnan(stop.reached_s) == (state != "reached")
    expected = {
        "not sounded": {"slope-not-sounded": "note"},
        "not reached when last sounded": {"slope-not-forecast": "note"},
        "reached": {"stop-reached": "error"},
    }
    assert codes(stop_findings(place, [stop])) == expected[state]


@pytest.mark.parametrize(("slope", "severity"), [(4.6, "note"), (4.5, "warning"), (3.1, "warning")])
def test_a_slope_that_nears_its_stop_is_a_warning_for_slopes_are_not_forecast(slope, severity):
    place = place_of(length_m=900.0, stop_slope_cot=3.0, stop_slope_height_m=2.0)
    soundings = [sounded(10.0, 1.0, 8.0), sounded(20.0, 1.0, slope), sounded(25.0, 1.0)]
    stop = stop_dates(place, soundings, band_of((1.0, 1.0, 1.0), (1.0, 1.0, 1.0)))[-1]
    assert (stop.sounded_s, stop.sounded_slope_cot) == (START_S + 20.0 * DAY_S, slope)
    (finding,) = stop_findings(place, [stop])
    assert finding.severity == severity
    assert f"slopes are not forecast; last sounded 1 in {slope:g} on 2027-04-21" in finding.message


def test_what_comes_within_the_programme_is_a_warning():
    place = results_of(stop_depth_m=5.5).places[0]
    assert codes(place.findings)["stop-ahead"] == "warning"
    assert "stop-ahead" not in codes(results_of(stop_depth_m=50.0, length_m=900.0).places[0].findings)


@pytest.mark.parametrize(
    ("soundings", "code"),
    [
        ([sounding(30.0, 4.0, 4.0)], "soundings-hardly-tell"),
        ([sounding(30.0, 20.0, 0.3)], "factor-far-from-expected"),
        ([sounding(15.0, 6.0, 0.1), sounding(30.0, 4.0, 0.1)], "soundings-disagree"),
    ],
)
def test_soundings_that_cannot_be_trusted_are_told(soundings, code):
    (place, other) = results_of(soundings).places
    found = codes(place.findings)
    assert found[code] == "warning"
    assert place.hardly_told == (code == "soundings-hardly-tell")
    assert code not in codes(other.findings)


def test_sound_soundings_are_told_of_nothing():
    assert codes(results_of(length_m=900.0).places[0].findings) == {}


def test_a_factor_that_is_in_the_plan_already_is_told():
    found = codes(results_of(growth_factor=0.8, length_m=900.0).places[0].findings)
    assert found == {"factor-in-plan": "note"}


def test_places_without_soundings_and_stages_on_the_tide_are_told():
    notes = sounding_notes(plan_of([sounding(30.0, 3.0)]), results_of().places)
    assert codes(notes) == {"not-sounded": "note"}
    assert "sea side" in notes[0].message
    # The second stage is over only at the last sounding of this plan.
    notes = sounding_notes(plan_of([sounding(60.0, 3.0)]), results_of().places)
    assert [note.where for note in notes if note.code == "hindcast-on-tide"] == ["stage 'sill to -4'"]


def test_soundings_of_a_place_come_in_order_as_depths():
    level = sounding(20.0, None, bed_level_m=-11.5, upper_slope_cot=4.0)
    plan = plan_of([sounding(30.0, 3.0), level, sounding(25.0, 1.0, side="sea")])
    early, late = soundings_at(plan, place_of(bed_level_m=-9.0))
    assert (early.depth_m, early.upper_slope_cot) == (2.5, 4.0)
    assert (late.depth_m, late.time_s) == (3.0, START_S + 30.0 * DAY_S)
    assert np.isnan(late.upper_slope_cot)


def test_the_programme_runs_from_first_to_last():
    assert programme_span(plan_of([]).stage) == (START_S, START_S + 60.0 * DAY_S)


def test_late_counts_in_days():
    planned_s = START_S + timedelta(days=25).total_seconds()
    assert days_late(planned_s, planned_s + 5.0 * DAY_S) == 5.0
    assert days_late(planned_s, planned_s - 0.5 * DAY_S) == -0.5
    assert np.isnan(days_late(np.nan, START_S))
