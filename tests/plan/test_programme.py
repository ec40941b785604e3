import io
import zipfile
from datetime import UTC, datetime

import openpyxl
import pytest

from tidescour.errors import PlanError
from tidescour.plan.hashes import plan_hashes
from tidescour.plan.loader import read_plan

TABLE = """\
stage,start,end,sea,basin,opening,crest_level_m,crest_level_end_m,width_m,relation,coefficient,alpha_basin
sill to -6,2027-04-01T00:00:00Z,2027-05-11T00:00:00+02:00,,,main gap,-6.0,-5.0,400,broad-crest,0.95,
sill to -6,,,,,shoal,-2.0,,250,broad-crest,1,
sill to -4,2027-05-11T00:00:00Z,2027-06-20T00:00:00Z,measured,measured,main gap,-4,-4,,,,3.0
"""


@pytest.fixture(scope="session")
def with_table(plan_text):
    """The plan of the other tests with a table instead of its stages."""
    return plan_text[: plan_text.index("[[stage]]")] + '[programme]\nfile = "programme.csv"\n'


@pytest.fixture
def read_table(tmp_path, choices, with_table):
    def read(content: str | bytes | openpyxl.Workbook = TABLE, name: str = "programme.csv"):
        file = tmp_path / name
        if isinstance(content, openpyxl.Workbook):
            content.save(file)
        else:
            file.write_bytes(content if isinstance(content, bytes) else content.encode())
        plan = tmp_path / "plan.toml"
        plan.write_text(with_table.replace("programme.csv", name))
        return read_plan(plan, choices)

    return read


@pytest.fixture
def table_problems(read_table):
    def problems_of(*changes: tuple[str, str], text: str = TABLE) -> tuple[str, ...]:
        for old, new in changes:
            assert old in text
            text = text.replace(old, new, 1)
        with pytest.raises(PlanError) as caught:
            read_table(text)
        return caught.value.problems

    return problems_of


def workbook(text: str = TABLE) -> openpyxl.Workbook:
    """Return the table as a workbook, numbers as numbers."""
    book = openpyxl.Workbook()
    sheet = book.active
    for line in text.splitlines():
        cells = []
        for cell in line.split(","):
            try:
                cells.append(float(cell))
            except ValueError:
                cells.append(cell or None)
        sheet.append(cells)
    return book


def test_a_table_gives_the_same_stages_as_the_plan_file(read_table, read, plan_text, edit):
    in_file = edit(
        plan_text,
        ('relation = "stone"\nporosity = 0.4\nstone_m = 0.6', 'relation = "broad-crest"\ncoefficient = 0.95'),
        ("crest_level_m = -4.0", "crest_level_m = -4.0\ncrest_level_end_m = -4.0"),
    )
    assert read_table().stage == read(in_file).stage


def test_a_workbook_gives_the_same_stages(read_table):
    assert read_table(workbook(), "programme.xlsx").stage == read_table().stage


@pytest.mark.parametrize(
    "content",
    [
        ("\ufeff" + TABLE).encode(),
        TABLE.replace("\n", "\r\n").encode(),
        TABLE.replace(",", "\t").encode(),
        TABLE.replace(",", ";").encode(),
        TABLE.replace(",", ";").replace("0.95", "0,95").replace("-6.0", "-6,0").encode(),
        TABLE.replace("\nsill to -4", "\n\n,,,,,,,,,,,\nsill to -4").encode(),
        TABLE.replace(",main gap", ", main gap ").encode(),
        TABLE.replace("coefficient,alpha_basin", "coefficient,alpha_basin,,").encode(),
        ("\n" + TABLE.replace(",", ";")).encode(),
        (";;;\n" + TABLE.replace(",", ";")).encode(),
        ("# first, second, third\n" + TABLE.replace(",", ";")).encode(),
        ('"# first, second, third";;;\n' + TABLE.replace(",", ";")).encode(),
        ("sep=;\n" + TABLE.replace(",", ";")).encode(),
        ("\ufeffSEP=\t\r\n# as agreed\r\n" + TABLE.replace(",", "\t").replace("\n", "\r\n")).encode(),
        TABLE.replace(",", ";").replace("\n", "\r").encode(),
    ],
    ids=[
        "byte order mark", "crlf", "tab", "semicolon", "decimal comma", "empty rows", "blanks", "empty columns",
        "blank line first", "empty row first", "comment first", "quoted comment first", "sep first",
        "sep and comment first", "cr",
    ],
)  # fmt: skip
def test_the_form_of_the_text_does_not_matter(read_table, content):
    assert read_table(content).stage == read_table().stage


