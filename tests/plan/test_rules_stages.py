import pytest

ROUTED_SERIES = 'sea = "storm"\nbasin = "routed"'
MEASURED = 'sea = "measured"\nbasin = "measured"'


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            "end = 2027-06-20",
            "end = 2027-05-11",
            'stage[2 "sill to -4"].end: found 2027-05-11T00:00:00Z, not after start',
        ),
        ("start = 2027-05-11T00:00:00Z", "start = 2027-05-10T21:59:59Z", "lasts until 2027-05-11T00:00:00+02:00"),
        (
            "start = 2027-05-11T00:00:00Z",
            "start = 2027-03-11T00:00:00Z",
            'starts before stage[1 "sill to -6"] above it',
        ),
        ('name = "sill to -4"', 'name = "sill to -6"', 'stage[2 "sill to -6"].name: stands twice; every stage needs'),
        (
            MEASURED,
            'sea = "measured"\nbasin = "tide"',
            '.basin: found "tide"; sea = "measured" goes with "routed" or "m',
        ),
        (MEASURED, 'sea = "measured"\nbasin = "storm"', '.basin: found "storm"; sea = "measured" goes with "routed"'),
        (MEASURED, 'basin = "measured"', '.basin: found "measured"; sea = "tide" goes with "routed" or "tide"'),
        (MEASURED, 'sea = "storm"\nbasin = "tide"', 'sea = "storm" goes with "routed" or a level series'),
        (MEASURED, 'sea = "storm"\nbasin = "measured"', 'sea = "storm" goes with "routed" or a level series'),
        (MEASURED, 'sea = "routed"', 'stage[2 "sill to -4"].sea: found "routed", but there is no [series.routed]; '),
        (MEASURED, 'sea = "strom"', '.sea: found "strom", but there is no [series.strom]; did you mean "storm"?'),
        (MEASURED, 'sea = "model"', '.sea: found "model", a series of discharge; needs one of level'),
        (
            "alpha_basin = 3.0\n",
            'discharge_series = "model"\n',
            ".discharge_series: stands beside relation; leave out one",
        ),
        (
            'relation = "stone"\nporosity = 0.4\nstone_m = 0.6',
            "",
            '.relation: missing; write "broad-crest" or "stone", or',
        ),
        (
            'relation = "stone"\n',
            'discharge_series = "model"\n',
            ".porosity: is a number of a relation, and discharge_se",
        ),
        (
            'relation = "stone"\nporosity = 0.4\nstone_m = 0.6',
            'discharge_series = "storm"',
            "a series of level; needs one of d",
        ),
        (
            'relation = "stone"\nporosity = 0.4\nstone_m = 0.6',
            'discharge_series = "mdl"',
            'no [series.mdl]; did you mean "mod',
        ),
        ('relation = "stone"\nporosity = 0.4\nstone_m = 0.6', 'end_velocity_series = "model"', "needs one of velocity"),
        (
            'relation = "broad-crest"\ncoefficient = 0.95',
            'end_velocity_series = "jet"',
            'gives no discharge, but basin = "rou',
        ),
        ('[protection.basin.opening."shoal"]', '[protection.basin.opening."shaol"]', 'did you mean "shoal"?'),
        ('name = "shoal"', 'name = "main gap"', 'opening[2 "main gap"].name: stands twice in this stage'),
        (
            "[protection.basin]\nlength_m = 90",
            "[protection.basin]",
            "protection.basin.length_m: missing: Length from the",
        ),
        (
            "chezy_m05_s = 40.0\n",
            "",
            "protection.basin.chezy_m05_s: missing; it gives alpha, unless alpha is given here or",
        ),
        ("failure_slope_cot = 7.0\n", "", "protection.sea.failure_slope_cot: missing: Slope 1 in n"),
        ("bed_level_m = -9.0\n", "", 'protection.basin.bed_level_m: missing, for "main gap": Original bed'),
        (
            "d50_mm = 0.25\n",
            "",
            "bed.d50_mm: missing; the critical velocity needs it, unless critical_velocity_m_s is giv",
        ),
    ],
)
def test_stages_that_do_not_hold_together_are_refused(problems, old, new, message):
    found = problems((old, new))
    assert any(message in problem for problem in found), found


def without(text: str, start: str, end: str) -> str:
    return text[: text.index(start)] + text[text.index(end) :]


