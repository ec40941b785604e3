"""`tidescour formulas`: what a person at a terminal and a program get of the methods."""

import json

import pytest

from tidescour.cli.main import exit_code

FINDINGS = [
    {
        "severity": "error",
        "code": "swept-out-jump",
        "where": "stage 'sill to -2', 'main gap', basin side",
        "message": "supercritical flow in 3 % of the time with flow",
    },
    {"severity": "note", "code": "default-used", "where": "bed.shields", "message": "the default soulsby"},
    {"severity": "warning", "code": "tide-only", "where": "load_case", "message": "surge is not in these numbers"},
    {"severity": "warning", "code": "protection-too-short", "where": "'main gap', sea side", "message": "90 m of 120"},
]


@pytest.fixture
def results(tmp_path):
    """A result folder with the hand-off of an invented run."""
    handoff = {
        "provenance": {"versions": {"tidescour": "1.0"}},
        "findings": FINDINGS,
        "methods": [{"name": "soulsby"}, {"name": "jump"}],
    }
    (tmp_path / "handoff.json").write_text(json.dumps(handoff), encoding="utf-8")
    return tmp_path


def listed(capsys, *arguments):
    assert exit_code(["formulas", *map(str, arguments)]) == 0
    return capsys.readouterr().out


def refused(capsys, code, *arguments):
    assert exit_code(["formulas", *map(str, arguments)]) == code
    captured = capsys.readouterr()
    assert captured.out == ""
    return captured.err


def test_a_formula_is_shown_with_its_symbols_range_source_and_how_sure(capsys):
    lines = listed(capsys, "soulsby").splitlines()
    assert lines[0].startswith("soulsby: ")
    assert lines[1].strip().startswith("theta_c = 0.30 / (1 + 1.2 D*)")
    text = "\n".join(lines)
    positions = [text.index(word) for word in ("theta_c = ", "D* ", "range:", "source:", "how sure: from memory")]
    assert positions == sorted(positions)


@pytest.mark.parametrize("columns", [40, 60, 100])
def test_formulas_fit_the_terminal_and_their_symbols_stand_in_columns(columns, capsys, monkeypatch):
    monkeypatch.setenv("COLUMNS", str(columns))
    text = listed(capsys)
    assert max(map(len, text.splitlines())) <= columns
    rows = listed(capsys, "broad-crest").splitlines()
    if columns >= 60:
        symbols = [line for line in rows if line.startswith(("    Q  ", "    z_c  "))]
        starts = {line.index(word) for line in symbols for word in ("m3/s ", "m  ") if word in line}
        assert len(symbols) == 2
        assert len(starts) == 1


def test_json_holds_the_same(capsys):
    (entry,) = json.loads(listed(capsys, "alpha", "--json"))
    assert "1.5 + 5 r0 f_C" in entry["says"]
    assert {"name", "unit", "meaning"} == set(entry["symbols"][0])
    assert "swept-out-jump" in entry["findings"]
    assert "left_range" not in entry


def test_the_code_of_a_finding_shows_the_methods_that_it_qualifies(capsys):
    entries = json.loads(listed(capsys, "swept-out-jump", "--json"))
    assert {"jump", "alpha"} <= {entry["name"] for entry in entries}
    assert all("swept-out-jump" in entry["findings"] for entry in entries)


def test_a_name_that_is_not_there_gets_the_nearest(capsys):
    assert "nearest: explicit" in refused(capsys, 2, "explicet")
    assert "nearest: swept-out-jump" in refused(capsys, 2, "swept-out-jmp")
    assert "nearest: default-used" in refused(capsys, 2, "default-usd")


def test_a_name_that_is_like_no_other_is_not_answered_with_all_of_them(capsys):
    text = refused(capsys, 2, "zzz")
    assert "no method and no finding is called 'zzz'" in text
    assert "without a NAME all methods are listed" in text
    assert max(map(len, text.splitlines())) < 160


def names(text):
    return [line.split(":")[0] for line in text.splitlines() if line and line[0] != " "]


def test_the_first_word_of_several_names_shows_them_all(capsys):
    assert names(listed(capsys, "izbash")) == ["izbash-embedded", "izbash-exposed"]
    assert names(listed(capsys, "filter")) == ["filter-retention", "filter-permeability", "filter-internal"]
    # A whole name is that method alone, though others begin with it.
    assert names(listed(capsys, "alpha")) == ["alpha"]
    assert "nearest: izbash-" in refused(capsys, 2, "izbash-e")


