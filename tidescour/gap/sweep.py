"""What the gap would do at other crests and widths: the curves from which a closure programme is read."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any, Final

import numpy as np

from tidescour.errors import Finding
from tidescour.gap.forcing import basin_inflow, even_steps, stage_forcing, stage_seas, with_points_between
from tidescour.gap.levels import Waters
from tidescour.gap.openings import OpeningSet, opening_rows, opening_section, opening_set
from tidescour.gap.routing import Forcing, basin_levels
from tidescour.gap.section import crest_area
from tidescour.gap.storage import Storage, basin_storage
from tidescour.gap.sweep_records import TIDES, ClosureSweep, SweepCurve, SweptTide
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.units import FloatArray, IntArray, seconds_since_epoch

CREST_RELATIONS: Final = ("broad-crest", "narrow-crest")
GAP_RELATIONS: Final = (*CREST_RELATIONS, "open-gap")
"""Relations of a gap that is being closed; an open gap has no sill that could be raised."""

STEP_S: Final = 60.0
WINDOW_STEPS: Final = 21269
"""14.77 days, from spring to spring."""
LEAD_STEPS: Final = 21600
SHORT_LEAD_STEPS: Final = 4320
LEADS_AT_MOST: Final = 4
"""Three days let most basins forget their start; the others run up to four times through fifteen."""

STARTS_AGREE_M: Final = 0.001
PEAKS_AGREE: Final = 0.01
MEANS_AGREE_M: Final = 0.01

CREST_RUNGS: Final = 16
WIDTH_RUNGS: Final = 12
NARROWEST: Final = 0.02
ABOVE_HIGHEST: Final = 0.02
"""How far the last crest stands over the highest sea level, as a share of the sea's range."""

TURN_SHARE: Final = 0.05
"""A tide must pass this share of its largest swing on both sides of the mean (common practice, no source)."""


