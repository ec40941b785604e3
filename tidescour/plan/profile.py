"""A surveyed profile across a gap: reading it, and the part of it that is open."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path

from tidescour.errors import PlanError
from tidescour.plan.number_table import number_table
from tidescour.plan.sheet import read_sheet

Points = tuple[tuple[float, float], ...]
"""Distance and level of each point [m]."""

_COLUMNS = ("distance_m", "level_m")
_FEWEST_POINTS = 3


def read_profile(path: Path) -> Points:
    """Read a table with the columns ``distance_m`` and ``level_m``.

    Parameters
    ----------
    path : Path
        ``.csv`` or ``.xlsx``; other columns are passed over.

    Returns
    -------
    tuple of (float, float)
        Distance and level [m above the datum] of each point. Two points at one distance are a wall.

    Raises
    ------
    PlanError
        With every problem by file and row: what is no finite number, a distance that decreases, fewer than three
        points, all of them at one distance or at one level.
    """
    table = number_table(path.name, read_sheet(path), _COLUMNS)
    points: Points = tuple((distance, level) for distance, level in table.values)
    wrong = [
        f"{path.name} row {row}: distance_m: found {after[0]:g} after {before[0]:g}; distances cannot decrease"
        for row, (before, after) in zip(table.row[1:], pairwise(points), strict=True)
        if after[0] < before[0]
    ]
    if len(points) < _FEWEST_POINTS:
        wrong.append(f"{path.name}: has {len(points)} points; a profile needs at least {_FEWEST_POINTS}")
    elif not wrong and points[0][0] == points[-1][0]:
        wrong.append(f"{path.name}: all points stand at one distance, {points[0][0]:g} m; a profile needs a width")
    elif len({level for _, level in points}) == 1:
        remedy = "write width_m and crest_level_m instead of a profile"
        wrong.append(f"{path.name}: all points stand at one level, {points[0][1]:g} m; {remedy}")
    if wrong:
        raise PlanError(*wrong)
    return points


def open_part(points: Points, from_m: float, to_m: float) -> Points:
    """Return the part of a profile between two distances, cut by vertical walls.

    Parameters
    ----------
    points : tuple of (float, float)
        As `read_profile` returns them.
    from_m, to_m : float
        Distances [m], the first below the second, with some of the profile between; infinite for no cut.

    Returns
    -------
    tuple of (float, float)
        At least two points; linear between the surveyed ones at the cuts. Of a wall in a cut, only the inner end.
    """
    inner = tuple(point for point in points if from_m < point[0] < to_m)
    first = tuple(
        (from_m, _level_at(from_m, left, right)) for left, right in pairwise(points) if left[0] <= from_m < right[0]
    )
    last = tuple((to_m, _level_at(to_m, left, right)) for left, right in pairwise(points) if left[0] < to_m <= right[0])
    return (*first, *inner, *last)


def _level_at(distance_m: float, left: tuple[float, float], right: tuple[float, float]) -> float:
    if distance_m == right[0]:
        return right[1]  # as surveyed, to the last digit
    return left[1] + (distance_m - left[0]) / (right[0] - left[0]) * (right[1] - left[1])
