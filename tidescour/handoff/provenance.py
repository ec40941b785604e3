"""Where results come from: hashes, versions, the resolved plan; and when, where and how they were made."""

from __future__ import annotations

import hashlib
import os
import platform
import time
from collections.abc import Iterable, Mapping, Sequence
from importlib import metadata
from pathlib import Path
from typing import Any

from tidescour import __version__
from tidescour.errors import HandoffError
from tidescour.gauge.records import InputFile
from tidescour.units import utc_text

LIBRARIES = ("numpy", "scipy", "pandas", "utide", "matplotlib", "numba")
"""Installed packages that a number or a picture depends on."""


def provenance_block(plan_file: Path, inputs: Iterable[InputFile], resolved_plan: Mapping[str, Any]) -> dict[str, Any]:
    """Return what results depend on, ready for JSON: the same on every machine, day and folder.

    Parameters
    ----------
    plan_file : Path
        The plan; its name and SHA-256 are kept, not its folder.
    inputs : iterable of InputFile
        Every file read beside the plan, with paths relative to it.
    resolved_plan : mapping
        The plan with its defaults filled in, ready for JSON.
    """
    return {
        "plan": {"file": plan_file.name, "sha256": hashlib.sha256(plan_file.read_bytes()).hexdigest()},
        "inputs": [{"file": file.path, "sha256": file.sha256} for file in inputs],
        "versions": versions(),
        "resolved_plan": dict(resolved_plan),
    }


def versions() -> dict[str, str]:
    """Return the versions of the program, of Python and of the libraries that results depend on."""
    installed = {name: metadata.version(name) for name in LIBRARIES}
    return {"tidescour": __version__, "python": platform.python_version(), **installed}


def circumstances(command_line: Sequence[str]) -> dict[str, Any]:
    """Return start time, host and command line for `provenance.json`; call it when a command starts.

    The time is that of ``SOURCE_DATE_EPOCH`` where this is set, so that a result folder can be made again to the byte.

    Raises
    ------
    HandoffError
        If ``SOURCE_DATE_EPOCH`` is not a whole number of seconds.
    """
    return {
        "started": utc_text(_start_s()),
        "host": platform.node(),
        "command_line": list(command_line),
    }


def _start_s() -> float:
    fixed = os.environ.get("SOURCE_DATE_EPOCH")
    if fixed is None:
        return float(int(time.time()))
    if not (fixed.isascii() and fixed.isdigit()):
        raise HandoffError(
            f"the environment variable SOURCE_DATE_EPOCH is {fixed!r}: write whole seconds since 1970, or unset it"
        )
    return float(fixed)
