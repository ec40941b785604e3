"""Excerpts of files as agencies and loggers write them; sources in tests/data/README.md."""

from pathlib import Path

import numpy as np
import pytest

from tidescour.errors import RecordError
from tidescour.gauge.pair import check_pair
from tidescour.gauge.read import read_gauge
from tidescour.plan.models import RecordSource
from tidescour.units import utc_text

DATA = Path(__file__).parent.parent / "data" / "gauge"


def gauge(file, side="sea", **keys):
    source = RecordSource.model_validate({"files": [file], "unit": "m", **keys})
    return read_gauge(source, side, (), DATA)


def codes(record):
    return [finding.code for finding in record.findings]


def test_a_logger_with_date_and_time_apart():
    keys = {"time": ("Date", "Time"), "level": "Depth_NAVD88m", "time_format": "%m/%d/%Y %H:%M:%S"}
    record = gauge("edc_logger_split_date_time.csv", **keys, utc_offset="-05:00")
    assert (record.time_s.size, record.step_s) == (240, 360.0)
    assert utc_text(record.time_s[0]) == "2014-12-05T05:00:00Z"
    assert record.level_m[:2].tolist() == [-0.2034, -0.211]
    assert record.findings == ()


def test_a_logger_whose_order_of_day_and_month_is_open():
    with pytest.raises(RecordError, match=r'"%d/%m/%Y %H:%M:%S" or "%m/%d/%Y %H:%M:%S"'):
        gauge("edc_logger_split_date_time.csv", time=("Date", "Time"), level="Depth_NAVD88m", utc_offset="-05:00")


def test_an_agency_file_with_blanks_after_commas():
    record = gauge("noaa_coops_hourly.csv", time="Date Time", level="Water Level", utc_offset="+00:00")
    assert (record.time_s.size, record.step_s) == (99, 3600.0)
    assert record.level_m[:3].tolist() == [1.035, 0.988, 0.865]
    assert utc_text(record.time_s[0]) == "2012-01-01T00:00:00Z"


def test_an_agency_file_without_its_offset_is_refused():
    with pytest.raises(RecordError, match="the plan gives none"):
        gauge("noaa_coops_hourly.csv", time="Date Time", level="Water Level")


def test_a_semicolon_file_with_decimal_commas_and_cr_line_ends():
    record = gauge(
        "rws_waterinfo_20200128_044.csv",
        time=("WAARNEMINGDATUM", "WAARNEMINGTIJD"),
        time_format="%d-%m-%Y %H:%M:%S",
        level="NUMERIEKEWAARDE",
        unit="cm",
        utc_offset="+01:00",
    )
    np.testing.assert_allclose(record.level_m, [6.28, 6.02, 5.72, 5.50], rtol=1e-14)
    assert utc_text(record.time_s[0]) == "1990-01-01T07:00:00Z"
    position = gauge(
        "rws_waterinfo_20200128_044.csv",
        time=("WAARNEMINGDATUM", "WAARNEMINGTIJD"),
        time_format="%d-%m-%Y %H:%M:%S",
        level="X",
        unit="mm",
        utc_offset="+01:00",
    )
    np.testing.assert_allclose(position.level_m, 680.971416970065, rtol=1e-14)
    assert codes(position) == ["decimal-comma"]


def test_a_tab_file_with_text_above_and_a_legal_12_hour_clock():
    keys = {"time": ("Date", "Time"), "level": "Pred", "unit": "ft", "time_format": "%Y/%m/%d %I:%M %p"}
    record = gauge("noaa_hilo_predictions_ampm_lstldt.txt", **keys, time_zone="America/Los_Angeles")
    assert record.time_s.size == 8
    assert utc_text(record.time_s[0]) == "2016-07-13T08:18:00Z"
    assert record.level_m[0] == pytest.approx(1.44 * 0.3048, rel=1e-14)
    assert "lines-above-header" in codes(record)


def test_a_logger_with_feet_and_metres_side_by_side():
    keys = {"time": "DateTime", "time_format": "%m/%d/%Y %H:%M", "utc_offset": "-08:00"}
    name = "tidegate_logger_ft_and_m.csv"
    feet = gauge(name, level="Tidal Level Upstream (ft)", unit="ft", **keys)
    metres = gauge(name, level="Tidal Level Inside Tidegate [m]", side="basin", **keys)
    np.testing.assert_allclose(feet.level_m, metres.level_m, atol=1e-6)
    with pytest.raises(RecordError, match="the same numbers"):
        check_pair(feet, metres)
    taken_for_metres = gauge(name, level="Tidal Level Upstream (ft)", **keys)
    assert "unit-in-header" in codes(taken_for_metres)


def test_a_packed_logger_file_with_both_sides_doubled_stamps_and_changing_steps():
    keys = {"time": "DateTime", "time_format": "%m/%d/%Y %H:%M", "utc_offset": "-08:00"}
    name = "tidegate_logger_raw.csv.gz"
    sea = gauge(name, level="Tidal Level Outside Tidegate [m]", **keys)
    basin = gauge(name, side="basin", level="Tidal Level Inside Tidegate [m]", **keys)
    assert "repeated-rows" in codes(sea)
    # Line 79 and 80 of the excerpt: 9/29/2021 12:15 twice, once without a value.
    at = np.searchsorted(sea.time_s, np.datetime64("2021-09-29T20:15:00").astype(np.int64))
    assert sea.level_m[at] == 1.72212
    assert sea.flag[at] == 2
    assert set(sea.flag.tolist()) == {2, 9}
    assert [finding.code for finding in check_pair(sea, basin)] == ["overlap"]
