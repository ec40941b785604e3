"""Estimates against textbook least squares, what cannot be told, and the findings that say so."""

import importlib.util
from pathlib import Path

import numpy as np
import pytest
from scipy import stats
from scipy.signal import lfilter

from tidescour.errors import DomainError, FitError
from tidescour.gap.calibration import estimate
from tidescour.gap.calibration_records import Estimate, Evidence, Simulated
from tidescour.gap.calibration_verdict import refuse_untellable

STEP_S = 600.0
COUNT = 2000
TIME_S = np.arange(COUNT) * STEP_S
# Not periodic with the tide, so that the noise at the tide's periods is not taken up.
SHAPE = 0.6 * np.sin(2.0 * np.pi * TIME_S / 30000.0)
WHITE = np.random.default_rng(11).standard_normal(COUNT)
NONE = np.empty(0)


def evidence(level_m, time_s=TIME_S, at_s=NONE, discharge=NONE, error=NONE):
    return Evidence(
        level_time_s=time_s,
        level_m=level_m,
        discharge_time_s=at_s,
        discharge_m3_s=discharge,
        standard_error_m3_s=error,
        discharge_opening=np.zeros(np.size(at_s), dtype=np.int64),
    )


def ratio_model(parameters):
    """Levels linear in the logarithm of coefficient over area: a gap with no inflow and one time constant."""
    return Simulated(level_m=SHAPE * np.log(parameters[0] / parameters[1]), discharge_m3_s=NONE)


def coefficient_and_offset(parameters):
    return Simulated(level_m=SHAPE * np.log(parameters[0]) - parameters[1], discharge_m3_s=NONE)


def codes(found):
    return {finding.code for finding in found.findings}


def half_widths(found):
    logarithmic = [name != "datum_offset_m" for name in found.names]
    ends = np.array([found.ci95_low, found.ci95_high])
    ends[:, logarithmic] = np.log(ends[:, logarithmic])
    return 0.5 * (ends[1] - ends[0])


def white_fit(scale=0.02):
    level = SHAPE * np.log(1.2) - 0.05 + scale * WHITE
    return estimate(
        ("coefficient", "datum_offset_m"), np.array([1.0, 0.0]), coefficient_and_offset, evidence(level)
    ), level


def test_white_noise_gives_ordinary_least_squares():
    # Textbook: b = (X'X)^-1 X'y, s^2 = residual sum of squares over n - p, interval by Student's t with n - p. Noise is
    # what is left beside six waves of the tide, to which the two regressors here are next to orthogonal.
    found, level = white_fit()
    assert found.noise_order == 0
    matrix = np.stack((SHAPE, -np.ones(COUNT)), axis=1)
    angles = 2.0 * np.pi * np.outer(TIME_S, [1.0, 2.0, 3.0]) / (12.4206012 * 3600.0)
    _, squares, _, _ = np.linalg.lstsq(np.hstack((matrix, np.cos(angles), np.sin(angles))), level, rcond=None)
    textbook = np.linalg.lstsq(matrix, level, rcond=None)[0]
    covariance = squares[0] / (COUNT - 2 - 6) * np.linalg.inv(matrix.T @ matrix)
    deviation = np.sqrt(np.diag(covariance))
    np.testing.assert_allclose(
        [np.log(found.estimate[0]), found.estimate[1]], textbook, atol=1e-3 * deviation.min(), rtol=0
    )
    np.testing.assert_allclose(found.covariance, covariance, rtol=1e-3, atol=1e-10)
    np.testing.assert_allclose(half_widths(found), stats.t.ppf(0.975, COUNT - 2) * deviation, rtol=1e-3)
    assert found.effective_count == COUNT


def test_twice_the_noise_gives_twice_the_interval():
    once, twice = white_fit(0.02)[0], white_fit(0.04)[0]
    np.testing.assert_allclose(half_widths(twice), 2.0 * half_widths(once), rtol=1e-4)
    assert twice.residual_std_m == pytest.approx(2.0 * once.residual_std_m, rel=1e-4)


