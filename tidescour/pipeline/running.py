"""The order of the steps: records, tides, flows, bed, scour. No step's arithmetic stands here."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from tidescour.bed.history import bed_history
from tidescour.bed.records import BedHistory
from tidescour.bed.water import submerged_relative_density
from tidescour.errors import DomainError, Finding, TidescourError
from tidescour.gap.levels import Waters
from tidescour.gap.limits import limit_findings
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.stage import FIRST_REMEDY, LATER_REMEDY, stage_flow
from tidescour.gap.sweep import closure_sweep
from tidescour.gauge.read import read_series
from tidescour.gauge.records import GivenSeries
from tidescour.handoff.records import DurationRow, PlaceResult, RaisedSea, RunResults
from tidescour.pipeline.inputs import Progress, TidalInputs, silent, tidal_inputs, together
from tidescour.plan.models import TIDE_RULES, PlaceBed, Plan, Side, Stage
from tidescour.plan.notes import default_notes
from tidescour.plan.places import opening_names, places
from tidescour.scour.chain import chain_place, depth_findings, gap_findings, growth_curve
from tidescour.scour.cycles import stage_cycles
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS, PowerLaw
from tidescour.scour.length import minimum_length, required_length
from tidescour.scour.records import CycleSet, EffectiveDuration

RAISED_BY = 0.05
"""Share by which the sea tide is made larger for the result beside the plan's own."""


def run(plan: Plan, progress: Progress = silent) -> RunResults:
    """Do the whole job of a plan, from its records to the length of its protection.

    Raises
    ------
    TidescourError
        If anything in the plan or its records does not allow it; nothing was written.
    """
    inputs = tidal_inputs(plan, progress)
    _refuse_missing_tides(plan, inputs)
    series = given_series(plan)
    waters = waters_of(plan, inputs, series)
    density = submerged_relative_density(
        plan.water.temperature_c, plan.water.salinity_g_kg, plan.bed.grain_density_kg_m3
    )
    law = LAWS[plan.scour.law].function(density)
    flows, results = _outcome(plan, waters, law, progress)
    progress("sweeping crest and width")
    sweep = closure_sweep(plan.stage[0], plan.basin, waters)
    raised, raised_finding = _raised_sea(plan, waters, law, results, progress)
    rows = [row for result in results for row in result.rows]
    return RunResults(
        plan=plan,
        law=law,
        submerged_relative_density=density,
        records=inputs.records,
        fits=inputs.fits,
        flows=flows,
        places=results,
        raised_sea=raised,
        sweep=sweep,
        files=(*inputs.files, *(each.file for each in series.values())),
        findings=together(
            [default_notes(plan), inputs.findings, gap_findings(plan.stage)],
            (each.findings for each in series.values()),
            (flow.findings for flow in flows),
            _limits(plan, flows),
            [(raised_finding,), sweep.findings],
            (row.duration.cycles.findings for row in rows),
            (row.bed.findings for row in rows),
            (row.duration.findings for row in rows),
            (_depth_findings(plan, result) for result in results),
            (result.required.findings for result in results),
        ),
    )


def given_series(plan: Plan) -> dict[str, GivenSeries]:
    """Read the given series of a plan, by name.

    Raises
    ------
    RecordError
        If a file cannot be read.
    """
    return {name: read_series(name, source, plan.folder) for name, source in plan.series.items()}


def waters_of(plan: Plan, inputs: TidalInputs, series: Mapping[str, GivenSeries]) -> Waters:
    """Return all that the levels and given flows of a plan can come from."""
    return Waters(
        sea_record=inputs.record("sea"),
        basin_record=inputs.record("basin"),
        sea_fit=inputs.fit("sea"),
        basin_fit=inputs.fit("basin"),
        series=series,
        sea_factor=plan.tide.sea_factor,
        set_up_m=plan.tide.set_up_m,
    )


