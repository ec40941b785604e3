from datetime import UTC, datetime, timedelta
from itertools import permutations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError
from tidescour.plan.models import Opening, Stage
from tidescour.scour.chain import chain_place, depth_findings, final_depth, gap_findings, growth_curve
from tidescour.scour.curves import depth_after
from tidescour.scour.laws import LAWS, GrowthLaw
from tidescour.scour.records import RULES
from tidescour.study.spans import rows_between

LAW = LAWS["explicit"].function(1.62)


@pytest.fixture
def three_stages(duration_row):
    """Three stages of steady flow: velocity, hours, alpha (u_c 0.42 m/s, h0 12 m)."""
    return [duration_row(LAW, u, hours, alpha) for u, hours, alpha in ((0.8, 160, 2.2), (1.3, 90, 2.5), (1.9, 25, 2.8))]


def test_three_stages_of_the_example(three_stages):
    # Worked out by separate code by equivalent time: depths, equivalent starts and, in hours of the third stage,
    # 0.64712 + 8.72974 + 25 = 34.37686.
    steps = chain_place(three_stages, LAW, 0.0, "integral")
    assert [s.end_depth_m for s in steps] == pytest.approx([1.46859, 4.27890, 7.19475], abs=5.1e-6)
    assert [s.equivalent_start_h for s in steps] == pytest.approx([0.0, 6.6715, 9.3769], abs=5.1e-5)
    assert [s.share for s in steps] == pytest.approx(
        [0.64712 / 34.37686, 8.72974 / 34.37686, 25.0 / 34.37686], abs=5e-7
    )
    assert [s.start_depth_m for s in steps[1:]] == [s.end_depth_m for s in steps[:-1]]
    assert max(s.stage_depth_m for s in steps) == pytest.approx(6.334, abs=5.1e-4)
    assert sum(s.stage_depth_m for s in steps) == pytest.approx(11.96, abs=5.1e-3)


def test_order_of_stages_is_free_for_a_power_law(three_stages):
    finals = [chain_place(order, LAW, 0.7, "integral")[-1].end_depth_m for order in permutations(three_stages)]
    assert finals == pytest.approx([finals[0]] * 6, rel=1e-12)


def test_order_matters_for_a_saturating_law(duration_row):
    # X: h_e 6 m, tau 50 h; Y: 20 m, 500 h; 100 h of each on h_e (1 - exp(-(t / tau)^0.4)). X alone 4.39640 m, Y alone
    # 8.17251 m; X then Y 8.53215 m; Y then X 8.17251 m, as the hole is deeper than X ever digs. By separate code.
    law = LAWS["saturating"].function(1.6)
    curves = {"X": (6.0, 50.0), "Y": (20.0, 500.0)}

    def row(name):
        deepest, tau_h = curves[name]
        return duration_row(law, 1.5, 100.0, stage=name, rate=deepest**2.5 / tau_h, scale=deepest)

    for order, wanted in (("XY", (4.39640, 8.53215)), ("YX", (8.17251, 8.17251))):
        steps = chain_place([row(name) for name in order], law, 0.0, "integral")
        assert [step.end_depth_m for step in steps] == pytest.approx(wanted, abs=5.1e-6)
    assert np.isnan(steps[1].equivalent_start_h)
    assert steps[1].stage_depth_m == pytest.approx(4.39640, abs=5.1e-6)


def test_order_matters_for_a_model_curve_between_water_depths(duration_row, law_of):
    # One depth of water: the curves differ by their time alone, and any order gives the same. Two depths: not.
    law = law_of("model-curve", 1.62)
    for depths, free in (((12.0, 12.0), True), ((6.0, 16.0), False)):
        rows = [
            duration_row(law, velocity, hours, depth=depth, scale=depth)
            for velocity, hours, depth in zip((0.9, 1.4), (300.0, 40.0), depths, strict=True)
        ]
        one, other = (chain_place(order, law, 0.0, "integral")[-1].end_depth_m for order in (rows, rows[::-1]))
        assert (abs(one / other - 1.0) < 1e-9) == free
        assert abs(one / other - 1.0) < 0.2


