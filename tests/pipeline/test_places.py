"""Places of a steady river: the day a length is reached, margins in every length, given references in layers."""

from datetime import datetime

import pytest

from tidescour.bed.water import submerged_relative_density
from tidescour.errors import DomainError
from tidescour.pipeline.delaying import delay
from tidescour.pipeline.inputs import tidal_inputs
from tidescour.pipeline.preparing import given_series, waters_of
from tidescour.pipeline.storms import load_cases
from tidescour.units import seconds_since_epoch

ALPHA, WATER_M, SLOPE = 2.4, 10.1, 8.0
AFTER_WIDE = '[[load_case]]\nname = "storm"\nstage = "wide"\nseries = "storm"\n'
STORM_DAYS = 16.0 - 1.0 / 24.0
WIDE_U, NARROW_U = 3000.0 / (300.0 * WATER_M), 3000.0 / (240.0 * WATER_M)


def rate(velocity, critical=0.42):
    """Gain of h^2.5 per day by the explicit law."""
    density = submerged_relative_density(10.0, 30.0, 2650.0)
    return 24.0 * ((ALPHA * velocity - critical) ** 1.7 * WATER_M**0.2 / (10.0 * density**0.7)) ** 2.5


def with_margin(margin):
    return f"alpha = {ALPHA}\ndepth_margin_factor = {margin}"


def test_the_day_on_which_the_length_is_reached_counts_with_the_margin(make_plan, wide, narrow, outcome, reread):
    make_plan(wide, narrow, alpha=with_margin(2.0))
    _, result = outcome(reread(("length_m = 90.0", "length_m = 64.0")))["sea"]
    # 64 m at 1 in 8 with a margin of 2 allow 4 m: h^2.5 = 32.
    days = (32.0 - 6.0 * rate(WIDE_U)) / rate(NARROW_U)
    assert 2.0 < days < 7.0
    begin_s = seconds_since_epoch(datetime.fromisoformat("2027-04-07T00:00:00Z"))
    assert result.length_reached_s == pytest.approx(begin_s + 86400.0 * days, abs=2.0 * 3600.0)


def test_a_storm_and_a_delay_are_designed_with_the_margin(make_plan, wide, narrow, outcome, river_depth):
    plan = make_plan(wide, narrow, alpha=with_margin(1.3), more=AFTER_WIDE)
    case, result = outcome(plan)["sea"]
    waters = waters_of(plan, tidal_inputs(plan), given_series(plan))
    (row,) = load_cases(plan, waters, [visit.flow for visit in case.visits], [case], [result]).rows
    assert row.depth_allowed_m == pytest.approx(90.0 / (SLOPE * 1.3), rel=1e-12)
    for length_m, days in (
        (row.length_required_after_m, {"wide": 6.0 + STORM_DAYS, "narrow": 0.0}),
        (row.length_required_final_m, {"wide": 6.0 + STORM_DAYS, "narrow": 8.0}),
    ):
        assert length_m == pytest.approx(SLOPE * 1.3 * river_depth(days), rel=2e-3)
    study = delay(plan, (2,))
    planned_m = river_depth({"wide": 6.0, "narrow": 8.0})
    place = next(each for each in study.places if each.place.side == "sea")
    assert place.required_length_m == pytest.approx(SLOPE * 1.3 * planned_m, rel=2e-3)
    late = next(each for each in study.rows if (each.stage, each.side) == ("wide", "sea"))
    extra_m = river_depth({"wide": 20.0, "narrow": 8.0}) - planned_m
    for each in (late.own_stay, late.calendar):
        assert each.length_m == pytest.approx(SLOPE * 1.3 * extra_m, rel=5e-3)


def layer(name, top_level_m, critical):
    return f'[[bed.layer]]\nname = "{name}"\ntop_level_m = {top_level_m}\ncritical_velocity_m_s = {critical}\n'


REFERENCE = "[scour]\nreference_velocity_m_s = 0.5\n"
"""Alpha times it is 1.2 m/s."""


def starting(depth_m):
    return f"alpha = {ALPHA}\nstart_depth_m = {depth_m}"


def test_a_given_reference_serves_in_every_layer_whose_threshold_it_passes(make_plan, wide, outcome):
    more = layer("gravel", -11.0, 1.5) + layer("silt", -16.0, 0.3) + REFERENCE
    (row,) = outcome(make_plan(wide, more=more))["sea"][1].rows
    # The gravel is met in this stage, not at its start: it has its own peak, and the silt under it the reference.
    assert [each.layer for each in row.chain[0].reached] == [1]
    found = [each.reference_velocity_m_s for each in row.durations.layers]
    assert found == [0.5, pytest.approx(WIDE_U, rel=1e-3), 0.5]
    # Hours of the reference: (E / E_ref)^(1.7 / 0.4) for each of the stage.
    for each, critical in ((row.durations.layers[0], 0.42), (row.durations.layers[2], 0.3)):
        share = ((ALPHA * WIDE_U - critical) / (ALPHA * 0.5 - critical)) ** 4.25
        assert each.total_h("integral") == pytest.approx(6.0 * 24.0 * share, rel=1e-2)


def test_a_surface_that_no_hole_is_in_does_not_refuse_a_reference(make_plan, reread, wide, outcome):
    make_plan(wide, alpha=starting(1.0), more=layer("silt", -11.0, 0.3) + REFERENCE)
    (row,) = outcome(reread(("critical_velocity_m_s = 0.42", "critical_velocity_m_s = 1.5")))["sea"][1].rows
    assert (row.chain[0].layer, row.duration.reference_velocity_m_s) == (1, 0.5)
    grown_m = (1.0 + 6.0 * rate(WIDE_U, 0.3)) ** 0.4
    assert row.chain[0].end_depth_m == pytest.approx(grown_m, rel=2e-3)


REFUSED = (
    "^stage '{stage}', opening 'gap', sea side: scour.reference_velocity_m_s = 0.5 times alpha = 2.400 does not pass "
    "the critical velocity of 1.500 m/s; write more than 0.625"
)


@pytest.mark.parametrize(("start_depth_m", "stage"), [(1.0, "wide"), (0.99, "narrow")])
def test_a_given_reference_is_refused_in_a_layer_in_which_a_stage_starts(
    make_plan, wide, narrow, outcome, start_depth_m, stage
):
    plan = make_plan(wide, narrow, alpha=starting(start_depth_m), more=layer("gravel", -11.0, 1.5) + REFERENCE)
    with pytest.raises(DomainError, match=REFUSED.format(stage=stage)):
        outcome(plan)
