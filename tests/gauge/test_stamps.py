"""From the text of stamps to seconds on UTC."""

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import RecordError
from tidescour.gauge.raw import Reading
from tidescour.gauge.stamps import clock_readings, utc_stamps
from tidescour.gauge.zones import offset_seconds, utc_from_zone
from tidescour.plan.models import Clock

NEW_YEAR_2026_S = 1767225600.0  # 56 years of 365 days and 14 leap days after 1970: 20454 days


def stamps(cells, **clock):
    cells = list(cells)
    reading = Reading(
        where="records.sea: sea.csv",
        table="records.sea",
        clock=Clock(**clock),
        value="level_m",
        value_key="level",
        unit="m",
    )
    return utc_stamps(cells, np.arange(2, len(cells) + 2), reading)


def codes(found):
    return [finding.code for finding in found.findings]


@pytest.mark.parametrize(
    ("cell", "seconds"),
    [
        ("2026-01-01T00:00Z", 0.0),
        ("2026-01-01 00:00Z", 0.0),
        ("2026-01-01 01:00:00+01:00", 0.0),
        ("2026-01-01 01:00:00 +0100", 0.0),
        ("2025-12-31T19:00:00.250-05", 0.25),
        ("2026-01-01T00:00:01,5Z", 1.5),
        ("2026-01-01T05:30+05:30", 0.0),
    ],
)
def test_iso_stamps_with_their_offset_come_out_on_utc(cell, seconds):
    assert stamps([cell]).time_s.tolist() == [NEW_YEAR_2026_S + seconds]


@pytest.mark.parametrize(
    ("cell", "time_format"),
    [
        ("2026-01-01 01:00", "iso"),
        ("1/1/2026 1:00", "%m/%d/%Y %H:%M"),
        ("01.01.2026 01:00:00", "%d.%m.%Y %H:%M:%S"),
        ("1/1/2026 1:00 AM", "%m/%d/%Y %I:%M %p"),
        ("2026 001 01:00", "%Y %j %H:%M"),
        ("01-Jan-2026 01:00", "%d-%b-%Y %H:%M"),
        ("01-01-2026 01:00 +0100", "%d-%m-%Y %H:%M %z"),
    ],
)
def test_a_fixed_offset_is_taken_off(cell, time_format):
    assert stamps([cell], time_format=time_format, utc_offset="+01:00").time_s.tolist() == [NEW_YEAR_2026_S]


def test_serial_dates_count_from_the_1900_system():
    # The documentation of the spreadsheet function DATE gives 39448 for 1 January 2008 (from memory); 25569 is the
    # count of days to 1970.
    found = stamps(["39448", "25569.5", "46023.0416667"], time_format="excel", utc_offset="+00:00")
    expected = [datetime(2008, 1, 1, tzinfo=UTC).timestamp(), 43200.0, NEW_YEAR_2026_S + 3600.0]
    assert found.time_s.tolist() == expected
    assert codes(found) == ["serial-dates"]


@pytest.mark.parametrize("cell", ["0", "59.5", "2958466", "nan", "2026-01-01"])
def test_what_is_no_serial_date_is_refused(cell):
    with pytest.raises(RecordError, match="no stamp"):
        stamps(["46023", cell], time_format="excel", utc_offset="+00:00")


@pytest.mark.parametrize(
    ("cell", "time_format"),
    [("2025-12-31 24:00", "iso"), ("2025-12-31T24:00:00", "iso"), ("31-12-2025 24:00", "%d-%m-%Y %H:%M")],
)
def test_midnight_written_as_24_is_the_next_day(cell, time_format):
    found = stamps([cell], time_format=time_format, utc_offset="+00:00")
    assert found.time_s.tolist() == [NEW_YEAR_2026_S]
    assert codes(found) == ["midnight-24"]


def test_a_leap_second_is_folded_into_the_next():
    found = stamps(["2016-12-31T23:59:60Z", "2016-12-31T23:59:59Z"])
    new_year_s = datetime(2017, 1, 1, tzinfo=UTC).timestamp()
    assert found.time_s.tolist() == [new_year_s, new_year_s - 1.0]
    assert codes(found) == ["leap-second"]


@pytest.mark.parametrize(
    "cell",
    [
        "2026-13-01 00:00",
        "2026-02-30 00:00",
        "2026-01-01 24:01",
        "2026-01-01",
        "20260101 00:00",
        "01/02/2026 00:00",
        "2026-01-01 00:00 CET",
        "٢٠٢٦-01-01 00:00",
        "",
    ],
)
def test_what_is_not_iso_is_refused_with_its_line(cell):
    with pytest.raises(RecordError, match="line 3"):
        stamps(["2026-01-01 00:00", cell], utc_offset="+00:00")


