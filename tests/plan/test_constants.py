from hashlib import sha256

import numpy as np
import pytest

from tidescour.errors import PlanError
from tidescour.plan.constants import ConstantsTable, read_constants

TABLE = "# from the almanac\nconstituent,amplitude_m,phase_deg\nM2,1.251,109.3\n\nS2, 0.184 ,146.6\nK1,0.136,-156.7\n"


@pytest.fixture
def read_table(tmp_path):
    def read(content: str | bytes) -> ConstantsTable:
        path = tmp_path / "constants.csv"
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return read_constants(path)

    return read


def test_constants_are_read_as_written(read_table):
    table = read_table(TABLE)
    assert table.constituents == ("M2", "S2", "K1")
    np.testing.assert_array_equal(table.amplitude_m, [1.251, 0.184, 0.136])
    np.testing.assert_array_equal(table.phase_deg, [109.3, 146.6, -156.7])
    assert table.sha256 == sha256(TABLE.encode()).hexdigest()


def test_arrays_cannot_be_written_to(read_table):
    with pytest.raises(ValueError, match="read-only"):
        read_table(TABLE).amplitude_m[0] = 2.0


def test_order_of_columns_and_line_ends_do_not_matter(read_table):
    table = read_table("\ufeffphase_deg,constituent,amplitude_m\r\n109.3,M2,1.251\r\n")
    assert (table.constituents, table.amplitude_m[0], table.phase_deg[0]) == (("M2",), 1.251, 109.3)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("S2,", "M2,", r'constants.csv line 5: "M2" stands twice'),
        ("S2,", ",", r"line 5: constituent is empty"),
        ("1.251", "-1.251", r"line 3: amplitude_m: found -1.251; needs a number from 0 up"),
        ("1.251", "nan", r'line 3: amplitude_m: found "nan"; needs a finite number'),
        ("109.3", "inf", r'line 3: phase_deg: found "inf"; needs a finite number'),
        ("109.3", "", r'line 3: phase_deg: found ""; needs a finite number'),
        ("1.251", "1,251", r"line 3: has 4 cells where the header has 3; write numbers with a decimal point"),
        ("1.251,109.3", "1.251", r"line 3: has 2 cells"),
        ("phase_deg", "phase", r'line 2: unknown column "phase"; did you mean "phase_deg"\?'),
        ("phase_deg", "phase", r'line 2: has no column "phase_deg"'),
        ("phase_deg", "phase_deg,phase_deg", r'line 2: two columns are named "phase_deg"'),
    ],
)
def test_a_wrong_table_is_refused_by_line(read_table, old, new, message):
    with pytest.raises(PlanError, match=message):
        read_table(TABLE.replace(old, new, 1))


def test_an_unknown_constituent_is_named_with_its_line(tmp_path):
    path = tmp_path / "constants.csv"
    path.write_text(TABLE.replace("S2,", "s2,").replace("K1,", "K9x,"))
    assert read_constants(path).constituents == ("M2", "s2", "K9x")
    with pytest.raises(PlanError) as caught:
        read_constants(path, known=("M2", "S2", "K1"))
    assert caught.value.problems == (
        f'{path} line 5: constituent: found "s2"; did you mean "S2"?',
        f'{path} line 6: constituent: found "K9x"; choose "M2", "S2" or "K1"',
    )


def test_all_wrong_lines_are_reported_together(read_table):
    with pytest.raises(PlanError) as caught:
        read_table(TABLE.replace("1.251", "-1").replace("0.136", "x"))
    assert len(caught.value.problems) == 2


@pytest.mark.parametrize("content", ["", "constituent,amplitude_m,phase_deg\n", "# nothing\n"])
def test_an_empty_table_is_refused(read_table, content):
    with pytest.raises(PlanError, match="needs a header constituent,amplitude_m,phase_deg and at least one row"):
        read_table(content)


def test_a_missing_file_and_other_text_are_refused(tmp_path, read_table):
    with pytest.raises(PlanError, match=r"cannot be read: .*tide.sea_constants names it"):
        read_constants(tmp_path / "none.csv")
    with pytest.raises(PlanError, match=r"cannot be read: File name too long"):
        read_constants(tmp_path / ("a" * 4000))
    with pytest.raises(PlanError, match=r"is no name of a file; tide.sea_constants has it"):
        read_constants(tmp_path / "a\0.csv")
    with pytest.raises(PlanError, match="is not UTF-8 text"):
        read_table(b"\xff\xfe")


def test_arrays_of_another_length_are_refused():
    with pytest.raises(ValueError, match="must have one length"):
        ConstantsTable(constituents=("M2",), amplitude_m=[1.0, 2.0], phase_deg=[1.0], sha256="")
