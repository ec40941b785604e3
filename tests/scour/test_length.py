import numpy as np
import pytest

from tidescour.bed.alpha import alpha_factor, relative_turbulence
from tidescour.errors import DomainError
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.scour.curves import depth_after
from tidescour.scour.laws import LAWS
from tidescour.scour.length import (
    length_curve,
    minimum_length,
    nearby_length,
    required_length,
    slope_length,
    time_reached,
)
from tidescour.scour.records import GrowthCurve

LAW = LAWS["explicit"].function(1.62)
SILL = np.array([3.0])


def alpha_at(length, roughness_factor=None):
    """Sill 3 m, depth 12 m, Chezy 45."""
    if roughness_factor is None:
        return float(alpha_factor(SILL, 12.0, length, 45.0)[0])
    return float(1.5 + 5.0 * roughness_factor * relative_turbulence(SILL, 12.0, length, 45.0)[0])


def depth_behind(alpha):
    return float(depth_after(LAW, alpha * 1.6 - 0.42, 12.0, 200.0))


@pytest.mark.parametrize(
    ("slope", "length", "alpha", "depth"),
    [(6.0, 48.8051, 2.43762, 8.13418), (10.0, 76.1277, 2.35449, 7.61277), (15.0, 107.9710, 2.28668, 7.19807)],
)
def test_length_of_the_example_without_the_roughness_factor(slope, length, alpha, depth):
    # u 1.6, u_c 0.42 m/s, 200 h, fixed point by separate code.
    found = slope_length(lambda x: depth_behind(alpha_at(x, 1.0)), slope, 18.0)
    assert found == pytest.approx(length, abs=5.1e-5)
    assert alpha_at(found, 1.0) == pytest.approx(alpha, abs=5.1e-6)
    assert depth_behind(alpha_at(found, 1.0)) == pytest.approx(depth, abs=5.1e-6)


def test_length_of_the_example_with_the_roughness_factor():
    # f_C = 45 / 40: 81.845 m, 8.1845 m by separate code.
    found = slope_length(lambda x: depth_behind(alpha_at(x)), 10.0, 18.0)
    assert found == pytest.approx(81.845, abs=5.1e-4)
    assert depth_behind(alpha_at(found)) == pytest.approx(8.1845, abs=5.1e-5)


def test_where_the_depth_does_not_depend_on_the_length_it_is_slope_times_depth():
    assert slope_length(lambda _: 7.0, 6.0, 18.0) == pytest.approx(42.0, abs=1e-6)
    assert slope_length(lambda _: 14.0, 6.0, 18.0) == pytest.approx(84.0, abs=1e-6)
    assert slope_length(lambda _: 7.0, 12.0, 0.0) == pytest.approx(84.0, abs=1e-6)


@pytest.mark.parametrize("depth", [0.0, 2.9, 3.0])
def test_the_minimum_stands_where_the_slope_asks_for_no_more(depth):
    assert slope_length(lambda _: depth, 6.0, 18.0) == 18.0


def test_no_length_without_scour_and_sill():
    assert slope_length(lambda _: 0.0, 6.0, 0.0) == 0.0


def test_a_depth_that_rises_with_the_length_is_refused():
    with pytest.raises(DomainError, match="rises with the length"):
        slope_length(lambda length: 1.0 + length, 6.0, 18.0)


@pytest.mark.parametrize(("slope", "minimum"), [(0.0, 18.0), (6.0, -1.0)])
def test_slope_and_minimum_must_make_sense(slope, minimum):
    with pytest.raises(DomainError, match="must be positive"):
        slope_length(lambda _: 1.0, slope, minimum)


def stage(name, crests, discharges, covered=None):
    n = len(crests)
    opening = OpeningFlow(
        name="main gap",
        level_sea_m=np.zeros(n),
        crest_level_m=crests,
        width_m=np.full(n, 400.0),
        discharge_m3_s=discharges,
        gap_velocity_m_s=np.ones(n),
        flow_width_m=np.full(n, 400.0),
    )
    return StageFlow(
        stage=name,
        time_s=60.0 * np.arange(n),
        level_sea_m=np.zeros(n),
        level_basin_m=np.zeros(n),
        covered=np.ones(n, dtype=bool) if covered is None else covered,
        measured=False,
        routed=False,
        openings=(opening,),
        inflow_m3_s=np.zeros(n),
    )