def test_rows_count_as_a_spreadsheet_shows_them(table_problems):
    text = "sep=;\n# as agreed\n" + TABLE.replace(",", ";").replace("250", "-250")
    assert any(problem.startswith("programme.csv row 4, width_m: ") for problem in table_problems(text=text))


def test_an_empty_cell_takes_the_value_of_that_opening_in_the_stage_before(read_table):
    table = (
        "stage,start,end,opening,crest_level_m,width_m,side_slope,relation,coefficient,alpha_sea,sea,basin\n"
        "one,2027-01-01T00:00Z,2027-02-01T00:00Z,main gap,-6,400,1.5,broad-crest,0.9,2.5,storm,\n"
        "one,,,shoal,-2,250,0.5,broad-crest,1.1,,,\n"
        "two,2027-02-01T00:00Z,2027-03-01T00:00Z,main gap,-5,,,,,,,\n"
        "three,2027-03-01T00:00Z,2027-04-01T00:00Z,main gap,,350,,,,-,tide,routed\n"
        "three,,,shoal,-1,,,,,,,\n"
    )
    one, two, three = read_table(table).stage
    (gap,) = two.opening
    assert (gap.crest_level_m, gap.width_m, gap.side_slope, gap.alpha_sea) == (-5.0, 400.0, 1.5, 2.5)
    assert (gap.relation, gap.parameters) == ("broad-crest", {"coefficient": 0.9})
    gap, shoal = three.opening
    assert (gap.crest_level_m, gap.width_m, gap.alpha_sea) == (-5.0, 350.0, None)
    assert (shoal.crest_level_m, shoal.width_m, shoal.parameters) == (-1.0, 250.0, {"coefficient": 1.1})
    assert (one.sea, two.sea, three.sea) == ("storm", "storm", "tide")
    assert (one.basin, two.basin) == ("routed", "routed")
    assert two.start == datetime(2027, 2, 1, tzinfo=UTC)


