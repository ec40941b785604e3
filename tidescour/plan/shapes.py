"""Which tables a plan may have and where, and the keys of each as they were written."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

from tidescour.plan.kinds import SIDES, PlanModel
from tidescour.plan.models import (
    Basin,
    Correction,
    Inflow,
    Opening,
    Programme,
    RecordSource,
    Series,
    Site,
    StageSpan,
    Tide,
    Water,
)
from tidescour.plan.models_bed import Bed, BedLayer, Grading, PlaceOverride, Scour, Stone
from tidescour.plan.models_calibration import CalibrationSpan, Discharge
from tidescour.plan.models_survey import LoadCase, Sounding, Soundings
from tidescour.plan.problems import KeyPath, Problem, found, purposes_of, suggestion

_ANY_NAME = "*"
_NO_KEYS = ("parameters", "profile_points", "curve_points")
"""Fields of the models that are filled from other keys."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Table:
    """A table as written, without those below it; `allowed` are all of its keys."""

    path: KeyPath
    keys: Mapping[str, Any]
    model: type[PlanModel]
    allowed: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Shape:
    """What may stand in a table: the keys of `model`, and tables below it; `many` for a list of tables."""

    model: type[PlanModel] | None = None
    below: Mapping[str, _Shape] = field(default_factory=dict)
    required: tuple[str, ...] = ()
    many: bool = False

    def inside(self, key: str) -> _Shape | None:
        return self.below.get(_ANY_NAME) or self.below.get(key)


_OPENINGS = _Shape(model=Opening, many=True)
_PLACES = _Shape(below={_ANY_NAME: _Shape(model=PlaceOverride)})
_PLAN = _Shape(
    below={
        "site": _Shape(model=Site),
        "water": _Shape(model=Water),
        "records": _Shape(below={side: _Shape(model=RecordSource) for side in SIDES}),
        "correction": _Shape(model=Correction, many=True),
        "series": _Shape(below={_ANY_NAME: _Shape(model=Series)}),
        "tide": _Shape(model=Tide),
        "basin": _Shape(model=Basin, below={"inflow": _Shape(model=Inflow, many=True), "side_opening": _OPENINGS}),
        "bed": _Shape(model=Bed, below={"layer": _Shape(model=BedLayer, many=True)}),
        "protection": _Shape(below={side: _Shape(model=PlaceOverride, below={"opening": _PLACES}) for side in SIDES}),
        "scour": _Shape(model=Scour),
        "programme": _Shape(model=Programme),
        "stage": _Shape(model=StageSpan, below={"opening": _OPENINGS}, required=("opening",), many=True),
        "calibration": _Shape(model=CalibrationSpan, below={"opening": _OPENINGS}, required=("opening",)),
        "discharge": _Shape(model=Discharge, many=True),
        "soundings": _Shape(model=Soundings),
        "sounding": _Shape(model=Sounding, many=True),
        "load_case": _Shape(model=LoadCase, many=True),
        "stone": _Shape(model=Stone),
        "filter": _Shape(model=Grading, many=True),
    },
    required=("site",),
)


def tables_of(written: Mapping[str, Any]) -> Iterator[Table | Problem]:
    """Return every table of a plan in the order of the file, or what is wrong with its form."""
    return _tables((), written, _PLAN)


def key_names(model: type[PlanModel]) -> tuple[str, ...]:
    """Return the keys of a table as they stand in the file."""
    return tuple(key for key in field_names(model) if key not in _NO_KEYS)


def field_names(model: type[PlanModel]) -> dict[str, str]:
    """Return the name of each key in the model, by its name in the file."""
    return {field.alias or name: name for name, field in model.model_fields.items()}


def known_keys(table: Table) -> tuple[dict[str, Any], list[Problem]]:
    """Return the keys that the table knows, and a problem for each that it does not."""
    known = {key: value for key, value in table.keys.items() if key in table.allowed}
    return known, [_unknown((*table.path, key), table.allowed) for key in table.keys if key not in table.allowed]


def _tables(path: KeyPath, value: Any, shape: _Shape) -> Iterator[Table | Problem]:
    name = ".".join(key for key in path if isinstance(key, str))
    if not shape.many:
        if isinstance(value, Mapping):
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


def _one_table(path: KeyPath, value: Mapping[str, Any], shape: _Shape) -> Iterator[Table | Problem]:
    allowed = tuple(dict.fromkeys((*(key_names(shape.model) if shape.model else ()), *shape.below)))
    own = {key: item for key, item in value.items() if shape.inside(key) is None}
    if shape.model:
        yield Table(path=path, keys=own, model=shape.model, allowed=allowed)
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
            yield Problem(path=(*path, key), message=message, only_for=purposes_of((*path, key)))


def _unknown(path: KeyPath, allowed: Collection[str]) -> Problem:
    return Problem(path=path, message=f"unknown key; {suggestion(path[-1], allowed)}")
