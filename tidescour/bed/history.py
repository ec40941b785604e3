"""What the bed feels through a stage: velocity, depth, alpha and critical velocity at the end of the protection."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tidescour.bed.disturbance import disturbance
from tidescour.bed.end_velocity import conjugate_depth, end_velocity, froude_number
from tidescour.bed.records import BedHistory
from tidescour.bed.row import Row
from tidescour.bed.spreading import SPREADINGS, USUAL_WIDENING, spread_width, velocity_share
from tidescour.bed.threshold import closed_form_critical_velocity, critical_velocity
from tidescour.bed.water import kinematic_viscosity, submerged_relative_density
from tidescour.errors import DomainError, Finding, PlanError
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.kinds import Side
from tidescour.plan.models import Stage, Water
from tidescour.plan.models_bed import Bed, BedLayer, PlaceBed
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


def grain_size_mm(place: PlaceBed, bed: Bed, layer: BedLayer | None) -> float | None:
    """Return d50 [mm] of a layer, or of the surface of a place; None where only a critical velocity is given."""
    if layer is not None:
        return layer.d50_mm
    return bed.d50_mm if place.d50_mm is None else place.d50_mm


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


def bed_history(
    stage: Stage,
    flow: StageFlow,
    opening: OpeningFlow,
    place: PlaceBed,
    bed: Bed,
    water: Water,
    length_m: float | None = None,
    layer: BedLayer | None = None,
) -> BedHistory:
    """Velocity, depth and disturbance at the end of the protection: one stage, one opening, one side.

    Parameters
    ----------
    stage : Stage
        For the alpha that it may give; that goes before the place's, before its table, before the formula.
    flow : StageFlow
        Levels, and what part of the stage is covered. Only covered samples are judged and averaged.
    opening : OpeningFlow
        One of `flow`.
    place : PlaceBed
        Protection and bed on one side of that opening.
    bed, water : Bed, Water
        Grain and water.
    length_m : float, optional
        Length of the protection instead of the place's own [m], for the search for the required one. It may be 6 sill
        heights exactly, where the search may end, and longer than the place's table of alpha, whose last value then
        holds. Findings are those of the place's own length, so that there are none then.
    layer : BedLayer, optional
        Layer that the flow digs in, instead of the surface: its grain or critical velocity is taken. All else is the
        same, and so are the findings of the flow.

    Returns
    -------
    BedHistory
        With findings where the grain is outside the evidence, spreading lowers the velocity, or the flow is
        supercritical or its jump swept out.

    Raises
    ------
    DomainError
        If there is flow towards this side over a bed that is dry there, if alpha is needed and the length is outside
        its table or the formula outside its evidence, or if there is no critical velocity at the mean depth.
    PlanError
        If the plan lacks a number that is needed.

    References
    ----------
    Continuity; alpha as `alpha_factor`; critical velocity as `critical_velocity`, at the mean depth.
    """
    length = place.length_m if length_m is None else length_m
    row = Row(
        where=row_name(stage.name, opening.name, place.side),
        flow=flow,
        opening=opening,
        place=place,
        length_m=length,
        searching=length_m is not None,
        depth_m=(flow.level_basin_m if place.side == "basin" else opening.level_sea_m) - place.bed_level_m,
        width_m=spread_width(place.spreading, opening.flow_width_m, length, place.widening),
        sill_m=sill_height(opening, place),
        flowing=flow.covered & (flow_towards(opening, place.side) > 0.0),
    )
    _refuse_dry_bed(row)
    reference_depth = covered_mean(flow.time_s, row.depth_m, flow.covered)
    velocity = _signed_velocity(row)
    disturbed = disturbance(row, stage, reference_depth)
    critical = _critical_velocity(row, bed, layer, water, reference_depth)
    return BedHistory(
        stage=stage.name,
        opening=opening.name,
        side=place.side,
        time_s=flow.time_s,
        covered=flow.covered,
        signed_velocity_m_s=velocity,
        depth_m=row.depth_m,
        alpha=disturbed.alpha,
        alpha_ref=disturbed.alpha_ref,
        turbulence=disturbed.turbulence,
        turbulence_ref=disturbed.turbulence_ref,
        critical_velocity_m_s=critical,
        reference_depth_m=reference_depth,
        protection_length_m=length,
        chezy_m05_s=place.chezy_m05_s,
        submerged_relative_density=submerged_relative_density(
            water.temperature_c, water.salinity_g_kg, bed.grain_density_kg_m3
        ),
        findings=() if row.searching else _findings(row, bed, layer, critical, reference_depth, velocity),
    )


def _findings(
    row: Row, bed: Bed, layer: BedLayer | None, critical_m_s: float, reference_depth: float, velocity: FloatArray
) -> tuple[Finding, ...]:
    return (
        *_grain_findings(row.place, bed, layer),
        *(_threshold_findings(row, bed, critical_m_s, reference_depth) if layer is None else ()),
        *_spreading_findings(row, velocity),
        *_regime_findings(row, velocity),
    )


def _refuse_dry_bed(row: Row) -> None:
    dry = row.flowing & (row.depth_m <= 0.0)
    if np.any(dry):
        first = int(np.argmax(dry))
        raise DomainError(
            f"{row.where}: at {utc_text(row.flow.time_s[first])} water flows to this side while the bed at the end of "
            f"the protection is dry (depth {row.depth_m[first]:.2f} m); check bed_level_m = {row.place.bed_level_m:g}"
        )


def _signed_velocity(row: Row) -> FloatArray:
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


def _critical_velocity(row: Row, bed: Bed, layer: BedLayer | None, water: Water, reference_depth: float) -> float:
    if row.has_flow and reference_depth <= 0.0:
        raise DomainError(
            f"{row.where}: the bed at the end of the protection lies {-reference_depth:.2f} m over the mean level, so "
            f"that scour has no reference depth; write a lower bed_level_m than {row.place.bed_level_m:g}"
        )
    given = bed.critical_velocity_m_s if layer is None else layer.critical_velocity_m_s
    if given is not None:
        return given
    d50_mm = grain_size_mm(row.place, bed, layer)
    if d50_mm is None:
        keys = "bed" if layer is None else f"bed.layer {layer.name!r}"
        raise PlanError(f"{keys}: give the grain size d50_mm, or critical_velocity_m_s")
    if not row.has_flow and 12.0 * reference_depth <= bed.roughness_d50 * d50_mm / 1000.0:
        return float("nan")
    relative_density = submerged_relative_density(water.temperature_c, water.salinity_g_kg, bed.grain_density_kg_m3)
    viscosity = kinematic_viscosity(water.temperature_c, water.salinity_g_kg)
    try:
        return critical_velocity(
            bed.shields,
            bed.velocity_profile,
            d50_mm / 1000.0,
            reference_depth,
            relative_density,
            viscosity,
            bed.roughness_d50,
        )
    except DomainError as error:
        raise DomainError(f"{row.where}{_in_layer(layer)}: {error}") from error


def _in_layer(layer: BedLayer | None) -> str:
    return "" if layer is None else f", layer {layer.name!r}"


def _grain_findings(place: PlaceBed, bed: Bed, layer: BedLayer | None) -> tuple[Finding, ...]:
    d50_mm = grain_size_mm(place, bed, layer)
    if d50_mm is None or FINEST_MM <= d50_mm <= COARSEST_MM:
        return ()
    reason = "finer beds are held by cohesion" if d50_mm < FINEST_MM else "coarser beds were not tested"
    return (
        Finding(
            severity="warning",
            code="grain-outside-evidence",
            where=place_name(place.opening, place.side) + _in_layer(layer),
            message=f"d50 = {d50_mm:g} mm is outside the {FINEST_MM:g} to {COARSEST_MM:g} mm of the evidence: {reason}",
        ),
    )


def _threshold_findings(row: Row, bed: Bed, critical_m_s: float, reference_depth: float) -> tuple[Finding, ...]:
    """Tell where the critical velocity is far from the closed form for quartz, given the whole grading."""
    if not row.has_flow or bed.d50_mm is None or bed.d90_mm is None or row.place.own_d50:
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


def _spreading_findings(row: Row, velocity: FloatArray) -> tuple[Finding, ...]:
    """One note where spreading lowers the highest velocity, with what the other ways to spread would leave of it."""
    if not row.has_flow or row.opening.given_end_velocity_m_s is not None:
        return ()
    peak = int(np.argmax(np.where(row.flowing, velocity, 0.0)))
    width = row.opening.flow_width_m[peak : peak + 1]
    widening = row.place.widening or USUAL_WIDENING
    shares = {name: float(velocity_share(name, width, row.length_m, widening)[0]) for name in SPREADINGS}
    taken = row.place.spreading
    if shares[taken] == 1.0:
        return ()
    full = float(velocity[peak]) / shares[taken]
    others = ", ".join(f"{full * share:.2f} m/s with {name!r}" for name, share in shares.items() if name != taken)
    return (
        Finding(
            severity="note",
            code="spreading-lowers-velocity",
            where=row.where,
            message=(
                f"with spreading {taken!r} the velocity at the end of the protection is at most {velocity[peak]:.2f} "
                f"m/s; it would be {others} (fixed rate: {widening:g} per side). 'none' is the cautious one: the "
                "centre of a jet keeps its velocity over about six widths"
            ),
        ),
    )


def _regime_findings(row: Row, velocity: FloatArray) -> tuple[Finding, ...]:
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


def _needed_tailwater(row: Row) -> FloatArray:
    """Depth that holds the jump, at the samples with flow; 0 where the velocity is given and no discharge is known."""
    if row.opening.given_end_velocity_m_s is not None:
        return np.zeros(np.count_nonzero(row.flowing))
    upstream = row.opening.level_sea_m if row.place.side == "basin" else row.flow.level_basin_m
    unit_discharge = np.abs(row.opening.discharge_m3_s[row.flowing]) / row.width_m[row.flowing]
    return conjugate_depth(unit_discharge, upstream[row.flowing] - row.place.bed_level_m)
