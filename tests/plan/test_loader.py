import tomllib
from datetime import UTC, datetime

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tidescour.errors import PlanError
from tidescour.plan.loader import read_plan
from tidescour.plan.named_files import read_named_files
from tidescour.plan.problems import problem_texts
from tidescour.plan.rules import rule_problems
from tidescour.plan.sections import draft_of


def test_a_sound_plan_is_read_with_its_defaults(read, plan_text):
    plan = read(plan_text)
    assert plan.site.latitude_deg == 53.4
    assert plan.water.temperature_c == 10.0
    assert plan.records.sea.level == "level_m"
    assert plan.records.basin.level == 2
    assert plan.records.basin.time == ("date", "clock")
    assert plan.protection.basin.length_m == 90.0
    assert plan.protection.basin.opening["shoal"].bed_level_m == -3.0
    assert plan.tide.infer == {"K2": ("S2", 0.272, 0.0)}
    assert [stage.name for stage in plan.stage] == ["sill to -6", "sill to -4"]
    assert (plan.stage[0].sea, plan.stage[0].basin) == ("tide", "routed")


def test_date_times_keep_their_instant(read, plan_text):
    plan = read(plan_text)
    assert plan.stage[0].end.astimezone(UTC) == datetime(2027, 5, 10, 22, tzinfo=UTC)
    assert plan.correction[0].start == datetime(2026, 3, 1, tzinfo=UTC)


def test_numbers_of_a_relation_go_to_parameters(read, plan_text):
    first, second = read(plan_text).stage
    assert first.opening[0].parameters == {"coefficient": 0.95}
    assert first.opening[1].parameters == {"coefficient": 1.0}
    assert second.opening[0].parameters == {"porosity": 0.4, "stone_m": 0.6}


def test_folder_and_file_are_those_of_the_plan(read, plan_text, tmp_path):
    plan = read(plan_text)
    assert plan.folder == tmp_path
    assert plan.file == tmp_path / "plan.toml"


def test_a_byte_order_mark_and_crlf_do_no_harm(tmp_path, choices, plan_text):
    path = tmp_path / "plan.toml"
    path.write_bytes(b"\xef\xbb\xbf" + plan_text.replace("\n", "\r\n").encode())
    assert read_plan(path, choices).site.name == "Invented gap"


