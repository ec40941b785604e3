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
    ],
)
def test_a_wrong_plan_fails(validator, plan_text, edit, old, new):
    assert not validator.is_valid(as_json(tomllib.loads(edit(plan_text, (old, new)))))


def test_every_key_says_what_it_means(choices):
    for name, table in plan_schema(choices)["$defs"].items():
        for key, schema in table["properties"].items():
            assert schema.get("description"), f"{name}.{key}"