def test_order_matters_between_time_exponents():
    # A = 1: exponent 0.38 for 100 h, then 0.40 for 100 h gives 7.97188 m; reversed 7.86322 m, by separate code. One
    # chain has one law, so the depth is handed over.
    def law(exponent):
        return GrowthLaw(
            name="", text="", coefficient=1.0, velocity_exponent=1.7, depth_exponent=0.2, time_exponent=exponent
        )

    def grown(start, exponent):
        return float(depth_after(law(exponent), 1.0, 1.0, start ** (1.0 / exponent) + 100.0))

    assert grown(grown(0.0, 0.38), 0.40) == pytest.approx(7.97188, abs=5.1e-6)
    assert grown(grown(0.0, 0.40), 0.38) == pytest.approx(7.86322, abs=5.1e-6)


@pytest.mark.parametrize("name", LAWS)
@pytest.mark.parametrize("factor", [0.4, 1.3])
def test_a_growth_factor_multiplies_the_depth_from_a_flat_bed(duration_row, law_of, name, factor):
    law = law_of(name, 1.62)
    rows = [
        duration_row(law, u, hours, depth=d, scale=d) for u, hours, d in ((0.8, 160, 9), (1.3, 90, 12), (1.9, 25, 7))
    ]
    plain = chain_place(rows, law, 0.0, "integral")
    scaled = chain_place(rows, law, 0.0, "integral", factor)
    for one, other in zip(plain, scaled, strict=True):
        assert other.end_depth_m == pytest.approx(factor * one.end_depth_m, rel=1e-12)
        assert other.stage_depth_m == pytest.approx(factor * one.stage_depth_m, rel=1e-12)
        assert other.share == one.share
        assert other.equivalent_start_h == pytest.approx(one.equivalent_start_h, rel=1e-9)
    curve = growth_curve(rows, law, 0.0, "integral", factor)
    assert curve.depth_m[-1] == scaled[-1].end_depth_m
    # A hole that is there is measured, and not multiplied: with it the law goes on from depth over factor.
    deep = chain_place(rows, law, factor * 2.0, "integral", factor)[-1].end_depth_m
    assert deep == pytest.approx(factor * chain_place(rows, law, 2.0, "integral")[-1].end_depth_m, rel=1e-12)


def test_a_factor_that_is_not_positive_is_refused(three_stages):
    for function in (chain_place, growth_curve):
        with pytest.raises(DomainError, match="growth_factor = 0 must be positive"):
            function(three_stages, LAW, 0.0, "integral", 0.0)


def test_depth_between_two_moments(duration_row):
    # 40 h of steady flow in one cycle, then 60 h after a pause of 10 h, at one velocity: h^2.5 goes with the hours.
    rows = [
        duration_row(LAW, 1.3, 40.0, stage="a"),
        duration_row(LAW, 1.3, 60.0, stage="b", start=50.0 * 3600.0),
    ]

    def after(hours, start=0.0):
        rate = rows[0].layers[0].growth_rate
        return (start**2.5 + rate * hours) ** 0.4

    def found(depth, begin, end, **more):
        parts = rows_between(rows, 3600.0 * begin, 3600.0 * end)
        return final_depth(chain_place(parts, LAW, depth, "integral", **more), depth)

    assert found(0.0, 0.0, 110.0) == pytest.approx(chain_place(rows, LAW, 0.0, "integral")[-1].end_depth_m, rel=1e-12)
    assert found(0.0, -5.0, 10.0) == pytest.approx(after(10.0), rel=1e-12)
    assert found(1.0, 30.0, 70.0) == pytest.approx(after(30.0, 1.0), rel=1e-12)
    assert found(1.0, 41.0, 49.0) == found(1.0, 30.0, 30.0) == found(1.0, 60.0, 20.0) == found(1.0, 200.0, 300.0) == 1.0
    # In two steps the same as in one; a factor goes with the depth.
    assert found(found(0.5, 3.0, 33.0), 33.0, 80.0) == pytest.approx(found(0.5, 3.0, 80.0), rel=1e-12)
    assert found(1.5, 3.0, 80.0, growth_factor=1.5) == pytest.approx(1.5 * found(1.0, 3.0, 80.0), rel=1e-12)


