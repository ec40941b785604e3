"""Saturating growth, equilibrium depths and curves of physical models."""

import numpy as np
import pytest

from tidescour.errors import DomainError
from tidescour.plan.models_bed import Scour
from tidescour.scour.curves import (
    bending_factor,
    curve_of,
    depth_after,
    depth_at,
    equilibrium_ratio,
    growth_rate,
    state_at,
)
from tidescour.scour.laws import LAWS
from tidescour.scour.shapes import POWER, SATURATING, chain_steps

ALPHA, VELOCITY, CRITICAL, DEPTH, TURBULENCE = 2.5, 1.2, 0.45, 10.0, 0.2
EXCESS = ALPHA * VELOCITY - CRITICAL
SCALE_H = 1380.7462
"""t1 = 330 x 10^2 x 1.65^1.7 / 2.55^4.3 by hand, with the density of the check."""


def ratio_of(form):
    return float(equilibrium_ratio(form, ALPHA * VELOCITY, VELOCITY, TURBULENCE, CRITICAL))


@pytest.mark.parametrize(("form", "column"), [("half-alpha", "half_alpha"), ("turbulence", "turbulence")])
def test_both_equilibria_give_the_depths_of_the_check(published, law_of, form, column):
    *early, last = published("hoffmans_1997_saturating.csv")
    assert DEPTH * ratio_of(form) == pytest.approx(last[column], abs=5.1e-3)
    law = law_of("saturating", 1.65, equilibrium=form)
    for row in early:
        found = depth_after(law, EXCESS, DEPTH, row["share_of_scale"] * SCALE_H, ratio_of(form))
        assert float(found) == pytest.approx(row[column], abs=5.1e-4)
    assert float(depth_after(law, EXCESS, DEPTH, 1e9, ratio_of(form))) == pytest.approx(last[column], abs=5.1e-3)


def test_the_two_equilibria_are_never_mixed(law_of):
    # 0.5 alpha u - u_c does not look at the turbulence, (1 + 3 r0) u - u_c not at alpha; u = u_c gives 0.25 and 0.60.
    assert float(equilibrium_ratio("half-alpha", 2.5, 1.0, np.nan, 1.0)) == pytest.approx(0.25)
    assert float(equilibrium_ratio("turbulence", np.nan, 1.0, 0.2, 1.0)) == pytest.approx(0.60)
    # 1.25 u_c against 1.60 u_c at r0 = 0.2.
    assert [float(equilibrium_ratio(form, 2.5, 1.0, 0.2, 1.0)) + 1.0 for form in ("half-alpha", "turbulence")] == (
        pytest.approx([1.25, 1.60])
    )
    texts = [law_of("saturating", equilibrium=form).text for form in ("half-alpha", "turbulence")]
    assert "0.5 alpha u" in texts[0]
    assert "r0" not in texts[0]
    assert "(1 + 3 r0) u" in texts[1]
    assert "0.5" not in texts[1]


def test_equilibrium_grows_in_proportion_to_all_velocities_at_once_not_at_all():
    # Only ratios of velocities count: all times 3, the same; the attack alone times 3 gives 3 (r + 1) - 1.
    for form in ("half-alpha", "turbulence"):
        one = ratio_of(form)
        three = float(equilibrium_ratio(form, 3.0 * ALPHA * VELOCITY, 3.0 * VELOCITY, TURBULENCE, 3.0 * CRITICAL))
        more = float(equilibrium_ratio(form, 3.0 * ALPHA * VELOCITY, 3.0 * VELOCITY, TURBULENCE, CRITICAL))
        assert three == pytest.approx(one, rel=1e-14)
        assert more == pytest.approx(3.0 * (one + 1.0) - 1.0, rel=1e-14)


@pytest.mark.parametrize("ratio", [1.0001, 1.2, 2.3333, 30.0])
def test_the_bent_curve_passes_through_the_water_depth_at_its_time(law_of, ratio):
    law = law_of("saturating", 1.65)
    assert float(depth_after(law, EXCESS, DEPTH, SCALE_H, ratio)) == pytest.approx(DEPTH, rel=1e-7)


@pytest.mark.parametrize("ratio", [0.05, 0.4, 1.0])
@pytest.mark.parametrize("share", [1e-4, 0.01, 1.0, 50.0])
def test_a_small_equilibrium_has_its_own_form(law_of, ratio, share):
    # h_e (1 - exp(-(h0 / h_e) (t / t1)^0.4)).
    found = float(depth_after(law_of("saturating", 1.65), EXCESS, DEPTH, share * SCALE_H, ratio))
    assert found == pytest.approx(ratio * DEPTH * (1.0 - np.exp(-(share**0.4) / ratio)), rel=1e-7)
    # Early it is the power law.
    if share**0.4 < 0.03 * ratio:
        assert found == pytest.approx(DEPTH * share**0.4, rel=0.015)


