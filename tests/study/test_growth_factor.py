"""The growth factor against closed forms, numerical integration and truths simulated by other code."""

import runpy
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.optimize import brentq
from scipy.stats import norm

from tidescour.errors import DomainError
from tidescour.plan.models_bed import Scour
from tidescour.scour.chain import chain_place
from tidescour.scour.laws import LAWS
from tidescour.study.growth_factor import (
    DepthSounding,
    Scatter,
    fit_factor,
    forecast,
    growth_along,
    mixture_percentiles,
)
from tidescour.study.spans import rows_between

INVENTED = runpy.run_path(str(Path(__file__).parent / "invented_soundings.py"))
hole_of, START_S, DAY_S = INVENTED["invented_hole"], INVENTED["START_S"], INVENTED["DAY_S"]
NOW, REST = 5.0**2.5, 8.0**2.5 - 5.0**2.5
"""5.0 m after 30 days and 8.0 m after 60, in depth**2.5."""


def sounded(day, depth_m, error_m=0.3):
    return DepthSounding(time_s=START_S + day * DAY_S, depth_m=depth_m, standard_error_m=error_m)


def estimated(hole, soundings, prior=0.3, growth=0.0):
    scatter = Scatter(prior=prior, growth=growth)
    fit = fit_factor(hole, soundings, scatter)
    return fit.factor, forecast(hole, fit, scatter)


def worked_factor(share, growth):
    """Percentile of the factor of the worked case by numerical integration, no part of the package."""

    def density(log_factor):
        factor = np.exp(log_factor)
        spread = np.hypot(0.3, growth * 5.0 * factor)
        return norm.pdf(log_factor, 0.0, 0.3) * norm.pdf(3.6, 5.0 * factor, spread)

    whole = quad(density, -3.0, 3.0, points=[-0.3])[0]
    return np.exp(brentq(lambda end: quad(density, -3.0, end, points=[-0.3])[0] / whole - share, -2.0, 1.0))


@pytest.mark.parametrize("growth", [0.0, 0.1])
def test_the_factor_of_the_worked_case_is_that_of_the_integral(growth):
    factor, _ = estimated(hole_of((NOW, REST)), [sounded(30.0, 3.6)], growth=growth)
    assert factor == pytest.approx([worked_factor(share, growth) for share in (0.05, 0.5, 0.95)], rel=1e-3)


def test_without_scatter_of_growth_the_forecast_is_the_law_times_the_factor():
    factor, band = estimated(hole_of((NOW, REST)), [sounded(30.0, 3.6)])
    assert band.depth_m[:, 0] == pytest.approx(5.0 * factor, rel=1e-3)
    assert band.depth_m[:, -1] == pytest.approx(8.0 * factor, rel=1e-3)


def test_with_scatter_of_growth_the_forecast_is_that_of_a_million_draws():
    random = np.random.default_rng(20270501)
    log_factor = 0.3 * random.standard_normal(1_000_000)
    factor = np.exp(log_factor)
    depth = 5.0 * factor * (1.0 + 0.1 * random.standard_normal(factor.size))
    weight = norm.pdf(3.6, depth, 0.3)
    growth = factor * ((np.maximum(depth, 0.0) / factor) ** 2.5 + REST) ** 0.4 - depth
    end = depth + growth * (1.0 + 0.1 * random.standard_normal(factor.size))
    order = np.argsort(end)
    shares = np.cumsum(weight[order]) / np.sum(weight)
    drawn = end[order][np.searchsorted(shares, [0.05, 0.5, 0.95])]
    _, band = estimated(hole_of((NOW, REST)), [sounded(30.0, 3.6)], growth=0.1)
    assert band.depth_m[:, -1] == pytest.approx(drawn, abs=0.02)


