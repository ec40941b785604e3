"""From text to rows of cells: comment lines, delimiter, header, columns."""

from __future__ import annotations

import csv
import difflib
import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from tidescour.errors import Finding, RecordError
from tidescour.gauge.wording import counted
from tidescour.plan.models import Column

BLANKS: Final = " "
DELIMITERS: Final = {"\t": "tab", ";": "semicolon", ",": "comma", BLANKS: "blanks"}
"""In the order of preference where field counts leave a tie."""
MOST_LINES_BEFORE_HEADER: Final = 40
LONGEST_LINE: Final = 100_000
"""Characters; a longer line is no row of a table."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RawTable:
    """Rows of cells below the header, blank rows left out.

    Parameters
    ----------
    delimiter : str
        Tab, semicolon, comma, or a blank for any run of blanks.
    header : tuple of str or None
        Names as in the file, blanks at both ends cut; None where the file has none.
    rows : list of list of str
        Cells, blanks at both ends cut; not all of one length.
    lines : list of int
        Line of each row in the file, counted from 1.
    complete : bool
        The last line ends with a line end.
    findings : tuple of Finding
        What was left out.
    """

    delimiter: str
    header: tuple[str, ...] | None
    rows: list[list[str]]
    lines: list[int]
    complete: bool
    findings: tuple[Finding, ...] = ()


def read_table(text: str, where: str, wanted: Sequence[Column]) -> RawTable:
    """Split text into rows of cells.

    Parameters
    ----------
    text : str
        The file, lines ended by a newline.
    where : str
        Name for messages.
    wanted : sequence of str or int
        The columns that will be asked for; names tell the header from lines that stand above it.

    Returns
    -------
    RawTable
        With the delimiter that fits the header and most lines of the whole file.

    Raises
    ------
    RecordError
        If a line is far too long, no delimiter fits, a quoted cell does not end on its line, or there is no row.
    """
    names = [column for column in wanted if isinstance(column, str)]
    numbered = [(number, line) for number, line in enumerate(text.split("\n"), 1) if line.strip()]
    _refuse_long_lines(numbered, where)
    numbered = _below_comments(numbered, names)
    if not numbered:
        raise RecordError(f"{where}: no row but comment lines; give a file that holds a record")
    delimiter = _delimiter([line for _, line in numbered], names, where)
    rows, lines = _split(numbered, delimiter, where)
    header_row = _header_row(rows, names) if names else None
    notes = []
    if header_row is None and not names:
        body, header = 0, None
    else:
        header_row = header_row or 0
        body, header = header_row + 1, tuple(rows[header_row])
        if header_row:
            above = f"above the header {counted(header_row, 'line')} left out, from {delimiter.join(rows[0])[:60]!r}"
            notes.append(Finding(severity="note", code="lines-above-header", where=where, message=above))
    return RawTable(
        delimiter=delimiter,
        header=header,
        rows=rows[body:],
        lines=lines[body:],
        complete=text.endswith("\n"),
        findings=tuple(notes),
    )


def column_position(column: Column, table: RawTable, key: str, where: str) -> int:
    """0-based position of a column that the plan names, exactly or but for blanks around it.

    Raises
    ------
    RecordError
        If the name is not in the header, stands there twice, or the position is beyond the last column.
    """
    width = len(table.header) if table.header is not None else Counter(map(len, table.rows)).most_common(1)[0][0]
    if isinstance(column, int):
        if column >= width:
            raise RecordError(f"{where}: {key} = {column}, but columns are 0 to {width - 1} ({_listed(table)})")
        return column
    header = table.header or ()
    found = [position for position, name in enumerate(header) if name == column.strip()]
    if len(found) > 1:
        raise RecordError(
            f"{where}: the header has {column!r} {len(found)} times, as columns {found}; write {key} = {found[0]} "
            "or another position"
        )
    if not found:
        raise RecordError(
            f"{where}: {key} = {column!r} is not in the header{_nearest(column, header)} {_listed(table)}"
        )
    return found[0]


def _listed(table: RawTable) -> str:
    if table.header is None:
        return f"the file has no header and is separated by {DELIMITERS[table.delimiter]}"
    return f"The columns, separated by {DELIMITERS[table.delimiter]}, are: {', '.join(map(repr, table.header))}"


def _nearest(column: str, header: Sequence[str]) -> str:
    by_lower = {name.lower(): name for name in header}
    near = difflib.get_close_matches(column.strip().lower(), by_lower, n=1, cutoff=0.5)
    return f"; the nearest is {by_lower[near[0]]!r}." if near else "."


def _refuse_long_lines(numbered: list[tuple[int, str]], where: str) -> None:
    for number, line in numbered:
        if len(line) > LONGEST_LINE:
            raise RecordError(
                f"{where} line {number} has {len(line)} characters, from {line[:40]!r}; this is no table of rows: give "
                "a text file with one row a sample"
            )


def _below_comments(numbered: list[tuple[int, str]], names: list[str]) -> list[tuple[int, str]]:
    """Lines below the comments at the top; the last comment stays where it is the only header."""
    comments = 0
    while comments < len(numbered) and numbered[comments][1].lstrip().startswith("#"):
        comments += 1
    below = numbered[comments:]
    if not comments or not names or any(_names_all(line, names) for _, line in below[:MOST_LINES_BEFORE_HEADER]):
        return below
    number, comment = numbered[comments - 1]
    header = comment.lstrip().lstrip("#")
    return [(number, header), *below] if _names_all(header, names) else below


def _names_all(line: str, names: list[str]) -> bool:
    """Whether a line names all columns, whatever separates them."""
    return any(_header_row([_cells(line, delimiter)], names) is not None for delimiter in DELIMITERS)


def _delimiter(lines: list[str], names: list[str], where: str) -> str:
    """Delimiter that shows the header, and among those the one that gives most lines one and the same field count."""
    unquoted = [re.sub(r'"[^"]*"', "q", line) if '"' in line else line for line in lines]
    best, best_rank = None, (False, 0)
    for delimiter in DELIMITERS:
        counts = Counter(
            (len(line.split()) for line in unquoted)
            if delimiter == BLANKS
            else (line.count(delimiter) + 1 for line in unquoted)
        )
        usual, share = max(counts.items(), key=lambda pair: (pair[1], pair[0]))
        top = [_cells(line, delimiter) for line in lines[:MOST_LINES_BEFORE_HEADER]]
        shows_header = bool(names) and _header_row(top, names) is not None
        if usual < 2 and not shows_header:
            continue
        rank = (shows_header, share)
        if rank > best_rank:
            best, best_rank = delimiter, rank
    if best is None:
        raise RecordError(
            f"{where}: no delimiter (tab, semicolon, comma, blanks) splits the rows, such as {lines[0][:60]!r}; "
            "a record needs a column of stamps and one of values"
        )
    return best


def _cells(line: str, delimiter: str) -> list[str]:
    if delimiter == BLANKS:
        return line.split()
    return [cell.strip() for cell in next(csv.reader([line], delimiter=delimiter, skipinitialspace=True))]


def _header_row(rows: list[list[str]], names: list[str]) -> int | None:
    wanted = {name.strip() for name in names}
    for position, row in enumerate(rows[:MOST_LINES_BEFORE_HEADER]):
        if wanted <= set(row):
            return position
    return None


def _split(numbered: list[tuple[int, str]], delimiter: str, where: str) -> tuple[list[list[str]], list[int]]:
    """Cells of each row that has any, and the line of each."""
    if delimiter == BLANKS:
        return [line.split() for _, line in numbered], [number for number, _ in numbered]
    reader = csv.reader((line for _, line in numbered), delimiter=delimiter, skipinitialspace=True)
    rows: list[list[str]] = []
    lines: list[int] = []
    try:
        for (number, _), row in zip(numbered, reader, strict=False):
            if reader.line_num != len(lines) + 1:
                raise csv.Error("it runs over the line end")
            rows.append(row)
            lines.append(number)
    except csv.Error as fault:
        line_number = numbered[min(len(lines), len(numbered) - 1)][0]
        raise RecordError(f"{where} line {line_number}: a quoted cell that does not end ({fault})") from fault
    stripped = [[cell.strip() for cell in row] for row in rows]
    kept = [position for position, row in enumerate(stripped) if any(row)]
    return [stripped[position] for position in kept], [lines[position] for position in kept]
