import runpy
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from tidescour.report.figures_soundings import soundings_figure, soundings_pictures
from tidescour.report.style import day_numbers, house_style

INVENTED = runpy.run_path(str(Path(__file__).parents[1] / "study" / "invented_soundings.py"))


@pytest.fixture(autouse=True)
def styled():
    with house_style():
        yield


@pytest.fixture(scope="module")
def results():
    return INVENTED["invented_results"](stop_depth_m=5.5, length_m=900.0)


def texts(axes):
    return " | ".join(text.get_text() for text in axes.texts)


def test_a_place_shows_law_sounding_forecast_and_limits(results):
    axes = soundings_figure(results).axes[0]
    forecast = results.places[0].forecast
    (container,) = axes.containers
    assert container[0].get_ydata().tolist() == [3.6]
    # 90 % of a normal error lie within 1.645 standard errors.
    (bar,) = container[2]
    assert np.diff(bar.get_segments()[0][:, 1]) == pytest.approx(2.0 * 1.645 * 0.3)
    drawn = [line.get_ydata() for line in axes.get_lines()]
    for curve in (forecast.band.depth_m[1], forecast.restart_unscaled_m, results.places[0].hindcast_m):
        assert any(len(values) == len(curve) and np.allclose(values, curve) for values in drawn)
    assert any(list(values) == [5.5, 5.5] for values in drawn)
    # The given length allows 90 m, far above: named, not drawn.
    assert "90 m, above" in texts(axes)
    assert axes.get_ylim()[1] < 20.0
    assert "factor 0.75" in axes.get_title(loc="left")


def test_a_place_without_soundings_says_so(results):
    axes = soundings_figure(results).axes[1]
    assert "not sounded" in axes.get_title(loc="left")
    band = results.places[1].forecast.band
    assert band.time_s[0] == INVENTED["START_S"]
    assert any(np.array_equal(line.get_xdata(), day_numbers(band.time_s)) for line in axes.get_lines())


def test_planned_dates_stand_over_actual_ones(results):
    axes = soundings_figure(results).axes[2]
    spans = [(bar.get_x(), bar.get_x() + bar.get_width()) for bars in axes.containers for bar in bars]
    first = day_numbers(INVENTED["START_S"])
    np.testing.assert_allclose(np.array(spans) - first, [(0.0, 25.0), (0.0, 30.0), (30.0, 60.0)], atol=1e-6)


def test_a_planned_date_that_stands_alone_is_drawn(results):
    alone = [stage.model_copy(update={"planned_start": None}) for stage in results.plan.stage]
    lone = results.plan.model_copy(update={"stage": tuple(alone)})
    axes = soundings_figure(replace(results, plan=lone)).axes[2]
    (alone,) = (line for line in axes.get_lines() if line.get_marker() == "D")
    assert alone.get_xdata() - day_numbers(INVENTED["START_S"]) == pytest.approx([25.0])
    assert "one alone a diamond" in axes.get_title(loc="left")
    assert "diamond" not in soundings_figure(results).axes[2].get_title(loc="left")


def test_the_law_is_named_with_the_factor_of_the_plan(results):
    def key(one):
        return [text.get_text() for legend in soundings_figure(one).legends for text in legend.get_texts()]

    assert "by the law alone" in key(results)
    scaled = INVENTED["invented_results"](growth_factor=0.8)
    assert "by the law alone" not in key(scaled)
    assert "by the law, with the plan's growth_factor" in key(scaled)


def test_without_planned_dates_there_is_no_panel_of_them(results):
    stages = tuple(
        stage.model_copy(update={"planned_start": None, "planned_end": None}) for stage in results.plan.stage
    )
    bare = results.plan.model_copy(update={"stage": stages})
    assert len(soundings_figure(replace(results, plan=bare)).axes) == 2


def test_the_picture_is_one_with_its_words(results):
    (picture,) = soundings_pictures(results)
    assert picture.name == "soundings"
    assert picture.png.startswith(b"\x89PNG")
    assert b"<svg" in picture.svg
    assert "90 %" in picture.caption
