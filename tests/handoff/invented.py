"""Invented results of a small closure: no number here is a fact of any site, or the output of the program.

Levels are two sines a side, the gap runs as the square root of the head, and growth follows the law by plain sums.
"""

import runpy
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np

from tidescour.bed.filters import filter_ratios
from tidescour.bed.layers import BedLayers
from tidescour.bed.records import BedHistory
from tidescour.bed.stone_records import LOCATIONS, StoneScreening
from tidescour.errors import Finding
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.sweep_records import ClosureSweep
from tidescour.gauge.records import GaugeRecord, InputFile
from tidescour.handoff.records import DurationRow, PlaceResult, RaisedSea, RunResults, Sensitivity
from tidescour.plan.models import Opening, Plan, Site, Stage
from tidescour.plan.models_bed import Grading, PlaceBed, Protection, Protections, Scour
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import (
    RULES,
    ChainStep,
    CycleSet,
    EffectiveDuration,
    LengthCurve,
    RequiredLength,
    RowDurations,
)
from tidescour.study.storms import LoadCaseRow, LoadCases
from tidescour.table import Entry, symbols
from tidescour.tide.records import TideConstants, TideFit
from tidescour.units import seconds_since_epoch

START = datetime(2027, 4, 1, tzinfo=UTC)
M2_S, S2_S = 12.4206012 * 3600.0, 12.0 * 3600.0
CRITICAL_M_S, SUBMERGED = 0.45, 1.6
BED_LEVEL_M = -9.0


def invented_law():
    return GrowthLaw(
        name="explicit",
        text="invented for tests",
        coefficient=0.1 / SUBMERGED**0.7,
        velocity_exponent=1.7,
        depth_exponent=0.2,
        time_exponent=0.4,
    )


def invented_results(
    *,
    stages=("sill to -6", "sill to -4"),
    openings=("main gap", "shoal"),
    days=6.0,
    step_s=300.0,
    rule="integral",
    still_place=None,
    record_samples=4000,
):
    """Return a run; `still_place` names an opening that nothing runs through."""
    law = invented_law()
    plan = _plan(stages, openings, days, rule)
    flows = tuple(_flow(number, len(stages), stage, step_s, still_place) for number, stage in enumerate(plan.stage))
    places = tuple(
        _place(plan, flows, law, opening, side, still_place == opening)
        for opening in openings
        for side in ("sea", "basin")
    )
    return RunResults(
        plan=plan,
        law=law,
        submerged_relative_density=SUBMERGED,
        records=tuple(_record(side, record_samples) for side in ("sea", "basin")),
        fits=(_fit("sea", 1.5),),
        flows=flows,
        places=places,
        sweep=ClosureSweep(stage=stages[0] if stages else "none"),
        raised_sea=RaisedSea(
            sea_factor=1.05, final_depth_m=[9.0] * len(places), length_required_m=[95.0] * len(places)
        ),
        load_cases=LoadCases(rows=tuple(_storm(opening) for opening in openings), findings=()),
        stone=StoneScreening(sizes=tuple(_sizes(stages, openings)), findings=()),
        filters=filter_ratios([Grading(name="bed", d15_mm=0.15, d85_mm=0.35), Grading(name="b", d15_mm=1, d85_mm=8)]),
        methods=(_method(),),
        files=(InputFile(path="sea.csv", sha256="a" * 64), InputFile(path="basin.csv", sha256="b" * 64)),
        findings=(
            Finding(
                severity="note", code="default-used", where="water", message="10 degrees, 30 g/kg, taken by default"
            ),
            Finding(severity="warning", code="invented", where='stage "x", "y"', message="first line,\nsecond line"),
        ),
    )


def _sizes(stages, openings):
    build = runpy.run_path(str(Path(__file__).with_name("invented_stone.py")))["invented_size"]
    return (
        build(
            stage=stage,
            opening=opening,
            direction=direction,
            location=location,
            size_m=(0.2, 0.4, np.nan, 0.1 + number),
        )
        for number, stage in enumerate(stages)
        for opening in openings
        for direction in ("flood", "ebb")
        for location in LOCATIONS
    )


def _storm(opening):
    depths = ("depth_before", "depth_after", "depth_allowed", "length_required_after", "final_depth")
    return LoadCaseRow(
        load_case="storm",
        stage="sill to -6",
        opening=opening,
        side="sea",
        start_s=1.8e9,
        end_s=1.8e9 + 86400.0,
        highest_sea_level_m=3.5,
        peak_gap_velocity_m_s=4.0,
        peak_end_velocity_m_s=2.5,
        length_required_final_m=40.0,
        stop_depth_m=12.0,
        **{f"{name}_m": 3.0 + number for number, name in enumerate(depths)},
    )