@pytest.mark.parametrize("part", [0.8, 0.9])
def test_autocorrelated_noise_gives_the_textbook_generalised_solution(part):
    # Aitken: b = (X' V^-1 X)^-1 X' V^-1 y with V = s^2 part^|i - j|; the fitted noise stands in for the true one.
    deviation = 0.03
    noise = deviation * np.sqrt(1.0 - part**2) * lfilter([1.0], [1.0, -part], WHITE)
    level = SHAPE * np.log(0.8) + 0.04 + noise
    found = estimate(("coefficient", "datum_offset_m"), np.array([1.0, 0.0]), coefficient_and_offset, evidence(level))
    matrix = np.stack((SHAPE, -np.ones(COUNT)), axis=1)
    covariance = deviation**2 * part ** np.abs(np.subtract.outer(np.arange(COUNT), np.arange(COUNT)))
    weighted = np.linalg.solve(covariance, matrix)
    expected = np.sqrt(np.diag(np.linalg.inv(matrix.T @ weighted)))
    textbook = np.linalg.solve(matrix.T @ weighted, weighted.T @ level)
    gained = np.array([np.log(found.estimate[0]), found.estimate[1]])
    assert np.all(np.abs(gained - textbook) < 0.15 * expected)
    # 1 - part is known within sqrt((1 - part^2) / n), a tenth of it for 0.9; deviations go with it.
    np.testing.assert_allclose(np.sqrt(np.diag(found.covariance)), expected, rtol=0.25)
    in_hours = 0.5 * STEP_S / 3600.0 * (1 + part) / (1 - part)
    assert found.residual_correlation_time_h == pytest.approx(in_hours, rel=0.5)
    assert found.effective_count == pytest.approx(COUNT * STEP_S / 7200.0 / in_hours, rel=0.5)


def test_levels_that_are_not_known_count_as_if_they_were_not_written():
    level = SHAPE * np.log(1.2) + 0.02 * WHITE
    holes = np.random.default_rng(2).random(COUNT) < 0.2
    kept = ~holes
    model = coefficient_and_offset

    def thinned(parameters):
        return Simulated(level_m=model(parameters).level_m[kept], discharge_m3_s=NONE)

    names, start = ("coefficient", "datum_offset_m"), np.array([1.0, 0.0])
    one = estimate(names, start, model, evidence(np.where(holes, np.nan, level)))
    other = estimate(names, start, thinned, evidence(level[kept], TIME_S[kept]))
    np.testing.assert_allclose(one.estimate, other.estimate, rtol=1e-9)
    np.testing.assert_allclose(one.ci95_low, other.ci95_low, rtol=1e-9)


def test_levels_alone_fix_the_ratio_and_neither_number():
    level = SHAPE * np.log(1.3) + 0.02 * WHITE
    pair = estimate(("coefficient", "area_factor"), np.array([1.0, 1.0]), ratio_model, evidence(level))
    alone = estimate(
        ("coefficient",), np.array([1.0]), lambda values: ratio_model(np.array([values[0], 1.0])), evidence(level)
    )
    assert not pair.determined.any()
    assert pair.ci95_high.tolist() == [np.inf, np.inf]
    assert pair.ci95_low.tolist() == [0.0, 0.0]
    assert alone.determined.all()
    assert pair.ratio.estimate == pytest.approx(alone.estimate[0], rel=1e-4)
    # One more fitted number: n - 2 in place of n - 1.
    assert pair.ratio.ci95_low == pytest.approx(alone.ci95_low[0], rel=1e-4)
    assert pair.ratio.ci95_high == pytest.approx(alone.ci95_high[0], rel=1e-4)
    assert pair.correlation[0, 1] == pytest.approx(1.0, abs=1e-6)
    assert codes(pair) == {"not-determined", "tied-parameters"}
    assert alone.ratio is None


def test_what_the_levels_leave_open_stays_near_the_start():
    level = SHAPE * np.log(1.3) + 0.02 * WHITE
    found = estimate(("coefficient", "area_factor"), np.array([0.9, 1.0]), ratio_model, evidence(level))
    # The nearest point to the start with the right ratio: both move by half the logarithm of 1.3 / 0.9.
    assert found.estimate[1] == pytest.approx(np.sqrt(0.9 / found.ratio.estimate), rel=1e-2)


AT_S = 86400.0 + np.arange(25) * 1800.0
FLOW = 2000.0 * np.sin(2.0 * np.pi * np.arange(25) / 24.8)


def with_discharge(parameters):
    return Simulated(level_m=np.zeros(COUNT), discharge_m3_s=parameters[0] * FLOW)


