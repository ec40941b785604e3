import dataclasses

import numpy as np
import pytest
from matplotlib.colors import to_hex
from matplotlib.text import Annotation

from tidescour.gauge.records import GaugeRecord
from tidescour.report.figures_flow import (
    end_velocity_figure,
    gap_velocity_figure,
    peak_tides_figure,
    threshold_velocity,
)
from tidescour.report.figures_records import records_figure
from tidescour.report.figures_scour import (
    growth_calendar_figure,
    growth_figure,
    shares_figure,
)
from tidescour.report.style import SIDE_MARKS, day_numbers, house_style
from tidescour.scour.laws import LAWS
from tidescour.scour.records import LayerReached, RowDurations

HOURS = ("integral", "flow_mean", "cycle_mean", "peak_held", "mean_held", "flow")


@pytest.fixture(autouse=True)
def styled():
    with house_style():
        yield


def texts(axes):
    return [text.get_text() for text in axes.texts]


def arrows(axes):
    return [text for text in axes.texts if isinstance(text, Annotation) and text.arrow_patch is not None]


def test_arrows_lead_at_one_depth_from_the_end_of_a_stage_to_the_curve_of_the_next(results):
    figure = growth_figure(results)
    for axes, place in zip(figure.axes, results.places, strict=True):
        (arrow,) = arrows(axes)
        (from_h, from_m), (to_h, to_m) = arrow.xyann, arrow.xy
        first, second = place.rows
        assert from_m == to_m == pytest.approx(first.chain[0].end_depth_m)
        assert from_h == pytest.approx(float(np.sum(first.duration.integral_h)))
        # the law of each stage by hand, h = c E^1.7 h0^0.2 t^0.4 with c = 0.1 / Delta^0.7 (Breusers, from memory)
        for row, hours in ((first, from_h), (second, to_h)):
            excess = row.duration.alpha * row.duration.reference_velocity_m_s - row.duration.critical_velocity_m_s
            depth_m = 0.1 / 1.6**0.7 * excess**1.7 * row.duration.reference_depth_m**0.2 * hours**0.4
            assert depth_m == pytest.approx(to_m, rel=1e-9)


def test_thick_curves_run_from_where_a_stage_starts_to_where_it_ends(results):
    for axes, place in zip(growth_figure(results).axes, results.places, strict=True):
        thick = [line for line in axes.get_lines() if line.get_linewidth() > 2.0]
        assert len(thick) == 2
        for line, row in zip(thick, place.rows, strict=True):
            depth = line.get_ydata()
            assert depth[0] == pytest.approx(row.chain[0].start_depth_m, abs=1e-12)
            assert depth[-1] == pytest.approx(row.chain[0].end_depth_m, rel=1e-9)


@pytest.mark.parametrize("strength", [500.0, 1.0 / 500.0])
def test_arrows_stay_in_the_panel_and_a_weak_stage_on_a_deep_hole_makes_its_time_logarithmic(results, strength):
    place = results.places[1]
    first, second = place.rows
    rate = first.duration.growth_rate * strength
    first_h, second_h = float(np.sum(first.duration.integral_h)), float(np.sum(second.duration.integral_h))
    start_m = (first.duration.growth_rate * first_h) ** 0.4
    step = dataclasses.replace(
        second.chain[0],
        equivalent_start_h=first_h / strength,
        start_depth_m=start_m,
        end_depth_m=(rate * (first_h / strength + second_h)) ** 0.4,
    )
    duration = dataclasses.replace(second.duration, growth_rate=rate)
    changed = dataclasses.replace(
        second, duration=duration, durations=RowDurations(layers=(duration,)), chain=(step, *second.chain[1:])
    )
    run = dataclasses.replace(results, places=(dataclasses.replace(place, rows=(first, changed)),))
    (axes,) = growth_figure(run).axes
    (arrow,) = arrows(axes)
    assert arrow.xy == pytest.approx((first_h / strength, start_m))
    assert arrow.xyann == pytest.approx((first_h, start_m))
    low, high = axes.get_xlim()
    assert low < min(arrow.xy[0], arrow.xyann[0])
    assert max(arrow.xy[0], arrow.xyann[0]) < high
    assert axes.get_xscale() == ("log" if strength < 1.0 else "linear")


