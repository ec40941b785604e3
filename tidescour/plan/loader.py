"""Reading a plan: the file, the table of stages it may name, and every problem of both in one pass."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

from tidescour.errors import PlanError
from tidescour.plan.choices import Choices
from tidescour.plan.draft import Draft
from tidescour.plan.lines import key_marks
from tidescour.plan.models import (
    SIDES,
    Correction,
    Opening,
    PlaceOverride,
    Plan,
    PlanModel,
    Protection,
    RecordSource,
    Series,
    Side,
    Stage,
    StageSpan,
)
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
    purpose : {"records", "run"}
        ``records`` asks only for what reading records and fitting tides needs; what else stands in the plan is judged
        all the same, but stages that are not complete yet are left out.

    Returns
    -------
    Plan
        With the stages of its programme table, where it has one.

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
    draft, problems = draft_of(written, choices)
    found = [*table.problems, *problems, *rule_problems(draft)]
    if wrong := [problem for problem in found if problem.only_for in (None, purpose)]:
        raise PlanError(*problem_texts(wrong, written, marks | table.marks, path.name))
    return _plan(path, draft)


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
            "stage": tuple(stage for place, span in draft.each(StageSpan) if (stage := _stage(draft, place, span))),
        }
    )


def _protection(draft: Draft, side: Side) -> Protection:
    whole_side = draft.part(PlaceOverride, "protection", side)
    single = {place[3]: own for place, own in draft.each(PlaceOverride) if place[1] == side and len(place) == 4}
    return Protection.model_validate(_set_keys(whole_side) | {"opening": single})


def _stage(draft: Draft, place: KeyPath, span: StageSpan) -> Stage | None:
    openings = tuple(opening for at, opening in draft.each(Opening) if at[:2] == place)
    return Stage.model_validate(_set_keys(span) | {"opening": openings}) if openings else None


def _set_keys(part: PlanModel | None) -> dict[str, Any]:
    return {key: getattr(part, key) for key in part.model_fields_set} if part is not None else {}
