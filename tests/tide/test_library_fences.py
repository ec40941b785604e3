"""Each pitfall of the tide library: what it does today, so that a changed one is noticed, and that the wall is safe.

Ids are those of the list of pitfalls, U1 to U36. Policy alone, with nothing of the library to hold: U26 (threads of the
linear algebra), U35 (a tide is not the water level) and U36 (never fit across a change of stage).
"""

import tracemalloc

import numpy as np
import pandas as pd
import pytest
import utide
import utide.utilities

from tidescour.errors import DomainError, FitError
from tidescour.tide import library
from tidescour.tide.choice import choose_constituents
from tidescour.tide.library import predicted_tide, separable_constituents, solve_constants
from tidescour.units import datetime64_utc

FOUR = ("M2", "S2", "K1", "O1")
QUIET = {"verbose": False, "conf_int": "none", "trend": False}


@pytest.fixture
def month(constants, times):
    """Return hourly times and levels of four constituents with noise."""
    tide = constants({"M2": (1.5, 60.0), "S2": (0.4, 120.0), "K1": (0.08, 350.0), "O1": (0.1, 190.0)})
    time_s = times(30.0)
    noise_m = np.random.default_rng(1).normal(0.0, 0.05, time_s.size)
    return time_s, 0.3 + predicted_tide(tide, time_s) + noise_m


@pytest.fixture
def fitted(month):
    """Return the constants that the wall finds in that month."""
    return solve_constants(*month, FOUR, {}, 53.4)


def amplitude(solution, name):
    """Return the amplitude of one constituent of a solution of the library."""
    return float(solution.A[list(solution.name).index(name)])


def same(one, other):
    """Tell whether two sets of constants agree to rounding."""
    return (
        one.constituents == other.constituents
        and np.allclose(one.amplitude_m, other.amplitude_m, rtol=0.0, atol=1e-9)
        and np.allclose(one.phase_deg, other.phase_deg, rtol=0.0, atol=1e-6)
        and abs(one.mean_m - other.mean_m) < 1e-9
    )


def test_u1_latitude_is_required_and_checked_here_not_there(month):
    time_s, level_m = month
    stamps = datetime64_utc(time_s)
    with pytest.raises(ValueError, match="Latitude must be supplied"):
        utide.solve(stamps, level_m, constit=list(FOUR), **QUIET)
    assert np.isfinite(amplitude(utide.solve(stamps, level_m, lat=95.0, constit=list(FOUR), **QUIET), "M2"))
    with pytest.raises(DomainError, match=r"site\.latitude_deg: 95\.0 must lie within"):
        solve_constants(time_s, level_m, FOUR, {}, 95.0)


def test_u1_the_equator_is_taken_as_five_degrees_north(month):
    time_s, level_m = month
    with pytest.raises((np.linalg.LinAlgError, RuntimeWarning, ValueError)):
        utide.solve(datetime64_utc(time_s), level_m, lat=0.0, constit=list(FOUR), **QUIET)
    at_zero, at_five = (solve_constants(time_s, level_m, FOUR, {}, latitude) for latitude in (0.0, 5.0))
    assert same(at_zero, at_five)


def test_u2_no_trend_is_fitted_though_the_library_would(month):
    time_s, level_m = month
    rising_m = level_m + (time_s - time_s[0]) * 1e-7
    free = utide.solve(datetime64_utc(time_s), rising_m, lat=53.4, constit=list(FOUR), verbose=False, conf_int="none")
    assert free.slope == pytest.approx(1e-7 * 86400.0, rel=0.2)
    fit = solve_constants(time_s, rising_m, FOUR, {}, 53.4)
    later_m = predicted_tide(fit, time_s + 730.0 * 86400.0)
    assert abs(float(np.mean(later_m))) < 0.01


def test_u3_bare_numbers_as_times_are_never_handed_over(month, fitted):
    time_s, level_m = month
    days = time_s / 86400.0
    naive = utide.solve(days, level_m, lat=53.4, verbose=False, conf_int="none", order_constit="frequency")
    assert len(naive.name) == 0  # Days are taken for milliseconds: a record too short for any tide, and no word of it.
    assert fitted.amplitude_m[0] == pytest.approx(1.5, abs=0.01)