_FIXED: Final[dict[str, Any]] = {"crest_level_end_m": None, "width_end_m": None}
"""What an opening loses that stays as it is at the start of its stage."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Sea:
    """What drives the basin before and in the window, and where in the window spring, mean, neap and all tides lie."""

    lead: Forcing
    window: Forcing
    storage: Storage
    tides: tuple[slice, ...]
    whole: slice


def low_waters(level_m: FloatArray) -> IntArray:
    """Return where the low waters of a tide are, those between two passages above its mean.

    Parameters
    ----------
    level_m : (n,) array
        Even samples of a level, finite.

    Returns
    -------
    (k,) array of int64
        Places in the array, increasing; none where the level does not swing.
    """
    away = level_m - level_m.mean()
    sure = np.flatnonzero(np.abs(away) > TURN_SHARE * np.abs(away).max())
    above = away[sure] > 0.0
    turns = np.flatnonzero(above[1:] != above[:-1])
    lows = []
    for before, last in pairwise(turns):
        if above[before]:
            first, behind = sure[before + 1], sure[last] + 1
            lows.append(first + int(np.argmin(level_m[first:behind])))
    return np.array(lows, dtype=np.int64)


def tide_slices(level_m: FloatArray) -> tuple[slice, ...]:
    """Return the tides of a level from low water to low water, both included; none without two low waters."""
    return tuple(slice(int(first), int(last) + 1) for first, last in pairwise(low_waters(level_m)))


def closure_sweep(stage: Stage, basin: Basin | None, waters: Waters) -> ClosureSweep:
    """Route the basin with the main opening of a stage at a ladder of crests, and at one of widths.

    The sea is its predicted tide over 14.77 days from the start of the stage, whatever the stage itself takes. The main
    opening is the one with the largest area under the highest of these levels; the others, and those beside the gap,
    stay as they are at the start of the stage. Inflows are their means over the stage. The crest is raised from that of
    the start to just over the highest sea level, the width cut down to a fiftieth. Spring, mean and neap tide are those
    with the largest, median and smallest range at sea, from low water to low water.

    Each run starts where two basins that began at the lowest and the highest sea level met within a millimetre. Where
    they do not, peaks are kept that both agree on within 1 %.

    Parameters
    ----------
    stage : Stage
        The first of the programme.
    basin : Basin or None
        Storage, inflows and side openings.
    waters : Waters
        The tide at sea, and series of inflow.

    Returns
    -------
    ClosureSweep
        Without curves, and with a finding that says why, where the plan does not allow them.

    Raises
    ------
    RecordError
        If a series of inflow does not cover the stage.
    DomainError
        If a number of a relation or a profile is not right.
    """
    reason = _reason_against(stage, basin, waters)
    if reason or basin is None:
        return ClosureSweep(stage=stage.name, findings=(_not_swept(stage, "crest and width", reason),))
    openings = [opening.model_copy(update=_FIXED) for opening in (*stage.opening, *basin.side_opening)]
    forcing, time_s = _tidal_forcing(stage, openings, basin, waters)
    level = forcing.sea_level_m[LEAD_STEPS:, 0]
    found = tide_slices(level)
    if not found:
        return ClosureSweep(stage=stage.name, findings=(_not_swept(stage, "crest and width", "the sea has no tide"),))
    tides = _spring_mean_neap(level, found)
    sea = _Sea(
        lead=_part(forcing, 0, LEAD_STEPS),
        window=_part(forcing, LEAD_STEPS, LEAD_STEPS + WINDOW_STEPS),
        storage=basin_storage(basin),
        tides=tides,
        whole=slice(found[0].start, found[-1].stop - 1),
    )
    main = _main_opening(stage, float(level.max()))
    top = float(level.max()) + ABOVE_HIGHEST * float(np.ptp(level))
    curves, findings = _curves(stage, openings, main, sea, top)
    return ClosureSweep(
        stage=stage.name,
        opening=stage.opening[main].name,
        tides=tuple(
            SweptTide(
                name=name,
                start_s=float(time_s[LEAD_STEPS + tide.start]),
                end_s=float(time_s[LEAD_STEPS + tide.stop - 1]),
                range_m=float(np.ptp(level[tide])),
            )
            for name, tide in zip(TIDES, tides, strict=True)
        ),
        crest=curves[0],
        width=curves[1],
        findings=findings,
    )


def _not_swept(stage: Stage, what: str, reason: str) -> Finding:
    """Return the note that there is no curve."""
    return Finding(
        severity="note",
        code="not-swept",
        where=f"stage {stage.name!r}",
        message=f"no curve by {what}: {reason}",
    )


def _reason_against(stage: Stage, basin: Basin | None, waters: Waters) -> str:
    """Return why a stage cannot be swept; empty where it can."""
    if basin is None or not basin.level_m:
        return "[basin] has no storage to route"
    if waters.sea_fit is None:
        return "there is no tide at sea to predict"
    for opening in (*stage.opening, *basin.side_opening):
        if opening.relation is None:
            return f"opening {opening.name!r} has a given flow, which another gap would change"
    if not any(opening.relation in GAP_RELATIONS for opening in stage.opening):
        return f"no opening has the relation of a gap ({', '.join(GAP_RELATIONS)})"
    return ""


def _tidal_forcing(
    stage: Stage, openings: Sequence[Opening], basin: Basin, waters: Waters
) -> tuple[Forcing, FloatArray]:
    """Return what drives the basin from fifteen days before the stage to the end of the window, and the steps."""
    start_s, end_s = seconds_since_epoch(stage.start), seconds_since_epoch(stage.end)
    time_s = start_s + STEP_S * np.arange(-LEAD_STEPS, WINDOW_STEPS + 1.0)
    instants = with_points_between(time_s)
    tidal = stage.model_copy(update={"sea": "tide"})
    inflow = float(basin_inflow(basin, waters, even_steps(start_s, end_s), stage.name).mean())
    steady = basin.model_copy(update={"inflow": (), "inflow_m3_s": inflow})
    seas = stage_seas(tidal, openings, waters, instants, bridge=True)
    return stage_forcing(tidal, steady, waters, instants, seas), time_s


def _part(forcing: Forcing, first: int, last: int) -> Forcing:
    """Return the steps from the first instant to the last."""
    return Forcing(
        step_s=forcing.step_s,
        sea_level_m=forcing.sea_level_m[first : last + 1],
        sea_level_between_m=forcing.sea_level_between_m[first:last],
        given_discharge_m3_s=forcing.given_discharge_m3_s[first : last + 1],
        given_discharge_between_m3_s=forcing.given_discharge_between_m3_s[first:last],
    )


def _spring_mean_neap(level_m: FloatArray, tides: tuple[slice, ...]) -> tuple[slice, ...]:
    """Return the tides of the largest, the median and the smallest range."""
    order = np.argsort([-np.ptp(level_m[tide]) for tide in tides], kind="stable")
    return tides[order[0]], tides[order[len(tides) // 2]], tides[order[-1]]


def _main_opening(stage: Stage, level_m: float) -> int:
    """Return which opening of a stage has the largest area below a level, of those that may be swept."""
    areas = []
    for opening in stage.opening:
        section = opening_section(opening)
        swept = opening.relation in GAP_RELATIONS
        areas.append(crest_area(level_m, section.crest_level_m, section.layers) if swept else -1.0)
    return int(np.argmax(areas))


def _curves(
    stage: Stage, openings: list[Opening], main: int, sea: _Sea, top_m: float
) -> tuple[tuple[SweepCurve | None, SweepCurve | None], tuple[Finding, ...]]:
    """Return the curves by crest and by width, and why there is none."""
    opening = openings[main]
    highest = np.array([sea.window.sea_level_m.max()])
    if not np.isfinite(opening_rows(opening_set(openings), main, highest, highest)[0, 0]):
        reason = f"relation {opening.relation} has no value for opening {opening.name!r} at the highest sea level"
        return (None, None), (_not_swept(stage, "crest and width", reason),)
    crest = width = None
    findings = []
    if opening.relation not in CREST_RELATIONS:
        findings.append(_not_swept(stage, "crest level", f"relation {opening.relation} has no sill to raise"))
    elif opening.crest_level_m >= top_m:
        findings.append(_not_swept(stage, "crest level", f"that of {opening.name!r} is over the highest sea level"))
    else:
        crest = _curve(openings, main, "crest_level_m", np.linspace(opening.crest_level_m, top_m, CREST_RUNGS), sea)
    if opening.width_m is None:
        findings.append(_not_swept(stage, "width", f"opening {opening.name!r} has a profile"))
    else:
        widths = np.geomspace(opening.width_m, NARROWEST * opening.width_m, WIDTH_RUNGS)
        width = _curve(openings, main, "width_m", widths, sea)
    return (crest, width), tuple(findings)


def _curve(openings: list[Opening], main: int, key: str, ladder: FloatArray, sea: _Sea) -> SweepCurve:
    """Return the peaks with one number of the main opening changed along a ladder."""
    rungs = []
    for value in ladder:
        changed = openings[main].model_copy(update={key: float(value)})
        rungs.append(_rung([*openings[:main], changed, *openings[main + 1 :]], main, sea))
    peaks = np.array([rung[0] for rung in rungs])
    return SweepCurve(
        value_m=ladder,
        head_m=peaks[:, 0],
        gap_velocity_m_s=peaks[:, 1],
        unit_discharge_m2_s=peaks[:, 2],
        mean_basin_level_m=np.array([rung[1] for rung in rungs]),
    )


def _rung(openings: list[Opening], main: int, sea: _Sea) -> tuple[FloatArray, float]:
    """Return (3, 3, 2) peaks of head, velocity and unit discharge by tide and direction, and the mean basin level."""
    geometry = opening_set(openings)
    low, high = _levels_after_lead(geometry, sea)
    met = high - low <= STARTS_AGREE_M
    starts = (0.5 * (low + high),) if met else (low, high)
    levels = [basin_levels(geometry, sea.window, sea.storage, start).level_m for start in starts]
    row = sea.window.sea_level_m[:, geometry.sea_row[main]]
    peaks = [_peaks(geometry, main, row, level, sea.tides) for level in levels]
    means = [float(level[sea.whole].mean()) for level in levels]
    agreed = np.ptp(peaks, axis=0) <= PEAKS_AGREE * np.max(peaks, axis=0)
    mean = float(np.mean(means)) if np.ptp(means) <= MEANS_AGREE_M else float("nan")
    return np.where(agreed, np.mean(peaks, axis=0), np.nan), mean


def _levels_after_lead(geometry: OpeningSet, sea: _Sea) -> tuple[float, float]:
    """Return where two basins stand at the start of the window that began at the lowest and the highest sea level."""
    short = _part(sea.lead, LEAD_STEPS - SHORT_LEAD_STEPS, LEAD_STEPS)
    low, high = float(sea.lead.sea_level_m[:, 0].min()), float(sea.lead.sea_level_m[:, 0].max())
    for lead in (short, *(sea.lead for _ in range(LEADS_AT_MOST))):
        if high - low <= STARTS_AGREE_M:
            break
        low, high = (float(basin_levels(geometry, lead, sea.storage, start).level_m[-1]) for start in (low, high))
    return low, high


def _peaks(
    geometry: OpeningSet, main: int, sea_m: FloatArray, basin_m: FloatArray, tides: tuple[slice, ...]
) -> FloatArray:
    """Return the largest head, gap velocity and unit discharge by tide and direction."""
    # One call for all tides: each costs more than the flow of a tide.
    instants = np.concatenate([np.arange(tide.start, tide.stop) for tide in tides])
    firsts = np.cumsum([0, *(tide.stop - tide.start for tide in tides[:-1])])
    sea, basin = sea_m[instants], basin_m[instants]
    discharge, area, flow_width = opening_rows(geometry, main, sea, basin)
    wet = area > 0.0
    velocity = np.divide(discharge, area, out=np.zeros_like(area), where=wet)
    unit = np.divide(discharge, flow_width, out=np.zeros_like(area), where=wet)
    rows = np.stack((sea - basin, velocity, unit))
    both_ways = [np.maximum.reduceat(sign * rows, firsts, axis=1) for sign in (1.0, -1.0)]
    peaks: FloatArray = np.maximum(0.0, np.stack(both_ways, axis=2)) + 0.0
    return peaks