def test_a_given_series_takes_over_no_relation_and_the_other_way_round(read_table):
    table = (
        "stage,start,end,opening,crest_level_m,width_m,relation,coefficient,porosity,stone_m,discharge_series\n"
        "one,2027-01-01T00:00Z,2027-02-01T00:00Z,main gap,-6,400,broad-crest,0.9,,,\n"
        "one,,,shoal,-6,400,broad-crest,0.9,,,\n"
        "two,2027-02-01T00:00Z,2027-03-01T00:00Z,main gap,-6,400,,,,,model\n"
        "two,,,shoal,-6,400,stone,,0.4,0.6,\n"
        "three,2027-03-01T00:00Z,2027-04-01T00:00Z,main gap,-6,400,stone,,0.3,0.5,\n"
        "three,,,shoal,-6,400,,,,,\n"
    )
    _, two, three = read_table(table).stage
    assert (two.opening[0].relation, two.opening[0].discharge_series, two.opening[0].parameters) == (None, "model", {})
    assert (two.opening[1].relation, two.opening[1].parameters) == ("stone", {"porosity": 0.4, "stone_m": 0.6})
    assert (three.opening[0].relation, three.opening[0].discharge_series) == ("stone", None)
    assert three.opening[1].parameters == {"porosity": 0.4, "stone_m": 0.6}


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (",width_m,", ",witdh_m,", 'programme.csv: unknown column "witdh_m"; did you mean "width_m"?'),
        (",width_m,", ",witdh_m,", 'programme.csv: has no column "width_m"; it has "stage", "start"'),
        (",coefficient,", ",stage,", 'programme.csv row 1: two columns are named "stage"'),
        (",coefficient,", ",,", "programme.csv row 1: column 11 has no name"),
        (
            "sill to -6,,,,,shoal",
            ",,,,,shoal",
            "programme.csv row 3: stage is empty; every row names its stage and its",
        ),
        ("sill to -6,,,,,shoal", "sill to -6,,,,,", "programme.csv row 3: opening is empty"),
        (
            "sill to -6,,,,,shoal",
            "sill to -6,,,,,main gap",
            'programme.csv row 3, opening: stage[1 "sill to -6"].opening[2 "main gap"].name',
        ),
        (",1,\n", ",1,,7\n", 'programme.csv row 3: "7" stands beyond the 12 columns of the header'),
        (",1,\n", ",1\n", "programme.csv row 3: has 11 cells where the header has 12"),
        (
            ",-2.0,,250",
            ",deep,,250",
            'row 3, crest_level_m: stage[1 "sill to -6"].opening[2 "shoal"].crest_level_m: found',
        ),
        (",-2.0,,250", ",nan,,250", 'found "nan"; needs a number'),
        (",-2.0,,250", ",-2_0,,250", 'found "-2_0"; needs a number'),
        (",-2.0,,250", ",,,250", 'row 3: stage[1 "sill to -6"].opening[2 "shoal"].crest_level_m: missing'),
        (",-2.0,,250", ",-2.0,,-250", "programme.csv row 3, width_m: "),
        (
            "2027-04-01T00:00:00Z",
            "1-4-2027 0:00",
            'row 2, start: stage[1 "sill to -6"].start: found "1-4-2027 0:00"; needs',
        ),
        ("2027-04-01T00:00:00Z", "2027-04-01T00:00:00", "found 2027-04-01T00:00:00; needs an offset from UTC"),
        ("2027-04-01T00:00:00Z", "", 'row 2: stage[1 "sill to -6"].start: missing: Start, with an offset'),
        (
            "sill to -6,,,,,shoal",
            "sill to -6,2027-04-02T00:00:00Z,,,,shoal",
            "row 3: start is 2027-04-02T00:00:00Z, but row 2",
        ),
        (
            ",-4,-4,,,,3.0",
            ",-4,-4,,brood-crest,,3.0",
            'row 4, relation: stage[2 "sill to -4"].opening[1 "main gap"].rel',
        ),
        (
            ",-4,-4,,,,3.0",
            ",-4,,,,,3.0",
            "row 4: crest_level_end_m is empty and would be -5.0 of row 2; write the value",
        ),
        (",-4,-4,,,,3.0", ",,-4,,,,3.0", "row 4: crest_level_m is empty after a stage in which it moved"),
        (",-4,-4,,,,3.0", ",,,,,,3.0", "row 4: crest_level_m is empty after a stage in which it moved"),
        (
            "2027-05-11T00:00:00Z,",
            "2027-05-01T00:00:00Z,",
            'row 4, start: stage[2 "sill to -4"].start: found 2027-05-01',
        ),
        (
            ",measured,measured",
            ",measured,tide",
            'row 4, basin: stage[2 "sill to -4"].basin: found "tide"; sea = "measured"',
        ),
    ],
)
def test_a_fault_is_named_by_row_and_column(table_problems, old, new, message):
    found = table_problems((old, new))
    assert any(message in problem for problem in found), found


