"""Soundings over the programme: growth by the law, what was sounded, the forecast with its band, and dates kept."""

from __future__ import annotations

from datetime import datetime
from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from tidescour.report.figures_scour import DEPTH_LABEL
from tidescour.report.pictures import Picture
from tidescour.report.style import (
    BLACK,
    BLUE,
    GREEN,
    GREY,
    ORANGE,
    PALE,
    PURPLE,
    VERMILION,
    day_numbers,
    heading,
    house_style,
    new_figure,
    place_title,
    rendered,
    rows_and_columns,
    stage_bands,
    stage_key,
    stage_numbers,
    time_axis,
)
from tidescour.study.soundings import SoundedPlace, SoundingResults
from tidescour.study.stops import allowed_depth_m
from tidescour.units import FloatArray, seconds_since_epoch

_CAPTION: Final = (
    "Depth of every place: by the law as the plan has it, as it was sounded, and from the last sounding on with the "
    "growth factor that the soundings give, median and 90 % band; without soundings the band is what is assumed "
    "beforehand. Error bars: 1.64 standard errors either way, 90 %. Lines across: the depth from which the given "
    "length is too short, and that at which the works stop."
)
_NORMAL_90: Final = 1.645
_PLANNED, _COMPUTED = GREY, BLUE


def soundings_pictures(results: SoundingResults) -> tuple[Picture, ...]:
    """Return the figure of a comparison with soundings."""
    with house_style():
        png, svg = rendered(soundings_figure(results))
    return (Picture(name="soundings", caption=_CAPTION, png=png, svg=svg),)


