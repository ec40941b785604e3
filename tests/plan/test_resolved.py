import json
from datetime import datetime

import pytest

from tidescour.plan.resolved import resolved_plan


def toml_text(value, at=()):
    """Return tables as TOML; enough of it for a plan."""
    lines = []
    for key, item in value.items():
        if not isinstance(item, dict) and not is_list_of_tables(item):
            lines.append(f"{json.dumps(key)} = {toml_value(item)}")
    for key, item in value.items():
        name = ".".join(json.dumps(part) for part in (*at, key))
        if isinstance(item, dict):
            lines += [f"[{name}]", toml_text(item, (*at, key))]
        elif is_list_of_tables(item):
            for table in item:
                lines += [f"[[{name}]]", toml_text(table, (*at, key))]
    return "\n".join(lines)


def is_list_of_tables(item):
    return isinstance(item, list) and bool(item) and all(isinstance(one, dict) for one in item)


def toml_value(item):
    if isinstance(item, list):
        return "[" + ", ".join(toml_value(one) for one in item) + "]"
    if isinstance(item, str) and item.endswith("Z") and item[:2] == "20":
        return item
    return json.dumps(item)


def test_the_resolved_plan_reads_as_the_same_plan(read, plan_text):
    plan = read(plan_text)
    again = read(toml_text(resolved_plan(plan)))
    assert again == plan


def test_it_is_json_with_every_default_and_no_path(read, plan_text, tmp_path):
    resolved = resolved_plan(read(plan_text))
    text = json.dumps(resolved, allow_nan=False)
    assert str(tmp_path) not in text
    assert "null" not in text
    assert resolved["water"] == {"temperature_c": 10.0, "salinity_g_kg": 30.0}
    assert resolved["scour"] == {"law": "explicit", "tide": "integral"}
    assert not {"folder", "file", "programme"} & resolved.keys()


def test_keys_are_those_of_the_file(read, plan_text):
    resolved = resolved_plan(read(plan_text))
    assert resolved["correction"][0]["from"] == "2026-03-01T00:00:00Z"
    assert "start" not in resolved["correction"][0]
    assert resolved["stage"][0]["end"] == "2027-05-10T22:00:00Z"
    assert resolved["stage"][0]["opening"][0]["coefficient"] == 0.95
    assert "parameters" not in resolved["stage"][0]["opening"][0]
    assert resolved["tide"]["infer"] == {"K2": ["S2", 0.272, 0.0]}


def test_stages_stand_for_the_table_that_gave_them(read, plan_text, tmp_path):
    (tmp_path / "p.csv").write_text(
        "stage,start,end,opening,crest_level_m,width_m,relation,coefficient\n"
        "one,2027-01-01T00:00:00+01:00,2027-02-01T00:00:00Z,shoal,-6,400,broad-crest,0.9\n"
    )
    plan = read(plan_text[: plan_text.index("[[stage]]")] + '[programme]\nfile = "p.csv"\n')
    resolved = resolved_plan(plan)
    assert "programme" not in resolved
    assert resolved["stage"][0]["start"] == "2026-12-31T23:00:00Z"
    assert datetime.fromisoformat(resolved["stage"][0]["start"]) == plan.stage[0].start


def test_a_plan_for_records_alone_has_no_stage(read, plan_text):
    resolved = resolved_plan(read(plan_text[: plan_text.index("[basin]")], "records"))
    assert "stage" not in resolved
    assert "basin" not in resolved


@pytest.mark.parametrize("key", ["records", "protection", "bed", "tide", "series"])
def test_tables_keep_their_place(read, plan_text, key):
    assert key in resolved_plan(read(plan_text))


