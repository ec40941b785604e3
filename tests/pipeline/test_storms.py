"""Load cases from end to end: more of the same water, a closed form, and what is refused."""

import numpy as np
import pytest

from tidescour import pipeline
from tidescour.bed.water import submerged_relative_density
from tidescour.errors import DomainError, PlanError, RecordError
from tidescour.pipeline.inputs import tidal_inputs
from tidescour.pipeline.places import place_result, surface_beds
from tidescour.pipeline.preparing import cases_of, given_series, stage_flows, waters_of
from tidescour.pipeline.storms import load_cases
from tidescour.plan.loader import read_plan
from tidescour.scour.laws import LAWS
from tidescour.units import utc_text

AFTER_WIDE = '[[load_case]]\nname = "storm of ten years"\nstage = "wide"\nseries = "storm"\n'
STORM_DAYS = 16.0 - 1.0 / 24.0
TIDE = "M2,1.4,40\nS2,0.4,80"


def silent(step):
    pass


def waters_and_flows(plan):
    waters = waters_of(plan, tidal_inputs(plan), given_series(plan))
    return waters, stage_flows(plan, waters, silent)


def stormed(plan):
    """Load cases of a plan, by side of the one opening, and the results as planned."""
    waters, flows = waters_and_flows(plan)
    law = LAWS["explicit"].function(submerged_relative_density(10.0, 30.0, 2650.0))
    cases = cases_of(plan, law, flows)
    beds = surface_beds(cases)
    results = [place_result(case, beds[case.place.opening, case.place.side]) for case in cases]
    found = load_cases(plan, waters, flows, cases, results)
    return {row.side: row for row in found.rows}, found.findings, {each.place.side: each for each in results}


def write_storm(plan, time_s, level_m):
    rows = (f"{utc_text(at)},{level:.9f}" for at, level in zip(time_s, level_m, strict=True))
    (plan.folder / "storm.csv").write_text("time,level_m\n" + "\n".join(rows) + "\n", encoding="utf-8")


def test_more_of_the_same_water_adds_its_time_and_nothing_else(make_plan, wide, narrow, river_depth):
    rows, findings, results = stormed(make_plan(wide, narrow, more=AFTER_WIDE))
    row = rows["sea"]
    assert row.depth_before_m == results["sea"].rows[0].chain[0].end_depth_m
    assert row.depth_after_m == pytest.approx(river_depth({"wide": 6.0 + STORM_DAYS, "narrow": 0.0}), rel=2e-3)
    assert row.final_depth_m == pytest.approx(river_depth({"wide": 6.0 + STORM_DAYS, "narrow": 8.0}), rel=2e-3)
    # Behind a given alpha the length is the slope times the depth.
    assert row.length_required_after_m == pytest.approx(8.0 * row.depth_after_m, rel=1e-6)
    assert row.length_required_final_m == pytest.approx(8.0 * row.final_depth_m, rel=1e-6)
    assert row.depth_allowed_m == 90.0 / 8.0
    assert row.highest_sea_level_m == pytest.approx(0.1)
    # Discharge over width times depth: 10.1 m at the end of the protection, 6.1 m over the drowned crest.
    assert row.peak_end_velocity_m_s == pytest.approx(3000.0 / 300.0 / 10.1, rel=1e-4)
    assert row.peak_gap_velocity_m_s == pytest.approx(3000.0 / 300.0 / 6.1, rel=1e-4)
    assert row.end_s - row.start_s == STORM_DAYS * 86400.0
    assert utc_text(row.start_s) == "2027-04-07T00:00:00Z"
    assert (rows["basin"].peak_end_velocity_m_s, rows["basin"].depth_after_m) == (0.0, 0.0)
    assert not {"load-case-jump", "load-case-too-deep"} & {finding.code for finding in findings}


def test_a_storm_that_is_the_tide_deepens_as_the_tide_does(make_plan, wide, narrow):
    longer = make_plan({**wide, "end": "04-10"}, river=0.0, tide=TIDE)
    flow = waters_and_flows(longer)[1][0]
    tail = flow.time_s >= flow.time_s[0] + 6.0 * 86400.0 - 1.0
    plan = make_plan(wide, narrow, river=0.0, tide=TIDE, more=AFTER_WIDE)
    # On another clock: it is moved to where the stage ends.
    write_storm(plan, flow.time_s[tail] - 5e8, flow.level_sea_m[tail])
    rows, findings, _ = stormed(plan)
    for side, longer_result in stormed(longer)[2].items():
        assert rows[side].depth_after_m == pytest.approx(longer_result.rows[0].chain[0].end_depth_m, rel=1e-6)
        assert rows[side].depth_after_m > rows[side].depth_before_m
    assert "load-case-jump" not in {finding.code for finding in findings}