def test_the_minimum_is_six_times_the_highest_sill_with_flow(place):
    flows = [
        stage("a", [-7.0, -6.0, -5.0, -4.0], [1.0, 1.0, -1.0, 0.0]),
        stage("b", [-8.0, -8.0, -1.0], [1.0, -1.0, 1.0], covered=np.array([True, True, False])),
    ]
    # Bed at -9: flow to the basin over a crest of up to -6, to the sea over up to -5.
    assert minimum_length(flows, place()) == 18.0
    assert minimum_length(flows, place(side="sea")) == 24.0
    assert minimum_length(flows, place(bed_level_m=-3.0)) == 0.0
    assert minimum_length(flows, place(opening="shoal")) == 0.0
    assert minimum_length([], place()) == 0.0


def test_required_length_of_a_place(place, duration_row):
    def rows(length):
        weak = duration_row(LAW, 0.9, 10.0, alpha_at(length), stage="weak")
        strong = duration_row(LAW, 1.6, 200.0, alpha_at(length), stage="strong")
        return weak, strong

    only_strong = required_length(place(), 18.0, lambda length: rows(length)[1:], LAW, "integral")
    assert only_strong.length_m == pytest.approx(81.845, abs=5.1e-4)
    assert only_strong.final_depth_m == pytest.approx(8.1845, abs=5.1e-5)
    assert only_strong.alpha == pytest.approx(alpha_at(only_strong.length_m))
    assert not only_strong.governed_by_minimum
    assert not only_strong.findings
    both = required_length(place(), 18.0, rows, LAW, "integral")
    assert both.length_m == pytest.approx(10.0 * both.final_depth_m, abs=1e-5)
    assert both.length_m > only_strong.length_m
    assert both.alpha == rows(both.length_m)[1].layers[0].alpha
    started = required_length(place(start_depth_m=4.0), 18.0, rows, LAW, "integral")
    assert started.length_m > both.length_m


def test_a_place_where_little_grows_needs_the_minimum_with_a_note(place, duration_row):
    found = required_length(place(), 18.0, lambda _: (duration_row(LAW, 0.5, 1.0),), LAW, "integral")
    assert (found.length_m, found.governed_by_minimum) == (18.0, True)
    assert found.final_depth_m > 0.0
    assert [(f.severity, f.code) for f in found.findings] == [("note", "minimum-length")]
    nothing = required_length(place(start_depth_m=1.0), 18.0, lambda _: (), LAW, "integral")
    assert nothing.final_depth_m == 1.0
    assert np.isnan(nothing.alpha)


def test_a_protection_shorter_than_required_is_a_warning(place, duration_row):
    def rows(length):
        return (duration_row(LAW, 1.6, 200.0, alpha_at(length)),)

    found = required_length(place(length_m=81.0), 18.0, rows, LAW, "integral")
    assert [(f.severity, f.code) for f in found.findings] == [("warning", "protection-too-short")]
    assert "81.0 m is shorter than the 81.8 m required" in found.findings[0].message
    assert not required_length(place(length_m=82.0), 18.0, rows, LAW, "integral").findings


def test_a_depth_without_a_value_is_refused():
    with pytest.raises(DomainError, match="behind a protection of 18 m the final depth has no value"):
        slope_length(lambda _: float("nan"), 6.0, 18.0)


def test_a_length_is_found_where_the_depth_rises_for_a_while():
    # 2 m up to 8 m, 3 m at 12 m, falling from there by 2 cm a metre.
    def depth(length):
        return 2.0 + min(max(length - 8.0, 0.0) / 4.0, 1.0) - 0.02 * max(length - 12.0, 0.0)

    found = slope_length(depth, 6.0, 6.0)
    assert found == pytest.approx(6.0 * depth(found), abs=1e-5)
    # 6 (3 - 0.02 (L - 12)) = L: L = 19.44 / 1.12 by hand.
    assert found == pytest.approx(19.44 / 1.12, abs=1e-5)


def test_a_saturating_law_little_over_the_water_depth_has_its_length(law_of):
    # Steady flow: the published form digs faster for an equilibrium of 1.03 than for one of 1.3 times the water depth.
    law = law_of("saturating")

    def depth(length):
        alpha = 3.01 + 1.5 / (1.0 + (length / 40.0) ** 2)
        return float(depth_after(law, alpha * 0.6 - 0.45, 8.0, 200.0, (0.5 * alpha * 0.6 - 0.45) / 0.45))

    assert depth(400.0) > depth(18.0) > depth(100.0)
    found = slope_length(depth, 100.0, 18.0)
    assert found == pytest.approx(100.0 * depth(found), rel=1e-8)
    assert found > 100.0 * depth(18.0)


@pytest.mark.parametrize("slope", [6.0, 10.0, 15.0])
@pytest.mark.parametrize("start_share", [0.8, 0.95, 1.0, 1.05, 1.2])
def test_a_length_near_the_start_is_found_to_a_millimetre(slope, start_share):
    def depth(length):
        return depth_behind(alpha_at(length, 1.0))

    exact = slope_length(depth, slope, 18.0)
    assert nearby_length(depth, slope, 18.0, start_share * exact) == pytest.approx(exact, abs=1e-3)


