"""Order of the rows, doubled stamps, several files."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import RecordError
from tidescour.gauge.joining import in_order, joined
from tidescour.gauge.raw import RawColumns


def raw(time_s, value):
    value = np.asarray(value, dtype=float)
    return RawColumns(
        time_s=np.asarray(time_s, dtype=float),
        value=value,
        flag=np.where(np.isnan(value), 9, 2).astype(np.int8),
        line=np.arange(2, value.size + 2),
    )


def codes(found):
    return [finding.code for finding in found.findings]


def test_rows_in_order_stay_as_they_are():
    given_rows = raw([0, 10, 20], [1, 2, 3])
    found = in_order(given_rows, "sea.csv")
    assert found.time_s.tolist() == [0, 10, 20]
    assert found.findings == ()


def test_few_rows_out_of_order_are_sorted_in_with_a_note():
    time_s = np.arange(300.0)
    time_s[[100, 101]] = time_s[[101, 100]]
    found = in_order(raw(time_s, time_s), "sea.csv")
    assert np.all(np.diff(found.time_s) == 1.0)
    assert found.value.tolist() == found.time_s.tolist()
    assert found.line[100] == 103
    assert codes(found) == ["out-of-order"]


def test_swapped_blocks_are_refused():
    time_s = np.concatenate([np.arange(150.0, 300.0), np.arange(150.0)])
    with pytest.raises(RecordError, match=r"line 152: the stamps go back .* or pieces of the file are not in order"):
        in_order(raw(time_s, time_s), "sea.csv")


def test_a_file_from_newest_to_oldest_is_turned_round_with_a_note():
    found = in_order(raw([20, 10, 0], [3, 2, 1]), "sea.csv")
    assert found.value.tolist() == [1, 2, 3]
    assert codes(found) == ["reversed"]


def test_repeated_rows_are_left_out_with_a_note():
    found = in_order(raw([0, 10, 10, 20, 20], [1, 2, 2, np.nan, 3]), "sea.csv")
    assert found.time_s.tolist() == [0, 10, 20]
    assert found.value.tolist() == [1, 2, 3]
    assert found.flag.tolist() == [2, 2, 2]
    assert codes(found) == ["repeated-rows"]


def test_one_stamp_with_two_values_is_flagged_4():
    found = in_order(raw([0, 10, 10, 20], [1, 2, 2.5, 3]), "sea.csv")
    assert found.value.tolist() == [1, 2, 3]
    assert found.flag.tolist() == [2, 4, 2]
    assert codes(found) == ["doubled-stamps"]
    assert "0.5" in found.findings[0].message


def test_one_doubled_stamp_is_spoken_of_as_one():
    (finding,) = in_order(raw([0, 10, 10, 20], [1, 2, 2.5, 3]), "sea.csv").findings
    assert finding.message.startswith("1 stamp with two values up to 0.5 apart")
    (finding,) = in_order(raw([0, 10, 10, 20], [1, 2, 2, 3]), "sea.csv").findings
    assert finding.message.startswith("1 row with the stamp of another")


def test_two_series_in_one_file_are_refused():
    time_s = np.repeat(np.arange(100.0), 2)
    with pytest.raises(RecordError, match="100 stamps with two values"):
        in_order(raw(time_s, np.arange(200.0)), "sea.csv")


def test_files_that_follow_each_other_are_joined():
    found = joined([raw([20, 30], [3, 4]), raw([0, 10], [1, 2])], ["b.csv", "a.csv"], "records.sea")
    assert found.value.tolist() == [1, 2, 3, 4]
    assert found.part.tolist() == [1, 1, 0, 0]
    assert found.findings == ()


def test_an_overlap_that_agrees_is_merged_with_a_note():
    parts = [raw([0, 10, 20], [1, 2, np.nan]), raw([10, 20, 30], [2, 3, 4])]
    found = joined(parts, ["a.csv", "b.csv"], "records.sea")
    assert found.value.tolist() == [1, 2, 3, 4]
    assert codes(found) == ["overlap-merged"]


def test_an_overlap_that_disagrees_is_refused_with_both_values():
    parts = [raw([0, 10, 20], [1, 2, 3]), raw([10, 20, 30], [2.5, 3.5, 4])]
    message = (
        r"2 stamps, first 1970-01-01T00:00:10Z: a.csv line 3 has 2, b.csv line 2 has 2.5 \(median difference \+0.5"
    )
    with pytest.raises(RecordError, match=message):
        joined(parts, ["a.csv", "b.csv"], "records.sea")


@given(
    cut=st.lists(st.integers(1, 199), min_size=1, max_size=4, unique=True),
    overlap=st.integers(0, 20),
    order=st.randoms(use_true_random=False),
)
@settings(max_examples=30, deadline=None)
def test_pieces_of_a_record_join_to_the_record(cut, overlap, order):
    time_s = 600.0 * np.arange(200)
    value = np.sin(time_s / 7000.0)
    bounds = [0, *sorted(cut), 200]
    parts = [
        raw(time_s[max(start - overlap, 0) : end], value[max(start - overlap, 0) : end])
        for start, end in pairwise(bounds)
    ]
    order.shuffle(parts)
    found = joined(parts, [f"{i}.csv" for i in range(len(parts))], "records.sea")
    np.testing.assert_array_equal(found.time_s, time_s)
    np.testing.assert_array_equal(found.value, value)