def test_a_curve_that_bends_is_drawn_as_it_is_and_with_the_factor_of_the_place(results):
    # h = h_e (1 - exp(-P / h_e)) of the power part P = (k t)^0.4, times the growth factor; h_e 4 m, k 1 m^2.5/h
    law = LAWS["saturating"].function(1.6)
    place = results.places[0]
    first = place.rows[0]
    duration = dataclasses.replace(first.duration, growth_rate=1.0, power_rate=1.0, scale_m=4.0)
    end_m = 1.5 * 4.0 * (1.0 - np.exp(-(20.0**0.4) / 4.0))
    step = dataclasses.replace(first.chain[0], equivalent_start_h=0.0, start_depth_m=0.0, end_depth_m=end_m)
    row = dataclasses.replace(
        first, duration=duration, durations=RowDurations(layers=(duration,)), chain=(step, *first.chain[1:])
    )
    bed = place.place.model_copy(update={"growth_factor": 1.5})
    run = dataclasses.replace(results, law=law, places=(dataclasses.replace(place, place=bed, rows=(row,)),))
    (axes,) = growth_figure(run).axes
    (thick,) = [line for line in axes.get_lines() if line.get_linewidth() > 2.0]
    hours, depths = thick.get_xdata(), thick.get_ydata()
    assert hours[-1] == pytest.approx(20.0)
    assert depths == pytest.approx(1.5 * 4.0 * (1.0 - np.exp(-(hours**0.4) / 4.0)))


def test_growth_goes_on_along_the_curve_of_the_layer_that_is_reached(results):
    # two power laws, k 1 m^2.5/h down to 1 m and a hundredth below: state 1 is reached after 1 h, and on the second
    # curve after 100 h; 50 h more give (0.01 x 150)^0.4
    place = results.places[0]
    first = place.rows[0]
    upper = dataclasses.replace(first.duration, growth_rate=1.0)
    lower = dataclasses.replace(first.duration, growth_rate=0.01)
    step = dataclasses.replace(
        first.chain[0],
        equivalent_start_h=0.0,
        start_depth_m=0.0,
        end_depth_m=1.5**0.4,
        reached=(LayerReached(layer=1, depth_m=1.0, time_s=1.8e9, equivalent_start_h=4.0, effective_duration_h=2.0),),
    )
    row = dataclasses.replace(
        first,
        duration=upper,
        durations=RowDurations(layers=(upper, lower), top_depth_m=(0.0, 1.0)),
        chain=(step, *first.chain[1:]),
    )
    run = dataclasses.replace(results, places=(dataclasses.replace(place, rows=(row,)),))
    (axes,) = growth_figure(run).axes
    thick = [line.get_xydata()[-1] for line in axes.get_lines() if line.get_linewidth() > 2.0]
    assert np.array(thick) == pytest.approx(np.array([[1.0, 1.0], [150.0, 1.5**0.4]]))
    (arrow,) = arrows(axes)
    assert (arrow.xyann, arrow.xy) == (pytest.approx((1.0, 1.0)), pytest.approx((100.0, 1.0)))
    assert texts(axes).count("1") == 1


def test_a_place_where_nothing_grows_says_so(make_results):
    run = make_results(still_place="shoal", days=3.0)
    for axes in growth_figure(run).axes[2:]:
        assert texts(axes) == ["nothing grows here"]
    assert texts(shares_figure(run).axes[0]).count("nothing grows here") == 2
    assert end_velocity_figure(run).axes[1].get_title(loc="left") == "shoal"
    assert len(peak_tides_figure(run).axes) == 4


def test_shares_of_a_place_fill_its_bar(results):
    (axes,) = shares_figure(results).axes
    for position, place in enumerate(results.places):
        bars = [patch for patch in axes.patches if abs(patch.get_y() + 0.35 - position) < 1e-9]
        assert [bar.get_width() for bar in bars] == pytest.approx([100.0 * row.chain[0].share for row in place.rows])
        assert sum(bar.get_width() for bar in bars) == pytest.approx(100.0)
    share = 100.0 * results.places[0].rows[1].chain[0].share
    assert f"2: {share:.0f} %" in texts(axes)


