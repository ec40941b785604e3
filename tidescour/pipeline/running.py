"""The order of the steps: records, tides, flows, bed, scour. No step's arithmetic stands here."""

from __future__ import annotations

from dataclasses import replace

from tidescour.bed.filters import filter_ratios
from tidescour.bed.stone_screening import stone_screening
from tidescour.errors import Finding, TidescourError
from tidescour.gap.levels import Waters
from tidescour.gap.limits import limit_findings
from tidescour.gap.records import StageFlow
from tidescour.gap.sweep import closure_sweep
from tidescour.handoff.records import PlaceResult, RaisedSea, RunResults
from tidescour.handoff.results_tables import final_depth_m
from tidescour.pipeline.inputs import Progress, silent, together
from tidescour.pipeline.methods import run_methods
from tidescour.pipeline.places import PlaceCase, place_length, place_result, rows_at, surface_beds
from tidescour.pipeline.preparing import cases_of, prepared, stage_flows
from tidescour.pipeline.sensitivity import sensitivities, spreading_finding
from tidescour.pipeline.storms import load_cases
from tidescour.plan.left_out import left_out_findings
from tidescour.plan.models import Plan
from tidescour.plan.notes import default_notes
from tidescour.plan.places import places
from tidescour.scour.chain import depth_findings, final_depth, gap_findings
from tidescour.scour.comparison import alpha_basis_findings
from tidescour.scour.law_findings import law_findings, layer_findings, stop_findings
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.length import chained, main_row
from tidescour.scour.records import GrowthCurve
from tidescour.study.storms import surge_findings

RAISED_BY = 0.05
"""Share by which the sea tide is made larger for the result beside the plan's own."""


def run(plan: Plan, progress: Progress = silent) -> RunResults:
    """Do the whole job of a plan, from its records to the length of its protection.

    Raises
    ------
    TidescourError
        If anything in the plan or its records does not allow it; nothing was written.
    """
    ready = prepared(plan, progress)
    waters, law, density = ready.waters, ready.law, ready.submerged_relative_density
    flows = stage_flows(plan, waters, progress)
    progress("velocities at the end of the protection")
    cases = cases_of(plan, law, flows)
    results = _place_results(cases, progress)
    progress("what each input is worth")
    results = tuple(
        replace(result, sensitivities=sensitivities(case, result, density))
        for case, result in zip(cases, results, strict=True)
    )
    progress("load cases")
    storms = load_cases(plan, waters, flows, cases, results)
    progress("sweeping crest and width")
    sweep = closure_sweep(plan.stage[0], plan.basin, waters)
    raised, raised_finding = _raised_sea(plan, waters, law, results, progress)
    rows = [row for result in results for row in result.rows]
    stone, filters = stone_screening(plan, flows, [row.bed for row in rows]), filter_ratios(plan.filter)
    return RunResults(
        plan=plan,
        law=law,
        submerged_relative_density=density,
        records=ready.inputs.records,
        fits=ready.inputs.fits,
        flows=flows,
        places=results,
        raised_sea=raised,
        sweep=sweep,
        stone=stone,
        filters=filters,
        methods=run_methods(plan),
        load_cases=storms,
        files=ready.files,
        findings=together(
            [
                default_notes(plan),
                left_out_findings(plan),
                surge_findings(plan, storms),
                ready.findings,
                gap_findings(plan.stage),
            ],
            (flow.findings for flow in flows),
            _limits(plan, flows),
            [(raised_finding,), sweep.findings],
            (row.duration.cycles.findings for row in rows),
            (row.bed.findings for row in rows),
            (row.duration.findings for row in rows),
            (_alpha_findings(plan, law, result) for result in results),
            (_growth_findings(plan, law, result) for result in results),
            [tuple(spreading_finding(result) for result in results)],
            (result.required.findings for result in results),
            [storms.findings, stone.findings, filters.findings],
        ),
    )


def _place_results(cases: tuple[PlaceCase, ...], progress: Progress) -> tuple[PlaceResult, ...]:
    """Return what the flows do at all places."""
    beds = surface_beds(cases)
    results = []
    for case in cases:
        place = case.place
        progress(f"scour at {place.opening!r}, {place.side} side")
        results.append(place_result(case, beds[place.opening, place.side]))
    return tuple(results)


def _depths_and_lengths(plan: Plan, waters: Waters, law: GrowthLaw) -> tuple[tuple[float, ...], tuple[float, ...]]:
    """Return final depth and required length of all places."""
    cases = cases_of(plan, law, stage_flows(plan, waters, silent))
    depths, lengths = [], []
    for case in cases:
        rows = rows_at(case, rules=(plan.scour.tide,))
        steps = chained(case.place, rows, law, plan.scour.tide)
        depths.append(final_depth(steps, case.place.start_depth_m))
        lengths.append(place_length(case, main_row(rows, steps)).length_m)
    return tuple(depths), tuple(lengths)


def _raised_sea(
    plan: Plan, waters: Waters, law: GrowthLaw, results: tuple[PlaceResult, ...], progress: Progress
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
        depths, lengths = _depths_and_lengths(plan, replace(waters, sea_factor=factor), law)
    except TidescourError as error:
        message = f"{warned}; with {factor:g} instead of {plan.tide.sea_factor:g} there is no result: {error}"
        return None, Finding(severity="warning", code="sea-tide-may-rise", where=where, message=message)
    compared = "; ".join(
        f"{result.place.opening}, {result.place.side} side: depth {final_depth_m(result, plan.scour.tide):.2f} to "
        f"{depth:.2f} m, required length {result.required.length_m:.1f} to {length:.1f} m"
        for result, depth, length in zip(results, depths, lengths, strict=True)
    )
    message = f"{warned}; with {factor:g} instead of {plan.tide.sea_factor:g}: {compared}"
    stopped = any(
        result.place.stop_depth_m is not None
        and final_depth_m(result, plan.scour.tide) < result.place.stop_depth_m <= depth
        for result, depth in zip(results, depths, strict=True)
    )
    if stopped:
        message += "; a hole then reaches its stop_depth_m"
    finding = Finding(severity="warning" if stopped else "note", code="sea-tide-may-rise", where=where, message=message)
    return RaisedSea(sea_factor=factor, final_depth_m=depths, length_required_m=lengths), finding


def _limits(plan: Plan, flows: tuple[StageFlow, ...]) -> list[tuple[Finding, ...]]:
    protected = places(plan)
    return [limit_findings(stage, flow, plan.basin, protected) for stage, flow in zip(plan.stage, flows, strict=True)]


def _alpha_findings(plan: Plan, law: GrowthLaw, result: PlaceResult) -> tuple[Finding, ...]:
    rows = result.rows
    return alpha_basis_findings(
        result.place,
        [row.stage for row in rows],
        [row.bed for row in rows],
        [row.durations.cycles for row in rows],
        law,
        plan.scour.tide,
    )


def _growth_findings(plan: Plan, law: GrowthLaw, result: PlaceResult) -> tuple[Finding, ...]:
    rows = [row.durations for row in result.rows]
    steps = [row.step(plan.scour.tide) for row in result.rows]
    growth = GrowthCurve(time_s=result.growth_time_s, depth_m=result.growth_depth_m, stage=result.growth_stage)
    return (
        *result.layers.findings,
        *layer_findings(rows, steps, result.layers),
        *law_findings(rows, steps, law),
        *depth_findings(rows, steps),
        *stop_findings(result.place, growth, final_depth_m(result, plan.scour.tide)),
    )
