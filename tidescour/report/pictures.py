"""The figures of a run, each as PNG and SVG with the words that go under it."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Final

from matplotlib.figure import Figure

from tidescour.handoff.records import RunResults
from tidescour.report.figures_flow import end_velocity_figure, gap_velocity_figure, peak_tides_figure
from tidescour.report.figures_records import records_figure
from tidescour.report.figures_scour import (
    final_depth_figure,
    growth_calendar_figure,
    growth_figure,
    shares_figure,
)
from tidescour.report.style import house_style, rendered


@dataclass(frozen=True, slots=True, kw_only=True)
class Picture:
    """A figure, drawn: its file name without ending, the words under it, and its bytes in two formats."""

    name: str
    caption: str
    png: bytes
    svg: bytes


@dataclass(frozen=True, slots=True, kw_only=True)
class _Sheet:
    name: str
    draw: Callable[[RunResults], Figure]
    caption: str


_SHEETS: Final = (
    _Sheet(
        name="records",
        draw=records_figure,
        caption="Both gauges on the site datum and UTC. Flagged readings outside the panel stand at its edge, missing "
        "ones at its foot. Holes of up to 1 h between good samples are interpolated; longer ones are hatched.",
    ),
    _Sheet(
        name="gap-velocity",
        draw=gap_velocity_figure,
        caption="Velocity in the control section of each opening, positive from sea to basin. Triangles and "
        "numbers: the highest of each stage in each direction.",
    ),
    _Sheet(
        name="end-velocity",
        draw=end_velocity_figure,
        caption="Velocity at the end of the protection, basin side upward and sea side downward: the highest of "
        "each cycle. Shaded: above the velocity at which the grains begin to move, critical velocity over alpha.",
    ),
    _Sheet(
        name="peak-tides",
        draw=peak_tides_figure,
        caption="The same within the tide, around the largest excess of each stage and opening.",
    ),
    _Sheet(
        name="growth",
        draw=growth_figure,
        caption="Growth by effective time. Every stage has its own curve, as velocity, depth and alpha differ. The "
        "hole keeps its depth when the stage changes: a horizontal arrow leads to the time at which the next curve "
        "has that depth, and growth goes on from there.",
    ),
    _Sheet(
        name="growth-calendar",
        draw=growth_calendar_figure,
        caption="Growth of every place over the programme, at cycle ends under the tide rule that drives. Marks: ends "
        "of stages.",
    ),
    _Sheet(
        name="shares",
        draw=shares_figure,
        caption="Share of each stage in the effective time of a place, all brought to one reference: which stage to "
        "shorten.",
    ),
    _Sheet(
        name="final-depth",
        draw=final_depth_figure,
        caption="Depth after the last stage under the three rules that bring the tide into the growth law. The rule "
        "that drives growth has the heavy outline.",
    ),
)


def pictures(results: RunResults) -> tuple[Picture, ...]:
    """Return the figures of a run; that of the records only where a gauge was read."""
    drawn = []
    with house_style():
        for sheet in _SHEETS:
            if sheet.name == "records" and not results.records:
                continue
            png, svg = rendered(sheet.draw(results))
            drawn.append(Picture(name=sheet.name, caption=sheet.caption, png=png, svg=svg))
    return tuple(drawn)


def picture_files(drawn: Iterable[Picture]) -> dict[str, bytes]:
    """Return the files of a result folder: ``figures/<name>.png`` and ``figures/<name>.svg``."""
    files = {}
    for picture in drawn:
        files[f"figures/{picture.name}.png"] = picture.png
        files[f"figures/{picture.name}.svg"] = picture.svg
    return files
