"""`tidescour soundings` from files to files: a past on measured levels, a future on the tide, and what is refused."""

import csv
import json
import tomllib

import numpy as np
import pytest

from tidescour.cli.main import exit_code
from tidescour.units import utc_text

START_S = 1806537600.0  # 2027-04-01T00:00:00Z
M2_DEG_H, M2_M = 28.984104, 1.4
PLAN = """
[site]
name = "Invented gap"
datum = "invented datum"
latitude_deg = 53.0

[records.sea]
files = ["sea.csv"]
utc_offset = "+00:00"
unit = "m"

[tide]
sea_constants = "constants.csv"
sea_mean_m = 0.0

[basin]
level_m = [-2.0, 2.0]
area_m2 = [1.2e7, 1.8e7]

[bed]
critical_velocity_m_s = 0.4

[protection.basin]
length_m = 80.0
bed_level_m = -8.0
failure_slope_cot = 8.0
alpha = 1.5

[protection.sea]
length_m = 80.0
bed_level_m = -8.0
failure_slope_cot = 8.0
alpha = 1.5

[[stage]]
name = "sill to -5"
planned_start = 2027-04-01T00:00:00Z
planned_end = 2027-04-06T00:00:00Z
start = 2027-04-01T00:00:00Z
end = 2027-04-08T00:00:00Z
sea = "measured"

[[stage.opening]]
name = "main gap"
crest_level_m = -5.0
width_m = 200.0
relation = "broad-crest"
coefficient = 1.0

[[stage]]
name = "sill to -4"
start = 2027-04-08T00:00:00Z
end = 2027-04-20T00:00:00Z

[[stage.opening]]
name = "main gap"
crest_level_m = -4.0
width_m = 200.0
relation = "broad-crest"
coefficient = 1.0
"""
SOUNDING = """
[[sounding]]
date = 2027-04-08T00:00:00Z
opening = "main gap"
side = "basin"
depth_m = {depth}
standard_error_m = 0.1
"""
SOUNDED_3_M = SOUNDING.format(depth=3.0)
FILES = {"soundings.csv", "sounded.csv", "forecast.csv", "stops.csv", "programme.csv", "findings.csv"}


def write_levels(path, level):
    time_s = START_S + np.arange(-144, 8 * 144) * 600.0
    rows = (
        f"{utc_text(at)},{height:.4f}" for at, height in zip(time_s, level((time_s - START_S) / 3600.0), strict=True)
    )
    path.write_text("\n".join(["time,level_m", *rows]) + "\n", encoding="utf-8")


@pytest.fixture
def plan(tmp_path):
    """Return the writer of the plan with soundings and texts replaced; the sea gauge read more than the tide."""
    write_levels(tmp_path / "sea.csv", lambda hours: 1.5 * np.cos(np.radians(M2_DEG_H * hours)))
    constants = f"constituent,amplitude_m,phase_deg\nM2,{M2_M},0.0\n"
    (tmp_path / "constants.csv").write_text(constants, encoding="utf-8")

    def write(*changes, soundings=(SOUNDED_3_M,)):
        text = PLAN + "".join(soundings)
        for old, new in changes:
            assert old in text, old
            text = text.replace(old, new)
        path = tmp_path / "plan.toml"
        path.write_text(text, encoding="utf-8")
        return path

    return write


def answer(capsys, path, *options, code=0):
    assert exit_code(["soundings", str(path), "--json", "--no-figures", *options]) == code
    captured = capsys.readouterr()
    assert captured.err == ""
    return json.loads(captured.out)


def refused(capsys, path):
    assert exit_code(["soundings", str(path)]) == 3
    captured = capsys.readouterr()
    assert captured.out == ""
    return " ".join(captured.err.split())


def grown(folder, capsys, path):
    """Return the depths of the basin side at the end of each stage by a run of the plan."""
    assert exit_code(["run", str(path), "--out", str(folder), "--no-figures", "--quiet"]) in (0, 4)
    capsys.readouterr()
    with (folder / "durations.csv").open(encoding="utf-8", newline="") as stream:
        return [float(row["end_depth_m"]) for row in csv.DictReader(stream) if row["side"] == "basin"]


