import csv
import io
import runpy
import tomllib
from pathlib import Path

import numpy as np
import pytest

from tidescour.handoff.soundings_tables import plan_lines, soundings_files, soundings_tables

INVENTED = runpy.run_path(str(Path(__file__).parents[1] / "study" / "invented_soundings.py"))


@pytest.fixture(scope="module")
def results():
    return INVENTED["invented_results"](stop_depth_m=5.5)


@pytest.fixture(scope="module")
def tables(results):
    return {name: rows(content) for name, content in soundings_files(results).items() if name.endswith(".csv")}


def rows(content):
    return list(csv.DictReader(io.StringIO(content.decode("utf-8"), newline="")))


def test_the_folder_holds_every_table_and_the_lines(results, tables):
    names = {"soundings.csv", "sounded.csv", "forecast.csv", "stops.csv", "programme.csv", "findings.csv"}
    assert tables.keys() == names
    assert soundings_files(results).keys() == names | {"plan_lines.toml"}
    assert {f"{table.name}.csv" for table in soundings_tables(results)} == names


def test_factors_have_the_columns_of_the_contract(tables, results):
    basin, sea = tables["soundings.csv"]
    assert list(basin)[:5] == ["opening", "side", "growth_factor", "growth_factor_p05", "growth_factor_p95"]
    low, middle, high = results.places[0].growth_factor
    found = [float(basin[key]) for key in ("growth_factor_p05", "growth_factor", "growth_factor_p95")]
    assert found == pytest.approx([low, middle, high], rel=1e-9)
    assert (basin["soundings"], sea["soundings"]) == ("1", "0")
    assert float(sea["growth_factor"]) == 1.0
    assert float(sea["growth_factor_p95"]) == float(sea["prior_p95"])


def test_a_sounding_stands_against_the_law(tables):
    (row,) = tables["sounded.csv"]
    assert row["time_utc"] == "2027-05-01T00:00:00Z"
    assert [float(row[key]) for key in ("sounded_depth_m", "standard_error_m", "hindcast_m")] == pytest.approx(
        [3.6, 0.3, 5.0], rel=1e-9
    )
    assert float(row["hindcast_with_factor_m"]) < 5.0
    assert row["upper_slope_cot"] == ""


def test_the_forecast_runs_from_the_last_sounding_to_the_end(tables):
    basin = [row for row in tables["forecast.csv"] if row["side"] == "basin"]
    assert (basin[0]["time_utc"], basin[-1]["time_utc"]) == ("2027-05-01T00:00:00Z", "2027-05-31T00:00:00Z")
    end = basin[-1]
    assert float(end["depth_p05_m"]) < float(end["depth_p50_m"]) < float(end["depth_p95_m"])
    assert float(end["as_planned_m"]) == pytest.approx(8.0, rel=1e-9)
    assert float(end["plain_ratio_m"]) == pytest.approx(5.76, rel=1e-9)
    sea = [row for row in tables["forecast.csv"] if row["side"] == "sea"]
    assert sea[0]["time_utc"] == "2027-04-01T00:00:00Z"
    assert {row["restart_unscaled_m"] for row in sea} == {""}


def test_stops_and_dates_stay_empty_where_there_are_none(tables):
    length, depth = (row for row in tables["stops.csv"] if row["side"] == "basin")
    assert (length["criterion"], length["limit_depth_m"], length["limit_slope_cot"]) == ("length", "9", "")
    assert (length["state"], length["expected_p50"]) == ("not expected", "")
    assert depth["state"] == "expected"
    assert "2027-05-01" < depth["expected_p95"] < depth["expected_p50"] < "2027-06"
    late, planless = tables["programme.csv"]
    assert (late["planned_end"], late["end"]) == ("2027-04-26T00:00:00Z", "2027-05-01T00:00:00Z")
    assert (float(late["start_days_late"]), float(late["end_days_late"])) == (0.0, 5.0)
    assert (late["sea"], late["basin"], planless["sea"]) == ("measured", "measured", "tide")
    assert (planless["planned_start"], planless["end_days_late"]) == ("", "")


def test_a_slope_that_is_not_reached_has_its_last_sounding():
    slope = INVENTED["sounding"](30.0, 3.6, upper_slope_cot=3.5)
    place = {"stop_slope_cot": 3.0, "stop_slope_height_m": 5.0}
    files = soundings_files(INVENTED["invented_results"]([slope], **place))
    basin, sea = (row for row in rows(files["stops.csv"]) if row["criterion"] == "slope")
    assert (basin["state"], basin["slope_last_sounded"], basin["last_slope_cot"]) == (
        "not reached when last sounded",
        "2027-05-01T00:00:00Z",
        "3.5",
    )
    assert (sea["state"], sea["slope_last_sounded"], sea["last_slope_cot"]) == ("not sounded", "", "")


def test_the_lines_are_a_part_of_a_plan(results):
    protection = tomllib.loads(plan_lines(results))["protection"]
    assert protection == {"basin": {"opening": {"main gap": {"growth_factor": pytest.approx(0.755, abs=0.01)}}}}


def test_the_lines_say_that_soundings_must_not_count_twice(results):
    comments = [line for line in plan_lines(results).splitlines() if line.startswith("#")]
    assert "counts these twice" in " ".join(comments)
    assert max(map(len, comments)) <= 60


def test_no_line_is_written_from_soundings_that_hardly_tell():
    hardly = INVENTED["invented_results"]([INVENTED["sounding"](30.0, 4.0, 4.0)])
    lines = plan_lines(hardly)
    assert tomllib.loads(lines) == {}
    assert '# "main gap", basin side: the soundings hardly tell' in lines


def test_nothing_in_a_table_is_endless(results):
    for table in soundings_tables(results):
        for column, values in zip(table.columns, table.values, strict=True):
            if column.kind == "number":
                assert not np.any(np.isinf(values)), (table.name, column.name)
