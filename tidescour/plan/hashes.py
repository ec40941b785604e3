"""Fingerprints of the files that a plan consists of, for provenance."""

from __future__ import annotations

from hashlib import sha256
from pathlib import PurePath, PureWindowsPath

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
        Names as `path_for_results` gives them.

    Raises
    ------
    PlanError
        If a file can no longer be read.
    """
    names = [plan.file.name] + ([plan.programme.file] if plan.programme and plan.stage else [])
    try:
        return tuple((path_for_results(name), sha256((plan.folder / name).read_bytes()).hexdigest()) for name in names)
    except OSError as error:
        raise PlanError(f"{error.filename}: cannot be read any more: {error.strerror}") from None


def path_for_results(name: str) -> str:
    """Return the path of a file as results name it: the same on every machine, and telling nothing of any.

    Parameters
    ----------
    name : str
        Path or pattern as the plan has it: relative to the plan, or absolute.

    Returns
    -------
    str
        A relative path with forward slashes; of an absolute one, of this system or of Windows, the file's name alone.
    """
    anywhere = PureWindowsPath(name)  # knows drives, shares and both slashes
    return anywhere.name if anywhere.root else PurePath(name).as_posix()
