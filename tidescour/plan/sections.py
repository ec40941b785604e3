"""Each table of a plan against its own limits."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any
from zoneinfo import available_timezones

from pydantic import ValidationError
from pydantic_core import ErrorDetails

from tidescour.plan.choices import Choices
from tidescour.plan.draft import Draft
from tidescour.plan.models import (
    NAME_NEEDS,
    NAME_PATTERN,
    OFFSET_PATTERN,
    SENTENCE_PATTERN,
    SIDES,
    TIME_FORMAT_PATTERN,
    Basin,
    Bed,
    Correction,
    Opening,
    PlaceOverride,
    PlanModel,
    Programme,
    RecordSource,
    Scour,
    Series,
    Site,
    StageSpan,
    Tide,
    Water,
)
from tidescour.plan.problems import KeyPath, Problem, Purpose, existing, found, suggestion
from tidescour.table import Parameter

_ANY_NAME = "*"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Shape:
    """What may stand in a table: the keys of `model`, and tables below it; `many` for a list of tables."""

    model: type[PlanModel] | None = None
    below: Mapping[str, _Shape] = field(default_factory=dict)
    required: tuple[str, ...] = ()
    many: bool = False

    def inside(self, key: str) -> _Shape | None:
        return self.below.get(_ANY_NAME) or self.below.get(key)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Table:
    """A table as written, without those below it; `allowed` are all of its keys."""

    path: KeyPath
    keys: dict[str, Any]
    model: type[PlanModel]
    allowed: tuple[str, ...]


_PLACES = _Shape(below={_ANY_NAME: _Shape(model=PlaceOverride)})
_STAGE = _Shape(model=StageSpan, below={"opening": _Shape(model=Opening, many=True)}, required=("opening",), many=True)
_PLAN = _Shape(
    below={
        "site": _Shape(model=Site),
        "water": _Shape(model=Water),
        "records": _Shape(below={side: _Shape(model=RecordSource) for side in SIDES}),
        "correction": _Shape(model=Correction, many=True),
        "series": _Shape(below={_ANY_NAME: _Shape(model=Series)}),
        "tide": _Shape(model=Tide),
        "basin": _Shape(model=Basin),
        "bed": _Shape(model=Bed),
        "protection": _Shape(below={side: _Shape(model=PlaceOverride, below={"opening": _PLACES}) for side in SIDES}),
        "scour": _Shape(model=Scour),
        "programme": _Shape(model=Programme),
        "stage": _STAGE,
    },
    required=("site",),
)

# What pydantic calls the fault, and what the value must be; its own numbers are filled in.
_NEEDS = {
    "float_type": "a number",
    "finite_number": "a finite number",
    "greater_than": "a number over {gt:g}",
    "greater_than_equal": "a number from {ge:.10g} up",
    "less_than_equal": "a number up to {le:.10g}",
    "string_type": "text in quotes",
    "string_too_long": "one line of printable text, at most {max_length} characters",
    "datetime_type": "a date and time with an offset, such as 2027-04-01T00:00:00Z (no quotes in the plan file)",
    "timezone_aware": "an offset from UTC: write one, such as the Z of 2027-04-01T00:00:00Z",
    "tuple_type": "a list in brackets",
    "too_short": "at least {min_length} in the list",
    "too_long": "a list of {max_length}",
    "dict_type": "a table",
}

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


def draft_of(written: Mapping[str, Any], choices: Choices) -> tuple[Draft, list[Problem]]:
    """Return the tables of a plan with those of their keys that are within their own limits, and what is wrong.

    Parameters
    ----------
    written : mapping
        The whole plan as parsed from TOML.
    choices : Choices
        Relations and the numbers that stand beside them.

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
    for item in _tables((), written, _PLAN):
        if isinstance(item, Problem):
            problems.append(item)
            continue
        keys, wrong = _opening_keys(item, choices) if item.model is Opening else _plain_keys(item)
        problems += [*wrong, *_choice_problems(item, choices)]
        values = _with_tuples(keys)
        try:
            parts[item.path] = item.model.model_validate(values, strict=True)
        except ValidationError as error:
            problems += _value_problems(error, item)
            at_fault = {str(fault["loc"][0]) for fault in error.errors()}
            faulty[item.path] = frozenset(_field_names(item.model).get(key, key) for key in at_fault)
            sound = {key: value for key, value in values.items() if key not in at_fault}
            parts[item.path] = item.model.model_construct(None, **sound)
    return Draft(written=written, parts=parts, faulty=faulty, choices=choices), problems


def key_names(model: type[PlanModel]) -> tuple[str, ...]:
    """Return the keys of a table as they stand in the file."""
    return tuple(key for key in _field_names(model) if key != "parameters")


def _field_names(model: type[PlanModel]) -> dict[str, str]:
    """Return the name of each key in the model, by its name in the file."""
    return {field.alias or name: name for name, field in model.model_fields.items()}


def _tables(path: KeyPath, value: Any, shape: _Shape) -> Iterator[_Table | Problem]:
    """Return every table of the plan in the order of the file, or what is wrong with its form."""
    name = ".".join(key for key in path if isinstance(key, str))
    if not shape.many:
        if isinstance(value, dict):
            yield from _one_table(path, value, shape)
        else:
            yield Problem(path=path, message=f"found {found(value)}; needs a table: write [{name}]")
    elif not isinstance(value, list) or not all(isinstance(item, dict) for item in value):
        yield Problem(path=path, message=f"found {found(value)}; needs a list of tables: write [[{name}]] over each")
    elif not value:
        yield Problem(path=path, message=f"found an empty list; write [[{name}]] over each table")
    else:
        for position, item in enumerate(value):
            yield from _one_table((*path, position), item, shape)


