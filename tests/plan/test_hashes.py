from hashlib import sha256

import pytest

from tidescour.errors import PlanError
from tidescour.plan.hashes import path_for_results, plan_hashes


def test_plan_and_programme_are_hashed_by_their_bytes(read, plan_text, tmp_path):
    table = (
        b"stage,start,end,opening,crest_level_m,width_m,relation,coefficient\r\n"
        b"one,2027-01-01T00:00:00Z,2027-02-01T00:00:00Z,shoal,-6,400,broad-crest,0.9\r\n"
    )
    (tmp_path / "tables").mkdir()
    (tmp_path / "tables" / "p.csv").write_bytes(table)
    text = plan_text[: plan_text.index("[[stage]]")] + '[programme]\nfile = "tables/p.csv"\n'
    assert plan_hashes(read(text)) == (
        ("plan.toml", sha256(text.encode()).hexdigest()),
        ("tables/p.csv", sha256(table).hexdigest()),
    )


def test_a_plan_that_went_away_is_refused(read, plan_text):
    plan = read(plan_text)
    plan.file.unlink()
    with pytest.raises(PlanError, match="cannot be read any more"):
        plan_hashes(plan)


def test_a_programme_with_an_absolute_path_is_named_without_it(read, plan_text, tmp_path):
    table = tmp_path / "p.csv"
    table.write_text(
        "stage,start,end,opening,crest_level_m,width_m,relation,coefficient\n"
        "one,2027-01-01T00:00:00Z,2027-02-01T00:00:00Z,shoal,-6,400,broad-crest,0.9\n"
    )
    plan = read(plan_text[: plan_text.index("[[stage]]")] + f"[programme]\nfile = '{table}'\n")
    assert [name for name, _ in plan_hashes(plan)] == ["plan.toml", "p.csv"]


def test_every_table_of_a_plan_is_hashed_once(read, full_text, full_tables, tmp_path, edit):
    spelled = edit(full_text, ('"survey.csv"\nprofile_from', '"./survey.csv"\nprofile_from'))
    hashes = plan_hashes(read(spelled))
    assert [name for name, _ in hashes] == ["plan.toml", "survey.csv", "hypsometry.csv", "campaign.csv"]
    assert dict(hashes)["hypsometry.csv"] == sha256((tmp_path / "hypsometry.csv").read_bytes()).hexdigest()


def test_curve_and_soundings_are_hashed(read, design_text, full_tables, tmp_path):
    hashes = plan_hashes(read(design_text))
    assert [name for name, _ in hashes][-2:] == ["curve.csv", "soundings.csv"]
    assert dict(hashes)["soundings.csv"] == sha256((tmp_path / "soundings.csv").read_bytes()).hexdigest()


@pytest.mark.parametrize("file", ["curve.csv", "soundings.csv"])
def test_a_table_of_the_design_that_is_not_there_yet_is_not_hashed(read, design_text, full_tables, tmp_path, file):
    (tmp_path / file).unlink()
    assert file not in dict(plan_hashes(read(design_text, "calibrate")))


@pytest.mark.parametrize("file", ["survey.csv", "hypsometry.csv", "campaign.csv"])
def test_a_table_that_is_not_there_yet_is_not_hashed(read, full_text, full_tables, tmp_path, file):
    (tmp_path / file).unlink()
    assert file not in dict(plan_hashes(read(full_text, "records")))


def test_a_profile_of_a_side_opening_is_hashed(read, full_text, full_tables, edit, tmp_path):
    (tmp_path / "sluice.csv").write_text("distance_m,level_m\n0,1\n0,-3\n20,1\n")
    text = edit(full_text, ("crest_level_m = -3.0\nwidth_m = 20.0\n", 'profile = "sluice.csv"\n'))
    assert "sluice.csv" in dict(plan_hashes(read(text)))


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("sea.csv", "sea.csv"),
        ("tables/sea.csv", "tables/sea.csv"),
        ("../sea.csv", "../sea.csv"),
        ("./sea.csv", "sea.csv"),
        ("/home/someone/sea.csv", "sea.csv"),
        ("/home/*/sea_*.csv", "sea_*.csv"),
        (r"C:\data\sea.csv", "sea.csv"),
        ("C:/data/sea.csv", "sea.csv"),
        (r"\\server\share\data\sea.csv", "sea.csv"),
    ],
)
def test_results_name_a_file_without_what_stands_before_the_plan(name, expected):
    assert path_for_results(name) == expected
