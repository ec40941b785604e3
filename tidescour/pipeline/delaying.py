"""Every stage late by some weeks: the flows that are then others, and the depths and lengths that follow."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

from tidescour.bed.history import place_name
from tidescour.errors import DomainError, Finding, TidescourError
from tidescour.gap.levels import Waters
from tidescour.gap.records import StageFlow
from tidescour.pipeline.inputs import Progress, silent, together
from tidescour.pipeline.places import PlaceCase, rows_at, surface_beds
from tidescour.pipeline.preparing import cases_of, prepared, stage_flows
from tidescour.plan.models import Plan, Stage
from tidescour.plan.notes import default_notes
from tidescour.scour.chain import final_depth, gap_findings
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.length import chained, minimum_length, nearby_length, required_length
from tidescour.scour.records import RowDurations
from tidescour.study.delay import (
    NOT_KNOWN,
    NOTHING,
    DelayRow,
    DelayStudy,
    Extra,
    PlannedPlace,
    bound_to_its_time,
    moved,
    prolonged,
)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Planned:
    """A place as planned; `rows` by the length of the protection, None for the plan's own."""

    case: PlaceCase
    rows: Mapping[float | None, tuple[RowDurations, ...]]
    depth_m: float
    length_m: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Job:
    """What all delays start from."""

    plan: Plan
    waters: Waters
    law: GrowthLaw
    flows: tuple[StageFlow, ...]
    places: tuple[_Planned, ...]


def delay(plan: Plan, weeks: Sequence[int], progress: Progress = silent) -> DelayStudy:
    """Let each stage of a plan be late, and compute depths and required lengths anew.

    Parameters
    ----------
    plan : Plan
        Read for a run.
    weeks : sequence of int
        By how many weeks, positive and increasing.
    progress : callable
        Takes the name of each step.

    Returns
    -------
    DelayStudy
        With a note for each stage that cannot be moved.

    Raises
    ------
    TidescourError
        If there is no result as planned; nothing was written.
    """
    ready = prepared(plan, progress)
    waters, law = ready.waters, ready.law
    flows = stage_flows(plan, waters, progress)
    progress("scour as planned")
    cases = cases_of(plan, law, flows)
    beds = surface_beds(cases)
    job = _Job(plan=plan, waters=waters, law=law, flows=flows, places=tuple(_planned(case) for case in cases))
    rows: list[DelayRow] = []
    findings: list[Finding] = []
    for number, stage in enumerate(plan.stage):
        said = _bound_findings(plan.stage, number)
        findings += said
        if bound_to_its_time(stage):
            continue
        for late in weeks:
            progress(f"stage {stage.name!r} late by {late} of {weeks[-1]} weeks")
            found, problems = _late(job, number, late, alone=bool(said))
            rows += found
            findings += problems
    return DelayStudy(
        plan=plan,
        weeks=tuple(weeks),
        places=tuple(
            PlannedPlace(place=each.case.place, final_depth_m=each.depth_m, required_length_m=each.length_m)
            for each in job.places
        ),
        rows=tuple(rows),
        files=ready.files,
        findings=together(
            [default_notes(plan), ready.findings, gap_findings(plan.stage)],
            (flow.findings for flow in flows),
            (bed.findings for place in beds.values() for bed in place),
            [(_CALENDAR,), findings],
        ),
    )


_CALENDAR = Finding(
    severity="note",
    code="delay-on-the-calendar",
    where="delay",
    message="on the calendar every later stage meets the tides of its new dates, so that spring and neap move too and "
    "a week late may cost less than nothing; 2 weeks are about one cycle of both. The own longer stay has the later "
    "stages grow as planned: it tells what time in that stage costs",
)


def _bound_findings(stages: Sequence[Stage], number: int) -> list[Finding]:
    """Tell what cannot be moved: the stage itself, or the first later one that stands fast."""
    stage = stages[number]
    if bound := bound_to_its_time(stage):
        message = f"it takes its water from {bound}, which tells of no later time: no delay of it is computed"
        return [_note(stage, message)]
    for later in stages[number + 1 :]:
        if bound := bound_to_its_time(later):
            message = (
                f"stage {later.name!r} after it takes its water from {bound} and cannot be moved: only its own longer "
                "stay is computed"
            )
            return [_note(stage, message)]
    return []


def _note(stage: Stage, message: str) -> Finding:
    return Finding(severity="note", code="delay-not-computed", where=f"stage {stage.name!r}", message=message)


def _planned(case: PlaceCase) -> _Planned:
    place, rule = case.place, case.plan.scour.tide
    own = rows_at(case, rules=(rule,))
    minimum = minimum_length([visit.flow for visit in case.visits], place)
    required = required_length(place, minimum, lambda length_m: rows_at(case, length_m, rules=(rule,)), case.law, rule)
    return _Planned(
        case=case,
        rows={None: own, required.length_m: rows_at(case, required.length_m, rules=(rule,))},
        depth_m=final_depth(chained(place, own, case.law, rule), place.start_depth_m),
        length_m=required.length_m,
    )


