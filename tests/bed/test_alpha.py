import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.bed.alpha import (
    alpha_factor,
    extrapolated_alpha,
    implied_turbulence,
    outside_evidence,
    relative_turbulence,
    roughness_factor,
)
from tidescour.errors import DomainError


def test_turbulence_of_the_checks(published):
    for row in published("hoffmans_1997_turbulence.csv"):
        found = relative_turbulence(
            np.array([row["sill_height_m"]]), row["depth_m"], row["length_m"], row["chezy_m05_s"]
        )
        np.testing.assert_allclose(found, row["relative_turbulence"], atol=5.1e-6)
        np.testing.assert_allclose(1.5 + 5.0 * found, row["alpha"], atol=5.1e-5)


def test_alpha_of_the_table(published):
    table = published("hoffmans_1997_alpha.csv")
    sills = np.array([0.1, 0.2, 0.3, 0.4, 0.5, 0.6])
    for row in table:
        found = alpha_factor(sills, 1.0, row["length"], 40.0)
        np.testing.assert_allclose(found, list(row)[1:], atol=5.1e-4)


def test_far_behind_the_sill_only_the_turbulence_of_uniform_flow_is_left():
    # sqrt(1.45 g) / C at C = 40.
    far = np.array([0.3])
    np.testing.assert_allclose(relative_turbulence(far, 1.0, 1e12, 40.0), 0.0942885, atol=5.1e-8)
    np.testing.assert_allclose(alpha_factor(far, 1.0, 1e12, 40.0), 1.97144, atol=5.1e-6)


def test_roughness_factor_begins_at_forty():
    assert [roughness_factor(c) for c in (20.0, 40.0, 45.0, 60.0)] == [1.0, 1.0, 1.125, 1.5]


def test_a_smoother_protection_raises_alpha_by_the_roughness_factor():
    # D 3, h0 12, L 90, C 45: r0 0.16440 (check value), f_C 1.125, so 1.5 + 5 x 0.16440 x 1.125.
    np.testing.assert_allclose(alpha_factor(np.array([3.0]), 12.0, 90.0, 45.0), 2.42475, atol=5e-5)


@given(
    st.floats(0.05, 0.8, exclude_max=True), st.floats(1.0, 30.0), st.floats(7.0, 60.0), st.floats(25.0, 70.0),
    st.floats(0.1, 10.0),
)  # fmt: skip
@settings(max_examples=50, deadline=None)
def test_alpha_is_free_of_scale_and_falls_with_length(share, depth, ratio, chezy, k):
    sill = np.array([share * depth])
    length = ratio * share * depth
    found = alpha_factor(sill, depth, length, chezy)
    np.testing.assert_allclose(alpha_factor(k * sill, k * depth, k * length, chezy), found, rtol=1e-9)
    assert alpha_factor(sill, depth, 1.5 * length, chezy)[0] < found[0]


def test_nan_passes_through():
    assert np.isnan(alpha_factor(np.array([2.0, np.nan]), 10.0, 90.0, 40.0)).tolist() == [False, True]


@pytest.mark.parametrize(
    ("sill", "length", "message"),
    [(0.0, 90.0, "must be over 0"), (8.1, 90.0, "over 0.8 of the depth"), (3.0, 17.9, "under 6 times the sill height")],
)
def test_sills_outside_the_formula_are_refused(sill, length, message):
    with pytest.raises(DomainError, match=message):
        relative_turbulence(np.array([1.0, sill]), 10.0, length, 40.0)


@pytest.mark.parametrize(("depth", "chezy"), [(0.0, 40.0), (10.0, 0.0), (float("nan"), 40.0)])
def test_depth_and_roughness_must_be_positive(depth, chezy):
    with pytest.raises(DomainError, match="must be positive"):
        relative_turbulence(np.array([1.0]), depth, 90.0, chezy)


def test_six_sill_heights_are_out_for_a_plan_and_in_for_the_search():
    sill = np.array([3.0])
    assert outside_evidence(sill, 10.0, 18.0).tolist() == [True]
    assert outside_evidence(sill, 10.0, 18.0, at_limit=True).tolist() == [False]
    # (1 - 0.3)^-2 without decay: sqrt(0.0225 / 0.49 + 1.45 x 9.81 / 1600).
    np.testing.assert_allclose(relative_turbulence(sill, 10.0, 18.0, 40.0), 0.2341125, atol=5e-7)


def test_extrapolation_tells_how_the_formula_diverges():
    # L 90, h0 9, D 7.5, 8, 8.5, 8.9, C 40: worked out by separate code.
    found = [extrapolated_alpha(d, 9.0, 90.0, 40.0) for d in (7.5, 8.0, 8.5, 8.9)]
    np.testing.assert_allclose(found, [4.9, 6.6, 11.8, 53.7], atol=0.051)
    assert not np.isfinite(extrapolated_alpha(9.0, 9.0, 90.0, 40.0))
    assert not np.isfinite(extrapolated_alpha(8.0, 1.0, 5.0, 40.0))


def test_a_shorter_protection_has_much_leverage():
    # D / h0 0.3, C 40, u 1.5 m/s, u_c 0.45 m/s: from L / h0 = 20 to 5, with alpha rounded to 3 decimals (2.207, 2.487),
    # the depth (excess to the power 1.7) is 1.262 times and the duration (4.25) 1.790 times as large.
    short, long = (1.5 * float(alpha_factor(np.array([0.3]), 1.0, length, 40.0)[0]) - 0.45 for length in (5.0, 20.0))
    assert (short / long) ** 1.7 == pytest.approx(1.262, rel=1e-3)
    assert (short / long) ** 4.25 == pytest.approx(1.790, rel=2e-3)


def test_turbulence_is_read_back_from_alpha():
    sill = np.array([2.0, 3.0, np.nan])
    for chezy in (30.0, 45.0):
        alpha = alpha_factor(sill, 10.0, 90.0, chezy)
        np.testing.assert_allclose(implied_turbulence(alpha, chezy), relative_turbulence(sill, 10.0, 90.0, chezy))
    with pytest.raises(DomainError, match="must be positive"):
        implied_turbulence(sill, 0.0)


@given(st.floats(1.0, 100.0), st.floats(10.0, 100.0), st.floats(1.0, 50.0))
@settings(max_examples=30, deadline=None)
def test_alpha_rises_with_the_roughness_factor_of_one_turbulence(alpha, chezy, more):
    assert roughness_factor(chezy + more) >= roughness_factor(chezy) >= 1.0
    assert implied_turbulence(np.array(alpha), chezy + more) <= implied_turbulence(np.array(alpha), chezy)
