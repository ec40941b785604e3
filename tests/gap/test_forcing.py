"""What drives the basin through a stage: steps, inflows, given discharges and sea levels of single openings."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import FitError, RecordError
from tidescour.gap.forcing import (
    basin_inflow,
    even_steps,
    exchanging,
    side_openings,
    stage_forcing,
    stage_seas,
    with_points_between,
)
from tidescour.gap.levels import Waters
from tidescour.gap.routing import GAMMA
from tidescour.gauge.records import GaugeRecord, GivenSeries, InputFile
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.tide.fit import fit_from_table

START_S = 1806537600.0  # 2027-04-01T00:00:00Z
FILE = InputFile(path="invented.csv", sha256="0" * 64)
M2 = fit_from_table(("M2",), np.array([1.5]), np.array([40.0]), 0.2, 53.0)
TIDAL = Waters(sea_fit=M2, series={})
STEPS = even_steps(START_S, START_S + 86400.0)
INSTANTS = with_points_between(STEPS)


def opening(name="gap", **changes):
    values = {"name": name, "crest_level_m": -6.0, "width_m": 40.0, "relation": "broad-crest"}
    return Opening.model_validate({**values, "parameters": {"coefficient": 0.9}, **changes})


def stage(*openings, **changes):
    values = {"name": "first", "start": "2027-04-01T00:00:00Z", "end": "2027-04-02T00:00:00Z"}
    return Stage.model_validate({**values, "opening": openings, **changes})


def series(name, value, quantity="discharge", time_s=None):
    stamps = START_S + np.arange(-6, 151) * 600.0 if time_s is None else time_s
    return GivenSeries(name=name, quantity=quantity, time_s=stamps, value=value(stamps), file=FILE)


def basin(**changes):
    return Basin.model_validate({"level_m": (0.0,), "area_m2": (1e7,)} | changes)


@given(hours=st.floats(0.02, 1000.0), longest=st.sampled_from([1.0, 60.0, 3600.0]))
@settings(max_examples=60, deadline=None)
def test_steps_are_even_end_where_the_stage_ends_and_are_as_long_as_they_may(hours, longest):
    steps = even_steps(START_S, START_S + 3600.0 * hours, longest)
    lengths = np.diff(steps)
    assert (steps[0], steps[-1]) == (START_S, START_S + 3600.0 * hours)
    assert lengths.max() <= longest + 1e-5
    assert np.ptp(lengths) < 1e-5
    assert steps.size == 2 or lengths.min() > 0.49 * longest


def test_the_solvers_inner_points_stand_between_the_steps():
    # Alexander (1977), two implicit parts of order 2: the first ends at 1 - sqrt(1/2) of the step.
    assert INSTANTS.size == 2 * STEPS.size - 1
    np.testing.assert_array_equal(INSTANTS[0::2], STEPS)
    np.testing.assert_allclose((INSTANTS[1::2] - STEPS[:-1]) / 60.0, 1.0 - np.sqrt(0.5), atol=1e-6)


def test_inflows_steady_and_given_add_up():
    rain = series("rain", lambda t: 3.0 + (t - START_S) / 3600.0)
    pumps = series("pumps", lambda t: np.where(t < START_S + 43200.0, -8.0, 0.0))
    several = (
        {"name": "river", "discharge_m3_s": 12.0},
        {"name": "rain", "series": "rain"},
        {"name": "pumps", "series": "pumps"},
    )
    waters = Waters(series={"rain": rain, "pumps": pumps})
    found = basin_inflow(basin(inflow_m3_s=5.0, inflow=several), waters, INSTANTS, "first")
    hours = (INSTANTS - START_S) / 3600.0
    shut = np.interp(hours, [12.0 - 1.0 / 6.0, 12.0], [-8.0, 0.0])
    np.testing.assert_allclose(found, 5.0 + 12.0 + 3.0 + hours + shut, atol=1e-6)


def test_no_basin_and_no_inflow_give_nothing():
    assert np.all(basin_inflow(None, TIDAL, INSTANTS, "first") == 0.0)
    assert np.all(basin_inflow(basin(), TIDAL, INSTANTS, "first") == 0.0)
    assert side_openings(None) == ()


def test_an_inflow_that_does_not_cover_its_stage_is_refused_with_both_spans():
    short = series("rain", np.ones_like, time_s=START_S + np.arange(100) * 600.0)
    planned = basin(inflow=({"name": "rain", "series": "rain"},))
    with pytest.raises(
        RecordError, match=r"2027-04-01T16:30:00Z and does not cover stage 'first'.*2027-04-02T00:00:00Z"
    ):
        basin_inflow(planned, Waters(series={"rain": short}), INSTANTS, "first")
    stamps = START_S + np.delete(np.arange(-6, 151), slice(50, 60)) * 600.0
    holed = series("rain", np.ones_like, time_s=stamps)
    with pytest.raises(RecordError, match=r"has a hole of 1.83 h after 2027-04-01T07:10:00Z"):
        basin_inflow(planned, Waters(series={"rain": holed}), INSTANTS, "first")


def test_given_discharges_of_the_gap_and_beside_it_join_the_inflow():
    waters = Waters(
        sea_fit=M2, series={"q": series("q", lambda t: 10.0 + 0.0 * t), "p": series("p", lambda t: 4.0 + 0.0 * t)}
    )
    turbine = opening("turbine", relation=None, parameters={}, discharge_series="q")
    pump = opening("pump", relation=None, parameters={}, discharge_series="p")
    planned, around = stage(opening(), turbine), basin(inflow_m3_s=1.5, side_opening=(pump, opening("sluice")))
    seas = stage_seas(planned, exchanging(planned, around), waters, INSTANTS, bridge=True)
    forcing = stage_forcing(planned, around, waters, INSTANTS, seas)
    assert [each.name for each in exchanging(planned, around)] == ["gap", "sluice"]
    assert forcing.step_s == pytest.approx(60.0)
    np.testing.assert_allclose(forcing.given_discharge_m3_s, 15.5)
    np.testing.assert_allclose(forcing.given_discharge_between_m3_s, 15.5)
    assert forcing.sea_level_m.shape == (STEPS.size, 1)
    assert forcing.sea_level_between_m.shape == (STEPS.size - 1, 1)


def test_every_opening_with_a_sea_of_its_own_has_its_column_in_their_order():
    late, higher = opening("late", sea_lag_s=900.0), opening("higher", sea_shift_m=0.25)
    planned, around = stage(opening(), late), basin(side_opening=(higher,))
    seas = stage_seas(planned, exchanging(planned, around), TIDAL, INSTANTS, bridge=True)
    forcing = stage_forcing(planned, around, TIDAL, INSTANTS, seas)
    # 900 s are 15 steps of a minute.
    np.testing.assert_allclose(forcing.sea_level_m[15:, 1], forcing.sea_level_m[:-15, 0], atol=1e-6)
    np.testing.assert_allclose(forcing.sea_level_m[:, 2], forcing.sea_level_m[:, 0] + 0.25, atol=1e-12)
    np.testing.assert_allclose(forcing.sea_level_between_m[15:, 1], forcing.sea_level_between_m[:-15, 0], atol=1e-6)
    assert seas.at(opening()) is seas.stage
    np.testing.assert_array_equal(seas.at(late).level_m[0::2], forcing.sea_level_m[:, 1])
    halved = seas.every_second()
    np.testing.assert_array_equal(halved.stage.level_m, forcing.sea_level_m[:, 0])
    np.testing.assert_array_equal(halved.at(higher).level_m, forcing.sea_level_m[:, 2])


def test_inner_points_of_a_step_take_the_value_of_their_own_time():
    waters = Waters(sea_fit=M2, series={"q": series("q", lambda t: (t - START_S) / 60.0)})
    turbine = opening("turbine", relation=None, parameters={}, discharge_series="q")
    planned = stage(opening(), turbine)
    seas = stage_seas(planned, exchanging(planned, basin()), waters, INSTANTS, bridge=True)
    forcing = stage_forcing(planned, basin(), waters, INSTANTS, seas)
    np.testing.assert_allclose(
        forcing.given_discharge_between_m3_s - forcing.given_discharge_m3_s[:-1], GAMMA, atol=1e-6
    )


def test_a_hole_of_a_measured_sea_comes_later_at_an_opening_that_lags():
    stamps = START_S + np.arange(-72, 288) * 600.0
    hole = (stamps > START_S + 6.0 * 3600.0) & (stamps < START_S + 8.0 * 3600.0)
    level = 0.2 + 1.5 * np.cos(2.0 * np.pi * (stamps - START_S) / 44714.16)
    record = GaugeRecord(
        side="sea", time_s=stamps[~hole], level_m=level[~hole], flag=np.ones((~hole).sum()), step_s=600.0, files=(FILE,)
    )
    late = opening("late", sea_lag_s=3600.0)
    planned = stage(opening(), late, sea="measured")
    waters = Waters(sea_record=record, sea_fit=M2, series={})
    seas = stage_seas(planned, (late,), waters, STEPS, bridge=True)
    hours = (STEPS - START_S) / 3600.0
    np.testing.assert_array_equal(seas.stage.covered, (hours <= 6.0) | (hours >= 8.0))
    np.testing.assert_array_equal(seas.at(late).covered, (hours <= 7.0) | (hours >= 9.0))
    np.testing.assert_array_equal(seas.covered, (hours <= 6.0) | (hours >= 9.0))
    with pytest.raises(FitError, match="no fitted tide to bridge it"):
        stage_seas(planned, (late,), Waters(sea_record=record, series={}), STEPS, bridge=True)
    # Without a tide the hole is linear, and where one level ends before its hole the other goes on.
    unbridged = stage_seas(planned, (late,), Waters(sea_record=record, series={}), STEPS, bridge=False)
    assert np.isfinite(unbridged.at(late).level_m).all()


def test_a_series_too_short_for_a_lag_is_refused():
    storm = series("storm", lambda t: 0.0 * t, quantity="level", time_s=START_S + np.arange(0, 145) * 600.0)
    planned = stage(opening(), opening("late", sea_lag_s=900.0), sea="storm")
    waters = Waters(series={"storm": storm})
    assert np.all(stage_seas(planned, (), waters, STEPS, bridge=True).stage.level_m == 0.0)
    with pytest.raises(RecordError, match=r"series 'storm' runs from 2027-04-01T00:00:00Z .* does not cover"):
        stage_seas(planned, planned.opening[1:], waters, STEPS, bridge=True)
