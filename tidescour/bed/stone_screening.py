"""Stone sizes of a whole programme by all stability forms: for screening only."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Final

from tidescour.bed.records import BedHistory
from tidescour.bed.stone import OWN_SHIELDS, SCREENING_ONLY, STABILITY
from tidescour.bed.stone_loads import THROUGH_STONE, has_gap_load, stone_loads
from tidescour.bed.stone_records import StoneDemand, StoneLoad, StoneScreening, StoneSize
from tidescour.bed.water import submerged_relative_density
from tidescour.errors import DomainError, Finding
from tidescour.gap.records import StageFlow
from tidescour.plan.kinds import Side
from tidescour.plan.models import Plan
from tidescour.plan.models_bed import Stone

_LEVEL: Final = 1.0

SHALLOW: Final = 0.2
"""Stone over water depth above which the velocity profile over it has little meaning (common practice, no source)."""

_SHALLOW_CODES: Final[Mapping[str, str]] = {
    "shields": "shields-in-shallow-water",
    "pilarczyk": "pilarczyk-in-shallow-water",
}
"""The code of the finding that a form with a velocity profile asks for much stone in little water: its own."""


@dataclass(frozen=True, slots=True, kw_only=True)
class _Answer:
    """What a form says to a load: its size [m], NaN without one, and what is wrong with it, if anything."""

    form: str
    load: StoneLoad
    size_m: float
    code: str = ""
    remark: str = ""


def stone_screening(plan: Plan, flows: Iterable[StageFlow], beds: Iterable[BedHistory]) -> StoneScreening:
    """Return the stone that each stage asks for at the crest, the downstream slope and the end of the protection.

    Parameters
    ----------
    plan : Plan
        Stages, water and the numbers of the stone.
    flows : iterable of StageFlow
        One a stage.
    beds : iterable of BedHistory
        Every row of every place, in any order.

    Returns
    -------
    StoneScreening
        A size for every load, in the order of the stages, and findings: that this is a screening, which openings
        have no load at the gap, and where a form has no size.
    """
    by_stage: dict[str, dict[tuple[str, Side], BedHistory]] = {}
    for bed in beds:
        by_stage.setdefault(bed.stage, {})[bed.opening, bed.side] = bed
    stages = {stage.name: stage for stage in plan.stage}
    density = submerged_relative_density(plan.water.temperature_c, plan.water.salinity_g_kg, plan.stone.density_kg_m3)
    sizes: list[StoneSize] = []
    answers: list[_Answer] = []
    for flow in flows:
        for load in stone_loads(stages[flow.stage], flow, by_stage[flow.stage]):
            demand = _demand(load, plan.stone, density)
            given = [_answer(form, load, demand) for form in STABILITY]
            answers += given
            sizes.append(StoneSize(load=load, demand=demand, size_m=tuple(answer.size_m for answer in given)))
    findings = (_screening_finding(plan.stone), *_not_judged(plan), *_remarks(answers))
    return StoneScreening(sizes=tuple(sizes), findings=findings if sizes else ())


def _demand(load: StoneLoad, stone: Stone, relative_density: float) -> StoneDemand:
    """Return what the forms need: the end of the protection is an edge, and the slope factor is for the slope alone."""
    edge, slope = load.location == "end of protection", load.location == "downstream slope"
    return StoneDemand(
        velocity_m_s=load.velocity_m_s,
        depth_m=load.depth_m,
        turbulence_factor=load.turbulence_factor,
        relative_density=relative_density,
        shields=stone.shields,
        stability_factor=stone.edge_stability_factor if edge else stone.stability_factor,
        slope_factor=stone.slope_factor if slope else _LEVEL,
    )


def _answer(form: str, load: StoneLoad, demand: StoneDemand) -> _Answer:
    try:
        size = STABILITY[form].function(demand)
    except DomainError as error:
        return _Answer(
            form=form, load=load, size_m=float("nan"), code="stone-without-size", remark=f"has no size: {error}"
        )
    if form in _SHALLOW_CODES and size > SHALLOW * load.depth_m:
        remark = (
            f"asks for {size:.2f} m in {load.depth_m:.2f} m of water; over a fifth of the depth its velocity profile "
            "has little meaning (common practice, no source): hold it against Izbash's"
        )
        return _Answer(form=form, load=load, size_m=size, code=_SHALLOW_CODES[form], remark=remark)
    return _Answer(form=form, load=load, size_m=size)


def _screening_finding(stone: Stone) -> Finding:
    if stone.shields is None:
        shields = f"{OWN_SHIELDS['shields']:g} (Shields form) and {OWN_SHIELDS['pilarczyk']:g} (Pilarczyk), from memory"
    else:
        shields = f"{stone.shields:g} in both forms that have one"
    return Finding(
        severity="note",
        code="stone-screening",
        where="stone",
        message=(
            f"stone sizes are for {SCREENING_ONLY}; stone of {stone.density_kg_m3:g} kg/m3; Shields parameter "
            f"{shields}; stability factor {stone.stability_factor:g}, at the end of the protection "
            f"{stone.edge_stability_factor:g} as for an edge; slope factor {stone.slope_factor:g} on the downstream "
            "slope; the ranges and defaults of these numbers are from memory"
        ),
    )


def _not_judged(plan: Plan) -> tuple[Finding, ...]:
    """Tell of which openings only the end of the protection is looked at."""
    return tuple(
        Finding(
            severity="note",
            code="stone-not-judged",
            where=f"stage {stage.name!r}, opening {opening.name!r}",
            message="no stone size at crest and downstream slope: "
            + (
                "water runs between the stones, which these forms are not for; look at the stability of a dam that "
                "is run through and overtopped"
                if opening.relation == THROUGH_STONE
                else "the velocity at the end of the protection is given, and that in the gap is not known"
            ),
        )
        for stage in plan.stage
        for opening in stage.opening
        if not has_gap_load(opening)
    )


def _remarks(answers: list[_Answer]) -> tuple[Finding, ...]:
    """Tell once for each form and location what is wrong with its sizes, by the first one."""
    groups: dict[tuple[str, str, str], list[_Answer]] = {}
    for answer in answers:
        if answer.remark:
            groups.setdefault((answer.code, answer.form, answer.load.location), []).append(answer)
    return tuple(
        Finding(
            severity="note",
            code=code,
            where=f"stone, {location}",
            message=f"in {len(group)} of its rows, the first in stage {group[0].load.stage!r}, opening "
            f"{group[0].load.opening!r}, {group[0].load.direction}: {form} {group[0].remark}",
        )
        for (code, form, location), group in groups.items()
    )
