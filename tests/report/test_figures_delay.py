import runpy
from pathlib import Path

import numpy as np
import pytest

from tidescour.report.figures_delay import delay_figure, delay_pictures
from tidescour.report.style import house_style, mark

INVENTED = runpy.run_path(str(Path(__file__).parents[1] / "study" / "invented_delay.py"))


def lines(axes):
    return [line for line in axes.get_lines() if len(line.get_xdata()) == 4]


def test_each_place_has_its_panel_and_each_late_stage_its_two_lines_from_nothing():
    with house_style():
        figure = delay_figure(INVENTED["invented_study"]())
    assert [axes.get_title(loc="left").splitlines()[-1] for axes in figure.axes] == [
        "as planned 4.00 m deep, 40.0 m required",
        "as planned 6.00 m deep, 60.0 m required",
    ]
    own, calendar, second, empty = lines(figure.axes[1])
    assert list(own.get_xdata()) == [0, 1, 2, 4]
    assert list(own.get_ydata()) == [0.0, 0.1, 0.3, 0.8]
    assert list(calendar.get_ydata()) == [0.0, 0.05, 0.15, 0.4]
    assert list(second.get_ydata()) == [0.0, 0.2, 0.5, 1.2]
    assert np.isnan(empty.get_ydata()[1:]).all()
    # Looks are those of the stages' numbers in the plan, whose first cannot be late.
    assert (own.get_color(), own.get_marker()) == (mark(1).colour, mark(1).marker)
    assert (second.get_color(), second.get_marker()) == (mark(2).colour, mark(2).marker)
    assert [line.get_fillstyle() for line in (own, calendar)] == ["full", "none"]
    assert [text.get_text() for text in figure.legends[-1].get_texts()] == ["2  first", "3  second"]


def test_a_study_without_rows_says_so():
    with house_style():
        figure = delay_figure(INVENTED["invented_study"]({}))
    assert "no stage can be late" in figure.axes[0].texts[0].get_text()


@pytest.mark.slow
def test_the_same_study_gives_the_same_bytes():
    one, other = (delay_pictures(INVENTED["invented_study"]())[0] for _ in range(2))
    assert one.png.startswith(b"\x89PNG")
    assert (one.png, one.svg) == (other.png, other.svg)
