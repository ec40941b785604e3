from datetime import UTC, datetime

import openpyxl
import pytest

from tidescour.plan.places import opening_names


@pytest.fixture
def read_full(read, full_text, full_tables, edit):
    def read_changed(*changes: tuple[str, str], purpose: str = "calibrate"):
        return read(edit(full_text, *changes), purpose)

    return read_changed


@pytest.fixture
def full_problems(problems, full_text, full_tables):
    def problems_of(*changes: tuple[str, str], purpose: str = "calibrate") -> tuple[str, ...]:
        return problems(*changes, text=full_text, purpose=purpose)

    return problems_of


def test_a_calibration_is_read_with_its_defaults(read_full):
    calibration = read_full().calibration
    assert calibration.start == datetime(2026, 3, 1, tzinfo=UTC)
    assert calibration.fit == ("coefficient", "datum_offset_m")
    assert calibration.hold_back == 0.25
    assert [opening.name for opening in calibration.opening] == ["gap of March"]
    assert calibration.opening[0].parameters == {"coefficient": 0.95}


def test_rows_of_the_file_stand_after_the_entries(read_full):
    discharge = read_full().discharge
    assert [(one.opening, one.discharge_m3_s, one.standard_error_m3_s) for one in discharge] == [
        ("", -2400.0, 120.0),
        ("gap of March", 1800.0, 90.0),
        ("", 2100.0, 100.0),
        ("sluice", 25.0, 3.0),
    ]
    assert discharge[2].time == datetime(2026, 3, 10, 10, 30, tzinfo=UTC)


@pytest.mark.parametrize("names", ['opening = "all"\n', 'opening = ""\n', ""])
def test_all_openings_together_have_one_name(read_full, names):
    assert read_full(("[[discharge]]\n", f"[[discharge]]\n{names}")).discharge[0].opening == ""


def test_a_semicolon_table_gives_the_same_discharges(read_full, full_tables, tmp_path):
    expected = read_full().discharge
    text = (tmp_path / "campaign.csv").read_text().replace(",", ";").replace("1800", "1800,0")
    (tmp_path / "campaign.csv").write_text("# as measured\n" + text)
    assert read_full().discharge == expected


def test_a_calibration_needs_no_stages(read_full, full_text):
    text = full_text[full_text.index("[[stage]]") : full_text.index("[calibration]")]
    plan = read_full((text, ""))
    assert plan.stage == ()
    assert opening_names(plan) == ()


def test_a_calibration_does_not_mind_what_stages_miss(read_full):
    plan = read_full(('relation = "stone"\nporosity = 0.4\nstone_m = 0.6', ""), ("failure_slope_cot = 6.0\n", ""))
    assert plan.calibration is not None


def test_discharges_need_no_file(read_full):
    assert len(read_full(('discharge_file = "campaign.csv"\n', "")).discharge) == 1


def test_a_calibration_needs_no_discharges(read_full, full_text):
    plan = read_full(('discharge_file = "campaign.csv"\n', ""), (full_text[full_text.index("[[discharge]]") :], ""))
    assert plan.discharge == ()