def test_u4_times_that_are_not_numbers_are_refused(month, fitted):
    time_s, level_m = month
    stamps = datetime64_utc(time_s)
    stamps[5] = np.datetime64("NaT")
    broken = utide.solve(stamps, level_m, lat=53.4, **QUIET)
    assert len(broken.name) > 60  # A month with one lost stamp is taken for ages.
    holed_s = np.where(np.arange(time_s.size) == 5, np.nan, time_s)
    with pytest.raises(DomainError, match="must be finite and increase"):
        solve_constants(holed_s, level_m, FOUR, {}, 53.4)
    with pytest.raises(DomainError, match="finite seconds since 1970"):
        predicted_tide(fitted, holed_s)


def test_u5_stamps_go_over_as_utc_without_zone_and_rounded_to_the_millisecond(month):
    time_s, level_m = month
    aware = pd.DatetimeIndex(datetime64_utc(time_s)).tz_localize("UTC").tz_convert("Europe/Amsterdam")
    with pytest.warns(UserWarning, match="timezone"):
        utide.solve(aware, level_m, lat=53.4, constit=list(FOUR), **QUIET)
    with pytest.raises(AttributeError, match="shape"):
        utide.solve(list(datetime64_utc(time_s)), level_m, lat=53.4, constit=list(FOUR), **QUIET)
    assert datetime64_utc(np.array([0.0019996])).astype(np.int64)[0] == 2
    assert datetime64_utc(time_s).dtype == np.dtype("datetime64[ms]")


def test_u6_unordered_and_repeated_times_are_refused(month):
    time_s, level_m = month
    doubled = (np.repeat(time_s, 2), np.repeat(level_m, 2))
    assert len(utide.solve(datetime64_utc(doubled[0]), doubled[1], lat=53.4, constit=list(FOUR), **QUIET).weights) == (
        2 * time_s.size
    )
    for wrong_s in (time_s[::-1], np.where(np.arange(time_s.size) == 7, time_s[6], time_s)):
        with pytest.raises(DomainError, match="increase, none twice"):
            solve_constants(wrong_s, level_m, FOUR, {}, 53.4)


def test_u7_padding_counts_as_record_in_the_library_and_not_here(month, times, fitted):
    padded_s = times(366.0)
    padded_m = np.full(padded_s.size, np.nan)
    padded_m[: month[1].size] = month[1]
    chosen = utide.solve(datetime64_utc(padded_s), padded_m, lat=53.4, **QUIET)
    assert len(chosen.name) > 60
    assert float(np.max(chosen.A)) > 100.0
    assert same(solve_constants(padded_s, padded_m, FOUR, {}, 53.4), fitted)


def test_u8_holes_may_be_rows_without_level_or_no_rows(month):
    time_s, level_m = month
    hole = (np.arange(time_s.size) > 200) & (np.arange(time_s.size) < 290)
    as_rows = solve_constants(time_s, np.where(hole, np.nan, level_m), FOUR, {}, 53.4)
    assert same(as_rows, solve_constants(time_s[~hole], level_m[~hole], FOUR, {}, 53.4))
    by_library = utide.solve(
        datetime64_utc(time_s), np.where(hole, np.nan, level_m), lat=53.4, constit=list(FOUR), **QUIET
    )
    assert as_rows.amplitude_m[0] == pytest.approx(amplitude(by_library, "M2"), abs=1e-9)


@pytest.mark.parametrize("days", [15.0, 20.0, 29.5, 60.0, 183.0, 366.0])
def test_u9_the_choice_is_that_of_the_library_for_a_gapless_record(times, days):
    time_s = times(days + 1e-9, 7200.0)
    chosen = utide.solve(datetime64_utc(time_s), np.zeros(time_s.size), lat=53.4, order_constit="frequency", **QUIET)
    assert set(separable_constituents(float(np.ptp(time_s)))) == set(chosen.name)


def test_u9_the_choice_of_the_library_looks_at_the_span_alone(times):
    time_s = times(60.0, 21600.0)
    mostly_hole = np.where((time_s > time_s[20]) & (time_s < time_s[-20]), np.nan, 0.0)
    solutions = [
        utide.solve(datetime64_utc(time_s), level_m, lat=53.4, order_constit="frequency", **QUIET)
        for level_m in (np.zeros(time_s.size), mostly_hole)
    ]
    assert list(solutions[0].name) == list(solutions[1].name)
    assert "M8" in solutions[0].name
    ours = choose_constituents(60.0 * 86400.0, 40 / 240, 21600.0).names
    assert len(ours) < len(solutions[0].name)
    assert "M8" not in ours