def test_a_near_length_keeps_the_minimum():
    assert nearby_length(lambda _: 2.0, 6.0, 18.0, 25.0) == 18.0
    assert nearby_length(lambda _: 2.0, 6.0, 18.0, 5.0) == 18.0
    assert nearby_length(lambda _: 4.0, 6.0, 18.0, 18.0) == pytest.approx(24.0)


@pytest.mark.parametrize("margin", [1.0, 1.2, 1.5])
def test_a_margin_multiplies_the_depth(place, duration_row, margin):
    # Alpha does not depend on the length: L = n x margin x h exactly.
    rows = (duration_row(LAW, 1.6, 200.0, 2.3),)
    found = required_length(place(depth_margin_factor=margin), 18.0, lambda _: rows, LAW, "integral")
    assert found.final_depth_m == pytest.approx(depth_behind(2.3), rel=1e-12)
    assert found.length_m == pytest.approx(10.0 * margin * depth_behind(2.3), rel=1e-9)
    # Where it does: the margin times the slope is a flatter slope, h is that of the longer protection.
    moving = required_length(
        place(depth_margin_factor=margin),
        18.0,
        lambda length: (duration_row(LAW, 1.6, 200.0, alpha_at(length)),),
        LAW,
        "integral",
    )
    flatter = slope_length(lambda length: depth_behind(alpha_at(length)), 10.0 * margin, 18.0)
    assert moving.length_m == pytest.approx(flatter, abs=1e-5)


def test_length_scales_with_the_depth(place, duration_row):
    # Hours times 32 are depth times 4, and so is the length where alpha is given.
    one, many = (
        required_length(place(), 0.0, lambda _, h=hours: (duration_row(LAW, 1.6, h, 2.3),), LAW, "integral")
        for hours in (50.0, 1600.0)
    )
    assert many.length_m == pytest.approx(4.0 * one.length_m, rel=1e-9)


def test_a_growth_factor_lengthens_the_protection(place, duration_row):
    rows = (duration_row(LAW, 1.6, 200.0, 2.3),)
    found = required_length(place(growth_factor=1.25), 18.0, lambda _: rows, LAW, "integral")
    assert found.final_depth_m == pytest.approx(1.25 * depth_behind(2.3), rel=1e-12)
    assert found.length_m == pytest.approx(12.5 * depth_behind(2.3), rel=1e-9)


@pytest.mark.parametrize(("after", "retreat"), [(6.0, 16.0), (15.0, 52.0)])
def test_a_single_slide_needs_half_the_difference_of_its_slopes(place, duration_row, after, retreat):
    # Table of slides of 8 m from 1 in 2: 16 m and 52 m. The depth does not depend on the length here.
    hours = (8.0 / depth_behind(2.3)) ** 2.5 * 200.0
    rows = (duration_row(LAW, 1.6, hours, 2.3),)
    found = required_length(place(failure_slope_cot=after), 0.0, lambda _: rows, LAW, "integral", 2.0)
    assert found.final_depth_m == pytest.approx(8.0)
    assert found.single_slide_m == pytest.approx(retreat, rel=1e-9)
    assert found.length_m == pytest.approx(8.0 * after, rel=1e-9)
    assert found.upstream_slope_cot == 2.0


def test_a_single_slide_has_its_own_depth_behind_its_own_length(place, duration_row):
    def rows(length):
        return (duration_row(LAW, 1.6, 200.0, alpha_at(length)),)

    found = required_length(place(), 18.0, rows, LAW, "integral", 2.5)
    exact = slope_length(lambda length: depth_behind(alpha_at(length)), (10.0 - 2.5) / 2.0, 18.0)
    assert found.single_slide_m == pytest.approx(exact, abs=1e-5)
    assert found.single_slide_m > 0.375 * found.length_m


def test_a_slope_that_is_flat_already_is_told_and_has_no_slide_nor_has_an_unknown_one(place, duration_row):
    rows = (duration_row(LAW, 1.6, 200.0, 2.3),)
    for slope in (10.0, 12.0):
        flat = required_length(place(), 18.0, lambda _: rows, LAW, "integral", slope)
        assert np.isnan(flat.single_slide_m)
        assert [f.code for f in flat.findings] == ["slope-before-flatter"]
    unknown = required_length(place(), 18.0, lambda _: rows, LAW, "integral")
    assert np.isnan([unknown.single_slide_m, unknown.upstream_slope_cot]).all()


