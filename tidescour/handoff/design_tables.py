"""The tables that lead from a run to the design of the protection: rules compared, lengths, inputs, layers."""

from __future__ import annotations

from typing import Any

import numpy as np

from tidescour.handoff.columns import (
    COMPARISON_COLUMNS,
    LAYER_COLUMNS,
    LENGTH_CURVE_COLUMNS,
    SENSITIVITY_COLUMNS,
)
from tidescour.handoff.records import DurationRow, PlaceResult, RunResults, Sensitivity
from tidescour.handoff.results_tables import layer_name, rows_by_stage
from tidescour.handoff.tables import ResultTable, table_from_rows
from tidescour.plan.models_bed import PlaceBed
from tidescour.scour.curves import depth_at
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import RULES, LayerReached, Rule


def comparison_table(results: RunResults) -> ResultTable:
    """Return one row a stage, opening, side and rule: in hours, in metres, and in alpha."""
    rows = (
        _comparison_cells(place, row, results.law, rule, drives=rule == results.plan.scour.tide)
        for place, row in rows_by_stage(results)
        for rule in RULES
    )
    return table_from_rows("comparison", COMPARISON_COLUMNS, rows)


def _comparison_cells(
    place: PlaceResult, row: DurationRow, law: GrowthLaw, rule: Rule, *, drives: bool
) -> tuple[Any, ...]:
    duration = row.duration
    return (
        row.stage.name,
        duration.opening,
        duration.side,
        rule,
        duration.total_h(rule),
        stage_depth_m(place, row, law, rule),
        row.step(rule).end_depth_m,
        duration.alpha,
        row.equal_alpha[RULES.index(rule)],
        "yes" if drives else "no",
    )


def stage_depth_m(place: PlaceResult, row: DurationRow, law: GrowthLaw, rule: Rule) -> float:
    """Return the depth of a row from a flat bed under one rule [m], all rules in the layer of the one that drives."""
    duration = row.duration
    hours = duration.total_h(rule)
    if hours == 0.0:
        return 0.0
    return place.place.growth_factor * float(depth_at(law, duration.growth_rate * hours, duration.scale_m))


def slope_rule_length_m(place: PlaceBed, depth_m: float) -> float:
    """Return the length that a hole of some depth asks for [m]: failure slope times margin times depth."""
    return place.failure_slope_cot * place.depth_margin_factor * depth_m


def row_of_largest_share(place: PlaceResult, rule: Rule) -> DurationRow | None:
    """Return the row with the largest share in the growth of a place under one rule; None where nothing grows."""
    grown = [row for row in place.rows if row.step(rule).share > 0.0]
    return max(grown, key=lambda row: row.step(rule).share, default=None)


def largest_changes(place: PlaceResult, most: int) -> list[Sensitivity]:
    """Return the changes of one input with the largest effect on the required length, those with a result alone."""
    known = [each for each in place.sensitivities if np.isfinite(each.length_change_m)]
    return sorted(known, key=lambda each: -abs(each.length_change_m))[:most]


def length_curve_table(results: RunResults) -> ResultTable:
    """Return alpha, duration, depth and the length that the depth asks for by length; none where nothing grows."""
    rows = (
        (
            place.place.opening,
            place.place.side,
            length_m,
            alpha,
            hours,
            depth_m,
            slope_rule_length_m(place.place, depth_m),
        )
        for place in results.places
        if (curve := place.length_curve) is not None
        for length_m, alpha, hours, depth_m in zip(
            curve.length_m, curve.alpha, curve.effective_duration_h, curve.final_depth_m, strict=True
        )
    )
    return table_from_rows("length_curve", LENGTH_CURVE_COLUMNS, rows)


def sensitivity_table(results: RunResults) -> ResultTable:
    """Return what each input is worth at each place, one row a change."""
    rows = (
        (
            place.place.opening,
            place.place.side,
            each.change,
            each.depth_change_m,
            each.length_change_m,
            each.why_empty,
        )
        for place in results.places
        for each in place.sensitivities
    )
    return table_from_rows("sensitivity", SENSITIVITY_COLUMNS, rows)


def layers_table(results: RunResults) -> ResultTable:
    """Return the layers of the bed that holes reach under the rule that drives; headings alone where none is."""
    rows = (
        _layer_cells(place, row, reached)
        for place, row in rows_by_stage(results)
        for reached in row.step(results.plan.scour.tide).reached
    )
    return table_from_rows("layers", LAYER_COLUMNS, rows)


def _layer_cells(place: PlaceResult, row: DurationRow, reached: LayerReached) -> tuple[Any, ...]:
    of_layer = row.durations.layers[reached.layer]
    return (
        row.stage.name,
        place.place.opening,
        place.place.side,
        layer_name(place.layers, reached.layer),
        place.place.bed_level_m - reached.depth_m,
        reached.depth_m,
        reached.time_s,
        of_layer.reference_velocity_m_s,
        of_layer.alpha,
        of_layer.critical_velocity_m_s,
        of_layer.reference_depth_m,
        reached.equivalent_start_h,
        reached.effective_duration_h,
    )
