"""What every job on a whole plan begins with: records, tides, waters, growth law, and the flows of its stages."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from tidescour.bed.water import submerged_relative_density
from tidescour.errors import Finding
from tidescour.gap.levels import Waters
from tidescour.gap.records import StageFlow
from tidescour.gap.stage import FIRST_REMEDY, LATER_REMEDY, stage_flow
from tidescour.gauge.read import read_series
from tidescour.gauge.records import GivenSeries, InputFile
from tidescour.pipeline.inputs import Progress, TidalInputs, refuse_missing_tides, silent, tidal_inputs
from tidescour.pipeline.places import PlaceCase, place_cases, visits
from tidescour.plan.models import Plan
from tidescour.plan.places import opening_names
from tidescour.scour.laws import LAWS, GrowthLaw


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Prepared:
    """Inputs of a plan that was read for the whole job; `files` holds every input beside the plan."""

    inputs: TidalInputs
    series: Mapping[str, GivenSeries]
    waters: Waters
    submerged_relative_density: float
    law: GrowthLaw

    @property
    def files(self) -> tuple[InputFile, ...]:
        """Every input beside the plan."""
        return (*self.inputs.files, *(each.file for each in self.series.values()))

    @property
    def findings(self) -> tuple[Finding, ...]:
        """What the records, the tides and the given series say."""
        return (*self.inputs.findings, *(finding for each in self.series.values() for finding in each.findings))


def prepared(plan: Plan, progress: Progress = silent) -> Prepared:
    """Read the inputs of a plan and fit its tides.

    Raises
    ------
    TidescourError
        If anything in the plan or its records does not allow it.
    """
    inputs = tidal_inputs(plan, progress)
    refuse_missing_tides(plan, inputs)
    series = given_series(plan)
    density = submerged_relative_density(
        plan.water.temperature_c, plan.water.salinity_g_kg, plan.bed.grain_density_kg_m3
    )
    return Prepared(
        inputs=inputs,
        series=series,
        waters=waters_of(plan, inputs, series),
        submerged_relative_density=density,
        law=LAWS[plan.scour.law].function(density, plan.scour),
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


def stage_flows(plan: Plan, waters: Waters, progress: Progress) -> tuple[StageFlow, ...]:
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


def cases_of(plan: Plan, law: GrowthLaw, flows: tuple[StageFlow, ...]) -> tuple[PlaceCase, ...]:
    """Return every place of a plan with its stages."""
    visited = {opening: visits(flows, plan.stage, opening) for opening in opening_names(plan)}
    return place_cases(plan, law, visited)