def test_all_problems_of_a_plan_are_reported_together(problems):
    found = problems(
        ("datum =", "datun ="),
        ('unit = "m"', 'unit = "yard"'),
        ("area_m2 = [1.4e7", "area_m2 = [nan"),
        ("width_m = 400.0", "width_m = -400.0"),
        ('relation = "broad-crest"', 'relation = "brod-crest"'),
        ("coefficient = 1\n", ""),
        ("start = 2027-05-11T00:00:00Z", "start = 2027-05-01T00:00:00Z"),
        ("[protection.sea]\nlength_m = 80.0", "[protection.sea]"),
        ('law = "explicit"', 'law = "implicit"'),
    )
    expected = [
        "line 2: site.datum: missing: Name of the site datum",
        'line 4: site.datun: unknown key; did you mean "datum"?',
        'line 10: records.sea.unit: found "yard"; choose "m", "cm", "mm" or "ft"',
        "basin.area_m2[1]: found nan; needs a finite number",
        'stage[1 "sill to -6"].opening[1 "main gap"].width_m: found -400.0; needs a number over 0',
        'stage[1 "sill to -6"].opening[1 "main gap"].relation: found "brod-crest"; did you mean "broad-crest"?',
        'opening[2 "shoal"].coefficient: missing; "broad-crest" needs a number over 0 up to 3 (discharge coefficient)',
        'stage[2 "sill to -4"].start: found 2027-05-01T00:00:00Z, but stage[1 "sill to -6"] lasts until 2027-05-11T00',
        'scour.law: found "implicit"; did you mean "explicit"?',
        "protection.sea.length_m: missing",
    ]
    for text in expected:
        assert [problem for problem in found if text in problem], text
    assert len(found) == len(expected)
    assert all(problem.startswith("plan.toml line ") for problem in found)


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        (
            (
                ('utc_offset = "+00:00"\nunit = "m"\nsensor_range_m = [-4.0, 5.0]',
                 'utc_offset = "1"\nunit = "M"\nsensor_range_m = [5, -5]\nstamp = "mean-preceding"'),
            ),
            (
                'records.sea.unit: found "M"; did you mean "m"?',
                'records.sea.utc_offset: found "1"; needs hours and minutes',
                "records.sea.sensor_range_m: found [5, -5]; needs the lower level first",
                "records.sea.averaging_s: missing",
            ),
        ),
        (
            (("to = 2026-03-20T00:00:00Z", "to = 2026-02-20T00:00:00Z"), ("shift_m = 0.12", "shift_m = true")),
            ("correction[1].to: found 2026-02-20", "correction[1].shift_m: found true"),
        ),
        (
            (("to = 2026-03-20T00:00:00Z", "to = 2026-03-20T00:00:00"), ("shift_m = 0.12", "shift_m = 0")),
            ("correction[1].to: found 2026-03-20T00:00:00; needs an offset", "correction[1]: does nothing"),
        ),
        (
            (('quantity = "discharge"\nvalue = "q"', 'quantity = "discharge"\nvalue = -1'), ('"m3/s"', '"m"')),
            ("series.model.value: found -1", 'series.model.unit: found "m"; discharge needs "m3/s"'),
        ),
        (
            (('["M2", "S2", "N2"]', '["M2", "X2", "M2"]'), ('["S2", 0.272, 0.0]', '["S2", 0.272]')),
            ("tide.infer.K2: the list", 'constituents[2]: found "X2"', 'constituents[3]: "M2" stands twice'),
        ),
        (
            (('["M2", "S2", "N2"]', "3"), ('{ K2 = ["S2"', '{ X2 = ["X3"')),
            ("tide.constituents: found 3", 'infer.X2: found "X2"', 'infer.X2[1]: found "X3"'),
        ),
        (
            (("level_m = [-3.0, 0.0, 3.0]", "level_m = [-3.0, -4.0, 3.0]"), ("[1.4e7,", "[nan,")),
            ("basin.level_m[2]: found -4 after -3", "basin.area_m2[1]: found nan"),
        ),
        (
            (("start = 2027-05-11T00:00:00Z\nend = 2027-06-20T00:00:00Z",
              "start = 2027-05-01T00:00:00Z\nend = 2027-06-20T00:00:00"),),
            ('stage[2 "sill to -4"].start: found 2027-05-01', 'stage[2 "sill to -4"].end: found 2027-06-20T00:00:00; '),
        ),
        (
            (('name = "sill to -6"\n', ""), ("start = 2027-05-11T00:00:00Z", "start = 2027-05-01T00:00:00Z")),
            ("stage[1].name: missing", "but stage[1] lasts until"),
        ),
        (
            (("end = 2027-05-11T00:00:00+02:00", "end = 2027-05-11\nsea = 'strom'"),),
            ("].end: found 2027-05-11; ", '].sea: found "strom", but there is no [series.strom]; did you mean "storm"'),
        ),
        (
            (('width_m = 250\nrelation = "broad-crest"\ncoefficient = 1', 'width_m = -1\ndischarge_series = "nope"'),),
            ("width_m: found -1", 'discharge_series: found "nope", but there is no [series.nope]'),
        ),
        (
            (("[protection.sea]\nlength_m = 80.0\nbed_level_m = -8.5", "[protection.sea]\nlength_m = -80.0"),),
            ("protection.sea.length_m: found -80.0", "protection.sea.bed_level_m: missing"),
        ),
    ],
    ids=lambda item: item[0][:40] if isinstance(item[0], str) else None,
)  # fmt: skip
def test_a_faulty_key_hides_no_other_of_its_table(problems, changes, expected):
    found = problems(*changes)
    for text in expected:
        assert [problem for problem in found if text in problem], (text, found)
    assert len(found) == len(expected), found


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ((("averaging_s = 600", "averaging_s = -600"),), "averaging_s: found -600"),
        ((('stamp = "mean-centred"', 'stamp = "mean"'),), 'stamp: found "mean"'),
        ((("alpha_basin = 3.0", "alpha_basin = -3.0"),), "alpha_basin: found -3.0"),
        ((("chezy_m05_s = 40.0", "chezy_m05_s = 0"),), "protection.basin.chezy_m05_s: found 0"),
        ((("d50_mm = 0.25", "d50_mm = 0"),), "bed.d50_mm: found 0"),
        ((('relation = "stone"', "relation = 3"),), "relation: found 3"),
        ((('quantity = "level"', 'quantity = "levels"'), ('sea = "measured"\nbasin = "measured"', 'sea = "storm"')),
         'series.storm.quantity: found "levels"'),
        ((('sea = "measured"', "sea = 3"), ("infer = {", 'sea_constants = "c.csv"\nsea_mean_m = 0.1\ninfer = {')),
         "sea: found 3"),
    ],
)  # fmt: skip
def test_a_faulty_key_is_judged_once_and_not_taken_for_missing(problems, changes, message):
    (found,) = problems(*changes)
    assert message in found


