"""How figures look: colours that the colour-blind can tell apart, and never a colour alone."""

from __future__ import annotations

import io
import textwrap
import warnings
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any, Final, Literal

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.dates import AutoDateLocator, ConciseDateFormatter
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from tidescour.handoff.records import RunResults
from tidescour.plan.models import PlaceBed, Side
from tidescour.units import SECONDS_PER_DAY, FloatArray, seconds_since_epoch

BLACK: Final = "#000000"
ORANGE: Final = "#e69f00"
SKY: Final = "#56b4e9"
GREEN: Final = "#009e73"
BLUE: Final = "#0072b2"
VERMILION: Final = "#d55e00"
PURPLE: Final = "#cc79a7"
"""Palette of Okabe and Ito (2008), Color Universal Design, without its yellow, which is too pale for lines."""

GREY: Final = "#6e6e6e"
PALE: Final = "#eeeeee"

WIDTH_IN: Final = 10.0
PNG_DPI: Final = 110
MOST_POINTS: Final = 2400

_SETTINGS: Final[Any] = {
    "font.family": "DejaVu Sans",
    "font.size": 9.0,
    "axes.titlesize": 9.5,
    "axes.titlelocation": "left",
    "axes.labelsize": 9.0,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.grid": True,
    "axes.axisbelow": True,
    "axes.xmargin": 0.01,
    "grid.color": "#d9d9d9",
    "grid.linewidth": 0.5,
    "xtick.labelsize": 9.0,
    "ytick.labelsize": 9.0,
    "legend.fontsize": 9.0,
    "legend.frameon": False,
    "figure.titlesize": 11.0,
    "figure.titleweight": "bold",
    "hatch.linewidth": 0.6,
    "lines.linewidth": 1.2,
    # A name of the user with dollar signs is no formula.
    "text.parse_math": False,
    "svg.hashsalt": "tidescour",
    "svg.fonttype": "path",
    "path.simplify": True,
    "date.epoch": "1970-01-01T00:00:00",
}


@contextmanager
def house_style() -> Iterator[None]:
    """Draw with the settings of the house, whatever those of the machine are, and leave those as they were."""
    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rcParams.update(_SETTINGS)
        yield


Dash = Literal["-"] | tuple[float, tuple[float, ...]]


@dataclass(frozen=True, slots=True, kw_only=True)
class Mark:
    """Colour, dash, marker and hatch that stand for one thing in every figure."""

    colour: str
    dash: Dash
    marker: str
    hatch: str


_COLOURS = (BLUE, VERMILION, GREEN, PURPLE, ORANGE, SKY, BLACK)
_DASHES: tuple[Dash, ...] = ("-", (0, (5, 2)), (0, (5, 2, 1, 2)), (0, (2, 1)))
_MARKERS = ("o", "s", "^", "D", "v")
_HATCHES = ("", "///", "...", "\\\\\\", "xxx")

SIDE_MARKS: Final[dict[Side, Mark]] = {
    "basin": Mark(colour=BLUE, dash="-", marker="^", hatch="///"),
    "sea": Mark(colour=VERMILION, dash=(0, (5, 2)), marker="v", hatch="\\\\\\"),
}

SIDE_WORDS: Final[dict[Side, str]] = {
    "basin": "basin side (dug by the flood)",
    "sea": "sea side (dug by the ebb)",
}


def mark(number: int) -> Mark:
    """Return the look of the thing with this number, from 0; periods differ, so that 140 pairs differ."""
    return Mark(
        colour=_COLOURS[number % len(_COLOURS)],
        dash=_DASHES[number % len(_DASHES)],
        marker=_MARKERS[number % len(_MARKERS)],
        hatch=_HATCHES[number % len(_HATCHES)],
    )


def new_figure(height_in: float) -> Figure:
    """Return an empty figure of the house width that keeps its parts apart."""
    return Figure(figsize=(WIDTH_IN, height_in), layout="constrained")


