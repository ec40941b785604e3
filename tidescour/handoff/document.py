"""The hand-off: one JSON document that a design calculation reads."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from tidescour.handoff.conventions import conventions
from tidescour.handoff.records import RunResults
from tidescour.handoff.results_tables import durations_table, findings_table, growth_table, protection_table
from tidescour.handoff.tables import row_objects
from tidescour.scour.laws import PowerLaw


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
        "findings": row_objects(findings_table(results.findings)),
        "provenance": dict(provenance),
    }


def _law(law: PowerLaw) -> dict[str, object]:
    return {
        "name": law.name,
        "text": law.text,
        "formula": "depth_m = coefficient * excess_m_s ** velocity_exponent * water_depth_m ** depth_exponent "
        "* time_h ** time_exponent, with excess_m_s = max(alpha * velocity_m_s - critical_velocity_m_s, 0)",
        "coefficient": law.coefficient,
        "velocity_exponent": law.velocity_exponent,
        "depth_exponent": law.depth_exponent,
        "time_exponent": law.time_exponent,
        "integral_exponent": law.integral_exponent,
    }
