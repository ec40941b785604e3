import re
from datetime import UTC, datetime

import openpyxl
import pytest


@pytest.fixture
def one_problem(problems, design_text, full_tables):
    """Return a function that gives the only problem of the design plan with a change."""

    def problem_of(old: str = "", new: str = "", purpose: str = "soundings") -> str:
        (found,) = problems((old, new), text=design_text, purpose=purpose)
        return found

    return problem_of


def test_rows_of_the_file_stand_after_the_entries(read, design_text, full_tables):
    soundings = read(design_text, "soundings").sounding
    assert [(one.opening, one.side, one.depth_m, one.bed_level_m) for one in soundings] == [
        ("main gap", "basin", 3.6, None),
        ("shoal", "basin", 1.2, None),
        ("main gap", "basin", None, -13.4),
    ]
    assert [one.standard_error_m for one in soundings] == [0.3, 0.3, 0.25]
    assert [one.upper_slope_cot for one in soundings] == [4.0, None, 3.5]
    assert soundings[2].date == datetime(2027, 6, 10, 12, tzinfo=UTC)


def test_a_semicolon_table_gives_the_same_soundings(read, design_text, full_tables, tmp_path):
    expected = read(design_text).sounding
    text = (tmp_path / "soundings.csv").read_text().replace(",", ";").replace("-13.4", "-13,4")
    (tmp_path / "soundings.csv").write_text("# as sounded\n" + text)
    assert read(design_text).sounding == expected


def test_a_table_without_the_optional_columns_is_enough(read, design_text, full_tables, tmp_path):
    (tmp_path / "soundings.csv").write_text(
        "date,opening,side,bed_level_m,standard_error_m\n2027-06-01T00:00:00Z,main gap,sea,-10,0.2\n"
    )
    assert read(design_text).sounding[1].bed_level_m == -10.0


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("depth_m = 3.6\n", "", "sounding[1].depth_m: missing; give it, or bed_level_m"),
        (
            "depth_m = 3.6",
            "depth_m = 3.6\nbed_level_m = -12",
            "sounding[1].bed_level_m: stands beside depth_m; leave out",
        ),
        ("depth_m = 3.6", "depth_m = -1", "sounding[1].depth_m: found -1; needs a number from 0 up"),
        (
            "depth_m = 3.6",
            "bed_level_m = -8.5",
            "sounding[1].bed_level_m: found -8.5, over the original bed at -9; write",
        ),
        (
            'opening = "main gap"\nside',
            'opening = "main gp"\nside',
            'sounding[1].opening: found "main gp"; did you mean "main',
        ),
        ('side = "basin"\ndepth', 'side = "land"\ndepth', 'sounding[1].side: found "land"; choose "sea" or "basin"'),
        (
            "date = 2027-05-20T12:00:00Z",
            "date = 2027-05-20T12:00:00",
            "sounding[1].date: found 2027-05-20T12:00:00; needs an",
        ),
        (
            "standard_error_m = 0.3",
            "standard_error_m = 0",
            "sounding[1].standard_error_m: found 0; needs a number over 0",
        ),
        (
            "prior_scatter = 0.25",
            "prior_scatter = 0",
            "soundings.prior_scatter: found 0; needs a number over 0 up to 2",
        ),
        (
            "growth_scatter = 0.05",
            "growth_scatter = 2.5",
            "soundings.growth_scatter: found 2.5; needs a number from 0 up to 2",
        ),
        (
            "date = 2027-05-20T12:00:00Z",
            "date = 2027-06-10T14:00:00+02:00",
            "row 3, date: sounding[3].date: found 2027-06-10T14:00:00+02:00, as in sounding[1]; a place is sounded",
        ),
    ],
)
def test_a_faulty_sounding_is_refused(one_problem, old, new, message):
    assert message in one_problem(old, new)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (("shoal", "shole"), 'soundings.csv row 2, opening: sounding[2].opening: found "shole"; did you mean "shoal"?'),
        (("1.2,,", ",,"), "soundings.csv row 2, depth_m: sounding[2].depth_m: missing; give it, or bed_level_m"),
        (("1.2,,", "1.2,-4,"), "row 2, bed_level_m: sounding[2].bed_level_m: stands beside depth_m; leave out one"),
        (("1.2,,", ",-2.5,"), "row 2, bed_level_m: sounding[2].bed_level_m: found -2.5, over the original bed at -3"),
        (("1.2,,", "deep,,"), 'row 2, depth_m: sounding[2].depth_m: found "deep"; needs a number'),
        ((",0.3,", ",,"), "row 2, standard_error_m: sounding[2].standard_error_m: missing: Standard error"),
        (("12:00:00Z", "12:00:00"), "row 2, date: sounding[2].date: found 2027-05-20T12:00:00; needs an offset"),
        (
            ("depth_m,bed_level_m", "depth,level"),
            'soundings.csv: has no column "depth_m" or "bed_level_m"; it has "date"',
        ),
        (("standard_error_m,", "error_m,"), 'soundings.file: soundings.csv: has no column "standard_error_m"; it has'),
    ],
)
def test_a_faulty_row_of_soundings_is_named(one_problem, full_tables, change, message):
    full_tables("soundings.csv", change)
    assert message in one_problem()


