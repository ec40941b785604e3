"""The table of discharge relations: from the levels on both sides of an opening to its discharge.

Every kernel has one signature: sea level, basin level and crest [m above datum], the section's layers, and the entry's
own numbers in their order; it returns the discharge [m3/s, positive from sea to basin], and area [m2] and mean width
[m] of the control section. A new relation is one kernel and one entry, in `crest_relations` or `conduit_relations`.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from tidescour.errors import DomainError
from tidescour.gap.conduit_relations import CONDUIT_RELATIONS
from tidescour.gap.crest_relations import CREST_RELATIONS
from tidescour.gap.relation_parts import Kernel
from tidescour.gap.section import Section
from tidescour.table import Entry
from tidescour.units import FloatArray, read_only

RELATIONS: Mapping[str, Entry[Kernel]] = {entry.name: entry for entry in (*CREST_RELATIONS, *CONDUIT_RELATIONS)}

KERNELS: tuple[Kernel, ...] = tuple(entry.function for entry in RELATIONS.values())
CODES: Mapping[str, int] = {name: code for code, name in enumerate(RELATIONS)}
NO_VALUE_REMEDY = (
    "what leads to the gap must be larger than the gap: for an open gap correct channel_area_sea_m2 and "
    "channel_area_basin_m2, or give it some friction; for a broad crest correct approach_width and approach_bed, take "
    "a smaller coefficient or modular_limit, or leave the approach out"
)
NUMBERS_AT_MOST = max(len(entry.parameters) for entry in RELATIONS.values())


def relation_numbers(name: str, values: Mapping[str, float]) -> FloatArray:
    """Return a relation's numbers in the order of its table entry, as its kernel wants them.

    Raises
    ------
    DomainError
        If the relation is not in the table, or a number is missing or outside its range.
    """
    if name not in RELATIONS:
        raise DomainError(f"relation {name!r} is not in the table; it has {', '.join(RELATIONS)}")
    numbers = np.zeros(NUMBERS_AT_MOST)
    for position, parameter in enumerate(RELATIONS[name].parameters):
        if parameter.name not in values and parameter.default is not None:
            numbers[position] = parameter.default
            continue
        value = values.get(parameter.name, np.nan)
        if not parameter.allows(value):
            raise DomainError(
                f"relation {name}: {parameter.name} = {value:g} must be over {parameter.low:g} and at most "
                f"{parameter.high:g}"
            )
        if parameter.together and parameter.together not in values:
            raise DomainError(f"relation {name}: {parameter.name} needs {parameter.together} beside it")
        numbers[position] = value
    return read_only(numbers)


def opening_discharge(
    relation: str, values: Mapping[str, float], section: Section, sea_level_m: FloatArray, basin_level_m: FloatArray
) -> FloatArray:
    """Return the discharge of an opening by one relation of the table.

    Parameters
    ----------
    relation : str
        Name in the table.
    values : mapping of str to float
        The relation's own numbers, such as ``coefficient``.
    section : Section
        Crest and wet area.
    sea_level_m, basin_level_m : (n,) array
        Levels on both sides [m above datum].

    Returns
    -------
    (n,) array
        Discharge [m3/s], positive from sea to basin; 0 where the crest is dry; NaN where a level is NaN, or the
        relation has no value.

    Raises
    ------
    DomainError
        If shapes differ, or the relation or one of its numbers is not right.
    """
    if sea_level_m.shape != basin_level_m.shape or sea_level_m.ndim != 1:
        raise DomainError("sea_level_m and basin_level_m must be two rows of one length")
    numbers = relation_numbers(relation, values)
    kernel = RELATIONS[relation].function
    discharge = np.full(sea_level_m.shape, np.nan)
    known = np.isfinite(sea_level_m) & np.isfinite(basin_level_m)
    discharge[known] = [
        kernel(sea, basin, section.crest_level_m, section.layers, numbers)[0]
        for sea, basin in zip(sea_level_m[known], basin_level_m[known], strict=True)
    ]
    return discharge
