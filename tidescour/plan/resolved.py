"""The plan as the file would have it with every default written out, for provenance."""

from __future__ import annotations

from datetime import datetime
from typing import Any

from tidescour.plan.hashes import path_for_results
from tidescour.plan.kinds import SIDES
from tidescour.plan.models import Basin, Opening, Plan
from tidescour.plan.models_bed import SATURATING
from tidescour.units import seconds_since_epoch, utc_text


def resolved_plan(plan: Plan) -> dict[str, object]:
    """Return a plan with its defaults, ready for JSON.

    Parameters
    ----------
    plan : Plan
        As read.

    Returns
    -------
    dict
        Tables under the keys of the plan file, so that it could be written as one: ``from`` and ``to``, the numbers
        of a relation beside the other keys of an opening, date-times as ``2027-04-01T00:00:00Z``. Keys without a
        value are left out, and so are paths of the plan itself; stages stand for the programme table that gave them,
        numbers for the table of the basin, and discharges and soundings for theirs. A profile and a growth curve stay
        files. The form of the equilibrium depth stands with the law that has one.
        Files stand as `path_for_results` gives them: one with an absolute path is no longer found from here.
    """
    tables = plan.model_dump(by_alias=True, exclude={"folder", "file", "sounding_faults", "programme", "stage"})
    _shorten_paths(tables)
    tables["stage"] = [
        stage.model_dump(exclude={"opening"}) | {"opening": _openings(stage.opening)} for stage in plan.stage
    ]
    if plan.basin is not None:
        tables["basin"] = _basin(plan.basin)
    if plan.calibration is not None:
        tables["calibration"]["opening"] = _openings(plan.calibration.opening)
        del tables["calibration"]["discharge_file"]
    del tables["soundings"]["file"]
    del tables["scour"]["curve_points"]
    if plan.scour.law != SATURATING:
        del tables["scour"]["equilibrium"]
    if not plan.bed.layer:
        del tables["bed"]["layer"]
    return {key: _plain(table) for key, table in tables.items() if not _is_empty(table)}


def _shorten_paths(tables: dict[str, Any]) -> None:
    """Put the paths for results in place of those of the plan."""
    for source in filter(None, (tables["records"][side] for side in SIDES)):
        source["files"] = [path_for_results(name) for name in source["files"]]
    for series in tables["series"].values():
        series["file"] = path_for_results(series["file"])
    if tables["tide"]["sea_constants"] is not None:
        tables["tide"]["sea_constants"] = path_for_results(tables["tide"]["sea_constants"])
    if tables["scour"]["curve_file"] is not None:
        tables["scour"]["curve_file"] = path_for_results(tables["scour"]["curve_file"])


def _basin(basin: Basin) -> dict[str, Any]:
    keys = basin.model_dump(exclude={"table", "table_column", "side_opening"})
    return {key: value for key, value in keys.items() if value != ()} | (
        {"side_opening": _openings(basin.side_opening)} if basin.side_opening else {}
    )


def _openings(openings: tuple[Opening, ...]) -> list[dict[str, Any]]:
    return [_opening(opening) for opening in openings]


def _opening(opening: Opening) -> dict[str, Any]:
    if opening.profile is None:
        return opening.model_dump(exclude={"parameters", "profile_points"}) | opening.parameters
    keys = opening.model_dump(exclude={"parameters", "profile_points", "side_slope"})
    return keys | {"profile": path_for_results(opening.profile)} | opening.parameters


def _plain(value: Any) -> Any:
    if isinstance(value, datetime):
        return utc_text(seconds_since_epoch(value))
    if isinstance(value, dict):
        return {key: _plain(item) for key, item in value.items() if item is not None}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    return value


def _is_empty(table: Any) -> bool:
    return table is None or table == [] or table == ()