def test_a_value_taken_over_names_both_rows(table_problems):
    found = table_problems((",-6.0,-5.0,400", ",-6.0,-5.0,-400"))
    assert any("row 2, width_m: " in problem for problem in found)
    assert any("row 4, width_m (taken over from row 2): " in problem for problem in found)


def test_a_dash_ends_a_movement(read_table):
    (_, stage) = read_table(TABLE.replace(",-4,-4,,,,3.0", ",-4,-,,,,3.0")).stage
    assert stage.opening[0].crest_level_end_m is None


def test_rows_of_a_stage_stand_together(table_problems):
    found = table_problems(text=TABLE + "sill to -6,,,,,flat,-1,,100,broad-crest,1,\n")
    assert any('programme.csv row 5: stage "sill to -6" stands further up too' in problem for problem in found)


def test_faults_of_table_and_plan_are_reported_together(tmp_path, choices, with_table):
    (tmp_path / "programme.csv").write_text(TABLE.replace("250", "-250"))
    plan = tmp_path / "plan.toml"
    plan.write_text(with_table.replace("latitude_deg = 53.4", "latitude_deg = 534"))
    with pytest.raises(PlanError) as caught:
        read_plan(plan, choices)
    first, second = caught.value.problems
    assert first.startswith("plan.toml line 5: site.latitude_deg")
    assert second.startswith("programme.csv row 3, width_m: ")


def test_a_decimal_comma_that_may_be_thousands_is_refused(table_problems):
    text = TABLE.replace(",", ";").replace("250", "1,250")
    assert any('found "1,250"; needs a number' in problem for problem in table_problems(text=text))


@pytest.mark.parametrize(
    ("content", "name", "message"),
    [
        (b"", "programme.csv", "programme.csv: is empty"),
        (b"stage,start,end,opening,crest_level_m,width_m\n", "programme.csv", "has a header but no row"),
        (b"\xff\xfes\x00", "programme.csv", "is not UTF-8 text; save it as CSV UTF-8"),
        (b"\xe9,b\n1,2\n", "programme.csv", "is not UTF-8 text"),
        (b'a,b\n"1,2\n', "programme.csv", "is not a table"),
        (b"not a zip", "programme.xlsx", "is not a workbook that can be read"),
        (b"x", "programme.ods", "needs a file that ends in .csv or .xlsx"),
    ],
)
def test_a_file_that_is_no_table_is_refused(read_table, content, name, message):
    with pytest.raises(PlanError, match=message):
        read_table(content, name)


def test_a_table_that_is_not_there_is_refused(tmp_path, choices, with_table):
    path = tmp_path / "plan.toml"
    path.write_text(with_table)
    with pytest.raises(PlanError, match=r"plan.toml line \d+: programme.file: \"programme.csv\": no such file in"):
        read_plan(path, choices)


def test_a_table_that_is_not_there_yet_is_missed_only_by_a_run(tmp_path, choices, with_table):
    path = tmp_path / "plan.toml"
    path.write_text(with_table)
    plan = read_plan(path, choices, "records")
    assert plan.stage == ()
    assert [name for name, _ in plan_hashes(plan)] == ["plan.toml"]


@pytest.mark.parametrize("name", ["a" * 4000 + ".csv", "b" * 4000 + ".xlsx", "a\\u0000.csv"])
def test_a_name_that_no_file_can_have_is_refused(tmp_path, choices, with_table, name):
    path = tmp_path / "plan.toml"
    path.write_text(with_table.replace("programme.csv", name))
    with pytest.raises(PlanError, match=r"programme.file: .*: no such file in"):
        read_plan(path, choices)


def damaged(book: openpyxl.Workbook, part: str, content: bytes | None) -> bytes:
    """Return a workbook in which one part of the archive is another, or is gone."""
    sound, other = io.BytesIO(), io.BytesIO()
    book.save(sound)
    with zipfile.ZipFile(sound) as old, zipfile.ZipFile(other, "w") as new:
        assert part in old.namelist()
        for name in old.namelist():
            if name != part:
                new.writestr(name, old.read(name))
            elif content is not None:
                new.writestr(name, content)
    return other.getvalue()


