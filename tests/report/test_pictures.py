import itertools
import xml.etree.ElementTree as ElementTree
from dataclasses import replace

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Text

from tidescour.bed.stone_records import StoneScreening
from tidescour.handoff.records import CalibrationResults
from tidescour.report.figures_basin import discharge_figure, levels_figure
from tidescour.report.figures_gap import COLOUR_BAR
from tidescour.report.figures_scour import shares_figure
from tidescour.report.figures_sweep import sweep_figure
from tidescour.report.pictures import calibration_pictures, picture_files, pictures
from tidescour.report.style import house_style, lay_out, rendered

NAMES = [
    "records",
    "sections",
    "gap-velocity",
    "velocity-by-head",
    "end-velocity",
    "peak-tides",
    "growth",
    "growth-calendar",
    "shares",
    "comparison",
    "length",
    "sensitivity",
]
LAST = "stone"
LONG = "Sill of dumped stone, northern part, with $B$ and all".ljust(80, "x")


def figures(results, **others):
    """Return the figures of a run by name, laid out but not written."""
    from tidescour.report import pictures as module

    drawn = {}
    with house_style():
        for sheet in module._SHEETS:
            drawn[sheet.name] = sheet.draw(results)
        drawn |= {name: draw() for name, draw in others.items()}
        for figure in drawn.values():
            lay_out(figure)
    return drawn


@pytest.fixture(scope="module")
def drawn(results):
    return pictures(results)


@pytest.fixture(scope="module", params=["two", "one", "twelve"])
def any_figures(request, results, make_results, make_sweep, make_calibrated, make_campaigns, site):
    if request.param == "two":
        run, days, campaigns = results, 20.0, 2
    elif request.param == "one":
        run = make_results(stages=(LONG,), openings=(LONG,), rule="cycle-mean", days=4.0)
        days, campaigns = 0.7, 1
    else:
        stages = tuple(f"{number:02d} {LONG}"[:80] for number in range(12))
        run = make_results(stages=stages, openings=(LONG, f"b {LONG}"[:80]), rule="flow-mean", days=4.0)
        days, campaigns = 400.0, 9
    name = run.plan.stage[0].opening[0].name
    return figures(
        run,
        sweep=lambda: sweep_figure(run, make_sweep(name)),
        levels=lambda: levels_figure(site, make_calibrated(days)),
        discharge=lambda: discharge_figure(site, make_campaigns(campaigns, name)),
    )


def test_a_run_has_its_figures_in_two_formats(drawn):
    assert [picture.name for picture in drawn] == [*NAMES, LAST]
    files = picture_files(drawn)
    assert set(files) == {f"figures/{name}.{kind}" for name in (*NAMES, LAST) for kind in ("png", "svg")}
    for picture in drawn:
        assert files[f"figures/{picture.name}.png"].startswith(b"\x89PNG\r\n\x1a\n")
        assert ElementTree.fromstring(files[f"figures/{picture.name}.svg"]).tag == "{http://www.w3.org/2000/svg}svg"
        assert picture.caption.endswith(".")


def test_a_sweep_has_its_figure_where_it_has_curves(results, make_sweep, drawn):
    with_sweep = pictures(replace(results, sweep=make_sweep("main gap")))
    assert [picture.name for picture in with_sweep] == [*NAMES, "sweep", LAST]
    assert (*with_sweep[:-2], with_sweep[-1]) == drawn


def test_a_calibration_has_its_levels_and_a_sheet_for_all_openings_and_each_measured_one(
    results, make_calibrated, make_campaigns
):
    calibrated = make_calibrated(campaigns=[make_campaigns(0, ""), make_campaigns(2, "shoal", storage=False)])
    found = calibration_pictures(CalibrationResults(plan=results.plan, calibrated=calibrated, files=(), findings=()))
    assert [picture.name for picture in found] == ["levels", "discharge", "discharge-2"]
    for picture in found:
        assert picture.png.startswith(b"\x89PNG\r\n\x1a\n")
        assert ElementTree.fromstring(picture.svg).tag == "{http://www.w3.org/2000/svg}svg"
        assert picture.caption.endswith(".")


def test_settings_of_the_machine_neither_change_a_picture_nor_are_changed(results, drawn):
    before = dict(mpl.rcParams)
    with mpl.rc_context({"font.size": 23.0, "axes.grid": False, "svg.hashsalt": "other", "lines.linewidth": 9.0}):
        assert pictures(results) == drawn
        assert mpl.rcParams["font.size"] == 23.0
    assert dict(mpl.rcParams) == before


