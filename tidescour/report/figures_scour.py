"""Scour: growth stage by stage, shares of effective time, and final depths under the three tide rules."""

from __future__ import annotations

from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from tidescour.handoff.records import DurationRow, PlaceResult, RunResults
from tidescour.handoff.results_tables import effective_duration_h, final_depth_m
from tidescour.plan.models import TIDE_RULES, TideRule
from tidescour.report.style import (
    BLACK,
    GREEN,
    GREY,
    ORANGE,
    SKY,
    day_numbers,
    flat_axes,
    foot_key,
    heading,
    mark,
    new_figure,
    place_title,
    rows_and_columns,
    say_why_empty,
    stage_bands,
    stage_key,
    stage_labels,
    stage_lines,
    stage_numbers,
    time_axis,
)
from tidescour.scour.laws import PowerLaw
from tidescour.units import FloatArray

DEPTH_LABEL: Final = "scour depth\n[m below the original bed]"
_LOGARITHMIC_FROM: Final = 30.0
_RULE_LOOKS: Final[dict[TideRule, tuple[str, str]]] = {
    "integral": (GREEN, ""),
    "flow-mean": (SKY, "///"),
    "cycle-mean": (ORANGE, "..."),
}


def growth_figure(results: RunResults) -> Figure:
    """Draw growth along each stage's own curve, with the shift of time that joins one curve to the next."""
    rows, _ = rows_and_columns(len(results.places), 2)
    figure = new_figure(3.3 * rows)
    heading(figure, f"{results.plan.site.name}: growth by effective time")
    for axes, place in zip(flat_axes(figure, len(results.places), 2), results.places, strict=True):
        _draw_growth(axes, place, results)
    how = "thin: from a flat bed; thick: what the stage grows; arrow: same depth, on to the curve of the next stage"
    stage_key(figure, stage_lines(results), title=f"curves of the stages ({how})")
    return figure


def _draw_growth(axes: Axes, place: PlaceResult, results: RunResults) -> None:
    rule = results.plan.scour.tide
    axes.set_title(place_title(place.place))
    axes.set_xlabel(f"effective time on the curve of the stage [h], rule: {rule}")
    axes.set_ylabel(DEPTH_LABEL)
    growing = [(number, row) for number, row in enumerate(place.rows) if effective_duration_h(row, rule) > 0.0]
    if not growing:
        say_why_empty(axes, "nothing grows here")
        return
    first_h, last_h = _time_limits([row for _, row in growing], rule)
    stage_numbers = {stage.name: number for number, stage in enumerate(results.plan.stage)}
    previous_h: float | None = None
    for _, row in growing:
        previous_h = _draw_stage_growth(
            axes, row, results.law, rule, stage_numbers[row.stage.name], (first_h, last_h), previous_h
        )
    if first_h > 0.0:
        axes.set_xscale("log")
        axes.xaxis.set_major_formatter(lambda value, _: f"{value:g}")
        axes.xaxis.set_minor_formatter("")
    axes.set_xlim(first_h, last_h)
    axes.set_ylim(0.0, 1.12 * final_depth_m(place, rule))


def _time_limits(rows: list[DurationRow], rule: TideRule) -> tuple[float, float]:
    """Return the ends of the time axis; the first is 0 for a linear one, which serves while spells are comparable."""
    starts, ends = zip(*(_spell(row, rule) for row in rows), strict=True)
    last = 1.08 * max(ends)
    if max(ends) < _LOGARITHMIC_FROM * min(ends):
        return 0.0, last
    begun = [0.5 * start for start in starts if start > 0.0]
    return max(min(0.1 * min(ends), *begun), 1e-4 * min(ends)), 1.3 * last


def _spell(row: DurationRow, rule: TideRule) -> tuple[float, float]:
    """Return where a stage begins and ends on its own curve [h]."""
    start_h = row.chain[TIDE_RULES.index(rule)].equivalent_start_h
    return start_h, start_h + effective_duration_h(row, rule)


