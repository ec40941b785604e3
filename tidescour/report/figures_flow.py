"""Velocities: in the gap, and at the end of the protection with what moves the bed."""

from __future__ import annotations

from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from tidescour.bed.records import BedHistory
from tidescour.handoff.records import DurationRow, RunResults
from tidescour.plan.kinds import Side
from tidescour.report.style import (
    BLACK,
    GREEN,
    SIDE_MARKS,
    SIDE_WORDS,
    day_numbers,
    flat_axes,
    heading,
    new_figure,
    rows_and_columns,
    say_why_empty,
    stage_bands,
    stage_key,
    stage_numbers,
    thinned,
    time_axis,
    wrapped,
)
from tidescour.units import SECONDS_PER_HOUR, FloatArray, utc_text

MOST_TIDES: Final = 12
NO_FLOW: Final = "no flow"
WINDOW_H: Final = 25.0
_TICK_S: Final = 6.0 * SECONDS_PER_HOUR
_UPWARD: Final[dict[Side, float]] = {"basin": 1.0, "sea": -1.0}


def opening_names(results: RunResults) -> list[str]:
    """Return the names of all openings in the order in which they first appear."""
    return list(dict.fromkeys(opening.name for flow in results.flows for opening in flow.openings))


def gap_velocity_figure(results: RunResults) -> Figure:
    """Draw the velocity in each opening over the programme, with the highest of each stage and direction."""
    names = opening_names(results)
    figure = new_figure(2.8 * len(names))
    heading(figure, f"{results.plan.site.name}: velocity in the gap")
    grid = figure.subplots(len(names), 1, squeeze=False, sharex=True)
    for axes, name in zip(grid[:, 0], names, strict=True):
        stage_bands(axes, results)
        axes.axhline(0.0, color=BLACK, linewidth=0.6)
        axes.margins(y=0.22)
        _draw_gap_velocities(axes, results, name)
        axes.set_title(wrapped(name, 60), pad=16.0)
        axes.set_ylabel("gap velocity [m/s]\n+ flood, − ebb")
        axes.tick_params(labelbottom=True)
    time_axis(grid[-1, 0])
    stage_key(figure, stage_numbers(results))
    return figure


def _draw_gap_velocities(axes: Axes, results: RunResults, name: str) -> None:
    """Draw the velocity in one opening, stage by stage."""
    stages = [(flow, opening) for flow in results.flows for opening in flow.openings if opening.name == name]
    velocities = [np.where(flow.covered, opening.gap_velocity_m_s, np.nan) for flow, opening in stages]
    if not any(np.any(np.abs(velocity) > 0.0) for velocity in velocities):
        given = any(opening.given_end_velocity_m_s is not None for _, opening in stages)
        say_why_empty(axes, "end velocity given: none in the gap" if given else NO_FLOW)
        axes.set_yticks([])
        return
    for (flow, _), velocity in zip(stages, velocities, strict=True):
        if not np.all(np.isnan(velocity)):
            _draw_gap_velocity(axes, flow.time_s, velocity)


def _draw_gap_velocity(axes: Axes, time_s: FloatArray, velocity: FloatArray) -> None:
    thin_s, thin = thinned(time_s, velocity)
    axes.plot(day_numbers(thin_s), thin, color=GREEN, linewidth=0.6)
    _mark_peak(axes, time_s, velocity, int(np.nanargmax(velocity)), "basin")
    _mark_peak(axes, time_s, velocity, int(np.nanargmin(velocity)), "sea")


def _mark_peak(axes: Axes, time_s: FloatArray, velocity: FloatArray, index: int, side: Side) -> None:
    """Mark the highest velocity towards a side, and write it at the edge of the panel where there is room."""
    if velocity[index] * _UPWARD[side] <= 0.0:
        return
    look = SIDE_MARKS[side]
    first, day, last = day_numbers(time_s[[0, index, -1]])
    axes.plot([day], velocity[[index]], marker=look.marker, color=look.colour, markersize=5.0, linestyle="none")
    low, high = axes.get_xlim()
    if last - first > 0.045 * (high - low):
        axes.text(
            0.5 * (first + last),
            0.98 if side == "basin" else 0.02,
            f"{abs(velocity[index]):.2f}",
            transform=axes.get_xaxis_transform(),
            ha="center",
            va="top" if side == "basin" else "bottom",
            color=look.colour,
        )


