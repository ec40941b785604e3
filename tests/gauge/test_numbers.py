"""From the text of values to numbers."""

import numpy as np
import pytest

from tidescour.errors import RecordError
from tidescour.gauge.numbers import read_numbers, unlisted_missing_values


def read(cells, comma_delimited=False):
    return read_numbers(cells, np.arange(2, len(cells) + 2), comma_delimited=comma_delimited, where="sea.csv")


def test_plain_numbers_are_read_exactly():
    cells = ["1", "-0.25", "+3.5", ".5", "2.", "1.5e-3"]
    assert read(cells).value.tolist() == [1.0, -0.25, 3.5, 0.5, 2.0, 0.0015]
    assert read(cells).findings == ()


def test_the_usual_words_for_none_are_missing():
    found = read(["", "NA", "NaN", "null", "n/a", "None", "1"])
    assert np.isnan(found.value).tolist() == [True] * 6 + [False]
    assert not found.infinite.any()


def test_infinite_numbers_are_marked():
    found = read(["1", "inf", "-Infinity", "1e400"])
    assert found.infinite.tolist() == [False, True, True, True]
    assert np.isnan(found.value[1:]).all()
    (finding,) = found.findings
    assert finding.code == "infinite-values"
    assert "on 3 rows, flagged 4, first line 3" in finding.message


def test_decimal_commas_are_read_with_a_note():
    found = read(["1,25", "-0,5", "2"])
    assert found.value.tolist() == [1.25, -0.5, 2.0]
    assert [finding.code for finding in found.findings] == ["decimal-comma"]


def test_commas_and_points_in_one_column_are_refused():
    with pytest.raises(RecordError, match=r"line 2 has a comma .* line 3 a point"):
        read(["1,25", "0.5"])


def test_a_comma_inside_a_number_of_a_comma_file_is_refused():
    with pytest.raises(RecordError, match="'1,234' is no number"):
        read(["1.0", "1,234"], comma_delimited=True)


def test_printed_minus_signs_and_narrow_blanks_are_read_with_a_note():
    found = read(["\u22121.5", "\u20130.5", "1\u202f234.5", "1\u00a0000"])
    assert found.value.tolist() == [-1.5, -0.5, 1234.5, 1000.0]
    assert [finding.code for finding in found.findings] == ["odd-characters"]


@pytest.mark.parametrize("token", ["Err", "---", "1.234,5", "1'234", "1_000", "0x1F", "1 2", "١"])
def test_other_text_is_refused_with_its_count(token):
    with pytest.raises(RecordError, match=r"line 3: .*on 2 rows"):
        read(["1.0", token, token])


TIDE = np.round(1.5 * np.sin(np.arange(500) * 0.1), 3)


def with_values(values, at):
    series = TIDE.copy()
    series[list(at)] = values
    return series


@pytest.mark.parametrize("sentinel", [-9999.0, 9999.0, 99.99, -99.9999, 999.0])
def test_a_number_of_nines_far_outside_is_a_candidate(sentinel):
    assert unlisted_missing_values(with_values(sentinel, [50]), nines_only=False) == [sentinel]


@pytest.mark.parametrize("sentinel", [-32768.0, 1e6, -100.0])
def test_a_repeated_number_far_outside_is_a_candidate(sentinel):
    series = with_values(sentinel, [50, 51, 200])
    assert unlisted_missing_values(series, nines_only=False) == [sentinel]
    assert unlisted_missing_values(series, nines_only=True) == []


def test_two_candidates_are_both_found():
    series = with_values([-9999.0, 9999.0], [50, 60])
    assert sorted(unlisted_missing_values(series, nines_only=False)) == [-9999.0, 9999.0]


def test_a_single_spike_is_no_candidate():
    assert unlisted_missing_values(with_values(57.3, [50]), nines_only=False) == []


def test_a_tide_has_no_candidate():
    assert unlisted_missing_values(TIDE, nines_only=False) == []


def test_a_flood_that_stays_at_its_peak_is_no_candidate():
    quiet = np.round(0.02 * np.sin(np.arange(1000) * 0.1), 3)
    flood = np.concatenate([np.linspace(0.0, 1.0, 20), np.full(6, 1.0), np.linspace(1.0, 0.0, 20)])
    series = np.concatenate([quiet, flood, quiet])
    assert unlisted_missing_values(series, nines_only=False) == []


def test_candidates_scale_with_the_unit():
    series = with_values(-100.0, [50, 51, 200])
    assert unlisted_missing_values(1000.0 * series, nines_only=False) == [-100000.0]


def test_missing_values_are_passed_over():
    series = with_values(-9999.0, [50])
    series[100:200] = np.nan
    assert unlisted_missing_values(series, nines_only=False) == [-9999.0]
    assert unlisted_missing_values(np.full(5, np.nan), nines_only=False) == []
