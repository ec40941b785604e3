"""From files to records."""

import gzip
import hashlib
from datetime import UTC, datetime

import numpy as np
import pytest

from tidescour.errors import RecordError
from tidescour.gauge.read import commonest_step, matching_files, read_gauge, read_series
from tidescour.plan.models import Correction, RecordSource, Series

START_S = 1767225600.0  # 2026-01-01T00:00Z
LEVEL_M = np.round(1.5 * np.sin(2.0 * np.pi * np.arange(300) * 600.0 / 44714.0), 3)


def text(values=LEVEL_M, first=0, step_s=600.0, name="level_m"):
    time_s = START_S + step_s * (first + np.arange(len(values)))
    stamps = np.datetime_as_string(time_s.astype("datetime64[s]"), unit="s")
    return f"time,{name}\n" + "".join(f"{s}Z,{v:.3f}\n" for s, v in zip(stamps, values, strict=True))


def source(**keys):
    return RecordSource.model_validate({"files": ["sea.csv"], "unit": "m", **keys})


def gauge(folder, content=None, side="sea", corrections=(), **keys):
    if content is not None:
        (folder / "sea.csv").write_text(content, encoding="utf-8")
    return read_gauge(source(**keys), side, corrections, folder)


def codes(record):
    return [finding.code for finding in record.findings]


def test_a_plain_record_comes_out_as_it_stands(tmp_path):
    content = text()
    record = gauge(tmp_path, content)
    np.testing.assert_array_equal(record.level_m, LEVEL_M)
    np.testing.assert_array_equal(record.time_s, START_S + 600.0 * np.arange(300))
    assert set(record.flag.tolist()) == {2}
    assert record.step_s == 600.0
    assert record.findings == ()
    (file,) = record.files
    assert (file.path, file.sha256) == ("sea.csv", hashlib.sha256(content.encode()).hexdigest())


@pytest.mark.parametrize(("unit", "metres"), [("m", 1.0), ("cm", 0.01), ("mm", 0.001), ("ft", 0.3048)])
def test_units_are_brought_to_metres(tmp_path, unit, metres):
    record = gauge(tmp_path, text(), unit=unit)
    np.testing.assert_allclose(record.level_m, metres * LEVEL_M, rtol=1e-14)


def test_the_order_is_missing_unit_sign_range_shift(tmp_path):
    # The raw -250 is listed as missing before the unit; 120 cm down is -1.20 m, inside the range on the sensor's zero
    # and below it once shifted; 150 cm down is outside.
    values = [120.0, -250.0, 150.0, 110.0, 100.0, 90.0]
    record = gauge(
        tmp_path,
        text(values),
        unit="cm",
        positive="down",
        missing=[-250.0],
        sensor_range_m=[-1.3, 0.0],
        shift_m=-0.5,
    )
    np.testing.assert_allclose(record.level_m, [-1.7, np.nan, -2.0, -1.6, -1.5, -1.4])
    assert record.flag.tolist() == [1, 9, 4, 1, 1, 1]
    assert "sensor-range" in codes(record)


def test_a_missing_value_clashes_with_no_other(tmp_path):
    # Once in a doubled stamp before the value, once after it, once in the overlap of two files.
    rows = text().splitlines(keepends=True)
    doubled = rows.copy()
    doubled.insert(51, rows[51].split(",")[0] + ",-999.0\n")
    doubled.insert(103, rows[101].split(",")[0] + ",-999.0\n")
    gap = rows[:1] + rows[200:]
    gap[20] = gap[20].split(",")[0] + ",-999.0\n"
    (tmp_path / "sea_1.csv").write_text("".join(doubled[:260]), encoding="utf-8")
    (tmp_path / "sea_2.csv").write_text("".join(gap), encoding="utf-8")
    record = gauge(tmp_path, files=["sea_*.csv"])
    np.testing.assert_array_equal(record.level_m, LEVEL_M)
    assert set(record.flag.tolist()) == {2}
    assert codes(record) == ["missing-values", "repeated-rows", "missing-values", "overlap-merged"]


