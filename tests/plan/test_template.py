import re
import tomllib

import pytest

from tidescour.errors import PlanError
from tidescour.plan import models, models_bed, models_calibration, models_survey
from tidescour.plan.shapes import key_names
from tidescour.plan.template import plan_template, write_new_plan

TABLES = (
    models.Site, models.Water, models.RecordSource, models.Correction, models.Series, models.Tide, models.Basin,
    models_bed.Bed, models_bed.PlaceOverride, models_bed.Scour, models.Programme, models.Stage, models.Opening,
    models.Inflow, models.Calibration, models_calibration.Discharge, models_bed.BedLayer, models_bed.Stone,
    models_bed.Grading, models_survey.Sounding, models_survey.Soundings, models_survey.LoadCase,
)  # fmt: skip
OPTIONAL = re.compile(r"^# ([a-z0-9_]+ = .*)$", re.MULTILINE)

# Optional lines that stand instead of others, or need a table around them that is optional too.
NOT_ALONE = {
    "time_zone", "averaging_s", "sea_constants", "sea_mean_m", "discharge_series", "end_velocity_series", "volume_m3",
    "table", "table_column", "profile", "profile_from_m", "profile_to_m", "critical_velocity_evidence",
    "alpha_lengths_m", "alpha_values", "stop_slope_cot", "stop_slope_height_m", "time_constant", "time_exponent",
    "equilibrium", "curve_file", "curve_source",
}  # fmt: skip
TOGETHER = (
    ("critical_velocity_m_s", "fines_percent", "critical_velocity_evidence"),
    ("alpha_lengths_m", "alpha_values"),
    ("stop_slope_cot", "stop_slope_height_m", "stop_depth_m"),
    ("spreading", "widening"),
)


def test_the_template_is_a_sound_plan(read):
    plan = read(plan_template())
    assert [stage.name for stage in plan.stage] == ["initial sill", "sill raised"]
    assert read(plan_template(), "records").records.sea.files == ("sea_*.csv",)


@pytest.mark.parametrize("model", TABLES, ids=lambda model: model.__name__)
def test_every_key_stands_in_the_template(model):
    text = plan_template()
    for key in key_names(model):
        assert re.search(rf"^(# )?(\[+[a-z.]*)?\b{key}\b( =|\]|\.)", text, re.MULTILINE), key


def blocks():
    """Return each optional line of a table that is there, with what it would be without its mark."""
    inside_optional_table = False
    for line in plan_template().splitlines():
        if re.match(r"^# \[", line):
            inside_optional_table = True
        elif not line.startswith("#"):
            inside_optional_table = False
        elif (key := OPTIONAL.match(line)) and not inside_optional_table:
            yield line, key[1]


@pytest.mark.parametrize(("line", "bare"), list(blocks()), ids=lambda text: text.split()[0])
def test_an_optional_line_is_sound_without_its_mark(read, line, bare):
    if bare.split()[0] in NOT_ALONE:
        tomllib.loads(bare)
        return
    assert read(plan_template().replace(line, bare, 1))


def with_lines(text, *keys):
    """Return a template in which the first optional line of each key has lost its mark."""
    for key in keys:
        text = re.sub(rf"^# (?={key} = )", "", text, count=1, flags=re.MULTILINE)
    return text


@pytest.mark.parametrize("keys", TOGETHER, ids=lambda keys: keys[0])
def test_lines_that_stand_together_are_sound_together(read, keys):
    text = plan_template().replace('# spreading = "none" ', '# spreading = "fixed-rate" ')
    assert read(with_lines(text, *keys)) != read(text)


@pytest.mark.parametrize(
    ("law", "keys"),
    [
        ("time-scale", ("time_constant", "time_exponent")),
        ("saturating", ("equilibrium",)),
        ("model-curve", ("curve_file", "curve_source")),
    ],
)
def test_numbers_of_a_law_are_sound_beside_it(read, tmp_path, law, keys):
    (tmp_path / "model_curve.csv").write_text("time_over_t1,depth_over_water_depth\n0.1,0.4\n1,1\n2,1.3\n")
    text = with_lines(plan_template(), "law", *keys).replace('law = "explicit"', f'law = "{law}"')
    assert read(text).scour.law == law


def test_the_last_tables_are_sound_together(read, tmp_path):
    (tmp_path / "soundings.csv").write_text(
        "date,opening,side,depth_m,standard_error_m\n2027-06-01T00:00:00Z,main gap,sea,1,0.2\n"
    )
    head, tail = re.split(r"(?=^# -+ soundings$)", plan_template(), maxsplit=1, flags=re.MULTILINE)
    tail = re.sub(r"^# (?=\[|[a-z0-9_]+ = )", "", tail, flags=re.MULTILINE)
    tail = re.sub(r"^bed_level_m = .*\n", "", tail, flags=re.MULTILINE)
    series = '[series.storm]\nfile = "storm.csv"\nquantity = "level"\nunit = "m"\n'
    plan = read(head + series + tail, "soundings")
    assert [sounding.side for sounding in plan.sounding] == ["basin", "sea"]
    assert len(plan.load_case) == 1
    assert len(plan.filter) == 2


def test_lines_that_show_a_default_change_nothing(read):
    text = plan_template()
    for line, bare in blocks():
        key = bare.split()[0]
        if key in ("temperature_c", "salinity_g_kg", "grain_density_kg_m3", "shields", "velocity_profile",
                   "roughness_d50", "law", "tide"):  # fmt: skip
            assert read(text.replace(line, bare, 1)) == read(text)


@pytest.mark.parametrize(
    "table",
    ["correction", "protection", "series", "basin.inflow", "basin.side_opening", "bed.layer", "calibration", "stone"],
)
def test_an_optional_table_is_sound_without_its_marks(read, table):
    text = plan_template()
    block = re.search(rf"^# \[+{table}[^\n]*\n(# [^\n]*\n)+", text, re.MULTILINE)[0]
    assert read(text.replace(block, re.sub(r"^# ", "", block, flags=re.MULTILINE)))


def test_no_line_is_wider_than_a_page():
    assert max(map(len, plan_template().splitlines())) <= 120


def test_a_new_plan_is_written_into_a_new_folder(tmp_path):
    path = write_new_plan(tmp_path / "gap" / "first")
    assert path == tmp_path / "gap" / "first" / "plan.toml"
    assert path.read_bytes() == plan_template().encode()


def test_a_plan_that_is_there_is_left_as_it_is(tmp_path):
    (tmp_path / "plan.toml").write_text("mine")
    with pytest.raises(PlanError, match=r"plan.toml: is there already and was left as it is"):
        write_new_plan(tmp_path)
    assert (tmp_path / "plan.toml").read_text() == "mine"


def test_a_file_is_no_folder(tmp_path):
    (tmp_path / "gap").write_text("mine")
    with pytest.raises(PlanError, match=r"gap: is a file; give the name of a folder"):
        write_new_plan(tmp_path / "gap")
    with pytest.raises(PlanError, match=r"cannot be written"):
        write_new_plan(tmp_path / "gap" / "inner")
