"""Every method in the tables says what it computes, with symbols and units, and which findings qualify it."""

import ast
import re
from itertools import chain
from pathlib import Path

import pytest

from tidescour.gauge.layouts import LAYOUTS
from tidescour.pipeline import method_entries, run_methods
from tidescour.pipeline.choices import plan_choices
from tidescour.plan.kinds import SIDES
from tidescour.plan.loader import read_plan

PACKAGE = Path(__file__).parent.parent / "tidescour"
TERNHOLM = Path(__file__).parent.parent / "sample_series" / "ternholm" / "plan.toml"

UNITS = {
    *("-", "deg", "s", "h", "1/m", "rad/s", "C", "g/kg", "kg/kg", "kg/m3"),
    *("mm", "m", "m2", "m3", "m/s", "m/s2", "m2/s", "m3/s", "m^0.5/s"),
    *("Pa s", "s/m", "s2/m2", "s/m^(1/3)", "h m^2.3 s^-4.3", "m/h^gamma"),
}

ABOUT_INPUT = {
    "about the plan": {
        "opening-renamed",
        "sea-change",
        "sea-tide-may-rise",
        "tide-only",
    },
    "about what comes of the works": {
        "delay-without-result",
        "load-case-too-deep",
        "protection-too-short",
        "stop-ahead",
        "stop-reached",
    },
    "about records and series": {
        "averaging-damps",
        "basin-larger",
        "basin-leads",
        "coarse-series",
        "correction-idle",
        "doubled-stamps",
        "excluded",
        "feet-ratio",
        "gaps",
        "load-case-jump",
        "missing-among-values",
        "no-overlap",
        "phase-reference",
        "sensor-range",
        "small-head",
        "spike",
        "stuck",
        "unit-in-header",
    },
}
"""Codes of warnings and errors that qualify what was given, and no method."""

ENTRIES = method_entries()


@pytest.fixture(params=[*ENTRIES, *LAYOUTS.values()], ids=lambda entry: entry.name)
def entry(request):
    return request.param


def trees():
    return [ast.parse(path.read_text(encoding="utf-8")) for path in sorted(PACKAGE.rglob("*.py"))]


def left_by(tree):
    """Return the nodes of all texts under `left_by`."""
    keywords = [node for node in ast.walk(tree) if isinstance(node, ast.keyword) and node.arg == "left_by"]
    return {id(text) for keyword in keywords for text in ast.walk(keyword)}


def texts_elsewhere():
    """Return every text in the package but those under `left_by`."""
    found = set()
    for tree in trees():
        apart = left_by(tree)
        found |= {
            node.value
            for node in ast.walk(tree)
            if isinstance(node, ast.Constant) and isinstance(node.value, str) and id(node) not in apart
        }
    return found


def severe_codes():
    """Return the codes of findings that may be warnings or errors, as far as they are written as texts."""
    found = set()
    for call in (node for tree in trees() for node in ast.walk(tree) if isinstance(node, ast.Call)):
        name = getattr(call.func, "id", "")
        if name == "Finding":
            given = {keyword.arg: keyword.value for keyword in call.keywords}
            severity = texts_in(given["severity"])
            if severity != {"note"}:
                found |= texts_in(given["code"]) if isinstance(given["code"], ast.Constant | ast.IfExp) else set()
        elif name in ("_finding", "found", "_summary") and call.args:
            first, *rest = call.args
            if name == "_summary":
                found |= texts_in(rest[1])
            elif texts_in(first) == {"warning"}:
                found |= texts_in(rest[0])
    return found


def texts_in(node):
    return {each.value for each in ast.walk(node) if isinstance(each, ast.Constant) and isinstance(each.value, str)}


def test_every_name_and_title_is_there_once():
    names = [entry.name for entry in ENTRIES]
    assert len(set(names)) == len(names)
    assert len({entry.title for entry in ENTRIES}) == len(ENTRIES)


