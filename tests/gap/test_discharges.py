"""Discharges side by side: volumes, peaks and slack of a sine in closed form, storage against an analytical level."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError
from tidescour.gap.discharges import (
    DischargeSeries,
    campaign_spans,
    compare_discharges,
    slack_times,
    storage_discharge,
    tidal_discharge,
)

PERIOD_S = 12.4206012 * 3600.0
SPEED = 2.0 * np.pi / PERIOD_S
PEAK = 3000.0


def series(time_s, discharge, error=np.nan, source="routed", independent=False):
    return DischargeSeries(
        source=source,
        time_s=time_s,
        discharge_m3_s=discharge,
        standard_error_m3_s=np.broadcast_to(error, np.shape(time_s)),
        independent=independent,
    )


def sine(step_s=60.0, tides=2.0, peak=PEAK, lag_s=0.0, **more):
    time_s = np.arange(0.0, tides * PERIOD_S + step_s, step_s)
    return series(time_s, peak * np.sin(SPEED * (time_s - lag_s)), **more)


def test_a_whole_tide_of_a_sine_has_its_closed_form():
    # Half a sine holds peak T / pi; it peaks at T/4 and 3T/4 and turns at T/2.
    found = tidal_discharge(sine(), 0.0, PERIOD_S)
    volume = PEAK * PERIOD_S / np.pi
    assert found.flood_volume_m3 == pytest.approx(volume, rel=1e-5)
    assert found.ebb_volume_m3 == pytest.approx(volume, rel=1e-5)
    assert found.flood_peak_m3_s == pytest.approx(PEAK, rel=1e-5)
    assert found.ebb_peak_m3_s == pytest.approx(PEAK, rel=1e-5)
    assert found.flood_peak_time_s == pytest.approx(PERIOD_S / 4.0, abs=31.0)
    assert found.ebb_peak_time_s == pytest.approx(0.75 * PERIOD_S, abs=31.0)
    np.testing.assert_allclose(found.slack_time_s, [PERIOD_S / 2.0], atol=1.0)


def test_a_part_of_a_half_tide_has_its_closed_form():
    # Integral of the sine from a to b is peak / w (cos w a - cos w b).
    start, end = 0.1 * PERIOD_S, 0.37 * PERIOD_S
    found = tidal_discharge(sine(), start, end)
    assert found.flood_volume_m3 == pytest.approx(
        PEAK / SPEED * (np.cos(SPEED * start) - np.cos(SPEED * end)), rel=1e-5
    )
    assert found.ebb_volume_m3 == 0.0
    assert found.ebb_peak_m3_s == 0.0
    assert np.isnan(found.ebb_peak_time_s)
    assert found.slack_time_s.size == 0


@settings(max_examples=30, deadline=None)
@given(st.floats(0.01, 100.0), st.floats(0.0, 0.9), st.floats(0.05, 1.0))
def test_volumes_grow_with_the_flow_and_swap_with_its_sign(factor, start, length):
    span = start * PERIOD_S, (start + length) * PERIOD_S
    one, more, turned = (tidal_discharge(sine(600.0, peak=PEAK * by), *span) for by in (1.0, factor, -1.0))
    assert more.flood_volume_m3 == pytest.approx(factor * one.flood_volume_m3, rel=1e-9, abs=1e-3)
    assert more.ebb_peak_m3_s == pytest.approx(factor * one.ebb_peak_m3_s, rel=1e-9, abs=1e-6)
    assert turned.flood_volume_m3 == pytest.approx(one.ebb_volume_m3, rel=1e-9, abs=1e-3)


def test_the_error_of_a_measured_volume_adds_in_quadrature():
    # Ten steady values with error e, dt apart: weights dt but for the ends, half of it: e dt sqrt(8 + 2/4).
    flow = series(np.arange(10.0) * 1800.0, np.full(10, 500.0), 40.0, "measured", True)
    found = tidal_discharge(flow, 0.0, 9 * 1800.0)
    assert found.flood_volume_error_m3 == pytest.approx(40.0 * 1800.0 * np.sqrt(8.5), rel=1e-12)
    assert found.ebb_volume_error_m3 == 0.0
    assert np.isnan(tidal_discharge(sine(error=5.0), 0.0, PERIOD_S).flood_volume_error_m3)


def test_noise_around_slack_counts_once():
    clean = sine(600.0)
    shaken = clean.discharge_m3_s + 60.0 * np.where(np.arange(clean.time_s.size) % 2, 1.0, -1.0)
    noisy = series(clean.time_s, shaken, 60.0)
    raw = np.count_nonzero(np.diff(np.sign(shaken[1:-1])))
    assert raw > 3
    found = slack_times(noisy, 1000.0, 1.9 * PERIOD_S)
    np.testing.assert_allclose(found, PERIOD_S * np.array([0.5, 1.0, 1.5]), atol=300.0)


def test_a_hole_in_the_span_leaves_no_volume():
    flow = np.array(sine(600.0).discharge_m3_s)
    flow[20:23] = np.nan
    found = tidal_discharge(series(sine(600.0).time_s, flow), 0.0, PERIOD_S)
    assert np.isnan([found.flood_volume_m3, found.ebb_volume_m3, found.flood_peak_m3_s]).all()
    assert np.isfinite(tidal_discharge(series(sine(600.0).time_s, flow), 0.5 * PERIOD_S, PERIOD_S).ebb_volume_m3)


def test_a_span_beyond_the_series_is_refused():
    with pytest.raises(DomainError, match="discharge routed: the span to compare is empty or beyond the series"):
        tidal_discharge(sine(), 0.0, 3.0 * PERIOD_S)
    with pytest.raises(DomainError, match="is empty"):
        tidal_discharge(sine(), 5.0, 5.0)


def test_a_series_out_of_order_is_refused():
    with pytest.raises(ValueError, match="time_s must increase"):
        series(np.array([1.0, 0.0]), np.zeros(2))
    with pytest.raises(ValueError, match="as long as time_s"):
        series(np.array([0.0, 1.0]), np.zeros(3))


def test_campaigns_are_told_apart_by_their_pauses():
    hours = np.array([0.0, 0.5, 1.0, 30.0, 31.0, 33.9, 90.0])
    assert campaign_spans(hours * 3600.0) == ((0.0, 3600.0), (30.0 * 3600.0, 33.9 * 3600.0))


def area_of(level_m):
    return 2.0e7 + 1.0e6 * level_m


@pytest.mark.parametrize(("step_s", "half"), [(60.0, 30), (600.0, 3), (900.0, 2), (1800.0, 2)])
def test_storage_gives_the_discharge_of_an_analytical_level(step_s, half):
    # z = a sin(w t): Q = A(z) a w cos(w t) - inflow.
    time_s = np.arange(0.0, 2.0 * PERIOD_S, step_s)
    level = 1.2 * np.sin(SPEED * time_s)
    found = storage_discharge(time_s, level, area_of, np.full(time_s.shape, 50.0))
    exact = area_of(level) * 1.2 * SPEED * np.cos(SPEED * time_s) - 50.0
    known = np.isfinite(found.discharge_m3_s)
    assert known[half:-half].all()
    assert not known[:half].any()
    assert not known[-half:].any()
    np.testing.assert_allclose(found.discharge_m3_s[known], exact[known], atol=1e-3 * np.abs(exact).max())


def kept_of_the_tide(step_s, half):
    """Slope of sin(w t) by least squares over 2k + 1 samples: sum(j sin(j w dt)) / (w dt sum(j^2)) of the true one."""
    j = np.arange(-half, half + 1)
    return np.sum(j * np.sin(j * SPEED * step_s)) / (SPEED * step_s * np.sum(j**2))


def test_the_error_is_the_scatter_of_the_slope():
    # Slope by least squares over 2k + 1 even samples: variance s^2 / (dt^2 sum of j^2), j from -k to k: 28 for 7.
    time_s = np.arange(20000) * 600.0
    noise = 0.01 * np.random.default_rng(6).standard_normal(time_s.size)
    found = storage_discharge(time_s, noise, lambda level: np.full(level.shape, 2.0e7), np.zeros(time_s.size))
    expected = 2.0e7 * 0.01 / (600.0 * np.sqrt(28.0)) / kept_of_the_tide(600.0, 3)
    known = np.isfinite(found.discharge_m3_s)
    np.testing.assert_allclose(found.standard_error_m3_s[known], expected, rtol=0.03)
    assert np.std(found.discharge_m3_s[known]) == pytest.approx(expected, rel=0.03)


def test_a_parabola_has_its_slope_but_for_what_is_put_back_of_the_tide():
    hours = np.arange(200) / 6.0
    level = 0.1 + 0.2 * hours - 0.003 * hours**2
    found = storage_discharge(hours * 3600.0, level, np.ones_like, np.zeros(200))
    inner = slice(3, -3)
    expected = (0.2 - 0.006 * hours[inner]) / 3600.0 / kept_of_the_tide(600.0, 3)
    np.testing.assert_allclose(found.discharge_m3_s[inner], expected, rtol=1e-9, atol=1e-12)


def test_storage_says_nothing_beside_a_hole():
    time_s = np.arange(100) * 600.0
    level = np.sin(SPEED * time_s)
    level[50] = np.nan
    found = storage_discharge(time_s, level, area_of, np.zeros(100))
    assert np.isnan(found.discharge_m3_s[47:54]).all()
    assert np.isfinite(found.discharge_m3_s[[46, 54]]).all()


def test_storage_of_uneven_levels_is_refused():
    with pytest.raises(DomainError, match="evenly stepped levels; put NaN where there is none"):
        storage_discharge(np.array([0.0, 1.0, 2.0, 3.0, 9.0]), np.zeros(5), area_of, np.zeros(5))
    with pytest.raises(DomainError, match="three rows of one length"):
        storage_discharge(np.arange(5.0), np.zeros(4), area_of, np.zeros(5))


def test_sources_are_compared_over_the_span_they_share():
    measured_s = np.linspace(0.0, PERIOD_S, 25)
    measured = series(measured_s, PEAK * np.sin(SPEED * measured_s), 100.0, "measured", True)
    routed = sine(60.0, peak=1.1 * PEAK)
    late = sine(60.0)
    late = series(late.time_s[100:], late.discharge_m3_s[100:], source="by head")
    (found,) = compare_discharges(measured, (routed, late))
    assert (found.start_s, found.end_s) == (6000.0, measured_s[-1])
    assert [row.source for row in found.rows] == ["measured", "routed", "by head"]
    ratio = found.rows[1].flood_volume_m3 / found.rows[0].flood_volume_m3
    # Straight lines half an hour apart cut off (w dt)^2 / 12 of a sine.
    assert ratio == pytest.approx(1.1 * (1.0 + (SPEED * PERIOD_S / 24.0) ** 2 / 12.0), rel=2e-3)
    assert not found.whole_flood
    assert found.whole_ebb


def test_a_campaign_from_slack_to_slack_holds_whole_half_tides():
    measured = sine(PERIOD_S / 24.0, tides=1.0, source="measured")
    (found,) = compare_discharges(measured, (sine(60.0),))
    assert found.whole_flood
    assert found.whole_ebb


def test_a_campaign_outside_the_other_sources_is_left_out():
    measured = series(np.arange(5) * 1800.0 + 10.0 * PERIOD_S, np.ones(5), 1.0, "measured", True)
    assert compare_discharges(measured, (sine(),)) == ()
    assert compare_discharges(measured, (series(np.arange(2.0), np.full(2, np.nan)),)) == ()