def test_a_storm_runs_over_the_crest_at_the_end_of_its_stage(make_plan, wide, narrow):
    raised = make_plan(wide, narrow, more=AFTER_WIDE)
    stage = raised.stage[0]
    lifted = stage.opening[0].model_copy(update={"crest_level_end_m": -5.0, "width_end_m": 280.0})
    raised = raised.model_copy(update={"stage": (stage.model_copy(update={"opening": (lifted,)}), raised.stage[1])})
    row = stormed(raised)[0]["sea"]
    assert row.peak_gap_velocity_m_s == pytest.approx(3000.0 / 280.0 / 5.1, rel=1e-3)
    assert row.peak_end_velocity_m_s == pytest.approx(3000.0 / 280.0 / 10.1, rel=1e-3)


def test_a_surge_is_told_where_it_jumps_and_where_the_hole_outgrows_its_length(make_plan, wide, narrow):
    plan = make_plan(wide, narrow, river=0.0, tide=TIDE, more=AFTER_WIDE)
    hours = np.arange(49.0)
    write_storm(plan, 1.0e9 + 3600.0 * hours, 3.0 + 2.0 * np.sin(2.0 * np.pi * hours / 12.0))
    rows, findings, results = stormed(plan)
    assert rows["basin"].highest_sea_level_m == pytest.approx(5.0, abs=0.01)
    assert rows["basin"].final_depth_m > results["basin"].rows[-1].chain[0].end_depth_m
    jump = next(finding for finding in findings if finding.code == "load-case-jump")
    assert "begins with the sea at 3.00 m" in jump.message
    # The table of the basin ends at 3 m.
    assert "basin-level-range" in {finding.code for finding in findings}
    assert "hole-deeper-than-evidence" not in {finding.code for finding in findings}
    short = plan.model_copy(
        update={
            "protection": plan.protection.model_copy(
                update={"basin": plan.protection.basin.model_copy(update={"length_m": 30.0})}
            )
        }
    )
    told = [finding for finding in stormed(short)[1] if finding.code == "load-case-too-deep"]
    assert [finding.where for finding in told] == [
        "load case 'storm of ten years', opening 'gap', basin side",
    ]
    assert "3.75 m are all that the given length allows" in told[0].message


def test_refusals_name_the_load_case(make_plan, wide, narrow):
    plan = make_plan(wide, narrow, more=AFTER_WIDE)
    waters, flows = waters_and_flows(plan)
    named = "load case 'storm of ten years' after stage 'wide': "
    with pytest.raises(PlanError, match=f"^{named}the basin is routed through a storm: write .basin."):
        load_cases(plan.model_copy(update={"basin": None}), waters, flows, (), ())
    given = plan.stage[0].opening[0].model_copy(update={"relation": None, "discharge_series": "river"})
    stages = (plan.stage[0].model_copy(update={"opening": (given,)}), plan.stage[1])
    with pytest.raises(PlanError, match=f"^{named}the flow of opening 'gap' is given"):
        load_cases(plan.model_copy(update={"stage": stages}), waters, flows, (), ())
    write_storm(plan, 1e9 + np.array([0.0, 1800.0]), np.zeros(2))
    with pytest.raises(PlanError, match=f"^{named}series 'storm' holds less than an hour"):
        stormed(plan)
    write_storm(plan, 1e9 + 3600.0 * np.array([0.0, 1.0, 5.0]), np.zeros(3))
    with pytest.raises(RecordError, match=f"^{named}.*a hole of 4 h"):
        stormed(plan)


def test_alpha_out_of_range_in_the_storm_alone_is_refused_with_its_name(make_plan, wide, narrow):
    plan = make_plan(wide, narrow, more=AFTER_WIDE)
    path = plan.folder / "plan.toml"
    text = path.read_text(encoding="utf-8").replace("alpha = 2.4", "chezy_m05_s = 40.0").replace("-6.0", "-2.2")
    path.write_text(text, encoding="utf-8")
    hours = np.arange(49.0)
    write_storm(plan, 1e9 + 3600.0 * hours, np.full(49, -1.0))
    # The sill stands 7.8 m over a bed with 10.1 m of water, but 9.0 m in the storm.
    with pytest.raises(DomainError, match=r"^load case 'storm of ten years' after stage 'wide': .*alpha"):
        stormed(read_plan(path, pipeline.plan_choices()))


def test_a_hole_that_a_storm_makes_deeper_than_the_evidence_is_told(make_plan, wide, narrow):
    # A steady river of the triple through a storm of sixteen days: E = 2.4 x 2.97 - 0.42 m/s.
    findings = stormed(make_plan(wide, narrow, river=9000.0, more=AFTER_WIDE))[1]
    (deep,) = (finding for finding in findings if finding.code == "hole-deeper-than-evidence")
    assert "in stage 'load case storm of ten years'" in deep.message
    assert deep.severity == "error"