def test_u10_an_explicit_list_is_not_checked_by_the_library(month):
    time_s, level_m = month
    three_days = slice(0, 72)
    lists = [
        utide.solve(
            datetime64_utc(time_s[three_days]),
            level_m[three_days],
            lat=53.4,
            constit=["S2", "K2"],
            Rayleigh_min=r,
            **QUIET,
        )
        for r in (1.0, 100.0)
    ]
    assert list(lists[0].name) == list(lists[1].name)


def test_u11_u12_a_hopeless_fit_is_silent_and_sure_of_itself_in_the_library(month):
    time_s, level_m = month
    first = slice(0, 72)
    wrong = utide.solve(
        datetime64_utc(time_s[first]),
        level_m[first],
        lat=53.4,
        constit=["M2", "S2", "N2", "K2", "K1", "P1", "O1"],
        trend=False,
        verbose=False,
        conf_int="linear",
    )
    assert amplitude(wrong, "S2") > 4.0
    assert float(wrong.SNR[list(wrong.name).index("S2")]) > 1000.0
    # The wall for this is the condition number, tests/tide/test_design.py and test_fit.py.


def test_u13_intervals_of_the_library_are_too_narrow_and_not_taken_over(month, constants, fitted):
    time_s, _ = month
    noise_m = np.random.default_rng(2).normal(0.0, 0.05, time_s.size)
    clean_m = predicted_tide(constants({"M2": (1.0, 0.0)}), time_s)
    solution = utide.solve(datetime64_utc(time_s), clean_m + noise_m, lat=53.4, constit=list(FOUR), verbose=False)
    # White noise: the variance of an amplitude is 2 sigma^2 / n.
    true_half_width_m = 1.96 * 0.05 * np.sqrt(2.0 / time_s.size)
    assert 0.4 < float(solution.A_ci[list(solution.name).index("M2")]) / true_half_width_m < 0.85
    assert not hasattr(fitted, "amplitude_ci95_m")


def test_u14_only_the_word_none_turns_intervals_off(month):
    time_s, level_m = month
    stamps = datetime64_utc(time_s)
    for word in (None, False, "Linear"):
        with pytest.raises(ValueError, match="conf_int"):
            utide.solve(stamps, level_m, lat=53.4, constit=list(FOUR), verbose=False, conf_int=word)
    bare = utide.solve(stamps, level_m, lat=53.4, constit=list(FOUR), **QUIET)
    assert "A_ci" not in bare
    assert np.std(utide.reconstruct(stamps, bare, verbose=False).h - level_m) == pytest.approx(0.05, rel=0.1)


def test_u15_the_global_generator_is_left_alone(month):
    time_s, level_m = month
    state = np.random.get_state()[1].copy()  # noqa: NPY002
    solve_constants(time_s, level_m, FOUR, {}, 53.4)
    assert np.array_equal(np.random.get_state()[1], state)  # noqa: NPY002
    utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), verbose=False, conf_int="MC")
    assert not np.array_equal(np.random.get_state()[1], state)  # noqa: NPY002


def test_u16_nothing_is_dropped_for_a_low_signal(month, times):
    time_s, level_m = month
    names = choose_constituents(float(np.ptp(time_s)), 1.0, 3600.0).names
    solution = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(names), trend=False, verbose=False)
    stamps = datetime64_utc(times(5.0))
    dropped = utide.reconstruct(stamps, solution, verbose=False).h
    whole = utide.reconstruct(stamps, solution, verbose=False, min_SNR=0, min_PE=0).h
    assert float(np.max(np.abs(dropped - whole))) > 0.005
    fit = solve_constants(time_s, level_m, names, {}, 53.4)
    assert np.allclose(fit.mean_m + predicted_tide(fit, times(5.0)), whole, rtol=0.0, atol=1e-9)


def test_u17_unknown_names_in_a_prediction_give_a_constant_there_and_a_refusal_here(month, constants):
    time_s, level_m = month
    solution = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), **QUIET)
    stamps = datetime64_utc(time_s[:50])
    assert np.ptp(utide.reconstruct(stamps, solution, verbose=False, constit=["nonsense"]).h) == 0.0
    assert np.ptp(utide.reconstruct(stamps, solution, verbose=False, constit="xM2x").h) > 1.0
    with pytest.raises(FitError, match="no constituent is called 'XM2'"):
        predicted_tide(constants({"XM2": (1.0, 0.0)}), time_s)


