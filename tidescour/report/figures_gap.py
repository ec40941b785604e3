"""The gap: sections of its openings through the stages, and velocity against head within a tide."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import groupby
from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PathCollection
from matplotlib.figure import Figure
from matplotlib.patches import Patch

from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.sweep import tide_slices
from tidescour.handoff.records import RunResults
from tidescour.plan.kinds import SIDES
from tidescour.plan.models import Opening
from tidescour.report.figures_flow import opening_names
from tidescour.report.style import (
    BLACK,
    BLUE,
    GREY,
    PALE,
    SIDE_MARKS,
    Mark,
    heading,
    level_label,
    mark,
    new_figure,
    rows_and_columns,
    say_why_empty,
    stage_key,
    stage_numbers,
    wrapped,
)
from tidescour.units import SECONDS_PER_HOUR, FloatArray, utc_text

LABEL_IN: Final = 0.165
_AROUND_AXES_IN: Final = 0.95
_LEAST_SECTION_IN: Final = 3.0

MOST_LOOPS: Final = 6
LOOP_POINTS: Final = 120
COLOUR_BAR: Final = "colour bar"
NUMBERED_H: Final = 2.0
_HOURS_APART: Final = 0.2
"""Hours nearer to one another than this share of the largest head and velocity are not both written."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Level:
    """A level across a section that is named beside it."""

    level_m: float
    label: str
    look: Mark


def numbers_text(numbers: list[int]) -> str:
    """Return rising numbers as ``1, 3–5``."""
    spells = []
    for _, spell in groupby(enumerate(numbers), key=lambda pair: pair[1] - pair[0]):
        run = [number for _, number in spell]
        spells.append(f"{run[0]}" if len(run) == 1 else f"{run[0]}–{run[-1]}")
    return ", ".join(spells)


def spread(position: FloatArray, gap: float, low: float, high: float) -> FloatArray:
    """Return rising positions moved as little as keeps them `gap` apart, from `low` to `high` where they fit.

    Parameters
    ----------
    position : (n,) array
        Rising.
    gap, low, high : float
        In the unit of the positions.
    """
    steps = gap * np.arange(position.size)
    # Less the steps, the positions must not fall: neighbours that do are joined at their mean until none is left.
    blocks: list[tuple[float, int]] = []
    for value in position - steps:
        total, count = float(value), 1
        while blocks and blocks[-1][0] / blocks[-1][1] >= total / count:
            before, size = blocks.pop()
            total, count = total + before, count + size
        blocks.append((total, count))
    plain = np.repeat([total / count for total, count in blocks], [count for _, count in blocks])
    moved: FloatArray = np.clip(plain, low, max(high - gap * (position.size - 1), low)) + steps
    return moved


def section_figure(results: RunResults) -> Figure:
    """Draw the section of each opening, filled up stage by stage, with the water levels and the bed behind it."""
    names = opening_names(results)
    levels = [_named_levels(results, name) for name in names]
    heights = [max(_LEAST_SECTION_IN, _AROUND_AXES_IN + LABEL_IN * (len(each) + 1)) for each in levels]
    figure = new_figure(sum(heights))
    ground = Patch(facecolor=PALE, edgecolor=GREY, hatch="..", linewidth=0.5, label="ground at the first stage")
    heading(figure, f"{results.plan.site.name}: sections of the gap at the end of each stage", [ground])
    grid = figure.subplots(len(names), 1, squeeze=False, height_ratios=heights)
    for axes, name, named, height in zip(grid[:, 0], names, levels, heights, strict=True):
        _draw_section(axes, _openings(results, name), named)
        _label_levels(axes, named, LABEL_IN / (height - _AROUND_AXES_IN))
        axes.set_title(_section_title(results, name))
        axes.set_ylabel(level_label(results))
    stage_key(figure, stage_numbers(results))
    return figure


def _openings(results: RunResults, name: str) -> dict[int, Opening]:
    """Return the opening of this name by the number of the stage, from 1."""
    return {
        number: opening
        for number, stage in enumerate(results.plan.stage, start=1)
        for opening in stage.opening
        if opening.name == name
    }


