"""Two gauges held against each other."""

import numpy as np
import pytest

from tidescour.errors import RecordError
from tidescour.gauge.pair import check_pair, common_levels
from tidescour.gauge.records import GaugeRecord, InputFile

TIME_S = 600.0 * np.arange(144 * 10)
PHASE = 2.0 * np.pi * TIME_S / 44714.0
SEA_M = 1.5 * np.sin(PHASE) + 0.02 * np.sin(PHASE * 40.3)
BASIN_M = 1.1 * np.sin(PHASE - 0.4)


def record(side, level_m, time_s=TIME_S, flag=None):
    flag = np.full(time_s.shape, 1) if flag is None else flag
    files = (InputFile(path=f"{side}.csv", sha256="0"),)
    return GaugeRecord(side=side, time_s=time_s, level_m=level_m, flag=flag, step_s=600.0, files=files)


def checked(sea_m=SEA_M, basin_m=BASIN_M, **basin):
    return check_pair(record("sea", sea_m), record("basin", basin_m, **basin))


def test_a_sound_pair_has_its_overlap_noted():
    (finding,) = checked()
    assert (finding.severity, finding.code) == ("note", "overlap")
    assert "1970-01-01T00:00:00Z to 1970-01-10T23:50:00Z, 10.0 days" in finding.message


def test_records_apart_in_time_are_warned_of():
    (finding,) = checked(time_s=TIME_S + 1e7)
    assert (finding.severity, finding.code) == ("warning", "no-overlap")


@pytest.mark.parametrize("shift_m", [0.0, 0.35])
def test_the_same_numbers_on_both_sides_are_refused(shift_m):
    with pytest.raises(RecordError, match=r"the same numbers on 1440 stamps.*sea\.csv and basin\.csv"):
        checked(basin_m=SEA_M + shift_m)


@pytest.mark.parametrize(("factor", "unit"), [(100.0, "cm"), (1000.0, "mm")])
def test_levels_in_another_unit_are_refused_with_the_unit_to_write(factor, unit):
    with pytest.raises(RecordError, match=rf'records\.basin: levels scatter .*unit = "{unit}" in \[records\.basin\]'):
        checked(basin_m=factor * BASIN_M)
    with pytest.raises(RecordError, match=rf'write unit = "{unit}" in \[records\.sea\]'):
        checked(sea_m=factor * SEA_M)


@pytest.mark.parametrize("factor", [0.01, 0.001])
def test_levels_far_too_small_are_refused(factor):
    with pytest.raises(RecordError, match=r"mend the unit of \[records\.basin\]"):
        checked(basin_m=factor * BASIN_M)


def test_a_basin_that_is_all_but_closed_is_no_other_unit():
    seepage_m = 0.015 * np.sin(PHASE - 1.5)
    assert [finding.code for finding in checked(basin_m=seepage_m)] == ["overlap"]


def test_a_ratio_near_feet_is_a_warning():
    findings = checked(basin_m=SEA_M / 3.28 + 0.001 * np.sin(PHASE * 30.0))
    assert [(finding.severity, finding.code) for finding in findings] == [
        ("note", "overlap"),
        ("warning", "feet-ratio"),
    ]


def test_a_turned_sign_is_refused():
    with pytest.raises(RecordError, match='positive = "down"'):
        checked(basin_m=-BASIN_M)


def test_a_level_basin_is_passed():
    assert [finding.code for finding in checked(basin_m=np.zeros(TIME_S.size))] == ["overlap"]


def test_only_good_samples_within_an_hour_are_compared():
    # Sea samples strictly inside a hole of 101 steps drop out; the one inside a hole of two steps is interpolated.
    flag = np.full(TIME_S.shape, 1)
    flag[500:600] = 4
    flag[1000] = 3
    common = common_levels(record("sea", SEA_M), record("basin", BASIN_M, flag=flag))
    assert common.sea_m.size == TIME_S.size - 100
    np.testing.assert_allclose(common.basin_m[:500], BASIN_M[:500])


def test_scaling_both_sides_changes_nothing_but_the_unit_check():
    assert checked(sea_m=3.0 * SEA_M, basin_m=3.0 * BASIN_M) == checked()
