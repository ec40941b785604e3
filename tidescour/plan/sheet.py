"""A table of text or of a spreadsheet as rows of cells; what the cells mean is no matter here."""

from __future__ import annotations

import csv
import io
import re
import warnings
from collections.abc import Iterator
from contextlib import closing
from dataclasses import dataclass
from itertools import dropwhile
from pathlib import Path
from typing import Any

from tidescour.errors import PlanError
from tidescour.plan.problems import found, listed

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


def is_there(path: Path) -> bool:
    """Tell whether there is a file or folder of that name."""
    try:
        return path.exists()
    except OSError:  # a name that is too long for any file
        return False


def not_there(path: Path) -> str:
    """Return the words for a file that is not there."""
    return f"{found(path.name)}: no such file in {path.parent}"


def no_column(sheet: Sheet, *names: str) -> str:
    """Return the words for a table in which none of these columns stands."""
    return f"has no column {listed(names)}; it has {listed(sheet.columns).replace(' or ', ' and ')}"


def read_sheet(path: Path) -> Sheet:
    """Read a ``.csv`` or ``.xlsx`` file.

    Parameters
    ----------
    path : Path
        Text (UTF-8; comma, semicolon or tab) or workbook, of which the first sheet is read. Empty rows are passed
        over, and so are rows above the header whose first cell begins with ``#``, and the ``sep=;`` that spreadsheet
        programs put first into a text file.

    Returns
    -------
    Sheet
        Cells of text without blanks around them.

    Raises
    ------
    PlanError
        If the file cannot be read, is of another kind, without header, with two columns of one name, with rows that
        are longer or shorter than the header (every such row is named), or with a formula that has no value.
    """
    delimiter = ""
    match path.suffix.lower():
        case ".csv":
            delimiter, text = _delimited(_utf8(path))
            cells = _text_cells(path.name, text, delimiter)
        case ".xlsx":
            cells = _workbook_cells(path)
        case _:
            raise PlanError(f"{path.name}: needs a file that ends in .csv or .xlsx")
    filled = [(number, row) for number, row in enumerate(cells, start=1) if any(cell is not None for cell in row)]
    table = list(dropwhile(lambda item: _is_comment(item[1]), filled))
    if not table:
        raise PlanError(f"{path.name}: is empty; needs a header row with the names of columns")
    columns = _columns(path.name, *table[0])
    if wrong := [problem for number, row in table[1:] for problem in _row_problems(path.name, number, row, columns)]:
        raise PlanError(*wrong)
    return Sheet(
        columns=columns,
        rows=tuple((number, _named(row, columns)) for number, row in table[1:]),
        decimal_comma=delimiter in (";", "\t"),
    )


def _utf8(path: Path) -> str:
    try:
        return path.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError:
        raise PlanError(f"{path.name}: is not UTF-8 text; save it as CSV UTF-8") from None
    except OSError as error:
        raise PlanError(f"{path.name}: cannot be read: {error.strerror}") from None


def _delimited(text: str) -> tuple[str, str]:
    """Return the delimiter of a text and its rows: what ``sep=`` says, or else what stands most in the header."""
    if told := re.match(r"sep=([,;\t])\r?\n", text, re.IGNORECASE):
        return told[1], text[told.end() :]
    starts = ((line, line.lstrip(' "' + "".join(_DELIMITERS))) for line in text.splitlines())
    header = next((line for line, start in starts if start and not start.startswith("#")), "")
    return max(_DELIMITERS, key=header.count), text


def _is_comment(row: list[Any]) -> bool:
    return str(next(cell for cell in row if cell is not None)).startswith("#")


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
            with closing(openpyxl.load_workbook(path, read_only=True, data_only=data_only)) as book:
                sheets = [list(sheet.iter_rows(values_only=True)) for sheet in book.worksheets[:1]]
        except Exception as error:  # a damaged workbook makes openpyxl fail in a dozen ways
            message = f"{path.name}: is not a workbook that can be read: {type(error).__name__}: {error}"
            raise PlanError(f"{message}; open it in a spreadsheet program and save it anew") from None
    if not sheets:
        raise PlanError(f"{path.name}: has no sheet with cells; write the table into the first sheet")
    return [[_stripped(cell) for cell in row] for row in sheets[0]]


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


def _row_problems(file: str, number: int, row: list[Any], columns: tuple[str, ...]) -> Iterator[str]:
    extra = [cell for cell in row[len(columns) :] if cell is not None]
    if extra:
        yield f"{file} row {number}: {found(extra[0])} stands beyond the {len(columns)} columns of the header"
    elif len(row) < len(columns):
        yield f"{file} row {number}: has {len(row)} cells where the header has {len(columns)}"


def _named(row: list[Any], columns: tuple[str, ...]) -> dict[str, Any]:
    return {name: cell for name, cell in zip(columns, row, strict=False) if cell is not None}