def _draw_stage_growth(
    axes: Axes,
    row: DurationRow,
    law: PowerLaw,
    rule: TideRule,
    number: int,
    limits: tuple[float, float],
    previous_h: float | None,
) -> float:
    """Draw one stage and the arrow that leads to it; return where on its own curve it ends."""
    look = mark(number)
    step = row.chain[TIDE_RULES.index(rule)]
    start_h, end_h = _spell(row, rule)
    whole, used = _hours(*limits, limits), _hours(start_h, end_h, limits)
    axes.plot(whole, _curve(row, law, whole), color=look.colour, linestyle=look.dash, linewidth=0.7)
    axes.plot(used, _curve(row, law, used), color=look.colour, linestyle="-", linewidth=2.8, solid_capstyle="butt")
    axes.plot([end_h], [step.end_depth_m], marker="o", markersize=3.5, color=look.colour)
    axes.annotate(
        str(number + 1),
        (end_h, step.end_depth_m),
        xytext=(4.0, -3.0),
        textcoords="offset points",
        va="top",
        color=look.colour,
        fontweight="bold",
    )
    if previous_h is not None:
        axes.annotate(
            "",
            (max(start_h, limits[0]), step.start_depth_m),
            xytext=(previous_h, step.start_depth_m),
            arrowprops={"arrowstyle": "-|>", "color": BLACK, "linewidth": 0.9, "shrinkA": 2.0, "shrinkB": 0.0},
        )
    return end_h


def _hours(start_h: float, end_h: float, limits: tuple[float, float]) -> FloatArray:
    if limits[0] > 0.0:
        return np.geomspace(max(start_h, limits[0]), max(end_h, limits[0]), 80)
    # Points crowd where the curve rises steeply.
    return start_h + (end_h - start_h) * np.linspace(0.0, 1.0, 80) ** 2.5


def _curve(row: DurationRow, law: PowerLaw, hours: FloatArray) -> FloatArray:
    """Return the depth from a flat bed on the curve of a stage [m]."""
    depth_m: FloatArray = (row.duration.growth_rate * hours) ** law.time_exponent
    return depth_m


def growth_calendar_figure(results: RunResults) -> Figure:
    """Draw the depth of every place over the programme."""
    figure = new_figure(4.2)
    axes = figure.subplots()
    stage_bands(axes, results)
    for number, place in enumerate(results.places):
        look = mark(number)
        axes.plot(
            day_numbers(place.growth_time_s),
            place.growth_depth_m,
            color=look.colour,
            linestyle=look.dash,
            marker=look.marker,
            markersize=4.5,
            markevery=_stage_ends(place),
            label=f"{place_title(place.place, 44)}: {final_depth_m(place, results.plan.scour.tide):.2f} m",
        )
    axes.set_ylim(bottom=0.0)
    axes.set_ylabel(f"{DEPTH_LABEL}\nrule: {results.plan.scour.tide}")
    time_axis(axes)
    title = f"{results.plan.site.name}: growth over the programme, with the final depth"
    heading(figure, title, axes.get_lines()[-len(results.places) :], columns=min(len(results.places), 3))
    stage_key(figure, stage_numbers(results))
    return figure


def _stage_ends(place: PlaceResult) -> list[int]:
    names = place.growth_stage
    return [index for index in range(len(names)) if index + 1 == len(names) or names[index + 1] != names[index]]


def shares_figure(results: RunResults) -> Figure:
    """Draw for every place which stage gives which share of its effective time."""
    labels = [place_title(place.place, 34) for place in results.places]
    figure = new_figure(0.6 + _label_height_in(labels) * len(labels))
    heading(figure, f"{results.plan.site.name}: shares of effective time by stage, rule: {results.plan.scour.tide}")
    axes = figure.subplots()
    numbers = {stage.name: number for number, stage in enumerate(results.plan.stage)}
    for position, place in enumerate(results.places):
        _draw_shares(axes, place, position, numbers, results.plan.scour.tide)
    axes.set_yticks(range(len(labels)), labels)
    axes.set_ylim(len(results.places) - 0.4, -0.6)
    axes.set_xlim(0.0, 100.0)
    axes.set_xlabel("share of the growth of the place [%]; stage number and share where there is room")
    axes.grid(visible=False, axis="y")
    stage_key(figure, [_share_patch(number, label) for number, label in enumerate(stage_labels(results))])
    return figure