def test_problems_stand_in_the_order_of_the_file(problems):
    found = problems(('law = "explicit"', 'law = "x"'), ("latitude_deg = 53.4", "latitude_deg = 534"))
    assert "site.latitude_deg" in found[0]
    assert "scour.law" in found[1]


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("latitude_deg = 53.4", 'latitude_deg = "53.4"', 'site.latitude_deg: found "53.4"; needs a number'),
        ("latitude_deg = 53.4", "latitude_deg = true", "site.latitude_deg: found true; needs a number"),
        ("latitude_deg = 53.4", "latitude_deg = 90.1", "needs a number from -90 up to 90: Latitude, positive north"),
        ("latitude_deg = 53.4", "latitude_deg = -91", "needs a number from -90 up"),
        ("latitude_deg = 53.4", "latitude_deg = inf", "found inf; needs a finite number"),
        ("latitude_deg = 53.4", "latitude_deg = nan", "found nan; needs a finite number"),
        ("length_m = 80.0", "length_m = -80.0", "protection.sea.length_m: found -80.0; needs a number from 0 up"),
        ("d50_mm = 0.25", "d50_mm = 0", "bed.d50_mm: found 0; needs a number over 0"),
        ('datum = "site datum"', 'datum = "  "', "needs one line of printable text: not blank"),
        ('datum = "site datum"', "datum = 7", "found 7; needs text in quotes"),
        ('files = ["sea_*.csv"]', 'files = "sea.csv"', 'records.sea.files: found "sea.csv"; needs a list'),
        ('files = ["sea_*.csv"]', "files = []", "records.sea.files: found []; needs at least 1 in the list"),
        ("level = 2", "level = -2", "records.basin.level: found -2; needs the name of a column, or its number from 0"),
        ("level = 2", "level = true", "found true; needs the name of a column"),
        ('time = ["date", "clock"]', 'time = ["a", "b", "c"]', "needs the name of a column, its number from 0, or a"),
        ("sensor_range_m = [-4.0, 5.0]", "sensor_range_m = [-4.0]", "sea.sensor_range_m: the list is too short"),
        ("sensor_range_m = [-4.0, 5.0]", "sensor_range_m = [-4.0, 0, 5.0]", "needs a list of 2"),
        ('constituents = ["M2", "S2", "N2"]', 'constituents = "atuo"', 'needs "auto" or a list of names'),
        ('["S2", 0.272, 0.0]', '["S2", 0.272]', "tide.infer.K2: the list is too short"),
        ('["S2", 0.272, 0.0]', '["S2", -0.272, 0]', "tide.infer.K2[2]: found -0.272; needs a number over 0"),
        ("start = 2027-04-01T00:00:00Z", "start = 2027-04-01T00:00:00", "needs an offset from UTC: write one, such as"),
        ("start = 2027-04-01T00:00:00Z", "start = 2027-04-01", "found 2027-04-01; needs a date and time with an"),
        ("start = 2027-04-01T00:00:00Z", 'start = "2027-04-01T00:00:00Z"', "no quotes in the plan file"),
        ("[2026-02-01T00:00:00Z, ", "[2026-02-01T00:00:00, ", "records.sea.exclude[1][1]: found 2026-02-01T00:00:00;"),
        ("shift_m = 0.12", "shift_n = 0.12", 'correction[1].shift_n: unknown key; did you mean "shift_m"?'),
        ("from = 2026-03-01T00:00:00Z", "start = 2026-03-01T00:00:00Z", "correction[1].start: unknown key"),
        (
            "utc_offset",
            "clock_shift_s = 1e300\nutc_offset",
            "found 1e+300; needs a number from -315576000 up to 315576000",
        ),
        ("utc_offset", "clock_shift_s = -315576001\nutc_offset", "needs a number from -315576000 up to"),
        (
            "utc_offset",
            "shift_m = -1000.5\nutc_offset",
            "records.sea.shift_m: found -1000.5; needs a number from -1000",
        ),
        (
            "shift_m = 0.12",
            "shift_m = 1e300",
            "correction[1].shift_m: found 1e+300; needs a number from -1000 up to 1000",
        ),
        (
            "shift_m = 0.12",
            "clock_shift_s = 1e12",
            "correction[1].clock_shift_s: found 1000000000000.0; needs a number",
        ),
        ("shift_m = 0.12", "clock_drift_s_per_day = 3601", "found 3601; needs a number from -3600 up to 3600"),
        ("[scour]", "[scuor]", 'scuor: unknown key; did you mean "scour"?'),
        ("[records.sea]", "[records.see]", 'records.see: unknown key; did you mean "sea"?'),
        ("[protection.sea]", "[protection.seaward]", 'protection.seaward: unknown key; did you mean "sea"?'),
        ("crest_level_m = -2.0", "crest_m = -2.0", 'opening[2 "shoal"].crest_m: unknown key; did you mean "crest_'),
        ("coefficient = 0.95", "coeficient = 0.95", 'coeficient: unknown key; did you mean "coefficient"?'),
        ("coefficient = 0.95", "coefficient = 0.95\nporosity = 0.4", "porosity: unknown key"),
        ("coefficient = 0.95", "coefficient = 3.5", "found 3.5; needs a number over 0 up to 3 (discharge coefficient)"),
        ("coefficient = 0.95", "coefficient = 0.0", "found 0.0; needs a number over 0 up to 3"),
        ("coefficient = 0.95", "coefficient = nan", "found nan; needs a number over 0 up to 3"),
        ("coefficient = 0.95", 'coefficient = "0.95"', 'found "0.95"; needs a number over 0 up to 3'),
        ("coefficient = 0.95", "coefficient = true", "found true; needs a number over 0 up to 3"),
        ("stone_m = 0.6\n", "", 'stone_m: missing; "stone" needs a number over 0 up to 5 m (size of the stone)'),
        ("coefficient = 0.95", "parameters = {coefficient = 0.95}", "parameters: unknown key"),
        ('law = "explicit"', 'tide = "mean"', 'scour.tide: found "mean"; did you mean "flow-mean"?'),
        ('quantity = "level"', 'quantity = "levels"', 'series.storm.quantity: found "levels"; did you mean "level"?'),
        ('name = "sill to -6"\n', "", "stage[1].name: missing: Name of the stage."),
    ],
)
def test_a_wrong_value_or_key_is_named_with_what_is_allowed(problems, old, new, message):
    assert [problem for problem in problems((old, new)) if message in problem]


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('[scour]\nlaw = "explicit"', "[[scour]]", "scour: found [an empty table]; needs a table: write [scour]"),
        ("[[correction]]", "[correction]", "needs a list of tables: write [[correction]] over each"),
        ("[tide]", "[tide]\n[records]\nsea = 3\n[extra]", "records.sea: found 3; needs a table: write [records.sea]"),
    ],
)
def test_a_table_of_the_wrong_form_is_named(problems, plan_text, old, new, message):
    text = plan_text
    if "records" in new:
        text = text[: text.index("[records.sea]")] + text[text.index("[[correction]]") :]
    assert [problem for problem in problems((old, new), text=text) if message in problem]