@pytest.mark.parametrize(
    ("start", "end", "message"),
    [
        ("[basin]", "[bed]", '.basin: "routed" needs a source, but there is no [basin] with level_m and area_m2'),
        (
            "[records.sea]",
            "[records.basin]",
            '.sea: "tide" needs a source, but there is neither [records.sea] nor tide.sea',
        ),
        ("[records.sea]", "[records.basin]", '.sea: "measured" needs a source, but there is no [records.sea]'),
        ("[records.basin]", "[[correction]]", '.basin: "measured" needs a source, but there is no [records.basin]'),
        ("[[stage]]", "porosity = 0.4", "stage: missing; write [[stage]] for each stage, or [programme] with a file"),
        ("[protection.sea]", "[scour]", "protection.sea.bed_level_m: missing: Original bed"),
    ],
)
def test_what_a_run_needs_is_asked_for(problems, plan_text, start, end, message):
    text = plan_text[: plan_text.index("[[stage]]")] if start == "[[stage]]" else without(plan_text, start, end)
    found = problems(text=text)
    assert any(message in problem for problem in found), found


def test_records_only_asks_for_nothing_that_a_run_needs(read, plan_text):
    text = without(without(plan_text, "[basin]", "[bed]"), "[protection.basin]", "[scour]").replace(
        "d50_mm = 0.25\n", ""
    )
    assert len(read(text, "records").stage) == 2


@pytest.mark.parametrize(
    "levels", [ROUTED_SERIES, 'sea = "storm"\nbasin = "storm"', 'basin = "tide"', "sea = 'measured'"]
)
def test_levels_that_go_together_are_read(read, plan_text, edit, levels):
    assert read(edit(plan_text, (MEASURED, levels))).stage[1].name == "sill to -4"


@pytest.mark.parametrize("given", ['discharge_series = "model"', 'end_velocity_series = "jet"'])
def test_a_given_series_stands_instead_of_a_relation(read, plan_text, edit, given):
    plan = read(edit(plan_text, ('relation = "stone"\nporosity = 0.4\nstone_m = 0.6', given)))
    assert plan.stage[1].opening[0].relation is None
    assert plan.stage[1].opening[0].parameters == {}


def test_a_broken_series_is_reported_once_and_not_missed(problems):
    found = problems((MEASURED, ROUTED_SERIES), ('file = "storm.csv"', "file = 3"))
    assert len(found) == 1
    assert "series.storm.file: found 3" in found[0]


@pytest.mark.parametrize(
    ("start", "end", "table"),
    [("[protection.basin]", "[protection.sea]", "protection.basin"), ("[bed]", "[protection.basin]", "bed")],
)
def test_what_is_no_table_is_reported_once(problems, plan_text, start, end, table):
    (found,) = problems(text=f"{table} = 3\n" + without(plan_text, start, end))
    assert f"{table}: found 3; needs a table" in found


def test_a_broken_opening_does_not_make_its_place_unknown(problems):
    found = problems(("width_m = 250", "width_m = -1"))
    assert len(found) == 1
    assert "width_m: found -1" in found[0]


def test_alpha_in_every_stage_needs_no_chezy(read, problems, plan_text, edit):
    text = edit(plan_text, ("chezy_m05_s = 40.0\n", ""))
    first = ("coefficient = 0.95", "coefficient = 0.95\nalpha_basin = 2.5")
    second = ("coefficient = 1\n", "coefficient = 1\nalpha_basin = 2.5\n")
    assert read(edit(text, first, second)).protection.basin.chezy_m05_s is None
    (found,) = problems(first, text=text)
    assert "protection.basin.chezy_m05_s: missing; it gives alpha" in found
    assert 'for "shoal"' in found


def test_a_given_critical_velocity_needs_no_grain_size(read, plan_text, edit):
    changes = ("d50_mm = 0.25\n", "critical_velocity_m_s = 0.45\n")
    assert read(edit(plan_text, changes)).bed.d50_mm is None


def test_grain_sizes_of_all_places_need_none_for_the_bed(read, plan_text, edit):
    sizes = "".join(
        f'[protection.{side}.opening."{name}"]\nd50_mm = 0.3\n' for side in ("sea",) for name in ("main gap", "shoal")
    )
    text = edit(plan_text, ("d50_mm = 0.25\nd90_mm = 0.40\n", ""), ("[scour]", sizes + "[scour]"))
    text = edit(text, ("[protection.sea]", '[protection.basin.opening."main gap"]\nd50_mm = 0.3\n[protection.sea]'))
    assert read(text).bed.d50_mm is None


def test_stages_may_leave_a_gap_of_time(read, plan_text, edit):
    assert read(edit(plan_text, ("start = 2027-05-11T00:00:00Z", "start = 2027-05-15T00:00:00Z"))).stage


def test_programme_and_stages_exclude_each_other(problems):
    found = problems(("[scour]", '[programme]\nfile = "programme.csv"\n[scour]'))
    assert len(found) == 1
    assert "programme: stands beside [[stage]]; leave out one of the two" in found[0]
