"""The order of the steps: records, tides, flows, bed, scour. No step's arithmetic stands here."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from tidescour.bed import methods as bed_methods
from tidescour.bed.history import bed_history
from tidescour.bed.records import BedHistory
from tidescour.bed.threshold import SHIELDS
from tidescour.bed.water import submerged_relative_density
from tidescour.errors import DomainError, Finding, FitError
from tidescour.gap import methods as gap_methods
from tidescour.gap.levels import Waters
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.relations import RELATIONS
from tidescour.gap.stage import FIRST_REMEDY, LATER_REMEDY, stage_flow
from tidescour.gauge.checks import check_record
from tidescour.gauge.layouts import LAYOUTS
from tidescour.gauge.pair import check_pair
from tidescour.gauge.read import read_gauge, read_series
from tidescour.gauge.records import GaugeRecord, InputFile
from tidescour.handoff.records import DurationRow, PlaceResult, RunResults
from tidescour.plan.choices import Choices
from tidescour.plan.constants import ConstantsTable, read_constants
from tidescour.plan.hashes import path_for_results, plan_hashes
from tidescour.plan.models import SIDES, TIDE_RULES, PlaceBed, Plan, Side, Stage, Tide
from tidescour.plan.notes import default_notes
from tidescour.plan.places import opening_names, places
from tidescour.scour import methods as scour_methods
from tidescour.scour.chain import chain_place, depth_findings, gap_findings, growth_curve
from tidescour.scour.cycles import stage_cycles
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS, PowerLaw
from tidescour.scour.length import minimum_length, required_length
from tidescour.scour.records import CycleSet, EffectiveDuration
from tidescour.table import Entry
from tidescour.tide import methods as tide_methods
from tidescour.tide.fit import MANY_SAMPLES, SCREENING_SAMPLES, fit_from_table, fit_pair, fit_record
from tidescour.tide.library import constituent_names
from tidescour.tide.pair import compare_fits
from tidescour.tide.predict import predicted_level
from tidescour.tide.records import TideFit

Progress = Callable[[str], None]


def silent(step: str) -> None:
    """Take the name of a step that begins, and do nothing."""


def plan_choices() -> Choices:
    """Return what the tables of all steps offer to a plan."""
    return Choices(
        layouts=tuple(LAYOUTS),
        shields=tuple(SHIELDS),
        laws=tuple(LAWS),
        constituents=constituent_names(),
        relations={name: entry.parameters for name, entry in RELATIONS.items()},
    )


def method_entries() -> tuple[Entry[Callable[..., Any]], ...]:
    """Return the methods of all steps in their order, chosen by the plan or not."""
    return (
        *tide_methods.METHODS,
        *RELATIONS.values(),
        *gap_methods.METHODS,
        *SHIELDS.values(),
        *bed_methods.METHODS,
        *LAWS.values(),
        *scour_methods.METHODS,
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TidalInputs:
    """Records and tides of a plan, checked: what `check` and `tides` print and a run starts from.

    `fits` holds the tides that could be fitted or were given; `refused` why a side has none.
    """

    records: tuple[GaugeRecord, ...]
    fits: tuple[TideFit, ...]
    refused: Mapping[Side, FitError]
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...]

    def record(self, side: Side) -> GaugeRecord | None:
        """Return the gauge of one side."""
        return next((record for record in self.records if record.side == side), None)

    def fit(self, side: Side) -> TideFit | None:
        """Return the tide of one side."""
        return next((fit for fit in self.fits if fit.side == side), None)


def tidal_inputs(plan: Plan, progress: Progress = silent) -> TidalInputs:
    """Read the gauges of a plan, fit their tides, check them against these, and fit again without what failed.

    Raises
    ------
    RecordError, PlanError
        If a file cannot be read, or the two records cannot be those of sea and basin.
    """
    progress("reading the records")
    sources = {"sea": plan.records.sea, "basin": plan.records.basin}
    raw = [
        read_gauge(source, side, plan.correction, plan.folder)
        for side in SIDES
        if (source := sources[side]) is not None
    ]
    pair_findings = check_pair(*raw) if len(raw) == 2 else ()
    progress("fitting the tides")
    # What is inferred serves other seasons; inside the record the fit is as good without.
    first, _ = _own_fits(plan, raw, plan.tide.model_copy(update={"infer": {}}), SCREENING_SAMPLES)
    progress("checking the records against the tides")
    records = tuple(
        check_record(record, predicted_level(first[record.side].constants, record.time_s))
        if record.side in first
        else check_record(record, None)
        for record in raw
    )
    progress("fitting the tides without what failed")
    fits, refused = _final_fits(plan, records)
    table = _sea_table(plan)
    # The plan itself stands apart from the files that it names.
    files = [InputFile(path=name, sha256=sha256) for name, sha256 in plan_hashes(plan)[1:]]
    files += [file for record in records for file in record.files]
    if table is not None:
        fits["sea"] = fit_from_table(
            table.constituents, table.amplitude_m, table.phase_deg, plan.tide.sea_mean_m or 0.0, plan.site.latitude_deg
        )
        refused.pop("sea", None)
        files.append(InputFile(path=path_for_results(str(plan.tide.sea_constants)), sha256=table.sha256))
    compared = compare_fits(fits["sea"], fits["basin"]) if fits.keys() == {"sea", "basin"} else ()
    unfitted = [
        Finding(
            severity="warning",
            code="no-tide",
            where=f"records.{side}",
            message=f"no tide is fitted, so that checks against the tide were not evaluated: {error}",
        )
        for side, error in refused.items()
    ]
    return TidalInputs(
        records=records,
        fits=tuple(fits[side] for side in SIDES if side in fits),
        refused=refused,
        files=tuple(files),
        findings=_together(
            (record.findings for record in records),
            [pair_findings, unfitted],
            (fit.findings for fit in fits.values()),
            [compared],
        ),
    )


def _together(*groups: Iterable[Iterable[Finding]]) -> tuple[Finding, ...]:
    """Return findings in order, each once."""
    return tuple(dict.fromkeys(finding for group in groups for findings in group for finding in findings))


def _sea_table(plan: Plan) -> ConstantsTable | None:
    if plan.tide.sea_constants is None:
        return None
    return read_constants(plan.folder / plan.tide.sea_constants, constituent_names())


def _own_fits(
    plan: Plan, records: Iterable[GaugeRecord], options: Tide, many_samples: int = MANY_SAMPLES
) -> tuple[dict[Side, TideFit], dict[Side, FitError]]:
    fits: dict[Side, TideFit] = {}
    refused: dict[Side, FitError] = {}
    for record in records:
        try:
            fits[record.side] = fit_record(record, options, plan.site.latitude_deg, many_samples)
        except FitError as error:
            refused[record.side] = error
    return fits, refused


def _final_fits(plan: Plan, records: tuple[GaugeRecord, ...]) -> tuple[dict[Side, TideFit], dict[Side, FitError]]:
    in_pairs = plan.tide.sea_constants is None and any(stage.basin == "tide" for stage in plan.stage)
    if len(records) == 2 and in_pairs:
        try:
            sea, basin = fit_pair(records[0], records[1], plan.tide, plan.site.latitude_deg)
        except FitError as error:
            return {}, {"sea": error, "basin": error}
        return {"sea": sea, "basin": basin}, {}
    return _own_fits(plan, records, plan.tide)


def run(plan: Plan, progress: Progress = silent) -> RunResults:
    """Do the whole job of a plan, from its records to the length of its protection.

    Raises
    ------
    TidescourError
        If anything in the plan or its records does not allow it; nothing was written.
    """
    inputs = tidal_inputs(plan, progress)
    _refuse_missing_tides(plan, inputs)
    series = {name: read_series(name, source, plan.folder) for name, source in plan.series.items()}
    waters = Waters(
        sea_record=inputs.record("sea"),
        basin_record=inputs.record("basin"),
        sea_fit=inputs.fit("sea"),
        basin_fit=inputs.fit("basin"),
        series=series,
        sea_factor=plan.tide.sea_factor,
        set_up_m=plan.tide.set_up_m,
    )
    flows = _stage_flows(plan, waters, progress)
    density = submerged_relative_density(
        plan.water.temperature_c, plan.water.salinity_g_kg, plan.bed.grain_density_kg_m3
    )
    law = LAWS[plan.scour.law].function(density)
    progress("velocities at the end of the protection")
    visits = {opening: _visits(plan, opening, flows) for opening in opening_names(plan)}
    beds = _beds(plan, visits)
    results = []
    for place in places(plan):
        progress(f"scour at {place.opening!r}, {place.side} side")
        key = (place.opening, place.side)
        results.append(_place_result(plan, place, visits[place.opening], beds[key], law))
    rows = [row for result in results for row in result.rows]
    return RunResults(
        plan=plan,
        law=law,
        submerged_relative_density=density,
        records=inputs.records,
        fits=inputs.fits,
        flows=flows,
        places=tuple(results),
        files=(*inputs.files, *(each.file for each in series.values())),
        findings=_together(
            [default_notes(plan), inputs.findings, gap_findings(plan.stage)],
            (each.findings for each in series.values()),
            (flow.findings for flow in flows),
            (row.duration.cycles.findings for row in rows),
            (row.bed.findings for row in rows),
            (row.duration.findings for row in rows),
            (_depth_findings(plan, result) for result in results),
            (result.required.findings for result in results),
        ),
    )


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
