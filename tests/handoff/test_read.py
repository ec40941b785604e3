"""Reading the hand-off of a run back."""

import json

import pytest

from tidescour.errors import HandoffError
from tidescour.handoff.read import read_run

ROW = {"severity": "error", "code": "swept-out-jump", "where": "stage 'one'", "message": "the jump is swept out"}
HANDOFF = {
    "provenance": {"versions": {"tidescour": "1.2"}},
    "findings": [ROW],
    "methods": [{"name": "alpha"}, {"name": "explicit"}],
}


def write(folder, content):
    text = content if isinstance(content, str) else json.dumps(content)
    (folder / "handoff.json").write_text(text, encoding="utf-8")


def test_methods_and_findings_come_back(tmp_path):
    write(tmp_path, HANDOFF)
    run = read_run(tmp_path)
    assert run.methods == ("alpha", "explicit")
    assert [(each.severity, each.code, each.where, each.message) for each in run.findings] == [tuple(ROW.values())]


def without(key):
    return {name: value for name, value in HANDOFF.items() if name != key}


@pytest.mark.parametrize(
    ("content", "told"),
    [
        ("{", "handoff.json is not JSON"),
        ("\xff\xfe", "is not JSON"),
        ([], "is not a hand-off of tidescour"),
        ({}, "not a hand-off of tidescour ('provenance' is missing)"),
        (without("findings"), "not a hand-off of tidescour ('findings' is missing)"),
        (HANDOFF | {"findings": [ROW | {"severity": "mild"}]}, "'mild' is no severity"),
        (HANDOFF | {"findings": [{"code": "x"}]}, "'severity' is missing"),
        (without("methods"), "does not list the methods of its run ('methods' is missing)"),
        (HANDOFF | {"methods": ["alpha"]}, "does not list the methods"),
    ],
)
def test_what_is_no_hand_off_is_refused(tmp_path, content, told):
    write(tmp_path, content)
    with pytest.raises(HandoffError) as refusal:
        read_run(tmp_path)
    assert told in str(refusal.value)
    assert str(tmp_path) in str(refusal.value)


def test_a_folder_without_results_is_refused(tmp_path):
    with pytest.raises(HandoffError, match=r"there is no folder .*none: give the result folder of `tidescour run`"):
        read_run(tmp_path / "none")
    with pytest.raises(HandoffError, match=r"holds no handoff.json: give the result folder"):
        read_run(tmp_path)
    (tmp_path / "file").write_text("x", encoding="utf-8")
    with pytest.raises(HandoffError, match="is a file"):
        read_run(tmp_path / "file")