def _section_title(results: RunResults, name: str) -> str:
    absent = [number for number in range(1, len(results.plan.stage) + 1) if number not in _openings(results, name)]
    if not absent:
        return wrapped(name, 80)
    return wrapped(f"{name} (not there in stage{'s' if len(absent) > 1 else ''} {numbers_text(absent)})", 80)


def _crest_at_end(opening: Opening) -> float:
    return opening.crest_level_m if opening.crest_level_end_m is None else opening.crest_level_end_m


def _width_at_end(opening: Opening) -> float:
    width = opening.width_m if opening.width_end_m is None else opening.width_end_m
    return float("nan") if width is None else width


def _named_levels(results: RunResults, name: str) -> list[_Level]:
    """Return the levels that a section shows, rising: crests, sea levels, and the bed behind the protection."""
    crests: dict[str, list[int]] = {}
    for number, opening in _openings(results, name).items():
        width = "" if opening.profile_points else f", {_width_at_end(opening):.4g} m wide"
        crests.setdefault(f"{_signed(_crest_at_end(opening))} m{width}", []).append(number)
    levels = [
        _Level(
            level_m=_crest_at_end(_openings(results, name)[numbers[0]]),
            label=f"{numbers_text(numbers)}: {text}",
            look=mark(numbers[0] - 1),
        )
        for text, numbers in crests.items()
    ]
    water = Mark(colour=BLUE, dash=(0, (6, 3)), marker="", hatch="")
    flows = [opening for flow in results.flows for opening in flow.openings if opening.name == name]
    highest = max(float(opening.level_sea_m.max()) for opening in flows)
    lowest = min(float(opening.level_sea_m.min()) for opening in flows)
    levels.append(_Level(level_m=highest, label=f"highest sea level {_signed(highest)} m", look=water))
    levels.append(_Level(level_m=lowest, label=f"lowest sea level {_signed(lowest)} m", look=water))
    return sorted([*levels, *_bed_levels(results, name)], key=lambda each: each.level_m)


def _bed_levels(results: RunResults, name: str) -> list[_Level]:
    beds = {
        side: place.place.bed_level_m
        for side in SIDES
        for place in results.places
        if place.place.opening == name and place.place.side == side
    }
    if len(set(beds.values())) == 1 and len(beds) > 1:
        look = Mark(colour=BLACK, dash=(0, (1, 2)), marker="", hatch="")
        level = next(iter(beds.values()))
        return [_Level(level_m=level, label=f"bed behind the protection {_signed(level)} m", look=look)]
    return [
        _Level(
            level_m=level,
            label=f"bed behind the protection, {side} side {_signed(level)} m",
            look=Mark(colour=SIDE_MARKS[side].colour, dash=(0, (1, 2)), marker="", hatch=""),
        )
        for side, level in beds.items()
    ]


def _signed(level_m: float) -> str:
    return f"{level_m:+.2f}".replace("-", "−")


def _outline(opening: Opening, crest_m: float, width_m: float, middle_m: float, top_m: float) -> FloatArray:
    """Return (n, 2) distance and level of a section's edge, from its top on one side to that on the other."""
    if opening.profile_points:
        points = np.array(opening.profile_points)
        filled = np.maximum(points[:, 1], crest_m)
        # Where the fill meets the ground between two points.
        low, high = points[:-1], points[1:]
        crossed = (low[:, 1] - crest_m) * (high[:, 1] - crest_m) < 0.0
        share = (crest_m - low[crossed, 1]) / (high[crossed, 1] - low[crossed, 1])
        edges = low[crossed, 0] + share * (high[crossed, 0] - low[crossed, 0])
        distance = np.concatenate((points[:, 0], edges))
        level = np.concatenate((filled, np.full(edges.size, crest_m)))
        order = np.argsort(distance, kind="stable")
        inner = np.column_stack((distance[order], level[order]))
        return np.vstack(([inner[0, 0], top_m], inner, [inner[-1, 0], top_m]))
    half = 0.5 * width_m
    reach = half + opening.side_slope * max(top_m - crest_m, 0.0)
    edge = np.array([[-reach, top_m], [-half, crest_m], [half, crest_m], [reach, top_m]])
    edge[:, 0] += middle_m
    return edge


