"""The layout ``columns``: a table with one or two columns of stamps and one of values."""

from __future__ import annotations

import re
from collections import Counter
from itertools import pairwise
from typing import Final

import numpy as np

from tidescour.errors import Finding, RecordError
from tidescour.gauge.numbers import COMMA_NUMBER, is_number, read_numbers
from tidescour.gauge.raw import RawColumns, Reading
from tidescour.gauge.records import FAIL, MISSING, NOT_EVALUATED
from tidescour.gauge.stamps import clock_readings, utc_stamps
from tidescour.gauge.tables import DELIMITERS, MOST_LINES_BEFORE_HEADER, RawTable, column_position, read_table
from tidescour.gauge.wording import counted
from tidescour.plan.models import Column

MOST_FOOTER_ROWS: Final = 5
MOST_ROWS_UNDER_HEADER: Final = 2
UNIT_WORDS: Final = {
    "m": "m",
    "metre": "m",
    "metres": "m",
    "meter": "m",
    "meters": "m",
    "cm": "cm",
    "centimetre": "cm",
    "centimetres": "cm",
    "centimeter": "cm",
    "centimeters": "cm",
    "mm": "mm",
    "millimetre": "mm",
    "millimetres": "mm",
    "millimeter": "mm",
    "millimeters": "mm",
    "ft": "ft",
    "feet": "ft",
    "foot": "ft",
    "m3/s": "m3/s",
    "m³/s": "m3/s",
    "m^3/s": "m3/s",
    "m/s": "m/s",
}
UNITS_WITHOUT_THOUSANDS: Final = ("m", "ft", "m/s")
"""A thousand of these is no level and no velocity."""
BRACKETED: Final = re.compile(r".*[\[(]\s*([^\s\])]+)[^\])]*[\])]")
"""A name with brackets at its end, and the first word in them."""
SUFFIXED: Final = re.compile(r".*_(cm|mm|ft|m)", re.IGNORECASE)


def read_columns(text: str, reading: Reading) -> RawColumns:
    """Read a table of stamps and values.

    Comment lines before the header, a row of units under it, the header repeated further down, an empty last column
    and up to five rows without a stamp at the end are left out, each with a note; a last row cut short likewise.

    Parameters
    ----------
    text : str
        The file, lines ended by a newline.
    reading : Reading
        Columns, format of the stamps, unit.

    Returns
    -------
    RawColumns
        In file order and in the unit of the file.

    Raises
    ------
    RecordError
        If columns are not found, rows differ in their number of cells, or a stamp or a value cannot be read.
    """
    where = reading.where
    keys = _time_columns(reading)
    table = read_table(text, where, [*keys, reading.value])
    if not table.rows:
        raise RecordError(f"{where}: a header and no row; give a file that holds a record")
    times = [column_position(key, table, "time", where) for key in keys]
    value = column_position(reading.value, table, reading.value_key, where)
    if value in times:
        raise RecordError(f"{where}: column {reading.value!r} is taken for the stamps and for the values")
    findings = list(table.findings)
    rows, lines = table.rows, table.lines
    if table.header is not None:
        findings += _header_unit(table.header[value], reading)
        kept = [i for i, row in enumerate(rows) if tuple(row) != table.header]
        if len(kept) < len(rows):
            findings.append(
                _note(where, "repeated-header", f"the header came {counted(len(rows) - len(kept), 'time')} more")
            )
            rows, lines = [rows[i] for i in kept], [lines[i] for i in kept]
    above = _rows_without_stamp(rows[: _most_above(table) + 1], times, reading)
    if 0 < above < min(len(rows), _most_above(table) + 1):
        findings += _above_the_data(rows[:above], lines, value, table, reading)
        rows, lines = rows[above:], lines[above:]
    below = _rows_without_stamp(rows[: -MOST_FOOTER_ROWS - 2 : -1], times, reading)
    if 0 < below <= min(MOST_FOOTER_ROWS, len(rows) - 1):
        findings.append(_below_the_data(rows[-below:], lines[-below:], times, value, reading))
        rows, lines = rows[:-below], lines[:-below]
    elif not table.complete and _cut_short(rows, value):
        findings.append(_note(where, "cut-short", f"line {lines[-1]} is cut short and was left out: {rows[-1]}"))
        rows, lines = rows[:-1], lines[:-1]
    findings += _check_widths(rows, lines, table, value, reading)
    line = np.array(lines, dtype=np.int64)
    stamps = utc_stamps([" ".join(row[i] for i in times) for row in rows], line, reading)
    numbers = read_numbers(
        [row[value] for row in rows],
        line,
        comma_delimited=table.delimiter == ",",
        thousands=reading.unit not in UNITS_WITHOUT_THOUSANDS,
        where=where,
    )
    flag = np.where(np.isnan(numbers.value), np.where(numbers.infinite, FAIL, MISSING), NOT_EVALUATED).astype(np.int8)
    return RawColumns(
        time_s=stamps.time_s,
        value=numbers.value,
        flag=flag,
        line=line,
        findings=(*findings, *stamps.findings, *numbers.findings),
    )


