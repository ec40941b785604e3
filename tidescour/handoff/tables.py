"""Tables of results as records, and how they are written as CSV."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from tidescour.handoff.columns import Column
from tidescour.units import FloatArray, datetime64_utc, read_only

SIGNIFICANT_DIGITS = 12


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ResultTable:
    """A table of results, column by column.

    Parameters
    ----------
    name : str
        Name of the file without its ending.
    columns : tuple of Column
        Headings and kinds.
    values : tuple of sequence
        One a column, all of one length: text as strings, times as seconds since 1970, counts as whole numbers,
        numbers as floats; NaN for an empty cell.
    """

    name: str
    columns: tuple[Column, ...]
    values: tuple[Any, ...]

    def __post_init__(self) -> None:
        """Check lengths and cells; keep read-only copies."""
        if len(self.values) != len(self.columns):
            raise ValueError(f"{self.name}: {len(self.values)} columns of values under {len(self.columns)} headings")
        kept = tuple(_kept(self.name, column, cells) for column, cells in zip(self.columns, self.values, strict=True))
        object.__setattr__(self, "values", kept)
        if len({len(cells) for cells in kept}) > 1:
            raise ValueError(f"{self.name}: columns differ in length")

    def __len__(self) -> int:
        """Return the number of rows."""
        return len(self.values[0])

    def column(self, name: str) -> Any:
        """Return the cells under a heading."""
        return self.values[[column.name for column in self.columns].index(name)]


def _kept(table: str, column: Column, cells: Sequence[Any] | FloatArray) -> Any:
    if column.kind == "text":
        return tuple(str(cell) for cell in cells)
    if column.kind == "count":
        counts = np.array(cells, dtype=np.int64)
        counts.flags.writeable = False
        return counts
    numbers = read_only(cells)
    empty = np.isnan(numbers)
    if np.any(np.isinf(numbers)) or (np.any(empty) and not column.may_be_empty):
        row = int(np.flatnonzero(~np.isfinite(numbers))[0])
        raise ValueError(f"{table}: {column.name} is {numbers[row]} in row {row + 1}")
    return numbers


def table_from_rows(name: str, columns: tuple[Column, ...], rows: Iterable[tuple[Any, ...]]) -> ResultTable:
    """Return a table from rows of cells; no rows give the headings alone."""
    values = tuple(zip(*rows, strict=True)) or tuple(() for _ in columns)
    return ResultTable(name=name, columns=columns, values=values)


def utc_texts(time_s: FloatArray) -> list[str]:
    """Return seconds since 1970 as texts like ``2027-04-01T00:10:00Z``, milliseconds only where there are any."""
    texts: list[str] = np.datetime_as_string(datetime64_utc(time_s), unit="ms").tolist()
    return [(text[:-4] if text.endswith(".000") else text) + "Z" for text in texts]


def _times(time_s: FloatArray, empty: str | None) -> list[str | None]:
    """Return seconds since 1970 as texts, and `empty` where NaN."""
    known = np.isfinite(time_s)
    texts: list[str | None] = [*utc_texts(np.where(known, time_s, 0.0))]
    return [text if is_known else empty for text, is_known in zip(texts, known.tolist(), strict=True)]


def csv_bytes(table: ResultTable) -> bytes:
    r"""Return a table as CSV: UTF-8, ``\n``, a point for decimals, 12 significant digits, empty where NaN.

    A row is a line: line breaks inside a text are written as one space. Text with commas or quotes is quoted.
    """
    stream = io.StringIO(newline="")
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(column.name for column in table.columns)
    cells = (_csv_cells(column, values) for column, values in zip(table.columns, table.values, strict=True))
    writer.writerows(zip(*cells, strict=True))
    return stream.getvalue().encode("utf-8")


def _csv_cells(column: Column, values: Any) -> list[Any]:
    if column.kind == "text":
        return [" ".join(text.splitlines()) for text in values]
    if column.kind == "time":
        return _times(values, "")
    if column.kind == "count":
        counts: list[int] = values.tolist()
        return counts
    # Adding zero turns -0.0 into 0.0.
    return ["" if number != number else f"{number:.{SIGNIFICANT_DIGITS}g}" for number in (values + 0.0).tolist()]


def row_objects(table: ResultTable) -> list[dict[str, Any]]:
    """Return a table as one dict a row for JSON: full digits, None for an empty cell, times as UTC text."""
    names = [column.name for column in table.columns]
    cells = (_json_cells(column, values) for column, values in zip(table.columns, table.values, strict=True))
    return [dict(zip(names, row, strict=True)) for row in zip(*cells, strict=True)]


def _json_cells(column: Column, values: Any) -> list[Any]:
    if column.kind == "text":
        return list(values)
    if column.kind == "time":
        return _times(values, None)
    if column.kind == "count":
        counts: list[int] = values.tolist()
        return counts
    return [None if number != number else number for number in (values + 0.0).tolist()]