def _draw_section(axes: Axes, openings: dict[int, Opening], levels: list[_Level]) -> None:
    low, high = levels[0].level_m, levels[-1].level_m
    margin = 0.06 * (high - low) + 0.1
    bottom, top = low - margin, high + margin
    points = [np.array(opening.profile_points) for opening in openings.values() if opening.profile_points]
    middle = float(np.mean(points[0][[0, -1], 0])) if points else 0.0
    first = next(iter(openings.values()))
    ground = _outline(first, first.crest_level_m, first.width_m or 0.0, middle, top)
    around = 0.06 * float(np.ptp(ground[:, 0])) + 1e-3
    left, right = float(ground[:, 0].min()) - around, float(ground[:, 0].max()) + around
    outlines = {
        number: _outline(opening, _crest_at_end(opening), _width_at_end(opening), middle, top)
        for number, opening in openings.items()
    }
    left = min([left, *(float(outline[:, 0].min()) - around for outline in outlines.values())])
    right = max([right, *(float(outline[:, 0].max()) + around for outline in outlines.values())])
    edge = np.vstack(([left, top], ground, [right, top]))
    axes.fill_between(edge[:, 0], bottom, edge[:, 1], facecolor=PALE, edgecolor=GREY, hatch="..", linewidth=0.5)
    for number, outline in outlines.items():
        look = mark(number - 1)
        axes.plot(outline[:, 0], outline[:, 1], color=look.colour, linestyle=look.dash, linewidth=1.8)
    axes.set_xlim(left, right)
    axes.set_ylim(bottom, top)
    axes.set_xlabel("distance along the profile [m]" if points else "distance from the middle of the opening [m]")


def _label_levels(axes: Axes, levels: list[_Level], gap: float) -> None:
    """Draw each level and write it beside the panel, `gap` of its height apart at least."""
    bottom, top = axes.get_ylim()
    share = (np.array([each.level_m for each in levels]) - bottom) / (top - bottom)
    for each, at, label_at in zip(levels, share, spread(share, gap, 0.0, 1.0), strict=True):
        axes.axhline(each.level_m, color=each.look.colour, linestyle=each.look.dash, linewidth=0.8, alpha=0.8)
        axes.annotate(
            each.label,
            (1.0, at),
            xytext=(1.035, label_at),
            xycoords="axes fraction",
            textcoords="axes fraction",
            va="center",
            color=each.look.colour,
            annotation_clip=False,
            arrowprops={
                "arrowstyle": "-",
                "color": each.look.colour,
                "linewidth": 0.7,
                "shrinkA": 1.0,
                "shrinkB": 0.0,
                "relpos": (0.0, 0.5),
            },
        )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Loop:
    """One tide of one stage: hours since its start, head and velocity."""

    stage: int
    title: str
    hours: FloatArray
    head_m: FloatArray
    velocity_m_s: FloatArray


def main_opening(results: RunResults) -> str:
    """Return the opening that most water passes over the programme; empty where no discharge is known."""
    passed: dict[str, float] = {}
    for flow in results.flows:
        for opening in flow.openings:
            volume = float(np.abs(opening.discharge_m3_s).sum()) * float(flow.time_s[1] - flow.time_s[0])
            passed[opening.name] = passed.get(opening.name, 0.0) + np.nan_to_num(volume)
    largest = max(passed, key=lambda name: passed[name])
    return largest if passed[largest] > 0.0 else ""


