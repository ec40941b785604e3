"""A table of text or of a spreadsheet as rows of cells; what the cells mean is no matter here."""

from __future__ import annotations

import csv
import io
import warnings
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from zipfile import BadZipFile

from tidescour.errors import PlanError
from tidescour.plan.problems import found

_DELIMITERS = (",", ";", "\t")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Sheet:
    """A table with one header row.

    Parameters
    ----------
    columns : tuple of str
        Names in the header, without blanks around them; no two alike.
    rows : tuple of (int, dict)
        Number of the row as a spreadsheet shows it, and its cells that are not empty, by column.
    decimal_comma : bool
        Whether a comma in a number is its decimal sign: a text file that is not separated by commas.
    """

    columns: tuple[str, ...]
    rows: tuple[tuple[int, dict[str, Any]], ...]
    decimal_comma: bool


def read_sheet(path: Path) -> Sheet:
    """Read a ``.csv`` or ``.xlsx`` file.

    Parameters
    ----------
    path : Path
        Text (UTF-8; comma, semicolon or tab) or workbook, of which the first sheet is read.

    Returns
    -------
    Sheet
        Cells of text without blanks around them.

    Raises
    ------
    PlanError
        If the file is not there, of another kind, without header, with two columns of one name, with a row that is
        longer or shorter than the header, or with a formula that has no value.
    """
    if not path.is_file():
        raise PlanError(f"{path.name}: no such file in {path.parent}")
    delimiter = ""
    match path.suffix.lower():
        case ".csv":
            text = _utf8(path)
            delimiter = max(_DELIMITERS, key=text.partition("\n")[0].count)
            cells = _text_cells(path.name, text, delimiter)
        case ".xlsx":
            cells = _workbook_cells(path)
        case _:
            raise PlanError(f"{path.name}: needs a file that ends in .csv or .xlsx")
    filled = [(number, row) for number, row in enumerate(cells, start=1) if any(cell is not None for cell in row)]
    if not filled:
        raise PlanError(f"{path.name}: is empty; needs a header row with the names of columns")
    columns = _columns(path.name, *filled[0])
    return Sheet(
        columns=columns,
        rows=tuple((number, _named(path.name, number, row, columns)) for number, row in filled[1:]),
        decimal_comma=delimiter in (";", "\t"),
    )


def _utf8(path: Path) -> str:
    try:
        return path.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError:
        raise PlanError(f"{path.name}: is not UTF-8 text; save it as CSV UTF-8") from None
    except OSError as error:
        raise PlanError(f"{path.name}: cannot be read: {error.strerror}") from None


def _text_cells(file: str, text: str, delimiter: str) -> list[list[Any]]:
    try:
        rows = list(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True))
    except csv.Error as error:
        raise PlanError(f"{file}: is not a table: {error}") from None
    return [[cell.strip() or None for cell in row] for row in rows]


def _workbook_cells(path: Path) -> list[list[Any]]:
    values = _first_sheet(path, data_only=True)
    formulas = _first_sheet(path, data_only=False)
    for number, (row, written) in enumerate(zip(values, formulas, strict=True), start=1):
        for cell, formula in zip(row, written, strict=True):
            if cell is None and formula is not None:
                message = f"{path.name} row {number}: the formula {formula} has no value"
                raise PlanError(f"{message}; open the file in a spreadsheet program and save it")
    return values


def _first_sheet(path: Path, *, data_only: bool) -> list[list[Any]]:
    import openpyxl  # takes longer to import than a plan takes to read

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of what a workbook has besides cells
        try:
            book = openpyxl.load_workbook(path, read_only=True, data_only=data_only)
        except (BadZipFile, KeyError, ValueError, OSError) as error:
            raise PlanError(f"{path.name}: is not a workbook that can be read: {error}") from None
        try:
            return [[_stripped(cell) for cell in row] for row in book.worksheets[0].iter_rows(values_only=True)]
        finally:
            book.close()


def _stripped(cell: Any) -> Any:
    return (cell.strip() or None) if isinstance(cell, str) else cell


def _columns(file: str, number: int, header: list[Any]) -> tuple[str, ...]:
    names = [str(name) if name is not None else "" for name in header]
    while names and not names[-1]:
        names.pop()
    for position, name in enumerate(names):
        if not name:
            raise PlanError(f"{file} row {number}: column {position + 1} has no name")
        if name in names[:position]:
            raise PlanError(f'{file} row {number}: two columns are named "{name}"')
    return tuple(names)


def _named(file: str, number: int, row: list[Any], columns: tuple[str, ...]) -> dict[str, Any]:
    extra = [cell for cell in row[len(columns) :] if cell is not None]
    if extra:
        message = f"{file} row {number}: {found(extra[0])} stands beyond the {len(columns)} columns of the header"
        raise PlanError(message)
    if len(row) < len(columns):
        raise PlanError(f"{file} row {number}: has {len(row)} cells where the header has {len(columns)}")
    return {name: cell for name, cell in zip(columns, row, strict=False) if cell is not None}