def end_velocity_figure(results: RunResults) -> Figure:
    """Draw the velocity at the end of the protection over the programme: basin side upward, sea side downward."""
    names = opening_names(results)
    figure = new_figure(2.8 * len(names))
    title = f"{results.plan.site.name}: velocity at the end of the protection, the highest of each cycle"
    heading(figure, title, _end_velocity_key(), columns=3)
    grid = figure.subplots(len(names), 1, squeeze=False, sharex=True)
    for axes, name in zip(grid[:, 0], names, strict=True):
        stage_bands(axes, results)
        flowing = [_draw_highest(axes, row) for row in _rows(results, name)]
        if not any(flowing):
            say_why_empty(axes, NO_FLOW)
            axes.set_yticks([])
        axes.set_title(wrapped(name, 60), pad=16.0)
        _finish_end_velocity(axes)
        axes.tick_params(labelbottom=True)
    time_axis(grid[-1, 0])
    stage_key(figure, stage_numbers(results))
    return figure


def _rows(results: RunResults, opening: str) -> list[DurationRow]:
    return [row for place in results.places if place.place.opening == opening for row in place.rows]


def threshold_velocity(bed: BedHistory) -> FloatArray:
    """Return the velocity at which grains begin to move, critical velocity over alpha [m/s]; NaN without flow."""
    return bed.critical_velocity_m_s / bed.alpha


def _draw_highest(axes: Axes, row: DurationRow) -> bool:
    """Draw one stage and side as a block a cycle, and return whether there is flow.

    A block has the highest velocity of the cycle, and the threshold at that moment.
    """
    bed, cycles = row.bed, row.duration.cycles
    velocity, threshold = bed.velocity_m_s, threshold_velocity(bed)
    begins, ends = np.searchsorted(bed.time_s, (cycles.start_s, cycles.end_s))
    blocks: list[tuple[float, float, float]] = []
    for start_s, end_s, begin, behind in zip(cycles.start_s, cycles.end_s, begins, ends, strict=True):
        if begin == behind:
            continue
        peak = begin + int(np.argmax(velocity[begin:behind]))
        if not velocity[peak] > 0.0:
            continue
        if blocks and start_s > blocks[-1][0]:
            # A break, so that nothing is drawn across a hole, or a part of a cycle without flow to this side.
            blocks.append((start_s, np.nan, np.nan))
        highest, least = velocity[peak], threshold[peak]
        blocks.extend(((start_s, highest, least), (end_s, highest, least)))
    if blocks:
        _draw_excess(axes, bed.side, *np.array(blocks).T)
    return bool(blocks)


def _draw_excess(axes: Axes, side: Side, time_s: FloatArray, velocity: FloatArray, threshold: FloatArray) -> None:
    look, up, days = SIDE_MARKS[side], _UPWARD[side], day_numbers(time_s)
    axes.plot(days, up * velocity, color=look.colour, linewidth=0.9)
    axes.plot(days, up * threshold, color=BLACK, linestyle=(0, (4, 2)), linewidth=1.0)
    axes.fill_between(
        days,
        up * threshold,
        up * np.fmax(velocity, threshold),
        facecolor=(look.colour, 0.35),
        edgecolor=look.colour,
        hatch=look.hatch,
        linewidth=0.0,
    )


def _finish_end_velocity(axes: Axes) -> None:
    axes.axhline(0.0, color=BLACK, linewidth=0.6)
    axes.set_ylabel("velocity [m/s]\n↑ basin side, ↓ sea side")
    axes.yaxis.set_major_formatter(lambda value, _: f"{abs(value):g}")