def loop_figure(results: RunResults) -> Figure:
    """Draw velocity against head in the main opening within the largest tide of each stage, by the hour."""
    name = main_opening(results)
    loops = _loops(results, name)
    shown = sorted(sorted(loops, key=lambda loop: -np.abs(loop.velocity_m_s).max())[:MOST_LOOPS], key=_stage_of)
    rows, columns = rows_and_columns(max(len(shown), 1), 3)
    figure = new_figure(2.6 * rows)
    left_out = len(loops) - len(shown)
    some = f" (the {len(shown)} stages with the fastest flow, {left_out} more not drawn)" if left_out else ""
    heading(figure, f"{results.plan.site.name}: velocity against head in {name or 'the gap'}{some}")
    grid = figure.add_gridspec(rows, columns + 1, width_ratios=[1.0] * columns + [0.05])
    if not shown:
        say_why_empty(figure.add_subplot(grid[0, 0]), "no discharge is known")
        return figure
    longest = max(float(loop.hours[-1]) for loop in shown)
    for position, loop in enumerate(shown):
        axes = figure.add_subplot(grid[position // columns, position % columns])
        points = _draw_loop(axes, loop, longest)
    bar = figure.colorbar(points, cax=figure.add_subplot(grid[:, columns], label=COLOUR_BAR))
    bar.set_label("time after low water at sea [h]")
    stage_key(figure, stage_numbers(results))
    return figure


def _stage_of(loop: _Loop) -> int:
    return loop.stage


def _loops(results: RunResults, name: str) -> list[_Loop]:
    return [
        _loop(number, flow, opening)
        for number, flow in enumerate(results.flows, start=1)
        for opening in flow.openings
        if opening.name == name and opening.given_end_velocity_m_s is None
    ]


def _loop(number: int, flow: StageFlow, opening: OpeningFlow) -> _Loop:
    """Return the tide of the largest range in a stage without a hole in it; the whole stage where there is none."""
    whole = [tide for tide in tide_slices(opening.level_sea_m) if np.all(flow.covered[tide])]
    tide = max(whole, key=lambda each: float(np.ptp(opening.level_sea_m[each])), default=slice(0, len(flow.time_s)))
    kept = np.unique(np.linspace(tide.start, tide.stop - 1, LOOP_POINTS).astype(np.int64))
    begun = utc_text(flow.time_s[tide.start])[:16].replace("T", " ")
    spell = f"from {begun}," if whole else f"whole stage, hours from {begun},"
    return _Loop(
        stage=number,
        title=f"{number}: {spell}\nrange {np.ptp(opening.level_sea_m[tide]):.2f} m",
        hours=(flow.time_s[kept] - flow.time_s[tide.start]) / SECONDS_PER_HOUR,
        head_m=opening.level_sea_m[kept] - flow.level_basin_m[kept],
        velocity_m_s=opening.gap_velocity_m_s[kept],
    )


def _draw_loop(axes: Axes, loop: _Loop, longest_h: float) -> PathCollection:
    axes.axhline(0.0, color=BLACK, linewidth=0.6)
    axes.axvline(0.0, color=BLACK, linewidth=0.6)
    axes.plot(loop.head_m, loop.velocity_m_s, color=GREY, linewidth=0.6)
    points = axes.scatter(
        loop.head_m, loop.velocity_m_s, c=loop.hours, s=8.0, cmap="viridis", vmin=0.0, vmax=longest_h, zorder=3
    )
    _write_hours(axes, loop)
    head, velocity = (1.3 * float(np.abs(row).max()) or 1.0 for row in (loop.head_m, loop.velocity_m_s))
    axes.set_xlim(-head, head)
    axes.set_ylim(-velocity, velocity)
    axes.text(0.03, 0.97, "↗ flood", transform=axes.transAxes, ha="left", va="top")
    axes.text(0.97, 0.03, "↙ ebb", transform=axes.transAxes, ha="right", va="bottom")
    axes.set_title(loop.title)
    axes.set_xlabel("head, sea less basin [m]")
    axes.set_ylabel("gap velocity [m/s]")
    return points


def _write_hours(axes: Axes, loop: _Loop) -> None:
    """Write the hour beside the curve: on one side while the flow grows, on the other while it falls."""
    size = np.array([np.abs(loop.head_m).max(), np.abs(loop.velocity_m_s).max()])
    grows = np.gradient(np.abs(loop.velocity_m_s)) >= 0.0
    written: list[tuple[bool, FloatArray]] = []
    for hour in np.arange(0.0, loop.hours[-1] - 0.5, NUMBERED_H):
        at = int(np.argmin(np.abs(loop.hours - hour)))
        place = np.array([loop.head_m[at], loop.velocity_m_s[at]]) / np.maximum(size, 1e-9)
        side = bool(grows[at])
        if any(side == other and np.abs(place - there).max() < _HOURS_APART for other, there in written):
            continue
        written.append((side, place))
        axes.annotate(
            f"{hour:.0f} h",
            (loop.head_m[at], loop.velocity_m_s[at]),
            xytext=(-5.0, 4.0) if side else (5.0, -4.0),
            textcoords="offset points",
            ha="right" if side else "left",
            va="center",
        )
