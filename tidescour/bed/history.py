"""What the bed feels through a stage: velocity, depth, alpha and critical velocity at the end of the protection."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tidescour.bed.alpha import HIGHEST_SILL, alpha_factor, extrapolated_alpha, outside_evidence
from tidescour.bed.end_velocity import conjugate_depth, end_velocity, froude_number, spread_width
from tidescour.bed.records import BedHistory
from tidescour.bed.threshold import closed_form_critical_velocity, critical_velocity
from tidescour.bed.water import kinematic_viscosity, submerged_relative_density
from tidescour.errors import DomainError, Finding, PlanError
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models import Bed, PlaceBed, Side, Stage, Water
from tidescour.units import FloatArray, utc_text

FORMS_APART = 0.2
"""Share by which two forms of the critical velocity may differ without a word (common practice, no source)."""

FINEST_MM, COARSEST_MM = 0.1, 2.0
"""Sand that the growth laws and the critical velocity were found with [mm]."""


def place_name(opening: str, side: Side) -> str:
    """Return how messages name a place."""
    return f"opening {opening!r}, {side} side"


def row_name(stage: str, opening: str, side: Side) -> str:
    """Return how messages name a stage at a place."""
    return f"stage {stage!r}, {place_name(opening, side)}"


def flow_towards(opening: OpeningFlow, side: Side) -> FloatArray:
    """(n,) array of discharge [m3/s], or given end velocity [m/s], positive towards that side."""
    return opening.signed_flow if side == "basin" else -opening.signed_flow


def sill_height(opening: OpeningFlow, place: PlaceBed) -> FloatArray:
    """(n,) array of the crest's height over the bed at the end of the protection [m]."""
    return opening.crest_level_m - place.bed_level_m


def covered_mean(time_s: FloatArray, values: FloatArray, covered: NDArray[np.bool_]) -> float:
    """Time mean by the trapezoid rule over steps with both ends covered.

    Raises
    ------
    DomainError
        If no step is covered.
    """
    weight = np.diff(time_s) * (covered[1:] & covered[:-1])
    total = float(np.sum(weight))
    if total == 0.0:
        raise DomainError("no part of the stage is covered by the records")
    return float(np.sum(weight * 0.5 * (values[1:] + values[:-1])) / total)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Row:
    """What the steps of `bed_history` share; `flowing` marks covered samples with flow towards this side."""

    where: str
    flow: StageFlow
    opening: OpeningFlow
    place: PlaceBed
    length_m: float
    at_limit: bool
    depth_m: FloatArray
    width_m: FloatArray
    flowing: NDArray[np.bool_]

    @property
    def has_flow(self) -> bool:
        """Whether anything flows towards this side."""
        return bool(np.any(self.flowing))


def bed_history(
    stage: Stage,
    flow: StageFlow,
    opening: OpeningFlow,
    place: PlaceBed,
    bed: Bed,
    water: Water,
    length_m: float | None = None,
) -> BedHistory:
    """Velocity, depth and disturbance at the end of the protection: one stage, one opening, one side.

    Parameters
    ----------
    stage : Stage
        For the alpha that it may give.
    flow : StageFlow
        Levels, and what part of the stage is covered. Only covered samples are judged and averaged.
    opening : OpeningFlow
        One of `flow`.
    place : PlaceBed
        Protection and bed on one side of that opening.
    bed, water : Bed, Water
        Grain and water.
    length_m : float, optional
        Length of the protection instead of the place's own [m]. It may be 6 sill heights exactly, where the search
        for the required length may end. Findings are those of the place's own length, so that there are none then.

    Returns
    -------
    BedHistory
        With findings where the grain is outside the evidence, or the flow is supercritical or its jump swept out.

    Raises
    ------
    DomainError
        If there is flow towards this side over a bed that is dry there, if alpha is needed and its formula is
        outside its evidence, or if there is no critical velocity at the mean depth.
    PlanError
        If the plan lacks a number that is needed.

    References
    ----------
    Continuity; alpha as `alpha_factor`; critical velocity as `critical_velocity`, at the mean depth.
    """
    length = place.length_m if length_m is None else length_m
    row = _Row(
        where=row_name(stage.name, opening.name, place.side),
        flow=flow,
        opening=opening,
        place=place,
        length_m=length,
        at_limit=length_m is not None,
        depth_m=(flow.level_basin_m if place.side == "basin" else opening.level_sea_m) - place.bed_level_m,
        width_m=spread_width(opening.flow_width_m, place.widening, length),
        flowing=flow.covered & (flow_towards(opening, place.side) > 0.0),
    )
    _refuse_dry_bed(row)
    reference_depth = covered_mean(flow.time_s, row.depth_m, flow.covered)
    velocity = _signed_velocity(row)
    alpha, alpha_ref = _alpha(row, stage, reference_depth)
    critical = _critical_velocity(row, bed, water, reference_depth)
    return BedHistory(
        stage=stage.name,
        opening=opening.name,
        side=place.side,
        time_s=flow.time_s,
        covered=flow.covered,
        signed_velocity_m_s=velocity,
        depth_m=row.depth_m,
        alpha=alpha,
        alpha_ref=alpha_ref,
        critical_velocity_m_s=critical,
        reference_depth_m=reference_depth,
        protection_length_m=length,
        submerged_relative_density=submerged_relative_density(
            water.temperature_c, water.salinity_g_kg, bed.grain_density_kg_m3
        ),
        findings=() if length_m is not None else _findings(row, bed, critical, reference_depth, velocity),
    )