def test_no_path_is_absolute(read, plan_text, edit):
    text = edit(
        plan_text,
        ('"sea_*.csv"', '"/home/someone/sea_*.csv", "more/sea.csv"'),
        ('"basin.csv"', '"C:\\\\data\\\\basin.csv"'),
        ('"storm.csv"', '"/srv/storm.csv"'),
        ("infer = {", 'sea_constants = "/srv/constants.csv"\nsea_mean_m = 0.1\ninfer = {'),
    )
    plan = read(text)
    resolved = resolved_plan(plan)
    assert resolved["records"]["sea"]["files"] == ["sea_*.csv", "more/sea.csv"]
    assert resolved["records"]["basin"]["files"] == ["basin.csv"]
    assert resolved["series"]["storm"]["file"] == "storm.csv"
    assert resolved["tide"]["sea_constants"] == "constants.csv"
    assert plan.records.sea.files[0] == "/home/someone/sea_*.csv"


def test_numbers_and_discharges_stand_for_their_tables(read, full_text, full_tables):
    plan = read(full_text)
    resolved = resolved_plan(plan)
    assert resolved["basin"]["level_m"] == [-3.0, 0.0, 3.0]
    assert resolved["basin"]["volume_m3"] == [0.0, 5.1e7, 1.2e8]
    assert not {"table", "table_column", "area_m2"} & resolved["basin"].keys()
    assert [one["discharge_m3_s"] for one in resolved["discharge"]] == [-2400.0, 1800.0, 2100.0, 25.0]
    assert "discharge_file" not in resolved["calibration"]
    again = read(toml_text(resolved))
    assert again.stage == plan.stage
    assert again.discharge == plan.discharge
    for table, files in (("basin", {"table", "table_column"}), ("calibration", {"discharge_file"})):
        assert getattr(again, table).model_dump(exclude=files) == getattr(plan, table).model_dump(exclude=files)


def test_soundings_stand_for_their_table_and_a_curve_stays_a_file(read, design_text, full_tables, edit, tmp_path):
    elsewhere = ('curve_file = "curve.csv"', f"curve_file = '{tmp_path / 'curve.csv'}'")
    plan = read(edit(design_text, elsewhere))
    resolved = resolved_plan(plan)
    assert [one.get("depth_m") for one in resolved["sounding"]] == [3.6, 1.2, None]
    assert resolved["sounding"][2]["date"] == "2027-06-10T12:00:00Z"
    assert resolved["soundings"] == {"prior_scatter": 0.25, "growth_scatter": 0.05}
    assert resolved["scour"]["curve_file"] == "curve.csv"
    assert not {"curve_points", "equilibrium"} & resolved["scour"].keys()
    assert resolved["stage"][0]["planned_start"] == "2027-03-15T00:00:00Z"
    again = read(toml_text(resolved))
    for table in ("bed", "protection", "sounding", "load_case", "stone", "filter", "stage"):
        assert getattr(again, table) == getattr(plan, table)
    assert again.scour.curve_points == plan.scour.curve_points


def test_the_form_of_the_equilibrium_stands_with_its_law(read, plan_text, edit):
    plan = read(edit(plan_text, ('"explicit"', '"saturating"')))
    resolved = resolved_plan(plan)
    assert resolved["scour"]["equilibrium"] == "half-alpha"
    assert read(toml_text(resolved)) == plan


def test_a_profile_stays_a_file_without_its_folder(read, full_text, full_tables, edit, tmp_path):
    whole = ('"gap of March"\nprofile = "survey.csv"', f"\"gap of March\"\nprofile = '{tmp_path / 'survey.csv'}'")
    resolved = resolved_plan(read(edit(full_text, whole)))
    assert resolved["calibration"]["opening"][0]["profile"] == "survey.csv"
    shoal = resolved["stage"][0]["opening"][1]
    assert (shoal["profile"], shoal["profile_from_m"], shoal["crest_level_m"]) == ("survey.csv", 10.0, -7.0)
    assert not {"profile_points", "side_slope", "width_m"} & shoal.keys()
    assert str(tmp_path) not in json.dumps(resolved)
