import dataclasses
import math

import pytest

from tidescour.errors import PlanError
from tidescour.plan.loader import read_plan
from tidescour.table import Parameter

SHAPE = ('profile = "survey.csv"\nprofile_from_m = 10\nprofile_to_m = 30\n', "")


@pytest.fixture
def read_full(read, full_text, full_tables, edit):
    def read_changed(*changes: tuple[str, str], purpose: str = "run"):
        return read(edit(full_text, *changes), purpose)

    return read_changed


@pytest.fixture
def full_problems(problems, full_text, full_tables):
    def problems_of(*changes: tuple[str, str], purpose: str = "run") -> tuple[str, ...]:
        return problems(*changes, text=full_text, purpose=purpose)

    return problems_of


def test_a_profile_is_read_into_its_opening(read_full):
    shoal = read_full().stage[0].opening[1]
    assert shoal.profile == "survey.csv"
    assert shoal.profile_points == ((10.0, -4.0), (20.0, -7.0), (30.0, -6.0))
    assert shoal.crest_level_m == -7.0
    assert shoal.width_m is None


def test_a_crest_that_is_given_stands_over_the_profile(read_full):
    opening = read_full().calibration.opening[0]
    assert opening.crest_level_m == -6.5
    assert len(opening.profile_points) == 6


def test_an_opening_without_profile_has_no_points(read_full):
    assert read_full().stage[0].opening[0].profile_points == ()


def test_side_openings_hold_what_is_written(read_full):
    (sluice,) = read_full().basin.side_opening
    assert (sluice.name, sluice.crest_level_m, sluice.width_m) == ("sluice", -3.0, 20.0)
    assert (sluice.sea_lag_s, sluice.sea_factor, sluice.sea_shift_m, sluice.flow_length_m) == (300.0, 1.02, -0.05, 60.0)
    assert (sluice.relation, sluice.parameters) == ("broad-crest", {"coefficient": 0.9})


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (SHAPE[0], "crest_level_m = -2\n", '"shoal"].width_m: missing: Width at crest level at the start of the stage'),
        (SHAPE[0], "width_m = 250\n", '"shoal"].crest_level_m: missing: Crest at the start of the stage'),
        (SHAPE[0], SHAPE[0] + "width_m = 250\n", ".width_m: stands beside profile; leave out one of the two"),
        (SHAPE[0], SHAPE[0] + "width_end_m = 250\n", ".width_end_m: stands beside profile; leave out one of the two"),
        (SHAPE[0], SHAPE[0] + "side_slope = 0.0\n", ".side_slope: stands beside profile; leave out one of the two"),
        ("width_m = 400.0", "width_m = 400.0\nprofile_to_m = 5", ".profile_to_m: belongs to a profile, and none is gi"),
        ("profile_from_m = 10", "profile_from_m = 30", ".profile_to_m: found 30, not over profile_from_m = 30"),
        ("profile_to_m = 30", "profile_to_m = -1", ".profile_to_m: found -1, not over profile_from_m = 10"),
        ("profile_from_m = 10\nprofile_to_m = 30", "profile_from_m = 50", "found 50, but the profile ends at 50"),
        ("profile_from_m = 10\nprofile_to_m = 30", "profile_to_m = -2", "found -2, but the profile begins at 0"),
        ("profile_from_m = 10", "profile_from_m = nan", ".profile_from_m: found nan; needs a finite number"),
        ("profile_from_m = 10", 'profile_from_m = "10"', '.profile_from_m: found "10"; needs a number'),
        ("profile_to_m = 30", "crest_level_m = -7.1", ".crest_level_m: found -7.1, under the lowest point of the prof"),
        ("profile_to_m = 30", "crest_level_m = -6.9\ncrest_level_end_m = -7.1", "_end_m: found -7.1, under the lowest"),
        ("profile_to_m = 30", "crest_level_end_m = -6", ".crest_level_m: missing; crest_level_end_m needs the crest"),
        (
            'profile = "survey.csv"\nprofile_from',
            'profile = "surveys.csv"\nprofile_from',
            '"surveys.csv": no such file',
        ),
        (
            'profile = "survey.csv"\nprofile_from',
            'profile = " "\nprofile_from',
            '.profile: found " "; needs text that i',
        ),
        (
            'profile = "survey.csv"\nprofile_from',
            "profile = 3\nprofile_from",
            ".profile: found 3; needs text in quotes",
        ),
        ('profile = "survey.csv"\nprofile_from', 'profile = "x.txt"\nprofile_from', "no such file in"),
        (SHAPE[0], "profile_points = [[0.0, 1.0]]\n" + SHAPE[0], ".profile_points: unknown key"),
        ("sea_lag_s = 300", "sea_lag_s = 43201", '"sluice"].sea_lag_s: found 43201; needs a number from -43200 up to'),
        ("sea_factor = 1.02", "sea_factor = 0", ".sea_factor: found 0; needs a number over 0"),
        ("sea_shift_m = -0.05", "sea_shift_m = 1001", ".sea_shift_m: found 1001; needs a number from -1000 up to"),
        ("flow_length_m = 60", "flow_length_m = 0", ".flow_length_m: found 0; needs a number over 0"),
        ("sea_lag_s = 300", "sea_lags = 300", '.sea_lags: unknown key; did you mean "sea_lag_s"?'),
        ("width_m = 20.0", "width_n = 20.0", '.width_n: unknown key; did you mean "width_m"?'),
    ],
)
def test_a_faulty_opening_is_refused(full_problems, old, new, message):
    found = full_problems((old, new))
    assert [problem for problem in found if message in problem], found
    assert all(problem.startswith("plan.toml line ") for problem in found)