def test_the_refusal_names_the_format_that_fits():
    with pytest.raises(RecordError, match=r'write time_format = "%d/%m/%Y %H:%M"$'):
        stamps(["31/01/2026 00:00", "01/02/2026 00:00"], utc_offset="+00:00")


def test_an_undecided_order_of_day_and_month_is_said():
    with pytest.raises(RecordError, match=r'"%d/%m/%Y %H:%M" or "%m/%d/%Y %H:%M" \(which of them cannot be told'):
        stamps(["01/02/2026 00:00", "02/02/2026 00:00"], utc_offset="+00:00")


def test_day_numbers_of_a_spreadsheet_are_recognised_in_the_refusal():
    with pytest.raises(RecordError, match='"excel"'):
        stamps(["46023.0", "46023.5"], utc_offset="+00:00")


@pytest.mark.parametrize(
    ("time_format", "message"),
    [
        ("%d-%m-%y %H:%M", "two-digit year"),
        ("%d-%m %H:%M", "no year"),
        ("%Y %H:%M", "needs the day and the month"),
        ("%d-%m-%Y %I:%M", "needs both %I and %p"),
        ("%d-%m-%Y %H:%M %p", "needs both %I and %p"),
        ("%d-%m-%Y %H:%M %Z", "not unique"),
        ("%z %d-%m-%Y %H:%M", "at the end only"),
        ("%d-%m-%Y %Q", "cannot be used"),
    ],
)
def test_formats_that_leave_the_moment_open_are_refused(time_format, message):
    with pytest.raises(RecordError, match=message):
        stamps(["01-01-2026 00:00"], time_format=time_format, utc_offset="+00:00")


def test_stamps_without_any_offset_are_refused_with_the_line_to_write():
    with pytest.raises(RecordError, match=r"'2026-01-01 00:00'.*\[records.sea\] utc_offset = \"\+00:00\""):
        stamps(["2026-01-01 00:00", "2026-01-01 00:10"])


def test_rows_with_and_without_an_offset_are_refused():
    with pytest.raises(RecordError, match=r"line 2: '2026-01-01 00:00Z'.*line 3"):
        stamps(["2026-01-01 00:00Z", "2026-01-01 00:10"])


def test_mixed_offsets_are_brought_to_utc_with_a_note():
    found = stamps(["2026-03-29T01:00+01:00", "2026-03-29T03:00+02:00"])
    assert np.diff(found.time_s).tolist() == [3600.0]
    assert codes(found) == ["mixed-offsets"]


@pytest.mark.parametrize("key", [{"utc_offset": "+01:00"}, {"time_zone": "Europe/Amsterdam"}])
def test_an_offset_against_the_plan_is_refused(key):
    with pytest.raises(RecordError, match="another offset"):
        stamps(["2026-01-01T00:00Z"], **key)


def test_an_offset_that_agrees_with_the_plan_is_read():
    cells = ["2026-01-01T01:00+01:00", "2026-07-01T02:00+02:00"]
    assert stamps(cells, time_zone="Europe/Amsterdam").time_s[0] == NEW_YEAR_2026_S
    assert stamps(cells[:1], utc_offset="+01:00").time_s[0] == NEW_YEAR_2026_S


@pytest.mark.parametrize(
    ("text", "seconds"), [("Z", 0.0), ("+01", 3600.0), ("+0530", 19800.0), ("-03:30", -12600.0), ("+14:00", 50400.0)]
)
def test_an_offset_is_read_as_seconds_east_of_utc(text, seconds):
    assert offset_seconds(text, "records.sea") == seconds


@pytest.mark.parametrize("text", ["+14:30", "+15:00", "+01:75", "-99", "one", "", "+1:00", "01:00", "+\u0660\u0661:00"])
def test_an_offset_that_is_none_is_refused(text):
    with pytest.raises(RecordError, match="no offset from UTC"):
        offset_seconds(text, "records.sea")


def test_a_stamp_with_an_offset_beyond_14_hours_is_refused():
    with pytest.raises(RecordError, match=r"'\+15:00' is no offset from UTC"):
        stamps(["2026-01-01T00:00+15:00"])


