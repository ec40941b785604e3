import tomllib
from dataclasses import replace
from datetime import datetime

import jsonschema
import pytest

from tidescour.plan.resolved import resolved_plan
from tidescour.plan.schema import plan_schema
from tidescour.plan.template import plan_template
from tidescour.table import Parameter


def as_json(value):
    """Return TOML as tools hand it to a schema: date-times as strings."""
    if isinstance(value, datetime):
        return value.isoformat()
    if isinstance(value, dict):
        return {key: as_json(item) for key, item in value.items()}
    return [as_json(item) for item in value] if isinstance(value, list) else value


@pytest.fixture(scope="module")
def validator(choices):
    schema = plan_schema(choices)
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def test_a_full_plan_and_the_template_pass(validator, plan_text):
    for text in (plan_text, plan_template()):
        validator.validate(as_json(tomllib.loads(text)))


def test_a_resolved_plan_passes(validator, read, plan_text):
    validator.validate(resolved_plan(read(plan_text)))


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("datum =", "datun ="),
        ("[scour]", "[scuor]"),
        ('unit = "m"', 'unit = "yard"'),
        ("latitude_deg = 53.4", "latitude_deg = 534"),
        ("latitude_deg = 53.4", 'latitude_deg = "53.4"'),
        ("width_m = 400.0", "width_m = 0"),
        ('law = "explicit"', 'law = "implicit"'),
        ("d90_mm = 0.40", 'shields = "none"'),
        ('files = ["basin.csv"]', 'files = ["b"]\nlayout = "agency"'),
        ('relation = "broad-crest"', 'relation = "brod-crest"'),
        ("coefficient = 0.95\n", ""),
        ("coefficient = 0.95\n", "coefficient = 3.5\n"),
        ("coefficient = 0.95\n", "coefficient = 0\n"),
        ("coefficient = 0.95\n", 'coefficient = 0.95\ndischarge_series = "model"\n'),
        ("coefficient = 0.95\n", "coefficient = 0.95\nparameters = {}\n"),
        ('["M2", "S2", "N2"]', '["M2", "X2"]'),
        ('{ K2 = ["S2"', '{ X2 = ["S2"'),
        ("from = 2026-03-01T00:00:00Z", "start = 2026-03-01T00:00:00Z"),
        ("[scour]", '[programme]\nfile = "p.csv"\n[scour]'),
        ('[site]\nname = "Invented gap"', "[site]"),
        ('utc_offset = "+00:00"', 'utc_offset = "abc"'),
        ('utc_offset = "+00:00"', 'utc_offset = "+14:30"'),
        ('time_format = "%d-%m-%Y %H:%M"', 'time_format = "dd-mm-yyyy"'),
        ("start = 2027-04-01T00:00:00Z", "start = 2027-04-01T00:00:00"),
        ("end = 2027-06-20T00:00:00Z", 'end = "soon"'),
        ("from = 2026-03-01T00:00:00Z", "from = 2026-03-01T00:00:00"),
        ("[[2026-02-01T00:00:00Z", "[[2026-02-01T00:00:00"),
        ('{ K2 = ["S2"', '{ K2 = ["X2"'),
        ("shift_m = 0.12", "shift_m = 1001"),
    ],
)
def test_a_wrong_plan_fails(validator, plan_text, edit, old, new):
    assert not validator.is_valid(as_json(tomllib.loads(edit(plan_text, (old, new)))))


@pytest.mark.parametrize("key", ["stage", "correction", "discharge", "sounding", "load_case", "filter"])
def test_an_empty_list_of_tables_fails(validator, plan_text, key):
    plan = as_json(tomllib.loads(plan_text))
    assert validator.is_valid(plan)
    assert not validator.is_valid(plan | {key: []})


def test_a_date_time_may_have_any_offset_and_parts_of_a_second(validator, plan_text, edit):
    for moment in ("2027-04-01T02:00:00+02:00", "2027-03-31 22:00:00.5Z", "2027-03-31T14:00:00-10:00"):
        validator.validate(as_json(tomllib.loads(edit(plan_text, ("2027-04-01T00:00:00Z", moment)))))


def test_the_schema_says_that_only_a_run_needs_a_relation(choices):
    assert "A run needs one of these" in plan_schema(choices)["$defs"]["Opening"]["description"]


def test_every_key_says_what_it_means(choices):
    for name, table in plan_schema(choices)["$defs"].items():
        for key, schema in table["properties"].items():
            assert schema.get("description"), f"{name}.{key}"


def test_a_plan_with_all_tables_passes(validator, read, full_text, full_tables):
    validator.validate(as_json(tomllib.loads(full_text)))
    validator.validate(resolved_plan(read(full_text)))


PROFILE = 'profile = "survey.csv"\nprofile_from_m = 10\nprofile_to_m = 30\n'


