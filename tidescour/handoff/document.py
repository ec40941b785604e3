"""The hand-off: one JSON document that a design calculation reads."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Final

import numpy as np

from tidescour.handoff.conventions import conventions
from tidescour.handoff.design_tables import comparison_table, layers_table, length_curve_table, sensitivity_table
from tidescour.handoff.load_case_tables import load_cases_table
from tidescour.handoff.methods_table import method_objects
from tidescour.handoff.records import RunResults
from tidescour.handoff.results_tables import durations_table, findings_table, growth_table, protection_table
from tidescour.handoff.stone_tables import filter_table, stone_table
from tidescour.handoff.tables import row_objects
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.shapes import MODEL_CURVE, POWER, SATURATING

SHAPES: Final = {POWER: "power", SATURATING: "saturating", MODEL_CURVE: "model-curve"}
"""Names of the shapes of growth laws."""

_POWER_FORMULA: Final = (
    "power_depth_m = coefficient_m_s_h * excess_m_s ** velocity_exponent * water_depth_m ** depth_exponent "
    "* time_h ** time_exponent, with excess_m_s = max(alpha * velocity_m_s - critical_velocity_m_s, 0); "
)
_FORMULAS: Final = {
    POWER: "depth_m = growth_factor * power_depth_m",
    SATURATING: "depth_m = growth_factor * equilibrium_depth_m * (1 - exp(-bending * power_depth_m / "
    "equilibrium_depth_m)), with bending = -(equilibrium_depth_m / water_depth_m) * log(1 - water_depth_m / "
    "equilibrium_depth_m) where equilibrium_depth_m > water_depth_m, else 1; equilibrium_depth_m is the form that "
    "equilibrium names",
    MODEL_CURVE: "depth_m = growth_factor * water_depth_m * F((power_depth_m / water_depth_m) ** (1 / "
    "time_exponent)), with F through the points of curve, straight in logarithms between them, with time_exponent as "
    "its slope under the first and the slope of the last two over the last",
}


def handoff_document(results: RunResults, provenance: Mapping[str, object]) -> dict[str, Any]:
    """Return the hand-off of a run, ready for JSON.

    Parameters
    ----------
    results : RunResults
        What the run found out.
    provenance : mapping
        From `provenance_block`: nothing in it depends on clock, host or folder.

    Returns
    -------
    dict
        As `handoff_schema` describes it. Tables are lists of objects; an empty cell is None.
    """
    return {
        "law": _law(results.law),
        "conventions": conventions(results.plan),
        "submerged_relative_density": results.submerged_relative_density,
        "durations": row_objects(durations_table(results)),
        "growth": row_objects(growth_table(results)),
        "lengths": row_objects(protection_table(results)),
        "comparison": row_objects(comparison_table(results)),
        "length_curve": row_objects(length_curve_table(results)),
        "sensitivity": row_objects(sensitivity_table(results)),
        "layers": row_objects(layers_table(results)),
        "load_cases": row_objects(load_cases_table(results.load_cases)),
        "stone": row_objects(stone_table(results.stone)),
        "filter": row_objects(filter_table(results.filters)),
        "methods": method_objects(results.methods, results.findings),
        "findings": row_objects(findings_table(results.findings)),
        "provenance": dict(provenance),
    }


def _law(law: GrowthLaw) -> dict[str, object]:
    return {
        "name": law.name,
        "text": law.text,
        "shape": SHAPES[law.shape],
        "formula": _POWER_FORMULA + _FORMULAS[law.shape],
        "how_sure": law.confidence,
        "coefficient_m_s_h": law.coefficient,
        "velocity_exponent": law.velocity_exponent,
        "depth_exponent": law.depth_exponent,
        "time_exponent": law.time_exponent,
        "integral_exponent": law.integral_exponent,
        "equilibrium": law.equilibrium if law.shape == SATURATING else None,
        "curve": _curve(law),
    }


def _curve(law: GrowthLaw) -> list[dict[str, float]]:
    """Return the points of a model curve; none for another law."""
    if law.shape != MODEL_CURVE:
        return []
    times, depths = np.exp(law.curve).tolist()
    return [{"time_over_t1": t, "depth_over_water_depth": h} for t, h in zip(times, depths, strict=True)]