@pytest.mark.parametrize(
    ("start", "end", "message"),
    [
        ("[records.sea]", "[records.basin]", "records.sea: missing; a calibration needs the sea level as it was"),
        ("[records.basin]", "[[correction]]", "records.basin: missing; a calibration needs the basin level as it was"),
        ("[basin]", "[bed]", "basin: missing; a calibration needs the storage of the basin"),
        ("[calibration]", "[[discharge]]", "calibration: missing; write [calibration] with start, end, fit and [["),
        ("[[calibration.opening]]", "[[discharge]]", "calibration.opening: missing; write [[calibration.opening]]"),
    ],
)
def test_what_a_calibration_needs_is_asked_for(full_problems, full_text, start, end, message):
    part = full_text[full_text.index(start) : full_text.index(end)]
    found = full_problems((part, ""))
    assert [problem for problem in found if message in problem], found


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            "end = 2026-04-01T00:00:00Z",
            "end = 2026-03-01T00:00:00Z",
            "calibration.end: found 2026-03-01T00:00:00Z, not after start = 2026-03-01",
        ),
        (
            "start = 2026-03-01T00:00:00Z\nend",
            "start = 2026-03-01T00:00:00\nend",
            "calibration.start: found 2026-03-01T00:00:00; needs an offset from UTC",
        ),
        (
            '"datum_offset_m"]',
            '"datum_ofset_m"]',
            'calibration.fit[2]: found "datum_ofset_m"; did you mean "datum_offset_m"?',
        ),
        ('"datum_offset_m"]', '"coefficient"]', 'calibration.fit[2]: "coefficient" stands twice'),
        ('["coefficient", "datum_offset_m"]', "[]", "calibration.fit: found []; needs at least 1 in the list"),
        (
            '["coefficient", "datum_offset_m"]',
            '"coefficient"',
            'calibration.fit: found "coefficient"; needs a list in brackets',
        ),
        ('fit = ["coefficient", "datum_offset_m"]\n', "", "calibration.fit: missing: What is estimated"),
        (
            "discharge_file",
            "hold_back = 0.6\ndischarge_file",
            "calibration.hold_back: found 0.6; needs a number from 0 up to 0.5",
        ),
        (
            "discharge_file",
            "hold_back = -0.1\ndischarge_file",
            "calibration.hold_back: found -0.1; needs a number from 0 up",
        ),
        ("discharge_file", "discharge_flie", 'calibration.discharge_flie: unknown key; did you mean "discharge_file"?'),
        (
            "crest_level_m = -6.5\nrelation",
            "crest_level_m = -7.5\nrelation",
            '"gap of March"].crest_level_m: found -7.5, under the lowest point',
        ),
        (
            '-6.5\nrelation = "broad-crest"\ncoefficient = 0.95',
            "-6.5",
            '"gap of March"].relation: missing; write "broad-crest" or "stone"',
        ),
        (
            '-6.5\nrelation = "broad-crest"\ncoefficient = 0.95',
            '-6.5\nrelation = "broad-crest"',
            '"gap of March"].coefficient: missing; "broad-crest" needs',
        ),
        (
            '-6.5\nrelation = "broad-crest"\ncoefficient = 0.95',
            '-6.5\nrelation = "stone"\nporosity = 0.4\nstone_m = 1.0',
            'found "coefficient", but no relation of [[calibration.opening]] has one; "broad-crest" would',
        ),
        (
            "time = 2026-03-10T09:30:00Z",
            "time = 2026-04-01T00:00:00Z",
            "00Z, outside the calibration: 2026-03-01T00:00:00Z up to 2026-04-01T00:00:00Z",
        ),
        (
            "time = 2026-03-10T09:30:00Z",
            "time = 2026-02-28T23:59:59Z",
            "discharge[1].time: found 2026-02-28T23:59:59Z, outside the calibration",
        ),
        (
            "discharge_m3_s = -2400",
            "discharge_m3_s = nan",
            "discharge[1].discharge_m3_s: found nan; needs a finite number",
        ),
        (
            "standard_error_m3_s = 120",
            "standard_error_m3_s = 0",
            "discharge[1].standard_error_m3_s: found 0; needs a number over 0",
        ),
        ("standard_error_m3_s = 120\n", "", "discharge[1].standard_error_m3_s: missing: Its standard error"),
        (
            "[[discharge]]\n",
            '[[discharge]]\nopening = "gap of may"\n',
            'discharge[1].opening: found "gap of may"; did you mean "gap of March"?',
        ),
        ("[[discharge]]\n", '[[discharge]]\nopening = "main gap"\n', 'discharge[1].opening: found "main gap"; '),
        (
            "[[discharge]]",
            "[discharge]",
            "discharge: found a table with time, discharge_m3_s, standard_error_m3_s; needs a list of tables",
        ),
    ],
)
def test_a_faulty_calibration_is_refused(full_problems, old, new, message):
    found = full_problems((old, new))
    assert [problem for problem in found if message in problem], found


@pytest.mark.parametrize("name", ["gap of March", "sluice"])
def test_no_opening_is_called_as_all_of_them(full_problems, name):
    found = full_problems((f'name = "{name}"', 'name = "all"'))
    assert [problem for problem in found if "means all openings together where a discharge names it" in problem], found