def test_growth_over_the_programme_is_that_of_the_table(results):
    (axes,) = growth_calendar_figure(results).axes
    lines = axes.get_lines()[-4:]
    for line, place in zip(lines, results.places, strict=True):
        assert line.get_ydata() == pytest.approx(place.growth_depth_m)
        assert line.get_xdata() == pytest.approx(day_numbers(place.growth_time_s))
        marked = line.get_markevery()
        assert [place.growth_stage[index] for index in marked] == ["sill to -6", "sill to -4"]
        assert line.get_ydata()[marked] == pytest.approx([row.chain[0].end_depth_m for row in place.rows])


def test_growth_is_flat_over_a_gap_between_stages_and_marked_at_the_end_of_the_stage_before(results):
    place = results.places[0]
    first = place.growth_stage.count("sill to -6")
    begun_s = place.growth_time_s[first] - 600.0
    gapped = dataclasses.replace(
        place,
        growth_time_s=np.insert(place.growth_time_s, first, begun_s),
        growth_depth_m=np.insert(place.growth_depth_m, first, place.growth_depth_m[first - 1]),
        growth_stage=(*place.growth_stage[:first], "sill to -4", *place.growth_stage[first:]),
    )
    line = growth_calendar_figure(dataclasses.replace(results, places=(gapped,))).axes[0].get_lines()[-1]
    assert line.get_markevery() == [first - 1, len(place.growth_stage)]
    assert line.get_ydata()[first] == line.get_ydata()[first - 1]
    assert line.get_xdata()[first] == pytest.approx(begun_s / 86400.0)


def test_the_highest_gap_velocity_of_each_stage_is_written(results):
    axes = gap_velocity_figure(results).axes[0]
    for flow in results.flows:
        velocity = flow.openings[0].gap_velocity_m_s
        assert f"{np.max(velocity):.2f}" in texts(axes)
        assert f"{-np.min(velocity):.2f}" in texts(axes)


def test_with_a_given_end_velocity_the_panel_of_the_gap_says_why_it_is_empty(results):
    flow = results.flows[0]
    unknown = np.full(flow.time_s.shape, np.nan)
    opening = dataclasses.replace(
        flow.openings[0],
        discharge_m3_s=unknown,
        gap_velocity_m_s=unknown,
        given_end_velocity_m_s=np.ones(flow.time_s.shape),
    )
    run = dataclasses.replace(results, flows=(dataclasses.replace(flow, openings=(opening,)),))
    (axes,) = gap_velocity_figure(run).axes
    assert texts(axes) == ["1", "2", "end velocity given: none in the gap"]
    assert len(axes.get_yticks()) == 0


def test_panels_without_flow_say_so_and_have_no_scale(make_results):
    run = make_results(still_place="shoal", days=3.0)
    for figure in (gap_velocity_figure(run), end_velocity_figure(run)):
        flowing, still = figure.axes
        assert "no flow" not in texts(flowing)
        assert texts(still) == ["1", "2", "no flow"]
        assert len(still.get_yticks()) == 0
    panels = peak_tides_figure(run).axes
    assert [texts(axes) for axes in panels] == [[], [], ["no flow"], ["no flow"]]


def test_the_threshold_is_critical_velocity_over_alpha(results):
    bed = results.places[0].rows[0].bed
    # E = alpha u - u_c is zero at u = u_c / alpha: 0.45 / 2.2
    assert threshold_velocity(bed) == pytest.approx(0.45 / 2.2, rel=1e-12)


def curve(axes, side):
    """Return the velocity line of one side over the first stage."""
    colour = SIDE_MARKS[side].colour
    return next(line for line in axes.get_lines() if to_hex(line.get_color()) == colour and line.get_linestyle() == "-")


def test_the_velocity_of_the_basin_side_is_drawn_upward_and_of_the_sea_side_downward(results):
    axes = end_velocity_figure(results).axes[0]
    sea, basin = results.places[0].rows[0].bed, results.places[1].rows[0].bed
    assert np.nanmax(curve(axes, "basin").get_ydata()) == pytest.approx(np.max(basin.velocity_m_s))
    assert np.nanmin(curve(axes, "sea").get_ydata()) == pytest.approx(-np.max(sea.velocity_m_s))
    assert np.nanmin(curve(axes, "basin").get_ydata()) > 0.0
    assert np.nanmax(curve(axes, "sea").get_ydata()) < 0.0


