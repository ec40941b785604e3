"""Stages from a table: one row a stage and opening, under the same keys as `[[stage]]`.

Columns ``stage`` and ``opening`` hold the two names and are filled in every row; the rows of a stage stand together.
``start`` and ``end`` are given at least once a stage. Any other empty cell takes what that opening had when it last
stood in an earlier stage (for ``sea`` and ``basin``, what the stage before had). A cell with a dash takes nothing.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from datetime import date
from itertools import groupby
from pathlib import Path
from typing import Any

from tidescour.errors import PlanError
from tidescour.plan.cells import number_cell, text_cell, time_cell
from tidescour.plan.choices import Choices
from tidescour.plan.models import Opening, StageSpan
from tidescour.plan.problems import WHOLE_JOB, KeyPath, Mark, Problem, found, suggestion
from tidescour.plan.shapes import key_names
from tidescour.plan.sheet import Sheet, is_there, no_column, not_there, read_sheet

_NOTHING = "-"
_NEEDED_COLUMNS = ("stage", "start", "end", "opening")
_NEEDED_WITHOUT_PROFILE = ("crest_level_m", "width_m")
_TIME_COLUMNS = ("start", "end", "planned_start", "planned_end")
_STAGE_COLUMNS = tuple(key for key in key_names(StageSpan) if key != "name")
_OPENING_COLUMNS = tuple(key for key in key_names(Opening) if key != "name")
_FLOW_COLUMNS = ("relation", "discharge_series", "end_velocity_series")
_PROFILE_COLUMNS = ("profile", "profile_from_m", "profile_to_m")
_WIDTH_COLUMNS = ("width_m", "width_end_m", "side_slope")
_TEXT_COLUMNS = ("stage", "opening", "sea", "basin", "profile", *_FLOW_COLUMNS)
_INSTEAD_OF = {"profile": _WIDTH_COLUMNS, "width_m": _PROFILE_COLUMNS}
_MOVING = (("crest_level_m", "crest_level_end_m"), ("width_m", "width_end_m"))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ProgrammeStages:
    """Stages of a table in the form that `[[stage]]` has when it is parsed.

    Parameters
    ----------
    stages : list of dict
        As TOML would give them, to be judged by the same rules.
    marks : dict
        Row and column of each key, by path.
    problems : tuple of Problem
        What kept the table, or single rows of it, from being read.
    """

    stages: list[dict[str, Any]]
    marks: dict[KeyPath, Mark]
    problems: tuple[Problem, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class _Cell:
    """A value and the row that gave it; `is_date` for a time that a workbook holds as a date."""

    value: Any
    row: int
    is_date: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class _Row:
    """What one row itself gives, by column; a cell with a dash has the value None."""

    number: int
    stage: str
    opening: str
    cells: dict[str, _Cell]


def programme_stages(path: Path, choices: Choices) -> ProgrammeStages:
    """Read the stages of a table.

    Parameters
    ----------
    path : Path
        ``.csv`` or ``.xlsx``.
    choices : Choices
        Relations, whose numbers may be columns too.

    Returns
    -------
    ProgrammeStages
        Without stages where the table as a whole cannot be read. Where there is none yet, only a run misses it.
    """
    if not is_there(path):
        missing = Problem(path=("programme", "file"), message=not_there(path), only_for=WHOLE_JOB)
        return ProgrammeStages(stages=[], marks={}, problems=(missing,))
    try:
        sheet = read_sheet(path)
    except PlanError as error:
        return ProgrammeStages(stages=[], marks={}, problems=tuple(_problem(text) for text in error.problems))
    problems = list(_column_problems(path.name, sheet, _number_names(choices)))
    if not set(_needed_columns(sheet)) <= set(sheet.columns):
        return ProgrammeStages(stages=[], marks={}, problems=tuple(problems))
    problems += _nameless_rows(path.name, sheet)
    groups = _rows_by_stage(sheet)
    problems += _scattered_stages(path.name, groups)
    stages: list[dict[str, Any]] = []
    marks: dict[KeyPath, Mark] = {}
    stage_cells: dict[str, _Cell] = {}
    before: dict[str, dict[str, _Cell]] = {}
    for position, rows in enumerate(groups):
        at = ("stage", position)
        problems += _disagreeing_cells(path.name, rows)
        stage_cells = _stage_cells(rows, stage_cells)
        marks |= _marks(path.name, at, "stage", rows[0].number, stage_cells)
        openings = [_opening_cells(row, before.get(row.opening, {}), choices) for row in rows]
        for number, (row, cells) in enumerate(zip(rows, openings, strict=True)):
            problems += _unclear_movements(path.name, row, cells, before.get(row.opening, {}))
            marks |= _marks(path.name, (*at, "opening", number), "opening", row.number, cells)
        before |= {row.opening: cells for row, cells in zip(rows, openings, strict=True)}
        stages.append(
            {"name": rows[0].stage}
            | _values(stage_cells)
            | {"opening": [{"name": row.opening} | _values(cells) for row, cells in zip(rows, openings, strict=True)]}
        )
    return ProgrammeStages(stages=stages, marks=marks, problems=tuple(problems))


def _problem(text: str) -> Problem:
    return Problem(path=("programme", "file"), message=text)


def _number_names(choices: Choices) -> tuple[str, ...]:
    return tuple(dict.fromkeys(number.name for wanted in choices.relations.values() for number in wanted))


def _column_problems(file: str, sheet: Sheet, numbers: tuple[str, ...]) -> Iterator[Problem]:
    allowed = ("stage", "opening", *_STAGE_COLUMNS, *_OPENING_COLUMNS, *numbers)
    for name in sheet.columns:
        if name == "name":
            yield _problem(f'{file}: unknown column "name"; write "stage" or "opening", whichever it names')
        elif name not in allowed:
            yield _problem(f"{file}: unknown column {found(name)}; {suggestion(name, allowed)}")
    for name in _needed_columns(sheet):
        if name not in sheet.columns:
            yield _problem(f"{file}: {no_column(sheet, name)}")


def _needed_columns(sheet: Sheet) -> tuple[str, ...]:
    return (*_NEEDED_COLUMNS, *(() if "profile" in sheet.columns else _NEEDED_WITHOUT_PROFILE))


def _nameless_rows(file: str, sheet: Sheet) -> Iterator[Problem]:
    if not sheet.rows:
        yield _problem(f"{file}: has a header but no row; write one row a stage and opening")
    for number, cells in sheet.rows:
        for column in ("stage", "opening"):
            if column not in cells:
                yield _problem(f"{file} row {number}: {column} is empty; every row names its stage and its opening")


def _rows_by_stage(sheet: Sheet) -> list[list[_Row]]:
    rows = [
        _Row(
            number=number,
            stage=str(_value("stage", cells["stage"], sheet.decimal_comma)),
            opening=str(_value("opening", cells["opening"], sheet.decimal_comma)),
            cells={
                column: _Cell(
                    value=_value(column, cell, sheet.decimal_comma),
                    row=number,
                    is_date=column in _TIME_COLUMNS and isinstance(cell, date),
                )
                for column, cell in cells.items()
                if column not in ("stage", "opening")
            },
        )
        for number, cells in sheet.rows
        if "stage" in cells and "opening" in cells
    ]
    return [list(group) for _, group in groupby(rows, key=lambda row: row.stage)]


def _value(column: str, cell: Any, decimal_comma: bool) -> Any:
    """Return a cell as TOML would give it; None for a dash."""
    if cell == _NOTHING:
        return None
    if column in _TEXT_COLUMNS:
        return text_cell(cell)
    return time_cell(cell) if column in _TIME_COLUMNS else number_cell(cell, decimal_comma)


def _scattered_stages(file: str, groups: list[list[_Row]]) -> Iterator[Problem]:
    seen: set[str] = set()
    for rows in groups:
        if rows[0].stage in seen:
            message = f'{file} row {rows[0].number}: stage "{rows[0].stage}" stands further up too'
            yield _problem(f"{message}; keep the rows of a stage together")
        seen.add(rows[0].stage)


def _disagreeing_cells(file: str, rows: list[_Row]) -> Iterator[Problem]:
    for column in _STAGE_COLUMNS:
        given = [row.cells[column] for row in rows if column in row.cells]
        for cell in given[1:]:
            if cell.value != given[0].value:
                message = f"{file} row {cell.row}: {column} is {found(cell.value)}"
                yield _problem(f"{message}, but row {given[0].row} of the same stage has {found(given[0].value)}")


def _stage_cells(rows: list[_Row], before: Mapping[str, _Cell]) -> dict[str, _Cell]:
    """Return start, end and sources of a stage; sources that no row gives are those of the stage before."""
    own = {column: row.cells[column] for column in _STAGE_COLUMNS for row in reversed(rows) if column in row.cells}
    return {column: cell for column, cell in before.items() if column not in _TIME_COLUMNS} | own


def _opening_cells(row: _Row, before: Mapping[str, _Cell], choices: Choices) -> dict[str, _Cell]:
    """Return what holds for an opening: its own cells, and for empty ones those of when it last stood in a stage.

    A relation and given series stand instead of each other, and so do a profile and a width: writing one takes over
    none of the others. Numbers are taken over for the relation that holds.
    """
    own = {column: cell for column, cell in row.cells.items() if column not in _STAGE_COLUMNS}
    taken = {column: cell for column, cell in before.items() if column not in own}
    instead_of = set(_FLOW_COLUMNS) if any(column in own for column in _FLOW_COLUMNS) else set()
    for shape, others in _INSTEAD_OF.items():
        if shape in own and own[shape].value is not None:
            instead_of.update(others)
    taken = {column: cell for column, cell in taken.items() if column not in instead_of}
    relation = (taken | own).get("relation")
    wanted = choices.relations.get(str(relation.value), ()) if relation is not None else ()
    dropped = set(_number_names(choices)) - {number.name for number in wanted}
    return {column: cell for column, cell in taken.items() if column not in dropped} | own


def _unclear_movements(
    file: str, row: _Row, cells: Mapping[str, _Cell], before: Mapping[str, _Cell]
) -> Iterator[Problem]:
    """Return empty cells that would move a crest or a width which the table does not plainly order to move."""
    for start, end in _MOVING:
        at_end = cells.get(end)
        if at_end is None or at_end.value is None or start not in cells:
            continue
        moves = at_end.value != cells[start].value
        if moves and cells[start].row != row.number and before.get(end) is not None:
            message = f"{file} row {row.number}: {start} is empty after a stage in which it moved"
            yield _problem(f"{message}; write the value that this stage starts with")
        elif moves and at_end.row != row.number:
            message = f"{file} row {row.number}: {end} is empty and would be {found(at_end.value)} of row {at_end.row}"
            yield _problem(f"{message}; write the value that this stage ends with, or a dash where it does not move")


def _values(cells: Mapping[str, _Cell]) -> dict[str, Any]:
    return {column: cell.value for column, cell in cells.items() if cell.value is not None}


def _marks(file: str, path: KeyPath, name_column: str, number: int, cells: Mapping[str, _Cell]) -> dict[KeyPath, Mark]:
    marks = {
        path: Mark(file=file, unit="row", number=number),
        (*path, "name"): Mark(file=file, unit="row", number=number, detail=f", {name_column}"),
    }
    for column, cell in cells.items():
        taken = "" if cell.row >= number else f" (taken over from row {cell.row})"
        detail = " (a date cell has no offset: write text)" if cell.is_date else taken
        marks[*path, column] = Mark(file=file, unit="row", number=max(cell.row, number), detail=f", {column}{detail}")
    return marks
