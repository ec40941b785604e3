"""Columns of numbers out of a table that a plan names."""

from __future__ import annotations

import math
from dataclasses import dataclass

from tidescour.errors import PlanError
from tidescour.plan.cells import number_cell
from tidescour.plan.problems import found
from tidescour.plan.sheet import Sheet, no_column


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class NumberTable:
    """Rows of finite numbers.

    Parameters
    ----------
    row : tuple of int
        Number of each row as a spreadsheet shows it.
    values : tuple of tuple of float
        The numbers of each row, in the order of the columns asked for.
    """

    row: tuple[int, ...]
    values: tuple[tuple[float, ...], ...]


def number_table(file: str, sheet: Sheet, columns: tuple[str, ...]) -> NumberTable:
    """Return columns of numbers; other columns are passed over.

    Parameters
    ----------
    file : str
        Name for messages.
    sheet : Sheet
        As read.
    columns : tuple of str
        Columns that must be there, and filled with numbers in every row.

    Returns
    -------
    NumberTable
        In the order of the file.

    Raises
    ------
    PlanError
        With every problem by file and row: a column that is missing, no row, an empty cell, anything that is not a
        finite number.
    """
    if missing := [name for name in columns if name not in sheet.columns]:
        raise PlanError(*(f"{file}: {no_column(sheet, name)}" for name in missing))
    if not sheet.rows:
        raise PlanError(f"{file}: has a header but no row")
    wrong: list[str] = []
    values: list[tuple[float, ...]] = []
    for number, cells in sheet.rows:
        row = tuple(number_cell(cells.get(name), sheet.decimal_comma) for name in columns)
        for name, cell in zip(columns, row, strict=True):
            if not _is_finite(cell):
                what = "is empty" if cell is None else f"found {found(cell)}"
                wrong.append(f"{file} row {number}: {name}: {what}; needs a finite number")
        values.append(row)
    if wrong:
        raise PlanError(*wrong)
    return NumberTable(
        row=tuple(number for number, _ in sheet.rows),
        values=tuple(tuple(float(cell) for cell in row) for row in values),
    )


def _is_finite(cell: object) -> bool:
    return isinstance(cell, int | float) and not isinstance(cell, bool) and math.isfinite(cell)