def _one_table(path: KeyPath, value: dict[str, Any], shape: _Shape) -> Iterator[_Table | Problem]:
    allowed = (*(key_names(shape.model) if shape.model else ()), *shape.below)
    own = {key: item for key, item in value.items() if shape.inside(key) is None}
    if shape.model:
        yield _Table(path=path, keys=own, model=shape.model, allowed=allowed)
    else:
        yield from (_unknown((*path, key), allowed) for key in own)
    for key, item in value.items():
        if inner := shape.inside(key):
            yield from _tables((*path, key), item, inner)
    for key in shape.required:
        if key not in value:
            brackets = "[[{}]]" if shape.below[key].many else "[{}]"
            name = ".".join(part for part in (*path, key) if isinstance(part, str))
            message = f"missing; write {brackets.format(name)} with its keys"
            yield Problem(path=(*path, key), message=message, only_for=_purpose((*path, key)))


def _unknown(path: KeyPath, allowed: Collection[str]) -> Problem:
    return Problem(path=path, message=f"unknown key; {suggestion(path[-1], allowed)}")


def _choice_problems(table: _Table, choices: Choices) -> Iterator[Problem]:
    """Return a problem for each name that none of the tables of choices has."""
    offered = {
        "layout": choices.layouts,
        "shields": choices.shields,
        "law": choices.laws,
        "relation": tuple(choices.relations),
    }
    for key, names in offered.items():
        value = table.keys.get(key)
        if key in table.allowed and isinstance(value, str) and value.strip() and value not in names:
            remedy = _NOT_YET.get((key, value)) or suggestion(value, names)
            yield Problem(path=(*table.path, key), message=f"found {found(value)}; {remedy}")


def _plain_keys(table: _Table) -> tuple[dict[str, Any], list[Problem]]:
    """Return the keys that the table knows, and a problem for each that it does not."""
    known = {key: value for key, value in table.keys.items() if key in table.allowed}
    return known, [_unknown((*table.path, key), table.allowed) for key in table.keys if key not in table.allowed]


def _opening_keys(table: _Table, choices: Choices) -> tuple[dict[str, Any], list[Problem]]:
    """Return the keys of an opening with the numbers of its relation gathered under ``parameters``.

    Where the relation is not known, numbers of any relation are let pass: the relation itself is the problem then.
    """
    relation = table.keys.get("relation")
    every = {number.name: number for numbers in choices.relations.values() for number in numbers}
    wanted = choices.relations.get(relation) if isinstance(relation, str) else None
    allowed = (*table.allowed, *(every if wanted is None else (number.name for number in wanted)))
    known, problems = _plain_keys(_Table(path=table.path, keys=table.keys, model=table.model, allowed=allowed))
    own = {key: value for key, value in known.items() if key in table.allowed}
    numbers: dict[str, float] = {}
    for number in wanted or ():
        path = (*table.path, number.name)
        if number.name not in known:
            message = f'missing; "{relation}" needs {_range_text(number)}'
            problems.append(Problem(path=path, message=message, only_for="run"))
        elif _fits(known[number.name], number):
            numbers[number.name] = float(known[number.name])
        else:
            message = f"found {found(known[number.name])}; needs {_range_text(number)}"
            problems.append(Problem(path=path, message=message))
    return own | {"parameters": numbers}, problems


def _fits(value: object, number: Parameter) -> bool:
    is_number = isinstance(value, int | float) and not isinstance(value, bool)
    return is_number and number.low < value <= number.high  # type: ignore[operator]


def _range_text(number: Parameter) -> str:
    unit = "" if number.unit == "-" else f" {number.unit}"
    return f"a number over {number.low:g} up to {number.high:g}{unit} ({number.meaning})"


def _with_tuples(value: Any) -> Any:
    """Return the value with every list as a tuple: TOML knows lists only, the strict models know tuples only."""
    if isinstance(value, list):
        return tuple(_with_tuples(item) for item in value)
    if isinstance(value, dict):
        return {key: _with_tuples(item) for key, item in value.items()}
    return value


def _value_problems(error: ValidationError, table: _Table) -> Iterator[Problem]:
    """Return one problem a value, also where it was tried against several kinds."""
    seen: set[KeyPath] = set()
    for fault in error.errors(include_url=False):
        below = existing(fault["loc"], table.keys)
        missing = fault["type"] == "missing" and len(fault["loc"]) == 1
        path = (*table.path, *(fault["loc"] if missing else below))
        if path in seen:
            continue
        seen.add(path)
        if missing:
            message = f"missing: {_meaning(table.model, str(path[-1]))}"
        elif below and len(below) < len(fault["loc"]) and below[-1] in _NEEDS_EITHER:
            message = f"found {found(table.keys[str(below[0])])}; needs {_NEEDS_EITHER[str(below[-1])]}"
        else:
            message = _fault_text(fault)
        yield Problem(path=path, message=message, only_for=_purpose(path) if missing else None)


def _purpose(missing: KeyPath) -> Purpose | None:
    """Return the purpose that misses a key: stages that are not complete yet harm no reading of records."""
    return "run" if missing[0] == "stage" else None


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


def _quoted(text: str) -> list[str]:
    return re.findall(r"'([^']*)'", text)


def _meaning(model: type[PlanModel], key: str) -> str:
    return model.model_fields[_field_names(model)[key]].description or ""
