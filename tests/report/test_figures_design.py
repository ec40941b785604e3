"""The pictures that lead to the design: rules compared, length of the protection, what each input is worth."""

import dataclasses

import numpy as np
import pytest

from tidescour.report.figures_comparison import comparison_figure
from tidescour.report.figures_length import length_figure, sensitivity_figure
from tidescour.report.style import house_style
from tidescour.scour.records import RULES


@pytest.fixture(autouse=True)
def styled():
    with house_style():
        yield


def texts(axes):
    return [text.get_text() for text in axes.texts]


@pytest.mark.parametrize("rule", ["integral", "cycle-mean"])
def test_all_five_rules_stand_in_hours_metres_and_alpha_and_the_one_that_drives_is_heavy(make_results, rule):
    run = make_results(rule=rule, openings=("gap",), days=3.0)
    hours, depth, alpha = comparison_figure(run).axes
    driving = RULES.index(rule)
    for place in run.places:
        largest = max(place.rows, key=lambda row: row.chain[driving].share)
        for number, name in enumerate(RULES):
            assert f"{largest.duration.total_h(name):.1f} h" in texts(hours)
            assert f"{place.rows[-1].chain[number].end_depth_m:.2f} m" in texts(depth)
        assert f"{largest.equal_alpha[3]:.2f}" in texts(alpha)
    assert texts(alpha).count("none") == len(run.places)
    for axes in (hours, depth, alpha):
        heavy = [at for at, patch in enumerate(axes.patches) if patch.get_linewidth() > 2.0]
        assert heavy == [driving, len(RULES) + driving]


def test_a_place_without_growth_has_no_hours_and_no_alpha(make_results):
    run = make_results(still_place="gap", openings=("gap",), days=3.0)
    hours, depth, alpha = comparison_figure(run).axes
    assert texts(hours) == ["0.0 h"] * 10
    assert texts(depth) == ["0.00 m"] * 10
    assert texts(alpha) == ["none"] * 10


def test_the_length_that_fits_lies_where_both_lines_cross(results):
    place = results.places[0]
    # margin 1.5, slope 1 in 6: 9 h(L) = 90 at L = 90, as h(90) = 10
    curve = dataclasses.replace(place.length_curve, final_depth_m=10.0 * (90.0 / place.length_curve.length_m) ** 0.12)
    bed = place.place.model_copy(update={"depth_margin_factor": 1.5})
    required = dataclasses.replace(place.required, length_m=90.0, minimum_m=30.0, governed_by_minimum=False)
    run = dataclasses.replace(
        results, places=(dataclasses.replace(place, place=bed, length_curve=curve, required=required),)
    )
    length, alpha, hours = length_figure(run).axes
    (asked,) = [line for line in length.get_lines() if line.get_linewidth() == 2.2]
    assert np.interp(90.0, asked.get_xdata(), asked.get_ydata()) == pytest.approx(90.0)
    (fixed,) = [line for line in length.get_lines() if line.get_marker() == "o"]
    assert fixed.get_xydata().tolist() == [[90.0, 90.0]]
    assert "90.0 m, 1 in 6" in texts(length)
    assert alpha.get_lines()[0].get_ydata() == pytest.approx(curve.alpha)
    assert hours.get_lines()[0].get_ydata() == pytest.approx(curve.effective_duration_h)


def test_common_slopes_are_drawn_and_named_but_not_those_that_need_another_scale(results):
    run = dataclasses.replace(results, places=results.places[:1])
    axes = length_figure(run).axes[0]
    assert [text for text in texts(axes) if "," in text and "m" not in text.split(",")[0]] == [
        "1 in 6, normally packed",
        "1 in 15, loose",
        "1 in 20, loose",
    ]
    thin = [line for line in axes.get_lines() if line.get_linewidth() == 0.7]
    depth_m = run.places[0].length_curve.final_depth_m[-1]
    assert [line.get_ydata()[-1] for line in thin] == pytest.approx([6.0 * depth_m, 15.0 * depth_m, 20.0 * depth_m])


def test_lengths_without_growth_say_so(make_results):
    run = make_results(still_place="gap", openings=("gap",), days=3.0)
    assert [texts(axes) for axes in length_figure(run).axes] == [["nothing grows here"]] * 6


def test_changes_come_largest_first_and_without_those_that_have_no_result(results):
    run = dataclasses.replace(results, places=results.places[:1])
    depth, length = sensitivity_figure(run).axes
    names = [label.get_text().replace("\N{NO-BREAK SPACE}", " ") for label in depth.get_yticklabels()]
    assert names == [
        "alpha 10 % higher",
        "failure slope flatter by 1 (1 in n + 1)",
        "flow spreading 1 in 8 to either side",
    ]
    assert texts(length) == ["+7.5", "+6.5", "\N{MINUS SIGN}2.5"]
    assert [patch.get_width() for patch in length.patches] == [7.5, 6.5, -2.5]
    # Each axis holds its numbers as well as its bars.
    low, high = length.get_xlim()
    assert low < -2.5 - 1.0
    assert high > 7.5 + 1.0


def test_a_place_without_any_result_says_so(results):
    place = dataclasses.replace(results.places[0], sensitivities=results.places[0].sensitivities[-1:])
    figure = sensitivity_figure(dataclasses.replace(results, places=(place,)))
    assert [texts(axes) for axes in figure.axes] == [["no change has a result"]] * 2
