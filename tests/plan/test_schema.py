import tomllib
from datetime import datetime

import jsonschema
import pytest

from tidescour.plan.resolved import resolved_plan
from tidescour.plan.schema import plan_schema
from tidescour.plan.template import plan_template


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


@pytest.mark.parametrize("key", ["stage", "correction"])
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
