"""Length of the protection: what it does to the hole and the hole to it, and what each input is worth."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from tidescour.bed.slope import COMMON_SLOPES
from tidescour.handoff.design_tables import largest_changes, slope_rule_length_m
from tidescour.handoff.records import PlaceResult, RunResults
from tidescour.report.style import (
    BLACK,
    BLUE,
    GREEN,
    GREY,
    ORANGE,
    VERMILION,
    Dash,
    heading,
    new_figure,
    place_title,
    say_why_empty,
    wrapped,
)
from tidescour.scour.records import LengthCurve
from tidescour.units import FloatArray

LENGTH_LABEL: Final = "length [m from the toe]"
FLATTEST_DRAWN: Final = 20.0
"""Common slopes that are flatter would draw all else together."""

MOST_CHANGES: Final = 8
"""Inputs drawn for each place; the table has all."""

_DASHED: Final[Dash] = (0, (5, 2))
_DOTTED: Final[Dash] = (0, (1, 1.5))
_WHITE: Final = {"facecolor": "white", "edgecolor": "none", "pad": 0.8}


def length_figure(results: RunResults) -> Figure:
    """Draw how length, alpha, duration and depth depend on each other at every place, with the length that fits."""
    figure = new_figure(2.9 * len(results.places))
    heading(figure, f"{results.plan.site.name}: length of the protection and the hole behind it", _key(), columns=3)
    grid = figure.subplots(len(results.places), 3, squeeze=False, width_ratios=(2.1, 1.0, 1.0))
    for (length, alpha, hours), place in zip(grid, results.places, strict=True):
        curve = place.length_curve
        length.set_title(place_title(place.place, 48))
        length.set_ylabel("length required\n[m from the toe]")
        alpha.set_ylabel("alpha [-]")
        hours.set_ylabel("effective\nduration [h]")
        for axes in (length, alpha, hours):
            axes.set_xlabel(LENGTH_LABEL)
        if curve is None:
            for axes in (length, alpha, hours):
                say_why_empty(axes, "nothing grows here")
            continue
        _draw_lengths(length, place, curve)
        _draw_by_length(alpha, curve.length_m, curve.alpha, place)
        _draw_by_length(hours, curve.length_m, curve.effective_duration_h, place)
    return figure


def _key() -> list[Line2D]:
    return [
        Line2D([], [], color=BLUE, linewidth=2.2, label="what the slope rule asks for behind that length"),
        Line2D([], [], color=BLACK, linestyle=_DASHED, label="length required = length"),
        Line2D([], [], color=VERMILION, marker="o", linestyle=_DASHED, linewidth=0.9, label="length required"),
        Line2D([], [], color=GREEN, label="length given"),
        Line2D([], [], color=ORANGE, linestyle=_DOTTED, label="least length"),
        Line2D([], [], color=GREY, linewidth=0.7, label="common slopes after a slide: common practice"),
    ]


def _draw_lengths(axes: Axes, place: PlaceResult, curve: LengthCurve) -> None:
    required = place.required
    asked = slope_rule_length_m(place.place, 1.0) * curve.final_depth_m
    first, last = float(curve.length_m[0]), float(curve.length_m[-1])
    _draw_common_slopes(axes, place, curve)
    axes.plot([0.0, 10.0 * last], [0.0, 10.0 * last], color=BLACK, linestyle=_DASHED, linewidth=1.0)
    axes.plot(curve.length_m, asked, color=BLUE, linewidth=2.2)
    axes.axvline(place.place.length_m, color=GREEN)
    axes.axvline(required.minimum_m, color=ORANGE, linestyle=_DOTTED)
    axes.plot([required.length_m], [required.length_m], marker="o", color=VERMILION, linestyle="none", zorder=5)
    governs = "least length" if required.governed_by_minimum else f"1 in {place.place.failure_slope_cot:g}"
    right = required.length_m > 0.5 * (first + last)
    axes.annotate(
        f"{required.length_m:.1f} m, {governs}",
        (required.length_m, required.length_m),
        xytext=(-7.0 if right else 7.0, 7.0),
        textcoords="offset points",
        ha="right" if right else "left",
        va="bottom",
        color=VERMILION,
        fontweight="bold",
        bbox=_WHITE,
    )
    room = 0.03 * (last - first)
    axes.set_xlim(min(first, place.place.length_m) - room, max(last, place.place.length_m) + room)
    flattest = FLATTEST_DRAWN * place.place.depth_margin_factor * curve.final_depth_m[0]
    axes.set_ylim(0.0, 1.1 * max(float(asked[0]), required.length_m, float(flattest)))


def _draw_common_slopes(axes: Axes, place: PlaceResult, curve: LengthCurve) -> None:
    """Draw what the slopes that are common after a slide would ask for, of one hole."""
    for slope in COMMON_SLOPES:
        for cot in sorted({slope.least_cot, slope.most_cot}):
            if cot > FLATTEST_DRAWN or (cot == FLATTEST_DRAWN and slope.most_cot > FLATTEST_DRAWN):
                continue
            asked = cot * place.place.depth_margin_factor * curve.final_depth_m
            # Away from the plan's own slope, whose length is written under its line.
            under = cot < place.place.failure_slope_cot
            axes.plot(curve.length_m, asked, color=GREY, linewidth=0.7)
            axes.annotate(
                f"1 in {cot:g}, {slope.sand}",
                (curve.length_m[-1], asked[-1]),
                xytext=(-2.0, -3.0 if under else 2.0),
                textcoords="offset points",
                ha="right",
                va="top" if under else "bottom",
                color=GREY,
                bbox=_WHITE,
            )


def _draw_by_length(axes: Axes, length_m: FloatArray, values: FloatArray, place: PlaceResult) -> None:
    if not np.any(np.isfinite(values)):
        say_why_empty(axes, "not known")
        return
    axes.plot(length_m, values, color=BLUE)
    axes.axvline(place.place.length_m, color=GREEN)
    axes.axvline(place.required.length_m, color=VERMILION, linestyle=_DASHED, linewidth=0.9)
    # No more than a straight line's worth of room below, so that a flat curve looks flat.
    axes.set_ylim(0.0, 1.15 * float(np.nanmax(values)))


def sensitivity_figure(results: RunResults) -> Figure:
    """Draw what the inputs that matter most are worth in metres of depth and of length, a row of panels a place."""
    changes = [largest_changes(place, MOST_CHANGES) for place in results.places]
    heights = [1.1 + 0.34 * max(len(each), 2) for each in changes]
    figure = new_figure(sum(heights))
    heading(figure, f"{results.plan.site.name}: one input changed at a time, largest first", _change_key(), columns=2)
    grid = figure.subplots(len(results.places), 2, squeeze=False, sharey="row", height_ratios=heights)
    for (depth, length), place, kept in zip(grid, results.places, changes, strict=True):
        depth.set_title(place_title(place.place, 40))
        _draw_changes(depth, [each.depth_change_m for each in kept], "{:+.2f}")
        _draw_changes(length, [each.length_change_m for each in kept], "{:+.1f}")
        depth.set_yticks(range(len(kept)), [_change_label(each.change) for each in kept])
        depth.set_ylim(max(len(kept), 1) - 0.4, -0.6)
        depth.set_xlabel("change of the final depth [m]")
        length.set_xlabel("change of the length required [m]")
    return figure


def _change_label(change: str) -> str:
    """Return a change in short lines that break neither at a hyphen nor before a percent sign."""
    return wrapped(change.replace(" %", "\N{NO-BREAK SPACE}%").replace("-", "\N{NON-BREAKING HYPHEN}"), 40)


def _change_key() -> list[Patch]:
    return [
        Patch(facecolor=VERMILION, edgecolor=BLACK, linewidth=0.5, label="more"),
        Patch(facecolor=BLUE, edgecolor=BLACK, hatch="///", linewidth=0.5, label="less"),
    ]


def _draw_changes(axes: Axes, values: Sequence[float], words: str) -> None:
    for position, value in enumerate(values):
        axes.barh(
            position,
            value,
            height=0.62,
            facecolor=VERMILION if value > 0.0 else BLUE,
            edgecolor=BLACK,
            hatch="" if value > 0.0 else "///",
            linewidth=0.5,
        )
        axes.annotate(
            words.format(value).replace("-", "−"),
            (value, position),
            xytext=(4.0 if value >= 0.0 else -4.0, 0.0),
            textcoords="offset points",
            ha="left" if value >= 0.0 else "right",
            va="center",
        )
    widest = max((abs(value) for value in values), default=0.0) or 1.0
    low, high = min(*values, 0.0) if values else 0.0, max(*values, 0.0) if values else 1.0
    axes.set_xlim(low - 0.28 * widest, high + 0.28 * widest)
    axes.axvline(0.0, color=BLACK, linewidth=0.8)
    axes.grid(visible=False, axis="y")
    if not values:
        say_why_empty(axes, "no change has a result")
