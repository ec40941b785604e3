import csv
import io
import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.handoff.columns import FINDING_COLUMNS, RECORD_COLUMNS, Column
from tidescour.handoff.tables import ResultTable, csv_bytes, row_objects, table_from_rows, utc_texts
from tidescour.units import utc_text

DEPTH = Column(name="depth_m", kind="number", meaning="depth, m", may_be_empty=True)
FULL = Column(name="length_m", kind="number", meaning="length, m")
NAME = Column(name="stage", kind="text", meaning="stage")


def lines(table):
    return csv_bytes(table).decode("utf-8").split("\n")


def test_csv_keeps_twelve_significant_digits_and_a_point():
    table = ResultTable(name="t", columns=(DEPTH,), values=([np.pi, 1e6 / 3.0, -2.0, 1e-13 / 3.0],))
    assert lines(table) == ["depth_m", "3.14159265359", "333333.333333", "-2", "3.33333333333e-14", ""]


def test_csv_leaves_a_cell_empty_where_there_is_no_number():
    table = ResultTable(name="t", columns=(NAME, DEPTH), values=(["a", "b"], [np.nan, 1.0]))
    assert lines(table) == ["stage,depth_m", "a,", "b,1", ""]


def test_csv_writes_no_negative_zero():
    assert lines(ResultTable(name="t", columns=(DEPTH,), values=([-0.0],)))[1] == "0"
    assert str(row_objects(ResultTable(name="t", columns=(DEPTH,), values=([-0.0],)))[0]["depth_m"]) == "0.0"


def test_csv_has_headings_alone_where_there_are_no_rows():
    assert csv_bytes(table_from_rows("findings", FINDING_COLUMNS, ())) == b"severity,code,where,message\n"


def test_csv_is_utf8_without_carriage_returns_and_quotes_commas():
    table = table_from_rows("t", (NAME, DEPTH), [('Fåre "gap", north', 1.0)])
    assert csv_bytes(table) == 'stage,depth_m\n"Fåre ""gap"", north",1\n'.encode()


@given(st.text(st.characters(codec="utf-8", exclude_characters="\0")))
@settings(max_examples=200, deadline=None)
def test_a_row_stays_a_line_and_text_comes_back(text):
    written = csv_bytes(table_from_rows("t", (NAME, FULL), [(text, 1.0)])).decode("utf-8")
    assert list(csv.reader(io.StringIO(written, newline=""))) == [
        ["stage", "length_m"],
        [" ".join(text.splitlines()), "1"],
    ]


@given(st.floats(allow_nan=False, allow_infinity=False))
@settings(max_examples=200, deadline=None)
def test_json_cells_keep_every_digit(number):
    assert row_objects(ResultTable(name="t", columns=(DEPTH,), values=([number],)))[0]["depth_m"] == number


def test_a_number_that_may_not_be_empty_is_refused_where_it_is_not_a_number():
    with pytest.raises(ValueError, match="t: length_m is nan in row 2"):
        ResultTable(name="t", columns=(FULL,), values=([1.0, np.nan],))


def test_a_time_may_be_empty_where_its_column_says_so():
    reached = Column(name="length_reached", kind="time", meaning="time, UTC", may_be_empty=True)
    table = ResultTable(name="t", columns=(reached,), values=([np.nan, 20908 * 86400.0],))
    assert csv_bytes(table).splitlines() == [b"length_reached", b'""', b"2027-03-31T00:00:00Z"]
    assert row_objects(table) == [{"length_reached": None}, {"length_reached": "2027-03-31T00:00:00Z"}]
    with pytest.raises(ValueError, match="t: time_utc is nan in row 1"):
        ResultTable(name="t", columns=(Column(name="time_utc", kind="time", meaning="UTC"),), values=([np.nan],))


def test_an_infinite_number_is_refused_everywhere():
    with pytest.raises(ValueError, match="t: depth_m is inf in row 1"):
        ResultTable(name="t", columns=(DEPTH,), values=([np.inf],))


def test_columns_of_different_length_are_refused():
    with pytest.raises(ValueError, match="t: columns differ in length"):
        ResultTable(name="t", columns=(NAME, DEPTH), values=(["a"], [1.0, 2.0]))


def test_values_without_a_heading_are_refused():
    with pytest.raises(ValueError, match="2 columns of values under 1 headings"):
        ResultTable(name="t", columns=(NAME,), values=(["a"], [1.0]))


def test_a_table_does_not_change_with_the_array_that_made_it():
    depth = np.array([1.0, 2.0])
    table = ResultTable(name="t", columns=(DEPTH,), values=(depth,))
    depth[0] = 9.0
    assert table.column("depth_m")[0] == 1.0
    with pytest.raises(ValueError, match="read-only"):
        table.column("depth_m")[0] = 5.0


@given(st.lists(st.integers(-(10**12), 4 * 10**12), max_size=20))
@settings(max_examples=100, deadline=None)
def test_times_of_a_column_read_as_single_times_do(milliseconds):
    times = np.array(milliseconds, dtype=np.float64) / 1000.0
    assert utc_texts(times) == [utc_text(moment) for moment in times]


def test_times_are_utc_text_with_milliseconds_only_where_there_are_any():
    # 1 806 451 800 s since 1970 is 2027-03-31T00:10:00Z: 20908 days of 86400 s and 600 s.
    assert utc_texts(np.array([20908 * 86400.0 + 600.0])) == ["2027-03-31T00:10:00Z"]
    assert utc_texts(np.array([20908 * 86400.0 + 600.25])) == ["2027-03-31T00:10:00.250Z"]


def test_half_a_million_records_are_written_in_seconds():
    count = 500_000
    rng = np.random.default_rng(1)
    values = (["sea"] * count, 1.8e9 + 60.0 * np.arange(count), rng.normal(size=count), np.ones(count, dtype=int))
    table = ResultTable(name="records", columns=RECORD_COLUMNS, values=values)
    start = time.perf_counter()
    written = csv_bytes(table)
    assert time.perf_counter() - start < 10.0
    assert written.count(b"\n") == count + 1
