"""Extra depth by weeks of delay, a panel a place."""

from __future__ import annotations

from typing import Final

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from tidescour.report.pictures import Picture
from tidescour.report.style import (
    BLACK,
    flat_axes,
    heading,
    house_style,
    mark,
    new_figure,
    place_title,
    rendered,
    rows_and_columns,
    say_why_empty,
    stage_key,
    wrapped,
)
from tidescour.study.delay import DelayStudy, PlannedPlace

_CAPTION: Final = (
    "What each stage adds to the final depth of a place by ending later. By its own longer stay, all other stages "
    "growing as planned; and with every later stage moved to the tides of its new dates, with other springs and neaps."
)


def delay_pictures(study: DelayStudy) -> tuple[Picture, ...]:
    """Return the figure of a study of delays, drawn."""
    with house_style():
        png, svg = rendered(delay_figure(study))
    return (Picture(name="delay", caption=_CAPTION, png=png, svg=svg),)


def delay_figure(study: DelayStudy) -> Figure:
    """Draw what each stage adds to the final depth of every place by being late.

    Parameters
    ----------
    study : DelayStudy
        All delays; a stage without a result has no line.
    """
    rows, _ = rows_and_columns(len(study.places), 2)
    figure = new_figure(3.3 * rows)
    key = [
        Line2D([], [], color=BLACK, linewidth=1.8, marker="o", label="own longer stay alone"),
        Line2D([], [], color=BLACK, linewidth=0.7, marker="o", fillstyle="none", label="later stages moved too"),
    ]
    heading(figure, f"{study.plan.site.name}: extra depth by weeks of delay", key, columns=2)
    for axes, each in zip(flat_axes(figure, len(study.places), 2), study.places, strict=True):
        _draw(axes, study, each)
    late = {row.stage for row in study.rows}
    handles = [
        _line(number, f"{number + 1}  {stage.name}")
        for number, stage in enumerate(study.plan.stage)
        if stage.name in late
    ]
    if handles:
        stage_key(figure, handles, title="stage that is late")
    return figure


def _line(number: int, label: str) -> Line2D:
    look = mark(number)
    return Line2D(
        [], [], color=look.colour, linestyle=look.dash, marker=look.marker, linewidth=1.8, label=wrapped(label, 46)
    )


def _draw(axes: Axes, study: DelayStudy, each: PlannedPlace) -> None:
    place = each.place
    axes.set_title(
        f"{place_title(place)}\nas planned {each.final_depth_m:.2f} m deep, {each.required_length_m:.1f} m required"
    )
    axes.set_xlabel("stage late by [weeks]")
    axes.set_ylabel("extra final depth [m]")
    axes.axhline(0.0, color=BLACK, linewidth=0.8)
    if not study.rows:
        say_why_empty(axes, "no stage can be late, see the findings")
        return
    for number, stage in enumerate(study.plan.stage):
        late = study.of(stage.name, place)
        look = mark(number)
        for values, width, filled in (
            ([row.own_stay.depth_m for row in late], 1.8, "full"),
            ([row.calendar.depth_m for row in late], 0.7, "none"),
        ):
            axes.plot(
                [0, *(row.weeks_late for row in late)] if late else [],
                [0.0, *values] if late else [],
                color=look.colour,
                linestyle=look.dash,
                linewidth=width,
                marker=look.marker,
                markersize=4.5,
                fillstyle=filled,
            )
    axes.set_xticks([0, *study.weeks])
    axes.set_xlim(0.0, 1.03 * study.weeks[-1])