def _method():
    return Entry(
        name="invented-law",
        title="Invented law",
        function=len,
        says="y = a x",
        symbols=symbols(("y", "m", "depth"), ("a", "-", "slope"), ("x", "m", "length")),
        validity="none",
        source="nobody",
        confidence="from memory",
        left_by=("invented",),
    )


def _plan(stages, openings, days, rule):
    length = timedelta(days=days)
    return Plan(
        folder=Path("invented"),
        file=Path("invented/plan.toml"),
        site=Site(name="Invented gap", datum="invented datum 2026", latitude_deg=53.4),
        scour=Scour(tide=rule),
        protection=Protections(
            sea=Protection(length_m=90.0, bed_level_m=BED_LEVEL_M, chezy_m05_s=40.0, failure_slope_cot=6.0),
            basin=Protection(length_m=90.0, bed_level_m=BED_LEVEL_M, chezy_m05_s=40.0, failure_slope_cot=6.0),
        ),
        stage=tuple(
            Stage(
                name=name,
                start=START + number * length,
                end=START + (number + 1) * length,
                opening=tuple(
                    Opening(
                        name=opening,
                        crest_level_m=-6.0 + 4.0 * number / len(stages),
                        width_m=400.0 - 200.0 * index / len(openings),
                        relation="broad-crest",
                        parameters={"coefficient": 0.95},
                    )
                    for index, opening in enumerate(openings)
                ),
            )
            for number, name in enumerate(stages)
        ),
    )


def _flow(number, len_stages, stage, step_s, still_place):
    start_s, end_s = seconds_since_epoch(stage.start), seconds_since_epoch(stage.end)
    time_s = np.arange(start_s, end_s + 0.5 * step_s, step_s)
    lag_s = 1200.0 + 4000.0 * number / len_stages
    sea, basin = sea_level(time_s), (0.9 - 0.3 * number / len_stages) * sea_level(time_s - lag_s)
    head = sea - basin
    openings = []
    for opening in stage.opening:
        open_ = 0.0 if opening.name == still_place else 1.0
        velocity = open_ * 0.95 * np.sign(head) * np.sqrt(2.0 * 9.81 * np.abs(head))
        depth = np.maximum(np.maximum(sea, basin) - opening.crest_level_m, 0.0)
        openings.append(
            OpeningFlow(
                name=opening.name,
                level_sea_m=sea,
                crest_level_m=np.full_like(time_s, opening.crest_level_m),
                width_m=np.full_like(time_s, opening.width_m),
                discharge_m3_s=velocity * depth * opening.width_m,
                gap_velocity_m_s=velocity,
                flow_width_m=np.full_like(time_s, opening.width_m),
            )
        )
    covered = np.ones(time_s.shape, dtype=bool)
    return StageFlow(
        stage=stage.name,
        time_s=time_s,
        level_sea_m=sea,
        level_basin_m=basin,
        covered=covered,
        measured=False,
        routed=True,
        openings=tuple(openings),
        inflow_m3_s=np.zeros_like(time_s),
    )


def sea_level(time_s):
    return 1.4 * np.cos(2.0 * np.pi * time_s / M2_S) + 0.3 * np.cos(2.0 * np.pi * time_s / S2_S)


def _cycles(flow):
    head = flow.head_m
    up = np.flatnonzero((head[:-1] < 0.0) & (head[1:] >= 0.0))
    turns = flow.time_s[up] - head[up] * np.diff(flow.time_s)[up] / (head[up + 1] - head[up])
    edges = np.concatenate((flow.time_s[:1], turns, flow.time_s[-1:]))
    return CycleSet(start_s=edges[:-1], end_s=edges[1:])


def _bed(flow, index, side, still):
    opening = flow.openings[index]
    level = flow.level_basin_m if side == "basin" else flow.level_sea_m
    depth = level - BED_LEVEL_M
    towards = 1.0 if side == "basin" else -1.0
    signed = towards * opening.discharge_m3_s / (opening.width_m * depth)
    alpha = np.nan if still else 2.2 + 0.3 * index + 0.1 * (opening.crest_level_m[0] + 6.0)
    return BedHistory(
        stage=flow.stage,
        opening=opening.name,
        side=side,
        time_s=flow.time_s,
        covered=flow.covered,
        signed_velocity_m_s=signed,
        depth_m=depth,
        alpha=np.full(flow.time_s.shape, alpha),
        alpha_ref=alpha,
        turbulence=np.full(flow.time_s.shape, (alpha - 1.5) / 5.0),
        turbulence_ref=(alpha - 1.5) / 5.0,
        critical_velocity_m_s=CRITICAL_M_S,
        reference_depth_m=float(np.mean(depth)),
        protection_length_m=90.0,
        submerged_relative_density=SUBMERGED,
    )


