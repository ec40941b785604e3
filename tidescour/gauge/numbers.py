"""From the text of values to numbers: missing words, decimal commas, odd characters."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding, RecordError
from tidescour.gauge.wording import counted
from tidescour.units import FloatArray

NUMBER: Final = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?", re.ASCII)
COMMA_NUMBER: Final = re.compile(r"[+-]?\d+,\d+", re.ASCII)
PERHAPS_THOUSANDS: Final = re.compile(r"[+-]?[1-9]\d{0,2}(?:,\d{3})+", re.ASCII)
MISSING_WORDS: Final = frozenset({"", "na", "n/a", "nan", "null", "none"})
INFINITE_WORDS: Final = frozenset({"inf", "+inf", "-inf", "infinity", "+infinity", "-infinity"})
ODD_CHARACTERS: Final = str.maketrans({"\u2212": "-", "\u2013": "-", "\u00a0": None, "\u2009": None, "\u202f": None})
"""Minus and dash as printers set them; blanks that spreadsheets put between thousands."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Numbers:
    """Values of a column.

    Parameters
    ----------
    value : (n,) array
        NaN where missing or infinite.
    infinite : (n,) bool array
        Where the file has an infinite number.
    findings : tuple of Finding
        What was put right.
    """

    value: FloatArray
    infinite: NDArray[np.bool_]
    findings: tuple[Finding, ...] = ()


def is_number(cell: str) -> bool:
    """Whether a cell holds a number in ASCII digits, with point or comma, or a word for none but the empty one."""
    text = cell.translate(ODD_CHARACTERS)
    if NUMBER.fullmatch(text) or COMMA_NUMBER.fullmatch(text):
        return True
    return bool(text) and text.lower() in MISSING_WORDS | INFINITE_WORDS


def read_numbers(
    cells: Sequence[str], lines: NDArray[np.int64], *, comma_delimited: bool, thousands: bool, where: str
) -> Numbers:
    """Read a column of values.

    Parameters
    ----------
    cells : sequence of str
        Text of each value, blanks at both ends cut.
    lines : (n,) array of int
        Line of each, for messages.
    comma_delimited : bool
        The file is separated by commas, so that a comma inside a number is not taken for a decimal one.
    thousands : bool
        Thousands are ordinary in this unit, so that ``4,950`` may be either; in metres it is a decimal comma.
    where : str
        Name for messages.

    Returns
    -------
    Numbers
        In the order of `cells`.

    Raises
    ------
    RecordError
        If a cell is neither a number nor one of the usual words for none, with the count of each such text; if commas
        may separate decimals or thousands.
    """
    text = list(cells)
    notes: list[tuple[str, str]] = []
    infinite = np.zeros(len(text), dtype=bool)
    odd = [i for i, cell in enumerate(text) if not NUMBER.fullmatch(cell)]
    repaired = 0
    commas, refused = [], []
    for i in odd:
        plain = text[i].translate(ODD_CHARACTERS)
        word = plain.lower()
        infinite[i] = word in INFINITE_WORDS
        if word in MISSING_WORDS or infinite[i]:
            text[i] = "nan"
        elif NUMBER.fullmatch(plain):
            text[i] = plain
            repaired += 1
        elif COMMA_NUMBER.fullmatch(plain) and not comma_delimited:
            text[i] = plain.replace(",", ".")
            commas.append(i)
        else:
            refused.append(i)
    if refused:
        raise RecordError(_refusal(cells, refused, lines, where))
    if commas:
        pointed = next((i for i, cell in enumerate(cells) if "." in cell), None)
        if pointed is not None:
            raise RecordError(
                f"{where}: line {lines[commas[0]]} has a comma in the number ({cells[commas[0]]!r}), line "
                f"{lines[pointed]} a point ({cells[pointed]!r}); export the column with one decimal sign"
            )
        if thousands and all(PERHAPS_THOUSANDS.fullmatch(cells[i].translate(ODD_CHARACTERS)) for i in commas):
            raise RecordError(
                f"{where} line {lines[commas[0]]}: the comma in {cells[commas[0]]!r} may separate decimals or "
                f"thousands ({counted(len(commas), 'row')}); export the column with points for decimals and "
                "nothing for thousands"
            )
        found = f"decimal commas read on {counted(len(commas), 'row')}, first {cells[commas[0]]!r}"
        notes.append(("decimal-comma", found))
    if repaired:
        found = f"printed minus signs or narrow blanks in numbers on {counted(repaired, 'row')}"
        notes.append(("odd-characters", found))
    value = np.array(text, dtype=np.float64)
    infinite |= np.isinf(value)
    value[infinite] = np.nan
    if infinite.any():
        first = int(np.argmax(infinite))
        message = f"infinite numbers on {counted(int(infinite.sum()), 'row')}, flagged 4, first line {lines[first]}"
        notes.append(("infinite-values", message))
    findings = tuple(Finding(severity="note", code=code, where=where, message=message) for code, message in notes)
    return Numbers(value=value, infinite=infinite, findings=findings)


def _refusal(cells: Sequence[str], refused: list[int], lines: NDArray[np.int64], where: str) -> str:
    counts = Counter(cells[i] for i in refused).most_common(5)
    tokens = ", ".join(f"{token!r} on {counted(count, 'row')}" for token, count in counts)
    more = len({cells[i] for i in refused}) - len(counts)
    remedy = "Leave the cell empty or write NaN where a value is missing"
    if any("," in cells[i] for i in refused):
        remedy = "Export the column with points for decimals and nothing for thousands"
    return (
        f"{where} line {lines[refused[0]]}: {cells[refused[0]]!r} is no number. Found: {tokens}"
        f"{' and ' + counted(more, 'other text') if more > 0 else ''}. {remedy}"
    )
