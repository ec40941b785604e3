import dataclasses
import hashlib
import json
import math
from datetime import datetime

import jsonschema
import pytest

from tidescour.errors import HandoffError
from tidescour.gauge.records import InputFile
from tidescour.handoff.document import handoff_document
from tidescour.handoff.encode import json_bytes
from tidescour.handoff.files import check_files, run_files, tides_files
from tidescour.handoff.provenance import circumstances, provenance_block
from tidescour.handoff.schema import handoff_schema
from tidescour.handoff.units_in_names import BARE_NUMBERS, unit_of
from tidescour.plan.models_bed import Scour
from tidescour.scour.laws import LAWS


@pytest.fixture
def plan_file(tmp_path):
    path = tmp_path / "closure.toml"
    path.write_bytes(b"invented = true\n")
    return path


@pytest.fixture
def block(plan_file):
    return provenance_block(plan_file, [InputFile(path="sea.csv", sha256="a" * 64)], {"site": {"name": "Invented gap"}})


def validator():
    schema = handoff_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def test_the_hand_off_has_the_keys_of_the_contract(results, block):
    keys = [
        "law",
        "conventions",
        "submerged_relative_density",
        "durations",
        "growth",
        "lengths",
        "comparison",
        "length_curve",
        "sensitivity",
        "layers",
        "load_cases",
        "stone",
        "filter",
        "methods",
        "findings",
        "provenance",
    ]
    assert list(handoff_document(results, block)) == keys


def test_the_hand_off_is_valid_by_its_schema(results, block):
    validator().validate(json.loads(json_bytes(handoff_document(results, block))))


def test_a_hand_off_without_flow_in_one_place_is_valid_too(make_results, block):
    document = json.loads(json_bytes(handoff_document(make_results(still_place="shoal"), block)))
    validator().validate(document)
    assert [row["alpha"] for row in document["durations"] if row["opening"] == "shoal"] == [None] * 4


@pytest.mark.parametrize(
    ("path", "wrong"),
    [
        (("durations", 0, "duration_h"), None),
        (("durations", 0, "side"), "left"),
        (("durations", 0, "start"), "2027-04-01 00:00"),
        (("durations", 0, "cycles"), 1.5),
        (("lengths", 0, "length_required_m"), "90"),
        (("findings", 0, "severity"), "bad"),
        (("law", "coefficient_m_s_h"), 0.0),
        (("law", "shape"), "straight"),
        (("law", "equilibrium"), "both"),
        (("comparison", 0, "rule"), "mean"),
        (("comparison", 0, "drives"), True),
        (("length_curve", 0, "final_depth_m"), None),
        (("lengths", 0, "length_reached"), "soon"),
        (("methods", 0, "how_sure"), "certain"),
        (("methods", 0, "symbols", 0), "y"),
        (("conventions", "not_in_it"), None),
        (("submerged_relative_density",), -1.0),
        (("provenance", "plan", "sha256"), "abc"),
        (("conventions", "tide_rule"), "mean"),
    ],
)
def test_the_schema_refuses_a_wrong_cell(results, block, path, wrong):
    document = json.loads(json_bytes(handoff_document(results, block)))
    part = document
    for key in path[:-1]:
        part = part[key]
    part[path[-1]] = wrong
    with pytest.raises(jsonschema.ValidationError):
        validator().validate(document)


TABLES = [
    "load_cases",
    "durations",
    "growth",
    "lengths",
    "comparison",
    "length_curve",
    "sensitivity",
    "stone",
    "filter",
    "findings",
]


@pytest.mark.parametrize("table", [*TABLES, "layers"])
def test_the_schema_asks_for_every_column(layered, block, table):
    document = json.loads(json_bytes(handoff_document(layered, block)))
    names = list(document[table][0])
    assert list(handoff_schema()["properties"][table]["items"]["properties"]) == names
    for name in names:
        cell = document[table][0].pop(name)
        with pytest.raises(jsonschema.ValidationError, match="required property"):
            validator().validate(document)
        document[table][0][name] = cell


def numbers(part, name):
    """Give the name under which each number, or empty number, of a document stands; lists go by their own name."""
    if isinstance(part, dict):
        for key, value in part.items():
            yield from numbers(value, key)
    elif isinstance(part, list):
        for value in part:
            yield from numbers(value, name)
    elif isinstance(part, float | int) and not isinstance(part, bool):
        yield name


def test_every_number_of_the_whole_hand_off_has_a_unit_by_its_name(layered, block):
    document = json.loads(json_bytes(handoff_document(layered, block)))
    # The plan as read stands with its own keys, whose units the schema of the plan gives.
    del document["provenance"]["resolved_plan"]
    found = set(numbers(document, ""))
    assert found >= {"gravity_m_s2", "coefficient_m_s_h", "cycles", "depth_m", "top_level_m", "stone_pilarczyk_m"}
    assert {name for name in found if unit_of(name) is None} == set()


def test_every_number_that_may_be_empty_has_a_unit_by_its_name_too():
    schema = handoff_schema()
    names = {
        name
        for table in [*TABLES, "layers"]
        for name, cell in schema["properties"][table]["items"]["properties"].items()
        if "number" in cell.get("type", ()) or "integer" in cell.get("type", ())
    }
    names |= {name for name, cell in schema["properties"]["law"]["properties"].items() if cell.get("type") == "number"}
    assert {name for name in names if unit_of(name) is None} == set()
    # Nothing stands in the list that no number bears.
    assert set(BARE_NUMBERS) <= names | {"submerged_relative_density", "time_over_t1", "depth_over_water_depth"}


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("depth_m", "metres"),
        ("unit_discharge_m2_s", "square metres per second"),
        ("velocity_m_s", "metres per second"),
        ("failure_slope_cot", "cotangent of a slope: 1 in this"),
        ("alpha", "none: a bare number"),
        ("strength", None),
    ],
)
def test_the_unit_of_a_number_follows_from_its_name(name, words):
    assert unit_of(name) == words