def test_a_very_deep_equilibrium_gives_the_power_law(law_of):
    hours = np.array([0.01, 1.0, 100.0, SCALE_H])
    straight = depth_after(law_of("time-scale", 1.65), EXCESS, DEPTH, hours)
    for ratio, apart in ((1e3, 1e-3), (1e6, 1e-6)):
        bent = depth_after(law_of("saturating", 1.65), EXCESS, DEPTH, hours, ratio)
        np.testing.assert_allclose(bent, straight, rtol=apart)
    # At the small equilibrium of the check it is not: 1.98 and 1.84 m against 1.58 m at a hundredth of t1.
    assert float(bending_factor(2.3333)) > 1.25


def test_bending_scales_out(law_of):
    # Lengths times k and t1 times k^2 by h0^2: h(k h0, k^2 t) = k h(h0, t) at one ratio and excess.
    law = law_of("saturating")
    one = float(depth_after(law, 2.0, 7.0, 30.0, 1.8))
    assert float(depth_after(law, 2.0, 21.0, 9.0 * 30.0, 1.8)) == pytest.approx(3.0 * one, rel=1e-12)


def test_nothing_digs_where_the_equilibrium_is_no_hole(law_of):
    law = law_of("saturating")
    for ratio in (0.0, -0.3):
        assert float(depth_after(law, 1.0, 10.0, 1000.0, ratio)) == 0.0
    rate, scale = curve_of(law, growth_rate(law, [1.0, 1.0], 10.0), 10.0, np.array([-0.2, 0.5]))
    assert (rate[0], scale[0]) == (0.0, 0.0)
    assert scale[1] == 5.0


def test_a_saturating_law_without_equilibrium_is_refused(law_of):
    with pytest.raises(DomainError, match="needs the equilibrium depth over the water depth"):
        depth_after(law_of("saturating"), 1.0, 10.0, 5.0)


@pytest.mark.parametrize("name", LAWS)
def test_nan_stays_where_it_is(law_of, name):
    law = law_of(name)
    depths = depth_at(law, [1.0, np.nan, 0.0], 12.0)
    assert np.isnan(depths).tolist() == [False, True, False]
    assert depths[2] == 0.0
    assert np.isnan(state_at(law, [1.0, np.nan, 0.0], 12.0)).tolist() == [False, True, False]
    assert np.isnan(depth_after(law, 2.0, np.nan, 5.0, 2.0))
    assert np.isnan(bending_factor([2.0, np.nan])).tolist() == [False, True]


@pytest.mark.parametrize("name", LAWS)
def test_state_and_depth_are_each_others_inverse(law_of, name):
    law = law_of(name)
    depth = np.array([1e-6, 0.02, 1.0, 7.0, 11.9])
    np.testing.assert_allclose(depth_at(law, state_at(law, depth, 12.0), 12.0), depth, rtol=1e-11)
    assert float(state_at(law, 0.0, 12.0)) == float(depth_at(law, 0.0, 12.0)) == 0.0


def test_a_depth_that_a_saturating_curve_never_has_is_infinitely_far(law_of):
    assert np.isinf(state_at(law_of("saturating"), [12.0, 13.0], 12.0)).all()


def test_a_model_curve_that_is_a_power_law_gives_the_power_law(law_of):
    shares = (0.003, 0.1, 1.0, 8.0)
    law = law_of("model-curve", curve_points=tuple((share, share**0.4) for share in shares))
    straight = law_of("time-scale")
    hours = np.geomspace(0.01, 1e5, 40)
    np.testing.assert_allclose(depth_after(law, 2.0, 9.0, hours), depth_after(straight, 2.0, 9.0, hours), rtol=1e-12)


