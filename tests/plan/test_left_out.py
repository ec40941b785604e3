"""What a plan leaves to others, and where it is said."""

import pytest

from tidescour.plan.left_out import left_out_findings, tide_only_finding


@pytest.fixture
def tidal(read, plan_text):
    """The plan with every stage on the tide."""
    plan = read(plan_text)
    return plan.model_copy(update={"stage": tuple(stage.model_copy(update={"sea": "tide"}) for stage in plan.stage)})


def with_sea(plan, sea):
    first = plan.stage[0].model_copy(update={"sea": sea})
    return plan.model_copy(update={"stage": (first, *plan.stage[1:])})


def codes(plan):
    return [finding.code for finding in left_out_findings(plan)]


def changed(plan, **values):
    """The plan with values of every opening of every stage changed."""
    stages = tuple(
        stage.model_copy(
            update={"opening": tuple(opening.model_copy(update=values) for opening in stage.opening)},
        )
        for stage in plan.stage
    )
    return plan.model_copy(update={"stage": stages})


def protected(plan, **values):
    sides = {side: getattr(plan.protection, side).model_copy(update=values) for side in ("sea", "basin")}
    return plan.model_copy(update={"protection": plan.protection.model_copy(update=sides)})


def test_a_plan_on_the_tide_alone_is_warned_that_surge_is_not_in_it(tidal):
    (finding,) = tide_only_finding(tidal)
    assert (finding.severity, finding.code) == ("warning", "tide-only")
    for word in ("surge is not in these numbers", "[series.NAME]", "[[load_case]]", "stage = ", "series = "):
        assert word in finding.message
    assert "set_up_m" not in finding.message
    raised = tidal.model_copy(update={"tide": tidal.tide.model_copy(update={"set_up_m": 0.3})})
    assert "but for set_up_m = 0.3 m" in tide_only_finding(raised)[0].message


@pytest.mark.parametrize("sea", ["measured", "storm"])
def test_a_measured_or_given_sea_holds_its_own_surge(tidal, sea):
    assert tide_only_finding(with_sea(tidal, sea)) == ()


def test_a_load_case_holds_a_surge_and_a_plan_without_stages_needs_none(tidal):
    assert tide_only_finding(tidal.model_copy(update={"load_case": ("storm",)})) == ()
    assert tide_only_finding(tidal.model_copy(update={"stage": ()})) == ()


@pytest.mark.parametrize("relation", ["culvert", "orifice"])
def test_openings_with_a_roof_are_told_that_their_placing_is_not_in_it(tidal, relation):
    assert "placing-not-in-it" not in codes(changed(tidal, relation="broad-crest"))
    found = [each for each in left_out_findings(changed(tidal, relation=relation)) if each.code == "placing-not-in-it"]
    assert [each.where for each in found] == ["opening 'main gap'", "opening 'shoal'"]
    assert all(each.severity == "note" and relation in each.message for each in found)


def eddies(plan):
    return {
        finding.where: finding.message
        for finding in left_out_findings(plan)
        if finding.code == "abutment-eddies-not-in-it" and finding.severity == "note"
    }


def test_dam_heads_that_nothing_allows_for_are_told_of_their_eddies(tidal):
    found = eddies(protected(tidal, local_velocity_factor=1.0))
    assert set(found) == {"protection.sea", "protection.basin"}
    assert all("local_velocity_factor is 1 at main gap, shoal" in message for message in found.values())
    assert set(eddies(protected(tidal, local_velocity_factor=None))) == set(found)


def test_a_sill_with_a_local_velocity_is_told_nothing_and_an_open_gap_is(tidal):
    plan = protected(tidal, local_velocity_factor=1.3, bed_level_m=-9.0)
    assert eddies(changed(plan, crest_level_m=-2.0, relation="broad-crest")) == {}
    open_gap = eddies(changed(plan, crest_level_m=-2.0, relation="open-gap"))
    assert all("no sill in some stage at main gap, shoal" in message for message in open_gap.values())
    # A crest of -9 m stands over no bed, one of -5 m not over that of the shoal on the basin side, its own -3 m.
    low = eddies(changed(plan, crest_level_m=-9.0, relation="broad-crest"))
    assert set(low) == {"protection.sea", "protection.basin"}
    between = eddies(changed(plan, crest_level_m=-5.0, relation="broad-crest"))
    assert list(between) == ["protection.basin"]
    assert "at shoal:" in between["protection.basin"]