def test_pictures_name_no_day_and_no_drawing_library(drawn):
    for picture in drawn:
        assert b"dc:date" not in picture.svg
        assert b"dc:creator" not in picture.svg
        assert b"tEXt" not in picture.png


def test_pictures_of_a_long_run_stay_small(make_results):
    long_run = make_results(stages=("a", "b"), days=60.0, step_s=60.0, record_samples=60_000)
    for picture in pictures(long_run):
        assert len(picture.svg) < 1_000_000, picture.name
        assert len(picture.png) < 1_000_000, picture.name


def test_a_run_without_gauges_curves_of_the_sweep_and_stone_has_no_figures_of_them(make_results, make_sweep):
    run = make_results(record_samples=1200, days=2.0)
    none_swept, no_stone = make_sweep("main gap", crest=False, width=False), StoneScreening(sizes=(), findings=())
    without = replace(run, records=(), sweep=none_swept, stone=no_stone)
    assert [picture.name for picture in pictures(without)] == NAMES[1:]


def test_every_axis_has_a_quantity_and_a_unit(any_figures):
    for name, figure in any_figures.items():
        last = figure.axes[-1]
        for axes in figure.axes:
            own_x = axes.get_xlabel() or last.get_xlabel()
            assert "[" in own_x or axes.get_label() == COLOUR_BAR, name
            sharing = axes.get_shared_y_axes().get_siblings(axes)
            named = " ".join(label.get_text() for each in sharing for label in each.get_yticklabels())
            assert (
                "[" in axes.get_ylabel() or {"comparison": "side", "sensitivity": "higher"}.get(name, "side") in named
            )


def test_levels_name_the_datum_and_times_name_utc(any_figures):
    for axes in any_figures["records"].axes:
        assert "above\ninvented datum 2026" in axes.get_ylabel()
    for axes in (*any_figures["sections"].axes, any_figures["levels"].axes[0]):
        assert "above\ninvented datum 2026" in axes.get_ylabel()
    assert "invented datum 2026" in any_figures["sweep"].axes[-2].get_xlabel()
    for name in ("records", "gap-velocity", "end-velocity", "growth-calendar", "levels", "discharge"):
        assert "UTC" in any_figures[name].axes[-1].get_xlabel()
    assert all("UTC" in axes.get_xlabel() for axes in any_figures["peak-tides"].axes)


def test_no_letter_is_smaller_than_nine_points(any_figures):
    for figure in any_figures.values():
        for text in figure.findobj(Text):
            assert not text.get_text() or text.get_fontsize() >= 9.0


def test_nothing_is_cut_off(any_figures):
    for name, figure in any_figures.items():
        renderer = FigureCanvasAgg(figure).get_renderer()
        inked = figure.get_tightbbox(renderer)
        width, height = figure.get_size_inches()
        assert inked.x0 > -0.01, name
        assert inked.y0 > -0.01, name
        assert inked.x1 < width + 0.01, name
        assert inked.y1 < height + 0.01, name


def test_title_key_and_panels_do_not_lie_on_one_another(any_figures):
    for name, figure in any_figures.items():
        renderer = FigureCanvasAgg(figure).get_renderer()
        boxes = [axes.get_tightbbox(renderer) for axes in figure.axes]
        boxes += [legend.get_window_extent(renderer) for legend in figure.legends]
        for number, first in enumerate(boxes):
            for second in boxes[number + 1 :]:
                width = min(first.x1, second.x1) - max(first.x0, second.x0)
                height = min(first.y1, second.y1) - max(first.y0, second.y0)
                assert width < 2.0 or height < 2.0, name


def test_labels_of_places_do_not_lie_on_one_another(any_figures):
    for name in ("shares",):
        figure = any_figures[name]
        renderer = FigureCanvasAgg(figure).get_renderer()
        labels = figure.axes[0].get_yticklabels()
        boxes = [label.get_window_extent(renderer) for label in labels]
        assert len(boxes) >= 2
        for upper, lower in itertools.pairwise(boxes):
            assert lower.y1 < upper.y0, name


def test_a_name_with_dollar_signs_is_no_formula(make_results):
    run = make_results(stages=("$a_b", "c$"), openings=(r"\frac{1}$ $",), days=2.0, record_samples=1200)
    texts = [text.get_text() for text in figures(run)["growth"].findobj(Text)]
    assert "1  $a_b" in texts
    assert np.any([r"\frac{1}$ $" in text for text in texts])


def test_a_name_in_letters_that_the_font_lacks_is_drawn_without_complaint(make_results):
    run = make_results(stages=("방조제",), openings=("물막이",), days=2.0, record_samples=1200)
    with house_style():
        png, _ = rendered(shares_figure(run))
    assert png.startswith(b"\x89PNG")