@pytest.mark.parametrize(
    ("old", "new"),
    [
        (PROFILE, 'profile = "survey.csv"\n'),
        (PROFILE, 'profile = "survey.csv"\ncrest_level_m = -6.0\ncrest_level_end_m = -5.0\n'),
        (PROFILE, "crest_level_m = -6.0\nwidth_m = 250\n"),
        ('table_column = "volume_m3"\n', ""),
        ('table = "hypsometry.csv"\ntable_column = "volume_m3"\n', "level_m = [0, 1]\nvolume_m3 = [0, 1]\n"),
        ('relation = "broad-crest"\ncoefficient = 0.9\nsea_lag', 'discharge_series = "model"\nsea_lag'),
        ("[[discharge]]\n", '[[discharge]]\nopening = "sluice"\n'),
        ("[calibration]\n", "[calibration]\nhold_back = 0.5\n"),
        ('["coefficient", "datum_offset_m"]', '["area_factor"]'),
    ],
)  # fmt: skip
def test_schema_and_loader_take_the_same_plans(validator, read, full_text, full_tables, edit, old, new):
    text = edit(full_text, (old, new))
    assert read(text, "calibrate").calibration is not None
    validator.validate(as_json(tomllib.loads(text)))


@pytest.mark.parametrize(
    ("old", "new"),
    [
        (PROFILE, PROFILE + "width_m = 250\n"),
        (PROFILE, PROFILE + "side_slope = 1.0\n"),
        (PROFILE, PROFILE + "crest_level_end_m = -5.0\n"),
        (PROFILE, PROFILE + "profile_points = [[0, 1], [1, 2]]\n"),
        (PROFILE, "crest_level_m = -6.0\nwidth_m = 250\nprofile_to_m = 30\n"),
        (PROFILE, "crest_level_m = -6.0\n"),
        (PROFILE, "width_m = 250\n"),
        ("sea_lag_s = 300", "sea_lag_s = -43201"),
        ("sea_factor = 1.02", "sea_factor = 0"),
        ("sea_shift_m = -0.05", "sea_shift_m = -1001"),
        ("flow_length_m = 60", "flow_length_m = 0"),
        ("width_m = 20.0", "width_m = 20.0\nalpha_sea = 2.0"),
        ("width_m = 20.0", "width_m = 20.0\ncrest_level_end_m = -1.0"),
        ('relation = "broad-crest"\ncoefficient = 0.9\nsea_lag', 'end_velocity_series = "jet"\nsea_lag'),
        ('relation = "broad-crest"\ncoefficient = 0.9\nsea_lag', "sea_lag"),
        ("coefficient = 0.9\n", ""),
        ("crest_level_m = -6.5\n", "crest_level_m = -6.5\nalpha_basin = 2.0\n"),
        ('-6.5\nrelation = "broad-crest"\ncoefficient = 0.95', '-6.5\ndischarge_series = "model"'),
        ('-6.5\nrelation = "broad-crest"\ncoefficient = 0.95', "-6.5"),
        ('table = "hypsometry.csv"\n', 'table = "hypsometry.csv"\nlevel_m = [0.0, 1.0]\n'),
        ('table = "hypsometry.csv"\n', 'table = "hypsometry.csv"\nvolume_m3 = [0.0, 1.0]\n'),
        ('table = "hypsometry.csv"\n', "level_m = [0.0]\narea_m2 = [1.0]\n"),
        ('table = "hypsometry.csv"\ntable_column = "volume_m3"\n', "level_m = [0.0]\n"),
        ('table = "hypsometry.csv"\ntable_column = "volume_m3"\n', "area_m2 = [1.0]\n"),
        ('table = "hypsometry.csv"\ntable_column = "volume_m3"\n', "level_m = [0.0]\nvolume_m3 = [1.0]\n"),
        (
            'table = "hypsometry.csv"\ntable_column = "volume_m3"\n',
            "level_m = [0, 1]\narea_m2 = [1, 1]\nvolume_m3 = [0, 1]\n",
        ),
        ('table_column = "volume_m3"', 'table_column = "volume"'),
        ("depth_m = 4.5", "depth_m = 0"),
        ("discharge_m3_s = 12\n", ""),
        ("discharge_m3_s = 12\n", 'discharge_m3_s = 12\nseries = "model"\n'),
        ("[[basin.inflow]]", "[basin.inflow]"),
        ('fit = ["coefficient", "datum_offset_m"]\n', ""),
        ('"datum_offset_m"]', '"datum"]'),
        ('"datum_offset_m"]', '"coefficient"]'),
        ('["coefficient", "datum_offset_m"]', "[]"),
        ("[calibration]\n", "[calibration]\nhold_back = 0.51\n"),
        ("standard_error_m3_s = 120", "standard_error_m3_s = 0"),
        ("standard_error_m3_s = 120\n", ""),
        ("time = 2026-03-10T09:30:00Z", "time = 2026-03-10T09:30:00"),
    ],
)  # fmt: skip
def test_schema_and_loader_refuse_the_same_plans(validator, problems, full_text, full_tables, edit, old, new):
    text = full_text
    if old == "[[basin.inflow]]":
        text = text.replace('[[basin.inflow]]\nname = "pumps"\nseries = "model"\n', "")
    assert problems((old, new), text=text, purpose="run" if old == PROFILE else "calibrate")
    assert not validator.is_valid(as_json(tomllib.loads(edit(text, (old, new)))))