def test_small_steps_of_equivalent_time_give_the_sum(duration_row):
    # Half a tide of 1.5 m/s in 2000 steps: 1.1476427 m by separate code.
    law = LAWS["explicit"].function(1.65)
    middle = (np.arange(2000) + 0.5) / 2000.0
    rows = [duration_row(law, 1.5 * np.sin(np.pi * x), 6.21 / 2000.0, 2.5, critical=0.45, depth=10.0) for x in middle]
    assert chain_place(rows, law, 0.0, "integral")[-1].end_depth_m == pytest.approx(1.1476427, rel=1e-7)


def test_a_hole_that_is_there_already_grows_on(three_stages):
    deep, weak = three_stages[2], three_stages[0]
    # The depth that 10 h of the stage would have made: 35 h in all.
    start = float(depth_after(LAW, deep.layers[0].reference_excess_m_s, 12.0, 10.0))
    (step,) = chain_place([deep], LAW, start, "integral")
    assert step.equivalent_start_h == pytest.approx(10.0)
    assert step.end_depth_m == pytest.approx(float(depth_after(LAW, deep.layers[0].reference_excess_m_s, 12.0, 35.0)))
    # A weak stage after a deep hole: very long equivalent time, hardly any growth, no digits lost.
    (long,) = chain_place([weak], LAW, 20.0, "integral")
    assert long.equivalent_start_h > 1e5
    # 160 h more than (20 / 0.19287)^2.5 = 109,500 h: 20 (1 + 160 / 109,500)^0.4.
    assert long.end_depth_m == pytest.approx(20.01168, abs=1e-5)


def test_where_nothing_grows_the_depth_stays(duration_row, three_stages):
    still = duration_row(LAW, 0.1, 0.0)
    steps = chain_place([three_stages[1], still, three_stages[2]], LAW, 0.0, "integral")
    assert steps[1].end_depth_m == steps[1].start_depth_m == steps[0].end_depth_m
    assert steps[1].stage_depth_m == steps[1].share == 0.0
    assert np.isnan(steps[1].equivalent_start_h)
    assert np.isnan(chain_place([still], LAW, 0.0, "integral")[0].share)
    assert chain_place([], LAW, 1.0, "integral") == ()
    assert final_depth((), 1.0) == 1.0
    assert final_depth(steps, 1.0) == steps[-1].end_depth_m


@given(st.lists(st.tuples(st.floats(0.3, 2.5), st.floats(0.1, 500.0)), min_size=1, max_size=6), st.floats(0.0, 5.0))
@settings(max_examples=50, deadline=None)
def test_depth_grows_and_lies_between_its_bounds(duration_row, stages, start):
    rows = [duration_row(LAW, u, hours) for u, hours in stages]
    steps = chain_place(rows, LAW, start, "integral")
    final = steps[-1].end_depth_m
    assert all(s.end_depth_m >= s.start_depth_m for s in steps)
    assert max(start, *(s.stage_depth_m for s in steps)) <= final * (1.0 + 1e-12)
    assert final <= (start + sum(s.stage_depth_m for s in steps)) * (1.0 + 1e-12)
    assert sum(s.share for s in steps) == pytest.approx(1.0)


def test_rules_read_their_own_hours(three_stages):
    shares = {"integral": 1.0, "flow-mean": 0.5, "cycle-mean": 0.25, "peak-held": 2.0, "mean-held": 0.75}
    assert tuple(shares) == RULES
    for rule, share in shares.items():
        assert three_stages[0].layers[0].hours(rule).tolist() == [160.0 * share]
        assert three_stages[0].layers[0].total_h(rule) == 160.0 * share
        final = chain_place(three_stages, LAW, 0.0, rule)[-1].end_depth_m
        assert final == pytest.approx(7.19475 * share**0.4, abs=1e-5)


