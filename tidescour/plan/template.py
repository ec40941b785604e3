"""The commented plan that a new user fills in."""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path

from tidescour.errors import PlanError

PLAN_NAME = "plan.toml"


def plan_template() -> str:
    """Return a complete plan in which every key stands with its unit and what it means."""
    return files("tidescour.plan").joinpath("template.toml").read_text(encoding="utf-8")


def write_new_plan(folder: Path) -> Path:
    """Write the template as ``plan.toml`` into a folder, which is made where it does not exist.

    Parameters
    ----------
    folder : Path
        Where the plan and, later, its records stand.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    PlanError
        If there is a plan already, or nothing can be written there.
    """
    path = folder / PLAN_NAME
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with path.open("x", encoding="utf-8", newline="\n") as file:
            file.write(plan_template())
    except FileExistsError:
        if path.exists() or path.is_symlink():
            raise PlanError(f"{path}: is there already and was left as it is; choose another folder") from None
        raise PlanError(f"{folder}: is a file; give the name of a folder") from None
    except OSError as error:
        raise PlanError(f"{path}: cannot be written: {error.strerror}") from None
    return path
