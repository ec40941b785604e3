"""What each command prints, where, and the exit code that it leaves with."""

import json
import re
import subprocess
import sys
from pathlib import Path

import pytest

from tidescour.cli.main import exit_code
from tidescour.cli.speaking import colours_wanted

SAMPLE = Path(__file__).parent.parent.parent / "sample_series"
TERNHOLM = SAMPLE / "ternholm" / "plan.toml"


def plan_with(tmp_path, *changes, source=TERNHOLM):
    """Copy a sample plan with texts replaced; its records are read where they are."""
    text = re.sub(r'(files? = \[?")', rf"\1{source.parent.as_posix()}/", source.read_text(encoding="utf-8"))
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new)
    path = tmp_path / "plan.toml"
    path.write_text(text, encoding="utf-8")
    return path


def refused(capsys, *arguments):
    assert exit_code([str(argument) for argument in arguments]) == 3
    captured = capsys.readouterr()
    assert captured.out == ""
    return captured.err


def test_help_teaches_and_loads_nothing_heavy():
    code = (
        "import sys; from tidescour.cli.main import exit_code; exit_code(['--help']);"
        "sys.exit(sum(name in sys.modules for name in ('numpy', 'numba', 'pandas', 'utide', 'matplotlib', 'pydantic')))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0
    assert "tidescour run" in done.stdout
    assert "Exit codes" in done.stdout


@pytest.mark.parametrize("command", ["new", "check", "tides", "run", "schema", "layouts", "relations", "formulas"])
def test_every_command_explains_itself(command, capsys):
    assert exit_code([command, "--help"]) == 0
    assert "Usage: tidescour" in capsys.readouterr().out


def test_a_wrong_option_is_wrong_usage(capsys):
    assert exit_code(["run", "--nonsense"]) == 2
    assert "No such option" in capsys.readouterr().err


@pytest.mark.parametrize("command", ["layouts", "relations", "formulas"])
def test_a_table_is_listed_with_range_source_and_how_sure(command, capsys):
    assert exit_code([command]) == 0
    text = capsys.readouterr().out
    assert all(word in text for word in ("range:", "source:", "how sure:"))
    assert exit_code([command, "--json"]) == 0
    entries = json.loads(capsys.readouterr().out)
    assert all(entry["source"] and entry["validity"] and entry["confidence"] for entry in entries)


def test_one_formula_is_shown_by_name_and_a_wrong_name_gets_the_nearest(capsys):
    assert exit_code(["formulas", "alpha"]) == 0
    assert "1.5 + 5 r0 f_C" in capsys.readouterr().out
    assert exit_code(["formulas", "aplha"]) == 2
    assert "nearest: alpha" in capsys.readouterr().err


def test_a_new_plan_is_written_once(tmp_path, capsys):
    assert exit_code(["new", str(tmp_path / "site")]) == 0
    assert (tmp_path / "site" / "plan.toml").is_file()
    capsys.readouterr()
    assert "plan.toml" in refused(capsys, "new", tmp_path / "site")


@pytest.mark.parametrize("of", [[], ["plan"], ["handoff"]])
def test_a_schema_is_json(of, capsys):
    assert exit_code(["schema", *of]) == 0
    assert json.loads(capsys.readouterr().out)["$schema"].startswith("https://json-schema.org")


def test_check_prints_counts_and_findings_and_writes_only_on_request(tmp_path, capsys):
    path = plan_with(tmp_path)
    assert exit_code(["check", str(path)]) == 0
    captured = capsys.readouterr()
    assert "suspect" in captured.out
    assert "[spike]" in captured.err
    assert sorted(p.name for p in tmp_path.iterdir()) == ["plan.toml"]
    assert exit_code(["check", str(path), "--quiet", "--out", str(tmp_path / "out")]) == 0
    assert capsys.readouterr().err == ""
    assert {p.name for p in (tmp_path / "out").iterdir()} == {"records.csv", "findings.csv", "provenance.json"}


def test_tides_prints_the_constants_as_text_or_json(tmp_path, capsys):
    path = plan_with(tmp_path)
    assert exit_code(["tides", str(path), "--json", "--out", str(tmp_path / "out")]) == 0
    captured = capsys.readouterr()
    assert captured.err == ""
    sea = [row for row in json.loads(captured.out)["tides"] if row["side"] == "sea"]
    assert next(row for row in sea if row["constituent"] == "M2")["amplitude_m"] == pytest.approx(1.44, abs=0.01)
    assert (tmp_path / "out" / "tides.csv").is_file()


def test_a_side_without_a_tide_does_not_hide_the_other(tmp_path, capsys):
    lines = (TERNHOLM.parent / "ternholm_sea_2026-10.csv").read_text(encoding="utf-8").splitlines()[:61]
    (tmp_path / "short.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    path = plan_with(tmp_path, ("ternholm_sea_*.csv", "MARK"))
    text = path.read_text(encoding="utf-8")
    path.write_text(text.replace(f"{TERNHOLM.parent.as_posix()}/MARK", "short.csv"), encoding="utf-8")
    assert exit_code(["tides", str(path)]) == 0
    captured = capsys.readouterr()
    assert "basin tide" in captured.out
    assert "sea tide" not in captured.out
    assert "[no-tide]" in captured.err


def test_a_foreign_folder_is_refused_before_anything_is_printed(tmp_path, capsys):
    path = plan_with(tmp_path)
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / "mine.txt").write_text("keep", encoding="utf-8")
    for command in ("check", "tides", "run"):
        assert "mine.txt" in refused(capsys, command, path, "--out", tmp_path / "out")
    assert [p.name for p in (tmp_path / "out").iterdir()] == ["mine.txt"]


def test_one_typo_is_refused_with_its_nearest_key(tmp_path, capsys):
    path = plan_with(tmp_path, ("chezy_m05_s = 40.0", "chezi_m05_s = 40.0"))
    message = refused(capsys, "run", path)
    assert "chezi_m05_s" in message
    assert "chezy_m05_s" in message
    assert not (tmp_path / "plan_results").exists()


def test_swapped_gauges_are_refused(tmp_path, capsys):
    # In the breaching inlet the basin has the smaller tide and lags by an hour and a half.
    source = SAMPLE / "breaching_inlet" / "plan.toml"
    path = plan_with(
        tmp_path,
        ("[records.sea]", "[records.x]"),
        ("[records.basin]", "[records.sea]"),
        ("[records.x]", "[records.basin]"),
        source=source,
    )
    message = refused(capsys, "run", path)
    assert "the records are exchanged" in message
    assert "[records.sea]" in message


def test_an_empty_file_is_refused(tmp_path, capsys):
    (tmp_path / "empty.csv").write_text("", encoding="utf-8")
    path = plan_with(tmp_path, ("ternholm_sea_*.csv", "MARK"))
    text = path.read_text(encoding="utf-8")
    path.write_text(text.replace(f"{TERNHOLM.parent.as_posix()}/MARK", "empty.csv"), encoding="utf-8")
    assert "empty.csv" in refused(capsys, "run", path)


def test_ten_hours_of_record_give_no_tide(tmp_path, capsys):
    lines = (TERNHOLM.parent / "ternholm_sea_2026-10.csv").read_text(encoding="utf-8").splitlines()[:61]
    (tmp_path / "short.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    path = plan_with(tmp_path, ("ternholm_sea_*.csv", "MARK"))
    text = path.read_text(encoding="utf-8")
    path.write_text(text.replace(f"{TERNHOLM.parent.as_posix()}/MARK", "short.csv"), encoding="utf-8")
    message = refused(capsys, "run", path)
    assert "a tide needs 360 h (15 days)" in message
    assert exit_code(["check", str(path)]) == 0
    assert "[no-tide]" in capsys.readouterr().err


def test_a_sill_that_outgrows_the_formula_for_alpha_is_refused_by_name(tmp_path, capsys):
    path = plan_with(tmp_path, ("alpha_basin = 4.0\n", ""), ("alpha_sea = 4.0\n", ""))
    message = refused(capsys, "run", path)
    assert all(part in message for part in ("last lift", "main gap", "alpha_", "would have given"))


def test_the_basin_fit_of_the_open_gap_used_for_a_narrowed_one_is_an_error_finding(tmp_path, capsys):
    path = plan_with(tmp_path, ("end = 2027-06-01T00:00:00Z\n", 'end = 2027-06-01T00:00:00Z\nbasin = "tide"\n'))
    assert exit_code(["run", "--no-figures", str(path)]) == 4
    message = capsys.readouterr().err
    assert "[volume-check]" in message
    assert "error: stage 'sill to -6'" in message
    assert (tmp_path / "plan_results" / "durations.csv").is_file()


@pytest.mark.parametrize("plan", [".", "/", ""])
def test_a_folder_in_place_of_a_plan_is_refused(plan, capsys):
    assert "refused" in refused(capsys, "run", plan)


def test_a_reader_that_goes_away_is_no_fault():
    command = [sys.executable, "-m", "tidescour.cli.main", "schema"]
    process = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    process.stdout.close()
    assert process.wait(timeout=60) == 0
    assert b"fault" not in process.stderr.read()
    process.stderr.close()


@pytest.mark.parametrize("columns", ["40", "60", "80", "100"])
def test_text_fits_the_terminal(columns, tmp_path, capsys, monkeypatch):
    monkeypatch.setenv("COLUMNS", columns)
    assert exit_code(["check", str(plan_with(tmp_path))]) == 0
    captured = capsys.readouterr()
    for line in (captured.out + captured.err).splitlines():
        assert len(line) <= int(columns), line


@pytest.mark.parametrize("variable", [("NO_COLOR", "1"), ("TERM", "dumb")])
def test_colours_are_left_out_on_request(variable, monkeypatch):
    monkeypatch.delenv("NO_COLOR", raising=False)
    monkeypatch.setenv("TERM", "xterm")
    assert colours_wanted() is None
    monkeypatch.setenv(*variable)
    assert colours_wanted() is False


def test_a_plan_that_is_not_there_is_refused(tmp_path, capsys):
    assert "nowhere.toml" in refused(capsys, "run", tmp_path / "nowhere.toml")