def test_plain_ways_beside_the_worked_case():
    # 24.59 + 125.12 = 149.71 in depth**2.5: 7.41 m; with factor f: f (24.59 / f**2.5 + 125.12)**0.4.
    hole = hole_of((NOW, REST))
    from_s, to_s = START_S + 30.0 * DAY_S, START_S + 60.0 * DAY_S
    unscaled = growth_along(hole, 3.6, from_s, to_s)[1][-1]
    assert unscaled == pytest.approx((3.6**2.5 + REST) ** 0.4, rel=1e-12)
    assert unscaled == pytest.approx(7.415, abs=5e-4)
    scaled = growth_along(hole, 3.6, from_s, to_s, 0.72)[1][-1]
    # At the plain ratio the hole lies on the law's own curve: 8.0 x 0.72.
    assert scaled == pytest.approx(5.76, rel=1e-12)


@pytest.mark.parametrize("growth", [0.0, 0.1])
def test_without_soundings_the_factor_is_as_it_was_known(growth):
    factor, band = estimated(hole_of((NOW, REST)), [], growth=growth)
    expected = np.exp(0.3 * norm.ppf([0.05, 0.5, 0.95]))
    assert factor == pytest.approx(expected, rel=1e-3)
    assert band.time_s[0] == START_S
    assert band.depth_m[:, 0].tolist() == [0.0, 0.0, 0.0]
    if growth == 0.0:
        assert band.depth_m[:, -1] == pytest.approx(8.0 * expected, rel=1e-3)


def test_many_exact_soundings_leave_no_doubt_wherever_the_factor_lies():
    true = 0.2
    soundings = [sounded(day, true * (NOW * day / 30.0) ** 0.4, 0.002) for day in (10.0, 20.0, 30.0)]
    factor, _ = estimated(hole_of((NOW, REST), cycles=30), soundings)
    assert factor == pytest.approx([true] * 3, rel=4e-3)
    assert factor[0] < factor[1] < factor[2]


def test_the_factor_of_the_plan_is_multiplied():
    # The same soundings, weighed against 0.8 of the law: what is found multiplies that.
    soundings = [sounded(30.0, 3.6)]
    against_law, _ = estimated(hole_of((NOW, REST)), soundings, prior=2.0)
    against_plan, band = estimated(hole_of((NOW, REST), growth_factor=0.8), soundings, prior=2.0)
    assert 0.8 * against_plan == pytest.approx(against_law, rel=2e-3)
    assert band.depth_m[1, -1] == pytest.approx(8.0 * against_law[1], rel=2e-3)


@pytest.mark.parametrize("growth", [0.0, 0.1])
def test_twice_as_deep_a_law_and_soundings_give_the_same_factor_and_twice_the_forecast(growth):
    soundings = [sounded(12.0, 2.0, 0.2), sounded(40.0, 3.6)]
    factor, band = estimated(hole_of((NOW, REST), start_depth_m=0.5), soundings, growth=growth)
    doubled = [
        replace(each, depth_m=2.0 * each.depth_m, standard_error_m=2.0 * each.standard_error_m) for each in soundings
    ]
    deeper = hole_of((NOW * 2.0**2.5, REST * 2.0**2.5), start_depth_m=1.0)
    again, twice = estimated(deeper, doubled, growth=growth)
    assert again == pytest.approx(factor, rel=1e-9)
    assert twice.depth_m == pytest.approx(2.0 * band.depth_m, rel=1e-6)


def test_a_sounding_pulls_the_depth_no_further_than_itself_and_never_under_zero():
    for depth_m in (0.0, 0.02, 9.0):
        _, band = estimated(hole_of((NOW, REST)), [sounded(1.0, depth_m, 0.5)], growth=0.3)
        assert np.all(band.depth_m >= 0.0)
        assert np.all(np.diff(band.depth_m, axis=0) >= 0.0)
        law_m = (NOW / 30.0) ** 0.4
        assert min(depth_m, 0.3 * law_m) <= band.depth_m[1, 0] <= max(depth_m, 3.0 * law_m)


def test_a_sounding_at_the_very_end_leaves_one_moment_of_forecast():
    _, band = estimated(hole_of((NOW, REST)), [sounded(60.0, 8.0)], growth=0.1)
    assert band.time_s.tolist() == [START_S + 60.0 * DAY_S]


