"""The methods behind a run, and where it left their range: for the hand-off and for `methods.csv`."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any, Final

from tidescour.errors import Finding
from tidescour.handoff.columns import Column
from tidescour.handoff.tables import ResultTable, table_from_rows
from tidescour.table import Entry

METHOD_COLUMNS: Final = (
    Column(name="name", kind="text", meaning="name of the method, as in the plan where it is chosen there"),
    Column(name="title", kind="text", meaning="what it is called in the trade"),
    Column(name="says", kind="text", meaning="the formula in plain text"),
    Column(name="range", kind="text", meaning="range of validity"),
    Column(name="source", kind="text", meaning="author, year, title"),
    Column(
        name="how_sure",
        kind="text",
        meaning="published, derived, common practice, or from memory (not looked up again)",
    ),
    Column(name="left_range", kind="text", meaning="where this run left that range; empty where no finding says so"),
)

BETWEEN: Final = " | "
"""Between the places where a run left a range, in one cell."""


def left_range(entry: Entry[Any], findings: Iterable[Finding]) -> tuple[str, ...]:
    """Return where a run left the range of a method, and what was found there, in the order of the findings."""
    return tuple(f"{finding.where}: {finding.message}" for finding in findings if finding.code in entry.left_by)


def method_objects(entries: Iterable[Entry[Any]], findings: Sequence[Finding]) -> list[dict[str, Any]]:
    """Return the methods of a run, ready for JSON.

    Parameters
    ----------
    entries : iterable of Entry
        Methods that the run used, in the order of the steps.
    findings : sequence of Finding
        Of the run.

    Returns
    -------
    list of dict
        One a method: name, title, says, symbols (name, unit, meaning), range, source, how_sure and left_range, a list
        of texts that is empty where no finding says that the run left the range.
    """
    return [
        {
            "name": entry.name,
            "title": entry.title,
            "says": entry.says,
            "symbols": symbol_objects(entry),
            "range": entry.validity,
            "source": entry.source,
            "how_sure": entry.confidence,
            "left_range": list(left_range(entry, findings)),
        }
        for entry in entries
    ]


def symbol_objects(entry: Entry[Any]) -> list[dict[str, str]]:
    """Return the symbols of a method, ready for JSON."""
    return [{"name": symbol.name, "unit": symbol.unit, "meaning": symbol.meaning} for symbol in entry.symbols]


def methods_table(entries: Iterable[Entry[Any]], findings: Sequence[Finding]) -> ResultTable:
    """Return the methods of a run as the table `methods`, one row a method; arguments as in `method_objects`."""
    rows = (
        (
            entry.name,
            entry.title,
            entry.says,
            entry.validity,
            entry.source,
            entry.confidence,
            BETWEEN.join(left_range(entry, findings)),
        )
        for entry in entries
    )
    return table_from_rows("methods", METHOD_COLUMNS, rows)