def test_a_stage_as_single_table_is_told_to_be_a_list(problems):
    found = problems(text='[site]\nname = "a"\ndatum = "b"\nlatitude_deg = 1\n[stage]\nname = "x"\n')
    assert [problem for problem in found if "stage: found a table with name; needs a list of tables" in problem]


def test_a_fault_in_one_opening_hides_none_in_the_next(problems):
    found = problems(("width_m = 400.0", "width_m = nan"), ("width_m = 250", "width_m = 0"))
    assert len(found) == 2


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"[site\n", r"plan.toml: is not sound TOML: .*line 1, column 6"),
        (b"[site]\nname = 'a'\nname = 'b'\n", r"is not sound TOML: .*line 3"),
        (b"[site]\nname = \xe9\n", "plan.toml line 2: is not UTF-8 text; save the file as UTF-8"),
        ("[site]\n".encode("utf-16"), "is not UTF-8 text"),
        (b"a = " + b"[" * 100_000, "is not sound TOML"),
    ],
    ids=["syntax", "double key", "latin", "utf-16", "too deep"],
)
def test_a_file_that_is_no_plan_is_refused(tmp_path, choices, content, message):
    path = tmp_path / "plan.toml"
    path.write_bytes(content)
    with pytest.raises(PlanError, match=message):
        read_plan(path, choices)