def soundings_figure(results: SoundingResults) -> Figure:
    """Draw each place by the calendar, and under them planned and computed dates where the plan has planned ones."""
    planned = any(stage.planned_start or stage.planned_end for stage in results.plan.stage)
    rows, columns = rows_and_columns(len(results.places), 2)
    dates_in = 0.8 + 0.28 * len(results.plan.stage) if planned else 0.0
    figure = new_figure(3.1 * rows + dates_in)
    heading(figure, f"{results.plan.site.name}: growth and soundings", _key(results), columns=3)
    heights = [3.1] * rows + [dates_in] * planned
    grid = figure.add_gridspec(len(heights), columns, height_ratios=heights)
    for number, each in enumerate(results.places):
        axes = figure.add_subplot(grid[number // columns, number % columns])
        stage_bands(axes, results)
        _draw_place(axes, each)
    if planned:
        _draw_dates(figure.add_subplot(grid[rows, :]), results)
    stage_key(figure, stage_numbers(results))
    return figure


def _key(results: SoundingResults) -> list[Line2D | Patch]:
    handles: list[Line2D | Patch] = [
        Line2D([], [], color=GREY, linewidth=0.9, linestyle="--", label=_law_text(results)),
        Line2D([], [], color=BLACK, marker="o", markersize=4.5, linestyle="none", label="sounded, 90 %"),
        Line2D([], [], color=GREEN, linewidth=2.0, label="forecast, median"),
        Patch(facecolor=(GREEN, 0.25), hatch="...", edgecolor=GREEN, linewidth=0.0, label="forecast, 90 %"),
        Line2D([], [], color=VERMILION, linestyle=(0, (5, 2)), label="given length too short from here"),
    ]
    if any(each.place.stop_depth_m is not None for each in results.places):
        handles.append(Line2D([], [], color=PURPLE, linestyle=(0, (2, 1)), label="works stop from here"))
    if any(each.soundings for each in results.places):
        handles.append(Line2D([], [], color=ORANGE, linewidth=0.9, linestyle="-.", label="unscaled restart"))
    return handles


def _law_text(results: SoundingResults) -> str:
    scaled = any(each.place.growth_factor != 1.0 for each in results.places)
    return "by the law, with the plan's growth_factor" if scaled else "by the law alone"


def _draw_place(axes: Axes, each: SoundedPlace) -> None:
    band = each.forecast.band
    days = day_numbers(band.time_s)
    low, middle, high = band.depth_m
    axes.plot(day_numbers(each.hindcast_time_s), each.hindcast_m, color=GREY, linewidth=0.9, linestyle="--")
    axes.fill_between(days, low, high, facecolor=(GREEN, 0.25), hatch="...", edgecolor=GREEN, linewidth=0.0, zorder=1)
    axes.plot(days, middle, color=GREEN, linewidth=2.0)
    if each.soundings:
        axes.plot(days, each.forecast.restart_unscaled_m, color=ORANGE, linewidth=0.9, linestyle="-.")
    axes.errorbar(
        day_numbers(np.array([sounding.time_s for sounding in each.soundings])),
        [sounding.depth_m for sounding in each.soundings],
        yerr=[_NORMAL_90 * sounding.standard_error_m for sounding in each.soundings],
        fmt="o",
        color=BLACK,
        markersize=4.5,
        capsize=3.0,
        linewidth=1.0,
        zorder=4,
    )
    top = _top(each, high)
    for limit_m, colour, dash in (
        (allowed_depth_m(each.place), VERMILION, (0, (5, 2))),
        (each.place.stop_depth_m, PURPLE, (0, (2, 1))),
    ):
        if limit_m is None:
            continue
        if limit_m <= top:
            axes.axhline(limit_m, color=colour, linestyle=dash, linewidth=1.2, zorder=3)
            height, words = limit_m, f"{limit_m:.3g} m"
        else:
            height, words = top, f"{limit_m:.3g} m, above"
        axes.annotate(
            words,
            (0.01, height),
            xycoords=("axes fraction", "data"),
            xytext=(0.0, 3.0 if limit_m <= top else -11.0),
            textcoords="offset points",
            color=colour,
        )
    axes.set_ylim(0.0, top)
    axes.set_title(f"{place_title(each.place)}: {_factor_text(each)}", pad=16.0)
    axes.set_ylabel(DEPTH_LABEL)
    time_axis(axes)


def _top(each: SoundedPlace, high: FloatArray) -> float:
    """Return the top of the axis: room for all that grows; a limit far above is only named."""
    sounded = [sounding.depth_m + _NORMAL_90 * sounding.standard_error_m for sounding in each.soundings]
    deepest = max(float(np.max(high)), float(np.max(each.hindcast_m)), *sounded, 0.0) or 1.0
    return 1.15 * deepest


def _factor_text(each: SoundedPlace) -> str:
    low, middle, high = each.growth_factor
    return f"factor {middle:.2f}, {low:.2f} to {high:.2f}" if each.soundings else "not sounded"


def _draw_dates(axes: Axes, results: SoundingResults) -> None:
    """Draw planned over computed dates, a row a stage; a planned date that stands alone is a diamond."""
    title = "dates of the stages: planned before (hatched) over as computed (filled)"
    for number, stage in enumerate(results.plan.stage, start=1):
        if stage.planned_start is not None and stage.planned_end is not None:
            _bar(axes, number - 0.2, (stage.planned_start, stage.planned_end), _PLANNED, "///")
        elif alone := stage.planned_start or stage.planned_end:
            day = day_numbers(np.array([seconds_since_epoch(alone)]))
            axes.plot(day, [number - 0.2], color=_PLANNED, marker="D", linestyle="none", clip_on=False, zorder=4)
            title = "dates of the stages: planned before (hatched, one alone a diamond) over as computed (filled)"
        _bar(axes, number + 0.2, (stage.start, stage.end), _COMPUTED, "")
    count = len(results.plan.stage)
    axes.set_ylim(count + 0.6, 0.4)
    axes.set_yticks(range(1, count + 1), [str(number) for number in range(1, count + 1)])
    axes.set_ylabel("stage")
    axes.grid(visible=False, axis="y")
    axes.set_title(title)
    for number in range(2, count + 1, 2):
        axes.axhspan(number - 0.5, number + 0.5, color=PALE, linewidth=0.0, zorder=0)
    time_axis(axes)


def _bar(axes: Axes, height: float, dates: tuple[datetime, datetime], colour: str, hatch: str) -> None:
    start, end = day_numbers(np.array([seconds_since_epoch(each) for each in dates]))
    axes.barh(
        height,
        end - start,
        left=start,
        height=0.32,
        facecolor=(colour, 0.8) if not hatch else "white",
        edgecolor=colour,
        hatch=hatch,
        linewidth=0.8,
    )