def test_the_past_is_computed_on_what_was_measured_and_the_lines_lead_to_the_sounding(plan, tmp_path, capsys):
    now_m, end_m = grown(tmp_path / "run", capsys, plan())
    found = answer(capsys, plan(soundings=[SOUNDING.format(depth=0.8 * now_m)]))
    (sounded,) = found["sounded"]
    assert sounded["hindcast_m"] == pytest.approx(now_m, rel=1e-9)
    last = [row for row in found["forecast"] if row["side"] == "basin"][-1]
    assert last["time_utc"] == "2027-04-20T00:00:00Z"
    assert last["as_planned_m"] == pytest.approx(end_m, rel=1e-9)
    assert last["plain_ratio_m"] == pytest.approx(0.8 * end_m, rel=1e-9)
    assert last["depth_p05_m"] < last["depth_p50_m"] < last["depth_p95_m"]
    # From the sounded depth on, with states of the law: h = (h_s**2.5 + h_end**2.5 - h_now**2.5)**0.4.
    unscaled = ((0.8 * now_m) ** 2.5 + end_m**2.5 - now_m**2.5) ** 0.4
    assert last["restart_unscaled_m"] == pytest.approx(unscaled, rel=1e-9)
    basin = next(row for row in found["soundings"] if row["side"] == "basin")
    # A standard error of 0.1 m and a tenth of the growth leave about a tenth either way of 0.8.
    assert basin["growth_factor"] == pytest.approx(0.8, abs=0.04)
    assert basin["growth_factor_p05"] < 0.8 < basin["growth_factor_p95"]
    lines = tomllib.loads(found["plan_lines"])["protection"]["basin"]["opening"]["main gap"]
    again = plan(("[protection.basin]", f"[protection.basin]\ngrowth_factor = {lines['growth_factor']}"))
    with_factor = answer(capsys, again)
    assert with_factor["sounded"][0]["hindcast_m"] == pytest.approx(lines["growth_factor"] * now_m, rel=1e-9)
    assert with_factor["soundings"][-1]["growth_factor_in_plan"] == lines["growth_factor"]
    # On the tide, whose range is a fifteenth smaller, the past would have been another.
    gauge = PLAN[PLAN.index("[records.sea]") : PLAN.index("[tide]")]
    tidal = answer(capsys, plan(('sea = "measured"\n', ""), (gauge, "")))
    assert abs(tidal["sounded"][0]["hindcast_m"] - now_m) > 0.05
    assert {row["code"] for row in tidal["findings"]} >= {"hindcast-on-tide"}
    assert "hindcast-on-tide" not in {row["code"] for row in found["findings"]}


def test_a_folder_is_written_and_replaced_whole(plan, tmp_path, capsys):
    out = tmp_path / "out"
    path = plan()
    assert exit_code(["soundings", str(path), "--out", str(out)]) in (0, 4)
    captured = capsys.readouterr()
    assert f"results in {out}" in captured.err
    assert {each.name for each in out.iterdir()} == FILES | {"plan_lines.toml", "provenance.json", "figures"}
    assert {each.name for each in (out / "figures").iterdir()} == {"soundings.png", "soundings.svg"}
    assert captured.out.rstrip().endswith((out / "plan_lines.toml").read_text(encoding="utf-8").rstrip())
    assert exit_code(["soundings", str(path), "--out", str(out), "--no-figures", "--quiet"]) in (0, 4)
    assert capsys.readouterr().err == ""
    assert {each.name for each in out.iterdir()} == FILES | {"plan_lines.toml", "provenance.json"}
    assert json.loads((out / "provenance.json").read_text(encoding="utf-8"))["command"] == "soundings"
    (out / "mine.txt").write_text("keep", encoding="utf-8")
    assert exit_code(["soundings", str(path), "--out", str(out)]) == 3
    assert "mine.txt" in capsys.readouterr().err


