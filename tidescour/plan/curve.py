"""A growth curve out of a physical model, scaled by the time at which the hole is as deep as the water."""

from __future__ import annotations

import math
from itertools import pairwise
from pathlib import Path

from tidescour.errors import PlanError
from tidescour.plan.number_table import NumberTable, number_table
from tidescour.plan.sheet import read_sheet

Curve = tuple[tuple[float, float], ...]
"""Time over t1 and depth over water depth of each point."""

_COLUMNS = ("time_over_t1", "depth_over_water_depth")
_FEWEST_POINTS = 3
_TOLERANCE = 0.05
"""How far a scaled curve may miss depth 1 at time 1; common practice, no source."""


def read_curve(path: Path) -> Curve:
    """Read a table with the columns ``time_over_t1`` and ``depth_over_water_depth``.

    Parameters
    ----------
    path : Path
        ``.csv`` or ``.xlsx``; other columns are passed over.

    Returns
    -------
    tuple of (float, float)
        Time over t1 and depth over water depth of each point, both positive and increasing.

    Raises
    ------
    PlanError
        With every problem by file and row: what is no finite number, not positive or not above the row before, fewer
        than three points, and a curve over time 1 whose depth there (logarithms linear between) is not 1 within 5 %.
    """
    table = number_table(path.name, read_sheet(path), _COLUMNS)
    curve: Curve = tuple((time, depth) for time, depth in table.values)
    wrong = _wrong_rows(path.name, table)
    if len(curve) < _FEWEST_POINTS:
        wrong.append(f"{path.name}: has {len(curve)} points; a growth curve needs at least {_FEWEST_POINTS}")
    if not wrong and curve[0][0] <= 1.0 <= curve[-1][0]:
        depth = _depth_at_one(curve)
        if abs(depth - 1.0) > _TOLERANCE:
            meaning = "t1 is the time at which the hole is as deep as the water"
            remedy = "scale the times so that the curve passes through 1 at 1"
            wrong.append(f"{path.name}: depth_over_water_depth is {depth:.3g} at time_over_t1 = 1; {meaning}: {remedy}")
    if wrong:
        raise PlanError(*wrong)
    return curve


def _wrong_rows(file: str, table: NumberTable) -> list[str]:
    wrong: list[str] = []
    origin = [row for row, values in zip(table.row, table.values, strict=True) if values == (0.0, 0.0)]
    wrong += [f"{file} row {row}: leave the row 0, 0 out: the curve starts there by itself" for row in origin]
    for column, name in enumerate(_COLUMNS):
        values = [row[column] for row in table.values]
        for row, value in zip(table.row, values, strict=True):
            if value <= 0.0 and row not in origin:
                wrong.append(f"{file} row {row}: {name}: found {value:g}; needs a number over 0")
        for row, (before, after) in zip(table.row[1:], pairwise(values), strict=True):
            if after <= before:
                wrong.append(f"{file} row {row}: {name}: found {after:g} after {before:g}; it must increase")
    return wrong


def _depth_at_one(curve: Curve) -> float:
    (time, depth), (later, deeper) = next((a, b) for a, b in pairwise(curve) if a[0] <= 1.0 <= b[0])
    share = math.log(1.0 / time) / math.log(later / time)
    return math.exp((1.0 - share) * math.log(depth) + share * math.log(deeper))