def _findings(
    row: _Row, bed: Bed, critical_m_s: float, reference_depth: float, velocity: FloatArray
) -> tuple[Finding, ...]:
    return (
        *_grain_findings(row.place, bed),
        *_threshold_findings(row, bed, critical_m_s, reference_depth),
        *_regime_findings(row, velocity),
    )


def _refuse_dry_bed(row: _Row) -> None:
    dry = row.flowing & (row.depth_m <= 0.0)
    if np.any(dry):
        first = int(np.argmax(dry))
        raise DomainError(
            f"{row.where}: at {utc_text(row.flow.time_s[first])} water flows to this side while the bed at the end of "
            f"the protection is dry (depth {row.depth_m[first]:.2f} m); check bed_level_m = {row.place.bed_level_m:g}"
        )


def _signed_velocity(row: _Row) -> FloatArray:
    towards = flow_towards(row.opening, row.place.side)
    if row.opening.given_end_velocity_m_s is not None:
        return towards
    wet = (towards > 0.0) & (row.depth_m > 0.0)
    if not np.any(wet):
        return np.minimum(towards, 0.0)
    velocity = end_velocity(towards[wet], row.width_m[wet], row.depth_m[wet], row.place.local_velocity_factor)
    # While the flow goes the other way only the sign matters: velocity over discharge is carried across that half
    # tide, so that the zero of u falls where the discharge changes sign, even where this side's bed falls dry.
    steps = np.arange(towards.size)
    return towards * np.interp(steps, steps[wet], velocity / towards[wet])


def _alpha(row: _Row, stage: Stage, reference_depth: float) -> tuple[FloatArray, float]:
    """Alpha at each step, and that of the stage's mean crest; NaN in a row without flow."""
    given = float("nan") if not row.has_flow else _given_alpha(row, stage)
    if given is not None:
        return np.full_like(row.depth_m, given), given
    chezy = row.place.chezy_m05_s
    if chezy is None:
        raise PlanError(
            f"protection.{row.place.side}: chezy_m05_s or alpha is missing for opening {row.opening.name!r}"
        )
    sill = sill_height(row.opening, row.place)
    # The crest moves linearly in time.
    mean_sill = 0.5 * float(sill[0] + sill[-1])
    _refuse_outside_evidence(row, sill, mean_sill, reference_depth, chezy)
    # It only scales the hours: where nothing flows at the mean crest, it may lie outside the evidence.
    alpha_ref = extrapolated_alpha(mean_sill, reference_depth, row.length_m, chezy)
    if sill[0] == sill[-1]:
        return np.full_like(sill, alpha_ref), alpha_ref
    with_flow = alpha_factor(sill[row.flowing], reference_depth, row.length_m, chezy)
    return np.interp(row.flow.time_s, row.flow.time_s[row.flowing], with_flow), alpha_ref


def _given_alpha(row: _Row, stage: Stage) -> float | None:
    planned = next(each for each in stage.opening if each.name == row.opening.name)
    of_stage = planned.alpha_basin if row.place.side == "basin" else planned.alpha_sea
    return row.place.alpha if of_stage is None else of_stage


def _refuse_outside_evidence(
    row: _Row, sill: FloatArray, mean_sill: float, reference_depth: float, chezy: float
) -> None:
    outside = row.flowing & outside_evidence(sill, reference_depth, row.length_m, at_limit=row.at_limit)
    if np.any(outside):
        first = int(np.argmax(outside))
        height, moment = float(sill[first]), f"at {utc_text(row.flow.time_s[first])}"
    elif not np.isfinite(extrapolated_alpha(mean_sill, reference_depth, row.length_m, chezy)):
        height, moment = mean_sill, "at the stage's mean crest"
    else:
        return
    would_be = extrapolated_alpha(height, reference_depth, row.length_m, chezy)
    value = f"would have given {would_be:.3g}" if np.isfinite(would_be) else "has no value there"
    raise DomainError(
        f"{row.where}: {moment} alpha cannot be computed: {_reason(height, reference_depth, row.length_m)}. The "
        f"formula {value}. Write alpha_{row.place.side} = ... beside this opening's crest_level_m in this stage"
    )


def _reason(sill: float, depth: float, length: float) -> str:
    if sill <= 0.0:
        return (
            f"the crest lies {abs(sill):.2f} m under the bed at the end of the protection, and the formula is for a "
            "sill"
        )
    if sill > HIGHEST_SILL * depth:
        return f"the crest stands {sill:.2f} m over that bed, over {HIGHEST_SILL:g} of the mean depth of {depth:.2f} m"
    return (
        f"the protection of {length:.1f} m is not longer than 6 times the crest's height of {sill:.2f} m over the bed "
        "at its end"
    )