@pytest.mark.parametrize(
    ("key", "kind", "why"),
    [
        ("alpha_sea = 3.0", "sluice", "no scour is computed at such an opening"),
        ("alpha_basin = 3.0", "sluice", "no scour is computed at such an opening"),
        ("crest_level_end_m = -2.0", "sluice", "a side opening does not change"),
        ("width_end_m = 10.0", "sluice", "a side opening does not change"),
        ('end_velocity_series = "jet"', "sluice", "a velocity gives no discharge to route"),
        ("alpha_sea = 3.0", "gap of March", "no scour is computed at such an opening"),
        ('discharge_series = "model"', "gap of March", "a calibration computes the discharge by a relation"),
        ('end_velocity_series = "jet"', "gap of March", "a velocity gives no discharge to route"),
    ],
)
def test_keys_of_other_openings_are_told_apart(full_problems, key, kind, why):
    (found,) = full_problems((f'name = "{kind}"', f'name = "{kind}"\n{key}'))
    name = key.split(" ")[0]
    assert f'opening[1 "{kind}"].{name}: does not belong here: {why}; leave it out' in found


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'name = "sluice"',
            'name = "main gap"',
            'opening[1 "main gap"].name: is the name of an opening of the gap too',
        ),
        ('name = "sluice"', 'name = "gap of March"', ".name: is the name of an opening of the gap too; a side opening"),
        (
            'relation = "broad-crest"\ncoefficient = 0.9\nsea_lag',
            "sea_lag",
            '.relation: missing; write "broad-crest" or "stone", or give discharge_series',
        ),
        (
            'relation = "broad-crest"\ncoefficient = 0.9\nsea_lag',
            'discharge_series = "storm"\nsea_lag',
            "a series of level; needs one of discharge",
        ),
        ("[[basin.side_opening]]", "[basin.side_opening]", "needs a list of tables: write [[basin.side_opening]] over"),
    ],
)
def test_side_openings_are_judged_as_openings(full_problems, old, new, message):
    found = full_problems((old, new), ('discharge_file = "campaign.csv"', ""))
    assert len(found) == 1, found
    assert message in found[0]


def test_a_name_stands_once_among_the_side_openings(full_problems):
    again = (
        '[[basin.side_opening]]\nname = "sluice"\ncrest_level_m = 1\nwidth_m = 9\ndischarge_series = "model"\n\n[bed]'
    )
    (found,) = full_problems(("[bed]", again))
    assert 'basin.side_opening[2 "sluice"].name: stands twice in [[basin.side_opening]]' in found