def test_a_date_of_a_workbook_is_told_to_be_text(one_problem, tmp_path):
    book = openpyxl.Workbook()
    book.active.append(["date", "opening", "side", "depth_m", "standard_error_m"])
    book.active.append([datetime(2027, 6, 10, 10), "shoal", "sea", 2, 0.3])
    book.save(tmp_path / "soundings.xlsx")
    found = one_problem('file = "soundings.csv"', 'file = "soundings.xlsx"')
    assert "soundings.xlsx row 2, date (a date cell has no offset: write text): sounding[2].date: found" in found


def test_a_file_that_is_not_there_stops_the_soundings_alone(one_problem, read, design_text, tmp_path):
    (tmp_path / "soundings.csv").unlink()
    assert 'soundings.file: "soundings.csv": no such file in ' in one_problem()
    for purpose in ("run", "delay"):
        assert len(read(design_text, purpose).sounding) == 1


def test_a_file_is_enough(read, design_text, full_tables, edit):
    entries = design_text[design_text.index("[[sounding]]") : design_text.index("[[load_case]]")]
    assert len(read(edit(design_text, (entries, "")), "soundings").sounding) == 2


def test_soundings_are_asked_for_only_where_they_are_compared(problems, read, plan_text):
    (found,) = problems(("", ""), purpose="soundings")
    assert "sounding: missing; write [[sounding]] with date, opening, side, depth_m (or bed_level_m) and" in found
    assert "or soundings.file, a table of these columns" in found
    assert read(plan_text, "delay") == read(plan_text, "run")


def test_a_sounding_that_is_not_complete_stops_the_soundings_alone(read, design_text, full_tables, edit):
    plan = read(edit(design_text, ("standard_error_m = 0.3\n", "")), "run")
    assert [one.opening for one in plan.sounding] == ["shoal", "main gap"]
    (fault,) = plan.sounding_faults
    assert re.match(r"plan\.toml line \d+: sounding\[1\]\.standard_error_m: missing: Standard error", fault)


# The first stage of the plan starts on 2027-04-01, the last ends on 2027-06-20.
@pytest.mark.parametrize(
    ("date", "message"),
    [
        ("2027-04-01T00:00:00Z", "not after the first stage's start at 2027-04-01T00:00:00Z, from which growth is"),
        ("2027-03-31T23:00:00Z", "; give that depth as start_depth_m of its protection, or leave the sounding out"),
        ("2027-06-20T00:00:01Z", "after the last stage's end at 2027-06-20T00:00:00Z; add the stage in which it was"),
    ],
)
def test_a_date_outside_the_programme_is_refused_where_soundings_are_compared(
    one_problem, read, design_text, full_tables, edit, date, message
):
    found = one_problem("date = 2027-05-20T12:00:00Z", f"date = {date}")
    assert f": sounding[1].date: found {date}, " in found
    assert message in found
    assert re.match(r"plan\.toml line \d+: ", found)
    text = edit(design_text, ("date = 2027-05-20T12:00:00Z", f"date = {date}"))
    for purpose in ("run", "delay", "records"):
        assert [found] == list(read(text, purpose).sounding_faults)


def test_the_last_moment_of_the_programme_may_be_sounded(read, design_text, full_tables, edit):
    plan = read(edit(design_text, ("date = 2027-05-20T12:00:00Z", "date = 2027-06-20T00:00:00Z")), "soundings")
    assert plan.sounding_faults == ()