def test_a_missing_file_and_a_folder_are_refused(tmp_path, choices):
    with pytest.raises(PlanError, match=r"no such file; `tidescour new FOLDER` writes a plan"):
        read_plan(tmp_path / "plan.toml", choices)
    with pytest.raises(PlanError, match=r"is a folder; give the plan file"):
        read_plan(tmp_path, choices)
    with pytest.raises(PlanError, match=r"cannot be read: File name too long"):
        read_plan(tmp_path / ("a" * 4000), choices)


def test_an_empty_plan_asks_for_its_site_and_stages(problems):
    found = problems(text="")
    assert [problem for problem in found if problem.startswith("plan.toml: site: missing; write [site]")]
    assert [problem for problem in found if problem.startswith("plan.toml: stage: missing; write [[stage]]")]


RECORDS_ONLY = """
[site]
name = "a"
datum = "b"
latitude_deg = 1
[records.sea]
files = ["sea.csv"]
unit = "m"
utc_offset = "+00:00"
"""


def test_records_need_site_and_one_record_only(read, problems):
    assert read(RECORDS_ONLY, "records").stage == ()
    found = problems(("[records.sea]", "[series.sea]"), ("files =", "file ="), text=RECORDS_ONLY, purpose="records")
    assert [problem for problem in found if "records: missing; write [records.sea]" in problem]


def test_constants_stand_for_a_record(read):
    text = RECORDS_ONLY[: RECORDS_ONLY.index("[records")] + '[tide]\nsea_constants = "c.csv"\nsea_mean_m = 0.0\n'
    assert read(text, "records").tide.sea_constants == "c.csv"


def test_records_only_leaves_out_stages_that_are_not_complete(read, problems):
    text = RECORDS_ONLY + '[[stage]]\nname = "later"\nstart = 2027-01-01T00:00:00Z\nend = 2027-02-01T00:00:00Z\n'
    assert read(text, "records").stage == ()
    opened = text + '[[stage.opening]]\nname = "gap"\ncrest_level_m = -6.0\nwidth_m = 10.0\n'
    assert [stage.name for stage in read(opened, "records").stage] == ["later"]
    assert [problem for problem in problems(text=text) if "stage[1" in problem and "opening: missing" in problem]


def test_records_only_still_judges_what_stands_in_stages(problems, plan_text):
    found = problems(("width_m = 250", "width_m = -250"), text=plan_text, purpose="records")
    assert len(found) == 1
    assert "width_m: found -250" in found[0]


VALUES = st.one_of(
    st.booleans(),
    st.integers(-3, 10**400),
    st.floats(),
    st.text(max_size=5),
    st.sampled_from(["tide", "measured", "routed", "storm", "model", "jet", "M2", "auto", "stone", "instant"]),
    st.datetimes(),
    st.lists(st.one_of(st.integers(), st.text(max_size=3), st.floats()), max_size=3),
    st.dictionaries(st.sampled_from(["a", "name", "sea", "opening", "unit"]), st.integers(), max_size=2),
    st.lists(st.dictionaries(st.sampled_from(["name", "opening"]), st.integers(), max_size=2), max_size=2),
)


def containers(value):
    """Return every table and list of a plan."""
    inner = list(value.values()) if isinstance(value, dict) else value if isinstance(value, list) else []
    return ([value] if isinstance(value, dict | list) else []) + [item for one in inner for item in containers(one)]


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_no_plan_however_wrong_breaks_the_checks(data, full_text, full_tables, tmp_path, choices):
    written = tomllib.loads(full_text)
    for _ in range(data.draw(st.integers(1, 4))):
        container = data.draw(st.sampled_from([one for one in containers(written) if one]))
        keys = list(container) if isinstance(container, dict) else list(range(len(container)))
        key = data.draw(st.sampled_from(keys))
        if data.draw(st.booleans()):
            container[key] = data.draw(VALUES)
        else:
            del container[key]
    files = read_named_files(tmp_path, written)
    draft, problems = draft_of(written, choices, files.values)
    problems += [*files.problems, *rule_problems(draft)]
    texts = problem_texts(problems, written, {}, "plan.toml")
    assert len(texts) == len(problems)
    assert all(len(text) < 500 for text in texts)