def _outcome(
    plan: Plan, waters: Waters, law: PowerLaw, progress: Progress
) -> tuple[tuple[StageFlow, ...], tuple[PlaceResult, ...]]:
    """Return the flows of all stages and what they do at all places."""
    flows = _stage_flows(plan, waters, progress)
    progress("velocities at the end of the protection")
    visits = {opening: _visits(plan, opening, flows) for opening in opening_names(plan)}
    beds = _beds(plan, visits)
    results = []
    for place in places(plan):
        progress(f"scour at {place.opening!r}, {place.side} side")
        key = (place.opening, place.side)
        results.append(_place_result(plan, place, visits[place.opening], beds[key], law))
    return flows, tuple(results)


def _raised_sea(
    plan: Plan, waters: Waters, law: PowerLaw, results: tuple[PlaceResult, ...], progress: Progress
) -> tuple[RaisedSea | None, Finding]:
    """Return what a larger sea tide would do, and the line that it must be thought of."""
    warned = "the closure may raise the sea tide in front of it, which is not computed"
    where = "tide.sea_factor"
    if all(stage.sea != "tide" for stage in plan.stage):
        message = f"{warned}; no stage takes its sea level from the tide, so that its factor has no effect here"
        return None, Finding(severity="note", code="sea-tide-may-rise", where=where, message=message)
    if any(stage.basin == "tide" for stage in plan.stage):
        message = (
            f'{warned}; a stage with basin = "tide" keeps the basin\'s own tide, so that all of a larger one would go '
            "into the head: route the basin to see what it does"
        )
        return None, Finding(severity="warning", code="sea-tide-may-rise", where=where, message=message)
    factor = plan.tide.sea_factor + RAISED_BY
    progress(f"the same with a sea tide {100.0 * RAISED_BY:.0f} % larger")
    try:
        _, raised = _outcome(plan, replace(waters, sea_factor=factor), law, silent)
    except TidescourError as error:
        message = f"{warned}; with {factor:g} instead of {plan.tide.sea_factor:g} there is no result: {error}"
        return None, Finding(severity="warning", code="sea-tide-may-rise", where=where, message=message)
    driving = TIDE_RULES.index(plan.scour.tide)
    compared = "; ".join(
        f"{before.place.opening}, {before.place.side} side: depth "
        f"{before.rows[-1].chain[driving].end_depth_m:.2f} to {after.rows[-1].chain[driving].end_depth_m:.2f} m, "
        f"required length {before.required.length_m:.1f} to {after.required.length_m:.1f} m"
        for before, after in zip(results, raised, strict=True)
    )
    message = f"{warned}; with {factor:g} instead of {plan.tide.sea_factor:g}: {compared}"
    finding = Finding(severity="note", code="sea-tide-may-rise", where=where, message=message)
    return RaisedSea(sea_factor=factor, places=raised), finding


def _limits(plan: Plan, flows: tuple[StageFlow, ...]) -> list[tuple[Finding, ...]]:
    protected = places(plan)
    return [limit_findings(stage, flow, plan.basin, protected) for stage, flow in zip(plan.stage, flows, strict=True)]


def _refuse_missing_tides(plan: Plan, inputs: TidalInputs) -> None:
    for side, error in inputs.refused.items():
        if any(stage.sea == "tide" if side == "sea" else stage.basin == "tide" for stage in plan.stage):
            raise error


def _stage_flows(plan: Plan, waters: Waters, progress: Progress) -> tuple[StageFlow, ...]:
    """Return the flow of each stage; a basin level is carried on where stages touch."""
    flows: list[StageFlow] = []
    for number, stage in enumerate(plan.stage):
        progress(f"stage {number + 1} of {len(plan.stage)}: {stage.name}")
        start: float | None = None
        carried = number > 0 and plan.stage[number - 1].end == stage.start
        if carried:
            start = float(flows[-1].level_basin_m[-1])
        elif number == 0 and plan.basin is not None:
            start = plan.basin.start_level_m
        remedy = FIRST_REMEDY if number == 0 else LATER_REMEDY
        flow = stage_flow(stage, plan.basin, waters, start, remedy=remedy)
        if carried and flow.routed and not flows[-1].covered[-1]:
            flow = replace(flow, findings=(*flow.findings, _carried_in_hole(flow.stage)))
        flows.append(flow)
    return tuple(flows)


