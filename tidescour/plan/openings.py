"""Keys of openings, of their three kinds (of a stage, beside the gap, of a calibration) and of their relations."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import Any

from tidescour.plan.choices import Choices
from tidescour.plan.problems import KeyPath, Problem, found, purposes_of
from tidescour.plan.shapes import Table, known_keys
from tidescour.table import Parameter

_NO_SCOUR = "no scour is computed at such an opening"
_STANDS_STILL = "a side opening does not change"
_GIVES_NO_DISCHARGE = "a velocity gives no discharge to route"
KEYS_OF_OTHERS: Mapping[str, Mapping[str, str]] = {
    "stage": {},
    "basin": {
        "alpha_sea": _NO_SCOUR,
        "alpha_basin": _NO_SCOUR,
        "crest_level_end_m": _STANDS_STILL,
        "width_end_m": _STANDS_STILL,
        "end_velocity_series": _GIVES_NO_DISCHARGE,
    },
    "calibration": {
        "alpha_sea": _NO_SCOUR,
        "alpha_basin": _NO_SCOUR,
        "discharge_series": "a calibration computes the discharge by a relation",
        "end_velocity_series": _GIVES_NO_DISCHARGE,
    },
}
"""Keys of an opening that do not belong to one kind, and why; by the table that its path starts with."""

_PLACES_OF_OPENINGS = (("basin", "side_opening"), ("calibration", "opening"))


def written_openings(written: Mapping[str, Any]) -> Iterator[tuple[KeyPath, dict[str, Any]]]:
    """Return every opening of a plan as written, with its path."""
    for at, stage in _tables_in(written, ("stage",)):
        for path, opening in _tables_in(stage, ("opening",)):
            yield (*at, *path), opening
    for around, key in _PLACES_OF_OPENINGS:
        if isinstance(table := written.get(around), dict):
            for path, opening in _tables_in(table, (key,)):
                yield (around, *path), opening


def written_names(written: Mapping[str, Any], *tables: str) -> list[str]:
    """Return the names of all openings of these kinds, by the table that they stand in, also of those not sound."""
    openings = (opening for path, opening in written_openings(written) if path[0] in tables)
    return [name for opening in openings if isinstance(name := opening.get("name"), str)]


def _tables_in(around: Mapping[str, Any], path: tuple[str]) -> Iterator[tuple[KeyPath, dict[str, Any]]]:
    tables = around.get(path[0])
    for position, table in enumerate(tables if isinstance(tables, list) else ()):
        if isinstance(table, dict):
            yield (*path, position), table


def opening_keys(table: Table, choices: Choices) -> tuple[dict[str, Any], list[Problem]]:
    """Return the keys of an opening with the numbers of its relation gathered under ``parameters``, and what is wrong.

    Where the relation is not known, numbers of any relation are let pass: the relation itself is the problem then.
    """
    others = KEYS_OF_OTHERS[str(table.path[0])]
    own = tuple(key for key in table.allowed if key not in others)
    relation = table.keys.get("relation")
    every = {number.name: number for numbers in choices.relations.values() for number in numbers}
    wanted = choices.relations.get(relation) if isinstance(relation, str) else None
    numbers = every if wanted is None else {number.name: number for number in wanted}
    keys = {key: value for key, value in table.keys.items() if key not in others}
    known, problems = known_keys(replace(table, keys=keys, allowed=(*own, *numbers)))
    for key in (key for key in table.keys if key in others):
        problems.append(Problem(path=(*table.path, key), message=f"does not belong here: {others[key]}; leave it out"))
    problems += _number_problems(table.path, str(relation), wanted or (), known)
    parameters = {
        number.name: float(known[number.name])
        for number in wanted or ()
        if number.name in known and _fits(known[number.name], number)
    }
    return {key: value for key, value in known.items() if key in own} | {"parameters": parameters}, problems


def _number_problems(
    path: KeyPath, relation: str, wanted: tuple[Parameter, ...], keys: Mapping[str, Any]
) -> Iterator[Problem]:
    for number in wanted:
        at = (*path, number.name)
        if number.name in keys:
            if not _fits(keys[number.name], number):
                yield Problem(path=at, message=f"found {found(keys[number.name])}; needs {_range_text(number)}")
            continue
        partner = next((other for other in wanted if other.together == number.name and other.name in keys), None)
        if number.default is None:
            message = f'missing; "{relation}" needs {_range_text(number)}'
            yield Problem(path=at, message=message, only_for=purposes_of(path))
        elif partner is not None:
            message = f"missing; {partner.name} goes together with {number.name}, {_range_text(number)}"
            yield Problem(path=at, message=message, only_for=purposes_of(path))


def _fits(value: object, number: Parameter) -> bool:
    is_number = isinstance(value, int | float) and not isinstance(value, bool)
    return is_number and number.low < value <= number.high  # type: ignore[operator]


def _range_text(number: Parameter) -> str:
    unit = "" if number.unit == "-" else f" {number.unit}"
    return f"a number over {number.low:g} up to {number.high:g}{unit} ({number.meaning})"
