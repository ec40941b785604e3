"""Load cases of a plan: each storm routed after its stage, and what it does to the holes there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import timedelta

import numpy as np

from tidescour.errors import Finding, PlanError, TidescourError
from tidescour.gap.levels import Waters
from tidescour.gap.limits import limit_findings
from tidescour.gap.records import StageFlow
from tidescour.gap.stage import stage_flow
from tidescour.handoff.records import PlaceResult
from tidescour.pipeline.inputs import together
from tidescour.pipeline.places import PlaceCase, Visit, peak_gap_velocity, rows_at, surface_beds, visits
from tidescour.plan.models import Plan, Stage
from tidescour.plan.models_survey import LoadCase
from tidescour.scour.chain import depth_findings, final_depth
from tidescour.scour.length import allowed_depth, chained, minimum_length, nearby_length
from tidescour.scour.records import RowDurations
from tidescour.study.storms import (
    LoadCaseRow,
    LoadCases,
    depth_limit_findings,
    jump_findings,
    storm_series,
    storm_stage,
)
from tidescour.units import seconds_since_epoch

SHORTEST = timedelta(hours=1)


def load_cases(
    plan: Plan,
    waters: Waters,
    flows: Sequence[StageFlow],
    cases: Sequence[PlaceCase],
    results: Sequence[PlaceResult],
) -> LoadCases:
    """Route the storms of a plan, and find what each does to the holes behind its openings.

    Parameters
    ----------
    plan : Plan
        Its load cases.
    waters : Waters
        With the series of the storms.
    flows : sequence of StageFlow
        Of all stages of the programme, for the levels at which they end.
    cases, results : sequences of one length
        The places, and what the programme does to them.

    Returns
    -------
    LoadCases
        A row for each storm and each place that stands in its stage.

    Raises
    ------
    TidescourError
        If a storm has no result; the message names the load case.
    """
    rows: list[LoadCaseRow] = []
    findings: list[tuple[Finding, ...]] = []
    for storm in plan.load_case:
        try:
            found, told = _storm(storm, plan, waters, flows, cases, results)
        except PlanError as error:
            raise PlanError(*(_named(storm, problem) for problem in error.problems)) from error
        except TidescourError as error:
            raise type(error)(_named(storm, str(error))) from error
        rows += found
        findings.append(told)
    return LoadCases(rows=tuple(rows), findings=together(findings))


def _named(storm: LoadCase, problem: str) -> str:
    return f"load case {storm.name!r} after stage {storm.stage!r}: {problem}"


def _storm(
    storm: LoadCase,
    plan: Plan,
    waters: Waters,
    flows: Sequence[StageFlow],
    cases: Sequence[PlaceCase],
    results: Sequence[PlaceResult],
) -> tuple[list[LoadCaseRow], tuple[Finding, ...]]:
    stage, before = next(
        (stage, flow) for stage, flow in zip(plan.stage, flows, strict=True) if stage.name == storm.stage
    )
    _refuse(stage, plan)
    given = waters.series[storm.series]
    after = storm_stage(storm.name, stage, given)
    if after.end - after.start < SHORTEST:
        raise PlanError(f"series {storm.series!r} holds less than an hour of storm: give the whole storm")
    moved = replace(waters, series={**waters.series, storm.series: storm_series(after, given)})
    flow = stage_flow(after, plan.basin, moved, float(before.level_basin_m[-1]))
    standing = [
        (replace(case, visits=visited), case, result)
        for case, result in zip(cases, results, strict=True)
        if (visited := visits((flow,), (after,), case.place.opening))
    ]
    beds = surface_beds(tuple(alone for alone, _, _ in standing))
    hit = [
        _Hit(case=case, result=result, visit=alone.visits[0], row=rows_at(alone, rules=(plan.scour.tide,))[0])
        for alone, case, result in standing
    ]
    rows = [_load_case_row(storm, each) for each in hit]
    findings = together(
        [flow.findings, _hole_findings(storm, before), jump_findings(storm.name, before, flow)],
        [limit_findings(after, flow, plan.basin, [case.place for case in cases])],
        (bed.findings for place in beds.values() for bed in place),
        (_deep_findings(storm, each) for each in hit),
        [depth_limit_findings(rows)],
    )
    return rows, findings


def _refuse(stage: Stage, plan: Plan) -> None:
    if plan.basin is None:
        raise PlanError("the basin is routed through a storm: write [basin] with level_m and area_m2")
    for opening in stage.opening:
        if opening.relation is None:
            raise PlanError(
                f"the flow of opening {opening.name!r} is given in that stage and is not known in a storm: write "
                "relation and coefficient there, or leave the load case out"
            )


def _hole_findings(storm: LoadCase, before: StageFlow) -> tuple[Finding, ...]:
    if before.covered[-1]:
        return ()
    return (
        Finding(
            severity="warning",
            code="start-in-hole",
            where=f"load case {storm.name!r}",
            message=f"the records have a hole where stage {before.stage!r} ends, so that the basin level at which the "
            "storm begins is a guess",
        ),
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Hit:
    """A place that a storm reaches, with its row in the storm."""

    case: PlaceCase
    result: PlaceResult
    visit: Visit
    row: RowDurations

    def before(self, stage: str) -> int:
        """Return how many of the rows of the programme come before the storm."""
        return 1 + next(number for number, row in enumerate(self.result.rows) if row.stage.name == stage)


def _load_case_row(storm: LoadCase, hit: _Hit) -> LoadCaseRow:
    case, visit, place = hit.case, hit.visit, hit.case.place
    at = hit.before(storm.stage)
    planned = [row.durations for row in hit.result.rows]
    until = replace(case, visits=(*case.visits[:at], visit))
    whole = replace(case, visits=(*until.visits, *case.visits[at:]))
    near_m = hit.result.required.length_m
    return LoadCaseRow(
        load_case=storm.name,
        stage=storm.stage,
        opening=place.opening,
        side=place.side,
        start_s=seconds_since_epoch(visit.stage.start),
        end_s=seconds_since_epoch(visit.stage.end),
        highest_sea_level_m=float(np.max(visit.opening.level_sea_m)),
        peak_gap_velocity_m_s=peak_gap_velocity(visit, place.side),
        peak_end_velocity_m_s=hit.row.layers[0].peak_velocity_m_s,
        depth_before_m=hit.result.rows[at - 1].step(case.plan.scour.tide).end_depth_m,
        depth_after_m=_depth(case, (*planned[:at], hit.row)),
        depth_allowed_m=allowed_depth(place),
        stop_depth_m=float("inf") if place.stop_depth_m is None else place.stop_depth_m,
        length_required_after_m=_length(until, near_m),
        final_depth_m=_depth(case, (*planned[:at], hit.row, *planned[at:])),
        length_required_final_m=_length(whole, near_m),
    )


def _deep_findings(storm: LoadCase, hit: _Hit) -> tuple[Finding, ...]:
    """Find whether the hole outgrows the evidence of the growth laws in the storm."""
    case = hit.case
    rows = (*(row.durations for row in hit.result.rows[: hit.before(storm.stage)]), hit.row)
    return depth_findings((hit.row,), chained(case.place, rows, case.law, case.plan.scour.tide)[-1:])


def _depth(case: PlaceCase, rows: Sequence[RowDurations]) -> float:
    steps = chained(case.place, rows, case.law, case.plan.scour.tide)
    return final_depth(steps, case.place.start_depth_m)


def _length(case: PlaceCase, near_m: float) -> float:
    """Return the length that a place needs for the depth after its last visit."""
    place = case.place
    return nearby_length(
        lambda length_m: (
            place.depth_margin_factor * _depth(case, rows_at(case, length_m, rules=(case.plan.scour.tide,)))
        ),
        place.failure_slope_cot,
        minimum_length([visit.flow for visit in case.visits], place),
        near_m,
    )