def heading(figure: Figure, title: str, handles: Sequence[Line2D | Patch] = (), columns: int = 1) -> None:
    """Write a title over a figure, with a key under it where there are handles."""
    if not handles:
        figure.suptitle(wrapped(title, 100))
        return
    legend = figure.legend(handles=list(handles), loc="outside upper center", ncols=columns, title=wrapped(title, 100))
    legend.get_title().set_fontsize(11.0)
    legend.get_title().set_fontweight("bold")
    legend.get_title().set_multialignment("center")


def wrapped(text: str, width: int) -> str:
    """Return a text in lines of at most `width` characters."""
    return "\n".join(textwrap.wrap(text, width)) or text


def place_title(place: PlaceBed, width: int = 56) -> str:
    """Return the opening, and under it the side and what digs there."""
    return f"{wrapped(place.opening, width)}\n{SIDE_WORDS[place.side]}"


def level_label(results: RunResults) -> str:
    """Return the label of an axis of levels, with the datum."""
    return f"level [m above\n{wrapped(results.plan.site.datum, 24)}]"


def stage_key(figure: Figure, handles: Sequence[Line2D | Patch], title: str = "stages") -> None:
    """Write under a figure which stage each number stands for."""
    longest = max(len(str(handle.get_label())) for handle in handles)
    columns = 1 if len(handles) == 1 else 2 if longest > 30 else 3
    bare = all(handle.get_linestyle() == "None" for handle in handles)
    legend = figure.legend(
        handles=list(handles),
        loc="outside lower center",
        ncols=columns,
        title=title,
        handlelength=0.0 if bare else 3.5,
        handletextpad=0.0 if bare else 0.8,
    )
    legend.get_title().set_fontsize(9.0)


def stage_labels(results: RunResults) -> list[str]:
    """Return number and name of each stage."""
    return [wrapped(f"{number}  {stage.name}", 60) for number, stage in enumerate(results.plan.stage, start=1)]


def stage_numbers(results: RunResults) -> list[Line2D]:
    """Return the handles of a key of stages whose looks do not differ."""
    return [Line2D([], [], linestyle="none", label=label) for label in stage_labels(results)]


def stage_lines(results: RunResults) -> list[Line2D]:
    """Return the handles of a key of stages that are drawn as lines."""
    looks = (mark(number) for number in range(len(results.plan.stage)))
    return [
        Line2D([], [], color=look.colour, linestyle=look.dash, linewidth=2.2, label=label)
        for look, label in zip(looks, stage_labels(results), strict=True)
    ]


def day_numbers(time_s: FloatArray) -> FloatArray:
    """Return seconds since 1970 as the day numbers of a time axis."""
    days: FloatArray = np.asarray(time_s, dtype=np.float64) / SECONDS_PER_DAY
    return days


def time_axis(axes: Axes, label: str = "time [UTC]") -> None:
    """Give an axis of day numbers its dates."""
    locator = AutoDateLocator(tz="UTC", minticks=3, maxticks=9)  # type: ignore[no-untyped-call]
    formatter = ConciseDateFormatter(  # type: ignore[no-untyped-call]
        locator,
        tz="UTC",
        formats=["%Y", "%b", "%d %b", "%H:%M", "%H:%M", "%H:%M:%S"],
        zero_formats=["", "%b\n%Y", "%d %b", "%d %b", "%H:%M", "%H:%M"],
        offset_formats=["", "%Y", "%Y", "%d %b %Y", "%d %b %Y", "%d %b %Y"],
    )
    axes.xaxis.set_major_locator(locator)
    axes.xaxis.set_major_formatter(formatter)
    axes.set_xlabel(label)


def stage_spans(results: RunResults) -> list[tuple[float, float]]:
    """Return start and end of each stage as day numbers."""
    spans = []
    for stage in results.plan.stage:
        start, end = day_numbers(np.array([seconds_since_epoch(stage.start), seconds_since_epoch(stage.end)]))
        spans.append((float(start), float(end)))
    return spans


