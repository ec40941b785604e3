"""Size of the stone by stage and location, the stability forms side by side: for screening only."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import NullLocator

from tidescour.bed.stone import SCREENING_ONLY, STABILITY
from tidescour.bed.stone_records import LOCATIONS, Direction, StoneScreening, StoneSize
from tidescour.handoff.records import RunResults
from tidescour.report.style import (
    BLACK,
    PALE,
    heading,
    mark,
    new_figure,
    say_why_empty,
    stage_key,
    stage_numbers,
    wrapped,
)

_APART: Final = 0.18
"""Distance between the forms of one stage, whose room is 1."""

_ABOVE_AND_BELOW: Final = 1.3
_FOOT: Final = 0.16
"""Height of the strip at the foot, in which forms without a size stand, over that of the axis above it."""

_BESIDE_EACH_OTHER: Final[dict[Direction, float]] = {"flood": 0.4, "ebb": -0.4}
"""Where the directions stand in that strip, in halves of its height from the middle."""

_FILLED: Final[dict[Direction, bool]] = {"flood": True, "ebb": False}


@dataclass(frozen=True, slots=True, kw_only=True)
class _Scale:
    """The axis of sizes [m]: from `low_m` to `high_m`, and under it a strip down to `foot_m` for what has no size."""

    low_m: float
    high_m: float
    foot_m: float

    def without_size(self, direction: Direction | None = None) -> float:
        """Return the height of the strip's middle, or of one direction in it."""
        off = 0.0 if direction is None else _BESIDE_EACH_OTHER[direction]
        return self.foot_m * math.pow(self.low_m / self.foot_m, 0.5 + 0.5 * off)


def stone_figure(results: RunResults, screening: StoneScreening) -> Figure:
    """Draw the stone that each stage asks for, a row of panels an opening, a panel a location.

    A form without a size stands in a strip at the foot.

    Parameters
    ----------
    results : RunResults
        The run, for its stages.
    screening : StoneScreening
        Its stone sizes.
    """
    openings = list(dict.fromkeys(size.load.opening for size in screening.sizes)) or [""]
    figure = new_figure(0.8 + 2.6 * len(openings))
    heading(figure, f"{results.plan.site.name}: size of stone, {SCREENING_ONLY}", _key(), columns=len(STABILITY))
    grid = figure.subplots(len(openings), len(LOCATIONS), squeeze=False, sharex=True, sharey=True)
    scale = _size_scale(screening)
    numbers = {stage.name: number for number, stage in enumerate(results.plan.stage, start=1)}
    for row, opening in zip(grid, openings, strict=True):
        for axes, location in zip(row, LOCATIONS, strict=True):
            sizes = [
                size for size in screening.sizes if size.load.opening == opening and size.load.location == location
            ]
            _draw_panel(axes, sizes, numbers, scale)
            axes.set_title(f"{wrapped(opening, 34)}\n{location}" if opening else location)
        row[0].set_ylabel("size of stone [m]")
    for axes in grid[-1]:
        axes.set_xlabel("stage")
    _size_axis(grid[0, 0], scale)
    stage_key(figure, stage_numbers(results))
    return figure


def _key() -> list[Line2D]:
    words = {"izbash": "size d", "shields": "D_n50", "pilarczyk": "D_n50"}
    forms = []
    for number, name in enumerate(STABILITY):
        look, who = mark(number), name.split("-")
        label = ", ".join([who[0].capitalize(), *who[1:], words[who[0]]])
        forms.append(
            Line2D([], [], color=look.colour, marker=look.marker, linestyle="none", markersize=6.0, label=label)
        )
    return [*forms, *(_direction_handle(direction) for direction in _FILLED)]


def _direction_handle(direction: Direction) -> Line2D:
    face, words = (BLACK, "filled") if _FILLED[direction] else ("none", "open")
    return Line2D(
        [], [], color=BLACK, markerfacecolor=face, marker="o", linestyle="none", label=f"{direction}: {words}"
    )


def _draw_panel(axes: Axes, sizes: Sequence[StoneSize], numbers: dict[str, int], scale: _Scale) -> None:
    last = max(numbers.values(), default=1)
    axes.set_xlim(0.5, last + 0.5)
    every = -(-last // 12)
    axes.set_xticks(range(1, last + 1, every), [str(number) for number in range(1, last + 1, every)])
    axes.grid(visible=False, axis="x")
    for number in range(2, last + 1, 2):
        axes.axvspan(number - 0.5, number + 0.5, color=PALE, linewidth=0.0, zorder=0)
    if not sizes:
        say_why_empty(axes, "no load here")
        return
    if scale.foot_m < scale.low_m:
        axes.axhline(scale.low_m, color=BLACK, linewidth=0.6)
    for size in sizes:
        for form, value_m in enumerate(size.size_m):
            look = mark(form)
            axes.plot(
                [numbers[size.load.stage] + _APART * (form - 0.5 * (len(STABILITY) - 1))],
                [value_m if _drawn(value_m) else scale.without_size(size.load.direction)],
                color=look.colour,
                marker=look.marker,
                markersize=5.0,
                markeredgewidth=1.1,
                markerfacecolor=look.colour if _FILLED[size.load.direction] else "none",
                linestyle="none",
            )


def _drawn(size_m: float) -> bool:
    """Tell whether a size has a place on a logarithmic axis."""
    return math.isfinite(size_m) and size_m > 0.0


def _size_scale(screening: StoneScreening) -> _Scale:
    sizes = [value for size in screening.sizes for value in size.size_m]
    found = [value for value in sizes if _drawn(value)] or [1.0]
    low, high = min(found) / _ABOVE_AND_BELOW, max(found) * _ABOVE_AND_BELOW
    foot = low if all(map(_drawn, sizes)) else low * (low / high) ** _FOOT
    return _Scale(low_m=low, high_m=high, foot_m=foot)


def _size_axis(axes: Axes, scale: _Scale) -> None:
    """Give the axis that all panels share equal steps for equal shares, and the strip at its foot a name."""
    axes.set_yscale("log")
    axes.set_ylim(scale.foot_m, scale.high_m)
    tens = 10.0 ** np.arange(np.floor(np.log10(scale.low_m)), np.ceil(np.log10(scale.high_m)) + 1.0)
    ticks = np.outer(tens, (1.0, 2.0, 5.0)).ravel()
    ticks = ticks[(ticks >= scale.low_m) & (ticks <= scale.high_m)]
    ticks = ticks[:: -(-len(ticks) // 9)]
    labels = [f"{tick:g}" for tick in ticks]
    if scale.foot_m < scale.low_m:
        ticks, labels = np.append(ticks, scale.without_size()), [*labels, "no size"]
    axes.set_yticks(ticks, labels)
    axes.yaxis.set_minor_locator(NullLocator())
