"""From the text of values to numbers."""

import numpy as np
import pytest

from tidescour.errors import RecordError
from tidescour.gauge.numbers import read_numbers


def read(cells, comma_delimited=False, thousands=False):
    lines = np.arange(2, len(cells) + 2)
    return read_numbers(cells, lines, comma_delimited=comma_delimited, thousands=thousands, where="sea.csv")


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


@pytest.mark.parametrize("cells", [["4,950", "-1,012", "985"], ["1,234"], ["4,950", "NaN", "12,000"]])
def test_commas_that_may_separate_thousands_are_refused(cells):
    with pytest.raises(RecordError, match=r"line 2: the comma in .* may separate decimals or thousands .*with points"):
        read(cells, thousands=True)


@pytest.mark.parametrize("cells", [["4,950", "0,985"], ["4,950", "12,50"], ["4,950", "-1234,567"]])
def test_commas_of_which_one_cannot_separate_thousands_are_decimal(cells):
    assert read(cells, thousands=True).value.tolist() == [float(cell.replace(",", ".")) for cell in cells]


def test_a_thousand_metres_is_no_level():
    assert read(["4,950", "1,234"], thousands=False).value.tolist() == [4.95, 1.234]


def test_a_comma_inside_a_number_is_not_answered_with_a_word_for_missing():
    with pytest.raises(RecordError, match=r"'1,950' on 1 row\. Export the column with points") as refusal:
        read(["1.0", "1,950"], comma_delimited=True)
    assert "NaN" not in str(refusal.value)


def test_printed_minus_signs_and_narrow_blanks_are_read_with_a_note():
    found = read(["\u22121.5", "\u20130.5", "1\u202f234.5", "1\u00a0000"])
    assert found.value.tolist() == [-1.5, -0.5, 1234.5, 1000.0]
    assert [finding.code for finding in found.findings] == ["odd-characters"]


@pytest.mark.parametrize("token", ["Err", "---", "1.234,5", "1'234", "1_000", "0x1F", "1 2", "١"])
def test_other_text_is_refused_with_its_count(token):
    with pytest.raises(RecordError, match=r"line 3: .*on 2 rows"):
        read(["1.0", token, token])
