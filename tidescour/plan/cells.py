"""Cells of a table as TOML would give them; what cannot be read stays as it is, for the rules to name."""

from __future__ import annotations

import re
from datetime import datetime
from typing import Any

_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_DECIMAL_COMMA = re.compile(r"([+-]?[0-9]+),([0-9]+)")
_PERHAPS_THOUSANDS = re.compile(r"[+-]?[1-9][0-9]{0,2}(?:,[0-9]{3})+")


def text_cell(cell: Any) -> str:
    """Return a cell as text; a number of a workbook without the ``.0`` that it does not show."""
    return cell if isinstance(cell, str) else f"{cell:g}" if isinstance(cell, float) else str(cell)


def time_cell(cell: Any) -> Any:
    """Return a text in ISO form as date and time."""
    if not isinstance(cell, str):
        return cell
    try:
        return datetime.fromisoformat(cell)
    except ValueError:
        return cell


def number_cell(cell: Any, decimal_comma: bool) -> Any:
    """Return a text that is a number as one.

    Where a comma is the decimal sign, one that may part thousands (``1,250``) is read as neither.
    """
    if not isinstance(cell, str):
        return cell
    if decimal_comma and not _PERHAPS_THOUSANDS.fullmatch(cell):
        cell = _DECIMAL_COMMA.sub(r"\1.\2", cell)
    return float(cell) if _NUMBER.fullmatch(cell) else cell
