"""Load cases: what a storm after a stage does at each place, beside the programme."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import timedelta

import numpy as np

from tidescour.bed.history import place_name
from tidescour.errors import Finding
from tidescour.gap.records import StageFlow
from tidescour.gauge.records import GivenSeries
from tidescour.plan.kinds import Side
from tidescour.plan.models import Opening, Plan, Stage
from tidescour.units import seconds_since_epoch

JUMP_M = 0.25
"""Step of the sea level where a storm begins that is worth a warning [m]: judgement, no source."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LoadCaseRow:
    """One storm at one place: times in seconds since 1970, levels in m above datum, velocities in m/s, depths in m.

    `depth_before_m` is that at the end of the stage, `depth_after_m` after the storm, `depth_allowed_m` that for which
    the given length is just enough, `stop_depth_m` that at which the works stop (infinite without one),
    `final_depth_m` after the programme if it goes on as planned behind the storm. `length_required_after_m` and
    `length_required_final_m` [m] belong to the depths after the storm and at the end.
    """

    load_case: str
    stage: str
    opening: str
    side: Side
    start_s: float
    end_s: float
    highest_sea_level_m: float
    peak_gap_velocity_m_s: float
    peak_end_velocity_m_s: float
    depth_before_m: float
    depth_after_m: float
    depth_allowed_m: float
    stop_depth_m: float
    length_required_after_m: float
    final_depth_m: float
    length_required_final_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class LoadCases:
    """All load cases of a plan, a row a case and place, in the order of the plan."""

    rows: tuple[LoadCaseRow, ...]
    findings: tuple[Finding, ...]


def storm_stage(name: str, stage: Stage, series: GivenSeries) -> Stage:
    """Return a storm as a stage that follows another, with the gap as it is at that one's end.

    Parameters
    ----------
    name : str
        Name of the load case.
    stage : Stage
        Stage that it follows.
    series : GivenSeries
        Sea level of the storm, on any clock. Where an opening has the sea later or earlier, the storm is shorter by so
        much.
    """
    lags = [opening.sea_lag_s for opening in stage.opening]
    lasting = timedelta(seconds=float(series.time_s[-1] - series.time_s[0]) - max(0.0, *lags) + min(0.0, *lags))
    return stage.model_copy(
        update={
            "name": f"load case {name}",
            "start": stage.end,
            "end": stage.end + lasting,
            "sea": series.name,
            "basin": "routed",
            "opening": tuple(_as_at_end(opening) for opening in stage.opening),
        }
    )


def storm_series(stage: Stage, series: GivenSeries) -> GivenSeries:
    """Return the sea level of a storm on the clock of its stage, from `storm_stage`."""
    first_s = seconds_since_epoch(stage.start) - max(0.0, *(opening.sea_lag_s for opening in stage.opening))
    return replace(series, time_s=series.time_s + (first_s - series.time_s[0]))


def _as_at_end(opening: Opening) -> Opening:
    crest_m, width_m = opening.crest_level_end_m, opening.width_end_m
    return opening.model_copy(
        update={
            "crest_level_m": opening.crest_level_m if crest_m is None else crest_m,
            "crest_level_end_m": None,
            "width_m": opening.width_m if width_m is None else width_m,
            "width_end_m": None,
        }
    )


def jump_findings(name: str, before: StageFlow, storm: StageFlow) -> tuple[Finding, ...]:
    """Tell where the sea level of a storm begins far from that at the end of its stage.

    Parameters
    ----------
    name : str
        Name of the load case.
    before, storm : StageFlow
        Flow of the stage, and of the storm that follows it.

    Returns
    -------
    tuple of Finding
        None or one: an error where no later head of the storm is larger than that of the jump, for the peaks are its
        own then; else a warning.
    """
    ended_m, begins_m = float(before.level_sea_m[-1]), float(storm.level_sea_m[0])
    if abs(begins_m - ended_m) <= JUMP_M:
        return ()
    heads_m = np.abs(storm.head_m)
    largest = float(heads_m[0]) >= float(np.max(heads_m))
    what = "no later head is larger, so that its peaks are those of" if largest else "its first hours are those of"
    return (
        Finding(
            severity="error" if largest else "warning",
            code="load-case-jump",
            where=f"load case {name!r}",
            message=f"the storm begins with the sea at {begins_m:.2f} m and the stage ends with it at {ended_m:.2f} m: "
            f"{what} that jump and not of the storm. Let the series begin at a level near {ended_m:.2f} m, on the same "
            f"{'rising' if _rising(before) else 'falling'} tide",
        ),
    )


def _rising(flow: StageFlow) -> bool:
    return bool(flow.level_sea_m[-1] > flow.level_sea_m[-2])


def depth_limit_findings(rows: Sequence[LoadCaseRow]) -> tuple[Finding, ...]:
    """Warn where a hole after a storm, or after the programme that goes on from it, is deeper than it may be."""
    findings = []
    for row in rows:
        where = f"load case {row.load_case!r}, {place_name(row.opening, row.side)}"
        if row.depth_after_m > row.depth_allowed_m:
            message = (
                f"the storm after stage {row.stage!r} deepens the hole from {row.depth_before_m:.2f} to "
                f"{row.depth_after_m:.2f} m, and {row.depth_allowed_m:.2f} m are all that the given length allows; "
                f"{row.length_required_after_m:.1f} m are required"
            )
            findings.append(Finding(severity="warning", code="load-case-too-deep", where=where, message=message))
        if row.final_depth_m >= row.stop_depth_m:
            message = (
                f"with the storm after stage {row.stage!r} the programme ends {row.final_depth_m:.2f} m deep: "
                f"stop_depth_m = {row.stop_depth_m:g} is reached"
            )
            findings.append(Finding(severity="warning", code="load-case-stop", where=where, message=message))
    return tuple(findings)


def surge_findings(plan: Plan, storms: LoadCases) -> tuple[Finding, ...]:
    """Say what the storms of a plan leave open; without any, the plan's own findings say that it holds the tide only.

    Parameters
    ----------
    plan : Plan
        Stages and load cases.
    storms : LoadCases
        What was found of them.

    Returns
    -------
    tuple of Finding
        None without load cases or where a stage takes a given sea; else one: a warning where a storm has an error,
        else a note.
    """
    if not plan.load_case or any(stage.sea != "tide" for stage in plan.stage):
        return ()
    tried = {case.stage for case in plan.load_case}
    without = [stage.name for stage in plan.stage if stage.name not in tried]
    unsound = any(finding.severity == "error" for finding in storms.findings)
    return (
        Finding(
            severity="warning" if unsound else "note",
            code="tide-only",
            where="load_case",
            message=(
                "depths and lengths of the programme hold the tide only; its storms stand beside them in load_cases.csv"
                + (", and not all of them are sound" if unsound else "")
                + (f". No storm was tried after {', '.join(map(repr, without))}" if without else "")
            ),
        ),
    )
