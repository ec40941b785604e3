"""The table of load cases."""

from __future__ import annotations

from tidescour.handoff.columns_cases import LOAD_CASE_COLUMNS
from tidescour.handoff.tables import ResultTable, table_from_rows
from tidescour.study.storms import LoadCases


def load_cases_table(found: LoadCases) -> ResultTable:
    """Return one row a storm and place; headings alone where the plan has no load case."""
    rows = (
        (
            row.load_case,
            row.stage,
            row.opening,
            row.side,
            row.start_s,
            row.end_s,
            row.highest_sea_level_m,
            row.peak_gap_velocity_m_s,
            row.peak_end_velocity_m_s,
            row.depth_before_m,
            row.depth_after_m,
            row.depth_allowed_m,
            row.length_required_after_m,
            row.final_depth_m,
            row.length_required_final_m,
        )
        for row in found.rows
    )
    return table_from_rows("load_cases", LOAD_CASE_COLUMNS, rows)
