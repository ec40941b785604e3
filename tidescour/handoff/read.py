"""Read the hand-off of a run back: which methods it used, and what it found."""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from tidescour.errors import Finding, HandoffError

HANDOFF = "handoff.json"
REMEDY = "give the result folder of `tidescour run`"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ReadRun:
    """What a run left behind: the names of the methods that it used, and its findings."""

    methods: tuple[str, ...]
    findings: tuple[Finding, ...]


def read_run(folder: Path) -> ReadRun:
    """Read methods and findings from the hand-off in a result folder.

    Parameters
    ----------
    folder : Path
        Result folder of `tidescour run`.

    Raises
    ------
    HandoffError
        If the folder or its hand-off is not there or cannot be read, or the file is not a hand-off of this program.
    """
    path = folder / HANDOFF
    document = _document(folder)
    try:
        # The version tells whose file it is.
        str(document["provenance"]["versions"]["tidescour"])
        findings = tuple(_finding(row) for row in document["findings"])
    except (KeyError, TypeError, ValueError) as problem:
        raise HandoffError(f"{path} is not a hand-off of tidescour ({_told(problem)}): {REMEDY}") from problem
    try:
        return ReadRun(methods=tuple(str(row["name"]) for row in document["methods"]), findings=findings)
    except (KeyError, TypeError) as problem:
        raise HandoffError(
            f"{path} does not list the methods of its run ({_told(problem)}), so that another version wrote it: "
            "run the plan again"
        ) from problem


def _document(folder: Path) -> Any:
    path = folder / HANDOFF
    if not folder.exists():
        raise HandoffError(f"there is no folder {folder}: {REMEDY}")
    if not folder.is_dir():
        raise HandoffError(f"{folder} is a file: {REMEDY}")
    try:
        return json.loads(path.read_bytes())
    except FileNotFoundError:
        raise HandoffError(f"{folder} holds no {HANDOFF}: {REMEDY}") from None
    except OSError as problem:
        raise HandoffError(f"{path} cannot be read: {problem}") from problem
    except ValueError as problem:
        raise HandoffError(f"{path} is not JSON ({problem}): run the plan again") from problem


def _finding(row: Any) -> Finding:
    if row["severity"] not in ("note", "warning", "error"):
        raise ValueError(f"{row['severity']!r} is no severity of a finding")
    return Finding(
        severity=row["severity"], code=str(row["code"]), where=str(row["where"]), message=str(row["message"])
    )


def _told(problem: Exception) -> str:
    return f"{problem.args[0]!r} is missing" if isinstance(problem, KeyError) else str(problem)
