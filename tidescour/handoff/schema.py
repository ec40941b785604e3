"""The JSON Schema of the hand-off, built from the columns of the tables."""

from __future__ import annotations

from typing import Any, get_args

from tidescour.handoff.columns import (
    COMPARISON_COLUMNS,
    DURATION_COLUMNS,
    FINDING_COLUMNS,
    GROWTH_COLUMNS,
    LAYER_COLUMNS,
    LENGTH_CURVE_COLUMNS,
    PROTECTION_COLUMNS,
    SENSITIVITY_COLUMNS,
    Column,
)
from tidescour.handoff.columns_cases import LOAD_CASE_COLUMNS
from tidescour.handoff.columns_stone import FILTER_COLUMNS, STONE_COLUMNS
from tidescour.handoff.document import SHAPES
from tidescour.handoff.units_in_names import UNIT_ENDINGS
from tidescour.plan.kinds import TIDE_RULES
from tidescour.plan.models_bed import Equilibrium
from tidescour.table import Confidence

TIME_PATTERN = r"^\d{4}-\d{2}-\d{2}T\d{2}:\d{2}:\d{2}(\.\d{3})?Z$"
SHA256 = {"type": "string", "pattern": "^[0-9a-f]{64}$"}
TEXT = {"type": "string"}
NUMBER = {"type": "number"}


def handoff_schema() -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of `handoff.json`; units stand in the names and descriptions.

    Keys may be added later without notice, so none are forbidden; those named here stay.
    """
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "tidescour hand-off",
        "description": "Effective scour durations, growth and required lengths of bed protection of a tidal closure. "
        "Scour time in hours, everything else in SI units; times in UTC.",
        **_object(
            law=_law_schema(),
            conventions=_conventions_schema(),
            submerged_relative_density={
                "type": "number",
                "exclusiveMinimum": 0,
                "description": "density of the grains over that of the water, less 1",
            },
            durations=_rows(DURATION_COLUMNS, "as in durations.csv"),
            growth=_rows(GROWTH_COLUMNS, "as in growth.csv: depth of each place at cycle ends"),
            lengths=_rows(PROTECTION_COLUMNS, "as in protection.csv: final depths and length of each place"),
            comparison=_rows(COMPARISON_COLUMNS, "as in comparison.csv: hours, metres and alpha under every rule"),
            length_curve=_rows(LENGTH_CURVE_COLUMNS, "as in length_curve.csv: depth by length of protection"),
            sensitivity=_rows(SENSITIVITY_COLUMNS, "as in sensitivity.csv: what each input is worth"),
            layers=_rows(LAYER_COLUMNS, "as in layers.csv: layers of the bed that holes reach"),
            load_cases=_rows(LOAD_CASE_COLUMNS, "as in load_cases.csv: storms beside the programme"),
            stone=_rows(STONE_COLUMNS, "as in stone.csv: sizes of stone, for screening only"),
            filter=_rows(FILTER_COLUMNS, "as in filter.csv: ratios of the filter, for screening only"),
            methods={"type": "array", "description": "methods that the run used", "items": _method_schema()},
            findings=_rows(FINDING_COLUMNS, "as in findings.csv: what qualifies the numbers"),
            provenance=_provenance_schema(),
        ),
    }


def _object(**properties: Any) -> dict[str, Any]:
    return {"type": "object", "properties": properties, "required": list(properties)}


def _law_schema() -> dict[str, Any]:
    return _object(
        name=TEXT,
        text=TEXT,
        shape={"enum": list(SHAPES.values())},
        formula={**TEXT, "description": "the law as a program writes it, growth factor of the place included"},
        how_sure=TEXT,
        coefficient_m_s_h={
            "type": "number",
            "exclusiveMinimum": 0,
            "description": "for depths in metres, velocities in m/s and time in hours; its unit is m to the power 1 - "
            "velocity_exponent - depth_exponent, s to velocity_exponent, h to minus time_exponent",
        },
        velocity_exponent={**NUMBER, "description": "of the excess velocity"},
        depth_exponent={**NUMBER, "description": "of the water depth"},
        time_exponent={**NUMBER, "description": "of the time"},
        integral_exponent={**NUMBER, "description": "velocity_exponent / time_exponent"},
        equilibrium={"enum": [*get_args(Equilibrium), None], "description": "of a saturating law, else null"},
        curve={
            "type": "array",
            "description": "points of a model curve; empty for another law",
            "items": _object(time_over_t1=NUMBER, depth_over_water_depth=NUMBER),
        },
    )


def _method_schema() -> dict[str, Any]:
    texts = {"type": "array", "items": TEXT}
    return _object(
        name=TEXT,
        title=TEXT,
        says={**TEXT, "description": "the formula in plain text"},
        symbols={"type": "array", "items": _object(name=TEXT, unit=TEXT, meaning=TEXT)},
        range=TEXT,
        source=TEXT,
        how_sure={"enum": list(get_args(Confidence))},
        left_range={**texts, "description": "where this run left the range; empty where no finding says so"},
    )


def _conventions_schema() -> dict[str, Any]:
    return _object(
        sides=TEXT,
        place=TEXT,
        signs=TEXT,
        datum={**TEXT, "description": "the site datum of all levels"},
        levels=TEXT,
        lengths=TEXT,
        time=TEXT,
        scour_time=TEXT,
        gravity_m_s2=NUMBER,
        tide_rule={"enum": list(TIDE_RULES), "description": "which rule drives growth"},
        effective_duration=TEXT,
        equivalent_start=TEXT,
        share=TEXT,
        growth_factor=TEXT,
        comparison=TEXT,
        length=TEXT,
        stone=TEXT,
        units=_object(
            endings={**_object(**dict.fromkeys(UNIT_ENDINGS, TEXT)), "description": "unit of a number by its ending"},
            bare_numbers={"type": "array", "items": TEXT, "description": "numbers without a unit"},
        ),
        cautions={"type": "array", "items": TEXT},
        not_in_it={
            "type": "array",
            "description": "what the numbers do not hold",
            "items": _object(name=TEXT, what=TEXT, why=TEXT, errs=TEXT, instead=TEXT),
        },
    )


def _provenance_schema() -> dict[str, Any]:
    return _object(
        plan=_object(file=TEXT, sha256=SHA256),
        inputs={"type": "array", "items": _object(file={**TEXT, "description": "relative to the plan"}, sha256=SHA256)},
        versions={"type": "object", "additionalProperties": TEXT, "required": ["tidescour", "python"]},
        resolved_plan={"type": "object", "description": "the plan with every default filled in"},
    )


def _rows(columns: tuple[Column, ...], description: str) -> dict[str, Any]:
    properties = {column.name: _cell(column) for column in columns}
    return {"type": "array", "description": description, "items": _object(**properties)}


def _cell(column: Column) -> dict[str, Any]:
    if column.choices:
        return {"enum": list(column.choices), "description": column.meaning}
    kinds: dict[str, dict[str, Any]] = {
        "text": {"type": "string"},
        "time": {"type": ["string", "null"] if column.may_be_empty else "string", "pattern": TIME_PATTERN},
        "count": {"type": "integer", "minimum": 0},
        "number": {"type": ["number", "null"] if column.may_be_empty else "number"},
    }
    return {**kinds[column.kind], "description": column.meaning}