@pytest.mark.parametrize(
    ("names", "error", "match"),
    [
        (["m2", "S2"], KeyError, "m2"),
        (["nonsense"], KeyError, "nonsense"),
        ([], IndexError, "integer"),
    ],
    ids=["lower-case", "unknown", "empty"],
)
def test_u18_bad_lists_fail_obscurely_there_and_clearly_here(month, names, error, match):
    time_s, level_m = month
    with pytest.raises(error, match=match):
        utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=names, **QUIET)
    with pytest.raises(FitError, match=r"nearest: M2|no constituent is called 'nonsense'|at least one constituent"):
        solve_constants(time_s, level_m, names, {}, 53.4)


def test_u18_the_mean_as_a_constituent_spoils_the_mean_there_and_is_refused_here(month):
    time_s, level_m = month
    spoilt = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=["M2", "Z0"], **QUIET)
    assert abs(spoilt.mean - 0.3) > 0.05
    with pytest.raises(FitError, match="Z0 is the mean level, which is always fitted"):
        solve_constants(time_s, level_m, ("M2", "Z0"), {}, 53.4)


def test_u18_a_name_given_twice_halves_the_amplitude_there_and_is_refused_here(month):
    time_s, level_m = month
    twice = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=["M2", "M2", "S2"], **QUIET)
    assert amplitude(twice, "M2") == pytest.approx(0.75, abs=0.01)
    with pytest.raises(FitError, match="M2 stands twice"):
        solve_constants(time_s, level_m, ("M2", "M2", "S2"), {}, 53.4)


def test_u18_any_sequence_of_names_may_be_given_here(month, fitted):
    time_s, level_m = month
    with pytest.raises(ValueError, match="ambiguous"):
        utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=np.array(FOUR), **QUIET)
    assert same(solve_constants(time_s, level_m, np.array(FOUR), {}, 53.4), fitted)


def test_u19_results_come_in_the_order_asked(month):
    time_s, level_m = month
    asked = ("O1", "S2", "K1", "M2")
    by_library = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(asked), **QUIET)
    assert list(by_library.name) == ["M2", "S2", "O1", "K1"]
    fit = solve_constants(time_s, level_m, asked, {}, 53.4)
    assert fit.constituents == asked
    assert fit.amplitude_m[3] == pytest.approx(1.5, abs=0.01)


def test_u20_a_partial_order_loses_constituents_there(month):
    time_s, level_m = month
    partial = utide.solve(
        datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), order_constit=["M2", "S2"], **QUIET
    )
    assert list(partial.name) == ["M2", "S2"]


def test_u21_a_misspelt_method_is_another_method_there(month):
    time_s, level_m = month
    stamps = datetime64_utc(time_s)
    assert "rf" in utide.solve(stamps, level_m, lat=53.4, constit=list(FOUR), method="OLS", **QUIET)
    plain = utide.solve(stamps, level_m, lat=53.4, constit=list(FOUR), method="ols", **QUIET)
    assert "rf" not in plain
    fit = solve_constants(time_s, level_m, FOUR, {}, 53.4)
    assert fit.amplitude_m[0] == pytest.approx(amplitude(plain, "M2"), abs=1e-9)


def test_u22_nodal_corrections_are_exact_at_any_date(month, fitted, times):
    time_s, level_m = month
    later_s = times(3.0, start_s=time_s[0] + 9.3 * 365.25 * 86400.0)
    frozen = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), nodal="linear_time", **QUIET)
    exact = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), nodal=True, **QUIET)
    predictions = [
        utide.reconstruct(datetime64_utc(later_s), each, verbose=False).h - each.mean for each in (frozen, exact)
    ]
    assert float(np.max(np.abs(predictions[0] - predictions[1]))) > 0.05
    assert np.allclose(predicted_tide(fitted, later_s), predictions[1], rtol=0.0, atol=1e-9)


def test_u23_robust_weights_crash_there_and_are_not_used_here(month):
    time_s, level_m = month
    with pytest.raises(ValueError, match="truth value of an array"):
        utide.solve(
            datetime64_utc(time_s),
            level_m,
            lat=53.4,
            constit=list(FOUR),
            method="robust",
            robust_kw={"weight_function": "huber"},
            **QUIET,
        )


def test_u24_a_fit_takes_about_nine_kilobytes_a_sample(times):
    time_s = times(60.0, 1800.0)
    level_m = np.cos(time_s / 7000.0)
    solve_constants(time_s, level_m, FOUR, {}, 53.4)
    tracemalloc.start()
    solve_constants(time_s, level_m, FOUR, {}, 53.4)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert 6000.0 < peak / time_s.size < 12000.0


