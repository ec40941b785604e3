"""Findings where an opening leaves the range of its geometry and relation."""

import numpy as np
import pytest

from tidescour.gap.limits import limit_findings
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models import Basin, Opening, Stage

PERIOD_S = 44712.0
START_S = 1806537600.0  # 2027-04-01T00:00:00Z
TIMES = START_S + np.arange(6 * 44712 // 8 + 1) * 8.0
SINE = np.sin(2.0 * np.pi / PERIOD_S * (TIMES - START_S))
"""Highest after a quarter of the period, 11178 s: 03:06:18Z."""

VALLEY = ((0.0, 4.0), (20.0, -6.0), (40.0, 4.0))
BREACH = ((0.0, 1.5), (4.0, -2.0), (10.0, -2.0), (12.0, 0.5), (20.0, 0.8))


def opening(name="gap", **changes):
    values = {"name": name, "crest_level_m": -6.0, "width_m": 100.0, "relation": "broad-crest"}
    return Opening.model_validate({**values, "parameters": {"coefficient": 0.95}, **changes})


def surveyed(points, crest=None, **changes):
    lowest = min(level for _, level in points) if crest is None else crest
    return opening(profile="valley.csv", profile_points=points, crest_level_m=lowest, width_m=None, **changes)


def through(planned, discharge=0.0, sea=SINE, **changes):
    end = planned.crest_level_m if planned.crest_level_end_m is None else planned.crest_level_end_m
    values = {
        "level_sea_m": sea,
        "crest_level_m": np.linspace(planned.crest_level_m, end, TIMES.size),
        "width_m": np.full(TIMES.size, 100.0),
        "discharge_m3_s": np.broadcast_to(discharge, TIMES.shape),
        "gap_velocity_m_s": np.zeros(TIMES.size),
        "flow_width_m": np.full(TIMES.size, 100.0),
    }
    return OpeningFlow(name=planned.name, **{**values, **changes})


def findings(planned, discharge=0.0, covered=None, side=False, **changes):
    """Return the findings of one opening, in a stage or beside its gap; the basin has half the tide."""
    main = opening("main") if side else planned
    stage = Stage.model_validate(
        {"name": "first", "start": "2027-04-01T00:00:00Z", "end": "2027-04-04T02:31:12Z", "opening": [main]}
    )
    found = StageFlow(
        stage="first",
        time_s=TIMES,
        level_sea_m=SINE,
        level_basin_m=0.5 * SINE,
        covered=np.ones(TIMES.size, dtype=bool) if covered is None else covered,
        measured=False,
        routed=False,
        openings=(through(main) if side else through(planned, discharge, **changes),),
        side_openings=(through(planned, discharge, **changes),) if side else (),
        inflow_m3_s=np.zeros(TIMES.size),
    )
    return limit_findings(stage, found, Basin(side_opening=(planned,)) if side else None, ())


def test_an_opening_inside_all_limits_has_no_findings():
    assert findings(opening()) == ()
    assert findings(opening("beside"), side=True) == ()


# Surveyed profiles


@pytest.mark.parametrize("relation", ["broad-crest", "narrow-crest"])
def test_strips_give_more_than_a_triangle_as_one(relation):
    # 1.36392 against 1.26778 times slope and energy^2.5: 2/3 sqrt(2 g / 3) H^1.5 over both slopes against the
    # critical triangle, 0.64 sqrt(0.4 g): 7.6 %. Derived from the energy equation.
    (finding,) = findings(surveyed(VALLEY, relation=relation))
    assert (finding.severity, finding.code) == ("note", "profile-as-one")
    assert finding.where == "stage 'first', opening 'gap'"
    assert "7.6 % more at the highest level met, 1.00 m" in finding.message


def test_strips_give_more_than_a_trapezoid_as_one():
    # 20 m wide at -2 m, 1 in 2, 3 m of energy: 219.70 against 213.55 m3/s, 2.9 %.
    trapezoid = ((0.0, 2.0), (8.0, -2.0), (28.0, -2.0), (36.0, 2.0))
    (finding,) = findings(surveyed(trapezoid))
    assert "2.9 % more" in finding.message
    # The same one that is a triangle filled to -2 m.
    filled = ((0.0, 2.0), (18.0, -7.0), (36.0, 2.0))
    assert findings(surveyed(filled, crest=-2.0)) == (finding,)


def test_strips_say_nothing_of_a_relation_without_a_control_depth():
    assert findings(surveyed(VALLEY, relation="orifice", parameters={"height_m": 2.0, "coefficient": 0.9})) == ()
    assert findings(surveyed(VALLEY, crest=1.5)) == ()


def test_water_over_an_end_of_a_profile_is_a_warning():
    finding = findings(surveyed(BREACH))[-1]
    assert (finding.severity, finding.code) == ("warning", "profile-end")
    assert "reaches 1.00 m at 2027-04-01T03:06:" in finding.message
    assert "over its end at 20 m (0.80 m): a vertical wall" in finding.message
    low = tuple((distance, min(level, 0.7)) for distance, level in BREACH)
    assert (
        "its end at 0 m (0.70 m) and its end at 20 m (0.70 m) and its highest point"
        in findings(surveyed(low))[-1].message
    )


def test_a_wall_that_the_plan_sets_is_no_end_of_the_survey():
    codes = [finding.code for finding in findings(surveyed(BREACH, profile_to_m=20.0))]
    assert codes == ["profile-as-one"]
    codes = [finding.code for finding in findings(surveyed(BREACH, profile_from_m=0.0))]
    assert codes == ["profile-as-one", "profile-end"]


def test_water_in_a_hole_of_the_record_reaches_no_end():
    holed = findings(surveyed(BREACH), covered=SINE < 0.75)
    assert [finding.code for finding in holed] == ["profile-as-one"]


# Overtopping


@pytest.mark.parametrize("side", [False, True])
def test_a_high_crest_that_is_seldom_wet_is_a_note(side):
    # A sine is over 0.88 for acos(0.88) / pi = 15.76 % of the time: 11.74 of 74.52 h.
    discharge = np.where(SINE > 0.88, 100.0 * (SINE - 0.88), 0.0)
    (finding,) = findings(opening("dam", crest_level_m=0.88), discharge, side=side)
    assert (finding.severity, finding.code) == ("note", "overtopping")
    assert "overtopped for 11.7 h (15.8 % of the time), by up to 0.12 m at 2027-04-0" in finding.message
    assert "at most 12 m3/s pass, into the basin, at 2027-04-0" in finding.message
    assert "T03:06:" in finding.message
    (outward,) = findings(opening("dam", crest_level_m=0.88), -discharge, side=side)
    assert "12 m3/s pass, out to sea" in outward.message


@pytest.mark.parametrize("crest", [1.2, 0.5, -0.5])
def test_a_crest_that_is_dry_or_often_wet_is_not_overtopped(crest):
    # A sine is over 0.5 for a third of the time.
    assert findings(opening(crest_level_m=crest), 0.0) == ()


def test_a_crest_under_the_mean_sea_is_a_sill():
    # Wet a tenth of the time, by so much that the sea's mean, 1.1 m, is over the crest.
    surge = np.where(np.arange(TIMES.size) < 0.1 * TIMES.size, 20.0, -1.0)
    assert findings(opening(crest_level_m=0.8), sea=surge) == ()
    assert [each.code for each in findings(opening(crest_level_m=1.2), sea=surge)] == ["overtopping"]


def test_hours_in_holes_of_the_record_are_not_counted():
    # The first three of six tides: 5.87 of 37.26 h, the same share.
    covered = TIMES <= START_S + 3.0 * PERIOD_S
    (finding,) = findings(opening(crest_level_m=0.88), covered=covered)
    assert "overtopped for 5.9 h (15.8 % of the time)" in finding.message
    assert finding.message.endswith("nothing passes")


def test_a_given_velocity_says_nothing_of_overtopping():
    given = opening(crest_level_m=0.9, relation=None, parameters={}, end_velocity_series="u")
    assert findings(given, np.nan, given=True, given_end_velocity_m_s=np.zeros(TIMES.size)) == ()


# Approach


def approach(coefficient=0.95, **changes):
    parameters = {"coefficient": coefficient, "approach_width_sea_m": 400.0, "approach_bed_sea_m": -8.0, **changes}
    return opening(side_slope=2.0, parameters=parameters)


def test_a_coefficient_over_one_counts_the_approach_twice():
    (finding,) = findings(approach(1.05))
    assert (finding.severity, finding.code, finding.where) == ("warning", "approach-twice", "opening 'gap'")
    assert "coefficient = 1.05 is over 1" in finding.message
    assert findings(approach(1.0)) == ()
    assert findings(opening(parameters={"coefficient": 1.3})) == ()


def test_an_approach_narrower_than_its_opening_is_a_warning():
    # At the highest sea, 1 m, the opening is 100 + 2 x 2 x 7 = 128 m wide; at the highest basin, 0.5 m, 126 m.
    (finding,) = findings(approach(approach_width_sea_m=127.9))
    assert (finding.severity, finding.code) == ("warning", "approach-width")
    assert "approach_width_sea_m = 127.9 m is less than the opening's own 128 m" in finding.message
    assert findings(approach(approach_width_sea_m=128.1)) == ()
    (finding,) = findings(approach(approach_width_basin_m=125.9, approach_bed_basin_m=-8.0))
    assert "less than the opening's own 126 m at the highest basin level, 0.50 m" in finding.message
    assert findings(approach(approach_width_basin_m=126.1, approach_bed_basin_m=-8.0)) == ()


def test_an_approach_is_held_against_the_wider_end_of_the_stage():
    # 140 + 2 x 2 x 7 = 168 m at the end, or the start.
    parameters = {"coefficient": 0.95, "approach_width_sea_m": 150.0, "approach_bed_sea_m": -8.0}
    for widths in ({"width_end_m": 140.0}, {"width_m": 140.0, "width_end_m": 100.0}):
        (finding,) = findings(opening(side_slope=2.0, parameters=parameters, **widths))
        assert "the opening's own 168 m" in finding.message


def test_an_approach_over_the_crest_is_a_warning():
    (finding,) = findings(approach(approach_bed_sea_m=-5.5))
    assert (finding.severity, finding.code) == ("warning", "approach-bed")
    assert "approach_bed_sea_m = -5.5 m stands over the crest, -6 m" in finding.message
    assert findings(approach(approach_bed_sea_m=-6.0)) == ()


# Flaps


@pytest.mark.parametrize("relation", ["ebb-flap", "flood-flap"])
def test_a_flap_says_that_its_head_and_leak_are_inputs(relation):
    given = {"height_m": 2.0, "coefficient": 0.8, "leak": 0.02, "opening_head_m": 0.05}
    (finding,) = findings(opening(relation=relation, parameters=given))
    assert (finding.severity, finding.code, finding.where) == ("note", "flap-inputs", "opening 'gap'")
    assert finding.message.startswith("opening_head_m = 0.05 m and leak = 0.02 of the flap are inputs")
    (finding,) = findings(opening(relation=relation, parameters={"height_m": 2.0, "coefficient": 0.8}), side=True)
    assert finding.message.startswith("opening_head_m = 0 m and leak = 0 of the flap are inputs")
