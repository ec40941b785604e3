"""The openings of a stage as the compiled kernels want them: geometry in time, relation and numbers."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from tidescour.compiled import compiled
from tidescour.errors import DomainError
from tidescour.gap.crests import mean_width
from tidescour.gap.layers import CONTENT, EXTENT, GROWTH, LEVEL
from tidescour.gap.relation_parts import Kernel
from tidescour.gap.relations import CODES, KERNELS, NUMBERS_AT_MOST, relation_numbers
from tidescour.gap.section import Section, control_level, crest_area, profile_layers, trapezoid_section
from tidescour.plan.kinds import SIDES
from tidescour.plan.models import Opening
from tidescour.units import BoolArray, FloatArray, IntArray


class OpeningSet(NamedTuple):
    """k openings through a stage, their geometry linear in time.

    A tuple of arrays, for that is what compiled code takes as one argument; `opening_set` builds it.

    Parameters
    ----------
    code : (k,) array of int64
        Place of each relation in the table.
    numbers : (k, p) array
        Each relation's own numbers.
    crest_level_m, width_m : (k, 2) array
        Crest [m above datum] and width at the crest [m] at the start and the end of the stage.
    side_slope : (k,) array
        Horizontal per vertical, both sides.
    layers : (k, n, 4) array
        Layers of surveyed profiles; of the others, and below the end of a shorter one, rows at infinity.
    profiled : (k,) array of bool
        Openings whose section is that of `layers`, filled up to the crest.
    sea_row : (k,) array of int64
        Which of the sea levels each opening meets.
    """

    code: IntArray
    numbers: FloatArray
    crest_level_m: FloatArray
    width_m: FloatArray
    side_slope: FloatArray
    layers: FloatArray
    profiled: BoolArray
    sea_row: IntArray


NO_RELATION = -1
"""Code of an opening whose flow is given."""


def has_own_sea(opening: Opening) -> bool:
    """Return whether an opening lies so far from the others that it meets a sea level of its own."""
    return opening.sea_lag_s != 0.0 or opening.sea_factor != 1.0 or opening.sea_shift_m != 0.0


def opening_set(openings: Sequence[Opening], fixed_at_start: bool = False) -> OpeningSet:
    """Return openings of a plan for the kernels.

    Parameters
    ----------
    openings : sequence of Opening
        As the plan has them; one without a relation has no code.
    fixed_at_start : bool
        Keep the geometry of the start throughout.

    Raises
    ------
    DomainError
        If a number of a relation or a profile is not right.
    """
    count = len(openings)
    tables = [_profile(opening) for opening in openings]
    layers = np.zeros((count, max([1, *(table.shape[0] for table in tables)]), 4))
    layers[:, :, LEVEL] = np.inf
    numbers = np.zeros((count, NUMBERS_AT_MOST))
    for k, (opening, table) in enumerate(zip(openings, tables, strict=True)):
        layers[k, : table.shape[0]] = table
        _refuse_high_approach(opening)
        if opening.relation is not None:
            numbers[k] = relation_numbers(opening.relation, opening.parameters)

    def ends(pairs: list[tuple[float | None, float | None]]) -> FloatArray:
        both = [(start, start if end is None or fixed_at_start else end) for start, end in pairs]
        return np.array(both, dtype=np.float64).reshape(count, 2)

    own = np.array([has_own_sea(opening) for opening in openings], dtype=np.bool_)
    return OpeningSet(
        code=np.array([CODES.get(str(opening.relation), NO_RELATION) for opening in openings], dtype=np.int64),
        numbers=numbers,
        crest_level_m=ends([(opening.crest_level_m, opening.crest_level_end_m) for opening in openings]),
        width_m=ends([(opening.width_m, opening.width_end_m) for opening in openings]),
        side_slope=np.array([opening.side_slope for opening in openings], dtype=np.float64),
        layers=layers,
        profiled=np.array([bool(opening.profile_points) for opening in openings], dtype=np.bool_),
        sea_row=np.where(own, np.cumsum(own), 0).astype(np.int64),
    )


def _refuse_high_approach(opening: Opening) -> None:
    lowest = min(opening.crest_level_m, opening.crest_level_m if (end := opening.crest_level_end_m) is None else end)
    for side in SIDES:
        bed = opening.parameters.get(f"approach_bed_{side}_m")
        if bed is not None and bed > lowest:
            raise DomainError(
                f"opening {opening.name!r}: approach_bed_{side}_m = {bed:g} lies over the crest at {lowest:g} m; write "
                "the bed of the channel in front of the sill, or leave approach width and bed out"
            )


def _profile(opening: Opening) -> FloatArray:
    if not opening.profile_points:
        return np.empty((0, 4))
    distance, level = np.array(opening.profile_points).T
    try:
        return profile_layers(distance, level)
    except DomainError as error:
        raise DomainError(f"opening {opening.name!r}, profile {opening.profile}: {error}") from error


def opening_section(opening: Opening, at_end: bool = False) -> Section:
    """Return the section of an opening at the start or the end of its stage.

    Raises
    ------
    DomainError
        If its profile has no width.
    """
    ending = opening.crest_level_end_m if at_end else None
    crest = opening.crest_level_m if ending is None else ending
    if opening.profile_points:
        return Section(crest_level_m=crest, layers=_profile(opening))
    wider = opening.width_end_m if at_end else None
    width = opening.width_m if wider is None else wider
    return trapezoid_section(crest, math.nan if width is None else width, opening.side_slope)


@compiled
def place_openings(openings: OpeningSet, fraction: float, crests: FloatArray, sections: FloatArray) -> None:
    """Fill in crests (k,) and sections (k, n, 4) at a fraction of the stage; profiles stand in `sections` already."""
    for k in range(openings.code.size):
        crests[k] = openings.crest_level_m[k, 0] + fraction * (
            openings.crest_level_m[k, 1] - openings.crest_level_m[k, 0]
        )
        if not openings.profiled[k]:
            sections[k, 0, LEVEL] = crests[k]
            sections[k, 0, CONTENT] = 0.0
            sections[k, 0, EXTENT] = openings.width_m[k, 0] + fraction * (
                openings.width_m[k, 1] - openings.width_m[k, 0]
            )
            sections[k, 0, GROWTH] = 2.0 * openings.side_slope[k]


@compiled
def _fill_rows(
    kernels: tuple[Kernel, ...],
    openings: OpeningSet,
    k: int,
    sea_m: FloatArray,
    basin_m: FloatArray,
    crests: FloatArray,
    sections: FloatArray,
    rows: FloatArray,
) -> None:
    steps = max(sea_m.size - 1, 1)
    for i in range(sea_m.size):
        place_openings(openings, i / steps, crests, sections)
        rows[0, i], rows[1, i], rows[2, i] = kernels[openings.code[k]](
            sea_m[i], basin_m[i], crests[k], sections[k], openings.numbers[k]
        )


@compiled
def _fill_given_rows(
    openings: OpeningSet,
    k: int,
    discharge: FloatArray,
    sea_m: FloatArray,
    basin_m: FloatArray,
    crests: FloatArray,
    sections: FloatArray,
    rows: FloatArray,
) -> None:
    """Fill in rows for a discharge that is given; its energy is the level on the side it comes from."""
    steps = max(sea_m.size - 1, 1)
    for i in range(sea_m.size):
        place_openings(openings, i / steps, crests, sections)
        from_sea = discharge[i] >= 0.0
        upstream, downstream = (sea_m[i], basin_m[i]) if from_sea else (basin_m[i], sea_m[i])
        level = control_level(upstream, downstream, crests[k], sections[k])
        area = crest_area(level, crests[k], sections[k])
        rows[0, i], rows[1, i] = discharge[i], area
        rows[2, i] = mean_width(area, level - crests[k])


def opening_rows(
    openings: OpeningSet,
    k: int,
    sea_level_m: FloatArray,
    basin_level_m: FloatArray,
    discharge_m3_s: FloatArray | None = None,
) -> FloatArray:
    """Return what passes the k-th opening, at even steps from the start of the stage to its end.

    Parameters
    ----------
    openings : OpeningSet
        The openings of a stage.
    k : int
        Which of them.
    sea_level_m, basin_level_m : (n,) array
        Levels on both sides [m above datum].
    discharge_m3_s : (n,) array, optional
        Given discharge, instead of that of its relation [m3/s, positive from sea to basin].

    Returns
    -------
    (3, n) array
        Discharge [m3/s, positive from sea to basin], area [m2] and mean width [m] of the control section.
    """
    sea, basin = np.ascontiguousarray(sea_level_m), np.ascontiguousarray(basin_level_m)
    rows = np.empty((3, sea.size))
    crests, sections = np.empty(openings.code.size), openings.layers.copy()
    if discharge_m3_s is None:
        _fill_rows(KERNELS, openings, k, sea, basin, crests, sections, rows)
    else:
        given = np.ascontiguousarray(discharge_m3_s)
        _fill_given_rows(openings, k, given, sea, basin, crests, sections, rows)
    return rows
