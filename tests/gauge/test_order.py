"""Order of the rows, and clocks that were set back."""

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import RecordError
from tidescour.gauge.order import newest_first, sorted_rows
from tidescour.gauge.raw import RawColumns

STEP_S = 600.0


def raw(time_s, value=None):
    time_s = np.asarray(time_s, dtype=float)
    value = np.sin(0.05 * np.arange(time_s.size)) if value is None else np.asarray(value, dtype=float)
    return RawColumns(
        time_s=time_s, value=value, flag=np.full(value.shape, 2, dtype=np.int8), line=np.arange(2, value.size + 2)
    )


def codes(found):
    return [finding.code for finding in found.findings]


def set_back(count, at, by_s, step_s=STEP_S):
    """Stamps of a clock that is set back by `by_s` before row `at`."""
    time_s = step_s * np.arange(count)
    time_s[at:] -= by_s
    return time_s


def on_a_wall(first, count, step_min, zone):
    """Stamps of a clock on legal time, read as if their offset stayed that of the first one."""
    moments = [first + timedelta(minutes=step_min * i) for i in range(count)]
    walls = [moment.astimezone(ZoneInfo(zone)) for moment in moments]
    offset_s = walls[0].utcoffset().total_seconds()
    return np.array([wall.replace(tzinfo=UTC).timestamp() - offset_s for wall in walls])


@pytest.mark.parametrize("by_min", [11, 20, 25, 30, 60, 720])
@pytest.mark.parametrize("at", [1000, 2999])
def test_a_clock_set_back_is_refused_with_line_and_size(by_min, at):
    message = (
        rf"^sea\.csv line {at + 2}: the stamps go back to .* set back by {by_min} min.*time_zone = .*mend the stamps"
    )
    with pytest.raises(RecordError, match=message):
        sorted_rows(raw(set_back(3000, at, 60.0 * by_min)), "sea.csv")


@pytest.mark.parametrize(
    ("zone", "first"),
    [
        ("Europe/Amsterdam", datetime(2026, 10, 20, tzinfo=UTC)),
        ("America/Los_Angeles", datetime(2026, 10, 28, tzinfo=UTC)),
        ("Australia/Sydney", datetime(2026, 3, 30, tzinfo=UTC)),
    ],
)
@pytest.mark.parametrize("step_min", [1, 6, 10, 15, 30, 60])
def test_legal_time_called_a_fixed_offset_is_refused(zone, first, step_min):
    time_s = on_a_wall(first, 12 * 24 * 60 // step_min, step_min, zone)
    with pytest.raises(RecordError, match="set back by 60 min"):
        sorted_rows(raw(time_s), "sea.csv")
    with pytest.raises(RecordError, match="set back by 60 min"):
        sorted_rows(raw(time_s[::-1]), "sea.csv")


def test_an_hour_read_twice_outside_the_season_is_no_change_of_summer_time():
    time_s = set_back(100, 50, 3600.0, step_s=3600.0) + datetime(2026, 7, 1, tzinfo=UTC).timestamp()
    assert sorted_rows(raw(time_s), "sea.csv").findings == ()


def test_an_hourly_row_given_twice_when_summer_time_ends_is_no_change_of_the_clock():
    first = datetime(2026, 10, 24, tzinfo=UTC).timestamp()
    time_s = first + np.insert(3600.0 * np.arange(72), 25, 25 * 3600.0)
    value = np.insert(np.arange(72.0), 25, 25.0)
    assert sorted_rows(raw(time_s, value), "sea.csv").findings == ()


def test_a_row_given_twice_elsewhere_does_not_hide_the_end_of_summer_time():
    # The hour comes again 121 rows after the first; one row more stands before it, and rows count from line 2.
    time_s = on_a_wall(datetime(2026, 10, 20, tzinfo=UTC), 240, 60, "Europe/Amsterdam")
    twice = raw(np.insert(time_s, 10, time_s[10]), np.insert(np.arange(240.0), 10, 10.0))
    with pytest.raises(RecordError, match=r"line 124: .*set back by 60 min"):
        sorted_rows(twice, "sea.csv")


def test_a_row_sent_again_later_is_a_slip():
    time_s = np.insert(STEP_S * np.arange(500), 200, 190 * STEP_S)
    found = sorted_rows(raw(time_s), "sea.csv")
    assert codes(found) == ["out-of-order"]
    assert found.time_s[190:192].tolist() == [190 * STEP_S] * 2


@given(
    start=st.integers(1, 900),
    moved=st.integers(1, 4),
    over=st.integers(1, 4),
    step_s=st.sampled_from([60.0, 600.0, 3600.0]),
)
@settings(max_examples=40, deadline=None)
def test_two_pieces_swapped_are_sorted_in(start, moved, over, step_s):
    index = np.arange(1000)
    a, b, c = start, start + moved, start + moved + over
    index[a:c] = np.concatenate([np.arange(b, c), np.arange(a, b)])
    found = sorted_rows(raw(step_s * index, index), "sea.csv")
    np.testing.assert_array_equal(found.time_s, step_s * np.arange(1000))
    np.testing.assert_array_equal(found.value, np.arange(1000))
    assert codes(found) == ["out-of-order"]


def test_one_stamp_far_ahead_is_named_and_not_the_rows_below_it():
    time_s = STEP_S * np.arange(3000)
    time_s[99] = 40.0 * 365 * 86400
    message = r"2900 of 3000 rows out of order, first line 102 .* below line 101 \(2009-.*mend line 101"
    with pytest.raises(RecordError, match=message):
        sorted_rows(raw(time_s), "sea.csv")


def test_a_file_from_newest_to_oldest_with_a_slip_is_turned_round():
    time_s = STEP_S * np.arange(300)
    time_s[[100, 101]] = time_s[[101, 100]]
    found = sorted_rows(raw(time_s[::-1]), "sea.csv")
    assert codes(found) == ["reversed", "out-of-order"]
    np.testing.assert_array_equal(found.time_s, STEP_S * np.arange(300))


def test_most_stamps_tell_the_order():
    assert newest_first(np.array([3.0, 2.0, 2.0, 1.0]))
    assert not newest_first(np.array([1.0, 2.0, 0.0, 3.0]))
    assert not newest_first(np.array([1.0]))


@pytest.mark.parametrize("factor", [0.1, 6.0])
def test_the_size_scales_with_the_step(factor):
    with pytest.raises(RecordError, match=f"set back by {30 * factor:g} min"):
        sorted_rows(raw(factor * set_back(500, 200, 1800.0)), "sea.csv")
