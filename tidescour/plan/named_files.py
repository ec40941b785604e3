"""Numbers out of the files that tables of a plan name: profiles, the basin, a growth curve, discharges, soundings."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from datetime import date
from pathlib import Path
from typing import Any

from tidescour.errors import PlanError
from tidescour.plan.cells import number_cell, text_cell, time_cell
from tidescour.plan.curve import read_curve
from tidescour.plan.kinds import PlanModel
from tidescour.plan.models_calibration import Discharge
from tidescour.plan.models_survey import Sounding
from tidescour.plan.number_table import number_table
from tidescour.plan.openings import written_openings
from tidescour.plan.problems import KeyPath, Mark, Problem, purposes_of
from tidescour.plan.profile import Points, open_part, read_profile
from tidescour.plan.shapes import key_names
from tidescour.plan.sheet import is_there, no_column, not_there, read_sheet

STORAGE_COLUMNS = ("area_m2", "volume_m3")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _RowFile:
    """A table whose rows stand after the entries of a list of tables.

    `path` is the key that names it, `entries` the list, `model` what each row is; of each group in `needed` one column
    must be there. A column outside `times` and `texts` holds numbers.
    """

    path: tuple[str, str]
    entries: str
    model: type[PlanModel]
    needed: tuple[tuple[str, ...], ...]
    times: tuple[str, ...]
    texts: tuple[str, ...]


_ROW_FILES = (
    _RowFile(
        path=("calibration", "discharge_file"),
        entries="discharge",
        model=Discharge,
        needed=(("time",), ("opening",), ("discharge_m3_s",), ("standard_error_m3_s",)),
        times=("time",),
        texts=("opening",),
    ),
    _RowFile(
        path=("soundings", "file"),
        entries="sounding",
        model=Sounding,
        needed=(("date",), ("opening",), ("side",), ("depth_m", "bed_level_m"), ("standard_error_m",)),
        times=("date",),
        texts=("opening", "side"),
    ),
)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FromFiles:
    """What the files of a plan hold.

    Parameters
    ----------
    values : mapping of path to mapping
        Keys to add to tables of the plan, by the path of the table.
    rows : mapping of str to tuple of dict
        Rows as TOML would give them, by the list of tables after whose entries they are to stand.
    marks : dict of path to Mark
        Row of each key that was added.
    problems : tuple of Problem
        What kept a file, or a row of it, from being read.
    """

    values: Mapping[KeyPath, Mapping[str, Any]]
    rows: Mapping[str, tuple[dict[str, Any], ...]]
    marks: dict[KeyPath, Mark]
    problems: tuple[Problem, ...]


_NOTHING = FromFiles(values={}, rows={}, marks={}, problems=())


def read_named_files(folder: Path, written: Mapping[str, Any]) -> FromFiles:
    """Read the profiles, the growth curve, and the tables of the basin, discharges and soundings that a plan names.

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
    parts = (
        _profiles(folder, written),
        _storage(folder, written),
        _growth_curve(folder, written),
        *(_listed_rows(folder, written, source) for source in _ROW_FILES),
    )
    return FromFiles(
        values={path: values for part in parts for path, values in part.values.items()},
        rows={key: rows for part in parts for key, rows in part.rows.items()},
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
    return replace(_NOTHING, values=values, problems=tuple(problems))


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
    return replace(
        _NOTHING,
        values={("basin",): dict(zip(("level_m", column), zip(*table.values, strict=True), strict=True))},
        marks={
            ("basin", key, position): Mark(file=file.name, unit="row", number=row, detail=f", {key}")
            for key in ("level_m", column)
            for position, row in enumerate(table.row)
        },
    )


def _growth_curve(folder: Path, written: Mapping[str, Any]) -> FromFiles:
    scour = written.get("scour")
    if not isinstance(scour, dict) or (name := _file_name(scour, "curve_file")) is None:
        return _NOTHING
    path: KeyPath = ("scour", "curve_file")
    file = folder / name
    if not is_there(file):
        return _missing_file(path, file)
    try:
        return replace(_NOTHING, values={("scour",): {"curve_points": read_curve(file)}})
    except PlanError as error:
        return _refused(path, error)


def _listed_rows(folder: Path, written: Mapping[str, Any], source: _RowFile) -> FromFiles:
    """Return the rows of a table that the plan names, to stand after the entries of a list."""
    around, key = source.path
    table, entries = written.get(around), written.get(source.entries, [])
    name = _file_name(table, key) if isinstance(table, dict) else None
    if name is None or not isinstance(entries, list) or (source.entries in written and not entries):
        return _NOTHING  # a faulty list of entries is judged elsewhere
    file = folder / name
    if not is_there(file):
        return _missing_file(source.path, file)
    try:
        sheet = read_sheet(file)
        if missing := [names for names in source.needed if not set(names) & set(sheet.columns)]:
            raise PlanError(*(f"{file.name}: {no_column(sheet, *names)}" for names in missing))
        if not sheet.rows:
            raise PlanError(f"{file.name}: has a header but no row")
    except PlanError as error:
        return _refused(source.path, error)
    marks: dict[KeyPath, Mark] = {}
    for position, (number, cells) in enumerate(sheet.rows, start=len(entries)):
        marks[source.entries, position] = Mark(file=file.name, unit="row", number=number)
        for column in key_names(source.model):
            is_date = column in source.times and isinstance(cells.get(column), date)
            detail = f", {column}" + (" (a date cell has no offset: write text)" if is_date else "")
            marks[source.entries, position, column] = Mark(file=file.name, unit="row", number=number, detail=detail)
    rows = tuple(_row(cells, source, sheet.decimal_comma) for _, cells in sheet.rows)
    return replace(_NOTHING, rows={source.entries: rows}, marks=marks)


def _row(cells: Mapping[str, Any], source: _RowFile, decimal_comma: bool) -> dict[str, Any]:
    def value(column: str) -> Any:
        if column in source.times:
            return time_cell(cells[column])
        return text_cell(cells[column]) if column in source.texts else number_cell(cells[column], decimal_comma)

    return {column: value(column) for column in key_names(source.model) if column in cells}
