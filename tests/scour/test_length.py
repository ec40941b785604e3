import numpy as np
import pytest

from tidescour.bed.alpha import alpha_factor, relative_turbulence
from tidescour.errors import DomainError
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.scour.laws import LAWS, depth_after
from tidescour.scour.length import minimum_length, required_length, slope_length

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
    assert both.alpha == rows(both.length_m)[1].alpha
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
