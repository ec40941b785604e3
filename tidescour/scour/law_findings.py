"""Where a hole meets another layer, or a growth law comes to the ends of what it knows."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from tidescour.bed.history import place_name, row_name
from tidescour.bed.layers import BedLayers
from tidescour.errors import Finding
from tidescour.plan.models_bed import PlaceBed
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.length import time_reached
from tidescour.scour.records import ChainStep, GrowthCurve, RowDurations
from tidescour.scour.shapes import MODEL_CURVE, SATURATING
from tidescour.units import utc_text

NEAR_JUMP: Final = 2.0
"""Equilibrium depth over water depth up to which a saturating law is near its jump (judgement, no source)."""


def layer_findings(rows: Sequence[RowDurations], steps: Sequence[ChainStep], layers: BedLayers) -> tuple[Finding, ...]:
    """Tell of every layer that the hole of one place reaches, and when.

    Parameters
    ----------
    rows, steps : sequences of one length
        Rows of one place and their growth.
    layers : BedLayers
        Layers of the bed there.

    Returns
    -------
    tuple of Finding
        A note a layer.
    """
    return tuple(
        Finding(
            severity="note",
            code="layer-reached",
            where=row_name(row.layers[0].stage, row.layers[0].opening, row.layers[0].side),
            message=(
                f"the hole reaches layer {layer.name!r} at {met.depth_m:.2f} m below the original bed at "
                f"{utc_text(met.time_s)}: its critical velocity of {row.layers[met.layer].critical_velocity_m_s:.3f} "
                f"m/s counts from then on, instead of {row.layers[met.layer - 1].critical_velocity_m_s:.3f} m/s"
            ),
        )
        for row, step in zip(rows, steps, strict=True)
        for met in step.reached
        if (layer := layers.layers[met.layer]) is not None
    )


def law_findings(rows: Sequence[RowDurations], steps: Sequence[ChainStep], law: GrowthLaw) -> tuple[Finding, ...]:
    """Tell where one place's growth leaves what its law knows.

    Parameters
    ----------
    rows, steps : sequences of one length
        Rows of one place and their growth.
    law : GrowthLaw
        Growth law.

    Returns
    -------
    tuple of Finding
        For a saturating law a warning where the equilibrium depth at the reference is not well over the water depth,
        where the law has its jump; for a model curve a warning where a growing hole is deeper than its last row; none
        for a power law.
    """
    if law.shape == SATURATING:
        return _small_equilibria(rows, steps)
    if law.shape == MODEL_CURVE:
        return _beyond_curve(rows, steps, float(np.exp(law.curve[1, -1])))
    return ()


def _small_equilibria(rows: Sequence[RowDurations], steps: Sequence[ChainStep]) -> tuple[Finding, ...]:
    small = [
        of_layer
        for row, step in zip(rows, steps, strict=True)
        for of_layer in (row.layers[number] for number in (step.layer, *(met.layer for met in step.reached)))
        if of_layer.reference_excess_m_s > 0.0 and of_layer.scale_m <= NEAR_JUMP * of_layer.reference_depth_m
    ]
    if not small:
        return ()
    stages = len({of_layer.stage for of_layer in small})
    least = min(small, key=lambda each: each.scale_m / each.reference_depth_m)
    return (
        Finding(
            severity="warning",
            code="small-equilibrium",
            where=place_name(least.opening, least.side),
            message=(
                f"in {stages} of {len(rows)} stages the equilibrium depth at the reference is under {NEAR_JUMP:g} "
                f"times the water depth, least in {least.stage!r} with {least.scale_m:.2f} m in "
                f"{least.reference_depth_m:.2f} m of water: where it equals the water depth the published curve has no "
                "value, near it the hole grows too fast, below it another form serves, at 0 nothing grows, and a "
                "stronger bed or slower flow can come out deeper. Read the depths of the explicit and the time-scale "
                "law beside these (sensitivity.csv)"
            ),
        ),
    )


def _beyond_curve(rows: Sequence[RowDurations], steps: Sequence[ChainStep], last_ratio: float) -> tuple[Finding, ...]:
    beyond = [
        (step.end_depth_m / of_layer.reference_depth_m, of_layer)
        for row, step in zip(rows, steps, strict=True)
        if (of_layer := row.layers[step.layer]).growth_rate > 0.0
        and step.end_depth_m > last_ratio * of_layer.reference_depth_m
    ]
    if not beyond:
        return ()
    ratio, worst = max(beyond, key=lambda each: each[0])
    return (
        Finding(
            severity="warning",
            code="beyond-model-curve",
            where=place_name(worst.opening, worst.side),
            message=(
                f"the hole becomes {ratio:.2f} times as deep as the water in stage {worst.stage!r}, but the model's "
                f"curve ends at {last_ratio:.2f}: it goes on with the slope of its last two rows"
            ),
        ),
    )


def stop_findings(place: PlaceBed, curve: GrowthCurve, final_depth_m: float) -> tuple[Finding, ...]:
    """Warn where the hole of one place becomes as deep as the works may let it, within the programme.

    Parameters
    ----------
    place : PlaceBed
        With the depth at which the works stop, if there is one.
    curve : GrowthCurve
        Growth of the hole.
    final_depth_m : float
        Depth at the end under the rule that drives [m].

    Returns
    -------
    tuple of Finding
        None or one, with the date.
    """
    if place.stop_depth_m is None:
        return ()
    reached_s = time_reached(curve, place.stop_depth_m)
    if np.isnan(reached_s):
        return ()
    return (
        Finding(
            severity="warning",
            code="stop-in-programme",
            where=place_name(place.opening, place.side),
            message=(
                f"the hole reaches stop_depth_m = {place.stop_depth_m:g} at {utc_text(reached_s)} and ends the "
                f"programme {final_depth_m:.2f} m deep"
            ),
        ),
    )