def _label_height_in(labels: list[str]) -> float:
    """Return the height of a row that holds the label with the most lines."""
    return 0.16 * max(3.5, max(label.count("\n") for label in labels) + 2.0)


def _share_patch(number: int, label: str) -> Patch:
    look = mark(number)
    return Patch(facecolor=(look.colour, 0.45), edgecolor=BLACK, hatch=look.hatch, linewidth=0.5, label=label)


def _draw_shares(axes: Axes, place: PlaceResult, position: int, numbers: dict[str, int], rule: TideRule) -> None:
    left = 0.0
    for row in place.rows:
        share = 100.0 * float(np.nan_to_num(row.chain[TIDE_RULES.index(rule)].share))
        number = numbers[row.stage.name]
        look = mark(number)
        axes.barh(
            position,
            share,
            left=left,
            height=0.7,
            facecolor=(look.colour, 0.45),
            edgecolor=BLACK,
            hatch=look.hatch,
            linewidth=0.5,
        )
        if share >= 3.0:
            text = f"{number + 1}: {share:.0f} %" if share >= 7.0 else f"{number + 1}"
            box = {"facecolor": "white", "edgecolor": "none", "pad": 1.0}
            axes.text(left + 0.5 * share, position, text, ha="center", va="center", bbox=box)
        left += share
    if left == 0.0:
        axes.text(1.0, position, "nothing grows here", va="center", color=GREY)


def final_depth_figure(results: RunResults) -> Figure:
    """Draw the final depth of every place under the three tide rules; the one that drives is marked."""
    driving = results.plan.scour.tide
    count = len(results.places)
    labels = [place_title(place.place, 34) for place in results.places]
    figure = new_figure(0.6 + max(_label_height_in(labels), 0.95) * count)
    heading(figure, f"{results.plan.site.name}: final depth by place under the three tide rules")
    axes = figure.subplots()
    deepest = 0.0
    for offset, rule in enumerate(TIDE_RULES):
        for position, place in enumerate(results.places):
            depth_m = final_depth_m(place, rule)
            deepest = max(deepest, depth_m)
            _draw_depth(axes, position + 0.26 * (offset - 1), depth_m, rule, rule == driving)
    axes.set_yticks(range(count), labels)
    axes.set_ylim(count - 0.45, -0.55)
    axes.set_xlim(0.0, 1.25 * deepest or 1.0)
    axes.set_xlabel("scour depth after the last stage [m below the original bed]")
    axes.grid(visible=False, axis="y")
    foot_key(figure, [_rule_patch(rule, rule == driving) for rule in TIDE_RULES], columns=3)
    return figure


def _draw_depth(axes: Axes, position: float, depth_m: float, rule: TideRule, drives: bool) -> None:
    colour, hatch = _RULE_LOOKS[rule]
    axes.barh(
        position,
        depth_m,
        height=0.24,
        facecolor=colour,
        edgecolor=BLACK,
        hatch=hatch,
        linewidth=2.2 if drives else 0.5,
        zorder=3 if drives else 2,
    )
    axes.annotate(
        f"{depth_m:.2f} m, drives" if drives else f"{depth_m:.2f} m",
        (depth_m, position),
        xytext=(5.0, 0.0),
        textcoords="offset points",
        va="center",
        fontweight="bold" if drives else "normal",
    )


def _rule_patch(rule: TideRule, drives: bool) -> Patch | Line2D:
    colour, hatch = _RULE_LOOKS[rule]
    label = f"{rule} (drives growth)" if drives else rule
    return Patch(facecolor=colour, edgecolor=BLACK, hatch=hatch, linewidth=2.2 if drives else 0.5, label=label)
