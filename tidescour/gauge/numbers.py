"""From the text of values to numbers: missing words, decimal commas, odd characters, unlisted missing values."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding, RecordError
from tidescour.units import FloatArray

NUMBER: Final = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?", re.ASCII)
COMMA_NUMBER: Final = re.compile(r"[+-]?\d+,\d+", re.ASCII)
MISSING_WORDS: Final = frozenset({"", "na", "n/a", "nan", "null", "none"})
INFINITE_WORDS: Final = frozenset({"inf", "+inf", "-inf", "infinity", "+infinity", "-infinity"})
ODD_CHARACTERS: Final = str.maketrans({"\u2212": "-", "\u2013": "-", "\u00a0": None, "\u2009": None, "\u202f": None})
"""Minus and dash as printers set them; blanks that spreadsheets put between thousands."""

SENTINEL_SPREADS: Final = 10.0
NINES_SPREADS: Final = 3.0
SENTINEL_REPEATS: Final = 3
SENTINEL_JUMP: Final = 0.8


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


def read_numbers(cells: Sequence[str], lines: NDArray[np.int64], *, comma_delimited: bool, where: str) -> Numbers:
    """Read a column of values.

    Parameters
    ----------
    cells : sequence of str
        Text of each value, blanks at both ends cut.
    lines : (n,) array of int
        Line of each, for messages.
    comma_delimited : bool
        The file is separated by commas, so that a comma inside a number is not taken for a decimal one.
    where : str
        Name for messages.

    Returns
    -------
    Numbers
        In the order of `cells`.

    Raises
    ------
    RecordError
        If a cell is neither a number nor one of the usual words for none, with the count of each such text.
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
        notes.append(("decimal-comma", f"decimal commas read on {len(commas)} rows, first {cells[commas[0]]!r}"))
    if repaired:
        notes.append(("odd-characters", f"printed minus signs or narrow blanks in numbers on {repaired} rows"))
    value = np.array(text, dtype=np.float64)
    infinite |= np.isinf(value)
    value[infinite] = np.nan
    if infinite.any():
        first = int(np.argmax(infinite))
        message = f"infinite numbers on {int(infinite.sum())} rows, flagged 4, first line {lines[first]}"
        notes.append(("infinite-values", message))
    findings = tuple(Finding(severity="note", code=code, where=where, message=message) for code, message in notes)
    return Numbers(value=value, infinite=infinite, findings=findings)


def _refusal(cells: Sequence[str], refused: list[int], lines: NDArray[np.int64], where: str) -> str:
    counts = Counter(cells[i] for i in refused).most_common(5)
    tokens = ", ".join(f"{token!r} on {count} rows" for token, count in counts)
    more = len({cells[i] for i in refused}) - len(counts)
    return (
        f"{where} line {lines[refused[0]]}: {cells[refused[0]]!r} is no number. Found: {tokens}"
        f"{f' and {more} other texts' if more > 0 else ''}. Leave the cell empty or write NaN where a value is missing"
    )


def unlisted_missing_values(value: FloatArray, *, nines_only: bool) -> list[float]:
    """Values that stand for "missing" though the plan does not list them.

    A candidate is the largest or smallest number of the column. It must lie far from the middle of the others (10
    times what holds 90 % of them; 3 times for numbers of nines only, such as -99.99 or 9999), come at least three
    times (nines: once), and be reached and left in one jump: a flood that stays at its peak is none.

    Parameters
    ----------
    value : (n,) array
        Numbers as read, in file order; NaN is left out.
    nines_only : bool
        Look for numbers of nines only (discharges and velocities may rest at one value and burst to another).

    Returns
    -------
    list of float
        In the order found, often empty.

    References
    ----------
    Common practice, no source.
    """
    left = value[np.isfinite(value)]
    found: list[float] = []
    while left.size:
        candidates = [float(extreme) for extreme in (left.min(), left.max())]
        hit = next((c for c in candidates if _stands_for_missing(c, left, nines_only=nines_only)), None)
        if hit is None:
            break
        found.append(hit)
        left = left[left != hit]
    return found


def _stands_for_missing(candidate: float, value: FloatArray, *, nines_only: bool) -> bool:
    here = value == candidate
    others = value[~here]
    nines = set(f"{abs(candidate):.10g}".replace(".", "")) == {"9"} and abs(candidate) > 9.0
    if others.size < 3 or not (nines or (not nines_only and here.sum() >= SENTINEL_REPEATS)):
        return False
    low, middle, high = np.quantile(others, (0.05, 0.5, 0.95))
    distance = abs(candidate - middle)
    if not 0.0 < (NINES_SPREADS if nines else SENTINEL_SPREADS) * (high - low) < distance:
        return False
    edge = here[1:] != here[:-1]
    jumps = np.abs(np.diff(value))[edge]
    return bool(np.all(jumps >= SENTINEL_JUMP * distance))