def _duration(bed, cycles, law):
    peak = float(np.max(bed.velocity_m_s))
    reference = 0.0 if np.isnan(bed.alpha_ref) else max(bed.alpha_ref * peak - CRITICAL_M_S, 0.0)
    step_h = np.gradient(bed.time_s) / 3600.0
    excess = np.nan_to_num(np.maximum(bed.alpha * bed.velocity_m_s - CRITICAL_M_S, 0.0))
    ratio = excess / reference if reference > 0.0 else np.zeros_like(excess)
    owner = np.clip(np.searchsorted(cycles.end_s, bed.time_s), 0, len(cycles.end_s) - 1)
    count = len(cycles.end_s)
    integral = np.bincount(owner, ratio**4.25 * step_h, count)
    flowing = np.bincount(owner, (bed.velocity_m_s > 0.0) * step_h, count)
    whole = (cycles.end_s - cycles.start_s) / 3600.0
    dose = np.bincount(owner, ratio**1.7 * step_h, count)
    mean = float(np.sum(bed.velocity_m_s * step_h) / max(np.sum(flowing), 1e-9))
    mean_excess = max(np.nan_to_num(bed.alpha_ref) * mean - CRITICAL_M_S, 0.0)
    rate = (law.coefficient * reference**1.7 * bed.reference_depth_m**0.2) ** 2.5
    return EffectiveDuration(
        stage=bed.stage,
        opening=bed.opening,
        side=bed.side,
        reference_velocity_m_s=peak if reference > 0.0 else np.nan,
        alpha=bed.alpha_ref,
        critical_velocity_m_s=CRITICAL_M_S,
        reference_depth_m=bed.reference_depth_m,
        turbulence=bed.turbulence_ref,
        reference_excess_m_s=reference,
        growth_rate=rate,
        power_rate=rate,
        scale_m=np.inf,
        equilibrium_half_alpha_m=(0.5 * bed.alpha_ref * peak / CRITICAL_M_S - 1.0) * bed.reference_depth_m,
        equilibrium_turbulence_m=((1.0 + 3.0 * bed.turbulence_ref) * peak / CRITICAL_M_S - 1.0) * bed.reference_depth_m,
        cycles=cycles,
        integral_h=integral,
        flow_mean_h=(dose / np.maximum(flowing, 1e-9)) ** 2.5 * flowing,
        cycle_mean_h=(dose / whole) ** 2.5 * whole,
        peak_held_h=flowing * (reference > 0.0),
        mean_held_h=flowing * (mean_excess / reference) ** 4.25 if reference > 0.0 else np.zeros(count),
        flow_h=flowing,
        peak_velocity_m_s=peak,
        mean_velocity_m_s=mean,
    )


def _chain(durations, hours):
    grown = [duration.growth_rate * np.sum(h) for duration, h in zip(durations, hours, strict=True)]
    total, before, steps = sum(grown), 0.0, []
    for duration, part in zip(durations, grown, strict=True):
        steps.append(
            ChainStep(
                stage_depth_m=part**0.4,
                equivalent_start_h=before / duration.growth_rate if part > 0.0 else np.nan,
                start_depth_m=before**0.4,
                end_depth_m=(before + part) ** 0.4,
                share=part / total if total > 0.0 else np.nan,
            )
        )
        before += part
    return steps