def test_a_factor_far_from_all_that_was_expected_is_found():
    # Prior 0.05: 0.4 m where the law has 5 m lies 50 of its scatters off. The density on a fine grid of its own.
    scatter = Scatter(prior=0.05, growth=0.0)
    fit = fit_factor(hole_of((NOW, REST)), [sounded(30.0, 0.4, 0.05)], scatter)
    nodes = np.linspace(-4.0, 0.5, 400_001)
    forecast_m = NOW**0.4 * np.exp(nodes)
    density = -0.5 * (nodes / 0.05) ** 2 - 0.5 * ((0.4 - forecast_m) / 0.05) ** 2
    weight = np.cumsum(np.exp(density - density.max()))
    wanted = np.exp(np.interp([0.05, 0.5, 0.95], weight / weight[-1], nodes))
    assert fit.factor == pytest.approx(wanted, rel=2e-3)


def test_where_nothing_grows_soundings_tell_nothing_of_the_factor():
    factor, band = estimated(hole_of((0.0, 0.0), start_depth_m=1.0), [sounded(30.0, 1.2)], growth=0.1)
    assert factor == pytest.approx(np.exp(0.3 * norm.ppf([0.05, 0.5, 0.95])), rel=1e-3)
    assert band.depth_m == pytest.approx(1.0)


def test_soundings_that_follow_no_one_factor_stand_out():
    scatter = Scatter(prior=0.3, growth=0.1)
    hole = hole_of((NOW, REST))
    steady = fit_factor(hole, [sounded(15.0, 0.7 * (NOW / 2.0) ** 0.4, 0.1), sounded(30.0, 3.5, 0.1)], scatter)
    assert np.all(np.abs(steady.innovation) < 1.5)
    # No law fills a hole.
    filled = fit_factor(hole, [sounded(15.0, 6.0, 0.1), sounded(30.0, 4.0, 0.1)], scatter)
    assert filled.innovation[1] < -3.0


@pytest.mark.parametrize("law", ["explicit", "saturating"])
def test_parts_of_rows_grow_as_the_whole(law):
    growth = LAWS[law].function(1.65, Scour())
    layers = {} if law == "explicit" else {"scale_m": 9.0}
    hole = hole_of((NOW, REST), cycles=7, law=growth, growth_factor=1.2, **layers)
    from_s, between_s, to_s = START_S + 3.3 * DAY_S, START_S + 31.0 * DAY_S, START_S + 55.5 * DAY_S
    parts = [row for ends in ((from_s, between_s), (between_s, to_s)) for row in rows_between(hole.rows, *ends)]
    whole_m = chain_place(rows_between(hole.rows, from_s, to_s), growth, 0.4, "integral", 1.2)[-1].end_depth_m
    assert chain_place(parts, growth, 0.4, "integral", 1.2)[-1].end_depth_m == pytest.approx(whole_m, rel=1e-12)
    time_s, along_m = growth_along(hole, 0.4, from_s, to_s)
    assert time_s[0] == from_s
    assert time_s[-1] == to_s
    assert along_m[-1] == pytest.approx(whole_m, rel=1e-12)
    assert rows_between(hole.rows, to_s, to_s) == ()


def test_a_firm_layer_holds_all_factors_back():
    # Under 4 m nothing moves: the law alone passes 4 m before day 30, so that deeper holes cannot be.
    hole = hole_of((NOW, REST), tops=(0.0, 4.0), weaker=(1.0, 1e-12))
    factor, band = estimated(hole, [sounded(30.0, 4.0, 0.1)], growth=0.05)
    assert np.all(band.depth_m[:2] <= 4.01)
    # A factor of 2 or of 1 gives the same 4 m: what is known beforehand decides between them.
    assert factor[1] == pytest.approx(1.12, abs=0.06)


@pytest.mark.parametrize(
    ("soundings", "message"),
    [
        ([sounded(0.0, 1.0)], "after the start"),
        ([sounded(61.0, 1.0)], "not after the end"),
        ([sounded(30.0, 3.0), sounded(20.0, 2.0)], "in order"),
    ],
)
def test_soundings_out_of_order_or_programme_are_refused(soundings, message):
    with pytest.raises(DomainError, match=message):
        fit_factor(hole_of((NOW, REST)), soundings, Scatter(prior=0.3, growth=0.1))


