"""What a plan leaves to others, said where it matters: surge, the placing of caissons, eddies at dam heads."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

from tidescour.errors import Finding
from tidescour.plan.kinds import SIDES, Side
from tidescour.plan.models import Opening, Plan
from tidescour.plan.places import opening_names, protection_of, setting

ROOFED: Final = ("culvert", "orifice")
"""Relations of openings that are placed as one piece, such as caissons with gates."""

WITHOUT_SILL: Final = "open-gap"


def left_out_findings(plan: Plan) -> tuple[Finding, ...]:
    """Return what a reader must know that this plan has no numbers for.

    Parameters
    ----------
    plan : Plan
        As read for a run.

    Returns
    -------
    tuple of Finding
        Code ``tide-only`` (warning) where nothing in the plan holds a surge; ``placing-not-in-it`` (note) for each
        opening with a roof in a stage; ``abutment-eddies-not-in-it`` (note) for each side with openings whose dam
        heads nothing allows for, or that have no sill.
    """
    return (*tide_only_finding(plan), *_placing(plan), *(note for side in SIDES for note in _eddies(plan, side)))


def tide_only_finding(plan: Plan) -> tuple[Finding, ...]:
    """Return a warning where no stage takes its sea level from measurement or a series, and there is no load case."""
    if not plan.stage or plan.load_case or any(stage.sea != "tide" for stage in plan.stage):
        return ()
    but = f" but for set_up_m = {plan.tide.set_up_m:g} m" if plan.tide.set_up_m != 0.0 else ""
    message = (
        f"tide only: surge is not in these numbers{but}, and a storm may dig more in a day than weeks of tide; give "
        'its levels as [series.NAME] with quantity = "level", and a [[load_case]] with stage = "..." and series = '
        '"NAME" for each stage that may meet it'
    )
    return (Finding(severity="warning", code="tide-only", where="load_case", message=message),)


def _openings(plan: Plan, name: str) -> Iterator[Opening]:
    return (opening for stage in plan.stage for opening in stage.opening if opening.name == name)


def _placing(plan: Plan) -> Iterator[Finding]:
    for name in opening_names(plan):
        relations = [opening.relation for opening in _openings(plan, name) if opening.relation in ROOFED]
        if relations:
            message = (
                f"relation {' and '.join(dict.fromkeys(map(str, relations)))}: where this is a caisson or another unit "
                "that is placed as one piece, its motion while it is placed and the flow around it until it sits are "
                "not in these numbers"
            )
            yield Finding(severity="note", code="placing-not-in-it", where=f"opening {name!r}", message=message)


def _eddies(plan: Plan, side: Side) -> Iterator[Finding]:
    """Return a note on the openings of one side whose ends shed eddies that nothing allows for."""
    names = opening_names(plan)
    mean = [name for name in names if _setting(plan, side, name, "local_velocity_factor") in (None, 1.0)]
    open_to_bed = [name for name in names if _without_sill(plan, side, name)]
    if not mean and not open_to_bed:
        return
    told = [
        *([f"local_velocity_factor is 1 at {', '.join(mean)}"] if mean else []),
        *([f"no sill in some stage at {', '.join(open_to_bed)}"] if open_to_bed else []),
    ]
    message = (
        f"{'; '.join(told)}: eddies with an upright axis that abutments and dam heads shed are not in these numbers, "
        "and holes there have grown more than 1.5 to 2 times as deep (from memory); give local_velocity_factor (1.2 to "
        "1.5) or an alpha of 3 to 4.5 (from memory), or what a model showed, if the plan does not yet hold them"
    )
    yield Finding(severity="note", code="abutment-eddies-not-in-it", where=f"protection.{side}", message=message)


def _without_sill(plan: Plan, side: Side, name: str) -> bool:
    """Tell whether the bed runs through an opening in some stage: by its relation, or by its crest."""
    bed = _setting(plan, side, name, "bed_level_m")
    return any(
        opening.relation == WITHOUT_SILL or (bed is not None and opening.crest_level_m <= bed)
        for opening in _openings(plan, name)
    )


def _setting(plan: Plan, side: Side, name: str, key: str) -> float | None:
    protection = protection_of(plan, side)
    value: float | None = setting(protection, protection.opening.get(name), key)
    return value