def test_u25_u33_a_prediction_in_parts_from_constants_alone_is_that_of_the_library_in_one(month, times):
    time_s, level_m = month
    names = choose_constituents(float(np.ptp(time_s)), 1.0, 3600.0).names
    solution = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(names), **QUIET)
    later_s = times(90.0, 600.0, time_s[0] + 3.0e7)
    assert later_s.size > 2 * library.SAMPLES_PER_CHUNK
    at_once = utide.reconstruct(datetime64_utc(later_s), solution, verbose=False).h
    fit = solve_constants(time_s, level_m, names, {}, 53.4)
    assert np.allclose(fit.mean_m + predicted_tide(fit, later_s), at_once, rtol=0.0, atol=1e-12)


def test_u27_nothing_is_printed(month, capsys):
    time_s, level_m = month
    utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), conf_int="none")
    assert "solve" in capsys.readouterr().out
    fit = solve_constants(time_s, level_m, FOUR, {}, 53.4)
    predicted_tide(fit, time_s)
    printed = capsys.readouterr()
    assert printed.out == ""
    assert printed.err == ""


def test_u28_a_warning_of_the_library_is_a_refusal(month, monkeypatch):
    def warns(*_, **__):
        np.log(np.array([-1.0]))

    monkeypatch.setattr(utide, "solve", warns)
    with pytest.raises(FitError, match="the tide library stopped: RuntimeWarning"):
        solve_constants(*month, FOUR, {}, 53.4)


def test_u28_a_failure_of_the_library_is_a_refusal(month, monkeypatch):
    def fails(*_, **__):
        raise np.linalg.LinAlgError("Singular matrix")

    monkeypatch.setattr(utide, "solve", fails)
    with pytest.raises(FitError, match="Singular matrix"):
        solve_constants(*month, FOUR, {}, 53.4)


def test_u29_times_of_a_prediction_are_not_read_back(month):
    time_s, level_m = month
    solution = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), **QUIET)
    with pytest.warns(FutureWarning, match="t_mpl"):
        _ = utide.reconstruct(datetime64_utc(time_s[:3]), solution, verbose=False).t_mpl


def test_u30_an_inference_is_read_and_left_as_it_was(month):
    time_s, level_m = month
    plain = {"inferred_names": ["K2"], "reference_names": ["S2"], "amp_ratios": [0.272], "phase_offsets": [0.0]}
    with pytest.raises(AttributeError, match="inferred_names"):
        utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), infer=plain, **QUIET)
    bunch = utide.utilities.Bunch(plain)
    utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), infer=bunch, **QUIET)
    assert "approximate" in bunch
    ours = {"K2": ("S2", 0.272, 0.0)}
    fit = solve_constants(time_s, level_m, FOUR, ours, 53.4)
    assert ours == {"K2": ("S2", 0.272, 0.0)}
    assert fit.constituents == (*FOUR, "K2")
    assert fit.amplitude_m[4] == pytest.approx(0.272 * fit.amplitude_m[1], rel=1e-12)


def test_u31_too_few_samples_are_refused(month):
    time_s, level_m = month
    with pytest.raises(FitError, match=r"35 good samples for 9 unknowns .* at least 36 are needed"):
        solve_constants(time_s[:35], level_m[:35], FOUR, {}, 53.4)
    with pytest.raises(FitError, match="0 good samples"):
        solve_constants(time_s, np.full(time_s.size, np.nan), FOUR, {}, 53.4)
    nothing = utide.solve(
        datetime64_utc(time_s),
        np.full(time_s.size, np.nan),
        lat=53.4,
        constit=list(FOUR),
        order_constit="frequency",
        **QUIET,
    )
    assert float(np.max(nothing.A)) == 0.0  # No levels at all give a flat tide there, without a word.


def test_u32_the_mean_is_kept_apart_from_the_tide(month, fitted):
    time_s, level_m = month
    solution = utide.solve(datetime64_utc(time_s), level_m, lat=53.4, constit=list(FOUR), **QUIET)
    by_library = utide.reconstruct(datetime64_utc(time_s), solution, verbose=False, constit=["nonsense"]).h
    assert np.allclose(by_library, solution.mean)
    assert np.allclose(
        predicted_tide(fitted, time_s) + solution.mean,
        utide.reconstruct(datetime64_utc(time_s), solution, verbose=False).h,
        rtol=0.0,
        atol=1e-9,
    )


def test_u34_weather_is_not_taken_for_a_tide_of_weeks(month):
    time_s, _ = month
    chosen = separable_constituents(float(np.ptp(time_s)))
    assert "MSF" in chosen
    assert "MSF" not in choose_constituents(float(np.ptp(time_s)), 1.0, 3600.0).names
