import dataclasses
import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Text

from tidescour.report.figures_gap import (
    COLOUR_BAR,
    MOST_LOOPS,
    loop_figure,
    main_opening,
    numbers_text,
    section_figure,
    spread,
)
from tidescour.report.style import house_style, lay_out, mark


@pytest.fixture(autouse=True)
def styled():
    with house_style():
        yield


def texts(axes):
    return [text.get_text() for text in axes.texts]


def with_openings(results, change):
    """Return a run whose main gap is changed by a function of the number of the stage, from 0."""
    stages = []
    for number, stage in enumerate(results.plan.stage):
        kept = [opening for opening in stage.opening if opening.name != "main gap"]
        main = next(opening for opening in stage.opening if opening.name == "main gap")
        updates = change(number)
        changed = () if updates is None else (main.model_copy(update=updates),)
        stages.append(stage.model_copy(update={"opening": (*changed, *kept)}))
    return dataclasses.replace(results, plan=results.plan.model_copy(update={"stage": tuple(stages)}))


def outlines(axes):
    """Return the outlines of the stages, without the levels across the panel."""
    return [np.array(line.get_xydata()) for line in axes.get_lines() if len(line.get_xdata()) > 2]


@given(st.lists(st.floats(0.0, 1.0), min_size=1, max_size=20), st.floats(0.001, 0.05))
@settings(max_examples=150, deadline=None)
def test_spread_labels_keep_their_order_their_distance_and_the_panel(values, gap):
    position = np.sort(values)
    moved = spread(position, gap, 0.0, 1.0)
    assert np.all(np.diff(moved) >= gap - 1e-9)
    assert moved[0] >= -1e-9
    assert moved[-1] <= 1.0 + 1e-9
    if position.size == 1 or np.diff(position).min() >= gap:
        assert moved == pytest.approx(position)


def test_labels_in_one_place_move_up_and_down_alike_and_too_many_start_at_the_foot():
    assert spread(np.array([0.5, 0.5, 0.5]), 0.1, 0.0, 1.0) == pytest.approx([0.4, 0.5, 0.6])
    assert spread(np.array([0.1, 0.5, 0.5]), 0.1, 0.0, 1.0) == pytest.approx([0.1, 0.45, 0.55])
    assert spread(np.array([0.9, 0.9, 0.9]), 0.6, 0.0, 1.0) == pytest.approx([0.0, 0.6, 1.2])


@pytest.mark.parametrize(
    ("numbers", "text"), [([1], "1"), ([1, 2], "1–2"), ([1, 3, 4, 5, 9], "1, 3–5, 9"), ([2, 4], "2, 4"), ([], "")]
)
def test_numbers_of_stages_are_written_as_spells(numbers, text):
    assert numbers_text(numbers) == text


def test_a_section_names_crests_widths_sea_levels_and_the_bed(results):
    main, shoal = section_figure(results).axes
    level = np.concatenate([flow.level_sea_m for flow in results.flows])
    assert texts(main) == [
        "bed behind the protection −9.00 m",
        "1: −6.00 m, 400 m wide",
        "2: −4.00 m, 400 m wide",
        f"lowest sea level −{-level.min():.2f} m",
        f"highest sea level +{level.max():.2f} m",
    ]
    assert "2: −4.00 m, 300 m wide" in texts(shoal)
    assert [axes.get_title(loc="left") for axes in (main, shoal)] == ["main gap", "shoal"]


def test_a_trapezoid_is_drawn_with_the_crest_width_and_slopes_of_the_end_of_the_stage(results):
    run = with_openings(
        results, lambda number: {"crest_level_end_m": -3.0 - number, "width_end_m": 200.0, "side_slope": 2.0}
    )
    axes = section_figure(run).axes[0]
    top = axes.get_ylim()[1]
    for number, outline in enumerate(outlines(axes)):
        crest = -3.0 - number
        reach = 100.0 + 2.0 * (top - crest)
        assert outline == pytest.approx(np.array([[-reach, top], [-100.0, crest], [100.0, crest], [reach, top]]))
    lines = [line for line in axes.get_lines() if len(line.get_xdata()) > 2]
    assert [line.get_color() for line in lines] == [mark(0).colour, mark(1).colour]
    low, high = axes.get_xlim()
    assert low < -100.0 - 2.0 * (top + 4.0)
    assert high > 100.0 + 2.0 * (top + 4.0)


def test_a_profile_is_filled_to_the_crest_where_that_meets_the_ground(results):
    points = ((0.0, 2.0), (100.0, -8.0), (300.0, -8.0), (400.0, 2.0))
    run = with_openings(
        results,
        lambda number: {"profile_points": points, "width_m": None, "crest_level_m": -8.0 if number == 0 else -3.0},
    )
    axes = section_figure(run).axes[0]
    bare, filled = outlines(axes)
    assert bare[1:-1] == pytest.approx(np.array(points))
    # A slope of 1 in 10 from 2 m at 0: -3 m is met at 50 m, and at 350 m on the other side.
    assert filled[1:-1] == pytest.approx(
        np.array([[0.0, 2.0], [50.0, -3.0], [100.0, -3.0], [300.0, -3.0], [350.0, -3.0], [400.0, 2.0]])
    )
    assert axes.get_xlabel() == "distance along the profile [m]"
    assert "2: −3.00 m" in texts(axes)


