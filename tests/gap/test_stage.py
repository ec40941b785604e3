"""One closure stage from plan and waters to flows, and the findings that qualify it."""

from dataclasses import replace

import numpy as np
import pytest

from tidescour.errors import DomainError, PlanError, RecordError
from tidescour.gap.forcing import even_steps
from tidescour.gap.levels import Waters
from tidescour.gap.stage import LATER_REMEDY, stage_flow
from tidescour.gap.volume import half_tide_volumes, zero_times
from tidescour.gauge.records import GaugeRecord, GivenSeries, InputFile
from tidescour.plan.models import Basin, Stage
from tidescour.tide.fit import fit_from_table
from tidescour.tide.predict import predicted_level

FILE = InputFile(path="invented.csv", sha256="0" * 64)
SEA = fit_from_table(("M2", "S2"), np.array([1.5, 0.4]), np.array([40.0, 80.0]), 0.1, 53.0)
BASIN = Basin(level_m=(-3.0, 0.0, 3.0), area_m2=(1.4e7, 2.0e7, 2.6e7))
START_S = 1806537600.0  # 2027-04-01T00:00:00Z


def opening(**changes):
    values = {"name": "main gap", "crest_level_m": -6.0, "width_m": 400.0, "relation": "broad-crest"}
    return {**values, "parameters": {"coefficient": 0.95}, **changes}


def stage(days=3, sea="tide", basin="routed", openings=None):
    return Stage.model_validate(
        {
            "name": "first",
            "start": "2027-04-01T00:00:00Z",
            "end": f"2027-04-{1 + days:02d}T00:00:00Z",
            "sea": sea,
            "basin": basin,
            "opening": openings or [opening()],
        }
    )


def series(name, time_s, value, quantity):
    return GivenSeries(name=name, quantity=quantity, time_s=time_s, value=value, file=FILE)


def gauge(side, time_s, level_m):
    return GaugeRecord(
        side=side, time_s=time_s, level_m=level_m, flag=np.ones(time_s.size), step_s=600.0, files=(FILE,)
    )


TIDAL = Waters(sea_fit=SEA, series={})
TEN_MINUTES = START_S + np.arange(-144, 10 * 144) * 600.0


def test_steps_divide_the_stage_evenly():
    steps = even_steps(0.0, 1000.0)
    assert steps[0] == 0.0
    assert steps[-1] == 1000.0
    assert np.diff(steps).max() <= 60.0
    assert np.ptp(np.diff(steps)) < 1e-9


def test_a_routed_stage_forgets_its_start():
    found = stage_flow(stage(), BASIN, TIDAL)
    given = stage_flow(stage(days=3), BASIN, TIDAL, start_level_m=float(found.level_basin_m[0]))
    np.testing.assert_array_equal(found.level_basin_m, given.level_basin_m)
    far = stage_flow(stage(), BASIN, TIDAL, start_level_m=float(found.level_basin_m[0]) + 1.0)
    assert abs(far.level_basin_m[-1] - found.level_basin_m[-1]) < 1e-3


def test_half_the_step_changes_no_peak_velocity_by_more_than_a_thousandth():
    peaks = []
    for longest in (60.0, 30.0):
        flow = stage_flow(stage(), BASIN, TIDAL, 0.3, longest_step_s=longest)
        peaks.append(np.abs(flow.openings[0].gap_velocity_m_s).max())
    assert peaks[0] == pytest.approx(peaks[1], rel=1e-3)


def test_splitting_a_stage_changes_no_level():
    whole = stage_flow(stage(days=4), BASIN, TIDAL, 0.3)
    first = stage_flow(stage(days=2), BASIN, TIDAL, 0.3)
    later = Stage.model_validate({**stage(days=4).model_dump(), "start": "2027-04-03T00:00:00Z"})
    second = stage_flow(later, BASIN, TIDAL, float(first.level_basin_m[-1]))
    joined = np.concatenate([first.level_basin_m, second.level_basin_m[1:]])
    assert np.abs(joined - whole.level_basin_m).max() < 1e-7


def test_two_openings_side_by_side_act_as_one_of_their_width():
    pair = stage(openings=[opening(width_m=150.0), opening(name="shoal", width_m=250.0)])
    both = stage_flow(pair, BASIN, TIDAL, 0.3)
    one = stage_flow(stage(), BASIN, TIDAL, 0.3)
    assert np.abs(both.level_basin_m - one.level_basin_m).max() < 1e-6
    assert both.openings[0].gap_velocity_m_s == pytest.approx(one.openings[0].gap_velocity_m_s, abs=1e-4)


