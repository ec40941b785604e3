"""The basin while it was measured: levels recorded and routed, and discharge from every source."""

from __future__ import annotations

from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from tidescour.gap.calibrating import Calibrated
from tidescour.gap.campaigns import CampaignTable
from tidescour.gap.discharges import DischargeSeries, campaign_spans
from tidescour.plan.models import Site
from tidescour.report.style import (
    BLACK,
    BLUE,
    GREEN,
    GREY,
    VERMILION,
    Dash,
    Mark,
    broken,
    day_numbers,
    heading,
    mark,
    new_figure,
    thinned,
    time_axis,
    wrapped,
)
from tidescour.units import SECONDS_PER_DAY, SECONDS_PER_HOUR, BoolArray, FloatArray, utc_text

LONGEST_BRIDGED_S: Final = SECONDS_PER_HOUR + 0.5
CLOSE_UP_S: Final = 6.0 * SECONDS_PER_DAY
MOST_CAMPAIGNS: Final = 4
AROUND_CAMPAIGN_S: Final = 3.0 * SECONDS_PER_HOUR
AROUND_PEAK_S: Final = SECONDS_PER_DAY
MEASURED: Final = "measured"

_LEVEL_LOOKS: Final[tuple[tuple[str, str, Dash, float], ...]] = (
    ("sea, recorded", VERMILION, (0, (5, 2)), 0.8),
    ("basin, recorded", BLUE, "-", 1.8),
    ("basin, routed", BLACK, (0, (2, 1.2)), 0.9),
)
_HELD_BACK: Final = ("#e4e4e4", "//")
_SOURCES: Final = ("by head", "by storage", "routed")


def levels_figure(site: Site, calibrated: Calibrated) -> Figure:
    """Draw levels at sea and in the basin, a close-up of some days, and what the routed level misses.

    Parameters
    ----------
    site : Site
        Its name and datum.
    calibrated : Calibrated
        Levels, recorded and routed, and the scores of the parts.
    """
    whole = (float(calibrated.time_s[0]), float(calibrated.time_s[-1]))
    spells = [("whole span", whole)]
    # A span that is short enough to be read needs no close-up.
    if whole[1] - whole[0] > CLOSE_UP_S:
        spells.append((f"close-up of {CLOSE_UP_S / SECONDS_PER_DAY:.0f} days", _close_up(calibrated)))
    figure = new_figure(2.6 * (len(spells) + 1))
    heading(figure, f"{site.name}: basin level recorded and routed", _levels_key(calibrated), columns=4)
    *panels, residual = figure.subplots(len(spells) + 1, 1)
    for axes, (title, spell) in zip(panels, spells, strict=True):
        _draw_levels(axes, calibrated, spell)
        axes.set_title(title)
        axes.set_ylabel(f"level [m above\n{wrapped(site.datum, 24)}]")
    routed = np.interp(calibrated.record_time_s, calibrated.time_s, calibrated.level_routed_m)
    missed = calibrated.record_level_m - routed
    residual.plot(*_line(calibrated.record_time_s, missed, whole), color=GREEN, linewidth=0.8)
    residual.axhline(0.0, color=BLACK, linewidth=0.6)
    residual.set_title(_scores(calibrated))
    residual.set_ylabel("recorded less\nrouted level [m]")
    _finish(residual, calibrated, whole)
    return figure


def _draw_levels(axes: Axes, calibrated: Calibrated, spell_s: tuple[float, float]) -> None:
    rows = (
        (calibrated.time_s, calibrated.level_sea_m),
        (calibrated.record_time_s, calibrated.record_level_m),
        (calibrated.time_s, calibrated.level_routed_m),
    )
    for (time_s, level_m), (_, colour, dash, wide) in zip(rows, _LEVEL_LOOKS, strict=True):
        axes.plot(*_line(time_s, level_m, spell_s), color=colour, linestyle=dash, linewidth=wide)
    _finish(axes, calibrated, spell_s)


def _line(time_s: FloatArray, value: FloatArray, spell_s: tuple[float, float]) -> tuple[FloatArray, FloatArray]:
    """Return day numbers and values that draw the line in a spell, with a break in every hole of over an hour."""
    inside = (time_s >= spell_s[0]) & (time_s <= spell_s[1]) & np.isfinite(value)
    if not inside.any():
        return np.empty(0), np.empty(0)
    thin_s, thin = thinned(*broken(time_s[inside], value[inside], LONGEST_BRIDGED_S))
    return day_numbers(thin_s), thin


def _held_back_from(calibrated: Calibrated) -> float:
    """Return where the part begins that was not fitted [s]; infinite where there is none."""
    return next((part.start_s for part in calibrated.parts if part.name == "held back"), float("inf"))


def _close_up(calibrated: Calibrated) -> tuple[float, float]:
    """Return some days around the start of the part held back, or in the middle where there is none."""
    start_s, end_s = float(calibrated.time_s[0]), float(calibrated.time_s[-1])
    middle_s = _held_back_from(calibrated)
    if middle_s > end_s:
        middle_s = 0.5 * (start_s + end_s)
    first_s = min(max(middle_s - 0.5 * CLOSE_UP_S, start_s), end_s - CLOSE_UP_S)
    return first_s, first_s + CLOSE_UP_S


def _finish(axes: Axes, calibrated: Calibrated, spell_s: tuple[float, float]) -> None:
    first, last = day_numbers(np.array(spell_s))
    begun = _held_back_from(calibrated) / SECONDS_PER_DAY
    if begun < last:
        colour, hatch = _HELD_BACK
        axes.axvspan(max(begun, first), last, facecolor=colour, edgecolor="white", hatch=hatch, linewidth=0.0, zorder=0)
    axes.set_xlim(first, last)
    time_axis(axes)


