"""The tables of a run, each from the records of the steps."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np

from tidescour.bed.layers import BedLayers
from tidescour.errors import Finding
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.sweep_records import DIRECTIONS, TIDES, ClosureSweep
from tidescour.gauge.records import GaugeRecord
from tidescour.handoff.columns import (
    CYCLE_COLUMNS,
    CYCLE_SIDES,
    DURATION_COLUMNS,
    FINDING_COLUMNS,
    GROWTH_COLUMNS,
    PROTECTION_COLUMNS,
    RECORD_COLUMNS,
    SWEEP_COLUMNS,
    TIDE_COLUMNS,
    VELOCITY_COLUMNS,
)
from tidescour.handoff.records import DurationRow, PlaceResult, RunResults
from tidescour.handoff.tables import ResultTable, table_from_rows
from tidescour.plan.kinds import TIDE_RULES, TideRule
from tidescour.scour.records import HELD_RULES, CycleSet, Rule
from tidescour.tide.records import TideFit
from tidescour.units import SECONDS_PER_HOUR, FloatArray, seconds_since_epoch

VELOCITY_STEP_S = 600.0


def final_depth_m(place: PlaceResult, rule: Rule) -> float:
    """Return the depth of a place after the last stage under one rule [m]; NaN where a held velocity has none."""
    return place.rows[-1].step(rule).end_depth_m if place.rows else place.place.start_depth_m


def rows_by_stage(results: RunResults) -> list[tuple[PlaceResult, DurationRow]]:
    """Return every row with its place, in the order of the stages, then of the places."""
    stages = [stage.name for stage in results.plan.stage]
    rows = [(place, row) for place in results.places for row in place.rows]
    return sorted(rows, key=lambda each: stages.index(each[1].stage.name))


def durations_table(results: RunResults) -> ResultTable:
    """Return one row a stage, opening and side, in the order of the stages, then of the places."""
    driving = results.plan.scour.tide
    rows = (_duration_cells(place, row, driving) for place, row in rows_by_stage(results))
    return table_from_rows("durations", DURATION_COLUMNS, rows)


def _duration_cells(place: PlaceResult, row: DurationRow, driving: TideRule) -> tuple[Any, ...]:
    start_s, end_s = seconds_since_epoch(row.stage.start), seconds_since_epoch(row.stage.end)
    duration, step = row.duration, row.step(driving)
    return (
        row.stage.name,
        duration.opening,
        duration.side,
        start_s,
        end_s,
        (end_s - start_s) / SECONDS_PER_HOUR,
        len(duration.cycles.start_s),
        duration.reference_velocity_m_s,
        duration.alpha,
        duration.critical_velocity_m_s,
        duration.reference_depth_m,
        *(duration.total_h(rule) for rule in TIDE_RULES),
        duration.total_h(driving),
        step.stage_depth_m,
        step.equivalent_start_h,
        step.start_depth_m,
        step.end_depth_m,
        row.peak_gap_velocity_m_s,
        duration.peak_velocity_m_s,
        100.0 * step.share,
        step.spent_h,
        place.place.growth_factor,
        duration.turbulence,
        duration.mean_velocity_m_s,
        float(np.sum(duration.flow_h)),
        duration.equilibrium_half_alpha_m,
        duration.equilibrium_turbulence_m,
        layer_name(place.layers, step.layer),
    )


def layer_name(layers: BedLayers, number: int) -> str:
    """Return the name of a layer of the bed; ``surface`` for the sand of the bed itself."""
    layer = layers.layers[number]
    return "surface" if layer is None else layer.name


def cycles_table(results: RunResults) -> ResultTable:
    """Return one row a stage, opening and cycle; an opening without a place on one side has empty cells there."""
    rows: list[tuple[Any, ...]] = []
    for flow in results.flows:
        for opening in flow.openings:
            rows.extend(_cycle_rows(flow, opening, _rows_by_side(results, flow.stage, opening.name)))
    return table_from_rows("cycles", CYCLE_COLUMNS, rows)


def _rows_by_side(results: RunResults, stage: str, opening: str) -> dict[str, DurationRow]:
    return {
        place.place.side: row
        for place in results.places
        for row in place.rows
        if place.place.opening == opening and row.stage.name == stage
    }


def _cycle_rows(flow: StageFlow, opening: OpeningFlow, by_side: dict[str, DurationRow]) -> Iterable[tuple[Any, ...]]:
    if not by_side:
        return ()
    cycles = _shared_cycles(flow.stage, opening.name, by_side)
    count = len(cycles.start_s)
    nothing = np.full(count, np.nan)
    hours = [
        by_side[side].duration.hours(rule) if side in by_side else nothing
        for side in CYCLE_SIDES
        for rule in TIDE_RULES
    ]
    return zip(
        [flow.stage] * count,
        [opening.name] * count,
        range(1, count + 1),
        cycles.start_s,
        cycles.end_s,
        _highest(flow.time_s, flow.level_sea_m, cycles) + _highest(flow.time_s, -flow.level_sea_m, cycles),
        np.maximum(_highest(flow.time_s, opening.gap_velocity_m_s, cycles), 0.0),
        np.maximum(_highest(flow.time_s, -opening.gap_velocity_m_s, cycles), 0.0),
        *hours,
        strict=True,
    )


def _shared_cycles(stage: str, opening: str, by_side: dict[str, DurationRow]) -> CycleSet:
    first, *others = (row.duration.cycles for row in by_side.values())
    if any(not np.array_equal(first.start_s, other.start_s) for other in others):
        raise ValueError(f"{stage}, {opening}: both sides must have the same cycles")
    return first


def _highest(time_s: FloatArray, values: FloatArray, cycles: CycleSet) -> FloatArray:
    """Return the highest value in each cycle, its ends by linear interpolation included; NaN stays NaN."""
    at_ends = np.maximum(np.interp(cycles.start_s, time_s, values), np.interp(cycles.end_s, time_s, values))
    first = np.searchsorted(time_s, cycles.start_s)
    behind = np.searchsorted(time_s, cycles.end_s, side="right")
    inside = [np.max(values[a:b], initial=end) for a, b, end in zip(first, behind, at_ends, strict=True)]
    return np.array(inside, dtype=np.float64)


def velocities_table(results: RunResults, step_s: float = VELOCITY_STEP_S) -> ResultTable:
    """Return levels, flow and velocities of every opening: the first of the solver's steps in each `step_s` of UTC.

    Where the solver steps on whole 10 minutes, those are the rows. A stage is half-open, so its last instant belongs
    to the next one. Openings beside the gap have no end velocities. Inside holes of the records the cells are empty.
    Peaks between rows are in the other tables.
    """
    parts = [
        _velocity_columns(flow, opening, _rows_by_side(results, flow.stage, opening.name), step_s)
        for flow in results.flows
        for opening in (*flow.openings, *flow.side_openings)
    ]
    values: Any = tuple(np.concatenate(column) for column in zip(*parts, strict=True)) or ((),) * len(VELOCITY_COLUMNS)
    return ResultTable(name="velocities", columns=VELOCITY_COLUMNS, values=values)


def _velocity_columns(
    flow: StageFlow, opening: OpeningFlow, by_side: dict[str, DurationRow], step_s: float
) -> tuple[Any, ...]:
    kept = _first_of_each(flow.time_s, step_s)
    numbers = (
        opening.level_sea_m,
        flow.level_basin_m,
        opening.level_sea_m - flow.level_basin_m,
        opening.discharge_m3_s,
        opening.gap_velocity_m_s,
        _end_velocity(by_side.get("basin"), flow),
        _end_velocity(by_side.get("sea"), flow),
    )
    covered = flow.covered[kept]
    return (
        flow.time_s[kept],
        np.full(len(kept), flow.stage, dtype=object),
        np.full(len(kept), opening.name, dtype=object),
        *(np.where(covered, number[kept], np.nan) for number in numbers),
    )


def _first_of_each(time_s: FloatArray, step_s: float) -> np.ndarray:
    """Return the indices of the first step in each interval of `step_s`, the end of the stage left out."""
    # A millisecond of grace, as steps are sums of floats.
    interval = np.floor((time_s[:-1] + 1e-3) / step_s)
    return np.flatnonzero(np.diff(interval, prepend=-np.inf) > 0.0)


def _end_velocity(row: DurationRow | None, flow: StageFlow) -> FloatArray:
    return np.full(flow.time_s.shape, np.nan) if row is None else row.bed.velocity_m_s


def growth_table(results: RunResults) -> ResultTable:
    """Return the depth of each place at cycle ends under the rule that drives."""
    rows = (
        (time_s, stage, place.place.opening, place.place.side, depth_m)
        for place in results.places
        for time_s, stage, depth_m in zip(place.growth_time_s, place.growth_stage, place.growth_depth_m, strict=True)
    )
    return table_from_rows("growth", GROWTH_COLUMNS, rows)


def protection_table(results: RunResults) -> ResultTable:
    """Return one row a place: final depths under all rules, length given and required."""
    rows = (
        (
            place.place.opening,
            place.place.side,
            place.place.failure_slope_cot,
            final_depth_m(place, results.plan.scour.tide),
            *(final_depth_m(place, rule) for rule in TIDE_RULES),
            place.place.length_m,
            place.required.length_m,
            place.required.alpha,
            raised_depth_m,
            raised_length_m,
            place.place.depth_margin_factor,
            place.required.single_slide_m,
            place.required.minimum_m,
            place.required.upstream_slope_cot,
            place.length_reached_s,
            *(final_depth_m(place, rule) for rule in HELD_RULES),
        )
        for place, (raised_depth_m, raised_length_m) in zip(results.places, _with_raised_sea(results), strict=True)
    )
    return table_from_rows("protection", PROTECTION_COLUMNS, rows)


def _with_raised_sea(results: RunResults) -> Iterable[tuple[float, float]]:
    """Return final depth and required length of each place with the larger sea tide; NaN where there are none."""
    raised = results.raised_sea
    if raised is None:
        return [(np.nan, np.nan)] * len(results.places)
    return zip(raised.final_depth_m, raised.length_required_m, strict=True)


def sweep_table(sweep: ClosureSweep) -> ResultTable:
    """Return peaks in the main opening by crest level and by width, a row a tide and direction."""
    rows = (
        (
            sweep.opening,
            varied,
            float(value),
            tide,
            direction,
            float(curve.head_m[at, number, way]),
            float(curve.gap_velocity_m_s[at, number, way]),
            float(curve.unit_discharge_m2_s[at, number, way]),
            float(curve.mean_basin_level_m[at]),
        )
        for varied, curve in (("crest", sweep.crest), ("width", sweep.width))
        if curve is not None
        for at, value in enumerate(curve.value_m)
        for number, tide in enumerate(TIDES)
        for way, direction in enumerate(DIRECTIONS)
    )
    return table_from_rows("sweep", SWEEP_COLUMNS, rows)


def tides_table(fits: Iterable[TideFit]) -> ResultTable:
    """Return the harmonic constants of each side; intervals stay empty until they are true ones."""
    rows = (
        (fit.side, name, amplitude_m, phase_deg, np.nan, np.nan)
        for fit in fits
        for name, amplitude_m, phase_deg in zip(
            fit.constants.constituents, fit.constants.amplitude_m, fit.constants.phase_deg, strict=True
        )
    )
    return table_from_rows("tides", TIDE_COLUMNS, rows)


def records_table(records: Iterable[GaugeRecord]) -> ResultTable:
    """Return every row read, on the site datum and UTC, with its flag."""
    parts = [
        (np.full(record.time_s.shape, record.side, dtype=object), record.time_s, record.level_m, record.flag)
        for record in records
    ]
    values: Any = tuple(np.concatenate(column) for column in zip(*parts, strict=True)) or ((),) * len(RECORD_COLUMNS)
    return ResultTable(name="records", columns=RECORD_COLUMNS, values=values)


def findings_table(findings: Iterable[Finding]) -> ResultTable:
    """Return the findings in the order of the steps; headings alone when there are none."""
    rows = ((finding.severity, finding.code, finding.where, finding.message) for finding in findings)
    return table_from_rows("findings", FINDING_COLUMNS, rows)