def test_the_shading_lies_between_threshold_and_highest_velocity(results):
    axes = end_velocity_figure(results).axes[0]
    shaded = [collection.get_paths() for collection in axes.collections]
    assert len(shaded) == 4
    for paths in shaded:
        heights = np.abs(np.concatenate([path.vertices[:, 1] for path in paths]))
        assert np.min(heights) >= 0.45 / 2.4 - 1e-9
        assert np.max(heights) <= max(row.bed.velocity_m_s.max() for place in results.places for row in place.rows)


def test_nothing_is_drawn_across_a_hole_of_the_records(results):
    place = results.places[1]
    row = place.rows[0]
    cycles = row.duration.cycles
    kept = np.arange(len(cycles.start_s)) != 4
    duration = dataclasses.replace(
        row.duration,
        cycles=dataclasses.replace(cycles, start_s=cycles.start_s[kept], end_s=cycles.end_s[kept]),
        **{f"{name}_h": getattr(row.duration, f"{name}_h")[kept] for name in HOURS},
    )
    row = dataclasses.replace(row, duration=duration)
    run = dataclasses.replace(results, places=(dataclasses.replace(place, rows=(row,)),))
    line = curve(end_velocity_figure(run).axes[0], "basin")
    days = line.get_xdata()
    inside = (days > day_numbers(cycles.start_s[[4]])[0]) & (days < day_numbers(cycles.end_s[[4]])[0])
    assert not np.any(inside & np.isfinite(line.get_ydata()))
    assert np.any(np.isnan(line.get_ydata()))


def test_tides_with_small_shares_are_left_out_and_counted(make_results):
    run = make_results(stages=tuple("abcdefgh"), openings=("gap", "shoal"), days=2.0, record_samples=1200)
    figure = peak_tides_figure(run)
    assert len(figure.axes) == 12
    assert "the 12 with the largest shares of growth, 4 more not drawn" in " ".join(
        figure.legends[0].get_title().get_text().split()
    )


def test_flags_and_holes_of_a_record_are_drawn():
    time_s = 600.0 * np.arange(100.0)
    level = np.sin(time_s / 7000.0)
    flag = np.ones(100, dtype=int)
    flag[5], flag[6], flag[20:40] = 3, 4, 9
    level[6], level[20:40] = 50.0, np.nan
    record = GaugeRecord(side="sea", time_s=time_s, level_m=level, flag=flag, step_s=600.0, files=())
    axes = drawn_record(record)
    assert axes.get_title(loc="left") == "sea gauge: 100 samples, every 10 min, 78.00 % good, 1 hole over 1 h"
    line, suspect, fail, missing = axes.get_lines()
    assert np.count_nonzero(np.isnan(line.get_ydata())) == 1
    assert suspect.get_ydata() == pytest.approx([level[5]])
    low, high = axes.get_ylim()
    # a reading of 50 m stands at the edge and does not stretch the panel
    assert high < 1.3
    assert high - 0.1 < fail.get_ydata()[0] < high
    assert len(missing.get_xdata()) == 20
    assert np.all(missing.get_ydata() < low + 0.1)
    (hole,) = axes.collections[0].get_paths()
    assert hole.vertices[:, 0].min() == pytest.approx(19 * 600.0 / 86400.0)
    assert hole.vertices[:, 0].max() == pytest.approx(40 * 600.0 / 86400.0)


def drawn_record(record):
    from tidescour.report.figures_records import _draw_record
    from tidescour.report.style import new_figure

    axes = new_figure(3.0).subplots()
    _draw_record(axes, record)
    return axes


def test_one_bad_sample_of_very_many_is_not_rounded_away():
    time_s = 600.0 * np.arange(60_000.0)
    flag = np.ones(60_000, dtype=int)
    record = GaugeRecord(side="sea", time_s=time_s, level_m=np.sin(time_s), flag=flag, step_s=600.0, files=())
    assert ", 100 % good" in drawn_record(record).get_title(loc="left")
    flag[5] = 4
    assert ", 99.99 % good" in drawn_record(dataclasses.replace(record, flag=flag)).get_title(loc="left")


@pytest.mark.parametrize("flag", [9, 4])
def test_a_record_without_a_good_sample_is_drawn_too(results, flag):
    record = GaugeRecord(
        side="sea", time_s=[0.0, 600.0], level_m=[np.nan, np.nan], flag=[flag, flag], step_s=600.0, files=()
    )
    figure = records_figure(dataclasses.replace(results, records=(record,)))
    assert "0.00 % good, 0 holes" in figure.axes[0].get_title(loc="left")
    figure.draw_without_rendering()
