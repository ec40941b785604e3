"""Clock, averaging and dated corrections."""

import numpy as np
import pytest

from tidescour.errors import RecordError
from tidescour.gauge.corrections import corrected, mean_gain
from tidescour.plan.models import Clock, Correction

DAY_S = 86400.0
START_S = 1767225600.0  # 2026-01-01T00:00Z
TIME_S = START_S + 3600.0 * np.arange(240)
LEVEL_M = np.sin(TIME_S / 7000.0)


def correction(start, end, **effect):
    return Correction.model_validate({"side": "sea", "from": start, "to": end, "evidence": "relevelled", **effect})


def moved(*corrections, clock=None, level_m=LEVEL_M):
    return corrected(TIME_S, level_m, clock or Clock(), corrections, "records.sea")


def test_nothing_ordered_changes_nothing():
    found = moved()
    np.testing.assert_array_equal(found.time_s, TIME_S)
    np.testing.assert_array_equal(found.level_m, LEVEL_M)
    assert found.findings == ()


@pytest.mark.parametrize(
    ("stamp", "shift_s"), [("mean-preceding", -300.0), ("mean-centred", 0.0), ("mean-following", 300.0)]
)
def test_stamps_of_means_move_to_the_middle_of_the_window(stamp, shift_s):
    found = moved(clock=Clock(stamp=stamp, averaging_s=600.0, clock_shift_s=7.0))
    np.testing.assert_allclose(found.time_s - TIME_S, shift_s + 7.0, atol=1e-6)
    assert [finding.code for finding in found.findings] == ["averaged"]


def test_long_means_are_warned_of():
    found = moved(clock=Clock(stamp="mean-centred", averaging_s=3600.0))
    assert [finding.severity for finding in found.findings] == ["note", "warning"]


@pytest.mark.parametrize("period_h", [12.42, 6.21, 4.14])
def test_the_gain_of_a_mean_is_that_of_the_averaged_wave(period_h):
    # Closed form: the mean of a cosine over a window around its crest.
    at_s = (np.arange(100000) + 0.5) / 100000 * 3600.0 - 1800.0
    mean = np.mean(np.cos(2.0 * np.pi * at_s / (period_h * 3600.0)))
    assert mean_gain(3600.0, period_h) == pytest.approx(mean, rel=1e-9)


def test_the_gain_depends_on_window_over_period_alone():
    assert mean_gain(2.0 * 3600.0, 2.0 * 12.42) == pytest.approx(mean_gain(3600.0, 12.42), rel=1e-14)


def test_a_correction_takes_a_half_open_stretch_of_stamps_as_read():
    found = moved(
        correction("2026-01-02T00:00:00Z", "2026-01-03T00:00:00Z", shift_m=0.12),
        clock=Clock(clock_shift_s=5400.0),
    )
    raised = found.level_m - LEVEL_M
    np.testing.assert_allclose(raised[24:48], 0.12, atol=1e-12)
    assert not raised[:24].any()
    assert not raised[48:].any()
    np.testing.assert_allclose(found.time_s - TIME_S, 5400.0)


def test_drift_grows_with_the_days_since_the_start():
    found = moved(correction("2026-01-02T00:00:00Z", "2026-01-08T00:00:00Z", clock_drift_s_per_day=2.0))
    days = (TIME_S - START_S) / DAY_S - 1.0
    expected_s = np.where((days >= 0.0) & (days < 6.0), 2.0 * days, 0.0)
    np.testing.assert_allclose(found.time_s - TIME_S, expected_s, atol=1e-6)


def test_drift_counts_days_on_the_stamps_as_read():
    span = ("2026-01-01T00:00:00Z", "2026-01-20T00:00:00Z")
    found = moved(correction(*span, clock_shift_s=43200.0), correction(*span, clock_drift_s_per_day=2.0))
    np.testing.assert_allclose(found.time_s - TIME_S, 43200.0 + 2.0 * (TIME_S - START_S) / DAY_S, atol=1e-6)


def test_corrections_add_up():
    one = correction("2026-01-01T00:00:00Z", "2026-01-20T00:00:00Z", shift_m=0.10, clock_shift_s=60.0)
    two = correction("2026-01-05T00:00:00Z", "2026-01-20T00:00:00Z", shift_m=-0.03, clock_shift_s=5.0)
    found = moved(one, two)
    np.testing.assert_allclose(found.level_m[-1] - LEVEL_M[-1], 0.07)
    np.testing.assert_allclose(found.time_s[[0, -1]] - TIME_S[[0, -1]], [60.0, 65.0])


def test_twice_the_correction_moves_twice_as_far():
    span = ("2026-01-02T00:00:00Z", "2026-01-08T00:00:00Z")
    once = moved(correction(*span, shift_m=0.1, clock_shift_s=10.0, clock_drift_s_per_day=1.0))
    twice = moved(correction(*span, shift_m=0.2, clock_shift_s=20.0, clock_drift_s_per_day=2.0))
    np.testing.assert_allclose(twice.level_m - LEVEL_M, 2.0 * (once.level_m - LEVEL_M), atol=1e-12)
    np.testing.assert_allclose(twice.time_s - TIME_S, 2.0 * (once.time_s - TIME_S), atol=1e-6)


def test_each_correction_is_reported_with_before_and_after():
    level_m = np.full(TIME_S.shape, 1.0)
    level_m[3] = np.nan
    found = moved(correction("2026-01-01T00:00:00Z", "2026-01-02T00:00:00Z", shift_m=0.25), level_m=level_m)
    (finding,) = found.findings
    assert finding.code == "correction-applied"
    assert "24 samples, mean level 1.0000 m before, 1.2500 m after; evidence: relevelled" in finding.message
    assert np.isnan(found.level_m[3])


def test_a_correction_beside_the_record_is_warned_of():
    (finding,) = moved(correction("2027-01-01T00:00:00Z", "2027-01-02T00:00:00Z", shift_m=0.25)).findings
    assert (finding.severity, finding.code) == ("warning", "correction-idle")


def test_stamps_that_collide_are_refused_naming_the_correction():
    one = correction("2026-01-02T00:00:00Z", "2026-01-03T00:00:00Z", clock_shift_s=3600.0)
    harmless = correction("2026-01-01T00:00:00Z", "2026-01-09T00:00:00Z", shift_m=0.1)
    message = r"^records.sea: \[\[correction\]\] of sea from 2026-01-02T00:00:00Z to 2026-01-03T00:00:00Z brings"
    with pytest.raises(RecordError, match=message):
        moved(one, harmless)


def test_a_collision_is_not_answered_with_exclusion():
    with pytest.raises(RecordError, match=r"end it before the samples.*take those out of the file") as refusal:
        moved(correction("2026-01-02T00:00:00Z", "2026-01-03T00:00:00Z", clock_shift_s=3600.0))
    assert "exclude" not in str(refusal.value)


def test_inputs_are_left_alone():
    before = TIME_S.copy(), LEVEL_M.copy()
    moved(correction("2026-01-02T00:00:00Z", "2026-01-03T00:00:00Z", shift_m=0.12))
    np.testing.assert_array_equal(TIME_S, before[0])
    np.testing.assert_array_equal(LEVEL_M, before[1])