def discharge_fit(told_error, scatter=100.0):
    measured = 1.1 * FLOW + scatter * np.random.default_rng(4).standard_normal(25)
    held = evidence(0.02 * WHITE, TIME_S, AT_S, measured, np.full(25, told_error))
    return estimate(("coefficient",), np.array([1.0]), with_discharge, held), measured


def test_discharges_alone_give_weighted_least_squares():
    # Textbook: c = sum(q Q) / sum(q^2), standard error s / sqrt(sum(q^2)) with the errors as given.
    found, measured = discharge_fit(150.0)
    textbook = float(FLOW @ measured / (FLOW @ FLOW))
    assert found.estimate[0] == pytest.approx(textbook, rel=1e-4)
    deviation = 150.0 / np.sqrt(FLOW @ FLOW) / textbook
    assert np.sqrt(found.covariance[0, 0]) == pytest.approx(deviation, rel=1e-3)
    assert found.chi_square == pytest.approx(float(np.sum((measured - textbook * FLOW) ** 2)) / 150.0**2, rel=1e-4)
    assert found.discharge_widening == 1.0


def test_too_small_standard_errors_are_widened_and_told():
    small, measured = discharge_fit(20.0)
    smaller, _ = discharge_fit(10.0)
    left = measured - small.estimate[0] * FLOW
    assert small.discharge_widening == pytest.approx(np.sqrt(np.mean(left**2)) / 20.0, rel=1e-4)
    # Widened by their own scatter, the interval no longer depends on what was told.
    np.testing.assert_allclose(half_widths(small), half_widths(smaller), rtol=1e-3)
    assert "discharges-disagree" in codes(small)


def test_a_discharge_campaign_parts_coefficient_and_area():
    def model(parameters):
        return Simulated(level_m=ratio_model(parameters).level_m, discharge_m3_s=parameters[0] * FLOW)

    level = SHAPE * np.log(1.1 / 0.9) + 0.02 * WHITE
    measured = 1.1 * FLOW + 100.0 * np.random.default_rng(4).standard_normal(25)
    held = evidence(level, TIME_S, AT_S, measured, np.full(25, 100.0))
    found = estimate(("coefficient", "area_factor"), np.array([1.0, 1.0]), model, held)
    assert found.determined.all()
    assert np.all((found.ci95_low < [1.1, 0.9]) & (found.ci95_high > [1.1, 0.9]))


def test_what_repeats_with_the_tide_widens_the_interval_and_is_told():
    wave = 0.03 * np.cos(2.0 * 2.0 * np.pi * TIME_S / (12.4206012 * 3600.0))
    level = SHAPE * np.log(1.2) + 0.01 * WHITE
    names, start = ("coefficient", "datum_offset_m"), np.array([1.0, 0.0])
    clean = estimate(names, start, coefficient_and_offset, evidence(level))
    stained = estimate(names, start, coefficient_and_offset, evidence(level + wave))
    assert "tidal-residual" not in codes(clean)
    assert clean.tidal_excess == 1.0
    assert half_widths(stained)[0] > 2.0 * half_widths(clean)[0]


def test_an_estimate_at_odds_with_physics_is_told():
    level = SHAPE * np.log(4.0) - 0.9 + 0.01 * WHITE
    found = estimate(("coefficient", "datum_offset_m"), np.array([1.0, 0.0]), coefficient_and_offset, evidence(level))
    told = [finding.message for finding in found.findings if finding.code == "at-odds-with-physics"]
    assert any(message.startswith("coefficient = 4") for message in told)
    assert any("datums of both gauges" in message for message in told)


def test_a_datum_of_tens_of_metres_is_found():
    level = SHAPE * np.log(1.1) - 42.0 + 0.01 * WHITE
    found = estimate(("coefficient", "datum_offset_m"), np.array([1.0, 0.0]), coefficient_and_offset, evidence(level))
    assert found.estimate[1] == pytest.approx(42.0, abs=1e-3)


def faint(parameters):
    return Simulated(level_m=0.02 * SHAPE * np.log(parameters[0]), discharge_m3_s=NONE)


def faint_fit(noise_m):
    return estimate(("coefficient",), np.array([1.0]), faint, evidence(noise_m * WHITE))