def test_a_side_opening_may_have_a_given_discharge(read_full):
    given = ('relation = "broad-crest"\ncoefficient = 0.9\nsea_lag', 'discharge_series = "model"\nsea_lag')
    assert read_full(given).basin.side_opening[0].discharge_series == "model"


def test_a_side_opening_is_no_place(read_full):
    from tidescour.plan.places import places

    assert {place.opening for place in places(read_full())} == {"main gap", "shoal"}


def test_a_faulty_profile_is_told_once_for_all_that_name_it(full_problems, full_tables):
    full_tables("survey.csv", ("20,-7", "20,low"))
    (found,) = full_problems()
    assert 'opening[2 "shoal"].profile: survey.csv row 4: level_m: found "low"; needs a finite number' in found


@pytest.mark.parametrize("purpose", ["run", "calibrate"])
def test_a_profile_that_is_not_there_stops_whoever_needs_it(full_problems, read_full, tmp_path, purpose):
    (tmp_path / "survey.csv").unlink()
    (found,) = full_problems(purpose=purpose)
    assert 'profile: "survey.csv": no such file in ' in found
    plan = read_full(purpose="records")
    assert [opening.name for opening in plan.stage[0].opening] == ["main gap"]
    assert plan.calibration is None


def test_a_profile_of_a_calibration_alone_stops_no_run(read_full, full_problems):
    elsewhere = ('name = "gap of March"\nprofile = "survey.csv"', 'name = "gap of March"\nprofile = "old.csv"')
    assert read_full(elsewhere).calibration is None
    (found,) = full_problems(elsewhere, purpose="calibrate")
    assert 'calibration.opening[1 "gap of March"].profile: "old.csv": no such file in ' in found


# Relations whose numbers may be left out: one alone, and two that go together.
SLOT = (
    Parameter(name="coefficient", unit="-", low=0.0, high=3.0, meaning="discharge coefficient", default=0.9),
    Parameter(
        name="slot_m", unit="m", low=0.0, high=50.0, meaning="width of the slot", default=math.inf, together="bed_m"
    ),
    Parameter(
        name="bed_m", unit="m", low=-50.0, high=50.0, meaning="bed of the slot", default=-math.inf, together="slot_m"
    ),
)


@pytest.fixture
def read_slot(tmp_path, plan_text, choices, edit):
    def read_with(numbers: str, purpose: str = "run"):
        path = tmp_path / "plan.toml"
        path.write_text(edit(plan_text, ('"broad-crest"\ncoefficient = 0.95', f'"slot"\n{numbers}')))
        slot = dataclasses.replace(choices, relations=dict(choices.relations) | {"slot": SLOT})
        return read_plan(path, slot, purpose)

    return read_with


@pytest.mark.parametrize(
    ("numbers", "expected"),
    [
        ("", {}),
        ("coefficient = 1", {"coefficient": 1.0}),
        ("slot_m = 10\nbed_m = -3", {"slot_m": 10.0, "bed_m": -3.0}),
    ],
)
def test_parameters_hold_only_what_was_written(read_slot, numbers, expected):
    assert read_slot(numbers).stage[0].opening[0].parameters == expected


@pytest.mark.parametrize(
    ("numbers", "message"),
    [
        (
            "slot_m = 10",
            r"bed_m: missing; slot_m goes together with bed_m, a number over -50 up to 50 m \(bed of the sl",
        ),
        (
            "bed_m = 1",
            r"slot_m: missing; bed_m goes together with slot_m, a number over 0 up to 50 m \(width of the sl",
        ),
        ("slot_m = inf\nbed_m = 1", r"slot_m: found inf; needs a number over 0 up to 50 m"),
        ("porosity = 0.4", r"porosity: unknown key"),
    ],
)
def test_numbers_that_go_together_are_not_parted(read_slot, numbers, message):
    with pytest.raises(PlanError, match=message) as caught:
        read_slot(numbers)
    assert len(caught.value.problems) == 1


def test_records_do_not_miss_a_number(read_slot):
    assert read_slot("slot_m = 10", "records").stage[0].opening[0].parameters == {"slot_m": 10.0}
