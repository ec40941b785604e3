"""The two gauge records as read: levels, flags and holes."""

from __future__ import annotations

from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from numpy.typing import NDArray

from tidescour.gauge.records import FAIL, MISSING, SUSPECT, GaugeRecord
from tidescour.handoff.records import RunResults
from tidescour.report.style import (
    BLACK,
    BLUE,
    ORANGE,
    VERMILION,
    broken,
    day_numbers,
    foot_key,
    heading,
    level_label,
    new_figure,
    thinned,
    time_axis,
)
from tidescour.units import FloatArray

LONGEST_BRIDGED_S: Final = 3600.0
"""Intervals between good samples up to this are interpolated; longer ones are holes."""

_FLAGS: Final = (
    (SUSPECT, "suspect", ORANGE, "^"),
    (FAIL, "fail or excluded", VERMILION, "x"),
    (MISSING, "missing", BLACK, "|"),
)
_MOST_MARKS: Final = 1500


def records_figure(results: RunResults) -> Figure:
    """Draw every gauge that was read, one above the other on one time axis."""
    figure = new_figure(2.7 * len(results.records))
    heading(figure, f"{results.plan.site.name}: water levels as read")
    grid = figure.subplots(len(results.records), 1, squeeze=False, sharex=True)
    for axes, record in zip(grid[:, 0], results.records, strict=True):
        _draw_record(axes, record)
        axes.set_ylabel(level_label(results))
        axes.tick_params(labelbottom=True)
    time_axis(grid[-1, 0])
    foot_key(figure, _key(), columns=5)
    return figure


def _draw_record(axes: Axes, record: GaugeRecord) -> None:
    good = record.good
    low, high = _limits(record)
    time_s, level_m = thinned(*broken(record.time_s[good], record.level_m[good], LONGEST_BRIDGED_S))
    axes.plot(day_numbers(time_s), level_m, color=BLUE, linewidth=0.8)
    holes = _holes(record.time_s[good])
    axes.broken_barh(holes, (low, high - low), facecolor="#dddddd", edgecolor="#888888", hatch="xxx", linewidth=0.4)
    for flag, _, colour, marker in _FLAGS:
        days, level = _flagged(record, flag, low, high)
        axes.plot(days, level, linestyle="none", marker=marker, color=colour, markersize=5.0, markerfacecolor="none")
    axes.set_ylim(low, high)
    axes.set_title(
        f"{record.side} gauge: {len(good)} samples, every {record.step_s / 60.0:g} min, "
        f"{_share(good)} % good, {len(holes)} hole{'' if len(holes) == 1 else 's'} over 1 h"
    )


def _share(good: NDArray[np.bool_]) -> str:
    """Return the share of good samples in percent, rounded down, so that 100 means every one."""
    count = int(np.count_nonzero(good))
    return "100" if count == len(good) else f"{10_000 * count // len(good) / 100.0:.2f}"


def _limits(record: GaugeRecord) -> tuple[float, float]:
    levels = record.level_m[record.good]
    levels = levels if len(levels) else record.level_m[np.isfinite(record.level_m)]
    if not len(levels):
        return -1.0, 1.0
    low, high = float(np.min(levels)), float(np.max(levels))
    margin = max(0.12 * (high - low), 0.05)
    return low - margin, high + margin


def _holes(good_time_s: FloatArray) -> list[tuple[float, float]]:
    """Return start and length of each hole in days."""
    days = day_numbers(good_time_s)
    first = np.flatnonzero(np.diff(good_time_s) > LONGEST_BRIDGED_S)
    return [(float(days[index]), float(days[index + 1] - days[index])) for index in first]


def _flagged(record: GaugeRecord, flag: int, low: float, high: float) -> tuple[FloatArray, FloatArray]:
    """Return where the marks of a flag stand: at the edge where the reading is outside, at the foot without one."""
    chosen = np.flatnonzero(record.flag == flag)
    # Marks that would stand on one another are left out.
    chosen = chosen[:: -(-len(chosen) // _MOST_MARKS) or 1]
    edge = 0.02 * (high - low)
    level = np.nan_to_num(record.level_m[chosen], nan=low)
    return day_numbers(record.time_s[chosen]), np.clip(level, low + edge, high - edge)


def _key() -> list[Line2D | Patch]:
    marks: list[Line2D | Patch] = [
        Line2D([], [], linestyle="none", marker=marker, color=colour, markerfacecolor="none", label=name)
        for _, name, colour, marker in _FLAGS
    ]
    hole = Patch(facecolor="#dddddd", edgecolor="#888888", hatch="xxx", label="hole over 1 h between good samples")
    return [Line2D([], [], color=BLUE, label="pass or not evaluated"), *marks, hole]