@pytest.mark.parametrize(
    ("code", "item"),
    [
        ("tide-only", "surge"),
        ("placing-not-in-it", "placing-of-units"),
        ("abutment-eddies-not-in-it", "abutment-vortices"),
        ("ice", "ice"),
    ],
)
def test_the_code_of_what_is_left_out_shows_what_to_do_instead(code, item, capsys):
    text = listed(capsys, code)
    assert names(text) == [item]
    assert "instead:" in text
    (document,) = json.loads(listed(capsys, code, "--json"))
    assert document["name"] == item
    assert document["instead"]


@pytest.mark.parametrize(
    ("code", "methods"),
    [
        ("sea-tide-may-rise", ["basin-routing", "sea-raised-by-the-works"]),
        ("spreading-compared", ["none", "fixed-rate", "plane-jet"]),
        ("protection-too-short", ["required-length"]),
        ("stop-reached", ["growth-factor"]),
        ("stone-screening", ["izbash-embedded", "izbash-exposed", "shields", "pilarczyk"]),
        ("small-head", ["basin-routing"]),
        ("fines-not-credited", ["critical-velocity"]),
    ],
)
def test_the_code_of_a_verdict_shows_the_methods_that_it_comes_of(code, methods, capsys):
    assert names(listed(capsys, code)) == methods


def test_a_code_that_is_about_no_method_says_so(results, capsys):
    assert listed(capsys, "default-used").strip() == (
        "finding default-used: about the plan, not about a method: its message says all"
    )
    assert json.loads(listed(capsys, "default-used", "--json")) == []
    lines = listed(capsys, "default-used", "--results", results).splitlines()
    assert lines[1:] == ["  this run: bed.shields: the default soulsby"]
    assert listed(capsys, "gaps", "--results", results).splitlines()[1:] == ["  this run: no such finding"]


def test_a_run_is_asked_for_the_findings_of_a_code(results, capsys):
    last = listed(capsys, "tide-only", "--results", results).split("\n\n")[-1]
    assert last.splitlines() == [
        "finding tide-only:",
        "  this run: load_case: surge is not in these numbers",
    ]
    last = listed(capsys, "protection-too-short", "--results", results).split("\n\n")[-1]
    assert last.splitlines()[1:] == ["  this run: 'main gap', sea side: 90 m of 120"]
    # What leaves a range stands with its method already.
    assert names(listed(capsys, "swept-out-jump", "--results", results))[-1] != "finding swept-out-jump"


def test_no_verdict_leaves_the_range_of_its_method(results, capsys):
    (entry,) = json.loads(listed(capsys, "required-length", "--json", "--results", results))
    assert "protection-too-short" in entry["findings"]
    assert entry["left_range"] == []


def test_a_run_lists_the_methods_that_it_used_and_where_it_left_their_range(results, capsys):
    text = listed(capsys, "--results", results)
    assert [line.split(":")[0] for line in text.splitlines() if line and line[0] != " "] == ["soulsby", "jump"]
    parts = {part.split(":")[0]: " ".join(part.split()) for part in text.split("\n\n")}
    assert parts["jump"].endswith(
        "this run: stage 'sill to -2', 'main gap', basin side: supercritical flow in 3 % of the time with flow"
    )
    assert parts["soulsby"].endswith("this run: nothing found that leaves this range")


def test_a_method_that_a_run_did_not_use_says_so(results, capsys):
    assert "this run: not used" in listed(capsys, "van-rijn", "--results", results)
    (entry,) = json.loads(listed(capsys, "jump", "--json", "--results", results))
    assert entry["used"] is True
    assert entry["left_range"] == [f"{FINDINGS[0]['where']}: {FINDINGS[0]['message']}"]
    (entry,) = json.loads(listed(capsys, "alpha", "--json", "--results", results))
    # Not used, though a finding of the run would qualify it.
    assert entry["used"] is False
    assert entry["left_range"] == []


def test_a_folder_that_holds_no_run_is_refused(tmp_path, capsys):
    assert "holds no handoff.json" in refused(capsys, 3, "--results", tmp_path)
    assert "there is no folder" in refused(capsys, 3, "--results", tmp_path / "none")


def test_what_is_not_in_it_is_told_with_the_way_that_it_errs(capsys, monkeypatch):
    monkeypatch.setenv("COLUMNS", "60")
    text = listed(capsys, "not-in-it")
    assert max(map(len, text.splitlines())) <= 60
    assert text.startswith("surge: storm surge")
    assert all(word in text for word in ("why it matters:", "errs: not cautious", "errs: cautious", "instead:"))
    assert json.loads(listed(capsys, "not-in-it", "--json"))[0]["name"] == "surge"