def test_a_name_stands_once_among_the_openings_of_then(full_problems):
    again = '[[calibration.opening]]\nname = "gap of March"\ncrest_level_m = 1\nwidth_m = 9\nrelation = "broad-crest"\n'
    (found,) = full_problems(("[[discharge]]", again + "coefficient = 1\n\n[[discharge]]"))
    assert 'calibration.opening[2 "gap of March"].name: stands twice in [[calibration.opening]]' in found


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (
            ("discharge_m3_s", "discharge"),
            'has no column "discharge_m3_s"; it has "time", "opening", "discharge" and "standard_error_m3_s"',
        ),
        (
            (",1800,", ",many,"),
            'campaign.csv row 2, discharge_m3_s: discharge[2].discharge_m3_s: found "many"; needs a number',
        ),
        (
            (",1800,", ",,"),
            "campaign.csv row 2, discharge_m3_s: discharge[2].discharge_m3_s: missing: Discharge, positive",
        ),
        (
            (",100\n", ",-100\n"),
            "row 3, standard_error_m3_s: discharge[3].standard_error_m3_s: found -100.0; needs a number over 0",
        ),
        (
            ("2026-03-10T10:00:00Z", "2026-03-10T10:00:00"),
            "campaign.csv row 2, time: discharge[2].time: found 2026-03-10T10:00:00; needs an offset",
        ),
        (
            ("2026-03-10T10:00:00Z", "10 March"),
            'campaign.csv row 2, time: discharge[2].time: found "10 March"; needs a date and time',
        ),
        (
            ("2026-03-10T10:00:00Z", "2026-05-10T10:00:00Z"),
            "campaign.csv row 2, time: discharge[2].time: found 2026-05-10T10:00:00Z, outside the calibration",
        ),
        (
            ("sluice", "sluise"),
            'campaign.csv row 4, opening: discharge[4].opening: found "sluise"; did you mean "sluice"?',
        ),
    ],
)
def test_a_faulty_row_of_discharges_is_named(full_problems, full_tables, change, message):
    full_tables("campaign.csv", change)
    (found,) = full_problems()
    assert message in found


def test_a_table_without_rows_is_refused(full_problems, tmp_path):
    (tmp_path / "campaign.csv").write_text("time,opening,discharge_m3_s,standard_error_m3_s\n")
    (found,) = full_problems()
    assert "calibration.discharge_file: campaign.csv: has a header but no row" in found


def test_a_date_of_a_workbook_is_told_to_be_text(full_problems, tmp_path):
    book = openpyxl.Workbook()
    book.active.append(["time", "opening", "discharge_m3_s", "standard_error_m3_s"])
    book.active.append([datetime(2026, 3, 10, 10), "sluice", 25, 3])
    book.save(tmp_path / "campaign.xlsx")
    (found,) = full_problems(('discharge_file = "campaign.csv"', 'discharge_file = "campaign.xlsx"'))
    assert "campaign.xlsx row 2, time (a date cell has no offset: write text): discharge[2].time: found" in found


def test_a_file_that_is_not_there_stops_the_calibration_alone(full_problems, read_full, tmp_path):
    (tmp_path / "campaign.csv").unlink()
    (found,) = full_problems()
    assert 'calibration.discharge_file: "campaign.csv": no such file in ' in found
    plan = read_full(purpose="run")
    assert plan.calibration is None
    assert len(plan.discharge) == 1


def test_a_run_leaves_out_a_calibration_that_is_not_complete(read_full, full_problems):
    assert read_full(('fit = ["coefficient", "datum_offset_m"]\n', ""), purpose="run").calibration is None
    (found,) = full_problems(("fit = [", "hold_back = 2\nfit = ["), purpose="run")
    assert "calibration.hold_back: found 2; needs a number from 0 up to 0.5" in found


def test_constants_and_a_sea_record_go_together_where_a_calibration_uses_the_record(read_full):
    measured = ('sea = "measured"\nbasin = "measured"\n', "")
    constants = ("infer = {", 'sea_constants = "c.csv"\nsea_mean_m = 0.1\ninfer = {')
    assert read_full(measured, constants, purpose="run").tide.sea_constants == "c.csv"


def test_a_span_is_half_open(read_full):
    plan = read_full(("time = 2026-03-10T09:30:00Z", "time = 2026-03-01T00:00:00Z"))
    assert plan.discharge[0].time == plan.calibration.start
