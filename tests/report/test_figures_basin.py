import dataclasses

import numpy as np
import pytest
from matplotlib.collections import LineCollection, PolyCollection

from tidescour.gap.discharges import DischargeSeries
from tidescour.report.figures_basin import AROUND_CAMPAIGN_S, MOST_CAMPAIGNS, discharge_figure, levels_figure
from tidescour.report.style import day_numbers, house_style, mark


@pytest.fixture(autouse=True)
def styled():
    with house_style():
        yield


def shaded(axes):
    """Return where the part held back begins and ends in a panel; None where there is none."""
    spans = [patch for patch in axes.patches if patch.get_hatch()]
    return (spans[0].get_x(), spans[0].get_x() + spans[0].get_width()) if spans else None


def test_the_residual_is_recorded_less_routed_with_the_scores_of_both_parts(site, make_calibrated):
    residual = levels_figure(site, make_calibrated()).axes[-1]
    value = residual.get_lines()[0].get_ydata()
    assert np.nanmin(value) == pytest.approx(0.03)
    assert np.nanmax(value) == pytest.approx(0.05)
    assert residual.get_title(loc="left").endswith("fitted 3.0 cm (9.0), held back 5.0 cm (15.0)")
    assert residual.get_ylabel() == "recorded less\nrouted level [m]"


def test_the_part_held_back_is_shaded_in_every_panel(site, make_calibrated):
    calibrated = make_calibrated()
    figure = levels_figure(site, calibrated)
    assert len(figure.axes) == 3
    begun = calibrated.parts[1].start_s / 86400.0
    for axes in figure.axes:
        assert shaded(axes) == pytest.approx((begun, axes.get_xlim()[1]))
    assert [text.get_text() for text in figure.legends[0].get_texts()][-1] == "held back, not fitted"
    first, last = figure.axes[1].get_xlim()
    assert last - first == pytest.approx(6.0)
    assert first < begun < last


def test_nothing_held_back_is_not_shaded(site, make_calibrated):
    figure = levels_figure(site, make_calibrated(held_back=0.0))
    assert all(shaded(axes) is None for axes in figure.axes)
    assert len(figure.legends[0].get_texts()) == 3
    assert figure.axes[-1].get_title(loc="left").endswith(": fitted 3.0 cm (9.0)")


def test_a_short_span_needs_no_close_up(site, make_calibrated):
    assert len(levels_figure(site, make_calibrated(days=4.0)).axes) == 2


def test_a_hole_breaks_the_recorded_level_and_no_other(site, make_calibrated):
    whole = levels_figure(site, make_calibrated(days=4.0)).axes[0]
    sea, recorded, routed = (line.get_ydata() for line in whole.get_lines())
    assert np.count_nonzero(np.isnan(recorded)) == 1
    assert not np.any(np.isnan(sea))
    assert not np.any(np.isnan(routed))


def test_a_record_with_a_hole_over_the_whole_close_up_is_drawn_as_nothing_there(site, make_calibrated):
    calibrated = make_calibrated()
    early = calibrated.record_time_s < calibrated.time_s[0] + 5.0 * 86400.0
    part = dataclasses.replace(
        calibrated, record_time_s=calibrated.record_time_s[early], record_level_m=calibrated.record_level_m[early]
    )
    close = levels_figure(site, part).axes[1]
    assert [line.get_xdata().size > 0 for line in close.get_lines()] == [True, False, True]


def test_a_campaign_shows_its_measurements_with_bars_and_every_source_around_them(site, make_campaigns):
    table = make_campaigns(1)
    (axes,) = discharge_figure(site, table).axes
    (bars,) = [each for each in axes.collections if isinstance(each, LineCollection)]
    measured = table.series[-1]
    assert [np.ptp(segment[:, 1]) for segment in bars.get_segments()] == pytest.approx([120.0] * measured.time_s.size)
    edges = day_numbers(measured.time_s[[0, -1]] + np.array([-1.0, 1.0]) * AROUND_CAMPAIGN_S)
    assert axes.get_xlim() == pytest.approx(edges)
    curves = [line for line in axes.get_lines() if len(line.get_xdata()) > 60]
    assert [np.max(line.get_ydata()) for line in curves] == pytest.approx([1000.0, 950.0, 980.0], rel=1e-3)


def test_only_a_source_with_a_standard_error_has_a_band(site, make_campaigns):
    figure = discharge_figure(site, make_campaigns(1))
    (axes,) = figure.axes
    (band,) = [each for each in axes.collections if isinstance(each, PolyCollection)]
    assert np.max(band.get_paths()[0].vertices[:, 1]) == pytest.approx(990.0, rel=1e-3)
    assert [text.get_text() for text in figure.legends[0].get_texts()] == [
        "by head",
        "by storage",
        "by storage ± error",
        "routed",
        "measured ± error",
    ]


def test_a_source_looks_the_same_on_a_sheet_without_the_others(site, make_campaigns):
    figure = discharge_figure(site, make_campaigns(1, storage=False))
    routed = next(line for line in figure.legends[0].get_lines() if line.get_label() == "routed")
    assert routed.get_color() == mark(2).colour


def test_without_measurements_the_days_around_the_largest_discharge_are_drawn(site, make_campaigns):
    table = make_campaigns(0)
    (axes,) = discharge_figure(site, table).axes
    assert axes.get_title(loc="left") == "no measurements: around the largest discharge"
    routed = table.series[-1]
    peak = day_numbers(routed.time_s)[np.argmax(np.abs(routed.discharge_m3_s))]
    first, last = axes.get_xlim()
    assert first <= peak <= last
    assert last - first <= 2.0
    assert day_numbers(routed.time_s)[0] <= first
    assert last <= day_numbers(routed.time_s)[-1]


def test_of_many_campaigns_some_are_drawn_and_the_others_counted(site, make_campaigns):
    figure = discharge_figure(site, make_campaigns(9))
    assert len(figure.axes) == MOST_CAMPAIGNS
    starts = [axes.get_xlim()[0] for axes in figure.axes]
    assert starts == sorted(starts)
    title = figure.legends[0].get_title().get_text().replace("\n", " ")
    assert f"{9 - MOST_CAMPAIGNS} more not drawn" in title


def test_measurements_far_apart_share_one_panel(site, make_campaigns):
    whole = make_campaigns(1)
    measured = DischargeSeries(
        source="measured",
        time_s=whole.series[-1].time_s[[0, 10]],
        discharge_m3_s=np.array([1.0, 2.0]),
        standard_error_m3_s=np.array([1.0, 1.0]),
    )
    table = dataclasses.replace(whole, series=(*whole.series[:-1], measured))
    assert len(discharge_figure(site, table).axes) == 1
