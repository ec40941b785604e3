"""Fingerprints of the files that a plan consists of, for provenance."""

from __future__ import annotations

from hashlib import sha256
from pathlib import PurePath

from tidescour.errors import PlanError
from tidescour.plan.models import Plan


def plan_hashes(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return name and SHA-256 (hexadecimal) of the plan file and of its programme table, where stages came from one.

    Parameters
    ----------
    plan : Plan
        As read.

    Returns
    -------
    tuple of (str, str)
        Names relative to the plan, with forward slashes.

    Raises
    ------
    PlanError
        If a file can no longer be read.
    """
    names = [plan.file.name] + ([plan.programme.file] if plan.programme and plan.stage else [])
    try:
        return tuple(
            (PurePath(name).as_posix(), sha256((plan.folder / name).read_bytes()).hexdigest()) for name in names
        )
    except OSError as error:
        raise PlanError(f"{error.filename}: cannot be read any more: {error.strerror}") from None
