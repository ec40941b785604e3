"""A choice that a user can make: one dict of entries in one file.

The plan check, the listing commands, the list of methods in the report and the contract tests all read the entries.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Generic, Literal, TypeVar

F_co = TypeVar("F_co", bound=Callable[..., Any], covariant=True)

Confidence = Literal["published", "derived", "common practice", "from memory"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Parameter:
    """A number that a table entry needs from the plan.

    Parameters
    ----------
    name : str
        Key in the plan, with its unit.
    unit : str
        Unit, ``-`` for a bare number.
    low, high : float
        Allowed range, `low` excluded, `high` included.
    meaning : str
        One line for the listing.
    default : float or None
        What holds where the plan leaves it out, not bound to the range; None where it must be given.
    together : str
        Name of another parameter that must be given where this one is; empty where it stands alone.
    """

    name: str
    unit: str
    low: float
    high: float
    meaning: str
    default: float | None = None
    together: str = ""

    def allows(self, value: float) -> bool:
        """Return whether a plan may give this value: one in the range, or the default."""
        return self.low < value <= self.high or value == self.default


@dataclass(frozen=True, slots=True, kw_only=True)
class Symbol:
    """A symbol in the text of a formula: its unit, ``-`` for a bare number, and its meaning in one line."""

    name: str
    unit: str
    meaning: str


def symbols(*rows: tuple[str, str, str]) -> tuple[Symbol, ...]:
    """Return symbols from rows of name, unit and meaning."""
    return tuple(Symbol(name=name, unit=unit, meaning=meaning) for name, unit, meaning in rows)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Entry(Generic[F_co]):
    """One row of a table of choices.

    Parameters
    ----------
    name : str
        What the user writes in the plan.
    title : str
        What it is called in the trade.
    function : callable
        The kernel.
    says : str
        The formula in plain text, a few lines at most, as its function computes it.
    symbols : tuple of Symbol
        Every symbol in that text; empty where it is words alone.
    parameters : tuple of Parameter
        What it needs from the plan.
    validity : str
        Range of validity, in words with units.
    source : str
        Author, year, title, equation or table.
    confidence : {"published", "derived", "common practice", "from memory"}
        How the formula was known when it was entered; ``derived`` from the laws that its source names.
    left_by : tuple of str
        Codes of the findings that tell that a run left its range, or rests on what the range only assumes.
    leads_to : tuple of str
        Codes of the findings that come of it and say nothing against its range, such as a verdict; for the listing.
    """

    name: str
    title: str
    function: F_co
    says: str
    symbols: tuple[Symbol, ...]
    parameters: tuple[Parameter, ...] = ()
    validity: str
    source: str
    confidence: Confidence
    left_by: tuple[str, ...] = ()
    leads_to: tuple[str, ...] = ()