def _scores(calibrated: Calibrated) -> str:
    """Return the size of what is missed, and of what the sea alone, scaled and lagged, misses."""
    parts = [
        f"{part.name} {100.0 * part.routed.rms_m:.1f} cm ({100.0 * part.guess.rms_m:.1f})" for part in calibrated.parts
    ]
    return f"root mean square (in brackets that of the sea scaled and lagged): {', '.join(parts)}"


def _levels_key(calibrated: Calibrated) -> list[Line2D | Patch]:
    lines: list[Line2D | Patch] = [
        Line2D([], [], color=colour, linestyle=dash, linewidth=wide, label=label)
        for label, colour, dash, wide in _LEVEL_LOOKS
    ]
    if np.isinf(_held_back_from(calibrated)):
        return lines
    colour, hatch = _HELD_BACK
    return [*lines, Patch(facecolor=colour, edgecolor="white", hatch=hatch, label="held back, not fitted")]


def discharge_figure(site: Site, table: CampaignTable) -> Figure:
    """Draw discharge by every source around each campaign, the longest ones where there are many.

    Without measurements two days around the largest routed discharge are drawn.

    Parameters
    ----------
    site : Site
        Its name.
    table : CampaignTable
        The series of one opening, or of all together.
    """
    every = _campaigns(table)
    spans = sorted(sorted(every, key=lambda span: span[0] - span[1])[:MOST_CAMPAIGNS])
    figure = new_figure(2.9 * len(spans))
    left_out = len(every) - len(spans)
    some = f" (the {len(spans)} longest campaigns, {left_out} more not drawn)" if left_out else ""
    key = _discharge_key(table)
    title = f"{site.name}: discharge of {table.opening or 'all openings'}{some}"
    heading(figure, title, key, columns=min(len(key), 5))
    grid = figure.subplots(len(spans), 1, squeeze=False)
    for axes, span in zip(grid[:, 0], spans, strict=True):
        _draw_campaign(axes, table, *span)
    return figure


def _campaigns(table: CampaignTable) -> tuple[tuple[float, float], ...]:
    """Return start and end of each campaign; of measurements far apart, or without any, one spell."""
    series = table.series[-1]
    if table.measured:
        return campaign_spans(series.time_s) or ((float(series.time_s[0]), float(series.time_s[-1])),)
    peak_s = float(series.time_s[np.argmax(np.abs(np.nan_to_num(series.discharge_m3_s)))])
    return ((max(peak_s - AROUND_PEAK_S, series.time_s[0]), min(peak_s + AROUND_PEAK_S, series.time_s[-1])),)


def _look(series: DischargeSeries) -> Mark:
    """Return the look of a source, the same on every sheet."""
    return mark(_SOURCES.index(series.source))


def _draw_campaign(axes: Axes, table: CampaignTable, start_s: float, end_s: float) -> None:
    around_s = AROUND_CAMPAIGN_S if table.measured else 0.0
    first_s, last_s = start_s - around_s, end_s + around_s
    axes.axhline(0.0, color=BLACK, linewidth=0.6)
    for series in table.series:
        inside = (series.time_s >= first_s) & (series.time_s <= last_s)
        if series.source == MEASURED:
            _draw_measured(axes, series, inside)
        else:
            _draw_source(axes, series, inside)
    axes.set_xlim(*day_numbers(np.array([first_s, last_s])))
    begun = utc_text(start_s)[:16].replace("T", " ")
    hours = (end_s - start_s) / SECONDS_PER_HOUR
    axes.set_title(
        f"campaign from {begun}, {hours:.1f} h" if table.measured else "no measurements: around the largest discharge"
    )
    axes.set_ylabel("discharge [m³/s]\n+ flood, − ebb")
    time_axis(axes)
    if table.measured:
        for edge in day_numbers(np.array([start_s, end_s])):
            axes.axvline(edge, color=GREY, linewidth=0.6, linestyle=(0, (2, 2)), zorder=0)


def _draw_measured(axes: Axes, series: DischargeSeries, inside: BoolArray) -> None:
    axes.errorbar(
        day_numbers(series.time_s[inside]),
        series.discharge_m3_s[inside],
        yerr=series.standard_error_m3_s[inside],
        color=BLACK,
        linestyle="none",
        marker="o",
        markersize=3.5,
        elinewidth=0.9,
        capsize=2.0,
        zorder=4,
    )


def _draw_source(axes: Axes, series: DischargeSeries, inside: BoolArray) -> None:
    look = _look(series)
    days, flow, error = (
        day_numbers(series.time_s[inside]),
        series.discharge_m3_s[inside],
        series.standard_error_m3_s[inside],
    )
    axes.plot(days, flow, color=look.colour, linestyle=look.dash, linewidth=1.2)
    if np.any(np.isfinite(error)):
        axes.fill_between(
            days,
            flow - error,
            flow + error,
            facecolor=(look.colour, 0.25),
            edgecolor=look.colour,
            hatch=look.hatch,
            linewidth=0.0,
        )


def _discharge_key(table: CampaignTable) -> list[Line2D | Patch]:
    handles: list[Line2D | Patch] = []
    for series in table.series:
        if series.source == MEASURED:
            handles.append(
                Line2D([], [], color=BLACK, linestyle="none", marker="o", markersize=3.5, label="measured ± error")
            )
            continue
        look = _look(series)
        handles.append(Line2D([], [], color=look.colour, linestyle=look.dash, linewidth=1.2, label=series.source))
        if np.any(np.isfinite(series.standard_error_m3_s)):
            handles.append(
                Patch(
                    facecolor=(look.colour, 0.25),
                    edgecolor=look.colour,
                    hatch=look.hatch,
                    linewidth=0.0,
                    label=f"{series.source} ± error",
                )
            )
    return handles
