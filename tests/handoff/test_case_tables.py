"""The tables of delays and of load cases."""

import runpy
from pathlib import Path

from tidescour.handoff.delay_tables import delay_files, delay_table
from tidescour.handoff.load_case_tables import load_cases_table
from tidescour.handoff.tables import csv_bytes, row_objects
from tidescour.study.storms import LoadCaseRow, LoadCases

INVENTED = runpy.run_path(str(Path(__file__).parents[1] / "study" / "invented_delay.py"))


def test_a_delay_has_a_row_a_stage_week_and_place_with_empty_cells_where_there_is_no_result():
    table = delay_table(INVENTED["invented_study"]())
    assert len(table) == 2 * 3 * 2
    assert row_objects(table)[3] == {
        "stage": "second",
        "weeks_late": 1,
        "opening": "gap",
        "side": "basin",
        "depth_change_own_stay_m": 0.2,
        "depth_change_calendar_m": None,
        "length_change_own_stay_m": 2.0,
        "length_change_calendar_m": None,
        "final_depth_planned_m": 6.0,
        "length_required_planned_m": 60.0,
    }
    assert set(delay_files(INVENTED["invented_study"]())) == {"delay.csv", "findings.csv"}


def test_load_cases_are_written_as_they_are():
    row = LoadCaseRow(
        load_case="storm",
        stage="sill",
        opening="gap",
        side="sea",
        start_s=0.0,
        end_s=3600.0,
        highest_sea_level_m=4.0,
        peak_gap_velocity_m_s=5.0,
        peak_end_velocity_m_s=2.0,
        depth_before_m=3.0,
        depth_after_m=3.5,
        depth_allowed_m=9.0,
        stop_depth_m=12.0,
        length_required_after_m=35.0,
        final_depth_m=4.5,
        length_required_final_m=45.0,
    )
    heading, line = csv_bytes(load_cases_table(LoadCases(rows=(row,), findings=()))).decode().splitlines()
    assert heading == (
        "load_case,stage,opening,side,start,end,highest_sea_level_m,peak_gap_velocity_m_s,peak_end_velocity_m_s,"
        "depth_before_m,depth_after_m,depth_allowed_m,length_required_after_m,final_depth_m,length_required_final_m"
    )
    assert line == "storm,sill,gap,sea,1970-01-01T00:00:00Z,1970-01-01T01:00:00Z,4,5,2,3,3.5,9,35,4.5,45"
    assert len(load_cases_table(LoadCases(rows=(), findings=()))) == 0