def _time_columns(reading: Reading) -> list[Column]:
    time = reading.clock.time
    return list(time) if isinstance(time, tuple) else [time]


def _most_above(table: RawTable) -> int:
    return MOST_LINES_BEFORE_HEADER if table.header is None else MOST_ROWS_UNDER_HEADER


def _rows_without_stamp(rows: list[list[str]], times: list[int], reading: Reading) -> int:
    """How many of the first rows given carry no stamp."""
    cells = [" ".join(row[i] for i in times) if max(times) < len(row) else "" for row in rows]
    if not cells:
        return 0
    stamped = np.isfinite(clock_readings(cells, reading.clock.time_format, reading.where).local_s)
    return int(np.argmax(stamped)) if stamped.any() else len(cells)


def _above_the_data(
    rows: list[list[str]], lines: list[int], value: int, table: RawTable, reading: Reading
) -> list[Finding]:
    """Rows of units under the header; where columns are given by position, all that stands above the first stamp."""
    findings = []
    for row, line in zip(rows, lines, strict=False):
        cell = row[value] if value < len(row) else ""
        unit = UNIT_WORDS.get(cell.strip("[]() ").lower())
        if unit is not None and unit != reading.unit:
            raise RecordError(
                f'{reading.where} line {line}: the row of units says {cell!r}, the plan unit = "{reading.unit}"; '
                f'write unit = "{unit}" in [{reading.table}] if the file is right'
            )
        if unit is None and table.header is not None:
            raise RecordError(
                f"{reading.where} line {line}: the row under the header has no stamp of time_format = "
                f"{reading.clock.time_format!r} and no unit: {' '.join(row)[:80]!r}; correct the format or take it out"
            )
        if unit is None and is_number(cell):
            raise RecordError(_value_without_stamp(row, line, cell, reading))
        code = "header-row" if unit is None else "unit-row"
        findings.append(_note(reading.where, code, f"line {line} is no measurement: {' '.join(row)[:80]}"))
    return findings


def _below_the_data(rows: list[list[str]], lines: list[int], times: list[int], value: int, reading: Reading) -> Finding:
    """Rows at the end that are no measurements: no value, or beside it words without a digit, such as "Average"."""
    for row, line in zip(rows, lines, strict=True):
        cell = row[value] if value < len(row) else ""
        stamp = " ".join(row[i] for i in times if i < len(row))
        if is_number(cell) and (not stamp or re.search(r"\d", stamp)):
            raise RecordError(_value_without_stamp(row, line, cell, reading))
    text = "; ".join(" ".join(row)[:40] for row in rows)
    return _note(reading.where, "footer", f"{counted(len(rows), 'row')} without a stamp at the end left out: {text}")


