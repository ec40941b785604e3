"""Each table of a plan against its own limits."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import replace
from types import MappingProxyType
from typing import Any, Final, get_args, get_type_hints
from zoneinfo import available_timezones

from pydantic import ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from tidescour.plan.choices import Choices
from tidescour.plan.draft import Draft
from tidescour.plan.kinds import (
    NAME_NEEDS,
    NAME_PATTERN,
    OFFSET_PATTERN,
    SENTENCE_PATTERN,
    TIME_FORMAT_PATTERN,
    PlanModel,
)
from tidescour.plan.models import Opening
from tidescour.plan.openings import opening_keys
from tidescour.plan.problems import KeyPath, Problem, existing, found, purposes_of, suggestion
from tidescour.plan.shapes import Table, field_names, known_keys, tables_of

_NOTHING: Final[Mapping[KeyPath, Mapping[str, Any]]] = MappingProxyType({})

# What pydantic calls the fault, and what the value must be; its own numbers are filled in.
_NEEDS = {
    "float_type": "a number",
    "finite_number": "a finite number",
    "string_type": "text in quotes",
    "string_too_long": "one line of printable text, at most {max_length} characters",
    "datetime_type": "a date and time with an offset, such as 2027-04-01T00:00:00Z (no quotes in the plan file)",
    "timezone_aware": "an offset from UTC: write one, such as the Z of 2027-04-01T00:00:00Z",
    "tuple_type": "a list in brackets",
    "too_short": "at least {min_length} in the list",
    "too_long": "a list of {max_length}",
    "dict_type": "a table",
}

# Words for the ends of what a number may be, and what pydantic calls a number beyond one.
_ENDS = {"gt": "over {:.10g}", "ge": "from {:.10g}", "lt": "under {:.10g}", "le": "up to {:.10g}"}
_BEYOND = ("greater_than", "greater_than_equal", "less_than", "less_than_equal")

# What a text must be, by the pattern that it does not follow.
_NEEDS_PATTERN = {
    NAME_PATTERN: NAME_NEEDS,
    SENTENCE_PATTERN: "one line of printable text",
    OFFSET_PATTERN: "hours and minutes such as +01:00 or -05:30, up to 14:00",
    TIME_FORMAT_PATTERN: '"iso", "excel" or a strptime format such as "%d-%m-%Y %H:%M"',
}

# Keys that allow more than one kind of value.
_NEEDS_EITHER = {
    "time": "the name of a column, its number from 0, or a list of two of these (date and time)",
    "level": "the name of a column, or its number from 0",
    "value": "the name of a column, or its number from 0",
    "constituents": '"auto" or a list of names, such as ["M2", "S2"]',
}

# Names that belong to the plan file, but that no table of choices has yet.
_NOT_YET = {("layout", "auto"): 'no layout recognises files by itself yet: write "columns"'}


def draft_of(
    written: Mapping[str, Any], choices: Choices, from_files: Mapping[KeyPath, Mapping[str, Any]] = _NOTHING
) -> tuple[Draft, list[Problem]]:
    """Return the tables of a plan with those of their keys that are within their own limits, and what is wrong.

    Parameters
    ----------
    written : mapping
        The whole plan as parsed from TOML.
    choices : Choices
        Relations and the numbers that stand beside them.
    from_files : mapping of path to mapping
        What else a table holds, by its path: numbers out of the files that it names.

    Returns
    -------
    draft : Draft
        For the rules that need more than one key.
    problems : list of Problem
        Unknown and missing keys, wrong kinds of value, numbers out of range.
    """
    parts: dict[KeyPath, PlanModel] = {}
    faulty: dict[KeyPath, frozenset[str]] = {}
    problems: list[Problem] = []
    for item in tables_of(written):
        if isinstance(item, Problem):
            problems.append(item)
            continue
        keys, wrong = opening_keys(item, choices) if item.model is Opening else known_keys(item)
        problems += [*wrong, *_choice_problems(item, choices)]
        table = replace(item, keys=keys | dict(from_files.get(item.path, {})))
        values = _with_tuples(table.keys)
        try:
            parts[item.path] = item.model.model_validate(values, strict=True)
        except ValidationError as error:
            problems += _value_problems(error, table)
            at_fault = {str(fault["loc"][0]) for fault in error.errors()}
            faulty[item.path] = frozenset(field_names(item.model).get(key, key) for key in at_fault)
            sound = {key: value for key, value in values.items() if key not in at_fault}
            parts[item.path] = item.model.model_construct(None, **sound)
    return Draft(written=written, parts=parts, faulty=faulty, choices=choices), problems


def _choice_problems(table: Table, choices: Choices) -> Iterator[Problem]:
    """Return a problem for each name that none of the tables of choices has."""
    offered = {
        "layout": choices.layouts,
        "shields": choices.shields,
        "velocity_profile": choices.profiles,
        "spreading": choices.spreadings,
        "law": choices.laws,
        "relation": tuple(choices.relations),
    }
    for key, names in offered.items():
        value = table.keys.get(key)
        if key in table.allowed and isinstance(value, str) and value.strip() and value not in names:
            remedy = _NOT_YET.get((key, value)) or suggestion(value, names)
            yield Problem(path=(*table.path, key), message=f"found {found(value)}; {remedy}")


def _with_tuples(value: Any) -> Any:
    """Return the value with every list as a tuple: TOML knows lists only, the strict models know tuples only."""
    if isinstance(value, list):
        return tuple(_with_tuples(item) for item in value)
    if isinstance(value, Mapping):
        return {key: _with_tuples(item) for key, item in value.items()}
    return value


def _value_problems(error: ValidationError, table: Table) -> Iterator[Problem]:
    """Return one problem a value, also where it was tried against several kinds."""
    seen: set[KeyPath] = set()
    for fault in error.errors(include_url=False):
        below = existing(fault["loc"], table.keys)
        missing = fault["type"] == "missing" and len(fault["loc"]) == 1
        path = (*table.path, *(fault["loc"] if missing else below))
        if path in seen or (missing and path[-1] == "crest_level_m" and "profile" in table.keys):
            continue  # a crest that a profile would give, were it sound
        seen.add(path)
        if missing:
            message = f"missing: {_meaning(table.model, str(path[-1]))}"
        elif below and len(below) < len(fault["loc"]) and below[-1] in _NEEDS_EITHER:
            message = f"found {found(table.keys[str(below[0])])}; needs {_NEEDS_EITHER[str(below[-1])]}"
        elif fault["type"] in _BEYOND:
            key = str(fault["loc"][0])
            explained = _dry_area(fault, table) or f": {_meaning(table.model, key)}"
            message = f"found {found(fault['input'])}; needs {_range_text(table.model, key)}{explained}"
        else:
            message = _fault_text(fault)
        yield Problem(path=path, message=message, only_for=purposes_of(path) if missing else ())


def _fault_text(fault: ErrorDetails) -> str:
    context = fault.get("ctx", {})
    if fault["type"] == "missing":
        return "the list is too short"
    if fault["type"] == "literal_error":
        return f"found {found(fault['input'])}; {suggestion(fault['input'], _quoted(context['expected']))}"
    if fault["type"] == "time_zone":
        return f"found {found(fault['input'])}; {suggestion(fault['input'], available_timezones())}"
    if fault["type"] == "string_pattern_mismatch":
        needs = _NEEDS_PATTERN.get(context["pattern"], "text that is not blank")
        return f"found {found(fault['input'])}; needs {needs}"
    words = _NEEDS.get(fault["type"])
    return f"found {found(fault['input'])}; " + (f"needs {words.format(**context)}" if words else fault["msg"])


def _range_text(model: type[PlanModel], key: str) -> str:
    """Return what a number of this key may be."""
    ends = _ends(get_type_hints(model, include_extras=True)[field_names(model)[key]])
    words = [text.format(ends[name]) for name, text in _ENDS.items() if name in ends]
    if tuple(ends) == ("ge",):
        words.append("up")
    return "a number " + (" and " if "lt" in ends else " ").join(words)


def _ends(kind: Any) -> dict[str, float]:
    """Return the bounds of the numbers in a type, by their names in pydantic."""
    ends: dict[str, float] = {}
    for part in get_args(kind):
        bounds = part.metadata if isinstance(part, FieldInfo) else ()
        ends |= {name: value for name in _ENDS for bound in bounds if (value := getattr(bound, name, None)) is not None}
        ends |= _ends(part)
    return ends


def _dry_area(fault: ErrorDetails, table: Table) -> str:
    """Return what to write for an area that is not positive; nothing for other faults."""
    match fault["type"], fault["loc"], table.keys.get("level_m"):
        case "greater_than", ("area_m2", int(position)), list() | tuple() as levels if position < len(levels):
            remedy = "write the smallest area that stays wet, or start the table higher"
            return f": at level {found(levels[position])} m {remedy}"
    return ""


def _quoted(text: str) -> list[str]:
    return re.findall(r"'([^']*)'", text)


def _meaning(model: type[PlanModel], key: str) -> str:
    return model.model_fields[field_names(model)[key]].description or ""
