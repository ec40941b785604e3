import pytest


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'time_zone = "Europe/Amsterdam"',
            'time_zone = "Europe/Amsterdam"\nutc_offset = "+01:00"',
            "basin.time_zone: st",
        ),
        (
            'utc_offset = "+00:00"',
            'utc_offset = "+1:00"',
            'utc_offset: found "+1:00"; needs hours and minutes such as +01',
        ),
        ('utc_offset = "+00:00"', 'utc_offset = "01:00"', 'utc_offset: found "01:00"; needs hours and minutes'),
        ('utc_offset = "+00:00"', 'utc_offset = "+25:00"', "needs hours and minutes"),
        ('utc_offset = "+00:00"', 'utc_offset = "+01:75"', "needs hours and minutes"),
        ('utc_offset = "+00:00"', 'utc_offset = "+14:30"', 'found "+14:30"; needs hours and minutes such as +01:00 or'),
        ('utc_offset = "+00:00"', 'utc_offset = ""', 'records.sea.utc_offset: found ""; needs hours and minutes'),
        ('utc_offset = "+00:00"', 'utc_offset = "+0\u0661:00"', "needs hours and minutes"),
        ("Europe/Amsterdam", "", 'records.basin.time_zone: found ""; needs text that is not blank'),
        ("Europe/Amsterdam", "Europe/Amsterdm", 'records.basin.time_zone: found "Europe/Amsterdm"; did you mean "Eur'),
        ("Europe/Amsterdam", "../../etc/passwd", 'found "../../etc/passwd"; there are'),
        (
            "%d-%m-%Y %H:%M",
            "dd-mm-yyyy",
            'records.basin.time_format: found "dd-mm-yyyy"; needs "iso", "excel" or a str',
        ),
        ("averaging_s = 600\n", "", 'records.basin.averaging_s: missing; stamp = "mean-centred" needs the length'),
        ('stamp = "mean-centred"\n', "", 'records.basin.averaging_s: stands beside stamp = "instant"'),
        ("[-4.0, 5.0]", "[5.0, -4.0]", "records.sea.sensor_range_m: found [5.0, -4.0]; needs the lower level first"),
        ("2026-02-02T00:00:00Z]]", "2026-02-01T00:00:00Z]]", "records.sea.exclude[1]: found [2026-02-01T00:00:00Z, "),
        (
            "to = 2026-03-20T00",
            "to = 2026-02-20T00",
            "correction[1].to: found 2026-02-20T00:00:00Z, not after from = 20",
        ),
        ("shift_m = 0.12", "shift_m = 0.0", "correction[1]: does nothing; give shift_m, clock_shift_s or clock_drift"),
        ('evidence = "levelled again"', 'evidence = " "', 'correction[1].evidence: found " "; needs one line of print'),
        ('evidence = "levelled again"\n', "", "correction[1].evidence: missing"),
        ('unit = "m3/s"', 'unit = "m"', 'series.model.unit: found "m"; discharge needs "m3/s"'),
        (
            'value = "u"\nutc_offset = "+00:00"\nunit = "m/s"',
            'value = "u"\nutc_offset = "+00:00"\nunit = "m3/s"',
            "jet.u",
        ),
        (
            'quantity = "level"\nutc_offset = "+00:00"\nunit = "m"',
            'quantity = "level"\nutc_offset = "+00:00"\nunit = "m/s"',
            'series.storm.unit: found "m/s"; level needs "m", "cm", "mm" or "ft"',
        ),
        ("[series.storm]", "[series.measured]", "series.measured: means another source of a level"),
        ('["M2", "S2", "N2"]', '["M2", "S2", "X9"]', 'tide.constituents[3]: found "X9"; '),
        ('["M2", "S2", "N2"]', '["M2", "S2", "M2"]', 'tide.constituents[3]: "M2" stands twice'),
        (
            '["M2", "S2", "N2"]',
            '["M2", "S2", "K2"]',
            "tide.infer.K2: is inferred, so leave it out of tide.constituents",
        ),
        ('["M2", "S2", "N2"]', '["M2", "N2"]', 'tide.infer.K2[1]: "S2" is not in tide.constituents; add it there'),
        ('{ K2 = ["S2"', '{ K3 = ["S2"', 'tide.infer.K3: found "K3"; choose "M2", "S2", "N2"'),
        ('{ K2 = ["S2"', '{ K2 = ["s2"', 'tide.infer.K2[1]: found "s2"; did you mean "S2"?'),
        ('{ K2 = ["S2"', '{ K2 = ["K2"', 'tide.infer.K2[1]: "K2" is inferred itself'),
        (
            "infer = {",
            'sea_constants = "c.csv"\ninfer = {',
            "tide.sea_mean_m: missing; tide.sea_constants needs the mean sea",
        ),
        ("infer = {", "sea_mean_m = 0.1\ninfer = {", "tide.sea_mean_m: belongs to tide.sea_constants"),
        (
            "level_m = [-3.0, 0.0, 3.0]",
            "level_m = [-3.0, 3.0, 0.0]",
            "basin.level_m[3]: found 0 after 3; levels must incr",
        ),
        ("level_m = [-3.0, 0.0, 3.0]", "level_m = [-3.0, 3.0]", "basin.area_m2: has 3 values where level_m has 2"),
        ("2.0e7, 2.6e7]", "2.0e7, 1.9e7]", "basin.area_m2[3]: found 1.9e+07 after 2e+07; the wet area cannot decrease"),
        ("2.0e7, 2.6e7]", "0.0, 2.6e7]", "basin.area_m2[2]: found 0.0; needs a number over 0"),
        ("d90_mm = 0.40", "d90_mm = 0.2", "bed.d90_mm: found 0.2, below d50_mm = 0.25"),
        ("d90_mm = 0.40", 'shields = "van-rhijn"', 'bed.shields: found "van-rhijn"; did you mean "van-rijn"?'),
        (
            'files = ["basin.csv"]',
            'files = ["b"]\nlayout = "auto"',
            'layout: found "auto"; no layout recognises files by itself yet: write "columns"',
        ),
    ],
)
def test_inputs_that_do_not_go_together_are_refused(problems, old, new, message):
    found = problems((old, new))
    assert len(found) == 1, found
    assert message in found[0]