def test_a_plan_with_every_design_key_passes(validator, read, design_text, full_tables):
    validator.validate(as_json(tomllib.loads(design_text)))
    validator.validate(resolved_plan(read(design_text)))


@pytest.mark.parametrize("law", ["explicit", "time-scale", "saturating"])
def test_a_resolved_plan_passes_with_any_law(validator, read, plan_text, edit, law):
    validator.validate(resolved_plan(read(edit(plan_text, ('"explicit"', f'"{law}"')))))


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ('"log-law"', '"log"'),
        ("fines_percent = 22", "fines_percent = 101"),
        ("critical_velocity_m_s = 0.9\n", ""),
        ("top_level_m = -11.0\n", ""),
        ("d50_mm = 0.3\n", ""),
        ('"fixed-rate"', '"fixed"'),
        ("alpha_lengths_m = [60, 90, 150]\n", ""),
        ("alpha_values = [2.6, 2.4, 2.4]\n", ""),
        ("alpha_values = [2.6, 2.4, 2.4]\n", "alpha_values = [2.6, 2.4, 2.4]\nalpha = 2\n"),
        ("depth_margin_factor = 1.2", "depth_margin_factor = 0.9"),
        ("growth_factor = 0.9", "growth_factor = 0"),
        ("time_exponent = 0.38", "time_exponent = 1"),
        ("time_exponent = 0.38", 'equilibrium = "turbulence"'),
        ("time_exponent = 0.38", "curve_points = [[1, 1], [2, 2]]"),
        ('curve_source = "physical model 1 in 60"\n', ""),
        ('law = "model-curve"\n', 'law = "time-scale"\n'),
        ("depth_margin_factor = 1.2", "depth_margin_factor = 5.5"),
        ("alpha_values = [2.6", "alpha_values = [26"),
        ("prior_scatter = 0.25", "prior_scatter = 0"),
        ("depth_m = 3.6\n", ""),
        ("depth_m = 3.6\n", "depth_m = 3.6\nbed_level_m = -12.6\n"),
        ("depth_m = 3.6\n", "depth_m = -0.1\n"),
        ('side = "basin"\ndepth_m', 'side = "east"\ndepth_m'),
        ("date = 2027-05-20T12:00:00Z", "date = 2027-05-20"),
        ('stage = "sill to -4"\n', ""),
        ("shields = 0.03", "shields = 0"),
        ("d85_mm = 4\n", ""),
        ('[[filter]]\nname = "gravel"\nd15_mm = 1.2\nd85_mm = 4\n', ""),
    ],
)
def test_schema_and_loader_refuse_the_same_designs(validator, problems, design_text, full_tables, edit, old, new):
    assert problems((old, new), text=design_text, purpose="soundings")
    assert not validator.is_valid(as_json(tomllib.loads(edit(design_text, (old, new)))))


def test_a_number_with_a_default_is_not_required(choices):
    gate = (
        Parameter(name="slot_m", unit="m", low=0.0, high=9.0, meaning="width of a slot", default=1.0, together="bed_m"),
        Parameter(
            name="bed_m", unit="m", low=-9.0, high=9.0, meaning="bed of the slot", default=0.0, together="slot_m"
        ),
    )
    schema = plan_schema(replace(choices, relations={"gate": gate}))
    check = jsonschema.Draft202012Validator({"$defs": schema["$defs"], "$ref": "#/$defs/Opening"})
    opening = {"name": "gate", "crest_level_m": 0.0, "width_m": 3.0, "relation": "gate"}
    assert check.is_valid(opening)
    assert check.is_valid(opening | {"slot_m": 1.0, "bed_m": 0.0})
    assert not check.is_valid(opening | {"slot_m": 1.0})
    assert not check.is_valid(opening | {"slot_m": 0.0, "bed_m": 0.0})


@pytest.mark.parametrize("key", ["inflow", "side_opening"])
def test_an_empty_list_of_the_basin_fails(validator, full_text, key):
    plan = as_json(tomllib.loads(full_text))
    plan["basin"] = plan["basin"] | {key: []}
    assert not validator.is_valid(plan)