def test_growth_curve_meets_the_chain_at_the_ends_of_stages(duration_row):
    rows = [
        duration_row(LAW, 0.8, 160.0, 2.2, stage="one", start=0.0),
        duration_row(LAW, 1.3, 90.0, 2.5, stage="two", start=160.0 * 3600.0),
    ]
    curve = growth_curve(rows, LAW, 0.5, "flow-mean")
    steps = chain_place(rows, LAW, 0.5, "flow-mean")
    np.testing.assert_allclose(curve.depth_m, [0.5, *(s.end_depth_m for s in steps)], rtol=1e-12)
    np.testing.assert_allclose(curve.time_s, np.array([0.0, 160.0, 250.0]) * 3600.0)
    assert curve.stage == ("one", "one", "two")
    assert growth_curve([], LAW, 0.5, "integral").time_s.size == 0


def test_the_curve_is_level_between_stages_that_do_not_touch(duration_row):
    rows = [duration_row(LAW, 1.5, 10.0, stage="a"), duration_row(LAW, 1.8, 5.0, stage="b", start=1e6)]
    curve = growth_curve(rows, LAW, 0.5, "integral")
    np.testing.assert_allclose(curve.time_s, [0.0, 36000.0, 1e6, 1e6 + 18000.0])
    assert curve.depth_m[1] == pytest.approx(curve.depth_m[2], rel=1e-12)
    assert curve.depth_m[0] == pytest.approx(0.5)
    assert curve.depth_m[3] > curve.depth_m[2] > curve.depth_m[0]
    assert curve.stage == ("a", "a", "b", "b")
    touching = [rows[0], duration_row(LAW, 1.8, 5.0, stage="b", start=36000.0)]
    assert growth_curve(touching, LAW, 0.5, "integral").time_s.size == 3


def test_a_negative_start_is_refused(three_stages):
    for function in (chain_place, growth_curve):
        with pytest.raises(DomainError, match="start_depth_m = -1 must not be negative"):
            function(three_stages, LAW, -1.0, "integral")


@pytest.mark.parametrize(("share", "severity"), [(1.49, None), (1.51, "warning"), (2.01, "error")])
def test_a_hole_beyond_the_evidence_is_told_once(duration_row, share, severity):
    hours = (share * 12.0 / float(depth_after(LAW, 2.5 * 1.5 - 0.42, 12.0, 1.0))) ** 2.5
    rows = [duration_row(LAW, 1.5, 0.4 * hours, stage="one"), duration_row(LAW, 1.5, 0.6 * hours, stage="two")]
    findings = depth_findings(rows, chain_place(rows, LAW, 0.0, "integral"))
    assert [f.severity for f in findings] == ([severity] if severity else [])
    assert all("in stage 'two'" in f.message and f"{share:.2f} times" in f.message for f in findings)


def test_a_deep_hole_is_told_also_where_nothing_grows(duration_row):
    rows = [duration_row(LAW, 0.1, 0.0)]
    assert [f.severity for f in depth_findings(rows, chain_place(rows, LAW, 40.0, "integral"))] == ["error"]
    assert not depth_findings(rows, chain_place(rows, LAW, 10.0, "integral"))


def test_time_between_stages_is_told():
    opening = (Opening(name="main gap", crest_level_m=-6.0, width_m=400.0),)
    start = datetime(2027, 4, 1, tzinfo=UTC)
    days = [start + timedelta(days=d) for d in (0, 10, 10, 20, 21, 30)]
    stages = [
        Stage(name=name, start=a, end=b, opening=opening)
        for name, a, b in zip("abc", days[::2], days[1::2], strict=True)
    ]
    (finding,) = gap_findings(stages)
    assert (finding.severity, finding.where) == ("warning", "stage 'c'")
    assert "24.0 h lie between the end of stage 'b' at 2027-04-21T00:00:00Z" in finding.message