def _place(plan, flows, law, opening, side, still):
    index = [entry.name for entry in plan.stage[0].opening].index(opening)
    beds = [_bed(flow, index, side, still) for flow in flows]
    durations = [_duration(bed, _cycles(flow), law) for bed, flow in zip(beds, flows, strict=True)]
    chains = [
        _chain(durations, [getattr(duration, f"{rule.replace('-', '_')}_h") for duration in durations])
        for rule in RULES
    ]
    towards = 1.0 if side == "basin" else -1.0
    rows = tuple(
        DurationRow(
            stage=stage,
            bed=bed,
            durations=RowDurations(layers=(duration,)),
            duration=duration,
            chain=chain,
            equal_alpha=(bed.alpha_ref, 1.1 * bed.alpha_ref, 1.2 * bed.alpha_ref, 0.7 * bed.alpha_ref, np.nan),
            peak_gap_velocity_m_s=float(np.max(towards * flow.openings[index].gap_velocity_m_s)),
        )
        for stage, bed, duration, chain, flow in zip(
            plan.stage, beds, durations, zip(*chains, strict=True), flows, strict=True
        )
    )
    driving = {"integral": "integral_h", "flow-mean": "flow_mean_h", "cycle-mean": "cycle_mean_h"}[plan.scour.tide]
    grown = np.concatenate([duration.growth_rate * getattr(duration, driving) for duration in durations])
    ends = np.concatenate([duration.cycles.end_s for duration in durations])
    names = [duration.stage for duration in durations for _ in duration.cycles.end_s]
    depth = np.concatenate(([0.0], np.cumsum(grown) ** 0.4))
    final_depth_m = float(depth[-1])
    lengths = np.linspace(30.0, 150.0, 9)
    return PlaceResult(
        layers=BedLayers(top_depth_m=(0.0,), layers=(None,)),
        place=PlaceBed(
            opening=opening,
            side=side,
            length_m=90.0,
            bed_level_m=BED_LEVEL_M,
            chezy_m05_s=40.0,
            widening=0.0,
            alpha=None,
            alpha_basis="integral",
            local_velocity_factor=1.0,
            failure_slope_cot=6.0,
            start_depth_m=0.0,
            d50_mm=None,
        ),
        rows=rows,
        growth_time_s=np.concatenate((flows[0].time_s[:1], ends)),
        growth_depth_m=depth,
        growth_stage=(durations[0].stage, *names),
        required=RequiredLength(
            length_m=max(30.0, 6.0 * final_depth_m),
            minimum_m=30.0,
            final_depth_m=final_depth_m,
            alpha=rows[-1].duration.alpha,
            governed_by_minimum=6.0 * final_depth_m < 30.0,
            upstream_slope_cot=2.5,
            single_slide_m=max(30.0, 1.75 * final_depth_m),
        ),
        length_reached_s=float("nan") if final_depth_m < 15.0 else float(ends[np.argmax(depth[1:] >= 15.0)]),
        length_curve=None
        if still
        else LengthCurve(
            length_m=lengths,
            alpha=rows[-1].duration.alpha * (90.0 / lengths) ** 0.1,
            effective_duration_h=40.0 * (90.0 / lengths) ** 0.3,
            final_depth_m=final_depth_m * (90.0 / lengths) ** 0.12,
        ),
        sensitivities=(
            Sensitivity(change="alpha 10 % higher", depth_change_m=0.18 * final_depth_m, length_change_m=7.5),
            Sensitivity(change="failure slope flatter by 1 (1 in n + 1)", depth_change_m=0.0, length_change_m=6.5),
            Sensitivity(
                change="flow spreading 1 in 8 to either side",
                depth_change_m=-0.05 * final_depth_m,
                length_change_m=-2.5,
            ),
            Sensitivity(
                change="Chezy coefficient of the protection 10 % lower",
                depth_change_m=np.nan,
                length_change_m=np.nan,
                why_empty="invented refusal",
            ),
        ),
    )


def _record(side, samples):
    time_s = seconds_since_epoch(START) - 40.0 * 86400.0 + 600.0 * np.arange(samples)
    time_s = np.delete(time_s, slice(samples // 2, samples // 2 + 150))
    level = sea_level(time_s if side == "sea" else time_s - 1500.0)
    flag = np.ones(level.shape, dtype=np.int8)
    flag[50:53], flag[700] = 3, 4
    level[700] += 3.0
    flag[900:930] = 9
    level[900:930] = np.nan
    return GaugeRecord(
        side=side,
        time_s=time_s,
        level_m=level,
        flag=flag,
        step_s=600.0,
        files=(InputFile(path=f"{side}.csv", sha256="a" * 64),),
    )


def _fit(side, amplitude_m):
    return TideFit(
        side=side,
        constants=TideConstants(
            constituents=("M2", "S2"),
            amplitude_m=[amplitude_m, 0.3],
            phase_deg=[10.0, 40.0],
            mean_m=0.05,
            latitude_deg=53.4,
        ),
        source="record",
        start_s=seconds_since_epoch(START),
        end_s=seconds_since_epoch(START) + 30.0 * 86400.0,
        samples=4000,
        explained_share=0.98,
        residual_std_m=0.1,
        choice="invented",
    )