def test_an_offset_may_be_as_large_as_any_clock_has(read, plan_text, edit):
    for offset in ("+14:00", "-09:30", "+05:45"):
        plan = read(edit(plan_text, ('utc_offset = "+00:00"', f'utc_offset = "{offset}"')))
        assert plan.records.sea.utc_offset == offset


def test_shifts_may_be_as_large_as_their_limits(read, plan_text, edit):
    shifts = "shift_m = 1000\nclock_shift_s = -315576000\nclock_drift_s_per_day = 3600"
    assert read(edit(plan_text, ("shift_m = 0.12", shifts))).correction[0].shift_m == 1000.0


def test_stamps_may_carry_their_own_offset(read, plan_text, edit):
    plan = read(edit(plan_text, ('utc_offset = "+00:00"\n', ""), ('time_zone = "Europe/Amsterdam"\n', "")))
    assert plan.records.sea.utc_offset is None
    assert plan.records.basin.time_zone is None


def test_a_plan_may_name_auto_where_it_is_offered(tmp_path, plan_text, choices, edit):
    from dataclasses import replace

    from tidescour.plan.loader import read_plan

    path = tmp_path / "plan.toml"
    path.write_text(edit(plan_text, ('files = ["basin.csv"]', 'files = ["b"]\nlayout = "auto"')))
    plan = read_plan(path, replace(choices, layouts=("auto", "columns")))
    assert plan.records.basin.layout == "auto"


def test_a_correction_needs_the_record_of_its_side(problems, plan_text):
    start, end = plan_text.index("[records.basin]"), plan_text.index("[[correction]]")
    text = plan_text[:start] + plan_text[end:]
    found = problems(text=text)
    assert any('correction[1].side: found "basin", but there is no [records.basin]' in problem for problem in found)


def test_constants_stand_beside_a_sea_record_only_where_a_stage_measures_it(read, problems, plan_text, edit):
    both = edit(plan_text, ("infer = {", 'sea_constants = "c.csv"\nsea_mean_m = 0.1\ninfer = {'))
    assert read(both).tide.sea_mean_m == 0.1
    (found,) = problems(('sea = "measured"\nbasin = "measured"', 'sea = "tide"'), text=both)
    assert "tide.sea_constants: stands instead of a sea record, but [records.sea] is there" in found


def test_one_level_of_the_basin_is_enough(read, plan_text, edit):
    plan = read(edit(plan_text, ("level_m = [-3.0, 0.0, 3.0]", "level_m = [0]"), ("[1.4e7, 2.0e7, 2.6e7]", "[2e7]")))
    assert plan.basin.area_m2 == (2e7,)