def test_numbers_keep_every_digit(results, block):
    document = json.loads(json_bytes(handoff_document(results, block)))
    row = results.places[0].rows[0]
    assert document["durations"][0]["stage_depth_m"] == row.chain[0].stage_depth_m
    assert document["durations"][0]["reference_depth_m"] == row.duration.reference_depth_m
    assert document["law"]["coefficient_m_s_h"] == results.law.coefficient
    assert document["law"]["integral_exponent"] == pytest.approx(4.25, rel=1e-15)


def test_the_chain_can_be_computed_again_from_the_hand_off_alone(results, block):
    document = json.loads(json_bytes(handoff_document(results, block)))
    law = document["law"]
    depth = {}
    for row in document["durations"]:
        place = (row["opening"], row["side"])
        excess = row["alpha"] * row["reference_velocity_m_s"] - row["critical_velocity_m_s"]
        rate = law["coefficient_m_s_h"] * excess ** law["velocity_exponent"]
        rate *= row["reference_depth_m"] ** law["depth_exponent"]
        equivalent_h = (depth.get(place, 0.0) / rate) ** (1.0 / law["time_exponent"])
        depth[place] = rate * (equivalent_h + row["effective_duration_h"]) ** law["time_exponent"]
        assert row["equivalent_start_h"] == pytest.approx(equivalent_h, rel=1e-9, abs=1e-12)
        assert row["end_depth_m"] == pytest.approx(depth[place], rel=1e-9)
    for row in document["lengths"]:
        assert row["final_depth_m"] == pytest.approx(depth[row["opening"], row["side"]], rel=1e-9)


@pytest.mark.parametrize(
    ("name", "scour", "shape", "equilibrium"),
    [
        ("explicit", Scour(), "power", None),
        ("time-scale", Scour(time_exponent=0.38), "power", None),
        ("saturating", Scour(equilibrium="turbulence"), "saturating", "turbulence"),
        ("model-curve", Scour(curve_points=((0.1, 0.4), (1.0, 1.0), (10.0, 2.5))), "model-curve", None),
    ],
)
def test_the_law_stands_in_the_hand_off_with_its_shape_and_curve(results, block, name, scour, shape, equilibrium):
    run = dataclasses.replace(results, law=LAWS[name].function(1.6, scour))
    document = json.loads(json_bytes(handoff_document(run, block)))
    validator().validate(document)
    law = document["law"]
    assert (law["shape"], law["equilibrium"], law["how_sure"]) == (shape, equilibrium, "from memory")
    points = [(each["time_over_t1"], each["depth_over_water_depth"]) for each in law["curve"]]
    assert points == [pytest.approx(row, rel=1e-14) for row in scour.curve_points]


def test_the_conventions_say_which_side_each_tide_digs(results, block):
    words = handoff_document(results, block)["conventions"]
    assert "flood (sea to basin) digs the hole on the basin side" in words["sides"]
    assert words["datum"] == "invented datum 2026"
    assert len(words["cautions"]) >= 10


def test_the_hand_off_knows_no_clock_host_or_folder(results, block, plan_file, monkeypatch):
    first = run_files(results, block)["handoff.json"]
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1")
    again = provenance_block(
        plan_file, [InputFile(path="sea.csv", sha256="a" * 64)], {"site": {"name": "Invented gap"}}
    )
    assert run_files(results, again)["handoff.json"] == first
    assert str(plan_file.parent).encode() not in first


def test_not_a_number_never_reaches_json():
    with pytest.raises(ValueError, match="Out of range float"):
        json_bytes({"depth_m": math.nan})


def test_provenance_hashes_the_plan_and_names_versions(block):
    assert block["plan"] == {"file": "closure.toml", "sha256": hashlib.sha256(b"invented = true\n").hexdigest()}
    assert block["inputs"] == [{"file": "sea.csv", "sha256": "a" * 64}]
    assert {"tidescour", "python", "numpy", "scipy", "pandas", "utide", "matplotlib", "numba"} == set(block["versions"])


def test_the_start_is_fixed_by_source_date_epoch(monkeypatch):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", str(20908 * 86400 + 600))
    made = circumstances(["tidescour", "run", "plan.toml"])
    assert made["started"] == "2027-03-31T00:10:00Z"
    assert made["command_line"] == ["tidescour", "run", "plan.toml"]


def test_the_start_is_now_otherwise(monkeypatch):
    monkeypatch.delenv("SOURCE_DATE_EPOCH", raising=False)
    started = datetime.fromisoformat(circumstances([])["started"])
    assert abs((datetime.now(started.tzinfo) - started).total_seconds()) < 60.0


@pytest.mark.parametrize("wrong", ["", "yesterday", "-5", "1.5", "²"])
def test_a_source_date_epoch_that_is_no_number_is_refused(monkeypatch, wrong):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", wrong)
    with pytest.raises(HandoffError, match="write whole seconds since 1970"):
        circumstances([])


def test_each_command_has_its_files(results, block):
    assert set(check_files(results.records, results.findings)) == {"records.csv", "findings.csv"}
    tides = tides_files(results.records, results.fits, results.findings)
    assert set(tides) == {"records.csv", "findings.csv", "tides.csv"}
    names = {"durations", "cycles", "velocities", "growth", "protection", "sweep", "tides", "records", "findings"}
    names |= {
        "load_cases",
        "comparison",
        "length_curve",
        "sensitivity",
        "layers",
        "stone",
        "filter",
        "methods",
    }
    assert set(run_files(results, block)) == {"handoff.json", *(f"{name}.csv" for name in names)}