def _end_velocity_key() -> list[Line2D | Patch]:
    excess = [
        Patch(
            facecolor=(look.colour, 0.35),
            edgecolor=look.colour,
            hatch=look.hatch,
            label=f"excess, {SIDE_WORDS[side]}",
        )
        for side, look in SIDE_MARKS.items()
    ]
    return [Line2D([], [], color=BLACK, linestyle=(0, (4, 2)), label="threshold: critical velocity / alpha"), *excess]


def peak_tides_figure(results: RunResults) -> Figure:
    """Draw the tides around the largest excess of each stage and opening, those with the largest shares."""
    panels, left_out = _peak_panels(results)
    rows, _ = rows_and_columns(len(panels), 3)
    some = f" (the {len(panels)} with the largest shares of growth, {left_out} more not drawn)" if left_out else ""
    title = f"{results.plan.site.name}: tides of the largest excess at the end of the protection{some}"
    figure = new_figure(2.5 * rows)
    heading(figure, title, _end_velocity_key(), columns=3)
    for axes, (stage_number, opening) in zip(flat_axes(figure, len(panels), 3), panels, strict=True):
        _draw_peak_tide(axes, results, stage_number, opening)
    stage_key(figure, stage_numbers(results))
    return figure


def _peak_panels(results: RunResults) -> tuple[list[tuple[int, str]], int]:
    """Return stage number and opening of the panels in the order of the stages, and how many are left out."""
    share: dict[tuple[int, str], float] = {}
    for place in results.places:
        for row in place.rows:
            key = (results.plan.stage.index(row.stage), place.place.opening)
            share[key] = max(share.get(key, 0.0), np.nan_to_num(row.chain[0].share))
    largest = sorted(share, key=lambda key: -share[key])[:MOST_TIDES]
    return sorted(largest, key=lambda key: (opening_names(results).index(key[1]), key[0])), len(share) - len(largest)


def _draw_peak_tide(axes: Axes, results: RunResults, stage_number: int, opening: str) -> None:
    stage = results.plan.stage[stage_number]
    beds = [row.bed for row in _rows(results, opening) if row.stage == stage]
    first_s, last_s = _window(beds)
    still = True
    for bed in beds:
        inside = np.flatnonzero((bed.time_s >= first_s) & (bed.time_s <= last_s))
        kept = inside[:: max(len(inside) // 400, 1)]
        velocity = np.where(bed.covered, bed.velocity_m_s, np.nan)
        if not np.any(velocity[kept] > 0.0):
            continue
        still = False
        _draw_excess(axes, bed.side, bed.time_s[kept], velocity[kept], threshold_velocity(bed)[kept])
    if still:
        say_why_empty(axes, NO_FLOW)
        axes.set_yticks([])
    axes.set_xlim(*day_numbers(np.array([first_s, last_s])))
    axes.set_title(wrapped(f"{stage_number + 1}: {opening}", 34))
    ticks_s = np.arange(np.ceil(first_s / _TICK_S), np.floor(last_s / _TICK_S) + 1.0) * _TICK_S
    axes.set_xticks(day_numbers(ticks_s), [utc_text(tick_s)[11:16] for tick_s in ticks_s])
    axes.set_xlabel(f"time [UTC] from {utc_text(first_s)[:16].replace('T', ' ')}")
    _finish_end_velocity(axes)


def _window(beds: list[BedHistory]) -> tuple[float, float]:
    """Return start and end of the spell around the largest excess of both sides, inside the stage."""
    best_s, best = float(beds[0].time_s[0]), -np.inf
    for bed in beds:
        excess = np.where(bed.covered, bed.alpha * bed.velocity_m_s - bed.critical_velocity_m_s, -np.inf)
        index = int(np.argmax(np.nan_to_num(excess, nan=-np.inf)))
        if excess[index] > best:
            best_s, best = float(bed.time_s[index]), float(excess[index])
    start_s, end_s = float(beds[0].time_s[0]), float(beds[0].time_s[-1])
    length_s = min(WINDOW_H * SECONDS_PER_HOUR, end_s - start_s)
    first_s = min(max(best_s - 0.5 * length_s, start_s), end_s - length_s)
    return first_s, first_s + length_s
