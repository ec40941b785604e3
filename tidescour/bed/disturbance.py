"""Alpha and turbulence of one stage at one place: given, from the place's own table, or by the formula."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from tidescour.bed.alpha import (
    HIGHEST_SILL,
    alpha_factor,
    extrapolated_alpha,
    implied_turbulence,
    outside_evidence,
)
from tidescour.bed.row import Row
from tidescour.errors import DomainError, PlanError
from tidescour.plan.models import Stage
from tidescour.units import FloatArray, utc_text

_NONE: Final = float("nan")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Disturbance:
    """Disturbance factor and relative turbulence at the end of the protection.

    `alpha` and `turbulence` are (n,) arrays, one value a step; `alpha_ref` and `turbulence_ref` are those of the
    stage's mean crest. All are NaN in a row without flow.
    """

    alpha: FloatArray
    alpha_ref: float
    turbulence: FloatArray
    turbulence_ref: float


def disturbance(row: Row, stage: Stage, reference_depth_m: float) -> Disturbance:
    """Alpha and turbulence of one stage at one place.

    Parameters
    ----------
    row : Row
        Flow and protection. Where the length is one of the search, it may be 6 sill heights exactly, and beyond the
        last length of the place's table its last alpha holds, which is cautious.
    stage : Stage
        Its alpha goes before the place's, before the place's table, before the formula.
    reference_depth_m : float
        Mean depth at the end of the protection [m].

    Returns
    -------
    Disturbance
        The turbulence is that which the formula has with this alpha (`implied_turbulence`).

    Raises
    ------
    DomainError
        If there is flow, and the length is outside the place's table or the formula outside its evidence.
    PlanError
        If the formula is needed and the protection has no Chezy coefficient.
    """
    alpha, alpha_ref = _alpha(row, stage, reference_depth_m)
    chezy = row.place.chezy_m05_s
    return Disturbance(
        alpha=alpha,
        alpha_ref=alpha_ref,
        turbulence=implied_turbulence(alpha, chezy),
        turbulence_ref=float(implied_turbulence(np.asarray(alpha_ref), chezy)),
    )


def _alpha(row: Row, stage: Stage, reference_depth: float) -> tuple[FloatArray, float]:
    """Alpha at each step, and that of the stage's mean crest; NaN in a row without flow."""
    known = _NONE if not row.has_flow else _known_alpha(row, stage)
    if known is not None:
        return np.full_like(row.depth_m, known), known
    chezy = row.place.chezy_m05_s
    if chezy is None:
        raise PlanError(
            f"protection.{row.place.side}: chezy_m05_s or alpha is missing for opening {row.opening.name!r}"
        )
    sill = row.sill_m
    # The crest moves linearly in time.
    mean_sill = 0.5 * float(sill[0] + sill[-1])
    _refuse_outside_evidence(row, mean_sill, reference_depth, chezy)
    # It only scales the hours: where nothing flows at the mean crest, it may lie outside the evidence.
    alpha_ref = extrapolated_alpha(mean_sill, reference_depth, row.length_m, chezy)
    if sill[0] == sill[-1]:
        return np.full_like(sill, alpha_ref), alpha_ref
    with_flow = alpha_factor(sill[row.flowing], reference_depth, row.length_m, chezy)
    return np.interp(row.flow.time_s, row.flow.time_s[row.flowing], with_flow), alpha_ref


def _known_alpha(row: Row, stage: Stage) -> float | None:
    """Alpha that needs no formula: of the stage, of the place, or from its table; None where there is none."""
    planned = next(each for each in stage.opening if each.name == row.opening.name)
    of_stage = planned.alpha_basin if row.place.side == "basin" else planned.alpha_sea
    if of_stage is not None:
        return of_stage
    if row.place.alpha is not None:
        return row.place.alpha
    return _alpha_of_table(row) if row.place.alpha_lengths_m else None


def _alpha_of_table(row: Row) -> float:
    lengths = row.place.alpha_lengths_m
    if row.length_m < lengths[0] or (row.length_m > lengths[-1] and not row.searching):
        raise DomainError(
            f"{row.where}: the protection of {row.length_m:.1f} m is outside the lengths for which alpha is known, "
            f"alpha_lengths_m from {lengths[0]:g} to {lengths[-1]:g} m. Write a length_m between, give "
            f"alpha_lengths_m and alpha_values for it, or write alpha_{row.place.side} = ... beside this opening's "
            "crest_level_m in this stage"
        )
    return float(np.interp(row.length_m, lengths, row.place.alpha_values))


def _refuse_outside_evidence(row: Row, mean_sill: float, reference_depth: float, chezy: float) -> None:
    outside = row.flowing & outside_evidence(row.sill_m, reference_depth, row.length_m, at_limit=row.searching)
    if np.any(outside):
        first = int(np.argmax(outside))
        height, moment = float(row.sill_m[first]), f"at {utc_text(row.flow.time_s[first])}"
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