def test_a_wide_gap_tells_nothing_of_the_coefficient():
    with pytest.raises(FitError, match=r"a wide gap tells nothing of the coefficient: .* 0\.02 m apart"):
        refuse_untellable(faint_fit(0.02), np.full(100, 0.02))


def test_a_head_under_a_centimetre_is_refused_however_quiet_the_record():
    found = faint_fit(0.0005)
    refuse_untellable(found, np.full(100, 0.02))
    with pytest.raises(FitError, match="a wide gap tells nothing"):
        refuse_untellable(found, np.array([0.005, np.nan, -0.005]))


def test_a_weak_signal_is_told():
    # 10 % more moves the levels by 0.1 x 0.02 x 0.6 / sqrt(2) m = 0.85 mm.
    found = faint_fit(0.0025)
    assert found.level_signal[0] == pytest.approx(0.00085 / 0.0025, rel=0.03)
    assert "weak-signal" in codes(found)
    refuse_untellable(found, np.full(100, 0.02))


def test_measured_discharges_can_tell_what_the_levels_cannot():
    refuse_untellable(discharge_fit(150.0)[0], np.full(100, 0.005))


def test_a_shut_gap_is_refused():
    def shut(parameters):
        return Simulated(level_m=np.full(COUNT, -parameters[1]), discharge_m3_s=NONE)

    with pytest.raises(FitError, match="no water passes the openings"):
        estimate(("coefficient", "datum_offset_m"), np.array([1.0, 0.0]), shut, evidence(0.01 * WHITE))


def test_less_than_two_tides_are_refused():
    level = np.full(COUNT, np.nan)
    level[100:240] = SHAPE[100:240]
    with pytest.raises(FitError, match=r"140 basin levels cover 23\.2 h; at least 2 tides \(24\.8 h\)"):
        estimate(("coefficient",), np.array([1.0]), faint, evidence(level))


def test_names_and_starts_that_make_no_sense_are_refused():
    held = evidence(0.01 * WHITE)
    with pytest.raises(DomainError, match="cannot fit width; fit one or more of coefficient, area_factor"):
        estimate(("width",), np.array([1.0]), faint, held)
    with pytest.raises(DomainError, match="cannot fit nothing"):
        estimate((), np.empty(0), faint, held)
    with pytest.raises(DomainError, match="above 0 for coefficient and area_factor"):
        estimate(("coefficient",), np.array([0.0]), faint, held)


def test_a_model_that_gives_no_number_is_refused():
    def broken(parameters):
        level = SHAPE * np.log(parameters[0])
        return Simulated(level_m=level if parameters[0] > 0.999 else np.full(COUNT, np.nan), discharge_m3_s=NONE)

    with pytest.raises(FitError, match="the routed basin gives no number"):
        estimate(("coefficient",), np.array([1.0]), broken, evidence(-0.5 * SHAPE + 0.01 * WHITE))


def test_evidence_out_of_shape_or_order_is_refused():
    with pytest.raises(ValueError, match="level_time_s must increase"):
        evidence(np.zeros(2), np.array([1.0, 0.0]))
    with pytest.raises(ValueError, match="two rows of one length"):
        evidence(np.zeros(3), np.array([0.0, 1.0]))
    with pytest.raises(ValueError, match="standard errors positive"):
        evidence(np.zeros(2), np.array([0.0, 1.0]), np.zeros(1), np.ones(1), np.zeros(1))


def test_records_cannot_be_written_to():
    found, _ = white_fit()
    assert isinstance(found, Estimate)
    with pytest.raises(ValueError, match="read-only"):
        found.estimate[0] = 1.0


@pytest.mark.slow
def test_the_intervals_hold_the_truth_as_often_as_they_say():
    place = Path(__file__).parent / "calibration_coverage.py"
    described = importlib.util.spec_from_file_location("calibration_coverage", place)
    coverage = importlib.util.module_from_spec(described)
    described.loader.exec_module(coverage)
    rows, _ = coverage.study(100, 20270401)
    for measured, name in ((True, "coefficient"), (True, "area_factor"), (True, "datum_offset_m"), (False, "ratio")):
        held = [
            low <= truth <= high for campaign, key, low, truth, high, *_ in rows if (campaign, key) == (measured, name)
        ]
        # Of 50 with 95 % each, 43 or fewer come once in 250.
        assert sum(held) >= 44, (measured, name)
