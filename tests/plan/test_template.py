import re
import tomllib

import pytest

from tidescour.errors import PlanError
from tidescour.plan import models, models_calibration
from tidescour.plan.shapes import key_names
from tidescour.plan.template import plan_template, write_new_plan

TABLES = (
    models.Site, models.Water, models.RecordSource, models.Correction, models.Series, models.Tide, models.Basin,
    models.Bed, models.Protection, models.Scour, models.Programme, models.Stage, models.Opening, models.Inflow,
    models.Calibration, models_calibration.Discharge,
)  # fmt: skip
OPTIONAL = re.compile(r"^# ([a-z0-9_]+ = .*)$", re.MULTILINE)

# Optional lines that stand instead of others, or need a table around them that is optional too.
NOT_ALONE = {
    "time_zone", "averaging_s", "sea_constants", "sea_mean_m", "discharge_series", "end_velocity_series", "volume_m3",
    "table", "table_column", "profile", "profile_from_m", "profile_to_m",
}  # fmt: skip


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


def test_lines_that_show_a_default_change_nothing(read):
    text = plan_template()
    for line, bare in blocks():
        key = bare.split()[0]
        if key in ("temperature_c", "salinity_g_kg", "grain_density_kg_m3", "shields", "roughness_d50", "law", "tide"):
            assert read(text.replace(line, bare, 1)) == read(text)


@pytest.mark.parametrize(
    "table", ["correction", "protection", "series", "basin.inflow", "basin.side_opening", "calibration"]
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
