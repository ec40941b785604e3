"""Soundings against growth: flows and rows as for a run, then a factor and a forecast for each place."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tidescour.errors import Finding
from tidescour.pipeline.inputs import Progress, silent, together
from tidescour.pipeline.places import PlaceCase, rows_at, surface_beds
from tidescour.pipeline.preparing import cases_of, prepared, stage_flows
from tidescour.plan.models import Plan
from tidescour.plan.notes import default_notes
from tidescour.scour.chain import chain_place, depth_findings, gap_findings
from tidescour.study.growth_factor import Hole, Scatter
from tidescour.study.soundings import (
    SoundedPlace,
    SoundingResults,
    programme_span,
    sounded_place,
    sounding_notes,
    soundings_at,
)


def soundings(plan: Plan, progress: Progress = silent) -> SoundingResults:
    """Compare the growth of every place with its soundings, and carry the forecast on from the last of them.

    Raises
    ------
    TidescourError
        If anything in the plan or its records does not allow it; nothing was written.
    """
    ready = prepared(plan, progress)
    flows = stage_flows(plan, ready.waters, progress)
    progress("velocities at the end of the protection")
    cases = cases_of(plan, ready.law, flows)
    beds = surface_beds(cases)
    places, deep = [], []
    for case in cases:
        progress(f"soundings at {case.place.opening!r}, {case.place.side} side")
        hole = _hole(case)
        places.append(
            sounded_place(
                case.place,
                hole,
                soundings_at(plan, case.place),
                Scatter(prior=plan.soundings.prior_scatter, growth=plan.soundings.growth_scatter),
            )
        )
        deep.append(_depth_findings(hole, places[-1]))
    return SoundingResults(
        plan=plan,
        law=ready.law,
        places=tuple(places),
        files=ready.files,
        findings=together(
            [default_notes(plan), ready.findings, gap_findings(plan.stage)],
            (flow.findings for flow in flows),
            (visit.cycles.findings for case in cases for visit in case.visits),
            (case.layers.findings for case in cases),
            (bed.findings for place_beds in beds.values() for bed in place_beds),
            deep,
            [sounding_notes(plan, places)],
            (place.findings for place in places),
        ),
    )


def _hole(case: PlaceCase) -> Hole:
    start_s, end_s = programme_span(case.plan.stage)
    return Hole(
        rows=rows_at(case, rules=(case.plan.scour.tide,)),
        law=case.law,
        rule=case.plan.scour.tide,
        start_s=start_s,
        end_s=end_s,
        start_depth_m=case.place.start_depth_m,
        growth_factor=case.place.growth_factor,
    )


def _depth_findings(hole: Hole, place: SoundedPlace) -> tuple[Finding, ...]:
    """Find whether the hole outgrows the evidence of the growth laws.

    By the median of the forecast where a row ends in it, before that by the law with the factor found.
    """
    factor, band = float(place.growth_factor[1]), place.forecast.band
    steps = []
    for row, step in zip(
        hole.rows, chain_place(hole.rows, hole.law, hole.start_depth_m, hole.rule, factor), strict=True
    ):
        ends_s = row.cycles.end_s[-1:]
        foretold_m = np.interp(ends_s, band.time_s, band.depth_m[1], left=step.end_depth_m)
        steps.append(replace(step, end_depth_m=float(foretold_m[0])) if foretold_m.size else step)
    return depth_findings(hole.rows, steps)
