"""Numbers out of the files that tables of a plan name: profiles across a gap, the basin by level, discharges."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from datetime import date
from pathlib import Path
from typing import Any

from tidescour.errors import PlanError
from tidescour.plan.cells import number_cell, text_cell, time_cell
from tidescour.plan.models_calibration import Discharge
from tidescour.plan.number_table import number_table
from tidescour.plan.openings import written_openings
from tidescour.plan.problems import KeyPath, Mark, Problem, purposes_of
from tidescour.plan.profile import Points, open_part, read_profile
from tidescour.plan.shapes import key_names
from tidescour.plan.sheet import is_there, no_column, not_there, read_sheet

_DISCHARGE_COLUMNS = key_names(Discharge)
STORAGE_COLUMNS = ("area_m2", "volume_m3")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FromFiles:
    """What the files of a plan hold.

    Parameters
    ----------
    values : mapping of path to mapping
        Keys to add to tables of the plan, by the path of the table.
    discharges : tuple of dict
        Rows of the table of discharges as TOML would give them, to stand after the entries of `[[discharge]]`.
    marks : dict of path to Mark
        Row of each key that was added.
    problems : tuple of Problem
        What kept a file, or a row of it, from being read.
    """

    values: Mapping[KeyPath, Mapping[str, Any]]
    discharges: tuple[dict[str, Any], ...] = ()
    marks: dict[KeyPath, Mark]
    problems: tuple[Problem, ...]


_NOTHING = FromFiles(values={}, marks={}, problems=())


def read_named_files(folder: Path, written: Mapping[str, Any]) -> FromFiles:
    """Read the profiles, the table of the basin and the table of discharges that a plan names.

    Parameters
    ----------
    folder : Path
        Where relative paths start.
    written : mapping
        The whole plan as parsed, sound or not; with the stages of its programme table.

    Returns
    -------
    FromFiles
        A file that several openings name is read, and judged, once.
    """
    parts = (_profiles(folder, written), _storage(folder, written), _discharges(folder, written))
    return FromFiles(
        values={path: values for part in parts for path, values in part.values.items()},
        discharges=tuple(row for part in parts for row in part.discharges),
        marks={path: mark for part in parts for path, mark in part.marks.items()},
        problems=tuple(problem for part in parts for problem in part.problems),
    )


def _file_name(table: Mapping[str, Any], key: str) -> str | None:
    """Return the file that a key names; None where it is not written or no text, which is judged elsewhere."""
    name = table.get(key)
    return name if isinstance(name, str) and name.strip() else None


def _missing_file(path: KeyPath, file: Path) -> FromFiles:
    return replace(_NOTHING, problems=(Problem(path=path, message=not_there(file), only_for=purposes_of(path)),))


def _refused(path: KeyPath, error: PlanError) -> FromFiles:
    return replace(_NOTHING, problems=tuple(Problem(path=path, message=text) for text in error.problems))


def _profiles(folder: Path, written: Mapping[str, Any]) -> FromFiles:
    users: dict[str, list[tuple[KeyPath, dict[str, Any]]]] = {}
    for path, opening in written_openings(written):
        if name := _file_name(opening, "profile"):
            users.setdefault(name, []).append((path, opening))
    values: dict[KeyPath, Mapping[str, Any]] = {}
    problems: list[Problem] = []
    for name, openings in users.items():
        points, wrong = _profile(folder / name, [(*path, "profile") for path, _ in openings])
        problems += wrong
        for path, opening in openings if points else ():
            values[path], wrong = _profile_keys(path, opening, points)
            problems += wrong
    return FromFiles(values=values, marks={}, problems=tuple(problems))


def _profile(file: Path, named_at: list[KeyPath]) -> tuple[Points, list[Problem]]:
    """Return the points of a profile, or none and what is wrong, told once for all openings that name it."""
    if not is_there(file):
        purposes = tuple(dict.fromkeys(purpose for path in named_at for purpose in purposes_of(path)))
        return (), [Problem(path=named_at[0], message=not_there(file), only_for=purposes)]
    try:
        return read_profile(file), []
    except PlanError as error:
        return (), [Problem(path=named_at[0], message=text) for text in error.problems]


def _profile_keys(path: KeyPath, opening: Mapping[str, Any], points: Points) -> tuple[dict[str, Any], list[Problem]]:
    """Return the open part of a profile and its crest; nothing where the distances of the cuts are no sound pair."""
    start, end = _distance(opening, "profile_from_m", -math.inf), _distance(opening, "profile_to_m", math.inf)
    if not start < end:
        return {}, []
    first, last = points[0][0], points[-1][0]
    if start >= last:
        message = f"found {start:g}, but the profile ends at {last:g}"
        return {}, [Problem(path=(*path, "profile_from_m"), message=message)]
    if end <= first:
        message = f"found {end:g}, but the profile begins at {first:g}"
        return {}, [Problem(path=(*path, "profile_to_m"), message=message)]
    part = open_part(points, start, end)
    lowest = {} if "crest_level_m" in opening else {"crest_level_m": min(level for _, level in part)}
    return {"profile_points": part} | lowest, []


def _distance(opening: Mapping[str, Any], key: str, default: float) -> float:
    value = opening.get(key, default)
    try:
        return float(value) if isinstance(value, int | float) and not isinstance(value, bool) else math.nan
    except OverflowError:
        return math.nan


def _storage(folder: Path, written: Mapping[str, Any]) -> FromFiles:
    basin = written.get("basin")
    if not isinstance(basin, dict) or (name := _file_name(basin, "table")) is None:
        return _NOTHING
    if any(key in basin for key in ("level_m", *STORAGE_COLUMNS)):
        return _NOTHING  # two sources are judged with the other rules
    path: KeyPath = ("basin", "table")
    file = folder / name
    if not is_there(file):
        return _missing_file(path, file)
    try:
        sheet = read_sheet(file)
        column = basin.get("table_column") or next((key for key in STORAGE_COLUMNS if key in sheet.columns), None)
        if column is None:
            raise PlanError(f"{file.name}: {no_column(sheet, *STORAGE_COLUMNS)}")
        if column not in STORAGE_COLUMNS:
            return _NOTHING  # a fault of the key itself
        table = number_table(file.name, sheet, ("level_m", column))
    except PlanError as error:
        return _refused(path, error)
    return FromFiles(
        values={("basin",): dict(zip(("level_m", column), zip(*table.values, strict=True), strict=True))},
        marks={
            ("basin", key, position): Mark(file=file.name, unit="row", number=row, detail=f", {key}")
            for key in ("level_m", column)
            for position, row in enumerate(table.row)
        },
        problems=(),
    )


def _discharges(folder: Path, written: Mapping[str, Any]) -> FromFiles:
    calibration, entries = written.get("calibration"), written.get("discharge", [])
    name = _file_name(calibration, "discharge_file") if isinstance(calibration, dict) else None
    if name is None or not isinstance(entries, list) or ("discharge" in written and not entries):
        return _NOTHING  # a faulty list of entries is judged elsewhere
    path: KeyPath = ("calibration", "discharge_file")
    file = folder / name
    if not is_there(file):
        return _missing_file(path, file)
    try:
        sheet = read_sheet(file)
        if missing := [key for key in _DISCHARGE_COLUMNS if key not in sheet.columns]:
            raise PlanError(*(f"{file.name}: {no_column(sheet, key)}" for key in missing))
        if not sheet.rows:
            raise PlanError(f"{file.name}: has a header but no row")
    except PlanError as error:
        return _refused(path, error)
    marks: dict[KeyPath, Mark] = {}
    for position, (number, cells) in enumerate(sheet.rows, start=len(entries)):
        marks["discharge", position] = Mark(file=file.name, unit="row", number=number)
        for key in _DISCHARGE_COLUMNS:
            is_date = key == "time" and isinstance(cells.get(key), date)
            detail = f", {key}" + (" (a date cell has no offset: write text)" if is_date else "")
            marks["discharge", position, key] = Mark(file=file.name, unit="row", number=number, detail=detail)
    return FromFiles(
        values={},
        discharges=tuple(_discharge(cells, sheet.decimal_comma) for _, cells in sheet.rows),
        marks=marks,
        problems=(),
    )


def _discharge(cells: Mapping[str, Any], decimal_comma: bool) -> dict[str, Any]:
    read = {"time": time_cell, "opening": text_cell}
    return {
        key: read[key](cells[key]) if key in read else number_cell(cells[key], decimal_comma)
        for key in _DISCHARGE_COLUMNS
        if key in cells
    }
