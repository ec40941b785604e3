"""`tidescour delay` from a plan to its files."""

import csv
import json

import pytest

from tidescour.cli.main import exit_code

PLAN = """
[site]
name = "Invented gap"
datum = "invented datum"
latitude_deg = 54.0
[tide]
sea_constants = "constants.csv"
sea_mean_m = 0.1
[basin]
level_m = [-3.0, 3.0]
area_m2 = [1.5e7, 1.5e7]
start_level_m = 0.4
[bed]
critical_velocity_m_s = 0.42
"""
SIDE = """
[protection.{side}]
length_m = 90.0
bed_level_m = -10.0
alpha = 2.4
failure_slope_cot = 8.0
"""
STAGE = """
[[stage]]
name = "{name}"
start = {start}T00:00:00Z
end = {end}T00:00:00Z
[[stage.opening]]
name = "gap"
crest_level_m = -6.0
width_m = {width}
relation = "broad-crest"
coefficient = 0.95
"""
STAGES = (("wide", "2027-04-01", "2027-04-04", 300.0), ("narrow", "2027-04-04", "2027-04-07", 200.0))


@pytest.fixture
def plan(tmp_path):
    stages = (STAGE.format(name=name, start=start, end=end, width=width) for name, start, end, width in STAGES)
    (tmp_path / "constants.csv").write_text("constituent,amplitude_m,phase_deg\nM2,1.4,40\n", encoding="utf-8")
    path = tmp_path / "plan.toml"
    path.write_text(PLAN + SIDE.format(side="sea") + SIDE.format(side="basin") + "".join(stages), encoding="utf-8")
    return path


def test_it_says_which_stage_to_shorten_and_writes_what_stands_behind_it(plan, capsys):
    folder = plan.parent / "late"
    assert exit_code(["delay", str(plan), "--weeks", "2", "--out", str(folder), "--no-figures"]) == 0
    said = capsys.readouterr()
    assert "Shorten 'narrow' first: for 2 weeks more of it the hole at gap" in " ".join(said.out.split())
    assert "metres more per week that a stage is late" in said.out
    assert "[delay-on-the-calendar]" in said.err
    assert {path.name for path in folder.iterdir()} == {"delay.csv", "findings.csv", "provenance.json"}
    with (folder / "delay.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert [(row["stage"], row["weeks_late"], row["side"]) for row in rows] == [
        (stage, weeks, side) for stage in ("wide", "narrow") for weeks in ("1", "2") for side in ("sea", "basin")
    ]
    assert all(float(row["depth_change_own_stay_m"]) > 0.0 for row in rows)


def test_one_week_is_told_once(plan, capsys):
    assert exit_code(["delay", str(plan), "--weeks", "1"]) == 0
    said = capsys.readouterr().out
    assert "stay over 1 week, and over 1 week with" in " ".join(said.split())
    assert said.count("depth 1 wk") == 1
    assert "for 1 week more of it" in " ".join(said.split())
    assert "1 weeks" not in said


def test_it_prints_json_where_one_pipes(plan, capsys):
    assert exit_code(["delay", str(plan), "--weeks", "1", "--json"]) == 0
    said = capsys.readouterr()
    document = json.loads(said.out)
    assert set(document) == {"delay", "findings"}
    assert len(document["delay"]) == 4
    assert said.err == ""


def test_weeks_without_sense_are_wrong_usage(plan, capsys):
    assert exit_code(["delay", str(plan), "--weeks", "0"]) == 2
    assert "1<=x<=26" in capsys.readouterr().err
