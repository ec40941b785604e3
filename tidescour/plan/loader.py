"""Reading a plan: the file, the table of stages it may name, and every problem of both in one pass."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path
from typing import Any

from tidescour.errors import PlanError
from tidescour.plan.choices import Choices
from tidescour.plan.draft import Draft
from tidescour.plan.kinds import SIDES, PlanModel, Side
from tidescour.plan.lines import key_marks
from tidescour.plan.models import (
    Basin,
    Calibration,
    Correction,
    Inflow,
    Opening,
    Plan,
    RecordSource,
    Series,
    Stage,
    StageSpan,
)
from tidescour.plan.models_bed import Bed, BedLayer, Grading, PlaceOverride, Protection
from tidescour.plan.models_calibration import CalibrationSpan, Discharge
from tidescour.plan.models_survey import LoadCase, Sounding
from tidescour.plan.named_files import read_named_files
from tidescour.plan.problems import KeyPath, Problem, Purpose, problem_texts
from tidescour.plan.programme import ProgrammeStages, programme_stages
from tidescour.plan.rules import rule_problems
from tidescour.plan.sections import draft_of

_NO_TABLE = ProgrammeStages(stages=[], marks={}, problems=())


def read_plan(path: Path, choices: Choices, purpose: Purpose = "run") -> Plan:
    """Read a plan and judge all of it.

    Parameters
    ----------
    path : Path
        The plan file, TOML in UTF-8.
    choices : Choices
        Names that a plan may use, from the tables of the later steps.
    purpose : {"records", "run", "soundings", "delay", "calibrate"}
        ``records`` asks only for what reading records and fitting tides needs, ``calibrate`` for the calibration and
        the basin besides, ``soundings`` and ``delay`` for what a run needs and, the first, for a sounding; what else
        stands in the plan is judged all the same, but what is not complete yet and only another purpose needs
        (stages, the basin, a calibration, soundings) is left out; `Plan.sounding_faults` tells it of soundings.

    Returns
    -------
    Plan
        With the stages of its programme table, the open parts of its profiles, the numbers of its table of the basin,
        the points of its growth curve and the rows of its tables of discharges and of soundings, where it has them.

    Raises
    ------
    PlanError
        With every problem: file and line (or row), key path, what was found and what is allowed. Stages, openings,
        corrections and entries of lists are counted from 1.
    """
    written = _parsed(path, text := _plan_text(path))
    marks = key_marks(text, written, path.name)
    table = _programme_table(path, written, choices)
    if table.stages:
        written = written | {"stage": table.stages}
    files = read_named_files(path.parent, written)
    written = written | {key: [*written.get(key, []), *rows] for key, rows in files.rows.items()}
    draft, problems = draft_of(written, choices, files.values)
    found = [*table.problems, *files.problems, *problems, *rule_problems(draft)]
    marks |= table.marks | files.marks
    if wrong := [problem for problem in found if not problem.only_for or purpose in problem.only_for]:
        raise PlanError(*problem_texts(wrong, written, marks, path.name))
    plan = _plan(path, _without_unread(draft, files.problems))
    faults = [problem for problem in found if problem.only_for == ("soundings",) and draft.has(str(problem.path[0]))]
    return plan.model_copy(update={"sounding_faults": problem_texts(faults, written, marks, path.name)})


def _without_unread(draft: Draft, problems: Iterable[Problem]) -> Draft:
    """Return a draft in which keys are faulty whose files are not there, though nobody needs them now."""
    faulty = dict(draft.faulty)
    for *table, key in (problem.path for problem in problems):
        faulty[tuple(table)] = faulty.get(tuple(table), frozenset()) | {str(key)}
    return replace(draft, faulty=faulty)


def _plan_text(path: Path) -> str:
    try:
        if path.is_dir():
            raise PlanError(f"{path}: is a folder; give the plan file, such as {path / 'plan.toml'}")
        return path.read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        raise PlanError(f"{path}: no such file; `tidescour new FOLDER` writes a plan to fill in") from None
    except OSError as error:
        raise PlanError(f"{path}: cannot be read: {error.strerror}") from None
    except UnicodeDecodeError as error:
        line = error.object[: error.start].count(b"\n") + 1
        raise PlanError(f"{path} line {line}: is not UTF-8 text; save the file as UTF-8") from None


def _parsed(path: Path, text: str) -> dict[str, Any]:
    try:
        return tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        raise PlanError(f"{path}: is not sound TOML: {error}") from None


def _programme_table(path: Path, written: dict[str, Any], choices: Choices) -> ProgrammeStages:
    """Return the stages of the table that the plan names; without one, or where its name is not sound, none."""
    programme = written.get("programme")
    if programme is not None and "stage" in written:
        message = "stands beside [[stage]]; leave out one of the two"
        return ProgrammeStages(stages=[], marks={}, problems=(Problem(path=("programme",), message=message),))
    file = programme.get("file") if isinstance(programme, dict) else None
    return programme_stages(path.parent / file, choices) if isinstance(file, str) and file.strip() else _NO_TABLE


def _plan(path: Path, draft: Draft) -> Plan:
    """Return the plan made of the parts of a draft; keys that were not written stay unset."""
    return Plan.model_validate(
        {
            "folder": path.absolute().parent,
            "file": path.absolute(),
            **{str(place[0]): part for place, part in draft.each(PlanModel) if len(place) == 1},
            "records": {side: source for side in SIDES if (source := draft.part(RecordSource, "records", side))},
            "correction": tuple(part for _, part in draft.each(Correction)),
            "series": {place[1]: part for place, part in draft.each(Series)},
            "protection": {side: _protection(draft, side) for side in SIDES},
            "basin": _basin(draft),
            "stage": tuple(stage for place, span in draft.each(StageSpan) if (stage := _stage(draft, place, span))),
            "calibration": _calibration(draft),
            "discharge": tuple(part for _, part in draft.each(Discharge)),
            "bed": _bed(draft),
            "sounding": tuple(part for _, part in draft.each(Sounding)),
            "load_case": tuple(part for _, part in draft.each(LoadCase)),
            "filter": tuple(part for _, part in draft.each(Grading)),
        }
    )


def _protection(draft: Draft, side: Side) -> Protection:
    whole_side = draft.part(PlaceOverride, "protection", side)
    single = {place[3]: own for place, own in draft.each(PlaceOverride) if place[1] == side and len(place) == 4}
    return Protection.model_validate(_set_keys(whole_side) | {"opening": single})


def _bed(draft: Draft) -> Bed:
    layers = tuple(layer for _, layer in draft.each(BedLayer))
    return Bed.model_validate(_set_keys(draft.part(Bed, "bed")) | ({"layer": layers} if layers else {}))


def _stage(draft: Draft, place: KeyPath, span: StageSpan) -> Stage | None:
    openings = _openings(draft, *place, "opening")
    return Stage.model_validate(_set_keys(span) | {"opening": openings}) if openings else None


def _basin(draft: Draft) -> Basin | None:
    storage = draft.part(Basin, "basin")
    if storage is None or not storage.level_m or not (storage.area_m2 or storage.volume_m3):
        return None
    inflows = tuple(inflow for _, inflow in draft.each(Inflow))
    lists = {"inflow": inflows, "side_opening": _openings(draft, "basin", "side_opening")}
    return Basin.model_validate(_set_keys(storage) | {key: parts for key, parts in lists.items() if parts})


def _calibration(draft: Draft) -> Calibration | None:
    """Return the calibration where all of it is sound; half of the gap of then would be another gap."""
    span = draft.part(CalibrationSpan, "calibration")
    openings = _openings(draft, "calibration", "opening")
    if span is None or len(openings) != sum(path[0] == "calibration" for path, _ in draft.each_with(Opening)):
        return None
    return Calibration.model_validate(_set_keys(span) | {"opening": openings}) if openings else None


def _openings(draft: Draft, *around: str | int) -> tuple[Opening, ...]:
    """Return the sound openings of one table; without width and profile, where these are not needed, it is none."""
    return tuple(
        opening
        for path, opening in draft.each(Opening)
        if path[:-1] == around and (opening.width_m is not None or opening.profile_points)
    )


def _set_keys(part: PlanModel | None) -> dict[str, Any]:
    return {key: getattr(part, key) for key in part.model_fields_set} if part is not None else {}