def test_all_faults_of_soundings_are_told_in_one_pass(problems, design_text, full_tables):
    full_tables("soundings.csv", (",1.2,,0.3,", ",1.2,,,"), ("2027-06-10T14", "2027-07-10T14"))
    found = problems(("depth_m = 3.6\n", ""), text=design_text, purpose="soundings")
    assert [re.sub(r"line \d+", "line", one).split(": ")[:2] for one in found] == [
        ["plan.toml line", "sounding[1].depth_m"],
        ["soundings.csv row 2, standard_error_m", "sounding[2].standard_error_m"],
        ["soundings.csv row 3, date", "sounding[3].date"],
    ]


@pytest.mark.parametrize("purpose", ["run", "soundings", "delay"])
@pytest.mark.parametrize(
    ("start", "end", "message"),
    [
        ("[[stage]]", "[calibration]", "stage: missing; write [[stage]] for each stage"),
        ("failure_slope_cot = 6.0\n", "upstream_slope_cot", "protection.basin.failure_slope_cot: missing"),
        ("d50_mm = 0.25\n", "velocity_profile", "bed.d50_mm: missing; the critical velocity needs it"),
        ("level_m = [-3.0", "[bed]", "basin.level_m: missing, or a table"),
    ],
)
def test_what_a_run_needs_is_asked_for_by_all_that_do_the_whole_job(problems, plan_text, purpose, start, end, message):
    sounding = '\n[[sounding]]\ndate = 2027-05-01T00:00:00Z\nopening = "shoal"\nside = "sea"\ndepth_m = 1\n'
    text = plan_text + sounding + "standard_error_m = 0.2\n"
    piece = {
        "[[stage]]": text[text.index("[[stage]]") : text.index("[[sounding]]")],
        "level_m = [-3.0": "level_m = [-3.0, 0.0, 3.0]\narea_m2 = [1.4e7, 2.0e7, 2.6e7]\n",
    }.get(start, start)
    found = problems((piece, ""), text=text, purpose=purpose)
    assert [problem for problem in found if message in problem], found


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'stage = "sill to -4"\n',
            'stage = "sill to 4"\n',
            'load_case[1 "storm of ten years"].stage: found "sill to 4"; did',
        ),
        (
            'stage = "sill to -4"\n',
            "",
            'load_case[1 "storm of ten years"].stage: missing: Stage at whose end the storm comes',
        ),
        (
            '"sill to -4"\nseries = "storm"',
            '"sill to -4"\nseries = "strom"',
            'found "strom", but there is no [series.strom]; did',
        ),
        (
            '"sill to -4"\nseries = "storm"',
            '"sill to -4"\nseries = "jet"',
            'found "jet", a series of velocity; needs one of level',
        ),
        (
            "[stone]",
            '[[load_case]]\nname = "storm of ten years"\nstage = "sill to -6"\nseries = "storm"\n[stone]',
            'load_case[2 "storm of ten years"].name: stands twice; every load case needs a name of its own',
        ),
    ],
)
def test_a_faulty_load_case_is_refused(one_problem, old, new, message):
    assert message in one_problem(old, new, purpose="run")


def test_planned_dates_run_forwards(one_problem):
    found = one_problem("planned_end = 2027-04-24T00:00:00Z", "planned_end = 2027-03-15T00:00:00Z", purpose="run")
    assert '"sill to -6"].planned_end: found 2027-03-15T00:00:00Z, not after planned_start = 2027-03-15' in found


@pytest.mark.parametrize("line", ["planned_start = 2027-03-15T00:00:00Z\n", "planned_end = 2027-04-24T00:00:00Z\n"])
def test_a_planned_date_may_stand_alone(read, design_text, full_tables, edit, line):
    stage = read(edit(design_text, (line, ""))).stage[0]
    assert (stage.planned_start is None) == ("start" in line)
    assert (stage.planned_end is None) == ("end" in line)


def test_planned_dates_of_a_programme_hold_for_their_stage_alone(read, plan_text, tmp_path):
    (tmp_path / "p.csv").write_text(
        "stage,start,end,planned_start,planned_end,opening,crest_level_m,width_m,relation,coefficient\n"
        "one,2027-01-01T00:00:00Z,2027-02-01T00:00:00Z,2026-12-20T00:00:00Z,2027-01-20T00:00:00Z,shoal,-6,400,"
        "broad-crest,0.9\n"
        "two,2027-02-01T00:00:00Z,2027-03-01T00:00:00Z,,,shoal,-5,,,\n"
    )
    plan = read(plan_text[: plan_text.index("[[stage]]")] + '[programme]\nfile = "p.csv"\n')
    assert plan.stage[0].planned_end == datetime(2027, 1, 20, tzinfo=UTC)
    assert plan.stage[1].planned_start is None