BROKEN_CELL = (
    b'<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
    b'<sheetData><row r="1"><c r="A1" t="s"><v>999</v></c></row></sheetData></worksheet>'
)


@pytest.mark.parametrize(
    ("part", "content"),
    [
        ("xl/worksheets/sheet1.xml", b"<junk"),
        ("xl/worksheets/sheet1.xml", BROKEN_CELL),
        ("xl/worksheets/sheet1.xml", None),
        ("xl/workbook.xml", b"<junk"),
        ("xl/workbook.xml", None),
        ("[Content_Types].xml", b"<junk"),
    ],
)
def test_a_damaged_workbook_is_refused(read_table, part, content):
    with pytest.raises(
        PlanError, match=r"programme.xlsx: (is not a workbook that can be read|has no sheet with cells)"
    ):
        read_table(damaged(workbook(), part, content), "programme.xlsx")


def test_a_workbook_without_a_sheet_of_cells_is_refused(read_table):
    book = openpyxl.Workbook()
    book.remove(book.active)
    book.create_chartsheet()
    with pytest.raises(PlanError, match=r"programme.xlsx: is not a workbook that can be read: .* save it anew"):
        read_table(book, "programme.xlsx")


def test_a_time_without_offset_in_text_is_no_date_cell(table_problems):
    found = table_problems(("2027-04-01T00:00:00Z", "2027-04-01T00:00:00"))
    assert any("row 2, start: " in problem and "needs an offset from UTC" in problem for problem in found), found


def test_a_column_name_is_pointed_to_stage_and_opening(table_problems):
    (found, _) = table_problems(("stage,start", "name,start"))
    assert 'programme.csv: unknown column "name"; write "stage" or "opening", whichever it names' in found


def test_all_rows_of_another_length_are_named(table_problems):
    found = table_problems((",1,\n", ",1\n"), (",,,,3.0\n", ",,,,3.0,,7\n"))
    assert len(found) == 2
    assert "programme.csv row 3: has 11 cells where the header has 12" in found[0]
    assert 'programme.csv row 4: "7" stands beyond the 12 columns of the header' in found[1]


def test_a_date_cell_of_another_column_is_not_told_to_be_text(read_table):
    book = workbook()
    book.active["I3"] = datetime(1900, 1, 2)
    with pytest.raises(PlanError, match=r"row 3, width_m: .*needs a number"):
        read_table(book, "programme.xlsx")


def test_a_date_cell_is_refused_for_its_offset(read_table):
    book = workbook()
    book.active["B2"] = datetime(2027, 4, 1)
    with pytest.raises(PlanError, match=r"row 2, start \(a date cell has no offset: write text\): .* needs an offset"):
        read_table(book, "programme.xlsx")


def test_a_formula_without_value_is_refused(read_table):
    book = workbook()
    book.active["I3"] = "=200+50"
    with pytest.raises(PlanError, match=r"row 3: the formula =200\+50 has no value; open the file in a spreadsheet"):
        read_table(book, "programme.xlsx")


def test_the_first_sheet_is_read_and_numbers_may_be_names(read_table):
    book = workbook(TABLE.replace("sill to -6", "1").replace("sill to -4", "2"))
    book.create_sheet("notes")["A1"] = "nothing"
    assert [stage.name for stage in read_table(book, "programme.xlsx").stage] == ["1", "2"]


PROFILES = (
    "stage,start,end,opening,profile,profile_from_m,profile_to_m,crest_level_m,width_m,relation,coefficient,sea_lag_s\n"
    "one,2027-01-01T00:00Z,2027-02-01T00:00Z,main gap,survey.csv,10,,,,broad-crest,0.9,600\n"
    "one,,,shoal,,,,-2,250,broad-crest,1.1,\n"
    "two,2027-02-01T00:00Z,2027-03-01T00:00Z,main gap,,,30,-6,,,,\n"
    "two,,,shoal,survey.csv,,,,,,,\n"
    "three,2027-03-01T00:00Z,2027-04-01T00:00Z,main gap,,,,,60,,,-\n"
    "three,,,shoal,,40,,-,,,,\n"
)