def test_length_alpha_hours_and_depth_in_one_curve(place, duration_row):
    def rows(length):
        return (duration_row(LAW, 1.6, 200.0, alpha_at(length)),)

    lengths = np.array([30.0, 81.845, 160.0])
    reference = rows(90.0)[0].layers[0]
    found = length_curve(place(), lengths, rows, LAW, "integral", reference)
    np.testing.assert_array_equal(found.length_m, lengths)
    np.testing.assert_allclose(found.alpha, [alpha_at(length) for length in lengths], rtol=1e-12)
    np.testing.assert_allclose(found.final_depth_m, [depth_behind(alpha_at(length)) for length in lengths], rtol=1e-12)
    # Hours at the reference's own excess that give the depth: 200 (E / E_ref)^4.25.
    excess = np.array([alpha_at(length) for length in lengths]) * 1.6 - 0.42
    np.testing.assert_allclose(
        found.effective_duration_h, 200.0 * (excess / (alpha_at(90.0) * 1.6 - 0.42)) ** 4.25, rtol=1e-9
    )
    # The fixed point of the check lies on it: 10 x 8.1845 m.
    assert found.final_depth_m[1] == pytest.approx(8.1845, abs=6e-5)


def test_a_curve_has_no_hours_that_its_reference_does_not_reach(place, duration_row, law_of):
    law = law_of("saturating")
    rows = (duration_row(law, 1.6, 1e5, rate=4.0, scale=9.0),)
    weak = duration_row(law, 1.0, 10.0, rate=1.0, scale=3.0).layers[0]
    found = length_curve(place(), np.array([50.0]), lambda _: rows, law, "integral", weak)
    assert np.isnan(found.effective_duration_h[0])
    assert found.final_depth_m[0] > 3.0
    still = length_curve(place(start_depth_m=1.0), np.array([50.0]), lambda _: (), LAW, "integral", weak)
    assert np.isnan(still.alpha[0])
    assert still.final_depth_m[0] == 1.0


def test_the_moment_at_which_a_depth_is_reached():
    curve = GrowthCurve(
        time_s=[0.0, 100.0, 200.0, 500.0, 600.0], depth_m=[0.5, 1.0, 2.0, 2.0, 3.0], stage=("a", "a", "a", "b", "b")
    )
    assert time_reached(curve, 0.0) == time_reached(curve, 0.5) == 0.0
    assert time_reached(curve, 0.75) == pytest.approx(50.0)
    # At the start of the pause, not at its end.
    assert time_reached(curve, 2.0) == pytest.approx(200.0)
    assert time_reached(curve, 2.25) == pytest.approx(525.0)
    assert np.isnan(time_reached(curve, 3.01))
    assert np.isnan(time_reached(GrowthCurve(time_s=[], depth_m=[], stage=()), 1.0))
    # Time times 7 and depth times 3: the moment times 7.
    wide = GrowthCurve(time_s=7.0 * curve.time_s, depth_m=3.0 * curve.depth_m, stage=curve.stage)
    assert time_reached(wide, 6.75) == pytest.approx(7.0 * 525.0)


def test_the_minimum_is_no_less_than_the_table_of_alpha(place):
    flows = [stage("a", [-7.0, -6.0], [1.0, 1.0])]
    table = {"alpha_lengths_m": (25.0, 90.0), "alpha_values": (2.8, 2.2)}
    assert minimum_length(flows, place(**table)) == 25.0
    assert minimum_length(flows, place(**(table | {"alpha_lengths_m": (10.0, 90.0)}))) == 18.0
    assert minimum_length([], place(**table)) == 25.0


def test_the_table_of_alpha_stands_in_the_notes(place, duration_row):
    table = place(alpha_lengths_m=(25.0, 60.0), alpha_values=(2.8, 2.2), length_m=50.0)
    long = required_length(table, 25.0, lambda _: (duration_row(LAW, 1.6, 200.0, 2.2),), LAW, "integral")
    assert {finding.code for finding in long.findings} == {"protection-too-short", "alpha-beyond-table"}
    (beyond,) = [finding for finding in long.findings if finding.code == "alpha-beyond-table"]
    assert f"{long.length_m:.1f} m is longer than the 60 m" in beyond.message
    short = required_length(table, 25.0, lambda _: (duration_row(LAW, 0.5, 1.0, 2.8),), LAW, "integral")
    (note,) = short.findings
    assert "25.0 m, the shortest for which alpha is given" in note.message


def test_under_the_threshold_everywhere_the_minimum_stands(place, duration_row):
    rows = (duration_row(LAW, 0.1, 0.0, stage="one"), duration_row(LAW, 0.16, 0.0, stage="two"))
    found = required_length(place(), 18.0, lambda _: rows, LAW, "integral", 3.0)
    assert (found.length_m, found.single_slide_m, found.final_depth_m) == (18.0, 0.0, 0.0)
    assert found.governed_by_minimum
    assert np.isnan(found.alpha)
