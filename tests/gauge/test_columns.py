"""The layout ``columns``, and the table of layouts."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import RecordError
from tidescour.gauge.columns import read_columns
from tidescour.gauge.layouts import LAYOUTS
from tidescour.gauge.raw import Reading
from tidescour.plan.models import Clock

START_S = 1767225600.0  # 2026-01-01T00:00Z
ROWS = [f"2026-01-01 0{i}:00,{1 + i / 10:.2f}" for i in range(5)]
HEADER = "time,level_m"


def read(text, value="level_m", unit="m", **clock):
    clock = {"utc_offset": "+00:00", **clock}
    reading = Reading(
        where="records.sea: sea.csv",
        table="records.sea",
        clock=Clock(**clock),
        value=value,
        value_key="level",
        unit=unit,
    )
    return read_columns(text, reading)


def lines(*rows):
    return "\n".join(rows) + "\n"


def codes(raw):
    return [finding.code for finding in raw.findings]


def assert_the_five_rows(raw):
    assert raw.time_s.tolist() == [START_S + 3600.0 * i for i in range(5)]
    assert raw.value.tolist() == [1.0, 1.1, 1.2, 1.3, 1.4]


def test_a_plain_file_is_read_without_a_finding():
    raw = read(lines(HEADER, *ROWS))
    assert_the_five_rows(raw)
    assert raw.line.tolist() == [2, 3, 4, 5, 6]
    assert raw.flag.tolist() == [2] * 5
    assert raw.findings == ()


@pytest.mark.parametrize("delimiter", [",", ";", "\t"])
def test_every_delimiter_is_told_from_the_file(delimiter):
    assert_the_five_rows(read(lines(HEADER, *ROWS).replace(",", delimiter)))


def test_blanks_separate_where_date_and_time_stand_apart():
    text = lines("date time level_m", *ROWS).replace(",", "   ")
    assert_the_five_rows(read(text, time=("date", "time")))


@pytest.mark.parametrize("delimiter", [";", "\t", " "])
def test_decimal_commas_are_read_where_commas_do_not_separate(delimiter):
    header = HEADER if delimiter != " " else "date time,level_m"
    text = lines(header, *ROWS).replace(",", delimiter).replace(".", ",")
    raw = read(text, time="time" if delimiter != " " else ("date", "time"))
    assert_the_five_rows(raw)
    assert codes(raw) == ["decimal-comma"]


def test_decimal_commas_in_a_comma_file_are_refused():
    with pytest.raises(RecordError, match=r"line 2: 3 cells where 2 are due.*decimal commas"):
        read(lines(HEADER, *ROWS).replace(".", ","))


def test_decimal_commas_in_a_comma_file_without_a_header_are_refused():
    with pytest.raises(RecordError, match="decimal commas"):
        read(lines(*ROWS).replace(".", ","), time=0, value=1)


def test_whole_millimetres_beside_a_code_are_not_taken_for_decimal_commas():
    raw = read(lines(*(f"2026-01-01 0{i}:00,{100 + i},12" for i in range(5))), time=0, value=1, unit="mm")
    assert raw.value.tolist() == [100.0, 101.0, 102.0, 103.0, 104.0]


def test_millimetres_with_commas_for_thousands_are_refused():
    rows = [f"2026-01-01 0{i}:00;4,{950 + i}" for i in range(5)]
    with pytest.raises(RecordError, match="decimals or thousands"):
        read(lines("time;level", *rows), value="level", unit="mm")


def test_quoted_cells_are_read():
    text = lines('"time","level_m","note"', *(f'"{row.split(",")[0]}","{row.split(",")[1]}","a, b"' for row in ROWS))
    assert_the_five_rows(read(text))


def test_a_quoted_cell_that_does_not_end_is_refused():
    text = lines(HEADER, ROWS[0], '2026-01-01 01:00,"1.10', *ROWS[2:])
    with pytest.raises(RecordError, match="line 3: a quoted cell"):
        read(text)


def test_comment_lines_blank_lines_and_lines_above_the_header_are_passed_over():
    raw = read(lines("# station A", "#", "", "Title: A", HEADER, *ROWS[:2], "", *ROWS[2:], ""))
    assert_the_five_rows(raw)
    assert codes(raw) == ["lines-above-header"]
    assert raw.line.tolist() == [6, 7, 9, 10, 11]


@pytest.mark.parametrize("header", ["# time,level_m", "#time,level_m", "  ## time,level_m"])
def test_a_header_in_the_last_comment_line_is_found(header):
    raw = read(lines("# station A", header, *ROWS))
    assert_the_five_rows(raw)
    assert raw.line.tolist() == [3, 4, 5, 6, 7]
    assert raw.findings == ()


def test_a_comment_that_names_the_columns_above_the_header_stays_a_comment():
    raw = read(lines("# time level_m", HEADER, *ROWS))
    assert_the_five_rows(raw)
    assert raw.findings == ()


@pytest.mark.parametrize(
    "text", ["x" * 200_000 + "\n", '{"data":[' + '{"t":1,"v":2},' * 20_000 + "]}", lines(HEADER, *ROWS, "9" * 150_000)]
)
def test_a_line_that_no_table_has_is_refused(text):
    with pytest.raises(RecordError, match=r"line \d has \d{6} characters, from '.*'; this is no table"):
        read(text)


def test_rows_of_delimiters_alone_are_no_rows():
    assert_the_five_rows(read(lines(HEADER, *ROWS, ",", ",")))


def test_a_row_of_units_is_left_out_with_a_note():
    raw = read(lines(HEADER, "UTC,[m]", *ROWS))
    assert_the_five_rows(raw)
    assert codes(raw) == ["unit-row"]


def test_a_row_of_units_against_the_plan_is_refused():
    with pytest.raises(RecordError, match=r"'cm', the plan unit = \"m\"; write unit = \"cm\""):
        read(lines(HEADER, "UTC,cm", *ROWS))


def test_another_row_under_the_header_is_refused():
    with pytest.raises(RecordError, match="line 2: the row under the header"):
        read(lines(HEADER, "5s,14n", *ROWS))


def test_a_unit_in_the_header_against_the_plan_is_a_warning():
    raw = read(lines("time,Level (ft)", *ROWS), value="Level (ft)")
    assert [(finding.severity, finding.code) for finding in raw.findings] == [("warning", "unit-in-header")]
    assert read(lines("time,Level [m]", *ROWS), value="Level [m]").findings == ()


@pytest.mark.parametrize(
    "name",
    [
        "Level [cm/s]",
        "q [cfs]",
        "Level (NAP)",
        "level_cm",
        "level_mm",
        "Level_FT",
        "Level (ft above datum)",
        "Level ( mm )",
    ],
)
def test_another_or_an_unknown_unit_in_the_header_is_a_warning(name):
    raw = read(lines(f"time,{name}", *ROWS), value=name)
    assert [(finding.severity, finding.code) for finding in raw.findings] == [("warning", "unit-in-header")]
    assert repr(name) in raw.findings[0].message


@pytest.mark.parametrize(
    ("name", "unit"),
    [
        ("level_m", "m"),
        ("Level [m]", "m"),
        ("Level (m above NAP)", "m"),
        ("h_cm", "cm"),
        ("Level (Centimetres)", "cm"),
        ("Q [m3/s]", "m3/s"),
        ("u_m_s", "m/s"),
        ("level", "ft"),
    ],
)
def test_the_unit_of_the_plan_in_the_header_is_no_finding(name, unit):
    assert read(lines(f"time,{name}", *ROWS), value=name, unit=unit).findings == ()


def test_a_repeated_header_is_left_out_with_a_note():
    raw = read(lines(HEADER, *ROWS[:3], HEADER, *ROWS[3:]))
    assert_the_five_rows(raw)
    assert codes(raw) == ["repeated-header"]


def test_a_footer_is_left_out_with_a_note():
    raw = read(lines(HEADER, *ROWS, "Average,1.2", "End of file"))
    assert_the_five_rows(raw)
    assert codes(raw) == ["footer"]


@pytest.mark.parametrize("row", ["2026-01-31 24:30,1.5", "31/01/2026 05:00,1.5", ",1.5", "2026-01-01 05:00:00?,NaN"])
def test_a_value_with_a_stamp_that_cannot_be_read_is_no_footer(row):
    with pytest.raises(RecordError, match=r"line 7: a value '.*' without a stamp.*mend the stamp, or take the row out"):
        read(lines(HEADER, *ROWS, row))


def test_a_long_footer_is_refused():
    with pytest.raises(RecordError, match="line 7"):
        read(lines(HEADER, *ROWS, *("Average,1.2",) * 6))


def test_text_between_the_rows_is_refused():
    with pytest.raises(RecordError, match="line 4: 'Average' is no stamp"):
        read(lines(HEADER, *ROWS[:2], "Average,1.2", *ROWS[2:]))


def test_a_ragged_row_is_refused_with_its_line():
    with pytest.raises(RecordError, match="line 4: 1 cells where 2 are due"):
        read(lines(HEADER, *ROWS[:2], "2026-01-01 01:30", *ROWS[2:]))


def test_a_delimiter_at_the_end_of_every_row_is_passed_over():
    raw = read(lines(HEADER, *(row + "," for row in ROWS)))
    assert_the_five_rows(raw)
    assert codes(raw) == ["trailing-delimiter"]


@pytest.mark.parametrize("cut", ["2026-01-01 05:00", "2026-01-01 05:00,1.", "2026-01-01 05:00,1.5", "2026-01-01 05"])
def test_a_last_row_cut_short_is_left_out_with_a_note(cut):
    raw = read(lines(HEADER, *ROWS) + cut)
    assert_the_five_rows(raw)
    assert codes(raw) in (["cut-short"], ["footer"])


def test_a_whole_last_row_without_a_line_end_stays():
    raw = read(lines(HEADER, *ROWS).rstrip("\n"))
    assert_the_five_rows(raw)
    assert raw.findings == ()


def test_columns_are_found_by_position():
    text = lines("a,b,level,level", *(row.replace(",", ",x,9,") for row in ROWS))
    assert_the_five_rows(read(text, time=0, value=3))
    assert_the_five_rows(read(text, time="a", value=3))


def test_columns_are_found_but_for_blanks_around_the_name():
    assert_the_five_rows(read(lines(" Date Time, Water Level ", *ROWS), time="Date Time", value="Water Level"))


@pytest.mark.parametrize(
    ("keys", "message"),
    [
        ({"value": "Level_m"}, r"'Level_m' is not in the header; the nearest is 'level_m'\. The columns.*'time'"),
        ({"value": "stage"}, r"'stage' is not in the header\. The columns"),
        ({"value": 2}, "columns are 0 to 1"),
        ({"value": "time"}, "taken for the stamps and for the values"),
        ({"time": "date"}, "time = 'date' is not in the header"),
    ],
)
def test_a_column_that_is_not_there_is_refused_with_the_nearest(keys, message):
    with pytest.raises(RecordError, match=message):
        read(lines(HEADER, *ROWS), **keys)


def test_the_key_of_the_plan_is_named_where_the_column_of_values_is_not_found():
    with pytest.raises(RecordError, match=r"sea\.csv: level = 'levl_m' is not in the header; the nearest is 'level_m'"):
        read(lines(HEADER, *ROWS), value="levl_m")


def test_a_name_that_stands_twice_is_refused():
    with pytest.raises(RecordError, match=r"'level_m' 2 times, as columns \[1, 2\]"):
        read(lines("time,level_m,level_m", *(row + ",9" for row in ROWS)))


@pytest.mark.parametrize("text", ["# only\n# comments\n", HEADER + "\n", "one\ntwo\nthree\n"])
def test_a_file_without_rows_is_refused(text):
    with pytest.raises(RecordError, match=r"records\.sea: sea\.csv"):
        read(text)


def test_missing_and_infinite_values_keep_their_rows():
    raw = read(lines(HEADER, ROWS[0], "2026-01-01 01:00,", "2026-01-01 02:00,inf", "2026-01-01 03:00,-999"))
    assert raw.flag.tolist() == [2, 9, 4, 2]
    np.testing.assert_array_equal(raw.value, [1.0, np.nan, np.nan, -999.0])


@given(
    values=st.lists(st.integers(-9000, 9000), min_size=3, max_size=40),
    delimiter=st.sampled_from([",", ";", "\t"]),
    comma=st.booleans(),
)
@settings(max_examples=40, deadline=None)
def test_what_was_written_is_read_again(values, delimiter, comma):
    decimal = "," if comma and delimiter != "," else "."
    stamps = np.datetime_as_string((START_S + 600.0 * np.arange(len(values))).astype("datetime64[s]"), unit="s")
    rows = [
        f"{stamp}{delimiter}{value / 1000:.3f}".replace(".", decimal)
        for stamp, value in zip(stamps, values, strict=True)
    ]
    raw = read(lines(f"time{delimiter}level_m", *rows))
    assert raw.value.tolist() == [value / 1000 for value in values]
    assert np.all(np.diff(raw.time_s) == 600.0)


def test_every_layout_has_its_name_and_says_what_it_reads():
    for name, entry in LAYOUTS.items():
        assert entry.name == name
        assert entry.title
        assert entry.validity
        assert entry.source