def test_missing_values_are_counted_with_the_first(tmp_path):
    values = LEVEL_M.copy()
    values[[40, 41]] = -999.0
    (finding,) = gauge(tmp_path, text(values)).findings
    assert (finding.severity, finding.code, finding.where) == ("note", "missing-values", "records.sea: sea.csv")
    assert finding.message.startswith("-999 on 2 rows, first line 42 (2026-01-01T06:40:00Z)")


def test_the_default_missing_value_among_ordinary_levels_is_a_warning(tmp_path):
    # 1.5 m in millimetres passes -999 in steps of up to 126; the tide is set to meet it twice.
    values = np.round(1000.0 * LEVEL_M)
    near = np.flatnonzero(np.abs(values + 999.0) < 60.0)[[0, 5]]
    values[near] = -999.0
    content = text(values, name="level_mm")
    keys = {"unit": "mm", "level": "level_mm"}
    record = gauge(tmp_path, content, **keys)
    assert np.flatnonzero(record.flag == 9).tolist() == near.tolist()
    assert [(finding.severity, finding.code) for finding in record.findings] == [
        ("note", "missing-values"),
        ("warning", "missing-among-values"),
    ]
    assert "Write missing = [] in [records.sea] if it was measured" in record.findings[1].message
    assert gauge(tmp_path, content, missing=[], **keys).findings == ()
    assert codes(gauge(tmp_path, content, missing=[-999.0], **keys)) == ["missing-values"]


def test_nothing_fails_for_range_without_a_range(tmp_path):
    values = LEVEL_M.copy()
    values[100] = 25.0
    assert set(gauge(tmp_path, text(values)).flag.tolist()) == {2}


def test_excluded_samples_keep_their_value_and_are_flagged_4(tmp_path):
    span = [datetime(2026, 1, 1, 1, tzinfo=UTC), datetime(2026, 1, 1, 2, tzinfo=UTC)]
    record = gauge(tmp_path, text(), exclude=[span], clock_shift_s=600)
    # On the shifted clock the sixth sample stands at 01:00 + 10 min - 10 min.
    assert np.flatnonzero(record.flag == 4).tolist() == [5, 6, 7, 8, 9, 10]
    np.testing.assert_array_equal(record.level_m, LEVEL_M)
    assert "excluded" in codes(record)


def test_only_corrections_of_this_side_are_applied(tmp_path):
    common = {"from": "2026-01-01T00:00:00Z", "to": "2026-01-02T00:00:00Z", "shift_m": 0.1, "evidence": "staff"}
    corrections = tuple(Correction.model_validate({"side": side, **common}) for side in ("sea", "basin"))
    record = gauge(tmp_path, text(), corrections=corrections)
    np.testing.assert_allclose(record.level_m[:144] - LEVEL_M[:144], 0.1)
    assert codes(record) == ["correction-applied"]


def test_an_unlisted_missing_value_is_refused_with_the_line_to_write(tmp_path):
    values = LEVEL_M.copy()
    values[[40, 41]] = -9999.0
    with pytest.raises(RecordError, match=r"-9999 on 2 rows \(first on line 42.*missing = \[-999, -9999\]"):
        gauge(tmp_path, text(values))
    record = gauge(tmp_path, text(values), missing=[-999.0, -9999.0])
    assert np.flatnonzero(record.flag == 9).tolist() == [40, 41]
    assert np.isnan(record.level_m[[40, 41]]).all()


def test_gaps_are_reported_and_no_row_is_invented(tmp_path):
    rows = text().splitlines(keepends=True)
    record = gauge(tmp_path, "".join(rows[:100] + rows[130:]))
    assert record.time_s.size == 270
    (finding,) = record.findings
    assert finding.code == "gaps"
    # Row 99 stands at 98 x 10 min, row 130 at 129 x 10 min: 31 steps.
    assert "1 gap over 1 h between samples read, together 5.2 h" in finding.message
    assert "2026-01-01T16:20:00Z" in finding.message


