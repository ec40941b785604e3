"""JSON Schema of the plan file, for editors."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any, Final

from tidescour.plan.choices import Choices
from tidescour.plan.kinds import NAME_LENGTH, NAME_PATTERN
from tidescour.plan.models import Plan
from tidescour.plan.models_bed import LAWS_WITH_TIME_SCALE, MODEL_CURVE, SATURATING
from tidescour.plan.openings import KEYS_OF_OTHERS
from tidescour.table import Parameter

# As RFC 3339 has it; "format" alone binds no reader of a schema.
_DATE_TIME = r"^[0-9]{4}-[0-9]{2}-[0-9]{2}[Tt ][0-9]{2}:[0-9]{2}(:[0-9]{2}(\.[0-9]+)?)?([Zz]|[+-][0-9]{2}:[0-9]{2})$"

DIALECT = "https://json-schema.org/draft/2020-12/schema"

_FLOWS = ("relation", "discharge_series", "end_velocity_series")


def _any_of(*keys: str) -> dict[str, Any]:
    return {"anyOf": [{"required": [key]} for key in keys]}


_ONE_STORAGE: Final = {
    "if": {"required": ["table"]},
    "then": {"not": _any_of("level_m", "area_m2", "volume_m3")},
    "else": {
        "required": ["level_m"],
        "oneOf": [{"required": ["area_m2"]}, {"required": ["volume_m3"]}],
        "not": {"required": ["table_column"]},
    },
}
_ONE_SHAPE: Final = {
    "if": {"required": ["profile"]},
    "then": {"not": _any_of("width_m", "width_end_m", "side_slope")},
    "else": {"required": ["crest_level_m", "width_m"]},
}
_ONE_ALPHA: Final = {
    "not": {"required": ["alpha"], **_any_of("alpha_lengths_m", "alpha_values")},
    "dependentRequired": {"alpha_lengths_m": ["alpha_values"], "alpha_values": ["alpha_lengths_m"]},
}
_ONE_DEPTH: Final = {"oneOf": [{"required": ["depth_m"]}, {"required": ["bed_level_m"]}]}
_WITH_EVIDENCE: Final = {"critical_velocity_evidence": ["critical_velocity_m_s"]}
_FEWEST: Final = {"correction": 1, "stage": 1, "discharge": 1, "sounding": 1, "load_case": 1, "filter": 2}
"""How many tables must stand in a list that is written at all."""


def plan_schema(choices: Choices) -> dict[str, object]:
    """Return the JSON Schema (draft 2020-12) of a plan as a user writes it.

    Parameters
    ----------
    choices : Choices
        Names that a plan may use.

    Returns
    -------
    dict
        Ready for JSON. Date-times are strings, as tools that check TOML by a schema hand them on. What needs more
        than one key to judge is not in it, but for the numbers that a relation or a growth law needs, and for keys of
        one table that stand together or instead of each other.
    """
    schema = Plan.model_json_schema(by_alias=True)
    for key in ("folder", "file", "sounding_faults"):
        del schema["properties"][key]
    schema["required"] = ["site"]
    schema["not"] = {"required": ["programme", "stage"]}
    tables = schema["$defs"]
    tables["RecordSource"]["properties"]["layout"]["enum"] = list(choices.layouts)
    _put_bed(tables, choices)
    names = {"enum": list(choices.constituents)}
    tables["Tide"]["properties"]["constituents"]["anyOf"][1]["items"] = names
    tables["Tide"]["properties"]["infer"]["propertyNames"] = names
    tables["Tide"]["properties"]["infer"]["additionalProperties"]["prefixItems"][0] = names
    schema["properties"]["series"]["propertyNames"] = {"pattern": NAME_PATTERN, "maxLength": NAME_LENGTH}
    for key, fewest in _FEWEST.items():
        schema["properties"][key]["minItems"] = fewest
    for key in ("inflow", "side_opening"):
        tables["Basin"]["properties"][key]["minItems"] = 1
    tables["Basin"] |= _ONE_STORAGE
    tables["Sounding"] |= _ONE_DEPTH
    tables["Inflow"]["oneOf"] = [{"required": [key]} for key in ("discharge_m3_s", "series")]
    _put_relations(tables["Opening"], choices)
    tables["SideOpening"] = _other_opening(tables["Opening"], "basin", "One permanent opening beside the gap.")
    tables["CalibrationOpening"] = _other_opening(tables["Opening"], "calibration", "One opening of the gap of then.")
    tables["Basin"]["properties"]["side_opening"]["items"] = {"$ref": "#/$defs/SideOpening"}
    tables["Calibration"]["properties"]["opening"]["items"] = {"$ref": "#/$defs/CalibrationOpening"}
    return {"$schema": DIALECT, "title": "Plan of tidescour", **_as_toml_has_it(schema)}


def _put_bed(tables: dict[str, Any], choices: Choices) -> None:
    """Put the choices of the bed, its protection and the growth law, and the keys that stand together there."""
    tables["Bed"]["properties"]["shields"]["enum"] = list(choices.shields)
    tables["Bed"]["properties"]["velocity_profile"]["enum"] = list(choices.profiles)
    tables["Bed"]["properties"]["layer"]["minItems"] = 1
    tables["BedLayer"] |= _any_of("d50_mm", "critical_velocity_m_s")
    for name in ("Bed", "BedLayer"):
        tables[name]["dependentRequired"] = _WITH_EVIDENCE
    for name in ("Protection", "PlaceOverride"):
        spreading = tables[name]["properties"]["spreading"]
        spreading["anyOf"] = [{"enum": list(choices.spreadings)}, {"type": "null"}]
        tables[name] |= _ONE_ALPHA
    scour = tables["Scour"]
    del scour["properties"]["curve_points"]
    scour["properties"]["law"]["enum"] = list(choices.laws)
    scour["allOf"] = [
        _only_with_laws(LAWS_WITH_TIME_SCALE, "time_constant", "time_exponent"),
        _only_with_laws((SATURATING,), "equilibrium"),
        _only_with_laws((MODEL_CURVE,), "curve_file", "curve_source")
        | {"then": {"required": ["curve_file", "curve_source"]}},
    ]


def _only_with_laws(laws: tuple[str, ...], *keys: str) -> dict[str, Any]:
    return {
        "if": {"properties": {"law": {"enum": list(laws)}}, "required": ["law"]},
        "else": {"not": _any_of(*keys)},
    }


def _put_relations(opening: dict[str, Any], choices: Choices) -> None:
    """Put the numbers of the relations beside the other keys, each needed and bounded where its relation stands."""
    opening["description"] = (
        "One opening of one stage: with a relation and its numbers, or with a given series. A run needs one of these; "
        "to check records and to fit tides it may be left open."
    )
    opening["required"] = ["name"]
    opening["oneOf"] = [{"required": [key]} for key in _FLOWS]
    properties = opening["properties"]
    for key in ("parameters", "profile_points"):
        del properties[key]
    properties["relation"] = {
        "description": properties["relation"]["description"],
        "enum": list(choices.relations),
    }
    for number in (number for wanted in choices.relations.values() for number in wanted):
        properties.setdefault(number.name, {"type": "number", "description": number.meaning})
    opening["allOf"] = [_ONE_SHAPE, *(_relation_rule(name, wanted) for name, wanted in choices.relations.items())]
    opening["dependentRequired"] = {
        "crest_level_end_m": ["crest_level_m"],
        "profile_from_m": ["profile"],
        "profile_to_m": ["profile"],
    }


def _other_opening(opening: dict[str, Any], kind: str, description: str) -> dict[str, Any]:
    """Return the schema of an opening that is none of a stage: some keys less."""
    kept = {key: value for key, value in opening["properties"].items() if key not in KEYS_OF_OTHERS[kind]}
    flows = [{"required": [key]} for key in _FLOWS if key not in KEYS_OF_OTHERS[kind]]
    return opening | {"description": description, "properties": kept, "oneOf": flows}


def _relation_rule(name: str, wanted: Iterable[Parameter]) -> dict[str, Any]:
    return {
        "if": {"properties": {"relation": {"const": name}}, "required": ["relation"]},
        "then": {
            "required": [number.name for number in wanted if number.default is None],
            "properties": {number.name: {"exclusiveMinimum": number.low, "maximum": number.high} for number in wanted},
            "dependentRequired": {number.name: [number.together] for number in wanted if number.together},
        },
    }


def _as_toml_has_it(schema: Any) -> Any:
    """Return a schema without null, which TOML does not know, and without titles that only repeat the keys."""
    if isinstance(schema, list):
        return [_as_toml_has_it(item) for item in schema if item != {"type": "null"}]
    if not isinstance(schema, dict):
        return schema
    kept = {key: _as_toml_has_it(value) for key, value in schema.items() if not _is_noise(key, value)}
    if kept.get("format") == "date-time":
        kept["pattern"] = _DATE_TIME
    alternatives = kept.pop("anyOf", [])
    return kept | (alternatives[0] if len(alternatives) == 1 else {"anyOf": alternatives} if alternatives else {})


def _is_noise(key: str, value: Any) -> bool:
    return (key == "title" and isinstance(value, str)) or (key == "default" and value is None)