def _value_without_stamp(row: list[str], line: int, cell: str, reading: Reading) -> str:
    return (
        f"{reading.where} line {line}: a value {cell!r} without a stamp of time_format = "
        f"{reading.clock.time_format!r}: {' '.join(row)[:80]!r}; mend the stamp, or take the row out"
    )


def _header_unit(name: str, reading: Reading) -> list[Finding]:
    """Warn of a unit in the name of the column, in brackets or as a suffix, that is not the plan's or not known."""
    found = BRACKETED.fullmatch(name) or SUFFIXED.fullmatch(name)
    unit = UNIT_WORDS.get(found[1].lower(), "") if found else reading.unit
    if unit == reading.unit:
        return []
    doubt = "" if unit else ", which is no unit known here"
    text = f'the header says {name!r}{doubt}; the plan, unit = "{reading.unit}", was followed: is it right?'
    return [Finding(severity="warning", code="unit-in-header", where=reading.where, message=text)]


def _cut_short(rows: list[list[str]], value: int) -> bool:
    """Whether a last row without a line end lost cells, or digits of the value where that ends the row."""
    if len(rows) < 3:
        return False
    last, before = rows[-1], rows[-1000:-1]
    usual = Counter(map(len, before)).most_common(1)[0][0]
    if len(last) != usual or value != usual - 1:
        return len(last) < usual
    return _decimals(last[value]) < min(_decimals(row[value]) for row in before if len(row) == usual)


def _decimals(cell: str) -> int:
    return len(re.split("[.,]", cell, maxsplit=1)[-1]) if re.search("[.,]", cell) else -1


def _check_widths(
    rows: list[list[str]], lines: list[int], table: RawTable, value: int, reading: Reading
) -> list[Finding]:
    widths = np.array([len(row) for row in rows])
    width = len(table.header) if table.header is not None else int(np.bincount(widths).argmax())
    odd = np.flatnonzero(widths != width)
    if table.delimiter == "," and odd.size == 0 and table.header is None and value + 1 < width:
        _refuse_hidden_commas(rows, lines, value, reading)
    if odd.size == 0:
        return []
    if np.all(widths == width + 1) and not any(row[-1] for row in rows):
        return [_note(reading.where, "trailing-delimiter", "an empty cell at the end of every row left out")]
    first = int(odd[0])
    cells = " | ".join(rows[first])[:100]
    found = f"{len(rows[first])} cells where {width} are due: {cells!r} ({counted(odd.size, 'row')})"
    remedy = "mend or take out the row"
    if table.delimiter == "," and np.all(widths >= width) and _comma_pair(rows[first]):
        remedy = "it looks like decimal commas in a file separated by commas; export it with semicolons or points"
    elif table.delimiter == " ":
        remedy = "between blanks, date and time are two columns: give the header a name for each, or use positions"
    raise RecordError(
        f"{reading.where} line {lines[first]}: {found}, separated by {DELIMITERS[table.delimiter]}; {remedy}"
    )


def _comma_pair(row: list[str]) -> bool:
    return any(COMMA_NUMBER.fullmatch(f"{whole},{fraction}") for whole, fraction in pairwise(row))


def _refuse_hidden_commas(rows: list[list[str]], lines: list[int], value: int, reading: Reading) -> None:
    """Refuse levels in whole metres beside a column of digits: without a header nothing else tells of ``1,23``."""
    filled = [row for row in rows if row[value]]
    if reading.unit not in UNITS_WITHOUT_THOUSANDS or len(filled) < 3:
        return
    pairs = all(len(row[value + 1]) > 1 and COMMA_NUMBER.fullmatch(f"{row[value]},{row[value + 1]}") for row in filled)
    if pairs:
        raise RecordError(
            f"{reading.where} line {lines[0]}: whole numbers of {reading.unit} with digits in the next column "
            f"({','.join(rows[0])!r}): decimal commas in a comma-separated file; export it with semicolons or points"
        )


def _note(where: str, code: str, message: str) -> Finding:
    return Finding(severity="note", code=code, where=where, message=message)
