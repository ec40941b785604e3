"""Fingerprints of the files that a plan consists of, for provenance."""

from __future__ import annotations

from collections.abc import Iterator
from hashlib import sha256
from pathlib import PurePath, PureWindowsPath

from tidescour.errors import PlanError
from tidescour.plan.models import Plan


def plan_hashes(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return name and SHA-256 (hexadecimal) of the plan file and of the tables that it is made of.

    These are the programme table, where stages came from one, the profiles of openings, the table of the basin, that of
    measured discharges, the growth curve and the table of soundings; each stands once.

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
    names = {PurePath(name): name for name in (plan.file.name, *_tables(plan))}
    try:
        return tuple(
            (path_for_results(name), sha256((plan.folder / name).read_bytes()).hexdigest()) for name in names.values()
        )
    except OSError as error:
        raise PlanError(f"{error.filename}: cannot be read any more: {error.strerror}") from None


def _tables(plan: Plan) -> Iterator[str]:
    """Return the names of the tables, as the plan has them."""
    if plan.programme and plan.stage:
        yield plan.programme.file
    openings = [opening for stage in plan.stage for opening in stage.opening]
    openings += plan.basin.side_opening if plan.basin else ()
    openings += plan.calibration.opening if plan.calibration else ()
    yield from (opening.profile for opening in openings if opening.profile is not None)
    if plan.basin and plan.basin.table is not None:
        yield plan.basin.table
    if plan.calibration and plan.calibration.discharge_file is not None:
        yield plan.calibration.discharge_file
    if plan.scour.curve_file is not None:
        yield plan.scour.curve_file
    if plan.soundings.file is not None:
        yield plan.soundings.file


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