def test_inflow_alone_fills_a_shut_basin_by_its_volume():
    shut = stage(openings=[opening(crest_level_m=50.0)])
    flow = stage_flow(shut, Basin(level_m=(0.0,), area_m2=(1.0e7,), inflow_m3_s=100.0), TIDAL, 0.0)
    assert flow.level_basin_m[-1] == pytest.approx(100.0 * 3 * 86400.0 / 1.0e7, rel=1e-9)
    assert np.all(flow.openings[0].discharge_m3_s == 0.0)


def test_a_given_discharge_fills_the_basin_by_its_volume():
    times = TEN_MINUTES
    waters = Waters(sea_fit=SEA, series={"model": series("model", times, np.full(times.size, 50.0), "discharge")})
    planned = stage(openings=[opening(relation=None, parameters={}, discharge_series="model")])
    flow = stage_flow(planned, Basin(level_m=(0.0,), area_m2=(1.0e7,)), waters, 0.0)
    assert flow.level_basin_m[-1] == pytest.approx(50.0 * 3 * 86400.0 / 1.0e7, rel=1e-9)
    assert flow.openings[0].given
    assert np.all(flow.openings[0].gap_velocity_m_s > 0.0)


def test_a_start_that_cannot_be_forgotten_asks_for_the_start_level():
    with pytest.raises(PlanError, match="after 60 days two basins that began 2 m apart still differ by 2 m"):
        stage_flow(stage(openings=[opening(crest_level_m=30.0)]), BASIN, TIDAL)
    waters = Waters(series={"storm": series("storm", TEN_MINUTES, np.sin(TEN_MINUTES / 7000.0), "level")})
    with pytest.raises(PlanError, match=r"nothing before it; write start_level_m in \[basin\]"):
        stage_flow(stage(sea="storm"), BASIN, waters)
    with pytest.raises(PlanError, match=r'basin = "routed" needs \[basin\]'):
        stage_flow(stage(), None, TIDAL)


def test_a_given_discharge_over_a_dry_crest_is_refused_with_its_time():
    waters = Waters(sea_fit=SEA, series={"q": series("q", TEN_MINUTES, np.full(TEN_MINUTES.size, 5.0), "discharge")})
    planned = stage(openings=[opening(crest_level_m=9.0, relation=None, parameters={}, discharge_series="q")])
    with pytest.raises(DomainError, match="gives 5 m3/s at 2027-04-01T00:00:00Z over a dry crest"):
        stage_flow(planned, BASIN, waters, 0.0)


def test_coarse_given_flows_are_a_warning():
    hourly = TEN_MINUTES[::6]
    waters = Waters(sea_fit=SEA, basin_fit=SEA, series={"u": series("u", hourly, np.sin(hourly / 7000.0), "velocity")})
    planned = stage(basin="tide", openings=[opening(relation=None, parameters={}, end_velocity_series="u")])
    flow = stage_flow(planned, None, waters)
    assert [(finding.severity, finding.code) for finding in flow.findings] == [("warning", "coarse-series")]
    assert np.isnan(flow.openings[0].discharge_m3_s).all()
    np.testing.assert_allclose(flow.openings[0].signed_flow[::60], np.sin(hourly[24:][:73] / 7000.0), atol=1e-12)


def routed_pair(width=400.0):
    """Return records of both sides as a gap of that width would give them."""
    flow = stage_flow(stage(days=9, openings=[opening(width_m=width)]), BASIN, TIDAL, 0.3)
    every = slice(None, None, 10)
    return gauge("sea", flow.time_s[every], flow.level_sea_m[every]), gauge(
        "basin", flow.time_s[every], flow.level_basin_m[every]
    )


def test_measured_levels_of_the_same_gap_pass_the_volume_check():
    sea, basin = routed_pair()
    flow = stage_flow(
        stage(sea="measured", basin="measured"), BASIN, Waters(sea_record=sea, basin_record=basin, series={})
    )
    by_head, by_storage = half_tide_volumes(flow, BASIN)
    assert by_head / by_storage == pytest.approx(1.0, abs=0.02)
    assert flow.measured
    assert flow.findings == ()


def test_a_basin_level_of_another_geometry_is_an_error_finding():
    sea, basin = routed_pair(width=400.0)
    narrowed = stage(sea="measured", basin="measured", openings=[opening(width_m=200.0)])
    flow = stage_flow(narrowed, BASIN, Waters(sea_record=sea, basin_record=basin, series={}))
    assert [(finding.severity, finding.code) for finding in flow.findings] == [("error", "volume-check")]
    assert "ratio 0.50" in flow.findings[0].message


