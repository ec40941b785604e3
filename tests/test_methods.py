"""Every method in the tables says what it computes, with symbols and units, and which findings qualify it."""

import ast
import re
from itertools import chain
from pathlib import Path

import pytest

from tidescour.gauge.layouts import LAYOUTS
from tidescour.handoff.finding_codes import OTHER_FINDINGS
from tidescour.handoff.not_in_it import NOT_IN_IT
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

TABLES_OF_CODES = {"_CODES", "_SHALLOW_CODES"}
"""Names of tables in the package from something to the code of its finding."""

ENTRIES = method_entries()


@pytest.fixture(params=[*ENTRIES, *LAYOUTS.values()], ids=lambda entry: entry.name)
def entry(request):
    return request.param


def trees():
    return [ast.parse(path.read_text(encoding="utf-8")) for path in sorted(PACKAGE.rglob("*.py"))]


def told_codes():
    """Return the codes of all findings that the package makes, as they are written in it."""
    found = set()
    for node in (node for tree in trees() for node in ast.walk(tree)):
        if isinstance(node, ast.Call):
            given = [word.value for word in node.keywords if word.arg == "code"]
            name = getattr(node.func, "id", getattr(node.func, "attr", ""))
            # The helpers that make a finding take its code as the second; `append` takes pairs of code and message.
            if name in ("_note", "_finding", "found"):
                given += node.args[1:2]
            elif name == "_summary":
                given += node.args[2:3]
            elif name == "append" and isinstance(node.args[0], ast.Tuple):
                given += node.args[0].elts[:1]
            found |= set(chain.from_iterable(map(written, given)))
        elif isinstance(node, ast.Assign | ast.AnnAssign) and node.value is not None:
            targets = node.targets if isinstance(node, ast.Assign) else [node.target]
            names = {target.id for target in targets if isinstance(target, ast.Name)}
            if "code" in names:
                found |= written(node.value)
            elif names & TABLES_OF_CODES:
                found |= set(chain.from_iterable(map(written, node.value.values)))
    return {text for text in found if re.fullmatch(r"[a-z]+(-[a-z0-9]+)*", text)}


def written(node):
    """Return the texts that stand in a place: one, or the two of a condition."""
    if isinstance(node, ast.IfExp):
        return written(node.body) | written(node.orelse)
    return {node.value} if isinstance(node, ast.Constant) and isinstance(node.value, str) else set()


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


def test_every_code_stands_where_the_listing_finds_it_and_no_other_does():
    of_methods = set(chain.from_iterable((*each.left_by, *each.leads_to) for each in ENTRIES))
    of_left_out = set(chain.from_iterable(each.told_by for each in NOT_IN_IT))
    of_others = list(chain.from_iterable(OTHER_FINDINGS.values()))
    codes = told_codes()
    assert {"swept-out-jump", "not-determined", "spike", "river-ponds", "header-row", "fines-credited"} <= codes
    assert of_methods | of_left_out | set(of_others) == codes
    assert len(set(of_others)) == len(of_others)
    assert (of_methods | of_left_out) & set(of_others) == set()
    # What is left out in every run leaves the range of no method.
    assert of_left_out & set(chain.from_iterable(each.left_by for each in ENTRIES)) == set()


def test_a_code_is_once_at_a_method_and_does_not_both_leave_its_range_and_come_of_it(entry):
    codes = (*entry.left_by, *entry.leads_to)
    assert len(set(codes)) == len(codes)


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
