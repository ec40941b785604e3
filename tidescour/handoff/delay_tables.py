"""The table of delays, and the files of a study of them."""

from __future__ import annotations

from tidescour.handoff.columns_cases import DELAY_COLUMNS
from tidescour.handoff.results_tables import findings_table
from tidescour.handoff.tables import ResultTable, csv_bytes, table_from_rows
from tidescour.study.delay import DelayStudy


def delay_table(study: DelayStudy) -> ResultTable:
    """Return one row a stage, number of weeks and place."""
    planned = {(each.place.opening, each.place.side): each for each in study.places}
    rows = (
        (
            row.stage,
            row.weeks_late,
            row.opening,
            row.side,
            row.own_stay.depth_m,
            row.calendar.depth_m,
            row.own_stay.length_m,
            row.calendar.length_m,
            planned[row.opening, row.side].final_depth_m,
            planned[row.opening, row.side].required_length_m,
        )
        for row in study.rows
    )
    return table_from_rows("delay", DELAY_COLUMNS, rows)


def delay_files(study: DelayStudy) -> dict[str, bytes]:
    """Return the files of a study of delays."""
    tables = (delay_table(study), findings_table(study.findings))
    return {f"{table.name}.csv": csv_bytes(table) for table in tables}
