import numpy as np
import pytest
from matplotlib.colors import same_color

from tidescour.report.figures_sweep import TIDE_DASHES, merged_numbers, sweep_figure
from tidescour.report.style import SIDE_MARKS, house_style


@pytest.fixture(autouse=True)
def styled():
    with house_style():
        yield


def curves(axes):
    return [line for line in axes.get_lines() if len(line.get_xdata()) > 2]


def test_each_panel_holds_its_quantity_by_tide_and_direction(results, make_sweep):
    sweep = make_sweep("main gap")
    grid = np.array(sweep_figure(results, sweep).axes).reshape(3, 2)
    for column, curve in ((0, sweep.crest), (1, sweep.width)):
        for row, name in enumerate(("head_m", "gap_velocity_m_s", "unit_discharge_m2_s")):
            lines = curves(grid[row, column])
            values = np.array([line.get_ydata() for line in lines]).reshape(3, 2, -1)
            assert values == pytest.approx(np.moveaxis(getattr(curve, name), 0, 2))
            assert all(line.get_xdata() == pytest.approx(curve.value_m) for line in lines)
            low, high = grid[row, column].get_ylim()
            assert low == 0.0
            assert high > values.max()


def test_tides_differ_by_dash_and_directions_by_colour_and_marker(results, make_sweep):
    figure = sweep_figure(results, make_sweep("main gap"))
    lines = np.array(curves(figure.axes[0])).reshape(3, 2)
    for way, side in ((0, "basin"), (1, "sea")):
        assert all(same_color(line.get_color(), SIDE_MARKS[side].colour) for line in lines[:, way])
        assert {line.get_marker() for line in lines[:, way]} == {SIDE_MARKS[side].marker}
    styles = [[str(line.get_linestyle()) for line in tide] for tide in lines]
    assert styles[0] == ["-", "-"]
    assert len(set(TIDE_DASHES)) == 3
    assert [text.get_text() for text in figure.legends[0].get_texts()] == [
        "spring, range 3.00 m",
        "mean, range 2.00 m",
        "neap, range 1.00 m",
        "flood",
        "ebb",
    ]


def test_closure_goes_on_to_the_right_in_both_columns(results, make_sweep):
    grid = np.array(sweep_figure(results, make_sweep("main gap")).axes).reshape(3, 2)
    for axes in grid[:, 0]:
        assert axes.get_xlim()[0] < axes.get_xlim()[1]
    for axes in grid[:, 1]:
        assert axes.get_xlim()[0] > 400.0
        assert axes.get_xlim()[1] < 8.0
        assert axes.get_xscale() == "log"
    assert [label.get_text() for label in grid[2, 1].get_xticklabels()] == ["10", "20", "50", "100", "200"]


def test_stages_stand_at_their_crests_and_widths(results, make_sweep):
    grid = np.array(sweep_figure(results, make_sweep("main gap")).axes).reshape(3, 2)
    for axes in grid[:, 0]:
        marks = [line.get_xdata()[0] for line in axes.get_lines() if len(line.get_xdata()) == 2]
        assert sorted(marks) == pytest.approx([-6.0, -4.0])
    assert [(text.get_text(), text.xy[0]) for text in grid[0, 0].texts] == [("1", -6.0), ("2", -4.0)]
    assert [(text.get_text(), text.xy[0]) for text in grid[0, 1].texts] == [("1–2", 400.0)]
    assert grid[0, 0].get_title(loc="left") == "raising the crest, width kept at 400 m"
    assert grid[0, 1].get_title(loc="left") == "narrowing, crest kept at −6 m"


def test_a_curve_that_is_not_there_is_told(results, make_sweep):
    grid = np.array(sweep_figure(results, make_sweep("main gap", crest=False)).axes).reshape(3, 2)
    for axes in grid[:, 0]:
        assert [text.get_text() for text in axes.texts] == ["not swept, see the findings"]
        assert not curves(axes)
    assert len(curves(grid[0, 1])) == 6


def test_numbers_that_would_touch_are_written_together():
    assert merged_numbers({1: 0.0, 2: 0.3, 3: 0.33, 5: 0.33, 4: 0.9}) == [(1, [1]), (2, [2, 3, 5]), (4, [4])]
    assert merged_numbers({}) == []
