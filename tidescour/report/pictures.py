"""The figures of a run, each as PNG and SVG with the words that go under it."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Final

from matplotlib.figure import Figure

from tidescour.handoff.records import CalibrationResults, RunResults
from tidescour.handoff.stone_tables import STONE_LABEL
from tidescour.report.figures_basin import discharge_figure, levels_figure
from tidescour.report.figures_comparison import comparison_figure
from tidescour.report.figures_flow import end_velocity_figure, gap_velocity_figure, peak_tides_figure
from tidescour.report.figures_gap import loop_figure, section_figure
from tidescour.report.figures_length import FLATTEST_DRAWN, MOST_CHANGES, length_figure, sensitivity_figure
from tidescour.report.figures_records import records_figure
from tidescour.report.figures_scour import (
    growth_calendar_figure,
    growth_figure,
    shares_figure,
)
from tidescour.report.figures_stone import stone_figure
from tidescour.report.figures_sweep import sweep_figure
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
        name="sections",
        draw=section_figure,
        caption="Sections of the openings, filled up from stage to stage: crest and width at the end of each, the "
        "highest and lowest sea level of the programme, and the original bed at the end of the protection.",
    ),
    _Sheet(
        name="gap-velocity",
        draw=gap_velocity_figure,
        caption="Velocity in the control section of each opening, positive from sea to basin. Triangles and "
        "numbers: the highest of each stage in each direction.",
    ),
    _Sheet(
        name="velocity-by-head",
        draw=loop_figure,
        caption="Velocity against head in the opening that most water passes, within the tide of the largest range of "
        "each stage; hours count from low water at sea.",
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
        name="comparison",
        draw=comparison_figure,
        caption="All ways of counting a tide, each with the same alpha. They differ because growth goes with a power "
        "over 4 of the excess velocity: the integral chains the tide in small steps; a mean over the flow, or over the "
        "whole cycle, spreads its peak and counts less; the peak held all the time with flow counts it as if there "
        "were no slack; the mean velocity held forgets the peak. An alpha found with one of them belongs to that one: "
        "the last column is what each would need. Heavy outline: the rule that drives.",
    ),
    _Sheet(
        name="length",
        draw=length_figure,
        caption="A longer protection makes the hole shallower, and a shallower hole asks for less length: the required "
        "length is where both agree, or the least length. Thin lines: what the slopes that are common after a slide "
        "would ask for, common practice without a source; very loose sand has run out flatter than 1 in "
        f"{FLATTEST_DRAWN:g}, off the panel. Which slope holds is for soil investigation to say.",
    ),
    _Sheet(
        name="sensitivity",
        draw=sensitivity_figure,
        caption=f"What each input is worth, one changed at a time, flows as planned: the {MOST_CHANGES} that change "
        "the required length most. Depth is that behind the given length, length that which the slope rule asks for.",
    ),
)


_SWEEP_CAPTION: Final = (
    "Peaks in the main opening if its crest is raised, or its width cut down, and everything else stays as at the "
    "start of the programme, under the predicted sea of one cycle of spring and neap. Curves end where peaks hang on "
    "the basin level of long before. Stages with both changed, or with other openings shut, do not lie on them."
)
_LEVELS_CAPTION: Final = (
    "The recorded sea level routed through the gap as it was, with the numbers that were fitted, against the recorded "
    "level of the basin. The part held back was predicted, not fitted."
)
_DISCHARGE_CAPTION: Final = (
    "Discharge, positive from sea to basin, by all sources around each campaign of measurements. Bars and bands: one "
    "standard error either way."
)


def pictures(results: RunResults) -> tuple[Picture, ...]:
    """Return the figures of a run: of the records where a gauge was read, of sweep and stone where there is any."""
    drawn = []
    sweep = results.sweep
    with house_style():
        for sheet in _SHEETS:
            if sheet.name == "records" and not results.records:
                continue
            drawn.append(_picture(sheet.name, sheet.caption, sheet.draw(results)))
        if sweep.crest is not None or sweep.width is not None:
            drawn.append(_picture("sweep", _SWEEP_CAPTION, sweep_figure(results, sweep)))
        if results.stone.sizes:
            drawn.append(_picture("stone", STONE_LABEL, stone_figure(results, results.stone)))
    return tuple(drawn)


def calibration_pictures(results: CalibrationResults) -> tuple[Picture, ...]:
    """Return the figures of a calibration: levels, and a sheet of discharges for all openings and each measured one."""
    site = results.plan.site
    with house_style():
        drawn = [_picture("levels", _LEVELS_CAPTION, levels_figure(site, results.calibrated))]
        for number, table in enumerate(results.calibrated.campaigns, start=1):
            name = "discharge" if number == 1 else f"discharge-{number}"
            drawn.append(_picture(name, _DISCHARGE_CAPTION, discharge_figure(site, table)))
    return tuple(drawn)


def _picture(name: str, caption: str, figure: Figure) -> Picture:
    png, svg = rendered(figure)
    return Picture(name=name, caption=caption, png=png, svg=svg)


def picture_files(drawn: Iterable[Picture]) -> dict[str, bytes]:
    """Return the files of a result folder: ``figures/<name>.png`` and ``figures/<name>.svg``."""
    files = {}
    for picture in drawn:
        files[f"figures/{picture.name}.png"] = picture.png
        files[f"figures/{picture.name}.svg"] = picture.svg
    return files