def test_a_gap_longer_than_the_record_is_a_warning(tmp_path):
    rows = text().splitlines(keepends=True)
    record = gauge(tmp_path, "".join(rows[:-1]) + "2062-01-01T00:00:00Z,0.5\n")
    (finding,) = record.findings
    assert (finding.severity, finding.code) == ("warning", "gaps")
    assert "is a stamp wrong?" in finding.message
    (finding,) = gauge(tmp_path, "".join(rows[:100] + rows[130:])).findings
    assert finding.severity == "note"


def test_several_files_are_joined_and_all_named(tmp_path):
    (tmp_path / "data").mkdir()
    (tmp_path / "data" / "sea_2.csv").write_bytes(gzip.compress(text(LEVEL_M[140:], first=140).encode()))
    (tmp_path / "data" / "sea_1.csv").write_text(text(LEVEL_M[:160]), encoding="utf-8")
    record = gauge(tmp_path, files=["data/sea_*.csv"])
    np.testing.assert_array_equal(record.level_m, LEVEL_M)
    assert [file.path for file in record.files] == ["data/sea_1.csv", "data/sea_2.csv"]
    assert codes(record) == ["overlap-merged"]


def test_a_file_named_twice_is_read_once(tmp_path):
    (tmp_path / "sea.csv").write_text(text(), encoding="utf-8")
    record = gauge(tmp_path, files=["sea.csv", "*.csv"])
    assert len(record.files) == 1
    assert record.findings == ()


def test_a_name_with_brackets_is_no_pattern(tmp_path):
    (tmp_path / "sea[1].csv").write_text(text(), encoding="utf-8")
    assert [path.name for path in matching_files(["sea[1].csv"], tmp_path, "records.sea")] == ["sea[1].csv"]


def test_a_pattern_that_fits_nothing_is_refused_with_what_is_there(tmp_path):
    (tmp_path / "see.csv").write_text(text(), encoding="utf-8")
    with pytest.raises(RecordError, match=r"records\.sea: 'sea\*\.csv' fits no file; the folder .* holds see\.csv"):
        gauge(tmp_path, files=["sea*.csv"])
    with pytest.raises(RecordError, match="there is no folder 'data'"):
        gauge(tmp_path, files=["data/sea.csv"])


@pytest.mark.parametrize(
    "content", ["", "time,level_m\n", "time,level_m\n2026-01-01T00:00Z,1.0\n", text([-999.0, -999.0, -999.0])]
)
def test_a_record_without_two_values_is_refused(tmp_path, content):
    with pytest.raises(RecordError, match=r"records\.sea"):
        gauge(tmp_path, content)


def test_levels_that_no_tide_spans_are_refused(tmp_path):
    with pytest.raises(RecordError, match=r"spread over 300 m, which no tide does.*unit = \"m\""):
        gauge(tmp_path, text(100.0 * LEVEL_M))


GARBAGE_M = np.where(np.arange(300) % 20 == 7, 40.0 + 0.1 * np.arange(300), LEVEL_M)


def test_levels_outside_the_range_of_the_sensor_do_not_count_for_the_spread(tmp_path):
    with pytest.raises(RecordError, match="which no tide does"):
        gauge(tmp_path, text(GARBAGE_M))
    record = gauge(tmp_path, text(GARBAGE_M), sensor_range_m=[-5.0, 5.0])
    assert np.flatnonzero(record.flag == 4).tolist() == list(range(7, 300, 20))


def test_excluded_levels_do_not_count_for_the_spread(tmp_path):
    values = np.where(np.arange(300) < 30, 60.0 + np.arange(300), LEVEL_M)
    span = [datetime(2026, 1, 1, tzinfo=UTC), datetime(2026, 1, 1, 5, tzinfo=UTC)]
    assert (gauge(tmp_path, text(values), exclude=[span]).flag == 4).sum() == 30
    everything = [datetime(2026, 1, 1, tzinfo=UTC), datetime(2026, 2, 1, tzinfo=UTC)]
    assert (gauge(tmp_path, text(values), exclude=[everything]).flag == 4).all()


