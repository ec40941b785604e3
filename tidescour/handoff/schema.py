"""The JSON Schema of the hand-off, built from the columns of the tables."""

from __future__ import annotations

from typing import Any

from tidescour.handoff.columns import (
    DURATION_COLUMNS,
    FINDING_COLUMNS,
    GROWTH_COLUMNS,
    PROTECTION_COLUMNS,
    Column,
)
from tidescour.plan.models import SIDES, TIDE_RULES

TIME_PATTERN = r"^\d{4}-\d{2}-\d{2}T\d{2}:\d{2}:\d{2}(\.\d{3})?Z$"
SHA256 = {"type": "string", "pattern": "^[0-9a-f]{64}$"}
TEXT = {"type": "string"}
NUMBER = {"type": "number"}

CHOICES = {"side": SIDES, "severity": ("note", "warning", "error")}
"""Text columns with few allowed values."""


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
        formula=TEXT,
        coefficient={"type": "number", "exclusiveMinimum": 0, "description": "for m, m/s and hours"},
        velocity_exponent={**NUMBER, "description": "of the excess velocity"},
        depth_exponent={**NUMBER, "description": "of the water depth"},
        time_exponent={**NUMBER, "description": "of the time"},
        integral_exponent={**NUMBER, "description": "velocity_exponent / time_exponent"},
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
        cautions={"type": "array", "items": TEXT},
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
    if column.name in CHOICES:
        return {"enum": list(CHOICES[column.name]), "description": column.meaning}
    kinds: dict[str, dict[str, Any]] = {
        "text": {"type": "string"},
        "time": {"type": "string", "pattern": TIME_PATTERN},
        "count": {"type": "integer", "minimum": 0},
        "number": {"type": ["number", "null"] if column.may_be_empty else "number"},
    }
    return {**kinds[column.kind], "description": column.meaning}