@pytest.mark.parametrize(("depth_m", "error_m"), [(-0.1, 0.3), (1.0, 0.0), (np.nan, 0.3), (1.0, np.nan)])
def test_a_sounding_of_no_depth_or_error_is_refused(depth_m, error_m):
    with pytest.raises(DomainError, match="sounded depth"):
        sounded(1.0, depth_m, error_m)


@pytest.mark.parametrize(("prior", "growth"), [(0.0, 0.1), (0.3, -0.1), (np.nan, 0.1), (0.3, np.nan)])
def test_no_scatter_beforehand_is_refused(prior, growth):
    with pytest.raises(DomainError, match="scatter must be positive beforehand"):
        Scatter(prior=prior, growth=growth)


@settings(max_examples=30, deadline=None)
@given(mean=st.floats(-5.0, 5.0), spread=st.floats(0.01, 3.0), count=st.integers(2, 9))
def test_alike_parts_have_the_percentiles_of_one(mean, spread, count):
    found = mixture_percentiles(np.full(count, 1.0 / count), np.full(count, mean), np.full(count, spread))
    assert found == pytest.approx(norm.ppf([0.05, 0.5, 0.95], mean, spread), abs=1e-9)


def test_two_parts_far_apart_keep_their_own_halves():
    found = mixture_percentiles(np.array([0.5, 0.5]), np.array([0.0, 100.0]), np.array([1.0, 1.0]))
    # Each of the two is spread by 40; the ends are their tenth part: 0 - 1.28 x 40 and 100 + 1.28 x 40.
    assert found == pytest.approx([-51.2, 50.0, 151.2], abs=0.4)


def test_no_number_stays_no_number():
    # A hole that cannot be computed must not look like one that can.
    weight, mean = np.array([0.5, 0.5]), np.array([[1.0, np.nan], [2.0, np.nan]])
    found = mixture_percentiles(weight, mean, np.ones((2, 2)))
    assert np.all(np.isfinite(found[:, 0]))
    assert np.all(np.isnan(found[:, 1]))


def simulated(random, growth_scatter):
    """Return stages, soundings, true factor and true depth at the end, chained by plain sums."""
    count = random.integers(2, 6)
    states = random.lognormal(3.0, 0.8, count)
    true = np.exp(0.3 * random.standard_normal())
    kept = np.sort(random.choice(count - 1, random.integers(1, count), replace=False))
    soundings, depth, gained = [], 0.0, 0.0
    for number, state in enumerate(states):
        gained += state
        if number not in kept and number < count - 1:
            continue
        grown = true * ((depth / true) ** 2.5 + gained) ** 0.4 - depth
        depth += grown * max(1.0 + growth_scatter * random.standard_normal(), 0.0)
        gained = 0.0
        if number in kept:
            error = random.uniform(0.05, 0.5)
            read = max(depth + error * random.standard_normal(), 0.0)
            soundings.append(sounded(30.0 * (number + 1), read, error))
    return states, soundings, true, depth


def coverage(cases, growth_scatter, seed):
    """Return the shares of cases whose true factor and end depth lie inside their 90 % intervals."""
    random = np.random.default_rng(seed)
    inside = np.zeros(2)
    for _ in range(cases):
        states, soundings, true, end = simulated(random, growth_scatter)
        factor, band = estimated(hole_of(states), soundings, growth=growth_scatter)
        inside += [factor[0] <= true <= factor[2], band.depth_m[0, -1] <= end <= band.depth_m[2, -1]]
    return inside / cases


@pytest.mark.parametrize("growth_scatter", [0.0, 0.1])
def test_simulated_truth_lies_inside_most_intervals(growth_scatter):
    # Of 30, 27 are expected: 22 or fewer would be rarer than one in a hundred.
    shares = coverage(30, growth_scatter, seed=4)
    assert np.all(shares >= 23 / 30), shares


@pytest.mark.slow
@pytest.mark.parametrize("growth_scatter", [0.0, 0.1])
def test_simulated_truth_lies_inside_nine_of_ten_intervals(growth_scatter):
    shares = coverage(200, growth_scatter, seed=2027)
    assert np.all((shares >= 0.85) & (shares <= 0.95)), shares
