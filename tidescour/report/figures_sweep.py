"""Head, velocity and unit discharge in the main opening by crest level and by width."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import NullLocator

from tidescour.gap.sweep_records import DIRECTIONS, TIDES, ClosureSweep, SweepCurve
from tidescour.handoff.records import RunResults
from tidescour.plan.models import Opening
from tidescour.report.figures_gap import numbers_text
from tidescour.report.style import (
    BLACK,
    GREY,
    SIDE_MARKS,
    Dash,
    Mark,
    heading,
    new_figure,
    say_why_empty,
    stage_key,
    stage_numbers,
    wrapped,
)

TIDE_DASHES: Final[tuple[Dash, ...]] = ("-", (0, (5, 2)), (0, (1, 1.5)))
_DIRECTION_MARKS: Final[tuple[Mark, ...]] = (SIDE_MARKS["basin"], SIDE_MARKS["sea"])
_ROWS: Final = (
    ("head_m", "largest head [m]"),
    ("gap_velocity_m_s", "largest gap velocity [m/s]"),
    ("unit_discharge_m2_s", "largest unit discharge\n[m²/s]"),
)
NUMBERS_APART: Final = 0.08
"""Stages nearer to one another than this share of the panel are numbered together."""


def sweep_figure(results: RunResults, sweep: ClosureSweep) -> Figure:
    """Draw the curves of a sweep, with the crests and widths of the stages.

    Parameters
    ----------
    results : RunResults
        The run, for its stages.
    sweep : ClosureSweep
        Its main opening at other crests and widths.
    """
    figure = new_figure(8.4)
    title = f"{results.plan.site.name}: {sweep.opening or 'the gap'} at other crests and widths"
    heading(figure, title, _key(sweep), columns=len(TIDES) + len(DIRECTIONS))
    grid = figure.subplots(len(_ROWS), 2, sharex="col", squeeze=False)
    first = next((each for each in results.plan.stage[0].opening if each.name == sweep.opening), None)
    left, right = list(grid[:, 0]), list(grid[:, 1])
    _draw_column(left, sweep.crest, _crests(results, sweep.opening))
    _draw_column(right, sweep.width, _widths(results, sweep.opening), math.log)
    if sweep.crest is not None and sweep.width is not None:
        # The unit discharge of a narrow deep gap is so large that the others would not be seen beside it.
        for one, other in zip(left[:-1], right[:-1], strict=True):
            top = max(one.get_ylim()[1], other.get_ylim()[1])
            one.set_ylim(0.0, top)
            other.set_ylim(0.0, top)
    datum = wrapped(results.plan.site.datum, 40)
    left[-1].set_xlabel(f"crest level [m above {datum}], rising")
    right[-1].set_xlabel("width at the crest [m], falling")
    left[0].set_title("raising the crest" + _kept("width", None if first is None else first.width_m), pad=20.0)
    right[0].set_title("narrowing" + _kept("crest", None if first is None else first.crest_level_m), pad=20.0)
    for pair, (_, label) in zip(grid, _ROWS, strict=True):
        for axes in pair:
            axes.set_ylabel(label)
    if sweep.width is not None:
        _widths_axis(right[-1], sweep.width)
    stage_key(figure, stage_numbers(results), title="grey lines: crest and width at the end of each stage")
    return figure


def _kept(name: str, value_m: float | None) -> str:
    return "" if value_m is None else f", {name} kept at {value_m:g} m".replace("-", "−")


def _key(sweep: ClosureSweep) -> list[Line2D]:
    ranges = {tide.name: f", range {tide.range_m:.2f} m" for tide in sweep.tides}
    tides = [
        Line2D([], [], color=BLACK, linestyle=dash, label=f"{name}{ranges.get(name, '')}")
        for name, dash in zip(TIDES, TIDE_DASHES, strict=True)
    ]
    ways = [
        Line2D([], [], color=look.colour, marker=look.marker, markersize=5.0, label=name)
        for name, look in zip(DIRECTIONS, _DIRECTION_MARKS, strict=True)
    ]
    return [*tides, *ways]


def _stage_openings(results: RunResults, name: str) -> dict[int, Opening]:
    return {
        number: opening
        for number, stage in enumerate(results.plan.stage, start=1)
        for opening in stage.opening
        if opening.name == name
    }


def _crests(results: RunResults, name: str) -> dict[int, float]:
    return {
        number: opening.crest_level_m if opening.crest_level_end_m is None else opening.crest_level_end_m
        for number, opening in _stage_openings(results, name).items()
    }


def _widths(results: RunResults, name: str) -> dict[int, float]:
    ends = {
        number: opening.width_m if opening.width_end_m is None else opening.width_end_m
        for number, opening in _stage_openings(results, name).items()
    }
    return {number: width for number, width in ends.items() if width is not None}


def _draw_column(
    column: Sequence[Axes], curve: SweepCurve | None, stages: dict[int, float], along: Callable[[float], float] = float
) -> None:
    if curve is None:
        for axes in column:
            say_why_empty(axes, "not swept, see the findings")
            axes.tick_params(labelbottom=False)
        return
    for axes, (name, _) in zip(column, _ROWS, strict=True):
        values = getattr(curve, name)
        for tide, dash in enumerate(TIDE_DASHES):
            for way, look in enumerate(_DIRECTION_MARKS):
                axes.plot(
                    curve.value_m,
                    values[:, tide, way],
                    color=look.colour,
                    linestyle=dash,
                    marker=look.marker,
                    markersize=3.5,
                    linewidth=1.1,
                )
        axes.set_ylim(bottom=0.0)
    first, last = along(float(curve.value_m[0])), along(float(curve.value_m[-1]))
    shares = {number: (along(value) - first) / (last - first) for number, value in stages.items()}
    _mark_stages(column, {number: (share, stages[number]) for number, share in shares.items() if -1e-9 <= share <= 1.0})


def _mark_stages(column: Sequence[Axes], stages: dict[int, tuple[float, float]]) -> None:
    """Draw a line at each stage, given by its share of the axis and its value, and number them over the first panel."""
    for axes in column:
        for _, value in set(stages.values()):
            axes.axvline(value, color=GREY, linewidth=0.7, linestyle=(0, (2, 2)), zorder=0)
    for first, numbers in merged_numbers({number: share for number, (share, _) in stages.items()}):
        column[0].annotate(
            numbers_text(numbers),
            (stages[first][1], 1.0),
            xycoords=column[0].get_xaxis_transform(),
            xytext=(0.0, 3.0),
            textcoords="offset points",
            ha="center",
            va="bottom",
            color=GREY,
        )


def merged_numbers(shares: dict[int, float]) -> list[tuple[int, list[int]]]:
    """Return the stages that are numbered together: the one that is first along the axis, and all their numbers.

    Parameters
    ----------
    shares : dict of int to float
        Where each stage lies along the axis, 0 to 1, by its number.
    """
    groups: list[tuple[int, list[int]]] = []
    for number, share in sorted(shares.items(), key=lambda item: (item[1], item[0])):
        if groups and share - shares[groups[-1][0]] < NUMBERS_APART:
            groups[-1][1].append(number)
        else:
            groups.append((number, [number]))
    return [(first, sorted(numbers)) for first, numbers in groups]


def _widths_axis(axes: Axes, curve: SweepCurve) -> None:
    """Let the width fall to the right by equal shares, so that the closure goes on to the right in both columns."""
    widest, narrowest = float(curve.value_m.max()), float(curve.value_m.min())
    axes.set_xscale("log")
    axes.set_xlim(widest * 1.06, narrowest / 1.06)
    tens = 10.0 ** np.arange(np.floor(np.log10(narrowest)), np.ceil(np.log10(widest)) + 1.0)
    ticks = np.outer(tens, (1.0, 2.0, 5.0)).ravel()
    axes.set_xticks(ticks[(ticks >= narrowest) & (ticks <= widest)])
    axes.xaxis.set_major_formatter(lambda value, _: f"{value:g}")
    axes.xaxis.set_minor_locator(NullLocator())
