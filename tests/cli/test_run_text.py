"""What `tidescour run` prints of its results, for a person at a terminal."""

import runpy
from dataclasses import replace
from pathlib import Path

import pytest

from tidescour.cli.running import _results_text

INVENTED = runpy.run_path(str(Path(__file__).parents[1] / "handoff" / "invented.py"))


@pytest.fixture(scope="module")
def results():
    return INVENTED["invented_results"](days=3.0)


def one_place(results, **changes):
    """Return the results of the first place alone, with something changed."""
    return replace(results, places=(replace(results.places[0], **changes),))


@pytest.mark.parametrize("columns", ["40", "60", "80", "100"])
def test_the_results_fit_the_terminal(results, columns, monkeypatch):
    monkeypatch.setenv("COLUMNS", columns)
    for line in _results_text(results).splitlines():
        assert len(line) <= int(columns), line


def test_all_rules_stand_side_by_side_in_metres_and_alpha(results, monkeypatch):
    monkeypatch.setenv("COLUMNS", "60")
    text = _results_text(one_place(results))
    steps = results.places[0].rows[-1].chain
    # Alphas of the builder: 1, 1.1, 1.2 and 0.7 times that of the row, and none.
    alpha = max(results.places[0].rows, key=lambda row: row.chain[0].share).duration.alpha
    assert f"final depth m {' '.join(f'{step.end_depth_m:.2f}' for step in steps)}" in " ".join(text.split())
    needed = [f"{factor * alpha:.2f}" for factor in (1.0, 1.1, 1.2, 0.7)]
    assert f"alpha needed {' '.join(needed)} - " in " ".join(text.split())
    assert "rule           integral  flow m.  cycle m.  peak  mean" in text


def test_the_length_is_told_as_given_required_and_by_a_single_slide(results, monkeypatch):
    monkeypatch.setenv("COLUMNS", "100")
    place = results.places[0]
    required = replace(place.required, length_m=61.25, single_slide_m=22.5, minimum_m=18.0)
    text = _results_text(one_place(results, required=required))
    assert "length given 90.0 m; required 61.2 m at a slope of 1 in 6 (22.5 m by a single slide)" in text
    text = " ".join(_results_text(one_place(results, required=replace(required, minimum_m=24.0))).split())
    assert "(22.5 m by a single slide, under the least length of 24.0 m)" in text
    bed = place.place.model_copy(update={"depth_margin_factor": 1.2})
    short = replace(required, length_m=101.0, single_slide_m=float("nan"))
    text = _results_text(one_place(results, place=bed, required=short, length_reached_s=20914 * 86400.0 + 5.0))
    assert (
        "length given 90.0 m; too short from 2027-04-06 on; required 101.0 m at a slope of 1 in 6, margin 1.2\n" in text
    )


def test_the_changes_that_matter_most_are_named_in_metres(results, monkeypatch):
    monkeypatch.setenv("COLUMNS", "100")
    lines = _results_text(one_place(results)).split("\n\nstone")[0].splitlines()[-3:]
    assert [line.split(":")[0] for line in lines] == [
        "alpha 10 % higher",
        "failure slope flatter by 1 (1 in n + 1)",
        "flow spreading 1 in 8 to either side",
    ]
    assert lines[1].endswith(": depth +0.00 m, length +6.5 m")
    assert lines[2].endswith("length -2.5 m")


def test_a_place_where_nothing_grows_has_depths_alone():
    still = INVENTED["invented_results"](days=3.0, openings=("gap",), still_place="gap")
    text = _results_text(still)
    assert "final depth m" in text
    assert "\nalpha needed" not in text