def _late(job: _Job, number: int, weeks: int, alone: bool) -> tuple[list[DelayRow], list[Finding]]:
    """Return the rows of one stage late by some weeks, a row a place; `alone`: later stages cannot be moved."""
    plan, flows = job.plan, job.flows
    before, stage, after = plan.stage[:number], plan.stage[number], plan.stage[number + 1 :]
    where = f"stage {stage.name!r}, {weeks} {'week' if weeks == 1 else 'weeks'} late"
    late = prolonged(stage, weeks)
    problems: list[Finding] = []
    own: tuple[PlaceCase, ...] | None = None
    calendar: tuple[PlaceCase, ...] | None = None
    try:
        stayed = _flows_after(job, before[-1:], flows[number - 1 : number], (late,))
        own = _cases(job, (*before, late, *after), (*flows[:number], *stayed, *flows[number + 1 :]))
        if not alone:
            later = tuple(moved(each, weeks) for each in after)
            followed = _flows_after(job, (late,), stayed, later)
            calendar = _cases(job, (*before, late, *later), (*flows[:number], *stayed, *followed))
    except TidescourError as error:
        problems.append(_without_result(where, error))
    rows = []
    for at, planned in enumerate(job.places):
        place = planned.case.place
        extras = [NOT_KNOWN, NOT_KNOWN]
        try:
            if own is not None:
                extras[0] = _extra(planned, own[at])
            if own is not None and calendar is not None:
                same = list(_flows_of(own[at])) == list(_flows_of(calendar[at]))
                extras[1] = extras[0] if same else _extra(planned, calendar[at])
        except DomainError as error:
            problems.append(_without_result(f"{where}, {place_name(place.opening, place.side)}", error))
        rows.append(
            DelayRow(
                stage=stage.name,
                weeks_late=weeks,
                opening=place.opening,
                side=place.side,
                own_stay=extras[0],
                calendar=extras[1],
            )
        )
    return rows, problems


def _without_result(where: str, error: TidescourError) -> Finding:
    return Finding(severity="warning", code="delay-without-result", where=where, message=f"no result: {error}")


def _flows_after(
    job: _Job, before: tuple[Stage, ...], flow_before: tuple[StageFlow, ...], stages: tuple[Stage, ...]
) -> tuple[StageFlow, ...]:
    """Return the flows of stages that follow one whose flow is known, or begin the programme."""
    plan = job.plan
    if before and plan.basin is not None:
        touches = bool(stages) and before[0].end == stages[0].start
        level_m = float(flow_before[0].level_basin_m[-1]) if touches else None
        plan = plan.model_copy(update={"basin": plan.basin.model_copy(update={"start_level_m": level_m})})
    return stage_flows(plan.model_copy(update={"stage": stages}), job.waters, silent)


def _cases(job: _Job, stages: tuple[Stage, ...], flows: tuple[StageFlow, ...]) -> tuple[PlaceCase, ...]:
    return cases_of(job.plan.model_copy(update={"stage": stages}), job.law, flows)


def _flows_of(case: PlaceCase) -> Iterator[StageFlow]:
    return (visit.flow for visit in case.visits)


def _extra(planned: _Planned, case: PlaceCase) -> Extra:
    """Return what the flows of a case add to depth and length of a place as planned."""
    place = case.place
    if list(_flows_of(case)) == list(_flows_of(planned.case)):
        return NOTHING

    def depth(length_m: float | None) -> float:
        steps = chained(place, _rows(planned, case, length_m), case.law, case.plan.scour.tide)
        return final_depth(steps, place.start_depth_m)

    depth_m = depth(None)
    length_m = nearby_length(
        lambda length: place.depth_margin_factor * depth(length),
        place.failure_slope_cot,
        minimum_length(list(_flows_of(case)), place),
        planned.length_m,
    )
    return Extra(depth_m=depth_m - planned.depth_m, length_m=length_m - planned.length_m)


def _rows(planned: _Planned, case: PlaceCase, length_m: float | None) -> tuple[RowDurations, ...]:
    """Return the rows of a case, those of unchanged flows as planned where they are known for this length."""
    known = planned.rows.get(length_m)
    if known is None:
        return rows_at(case, length_m, rules=(case.plan.scour.tide,))
    kept = [own is flow for own, flow in zip(_flows_of(planned.case), _flows_of(case), strict=True)]
    others = tuple(visit for visit, keep in zip(case.visits, kept, strict=True) if not keep)
    computed = iter(rows_at(replace(case, visits=others), length_m, rules=(case.plan.scour.tide,)))
    return tuple(row if keep else next(computed) for row, keep in zip(known, kept, strict=True))
