"""What loads the stone of the crest, of the downstream slope and of the protection's end: for screening only."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final

import numpy as np

from tidescour.bed.records import BedHistory
from tidescour.bed.stone_records import Direction, Location, StoneLoad
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.kinds import Side
from tidescour.plan.models import Opening, Stage
from tidescour.units import GRAVITY_M_S2, BoolArray, FloatArray

RECEIVING: Final[Mapping[Direction, Side]] = {"flood": "basin", "ebb": "sea"}
"""The side that receives the flow of each direction."""

THROUGH_STONE: Final = "rubble-dam"
"""Relation in which water runs between the stones: its velocity is no load in the sense of the stability forms."""

ENERGY_FROM_LEVELS: Final = ("broad-crest", "narrow-crest")
"""Relations whose control section has a free surface at the level that the water really has there, so that the levels
give the jet. Under a roof a drowned jet is lower than the water over it, and in an open gap lower than the tailwater:
there the jet is the gap velocity over the coefficient."""

CREST_TURBULENCE_FACTOR: Final = 1.0
"""K_T in flow that speeds up towards the crest (from memory)."""

JET_TURBULENCE_SQUARED: Final = 3.0
"""k_t^2 of the water that shoots down the slope: the lower of the 3 to 4 of jets (from memory), for its velocity takes
the whole head without loss."""

_NO_SILL_M: Final = 1e-6
"""Less than this is rounding of levels and depths."""

UNIFORM_TURBULENCE: Final = 0.1
"""Relative turbulence r0 at which K_T = (1 + 3 r0) / (1 + 3 x 0.1) is 1 (from memory)."""

_CREST_WORDS = (
    "contracted jet, not under the gap velocity; depth of the control section; K_T 1, as flow that speeds up is smooth "
    "(from memory)"
)
_SLOPE_WORDS = (
    "whole head turned into velocity, not under the jet on the crest; depth is unit discharge over velocity; K_T^2 = "
    "k_t^2 = 3, the lower of 3 to 4 for jets (from memory)"
)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Course:
    """The flow of one opening in one direction through a stage; `running` marks what counts of it."""

    stage: str
    opening: str
    direction: Direction
    time_s: FloatArray
    running: BoolArray
    head_m: FloatArray


def stone_loads(stage: Stage, flow: StageFlow, beds: Mapping[tuple[str, Side], BedHistory]) -> tuple[StoneLoad, ...]:
    """Return what loads the stone in one stage: by opening, direction and location, when it is fastest there.

    Parameters
    ----------
    stage : Stage
        For relation and coefficient of each opening.
    flow : StageFlow
        Its flow; only covered samples count.
    beds : mapping of (opening, side) to BedHistory
        What the bed feels at the end of the protections in that stage.

    Returns
    -------
    tuple of StoneLoad
        No row where nothing runs that way, none of a slope where the crest is not over the bed at the end of the
        protection; of an opening whose end velocity is given, or whose water runs through stone, only that at the end
        of the protection.

    References
    ----------
    Jet on the crest: energy, sqrt(2 g (upstream level - level in the control section)), or gap velocity over the
    coefficient, whichever is larger and not under the gap velocity. Downstream slope: sqrt(2 g head). K_T = (1 + 3 r0)
    / 1.3 at the end of the protection (from memory).
    """
    planned = {opening.name: opening for opening in stage.opening}
    loads: list[StoneLoad] = []
    for opening in flow.openings:
        for direction, side in RECEIVING.items():
            course = _course(flow, opening, direction)
            if not np.any(course.running):
                continue
            bed = beds[opening.name, side]
            if has_gap_load(planned[opening.name]):
                loads += _gap_loads(course, flow, opening, planned[opening.name], bed)
            loads.append(_end_load(course, bed))
    return tuple(loads)


def has_gap_load(opening: Opening) -> bool:
    """Return whether the stone at an opening itself can be judged: its discharge is known and runs over the stone."""
    return opening.end_velocity_series is None and opening.relation != THROUGH_STONE


def turbulence_factor(relative_turbulence: float) -> float:
    """K_T = (1 + 3 r0) / 1.3, by which turbulence raises the velocity (from memory); NaN for NaN."""
    return (1.0 + 3.0 * relative_turbulence) / (1.0 + 3.0 * UNIFORM_TURBULENCE)


def _course(flow: StageFlow, opening: OpeningFlow, direction: Direction) -> _Course:
    sign = 1.0 if direction == "flood" else -1.0
    return _Course(
        stage=flow.stage,
        opening=opening.name,
        direction=direction,
        time_s=flow.time_s,
        running=flow.covered & (sign * opening.signed_flow > 0.0),
        head_m=sign * (opening.level_sea_m - flow.level_basin_m),
    )


def _gap_loads(
    course: _Course, flow: StageFlow, opening: OpeningFlow, planned: Opening, bed: BedHistory
) -> list[StoneLoad]:
    unit_discharge = np.abs(opening.discharge_m3_s) / opening.flow_width_m
    crest_m_s = jet_velocity(flow, opening, planned)
    depth = _control_depth(opening)
    crest = _load(course, "crest", crest_m_s, unit_discharge, depth, CREST_TURBULENCE_FACTOR, _CREST_WORDS)
    if not _has_slope(course, flow, opening, bed):
        return [crest]
    slope_m_s = np.maximum(np.sqrt(2.0 * GRAVITY_M_S2 * np.maximum(course.head_m, 0.0)), crest_m_s)
    with np.errstate(divide="ignore", invalid="ignore"):
        thickness = unit_discharge / slope_m_s
    factor = float(np.sqrt(JET_TURBULENCE_SQUARED))
    return [crest, _load(course, "downstream slope", slope_m_s, unit_discharge, thickness, factor, _SLOPE_WORDS)]


def _has_slope(course: _Course, flow: StageFlow, opening: OpeningFlow, bed: BedHistory) -> bool:
    """Return whether the crest ever stands over the bed at the end of the protection, so that there is a slope."""
    tailwater = flow.level_basin_m if course.direction == "flood" else opening.level_sea_m
    bed_level = tailwater - bed.depth_m
    return bool(np.any((opening.crest_level_m - bed_level)[course.running] > _NO_SILL_M))


def jet_velocity(flow: StageFlow, opening: OpeningFlow, planned: Opening) -> FloatArray:
    """Velocity of the contracted jet on the crest of an opening.

    Parameters
    ----------
    flow : StageFlow
        For the basin level.
    opening : OpeningFlow
        Its flow.
    planned : Opening
        The same opening in the plan, for its relation and coefficient.

    Returns
    -------
    (n,) array
        Velocity [m/s], never under the magnitude of the gap velocity; NaN where that is.
    """
    gap = np.abs(opening.gap_velocity_m_s)
    coefficient = planned.parameters.get("coefficient", 1.0)
    jet = np.maximum(gap, gap / coefficient)
    if planned.relation is not None and planned.relation not in ENERGY_FROM_LEVELS:
        return jet
    upstream = np.where(opening.signed_flow > 0.0, opening.level_sea_m, flow.level_basin_m)
    level = opening.crest_level_m + _control_depth(opening)
    drop = np.maximum(upstream - level, 0.0)
    # Where nothing runs there is no control section, and no jet.
    return np.where(gap > 0.0, np.maximum(jet, np.sqrt(2.0 * GRAVITY_M_S2 * drop)), jet)


def _control_depth(opening: OpeningFlow) -> FloatArray:
    """Depth in the control section [m]: area over mean width; NaN where nothing runs."""
    with np.errstate(divide="ignore", invalid="ignore"):
        area = np.abs(opening.discharge_m3_s) / np.abs(opening.gap_velocity_m_s)
    return np.asarray(area / opening.flow_width_m, dtype=np.float64)


def _end_load(course: _Course, bed: BedHistory) -> StoneLoad:
    velocity = bed.velocity_m_s
    at = _fastest(course, velocity)
    turbulence = float(bed.turbulence[at])
    factor = (
        "K_T not known, as the turbulence is not"
        if np.isnan(turbulence)
        else f"K_T = (1 + 3 r0) / 1.3 with the r0 = {turbulence:.3f} of that moment (from memory)"
    )
    return _load(
        course,
        "end of protection",
        velocity,
        velocity * bed.depth_m,
        bed.depth_m,
        turbulence_factor(turbulence),
        f"velocity at the end of the protection, an edge; {factor}",
    )


def _load(
    course: _Course,
    location: Location,
    velocity_m_s: FloatArray,
    unit_discharge_m2_s: FloatArray,
    depth_m: FloatArray,
    factor: float,
    words: str,
) -> StoneLoad:
    at = _fastest(course, velocity_m_s)
    return StoneLoad(
        stage=course.stage,
        opening=course.opening,
        direction=course.direction,
        location=location,
        time_s=float(course.time_s[at]),
        velocity_m_s=float(velocity_m_s[at]),
        head_m=float(course.head_m[at]),
        unit_discharge_m2_s=float(unit_discharge_m2_s[at]),
        depth_m=float(depth_m[at]),
        turbulence_factor=factor,
        assumption=words,
    )


def _fastest(course: _Course, velocity_m_s: FloatArray) -> int:
    """Return the step at which the flow of a course is fastest."""
    return int(np.argmax(np.where(course.running, velocity_m_s, -np.inf)))