def _carried_in_hole(stage: str) -> Finding:
    return Finding(
        severity="warning",
        code="start-in-hole",
        where=f"stage {stage!r}",
        message="the records have a hole where this stage starts, so that its first basin level is a guess; look at "
        "its first tides",
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Visit:
    """One stage of one opening, with the cycles that both sides share, whatever the length of the protection."""

    stage: Stage
    flow: StageFlow
    opening: OpeningFlow
    cycles: CycleSet


def _visits(plan: Plan, name: str, flows: tuple[StageFlow, ...]) -> tuple[_Visit, ...]:
    return tuple(
        _Visit(stage=stage, flow=flow, opening=opening, cycles=stage_cycles(flow, opening))
        for stage, flow in zip(plan.stage, flows, strict=True)
        for opening in flow.openings
        if opening.name == name
    )


def _bed(plan: Plan, place: PlaceBed, visit: _Visit, length_m: float | None = None) -> BedHistory:
    return bed_history(visit.stage, visit.flow, visit.opening, place, plan.bed, plan.water, length_m)


def _beds(plan: Plan, visits: Mapping[str, tuple[_Visit, ...]]) -> dict[tuple[str, Side], tuple[BedHistory, ...]]:
    """Return the rows of every place; what is refused at any of them is told at once."""
    rows: dict[tuple[str, Side], tuple[BedHistory, ...]] = {}
    refused = []
    for place in places(plan):
        beds = []
        for visit in visits[place.opening]:
            try:
                beds.append(_bed(plan, place, visit))
            except DomainError as error:
                refused.append(str(error))
        rows[place.opening, place.side] = tuple(beds)
    if refused:
        raise DomainError("\n".join(refused))
    return rows


def _place_result(
    plan: Plan, place: PlaceBed, visits: tuple[_Visit, ...], beds: tuple[BedHistory, ...], law: PowerLaw
) -> PlaceResult:
    durations = [
        effective_duration(bed, visit.cycles, law, plan.scour.reference_velocity_m_s)
        for bed, visit in zip(beds, visits, strict=True)
    ]
    chains = [chain_place(durations, law, place.start_depth_m, rule) for rule in TIDE_RULES]
    growth = growth_curve(durations, law, place.start_depth_m, plan.scour.tide)

    def durations_at(length_m: float) -> tuple[EffectiveDuration, ...]:
        return tuple(
            effective_duration(_bed(plan, place, visit, length_m), visit.cycles, law, None) for visit in visits
        )

    return PlaceResult(
        place=place,
        rows=tuple(
            DurationRow(
                stage=visit.stage,
                bed=bed,
                duration=duration,
                chain=(integral, flow_mean, cycle_mean),
                peak_gap_velocity_m_s=_peak_gap_velocity(visit, place.side),
            )
            for visit, bed, duration, integral, flow_mean, cycle_mean in zip(
                visits, beds, durations, *chains, strict=True
            )
        ),
        growth_time_s=growth.time_s,
        growth_depth_m=growth.depth_m,
        growth_stage=growth.stage,
        required=required_length(
            place, minimum_length([visit.flow for visit in visits], place), durations_at, law, plan.scour.tide
        ),
    )


def _peak_gap_velocity(visit: _Visit, side: Side) -> float:
    if visit.opening.given_end_velocity_m_s is not None:
        return float("nan")
    towards = visit.opening.gap_velocity_m_s if side == "basin" else -visit.opening.gap_velocity_m_s
    return float(np.max(towards[visit.flow.covered], initial=0.0))


def _depth_findings(plan: Plan, result: PlaceResult) -> tuple[Finding, ...]:
    driving = TIDE_RULES.index(plan.scour.tide)
    return depth_findings([row.duration for row in result.rows], [row.chain[driving] for row in result.rows])
