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
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.dates import AutoDateLocator, num2date
from matplotlib.figure import Figure
from matplotlib.legend import Legend
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import AutoLocator

from tidescour.handoff.records import RunResults
from tidescour.plan.kinds import Side
from tidescour.plan.models_bed import PlaceBed
from tidescour.study.soundings import SoundingResults
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

_HEADING: Final = "heading"
_FOOT: Final = "key"
_AROUND_IN: Final = 0.08

_SETTINGS: Final[Any] = {
    "font.family": "DejaVu Sans",
    "font.size": 9.0,
    "axes.titlesize": 9.5,
    "axes.titlelocation": "left",
    # Sought by the drawing library unless given, which takes long.
    "axes.titley": 1.0,
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
    # Fitting letters to dots takes an eighth of the drawing and shows little at this size.
    "text.hinting": "none",
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


ResultsOfStages = RunResults | SoundingResults
"""Results of a plan's stages, for what is drawn of these alone."""

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


def new_figure(panels_in: float) -> Figure:
    """Return an empty figure of the house width; `panels_in` is the height of all its panels with their labels."""
    # The dots of the PNG from the start, so that no text is measured twice.
    return Figure(figsize=(WIDTH_IN, panels_in), dpi=PNG_DPI)


def heading(figure: Figure, title: str, handles: Sequence[Line2D | Patch] = (), columns: int = 1) -> None:
    """Write a title over a figure, with a key under it where there are handles."""
    legend = figure.legend(handles=list(handles), loc="upper center", ncols=columns, title=wrapped(title, 100))
    legend.set_gid(_HEADING)
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


def lay_out(figure: Figure) -> None:
    """Give the panels of a figure their room, then add that of heading and key above and below them."""
    renderer = FigureCanvasAgg(figure).get_renderer()  # type: ignore[no-untyped-call]
    for axes in figure.axes:
        locator = axes.yaxis.get_major_locator()
        if isinstance(locator, AutoLocator):
            # Their number must not change, and with it the width of their labels, once the room is given.
            locator.set_params(nbins=6)
    figure.tight_layout(pad=0.5, h_pad=0.9, w_pad=1.5)
    # Left in place, the layout would be sought again for each format.
    figure.set_layout_engine(None)
    panels_in = figure.get_figheight()
    above_in, below_in = (
        sum(
            legend.get_window_extent(renderer).height / PNG_DPI + _AROUND_IN
            for legend in figure.legends
            if legend.get_gid() == where
        )
        for where in (_HEADING, _FOOT)
    )
    height_in = above_in + panels_in + below_in
    bottom, top = (
        (below_in + part * panels_in) / height_in for part in (figure.subplotpars.bottom, figure.subplotpars.top)
    )
    figure.set_size_inches(WIDTH_IN, height_in)
    figure.subplots_adjust(bottom=bottom, top=top)


def foot_key(figure: Figure, handles: Sequence[Line2D | Patch], columns: int) -> Legend:
    """Write a key under a figure."""
    legend = figure.legend(handles=list(handles), loc="lower center", ncols=columns)
    legend.set_gid(_FOOT)
    return legend


def stage_key(figure: Figure, handles: Sequence[Line2D | Patch], title: str = "stages") -> None:
    """Write under a figure which stage each number stands for."""
    longest = max(len(line) for handle in handles for line in str(handle.get_label()).splitlines())
    columns = 1 if len(handles) == 1 else 2 if longest > 30 else 3
    bare = all(handle.get_linestyle() == "None" for handle in handles)
    legend = figure.legend(
        handles=list(handles),
        loc="lower center",
        ncols=columns,
        title=title,
        handlelength=0.0 if bare else 3.5,
        handletextpad=0.0 if bare else 0.8,
    )
    legend.set_gid(_FOOT)
    legend.get_title().set_fontsize(9.0)


def stage_labels(results: ResultsOfStages) -> list[str]:
    """Return number and name of each stage."""
    return [wrapped(f"{number}  {stage.name}", 46) for number, stage in enumerate(results.plan.stage, start=1)]


def stage_numbers(results: ResultsOfStages) -> list[Line2D]:
    """Return the handles of a key of stages whose looks do not differ."""
    return [Line2D([], [], linestyle="none", label=label) for label in stage_labels(results)]


def stage_lines(results: RunResults) -> list[Line2D]:
    """Return the handles of a key of stages that are drawn as lines."""
    looks = (mark(number) for number in range(len(results.plan.stage)))
    return [
        Line2D([], [], color=look.colour, linestyle=look.dash, linewidth=2.2, label=label)
        for look, label in zip(looks, stage_labels(results), strict=True)
    ]


def say_why_empty(axes: Axes, words: str) -> None:
    """Write in an empty panel why it is empty."""
    axes.text(0.5, 0.55, words, transform=axes.transAxes, ha="center", color=GREY)


def day_numbers(time_s: FloatArray) -> FloatArray:
    """Return seconds since 1970 as the day numbers of a time axis."""
    days: FloatArray = np.asarray(time_s, dtype=np.float64) / SECONDS_PER_DAY
    return days


def time_axis(axes: Axes, label: str = "time [UTC]") -> None:
    """Give an axis of day numbers, already drawn on, its dates."""
    first, last = axes.get_xlim()
    locator = AutoDateLocator(tz="UTC", minticks=3, maxticks=9)  # type: ignore[no-untyped-call]
    ticks = np.asarray(locator.tick_values(*num2date([first, last], tz="UTC")))  # type: ignore[no-untyped-call]
    ticks = ticks[(ticks >= first) & (ticks <= last)]
    axes.set_xticks(ticks, date_labels(ticks))
    axes.set_xlabel(label)


def date_labels(days: FloatArray) -> list[str]:
    """Return what stands under the ticks of a time axis: day and month, or the hour where ticks lie within the day.

    What these leave open, the year or the date, stands under the first tick and wherever it changes.
    """
    moments = num2date(days, tz="UTC")  # type: ignore[no-untyped-call]
    whole = all(moment.hour == moment.minute == moment.second == 0 for moment in moments)
    near, far = ("%d %b", "%Y") if whole else ("%H:%M", "%d %b %Y")
    labels, before = [], ""
    for moment in moments:
        above = moment.strftime(far)
        labels.append(f"{moment.strftime(near)}\n{above if above != before else ''}")
        before = above
    return labels


def stage_spans(results: ResultsOfStages) -> list[tuple[float, float]]:
    """Return start and end of each stage as day numbers."""
    spans = []
    for stage in results.plan.stage:
        start, end = day_numbers(np.array([seconds_since_epoch(stage.start), seconds_since_epoch(stage.end)]))
        spans.append((float(start), float(end)))
    return spans


def stage_bands(axes: Axes, results: ResultsOfStages) -> None:
    """Shade every other stage and write its number over it."""
    spans = stage_spans(results)
    whole = spans[-1][1] - spans[0][0]
    # A stage that the next one does not follow at once has a line at its end as well.
    for edge in sorted({edge for span in spans for edge in span}):
        axes.axvline(edge, color="#bbbbbb", linewidth=0.6, zorder=0)
    for number, (start, end) in enumerate(spans, start=1):
        if number % 2 == 0:
            axes.axvspan(start, end, color=PALE, linewidth=0.0, zorder=0)
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
    cuts = np.linspace(time_s[0], time_s[-1], points // 2 + 1)[1:-1]
    spell = np.searchsorted(cuts, time_s, side="right")
    # By spell, then by value: the first of each spell is its lowest, the first from behind its highest.
    order = np.lexsort((value, spell))
    valued, missing = order[~np.isnan(value[order])], np.flatnonzero(np.isnan(value))
    kept = [each[np.unique(spell[each], return_index=True)[1]] for each in (valued, valued[::-1], missing)]
    chosen = np.unique(np.concatenate(([0, len(time_s) - 1], *kept)))
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
        lay_out(figure)
        return _saved(figure, "png"), _saved(figure, "svg")


def _saved(figure: Figure, kind: Literal["png", "svg"]) -> bytes:
    stream = io.BytesIO()
    # Neither the day nor the version of the drawing library stands in a picture.
    if kind == "png":
        # Packed less hard: in about half the time, and about a sixth larger.
        figure.savefig(stream, format=kind, metadata={"Software": None}, pil_kwargs={"compress_level": 1})
    else:
        figure.savefig(stream, format=kind, metadata={"Date": None, "Creator": None})
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