@pytest.mark.parametrize("year", ["1799", "0001", "2201", "9999"])
def test_a_stamp_far_from_our_time_is_refused_with_its_line(year):
    with pytest.raises(RecordError, match=rf"line 3: '{year}-12-31 23:00' is outside the years 1800 to 2200 \(1 row\)"):
        stamps(["2026-01-01 00:00", f"{year}-12-31 23:00"], utc_offset="+00:00")


def test_stamps_of_the_first_and_the_last_year_are_read():
    found = stamps(["1800-01-01 00:00", "2200-12-31 23:59"], utc_offset="+00:00")
    expected = [datetime(1800, 1, 1, tzinfo=UTC).timestamp(), datetime(2200, 12, 31, 23, 59, tzinfo=UTC).timestamp()]
    assert found.time_s.tolist() == expected


def local_texts(first_utc, count, step_min, zone):
    moments = [first_utc + timedelta(minutes=step_min * i) for i in range(count)]
    return [moment.astimezone(ZoneInfo(zone)).strftime("%Y-%m-%d %H:%M") for moment in moments]


@given(
    step_min=st.sampled_from([1, 6, 10, 15, 20, 30, 60]),
    lead_h=st.integers(0, 5),
    zone=st.sampled_from(["Europe/Amsterdam", "America/Los_Angeles", "Australia/Lord_Howe"]),
)
@settings(max_examples=25, deadline=None)
def test_a_whole_autumn_night_of_legal_time_comes_back_to_utc(step_min, lead_h, zone):
    # Clocks go back at 2026-10-25 01:00 UTC, 2026-11-01 09:00 UTC and, by half an hour, 2026-04-04 15:00 UTC.
    ends = {
        "Europe/Amsterdam": datetime(2026, 10, 25, 1, tzinfo=UTC),
        "America/Los_Angeles": datetime(2026, 11, 1, 9, tzinfo=UTC),
        "Australia/Lord_Howe": datetime(2026, 4, 4, 15, tzinfo=UTC),
    }
    if zone == "Australia/Lord_Howe" and step_min == 60:
        step_min = 30
    first = ends[zone] - timedelta(hours=2 + lead_h)
    count = (10 + lead_h) * 60 // step_min
    found = stamps(local_texts(first, count, step_min, zone), time_zone=zone)
    assert found.time_s.tolist() == [first.timestamp() + 60.0 * step_min * i for i in range(count)]
    assert codes(found) == ["doubled-hour"]


def test_a_legal_time_file_from_newest_to_oldest_comes_back_to_utc():
    first = datetime(2026, 10, 24, 12, tzinfo=UTC)
    cells = local_texts(first, 200, 10, "Europe/Amsterdam")
    found = stamps(cells[::-1], time_zone="Europe/Amsterdam")
    assert found.time_s[::-1].tolist() == [first.timestamp() + 600.0 * i for i in range(200)]
    assert codes(found) == ["doubled-hour"]


def test_a_single_copy_of_the_doubled_hour_is_refused():
    cells = ["2026-10-25 01:30", "2026-10-25 02:00", "2026-10-25 02:30", "2026-10-25 03:00"]
    with pytest.raises(RecordError, match=r"lines 3 to 4: 2026-10-25 02:00 to 02:30 comes twice in Europe/Amsterdam"):
        stamps(cells, time_zone="Europe/Amsterdam")


def test_two_steps_back_in_the_doubled_hour_are_refused():
    cells = ["2026-10-25 02:00", "2026-10-25 02:00", "2026-10-25 02:00", "2026-10-25 03:00"]
    with pytest.raises(RecordError, match="comes twice"):
        stamps(cells, time_zone="Europe/Amsterdam")


def test_the_hour_that_spring_leaves_out_is_refused():
    with pytest.raises(RecordError, match=r"line 3: 2026-03-29 02:30:00 does not exist in Europe/Amsterdam"):
        stamps(["2026-03-29 01:30", "2026-03-29 02:30", "2026-03-29 03:30"], time_zone="Europe/Amsterdam")


def test_an_unknown_zone_is_refused():
    with pytest.raises(RecordError, match="Europe/Nowhere"):
        utc_from_zone(np.zeros(1), "Europe/Nowhere", np.array([2]), "sea.csv")


def test_readings_that_do_not_follow_the_format_are_nan():
    found = clock_readings(["2026-01-01 00:00", "Average", ""], "iso", "sea.csv")
    assert np.isnan(found.local_s).tolist() == [False, True, True]
    assert np.isnan(found.offset_s).all()