def _critical_velocity(row: _Row, bed: Bed, water: Water, reference_depth: float) -> float:
    if row.has_flow and reference_depth <= 0.0:
        raise DomainError(
            f"{row.where}: the bed at the end of the protection lies {-reference_depth:.2f} m over the mean level, so "
            f"that scour has no reference depth; write a lower bed_level_m than {row.place.bed_level_m:g}"
        )
    if bed.critical_velocity_m_s is not None:
        return bed.critical_velocity_m_s
    d50_mm = bed.d50_mm if row.place.d50_mm is None else row.place.d50_mm
    if d50_mm is None:
        raise PlanError("bed.d50_mm: give the grain size, or bed.critical_velocity_m_s")
    if not row.has_flow and 12.0 * reference_depth <= bed.roughness_d50 * d50_mm / 1000.0:
        return float("nan")
    relative_density = submerged_relative_density(water.temperature_c, water.salinity_g_kg, bed.grain_density_kg_m3)
    viscosity = kinematic_viscosity(water.temperature_c, water.salinity_g_kg)
    try:
        return critical_velocity(
            bed.shields, d50_mm / 1000.0, reference_depth, relative_density, viscosity, bed.roughness_d50
        )
    except DomainError as error:
        raise DomainError(f"{row.where}: {error}") from error


def _grain_findings(place: PlaceBed, bed: Bed) -> tuple[Finding, ...]:
    d50_mm = bed.d50_mm if place.d50_mm is None else place.d50_mm
    if d50_mm is None or FINEST_MM <= d50_mm <= COARSEST_MM:
        return ()
    reason = "finer beds are held by cohesion" if d50_mm < FINEST_MM else "coarser beds were not tested"
    return (
        Finding(
            severity="warning",
            code="grain-outside-evidence",
            where=place_name(place.opening, place.side),
            message=f"d50 = {d50_mm:g} mm is outside the {FINEST_MM:g} to {COARSEST_MM:g} mm of the evidence: {reason}",
        ),
    )


def _threshold_findings(row: _Row, bed: Bed, critical_m_s: float, reference_depth: float) -> tuple[Finding, ...]:
    """Tell where the critical velocity is far from the closed form for quartz, given the whole grading."""
    if not row.has_flow or bed.d50_mm is None or bed.d90_mm is None or row.place.d50_mm is not None:
        return ()
    if bed.critical_velocity_m_s is not None or not FINEST_MM <= bed.d50_mm <= COARSEST_MM:
        return ()
    other = closed_form_critical_velocity(bed.d50_mm / 1000.0, bed.d90_mm / 1000.0, reference_depth)
    if abs(other / critical_m_s - 1.0) <= FORMS_APART:
        return ()
    return (
        Finding(
            severity="note",
            code="threshold-forms-differ",
            where=row.where,
            message=(
                f"the critical velocity is {critical_m_s:.3f} m/s; van Rijn's closed form for quartz in fresh water of "
                f"15 C gives {other:.3f} m/s"
            ),
        ),
    )


def _regime_findings(row: _Row, velocity: FloatArray) -> tuple[Finding, ...]:
    """One error where the flow at the end of the protection is supercritical or its jump is swept out."""
    if not row.has_flow:
        return ()
    tail = row.depth_m[row.flowing]
    froude = froude_number(velocity[row.flowing], tail)
    missing = _needed_tailwater(row) - tail
    beyond = (froude > 1.0) | (missing > 0.0)
    if not np.any(beyond):
        return ()
    first = row.flow.time_s[row.flowing][np.argmax(beyond)]
    worst = [f"Froude number up to {np.max(froude):.2f}"]
    if np.max(missing) > 0.0:
        worst.append(f"tailwater up to {np.max(missing):.2f} m under the depth that holds the jump")
    return (
        Finding(
            severity="error",
            code="swept-out-jump",
            where=row.where,
            message=(
                "supercritical flow or a swept-out jump at the end of the protection in "
                f"{100.0 * np.count_nonzero(beyond) / beyond.size:.2g} % of the time with flow, first at "
                f"{utc_text(first)}: {', '.join(worst)}; alpha and the growth law do not cover this"
            ),
        ),
    )


def _needed_tailwater(row: _Row) -> FloatArray:
    """Depth that holds the jump, at the samples with flow; 0 where the velocity is given and no discharge is known."""
    if row.opening.given_end_velocity_m_s is not None:
        return np.zeros(np.count_nonzero(row.flowing))
    upstream = row.opening.level_sea_m if row.place.side == "basin" else row.flow.level_basin_m
    unit_discharge = np.abs(row.opening.discharge_m3_s[row.flowing]) / row.width_m[row.flowing]
    return conjugate_depth(unit_discharge, upstream[row.flowing] - row.place.bed_level_m)