def test_a_name_that_the_system_cannot_take_is_refused(tmp_path):
    for name in ("x" * 5000 + ".csv", "d/" + "y" * 5000 + "/*.csv"):
        with pytest.raises(RecordError, match=r"records\.sea: '"):
            gauge(tmp_path, files=[name])


def test_a_clock_set_back_is_refused_with_file_and_line(tmp_path):
    rows = text().splitlines(keepends=True)
    again = text(LEVEL_M[200:], first=194).splitlines(keepends=True)
    with pytest.raises(RecordError, match=r"records\.sea: sea\.csv line 202: .*set back by 60 min"):
        gauge(tmp_path, "".join(rows[:201] + again[1:]))


def test_an_unknown_layout_is_refused_with_the_list(tmp_path):
    with pytest.raises(RecordError, match="layout = 'column'; it must be one of columns"):
        gauge(tmp_path, text(), layout="column")


def test_the_commonest_step_is_found_and_scales():
    time_s = np.array([0.0, 900.0, 1800.0, 2100.0, 3000.0, 4800.0])
    assert commonest_step(time_s) == 900.0
    assert commonest_step(4.0 * time_s) == 3600.0


def given_series(folder, content, **keys):
    (folder / "storm.csv").write_text(content, encoding="utf-8")
    keys = {"file": "storm.csv", "quantity": "level", "unit": "m", **keys}
    return read_series("storm", Series.model_validate(keys), folder)


def test_a_given_series_is_read_and_missing_rows_left_out(tmp_path):
    values = 100.0 * LEVEL_M
    values[[10, 20]] = -999.0
    content = text(values, name="level_cm")
    series = given_series(tmp_path, content, value="level_cm", unit="cm", clock_shift_s=60.0)
    kept = np.delete(np.arange(300), [10, 20])
    np.testing.assert_allclose(series.value, LEVEL_M[kept], atol=1e-12)
    np.testing.assert_allclose(series.time_s, START_S + 60.0 + 600.0 * kept)
    assert (series.name, series.quantity, series.file.path) == ("storm", "level", "storm.csv")
    assert codes(series) == ["missing-values", "rows-left-out"]


def test_given_discharges_keep_their_unit(tmp_path):
    values = np.where(np.arange(300) % 100 < 5, 4000.0, 0.0)
    series = given_series(tmp_path, text(values, name="q"), quantity="discharge", unit="m3/s", value="q")
    np.testing.assert_array_equal(series.value, values)


def test_a_given_series_with_two_values_at_one_time_is_refused(tmp_path):
    rows = text().splitlines(keepends=True)
    rows.insert(50, rows[49].split(",")[0] + ",9.000\n")
    with pytest.raises(RecordError, match=r"series\.storm: storm\.csv line 50: 2026-01-01T08:00:00Z comes twice"):
        given_series(tmp_path, "".join(rows))


def test_the_key_of_a_series_is_named_where_its_column_is_not_found(tmp_path):
    with pytest.raises(RecordError, match=r"series\.storm: storm\.csv: value = 'q' is not in the header"):
        given_series(tmp_path, text(), value="q")


def test_a_missing_value_at_a_doubled_stamp_of_a_series_is_passed_over(tmp_path):
    rows = text().splitlines(keepends=True)
    rows.insert(50, rows[49].split(",")[0] + ",-999.0\n")
    np.testing.assert_array_equal(given_series(tmp_path, "".join(rows)).value, LEVEL_M)


def test_a_given_series_is_one_file(tmp_path):
    (tmp_path / "a.csv").write_text(text(), encoding="utf-8")
    (tmp_path / "b.csv").write_text(text(), encoding="utf-8")
    with pytest.raises(RecordError, match=r"fits 2 files \(a\.csv, b\.csv\)"):
        given_series(tmp_path, text(), file="[ab].csv")