def stage_bands(axes: Axes, results: RunResults) -> None:
    """Shade every other stage and write its number over it."""
    spans = stage_spans(results)
    whole = spans[-1][1] - spans[0][0]
    for number, (start, end) in enumerate(spans, start=1):
        if number % 2 == 0:
            axes.axvspan(start, end, color=PALE, linewidth=0.0, zorder=0)
        axes.axvline(start, color="#bbbbbb", linewidth=0.6, zorder=0)
        if (end - start) / whole > 0.015:
            axes.text(
                0.5 * (start + end),
                1.0,
                str(number),
                transform=axes.get_xaxis_transform(),
                ha="center",
                va="bottom",
                color=GREY,
            )
    axes.set_xlim(spans[0][0], spans[-1][1])


def thinned(time_s: FloatArray, value: FloatArray, points: int = MOST_POINTS) -> tuple[FloatArray, FloatArray]:
    """Return fewer points that draw the same line: in each of many equal spells the lowest and the highest.

    Parameters
    ----------
    time_s, value : (n,) array
        A series; NaN breaks the line and is kept as a break.
    points : int
        About how many points are kept at most, breaks apart.

    Returns
    -------
    (m,) array, (m,) array
        Stamps and values, m not above n.
    """
    if len(time_s) <= points:
        return time_s, value
    spells = np.linspace(time_s[0], time_s[-1], points // 2 + 1)
    cuts = np.searchsorted(time_s, spells[1:-1])
    kept = [0, len(time_s) - 1]
    for begin, end in zip([0, *cuts], [*cuts, len(time_s)], strict=True):
        spell = value[begin:end]
        breaks = np.flatnonzero(np.isnan(spell))
        if len(breaks) < len(spell):
            kept.extend((begin + int(np.nanargmin(spell)), begin + int(np.nanargmax(spell))))
        if len(breaks):
            kept.append(begin + int(breaks[0]))
    chosen = np.unique(kept)
    return time_s[chosen], value[chosen]


def broken(time_s: FloatArray, value: FloatArray, longest_s: float) -> tuple[FloatArray, FloatArray]:
    """Return a series with a break, one NaN, in every interval longer than `longest_s`."""
    holes = np.flatnonzero(np.diff(time_s) > longest_s)
    middle = 0.5 * (time_s[holes] + time_s[holes + 1])
    return np.insert(time_s, holes + 1, middle), np.insert(value, holes + 1, np.nan)


def rendered(figure: Figure) -> tuple[bytes, bytes]:
    """Return a figure as PNG and as SVG, the same bytes from the same figure."""
    with warnings.catch_warnings():
        # A name in letters that the font lacks gets boxes in the picture; the tables have it in full.
        warnings.filterwarnings("ignore", message="Glyph .* missing from font")
        figure.draw_without_rendering()
        # The parts have found their places; they need not be sought again for each format.
        figure.set_layout_engine(None)
        return _saved(figure, "png"), _saved(figure, "svg")


def _saved(figure: Figure, kind: Literal["png", "svg"]) -> bytes:
    stream = io.BytesIO()
    # Neither the day nor the version of the drawing library stands in a picture.
    nameless = {"png": {"Software": None}, "svg": {"Date": None, "Creator": None}}
    figure.savefig(stream, format=kind, dpi=PNG_DPI, metadata=nameless[kind])
    return stream.getvalue()


def rows_and_columns(panels: int, most_columns: int) -> tuple[int, int]:
    """Return the grid that holds so many panels."""
    columns = min(panels, most_columns)
    return -(-panels // columns), columns


def flat_axes(figure: Figure, panels: int, most_columns: int, *, share_x: bool = False) -> Sequence[Axes]:
    """Return so many axes in a grid, filled row by row."""
    rows, columns = rows_and_columns(panels, most_columns)
    grid = figure.subplots(rows, columns, squeeze=False, sharex=share_x)
    axes: list[Axes] = list(grid.flat)
    for spare in axes[panels:]:
        spare.remove()
    return axes[:panels]
