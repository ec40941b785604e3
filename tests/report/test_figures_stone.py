import dataclasses
import runpy
from pathlib import Path

import numpy as np
import pytest

from tidescour.bed.stone import STABILITY
from tidescour.bed.stone_records import LOCATIONS, StoneScreening
from tidescour.report.figures_stone import stone_figure
from tidescour.report.style import house_style, mark

INVENTED = runpy.run_path(str(Path(__file__).parents[1] / "handoff" / "invented_stone.py"))


@pytest.fixture(autouse=True)
def styled():
    with house_style():
        yield


@pytest.fixture
def screening(results):
    return StoneScreening(
        sizes=tuple(
            INVENTED["invented_size"](
                stage=stage.name,
                opening=opening,
                direction=direction,
                location=location,
                size_m=tuple((1.0 + number) * factor * np.array([0.2, 0.4, np.nan if at == 1 else 0.1, 0.3])),
            )
            for number, stage in enumerate(results.plan.stage)
            for opening in ("main gap", "shoal")
            for direction, factor in (("flood", 1.0), ("ebb", 0.7))
            for at, location in enumerate(LOCATIONS)
        ),
        findings=(),
    )


def points(axes):
    return [line for line in axes.get_lines() if len(line.get_xdata()) == 1]


def test_a_panel_holds_every_form_by_stage_flood_filled_and_ebb_open(results, screening):
    figure = stone_figure(results, screening)
    grid = np.array(figure.axes).reshape(2, 3)
    drawn = points(grid[0, 0])
    assert len(drawn) == 2 * 2 * len(STABILITY)
    flood = [line for line in drawn if line.get_markerfacecolor() != "none"]
    assert [line.get_ydata()[0] for line in flood] == pytest.approx([0.2, 0.4, 0.1, 0.3, 0.4, 0.8, 0.2, 0.6])
    assert [line.get_marker() for line in flood[:4]] == [mark(number).marker for number in range(4)]
    # A stage has its own room, in the order of the table.
    assert [round(float(line.get_xdata()[0])) for line in flood] == [1] * 4 + [2] * 4
    assert np.all(np.diff([line.get_xdata()[0] for line in flood]) > 0.0)
    assert [axes.get_title(loc="left").splitlines()[-1] for axes in grid[0]] == list(LOCATIONS)


def test_a_form_without_a_size_stands_in_a_strip_at_the_foot(results, screening):
    figure = stone_figure(results, screening)
    axes = np.array(figure.axes).reshape(2, 3)[1, 1]
    shields = [line for line in points(axes) if line.get_marker() == mark(2).marker]
    (edge,) = (line.get_ydata()[0] for line in axes.get_lines() if len(line.get_xdata()) == 2)
    low = axes.get_ylim()[0]
    smallest = min(value for size in screening.sizes for value in size.size_m if value > 0.0)
    assert len(shields) == 4
    assert all(low < line.get_ydata()[0] < edge < smallest for line in shields)
    # Flood and ebb stand over each other, not one on the other.
    assert len({line.get_ydata()[0] for line in shields}) == 2
    assert "no size" in [label.get_text() for label in figure.axes[0].get_yticklabels()]


def test_without_forms_that_have_no_size_there_is_no_strip(results, screening):
    kept = tuple(each for each in screening.sizes if each.load.location == "crest")
    axes = stone_figure(results, dataclasses.replace(screening, sizes=kept)).axes[0]
    assert "no size" not in [label.get_text() for label in axes.get_yticklabels()]
    assert len(points(axes)) == len(axes.get_lines())


def test_sizes_of_which_none_is_known_stand_in_the_strip(results, screening):
    unknown = tuple(dataclasses.replace(each, size_m=(np.nan,) * len(STABILITY)) for each in screening.sizes)
    axes = stone_figure(results, dataclasses.replace(screening, sizes=unknown)).axes[0]
    assert all(line.get_ydata()[0] < 1.0 / 1.3 for line in points(axes))


def test_all_panels_share_a_logarithmic_axis_that_holds_every_size(results, screening):
    figure = stone_figure(results, screening)
    for axes in figure.axes:
        assert axes.get_yscale() == "log"
        low, high = axes.get_ylim()
        assert low < 0.07
        assert high > 0.8


def test_the_figure_says_what_it_is_not(results, screening):
    legend = stone_figure(results, screening).legends[0]
    assert "screening only, not a design of the protection" in legend.get_title().get_text().replace("\n", " ")
    labels = [text.get_text() for text in legend.get_texts()]
    assert labels == [
        "Izbash, embedded, size d",
        "Izbash, exposed, size d",
        "Shields, D_n50",
        "Pilarczyk, D_n50",
        "flood: filled",
        "ebb: open",
    ]


def test_a_location_without_load_says_so(results, screening):
    kept = tuple(each for each in screening.sizes if each.load.location == "end of protection")
    crest = stone_figure(results, dataclasses.replace(screening, sizes=kept)).axes[0]
    assert [text.get_text() for text in crest.texts] == ["no load here"]
    nothing = stone_figure(results, StoneScreening(sizes=(), findings=()))
    assert [text.get_text() for axes in nothing.axes for text in axes.texts] == ["no load here"] * 3
