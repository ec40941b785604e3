"""What goes wrong, and what only qualifies a number.

::

    TidescourError            anything refused; the command line exits with 3
    |-- PlanError             the plan file, or a table it names
    |-- RecordError           a gauge file or a given series
    |-- FitError              the harmonic fit
    |-- HandoffError          the result folder
    `-- DomainError           a number outside the range of a formula (also a ValueError)

A message says what was found, where, and what to write instead. What does not stop the work is a `Finding`.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Severity = Literal["note", "warning", "error"]


class TidescourError(Exception):
    """Input refused: nothing was computed or written."""


class PlanError(TidescourError):
    """The plan file, or a table that it names, cannot be used.

    Parameters
    ----------
    problems : tuple of str
        Every problem found, each with its key path, what was found and what is allowed.
    """

    def __init__(self, *problems: str) -> None:
        self.problems = problems
        super().__init__("\n".join(problems))


class RecordError(TidescourError):
    """A gauge file or a given series cannot be used."""


class FitError(TidescourError):
    """The tide cannot be fitted to what was read."""


class HandoffError(TidescourError):
    """The result folder cannot be replaced."""


class DomainError(TidescourError, ValueError):
    """A number lies outside the range of a formula."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """What a reader must know beside a result.

    Parameters
    ----------
    severity : {"note", "warning", "error"}
        ``note``: fixed or assumed; ``warning``: look; ``error``: a result number should not be used as it is.
    code : str
        Short stable name in kebab case, such as ``default-used``.
    where : str
        Key path, file and line, or stage, opening and side.
    message : str
        What was found and what it means, with units.
    """

    severity: Severity
    code: str
    where: str
    message: str
