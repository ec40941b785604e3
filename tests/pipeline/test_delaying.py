"""Delays from end to end: a steady river with a closed form, a tide against a plan with other dates, refusals."""

import numpy as np
import pytest

from tidescour.bed.water import submerged_relative_density
from tidescour.pipeline.delaying import delay
from tidescour.pipeline.inputs import tidal_inputs
from tidescour.pipeline.places import rows_at
from tidescour.pipeline.preparing import cases_of, given_series, stage_flows, waters_of
from tidescour.scour.chain import final_depth
from tidescour.scour.laws import LAWS
from tidescour.scour.length import chained, minimum_length, required_length

DAYS = {"wide": 6.0, "narrow": 8.0}
TIDE = "M2,1.4,40\nS2,0.4,80"


def by_place(study, side):
    return {(row.stage, row.weeks_late): row for row in study.rows if row.side == side}


def test_a_longer_stay_under_a_steady_river_follows_the_power_law(make_plan, wide, narrow, river_depth):
    study = delay(make_plan(wide, narrow), (0, 1, 3))
    planned = river_depth(DAYS)
    sea = next(each for each in study.places if each.place.side == "sea")
    assert sea.final_depth_m == pytest.approx(planned, rel=2e-3)
    rows = by_place(study, "sea")
    for name in DAYS:
        for weeks in (1, 3):
            extra = river_depth({**DAYS, name: DAYS[name] + 7.0 * weeks}) - planned
            row = rows[name, weeks]
            assert row.own_stay.depth_m == pytest.approx(extra, rel=5e-3)
            # A river knows no calendar, and behind a given alpha the length is the slope times the depth.
            assert row.calendar.depth_m == pytest.approx(row.own_stay.depth_m, rel=1e-3)
            assert row.own_stay.length_m == pytest.approx(8.0 * row.own_stay.depth_m, rel=1e-5)
        # Growth bends: three weeks cost less than three times one.
        assert rows[name, 3].own_stay.depth_m < 3.0 * rows[name, 1].own_stay.depth_m
        # No delay, no change.
        assert rows[name, 0].own_stay.depth_m == pytest.approx(0.0, abs=1e-9)
        assert rows[name, 0].calendar.length_m == pytest.approx(0.0, abs=1e-5)
    assert rows["narrow", 1].own_stay.depth_m > rows["wide", 1].own_stay.depth_m
    still = by_place(study, "basin")["narrow", 3]
    assert (still.own_stay.depth_m, still.own_stay.length_m) == (0.0, 0.0)


def outcomes(plan):
    """Final depth and required length at each side of a plan, by the steps of a run."""
    waters = waters_of(plan, tidal_inputs(plan), given_series(plan))
    law = LAWS["explicit"].function(submerged_relative_density(10.0, 30.0, 2650.0))
    cases = cases_of(plan, law, stage_flows(plan, waters, lambda step: None))
    found = {}
    for case in cases:
        least_m = minimum_length([visit.flow for visit in case.visits], case.place)
        required = required_length(
            case.place, least_m, lambda length, case=case: rows_at(case, length), law, "integral"
        )
        depth_m = final_depth(chained(case.place, rows_at(case), law, "integral"), 0.0)
        found[case.place.side] = np.array([depth_m, required.length_m])
    return found


def test_a_delay_on_the_calendar_is_a_plan_with_other_dates(make_plan, wide, narrow):
    # Alpha from sill and length, so that the required length changes it.
    tidal = {"river": 0.0, "tide": TIDE, "alpha": "chezy_m05_s = 40.0"}
    expected = outcomes(make_plan({**wide, "end": "04-14"}, {**narrow, "start": "04-14", "end": "04-22"}, **tidal))
    plan = make_plan(wide, narrow, **tidal)
    planned = outcomes(plan)
    study = delay(plan, (1,))
    for each in study.places:
        side = each.place.side
        assert [each.final_depth_m, each.required_length_m] == pytest.approx(planned[side], rel=1e-12)
        row = by_place(study, side)["wide", 1]
        depth_m, length_m = expected[side] - planned[side]
        assert row.calendar.depth_m == pytest.approx(depth_m, abs=1e-9)
        assert row.calendar.length_m == pytest.approx(length_m, abs=0.005)
        assert abs(length_m) > 0.2
        # Spring and neap have moved under the second stage.
        assert abs(row.calendar.depth_m - row.own_stay.depth_m) > 0.02
        last = by_place(study, side)["narrow", 1]
        assert last.calendar == last.own_stay
    assert [f.code for f in study.findings].count("delay-on-the-calendar") == 1


def test_stages_bound_to_a_series_are_not_moved_and_named(make_plan, wide, narrow):
    # The series is level, so that water runs in no stage but the tidal one.
    bound = {**narrow, "sea": "storm"}
    study = delay(make_plan(wide, bound, river=0.0, tide=TIDE), (1,))
    rows = by_place(study, "basin")
    assert set(rows) == {("wide", 1)}
    assert rows["wide", 1].own_stay.depth_m > 0.0
    assert np.isnan([rows["wide", 1].calendar.depth_m, rows["wide", 1].calendar.length_m]).all()
    told = {f.where: f.message for f in study.findings if f.code == "delay-not-computed"}
    assert told["stage 'narrow'"].startswith("it takes its water from series 'storm'")
    assert "stage 'narrow' after it takes its water from series 'storm'" in told["stage 'wide'"]


def test_a_delay_without_a_result_is_told_and_left_empty(make_plan, wide, narrow):
    river = '[[basin.inflow]]\nname = "river"\nseries = "river"\n[series.river]\nfile = "river.csv"\n'
    river += 'quantity = "discharge"\nvalue = "discharge_m3_s"\nunit = "m3/s"\nutc_offset = "+00:00"\n'
    plan = make_plan(wide, narrow, river=0.0)
    rows = (f"2027-04-{day:02d}T{hour:02d}:00:00Z,3000" for day in range(1, 16) for hour in range(24))
    (plan.folder / "river.csv").write_text("time,discharge_m3_s\n" + "\n".join(rows) + "\n", encoding="utf-8")
    study = delay(make_plan(wide, narrow, river=0.0, more=river), (1,))
    told = [f for f in study.findings if f.code == "delay-without-result"]
    assert {f.where for f in told} == {"stage 'wide', 1 week late", "stage 'narrow', 1 week late"}
    assert "does not cover stage 'narrow'" in told[0].message
    # The wide stage alone can stay for a week more; the narrow one, or what follows, is beyond the series.
    rows = by_place(study, "sea")
    assert rows["wide", 1].own_stay.depth_m > 0.0
    assert np.isnan([rows["wide", 1].calendar.depth_m, rows["narrow", 1].own_stay.depth_m]).all()
