"""Scour: growth stage by stage, shares of effective time, and final depths under the three tide rules."""

from __future__ import annotations

from itertools import pairwise
from typing import Final, NamedTuple

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Patch

from tidescour.handoff.records import DurationRow, PlaceResult, RunResults
from tidescour.handoff.results_tables import final_depth_m
from tidescour.plan.kinds import TIDE_RULES, TideRule
from tidescour.report.style import (
    BLACK,
    GREY,
    day_numbers,
    flat_axes,
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
from tidescour.scour.curves import depth_at, state_at
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import EffectiveDuration
from tidescour.units import FloatArray

DEPTH_LABEL: Final = "scour depth\n[m below the original bed]"
_LOGARITHMIC_FROM: Final = 30.0
"""Colour and hatch of each rule."""


class _Spell(NamedTuple):
    """Growth along one curve: its row in a layer, the stage's number, hours on the curve, depths, factor of the place.

    `last` tells that the stage ends with it.
    """

    duration: EffectiveDuration
    stage: int
    start_h: float
    end_h: float
    start_m: float
    end_m: float
    factor: float
    last: bool


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
    stages = {stage.name: number for number, stage in enumerate(results.plan.stage)}
    spells = [spell for row in place.rows for spell in _spells(row, results.law, rule, stages[row.stage.name], place)]
    if not spells:
        say_why_empty(axes, "nothing grows here")
        return
    limits = _time_limits(spells)
    previous_h: float | None = None
    for spell in spells:
        _draw_spell(axes, spell, results.law, limits, previous_h)
        previous_h = spell.end_h
    if limits[0] > 0.0:
        axes.set_xscale("log")
        axes.xaxis.set_major_formatter(lambda value, _: f"{value:g}")
        axes.xaxis.set_minor_formatter("")
    axes.set_xlim(*limits)
    axes.set_ylim(0.0, 1.12 * final_depth_m(place, rule))


def _spells(row: DurationRow, law: GrowthLaw, rule: TideRule, stage: int, place: PlaceResult) -> list[_Spell]:
    """Return growth through a stage, a spell a layer of the bed; none where nothing grows."""
    step, factor = row.step(rule), place.place.growth_factor
    if not step.end_depth_m > step.start_depth_m:
        return []
    layers = (step.layer, *(reached.layer for reached in step.reached))
    depths = (step.start_depth_m, *(reached.depth_m for reached in step.reached), step.end_depth_m)
    spells = []
    for number, (start_m, end_m) in zip(layers, pairwise(depths), strict=True):
        duration = row.durations.layers[number]
        if end_m > start_m:
            start_h, end_h = state_at(law, np.array([start_m, end_m]) / factor, duration.scale_m) / duration.growth_rate
            last = end_m == step.end_depth_m
            spells.append(_Spell(duration, stage, float(start_h), float(end_h), start_m, end_m, factor, last))
    return spells


def _time_limits(spells: list[_Spell]) -> tuple[float, float]:
    """Return the ends of the time axis; the first is 0 for a linear one, which serves while spells are comparable."""
    ends = [spell.end_h for spell in spells]
    if max(ends) < _LOGARITHMIC_FROM * min(ends):
        return 0.0, 1.08 * max(ends)
    begun = [0.5 * spell.start_h for spell in spells if spell.start_h > 0.0]
    return max(min(0.1 * min(ends), *begun), 1e-4 * min(ends)), 1.3 * max(ends)


def _draw_spell(
    axes: Axes, spell: _Spell, law: GrowthLaw, limits: tuple[float, float], previous_h: float | None
) -> None:
    """Draw growth along one curve, and the arrow that leads to it from where the curve before was left."""
    look = mark(spell.stage)
    whole, used = _hours(*limits, limits), _hours(spell.start_h, spell.end_h, limits)
    axes.plot(whole, _curve(spell, law, whole), color=look.colour, linestyle=look.dash, linewidth=0.7)
    axes.plot(used, _curve(spell, law, used), color=look.colour, linestyle="-", linewidth=2.8, solid_capstyle="butt")
    if spell.last:
        axes.plot([spell.end_h], [spell.end_m], marker="o", markersize=3.5, color=look.colour)
        axes.annotate(
            str(spell.stage + 1),
            (spell.end_h, spell.end_m),
            xytext=(4.0, -3.0),
            textcoords="offset points",
            va="top",
            color=look.colour,
            fontweight="bold",
        )
    if previous_h is not None:
        axes.annotate(
            "",
            (max(spell.start_h, limits[0]), spell.start_m),
            xytext=(previous_h, spell.start_m),
            arrowprops={"arrowstyle": "-|>", "color": BLACK, "linewidth": 0.9, "shrinkA": 2.0, "shrinkB": 0.0},
        )


def _hours(start_h: float, end_h: float, limits: tuple[float, float]) -> FloatArray:
    if limits[0] > 0.0:
        return np.geomspace(max(start_h, limits[0]), max(end_h, limits[0]), 80)
    # Points crowd where the curve rises steeply.
    return start_h + (end_h - start_h) * np.linspace(0.0, 1.0, 80) ** 2.5


def _curve(spell: _Spell, law: GrowthLaw, hours: FloatArray) -> FloatArray:
    """Return the depth from a flat bed on a curve [m]."""
    return spell.factor * depth_at(law, spell.duration.growth_rate * hours, spell.duration.scale_m)


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
    figure = new_figure(0.6 + label_height_in(labels) * len(labels))
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


def label_height_in(labels: list[str]) -> float:
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