def test_inflow_counts_in_the_volume_check_with_its_sign():
    filled = Basin(level_m=(0.0,), area_m2=(4.0e6,), inflow_m3_s=300.0)
    flow = stage_flow(stage(days=9, openings=[opening(width_m=100.0)]), filled, TIDAL, 0.3)
    every = slice(None, None, 10)
    waters = Waters(
        sea_record=gauge("sea", flow.time_s[every], flow.level_sea_m[every]),
        basin_record=gauge("basin", flow.time_s[every], flow.level_basin_m[every]),
        series={},
    )
    planned = stage(sea="measured", basin="measured", openings=[opening(width_m=100.0)])
    assert stage_flow(planned, filled, waters).findings == ()
    without = replace_basin(filled, inflow_m3_s=0.0)
    assert [finding.code for finding in stage_flow(planned, without, waters).findings] == ["volume-check"]


def replace_basin(basin, **changes):
    return basin.model_copy(update=changes)


def test_a_given_velocity_leaves_the_volume_unchecked_with_a_note():
    fine = TEN_MINUTES
    waters = Waters(sea_fit=SEA, basin_fit=SEA, series={"u": series("u", fine, np.sin(fine / 7000.0), "velocity")})
    planned = stage(basin="tide", openings=[opening(relation=None, parameters={}, end_velocity_series="u")])
    assert [finding.code for finding in stage_flow(planned, BASIN, waters).findings] == ["volume-not-checked"]


def test_the_spin_up_keeps_the_geometry_of_the_start():
    still = stage_flow(stage(), BASIN, TIDAL).level_basin_m[0]
    moving = stage_flow(stage(openings=[opening(crest_level_end_m=-1.0, width_end_m=50.0)]), BASIN, TIDAL)
    assert moving.level_basin_m[0] == still


def test_a_given_discharge_against_the_head_is_critical_on_the_side_it_comes_from():
    # Sea 1.1 m over the crest, basin 3 m over it, yet 20 m3/s come from the sea: y = max(3, 2/3 x 1.1) = 3 m.
    times = TEN_MINUTES
    constant = {
        "high": series("high", times, np.full(times.size, -3.0), "level"),
        "low": series("low", times, np.full(times.size, -4.9), "level"),
        "q": series("q", times, np.full(times.size, 20.0), "discharge"),
    }
    given = opening(width_m=10.0, relation=None, parameters={}, discharge_series="q")
    against = stage_flow(stage(sea="low", basin="high", openings=[given]), None, Waters(series=constant))
    assert against.openings[0].gap_velocity_m_s[0] == pytest.approx(20.0 / (10.0 * 3.0), rel=1e-9)
    # With the head, from 3 m to 1.1 m: y = max(1.1, 2) = 2 m.
    along = stage_flow(stage(sea="high", basin="low", openings=[given]), None, Waters(series=constant))
    assert along.openings[0].gap_velocity_m_s[0] == pytest.approx(20.0 / (10.0 * 2.0), rel=1e-9)


def test_a_later_stage_is_told_another_remedy():
    with pytest.raises(PlanError, match="let this stage start where the one before it ends"):
        stage_flow(stage(openings=[opening(crest_level_m=30.0)]), BASIN, TIDAL, remedy=LATER_REMEDY)


def test_holes_are_counted_and_too_many_are_refused():
    sea, basin = routed_pair()
    hole = (basin.time_s > START_S + 40 * 3600.0) & (basin.time_s < START_S + 46 * 3600.0)
    holed = replace(basin, time_s=basin.time_s[~hole], level_m=basin.level_m[~hole], flag=basin.flag[~hole])
    waters = Waters(sea_record=sea, basin_record=holed, series={})
    planned = stage(sea="measured", basin="measured")
    flow = stage_flow(planned, BASIN, waters)
    assert [(finding.severity, finding.code) for finding in flow.findings] == [("error", "hole-in-record")]
    assert "6.0 h (8.3 %)" in flow.findings[0].message
    assert (~flow.covered).sum() * 60.0 == pytest.approx(6 * 3600.0, abs=120.0)
    hole |= basin.time_s > START_S + 62 * 3600.0
    holed = replace(basin, time_s=basin.time_s[~hole], level_m=basin.level_m[~hole], flag=basin.flag[~hole])
    with pytest.raises(RecordError, match="at least 80 % must be there"):
        stage_flow(planned, BASIN, replace(waters, basin_record=holed))


def test_a_measured_sea_routes_like_the_tide_that_it_is():
    level = predicted_level(SEA.constants, TEN_MINUTES)
    waters = Waters(sea_record=gauge("sea", TEN_MINUTES, level), sea_fit=SEA, series={})
    measured = stage_flow(stage(sea="measured"), BASIN, waters)
    tidal = stage_flow(stage(), BASIN, TIDAL)
    assert np.abs(measured.level_basin_m - tidal.level_basin_m).max() < 1e-4


def test_zeros_are_placed_by_linear_interpolation():
    assert zero_times(np.array([0.0, 1.0, 2.0, 3.0]), np.array([-1.0, 3.0, 1.0, -1.0])) == pytest.approx([0.25, 2.5])