@pytest.mark.parametrize("columns", ["40", "60"])
def test_words_and_tables_fit_the_terminal(columns, plan, capsys, monkeypatch):
    monkeypatch.setenv("COLUMNS", columns)
    assert exit_code(["soundings", str(plan(("length_m = 80.0", "length_m = 20.0")))]) == 4
    captured = capsys.readouterr()
    words, lines = captured.out.split("lines for the plan:")
    for line in (words + captured.err).splitlines():
        assert len(line) <= int(columns), line
    flat = " ".join(words.split())
    assert "REACHED by 2027-04-08: the depth of 2.5 m from which the given length is too short" in flat
    assert "the ebb (basin to sea) the one on the sea side" in flat
    assert "not sounded" in flat
    assert "unscaled" in flat
    assert "2027-04-06" in flat
    assert "growth_factor = " in lines
    for line in lines.splitlines():
        assert len(line) <= 60, line


def test_a_stop_that_is_reached_is_an_error(plan, capsys):
    stopping = ("[protection.basin]", "[protection.basin]\nstop_depth_m = 2.9")
    found = answer(capsys, plan(stopping), code=4)
    depth = next(row for row in found["stops"] if row["side"] == "basin" and row["criterion"] == "depth")
    assert (depth["state"], depth["reached"]) == ("reached", "2027-04-08T00:00:00Z")
    assert ("error", "stop-reached") in {(row["severity"], row["code"]) for row in found["findings"]}


def test_the_law_a_slope_and_a_lone_planned_start_are_named_for_what_they_are(plan, capsys):
    stopping = "[protection.basin]\ngrowth_factor = 0.8\nstop_slope_cot = 3.0\nstop_slope_height_m = 2.0"
    path = plan(
        ("[protection.basin]", stopping),
        ("planned_end = 2027-04-06T00:00:00Z\n", ""),
        ("planned_start = 2027-04-01", "planned_start = 2027-03-30"),
        ("standard_error_m = 0.1\n", "standard_error_m = 0.1\nupper_slope_cot = 3.5\n"),
    )
    assert exit_code(["soundings", str(path)]) in (0, 4)
    said = capsys.readouterr()
    flat = " ".join(said.out.split())
    assert "by the law with the plan's growth_factor 0.8" in flat
    assert "law x 0.8" in flat
    assert "not reached when last sounded, 1 in 3.5 on 2027-04-08; slopes are not forecast: stop_slope_cot = 3" in flat
    assert "planned start" in flat
    assert "planned end" not in flat
    assert "[slope-not-forecast]" in said.err


def test_one_depth_is_told_of_a_hole_that_outgrows_the_evidence(plan, capsys):
    deep = SOUNDING.format(depth=16.0)
    found = answer(capsys, plan(("length_m = 80.0", "length_m = 800.0"), soundings=[deep]), code=4)
    (basin,) = [
        row for row in found["findings"] if row["code"] == "hole-deeper-than-evidence" and "basin" in row["where"]
    ]
    median_m = [row for row in found["forecast"] if row["side"] == "basin"][-1]["depth_p50_m"]
    assert f"becomes {median_m:.2f} m deep in stage 'sill to -4'" in basin["message"]


def test_a_table_of_soundings_serves_as_well(plan, tmp_path, capsys):
    written = answer(capsys, plan())
    (tmp_path / "table.csv").write_text(
        "date,opening,side,depth_m,standard_error_m\n2027-04-08T00:00:00Z,main gap,basin,3.0,0.1\n", encoding="utf-8"
    )
    read = answer(capsys, plan(soundings=['\n[soundings]\nfile = "table.csv"\n']))
    assert read["soundings"] == written["soundings"]


def test_a_plan_without_soundings_and_dates_outside_it_are_refused(plan, capsys):
    assert "sounding: missing; write [[sounding]]" in refused(capsys, plan(soundings=()))
    outside = SOUNDING.format(depth=3.0).replace("2027-04-08", "2027-05-08")
    assert "sounding[1].date" in refused(capsys, plan(soundings=[outside]))
    assert "after the last stage's end at 2027-04-20T00:00:00Z" in refused(capsys, plan(soundings=[outside]))
