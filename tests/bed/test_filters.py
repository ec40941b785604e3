import pytest

from tidescour.bed.filters import FILTER_RULES, filter_ratios, permeability_ratio, retention_ratio, uniformity_ratio
from tidescour.handoff.methods_table import left_range
from tidescour.plan.models_bed import Grading

BED = Grading(name="bed", d10_mm=0.1, d15_mm=0.15, d60_mm=0.3, d85_mm=0.35)
# d15F 1.2, d85B 0.35, d15B 0.15 mm: 1.2 / 0.35 = 3.43 and 1.2 / 0.15 = 8.0, both within the limits.
LAYER = Grading(name="layer", d10_mm=1.0, d15_mm=1.2, d60_mm=6.0, d85_mm=8.0)


def test_ratios_of_the_check():
    assert retention_ratio(LAYER, BED) == pytest.approx(3.43, abs=0.005)
    assert permeability_ratio(LAYER, BED) == pytest.approx(8.0, abs=0.05)
    assert uniformity_ratio(LAYER, BED) == 6.0
    found = filter_ratios([BED, LAYER])
    assert [(check.layer, check.under, check.rule) for check in found.checks] == [
        ("bed", "", "filter-internal"),
        ("layer", "bed", "filter-retention"),
        ("layer", "bed", "filter-permeability"),
        ("layer", "", "filter-internal"),
    ]
    assert {check.holds for check in found.checks} == {"yes"}
    assert found.findings == ()


def test_ratios_are_free_of_the_unit():
    metres = [
        Grading(**{key: value / 1000.0 if key != "name" else value for key, value in layer.model_dump().items()})
        for layer in (BED, LAYER)
    ]
    scaled, plain = filter_ratios(metres), filter_ratios([BED, LAYER])
    assert [check.ratio for check in scaled.checks] == pytest.approx([check.ratio for check in plain.checks])


@pytest.mark.parametrize(
    ("d15_mm", "retention", "permeability"),
    [
        # Over d85B 0.35 and d15B 0.15 mm.
        (1.39, "yes", "yes"),
        (1.40, "between the limits in use", "yes"),
        (1.74, "between the limits in use", "yes"),
        (1.76, "no", "yes"),
        (0.74, "yes", "between the limits in use"),
        (0.59, "yes", "no"),
    ],
)
def test_what_lies_between_the_limits_in_use_is_neither_yes_nor_no(d15_mm, retention, permeability):
    found = filter_ratios([BED, LAYER.model_copy(update={"d15_mm": d15_mm})])
    assert [check.holds for check in found.checks[1:3]] == [retention, permeability]
    severities = {"yes": [], "between the limits in use": ["note"], "no": ["warning"]}
    assert [finding.severity for finding in found.findings] == severities[retention] + severities[permeability]


def test_a_rule_that_does_not_hold_is_told_with_its_ratio():
    (finding,) = filter_ratios([BED, LAYER.model_copy(update={"d15_mm": 3.5, "d10_mm": 1.0})]).findings
    assert finding.code == "filter-retention-ratio"
    assert finding.where == "filter 'layer' on 'bed'"
    assert finding.message == "the ratio is 10: d15F / d85B under 4 (5 is also in use) does not hold"


def test_gradings_without_all_sizes_are_said_to_be_not_judged():
    found = filter_ratios([BED, LAYER.model_copy(update={"d60_mm": None})])
    assert found.checks[-1].holds == "not known"
    (finding,) = found.findings
    assert (finding.severity, finding.code) == ("note", "filter-not-judged")
    assert "give d60_mm and d10_mm" in finding.message


def test_a_wide_grading_is_not_stable_in_itself():
    (finding,) = filter_ratios([BED.model_copy(update={"d60_mm": 1.0})]).findings
    assert (finding.severity, finding.where, finding.code) == ("warning", "filter 'bed'", "filter-internal-ratio")


def test_what_one_rule_finds_leaves_the_range_of_that_rule_alone():
    found = filter_ratios([BED.model_copy(update={"d60_mm": 1.0}), LAYER.model_copy(update={"d15_mm": 0.59})])
    assert {finding.code for finding in found.findings} == {"filter-permeability-ratio", "filter-internal-ratio"}
    left = {name: left_range(entry, found.findings) for name, entry in FILTER_RULES.items()}
    assert left["filter-retention"] == ()
    assert [text.split(":")[0] for text in left["filter-permeability"]] == ["filter 'layer' on 'bed'"]
    assert [text.split(":")[0] for text in left["filter-internal"]] == ["filter 'bed'"]


def test_without_layers_there_is_nothing():
    assert filter_ratios(()).checks == ()


def test_every_rule_says_its_limits():
    assert [entry.says.split(" (")[0].split()[-1] for entry in FILTER_RULES.values()] == ["4", "5", "10"]