def test_stages_of_one_geometry_are_named_together_and_absent_ones_in_the_title(make_results):
    run = make_results(stages=("a", "b", "c", "d"), days=2.0)
    same = with_openings(run, lambda number: {"crest_level_m": -5.0} if number < 3 else None)
    axes = section_figure(same).axes[0]
    assert "1–3: −5.00 m, 400 m wide" in texts(axes)
    assert axes.get_title(loc="left") == "main gap (not there in stage 4)"


def test_beds_that_differ_are_named_by_their_side(results):
    places = tuple(
        dataclasses.replace(place, place=place.place.model_copy(update={"bed_level_m": -11.0}))
        if place.place.side == "sea"
        else place
        for place in results.places
    )
    labels = texts(section_figure(dataclasses.replace(results, places=places)).axes[0])
    assert "bed behind the protection, sea side −11.00 m" in labels
    assert "bed behind the protection, basin side −9.00 m" in labels


def test_labels_of_many_stages_do_not_lie_on_one_another(make_results):
    run = make_results(stages=tuple(f"stage {number}" for number in range(20)), days=1.0, openings=("main gap",))
    figure = section_figure(run)
    lay_out(figure)
    renderer = FigureCanvasAgg(figure).get_renderer()
    boxes = [Text.get_window_extent(text, renderer) for text in figure.axes[0].texts]
    assert len(boxes) == 23
    for lower, upper in itertools.pairwise(boxes):
        assert lower.y1 - upper.y0 < 1.0


def test_the_opening_that_most_water_passes_is_the_main_one(results, make_results):
    assert main_opening(results) == "main gap"
    assert main_opening(make_results(still_place="main gap", days=2.0)) == "shoal"


def test_a_loop_is_velocity_against_head_from_one_low_water_to_the_next(results):
    *panels, bar = loop_figure(results).axes
    assert len(panels) == len(results.plan.stage)
    assert bar.get_label() == COLOUR_BAR
    assert bar.get_ylabel() == "time after low water at sea [h]"
    for axes, flow in zip(panels, results.flows, strict=True):
        (points,) = axes.collections
        head, velocity = np.array(points.get_offsets()).T
        # The invented gap runs by 0.95 sqrt(2 g head).
        assert np.abs(velocity) == pytest.approx(0.95 * np.sqrt(2.0 * 9.81 * np.abs(head)))
        assert np.all(velocity * head >= 0.0)
        hours = np.array(points.get_array())
        assert hours[0] == 0.0
        assert 12.0 < hours[-1] < 13.0
        written = next(title for title in axes.get_title(loc="left").splitlines() if "range" in title)
        # Highest to lowest level of 1.4 m M2 with 0.3 m S2 is at most 3.4 m.
        assert 3.0 < float(written.split()[1]) <= 3.4
        first = flow.time_s[np.argmin(np.abs(flow.head_m - head[0]))]
        assert flow.time_s[0] <= first <= flow.time_s[-1]
        assert {"↗ flood", "↙ ebb"} <= set(texts(axes))
        assert sum(text.endswith(" h") for text in texts(axes)) >= 3


def test_the_tide_of_the_largest_range_without_a_hole_is_taken(make_results):
    run = make_results(stages=("a",), openings=("main gap",), days=16.0)
    (flow,) = run.flows
    full = loop_figure(run).axes[0].get_title(loc="left")
    covered = flow.covered.copy()
    covered[: np.searchsorted(flow.time_s, flow.time_s[0] + 6.0 * 86400.0)] = False
    part = dataclasses.replace(run, flows=(dataclasses.replace(flow, covered=covered),))
    later = loop_figure(part).axes[0].get_title(loc="left")
    assert full.startswith("1: from 2027-04-")
    assert later > "1: from 2027-04-07"
    assert float(later.split()[-2]) <= float(full.split()[-2])


def test_a_stage_shorter_than_a_tide_is_drawn_whole(make_results):
    run = make_results(stages=("a",), openings=("main gap",), days=0.6)
    axes, _ = loop_figure(run).axes
    assert axes.get_title(loc="left").startswith("1: whole stage, hours from 2027-04-01 00:00,")
    (points,) = axes.collections
    assert np.array(points.get_array())[-1] == pytest.approx(14.4, abs=0.1)


def test_only_the_fastest_stages_are_drawn_where_there_are_many(make_results):
    run = make_results(stages=tuple("abcdefgh"), openings=("main gap",), days=1.5)
    figure = loop_figure(run)
    assert len(figure.axes) == MOST_LOOPS + 1
    peaks = [float(np.abs(flow.openings[0].gap_velocity_m_s).max()) for flow in run.flows]
    drawn = [int(axes.get_title(loc="left").split(":")[0]) - 1 for axes in figure.axes[:-1]]
    assert drawn == sorted(drawn)
    assert "2 more not drawn" in figure.legends[0].get_title().get_text().replace("\n", " ")
    # The invented gap runs faster from stage to stage.
    assert drawn == [2, 3, 4, 5, 6, 7]
    assert min(peaks[number] for number in drawn) > max(peaks[:2]) - 0.05


def test_a_run_of_given_velocities_has_no_loop_and_says_so(results):
    flows = tuple(
        dataclasses.replace(
            flow,
            openings=tuple(
                dataclasses.replace(
                    opening,
                    discharge_m3_s=np.full(flow.time_s.shape, np.nan),
                    gap_velocity_m_s=np.full(flow.time_s.shape, np.nan),
                    given_end_velocity_m_s=opening.gap_velocity_m_s,
                )
                for opening in flow.openings
            ),
        )
        for flow in results.flows
    )
    run = dataclasses.replace(results, flows=flows)
    assert main_opening(run) == ""
    (axes,) = loop_figure(run).axes
    assert texts(axes) == ["no discharge is known"]