def test_every_method_says_what_it_computes_in_plain_text(entry):
    assert entry.says.strip() == entry.says != ""
    assert entry.says.isascii()
    assert len(entry.says.splitlines()) <= 4
    assert entry.validity
    assert entry.source


def test_every_symbol_is_in_the_text_and_has_a_known_unit(entry):
    names = [symbol.name for symbol in entry.symbols]
    assert len(set(names)) == len(names)
    for symbol in entry.symbols:
        assert symbol.unit in UNITS, symbol
        assert symbol.meaning, symbol
        assert re.search(rf"(?<![A-Za-z0-9_]){re.escape(symbol.name)}(?![A-Za-z0-9_])", entry.says), symbol
    assert entry.symbols or entry in LAYOUTS.values() or "=" not in entry.says


def test_every_code_that_qualifies_a_method_is_the_code_of_some_finding():
    known = texts_elsewhere()
    for each in ENTRIES:
        assert set(each.left_by) <= known, each.name
        assert len(set(each.left_by)) == len(each.left_by)


def test_every_warning_and_error_qualifies_a_method_or_what_was_given():
    codes = severe_codes()
    assert {"swept-out-jump", "not-determined", "spike", "river-ponds"} <= codes
    of_methods = set(chain.from_iterable(each.left_by for each in ENTRIES))
    of_input = set(chain.from_iterable(ABOUT_INPUT.values()))
    assert codes - of_methods - of_input == set()
    assert of_input <= codes
    assert of_methods & of_input == set()


@pytest.fixture(scope="module")
def plan():
    return read_plan(TERNHOLM, plan_choices(), purpose="run")


def used(plan):
    return {entry.name for entry in run_methods(plan)}


def with_tables(plan, **tables):
    return plan.model_copy(
        update={name: getattr(plan, name).model_copy(update=values) for name, values in tables.items()}
    )


def test_a_run_uses_what_its_plan_chose_and_what_is_not_chosen(plan):
    names = used(plan)
    assert {"broad-crest", "soulsby", "chezy", "explicit", "none"} <= names
    assert {"basin-routing", "control-section", "critical-velocity", "alpha", "chain", "water-density"} <= names
    assert not names & {"open-gap", "van-rijn", "log-law", "time-scale", "calibration", "growth-factor"}
    assert {"pilarczyk", "izbash-exposed"} <= names
    assert "filter-retention" in names
    assert "filter-retention" not in used(plan.model_copy(update={"filter": ()}))
    changed = with_tables(plan, scour={"law": "time-scale"}, bed={"shields": "brownlie"})
    assert used(changed) - names == {"time-scale", "brownlie"}
    assert [entry for entry in ENTRIES if entry.name in names] == list(run_methods(plan))


def test_a_run_does_not_use_what_its_plan_gives(plan):
    assert used(plan) - used(with_tables(plan, bed={"critical_velocity_m_s": 0.4})) == {
        "closed-form-threshold",
        "critical-velocity",
        "soulsby",
        "chezy",
        "water-viscosity",
    }
    given = {side: getattr(plan.protection, side).model_copy(update={"alpha": 2.5}) for side in SIDES}
    assert used(plan) - used(with_tables(plan, protection=given)) == {"alpha"}


def test_what_the_plan_has_none_of_is_not_used(plan):
    assert not used(with_tables(plan, records={"sea": None, "basin": None})) & {"spike", "stuck"}
    assert "closed-form-threshold" not in used(with_tables(plan, bed={"d90_mm": None}))
    assert "closed-form-threshold" in used(with_tables(plan, bed={"d90_mm": 0.4}))
    assert "layers" not in used(plan)


def test_levels_that_are_given_are_held_against_the_storage_and_not_routed(plan):
    assert "volume-check" not in used(plan)
    stages = tuple(stage.model_copy(update={"basin": "tide"}) for stage in plan.stage)
    names = used(plan.model_copy(update={"stage": stages}))
    assert "volume-check" in names
    assert not names & {"basin-routing", "basin-length"}