def test_keys_of_a_profile_are_columns(read_table, full_tables):
    one, two, three = read_table(PROFILES).stage
    gap, shoal = one.opening
    assert gap.profile_points == ((10.0, -4.0), (20.0, -7.0), (40.0, -5.0), (40.0, 1.0), (50.0, 2.0))
    assert (gap.crest_level_m, gap.width_m, gap.sea_lag_s) == (-7.0, None, 600.0)
    assert (shoal.profile, shoal.width_m) == (None, 250.0)
    gap, shoal = two.opening
    assert gap.profile_points == ((10.0, -4.0), (20.0, -7.0), (30.0, -6.0))
    assert (gap.profile, gap.crest_level_m, gap.sea_lag_s) == ("survey.csv", -6.0, 600.0)
    assert (shoal.profile, shoal.width_m, shoal.crest_level_m) == ("survey.csv", None, -2.0)
    gap, shoal = three.opening
    assert (gap.profile, gap.profile_from_m, gap.profile_to_m) == (None, None, None)
    assert (gap.width_m, gap.crest_level_m, gap.sea_lag_s) == (60.0, -6.0, 0.0)
    assert (shoal.profile_points, shoal.crest_level_m) == (((40.0, 1.0), (50.0, 2.0)), 1.0)


def test_a_dash_for_a_profile_keeps_the_width(read_table, full_tables):
    table = (
        "stage,start,end,opening,profile,crest_level_m,width_m,relation,coefficient\n"
        "one,2027-01-01T00:00Z,2027-02-01T00:00Z,main gap,-,-6,400,broad-crest,0.9\n"
        "one,,,shoal,survey.csv,,,broad-crest,0.9\n"
        "two,2027-02-01T00:00Z,2027-03-01T00:00Z,main gap,-,-5,,,\n"
    )
    assert read_table(table).stage[1].opening[0].width_m == 400.0


def test_a_column_of_profiles_needs_none_of_widths(read_table, full_tables):
    table = PROFILES.split("\n", maxsplit=2)
    header, row = table[0].replace(",crest_level_m,width_m", ""), table[1].replace("10,,,,", "10,,")
    assert read_table(f"{header}\n{row}\nnext,2027-02-01T00:00Z,2027-03-01T00:00Z,shoal,survey.csv,,,broad-crest,1,\n")


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("one,,,shoal,,,,-2,250", "one,,,shoal,,,,-2,", 'row 3: stage[1 "one"].opening[2 "shoal"].width_m: missing'),
        ("one,,,shoal,,,,-2,250", "one,,,shoal,,,,,250", '[1 "one"].opening[2 "shoal"].crest_level_m: missing'),
        ("survey.csv,10,,", "survey.csv,10,5,", "row 2, profile_to_m: "),
        ("survey.csv,10,,", "survey.csv,ten,,", 'row 2, profile_from_m: stage[1 "one"].opening[1 "main gap"].pr'),
        ("survey.csv,10,,,", "survey.csv,10,,-7.5,", "row 2, crest_level_m: "),
        ("main gap,survey.csv", "main gap,surveys.csv", '[1 "one"].opening[1 "main gap"].profile: "surveys.csv": no'),
        ("profile,", "profiel,", 'programme.csv: unknown column "profiel"; did you mean "profile"?'),
    ],
)  # fmt: skip
def test_a_faulty_cell_of_a_profile_is_named(table_problems, full_tables, old, new, message):
    found = table_problems((old, new), text=PROFILES)
    assert [problem for problem in found if message in problem], found