def test_a_model_curve_passes_through_its_rows_and_goes_on_outside(law_of):
    points = ((0.01, 0.2), (0.5, 0.9), (4.0, 1.3))
    law = law_of("model-curve", 1.0, curve_points=points, time_exponent=0.36)
    scale_h = 330.0 * 9.0**2 / 2.0**4.3
    found = depth_after(law, 2.0, 9.0, np.array([share for share, _ in points]) * scale_h)
    np.testing.assert_allclose(found, 9.0 * np.array([deep for _, deep in points]), rtol=1e-12)
    # Half way between two rows in logarithms: the geometric mean.
    middle = float(depth_after(law, 2.0, 9.0, np.sqrt(0.01 * 0.5) * scale_h))
    assert middle == pytest.approx(9.0 * np.sqrt(0.2 * 0.9), rel=1e-12)
    # Under the first row with t^gamma, over the last with its own slope in logarithms.
    early = float(depth_after(law, 2.0, 9.0, 1e-5 * scale_h))
    assert early == pytest.approx(9.0 * 0.2 * 1e-3**0.36, rel=1e-12)
    late = float(depth_after(law, 2.0, 9.0, 400.0 * scale_h))
    assert late == pytest.approx(9.0 * 1.3 * 100.0 ** (np.log(1.3 / 0.9) / np.log(4.0 / 0.5)), rel=1e-12)


def test_a_model_curve_scales_with_its_water_depth(law_of):
    law = law_of("model-curve")
    one = float(depth_after(law, 2.0, 7.0, 30.0))
    assert float(depth_after(law, 2.0, 21.0, 9.0 * 30.0)) == pytest.approx(3.0 * one, rel=1e-12)


@pytest.mark.parametrize("points", [(), ((1.0, 1.0),)])
def test_a_model_curve_without_rows_is_refused(points):
    with pytest.raises(DomainError, match="needs at least two rows"):
        LAWS["model-curve"].function(1.65, Scour(curve_points=points))


def steps_of(shape, law, rate, scale, hours):
    depth = np.zeros(len(rate))
    chain_steps(
        shape,
        law.curve,
        law.time_exponent,
        np.array(rate, dtype=float),
        np.array(scale, dtype=float),
        np.array(hours, dtype=float),
        np.arange(len(rate)),
        depth,
    )
    return depth


def test_chained_steps_of_a_power_law_are_the_sum_of_their_states(law_of):
    # Section on chaining of the methods: h_n^2.5 = sum of k_i t_i; the three stages of the example, exponent 1.7.
    law = law_of("explicit", 1.62)
    rates = growth_rate(law, np.array([2.2 * 0.8, 2.5 * 1.3, 2.8 * 1.9]) - 0.42, 12.0)
    found = steps_of(POWER, law, rates, np.full(3, np.inf), [160.0, 90.0, 25.0])
    np.testing.assert_allclose(found, [1.46859, 4.27890, 7.19475], atol=5.1e-6)
    random = np.random.default_rng(5)
    rate, hours = random.uniform(0.0, 2.0, 500), random.uniform(0.0, 3.0, 500)
    np.testing.assert_allclose(
        steps_of(POWER, law, rate, np.full(500, np.inf), hours), np.cumsum(rate * hours) ** 0.4, rtol=1e-10
    )


def test_chained_steps_of_saturating_curves_in_both_orders(law_of):
    # X: h_e 6 m, tau 50 h; Y: 20 m, 500 h; 100 h of each, h_e (1 - exp(-(t / tau)^0.4)): k = s^2.5 / tau.
    law = law_of("saturating")
    rate = {"X": 6.0**2.5 / 50.0, "Y": 20.0**2.5 / 500.0}
    scale = {"X": 6.0, "Y": 20.0}
    for order, wanted in (("XY", [4.39640, 8.53215]), ("YX", [8.17251, 8.17251])):
        found = steps_of(SATURATING, law, [rate[c] for c in order], [scale[c] for c in order], [100.0, 100.0])
        np.testing.assert_allclose(found, wanted, atol=5.1e-6)


def test_cutting_chained_steps_changes_nothing(law_of):
    random = np.random.default_rng(6)
    rate, scale, hours = random.uniform(0.0, 2.0, 60), random.uniform(1.0, 9.0, 60), random.uniform(0.1, 3.0, 60)
    for name in ("saturating", "model-curve"):
        law = law_of(name)
        whole = steps_of(law.shape, law, rate, scale, hours)
        halves = steps_of(law.shape, law, np.repeat(rate, 2), np.repeat(scale, 2), np.repeat(0.5 * hours, 2))
        np.testing.assert_allclose(halves[1::2], whole, rtol=1e-10)


def test_steps_in_no_cycle_count_for_nothing(law_of):
    law = law_of("explicit")
    depth = np.zeros(1)
    chain_steps(POWER, law.curve, 0.4, np.ones(2), np.full(2, np.inf), np.array([2.0, 50.0]), np.array([0, 1]), depth)
    assert depth[0] == pytest.approx(2.0**0.4)
