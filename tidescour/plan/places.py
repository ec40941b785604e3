"""Places: an opening and a side, with the protection and the bed that hold there."""

from __future__ import annotations

from typing import Any

from tidescour.plan.kinds import SIDES, Side
from tidescour.plan.models import Plan
from tidescour.plan.models_bed import PlaceBed, PlaceOverride, Protection


def places(plan: Plan) -> tuple[PlaceBed, ...]:
    """Return the bed and protection of every place of a plan that was read for a run.

    Parameters
    ----------
    plan : Plan
        With the keys of `[protection]` that a run needs.

    Returns
    -------
    tuple of PlaceBed
        Openings in the order in which the stages first name them, sides in the order of `SIDES`. What neither the
        opening nor the side gives has its default: widening 0, `alpha_basis` integral, local velocity factor 1, no
        hole at the start, the grain size of `[bed]`.
    """
    return tuple(_place(plan, opening, side) for opening in opening_names(plan) for side in SIDES)


def opening_names(plan: Plan) -> tuple[str, ...]:
    """Return the names of all openings, each once, in the order in which the stages first name them."""
    return tuple(dict.fromkeys(opening.name for stage in plan.stage for opening in stage.opening))


def setting(side: PlaceOverride, own: PlaceOverride | None, key: str) -> Any:
    """Return one key of a place: what the opening has for itself, else what the side has; None where neither."""
    special = getattr(own, key) if own is not None else None
    return getattr(side, key) if special is None else special


def protection_of(plan: Plan, side: Side) -> Protection:
    """Return the protection of one side."""
    return plan.protection.sea if side == "sea" else plan.protection.basin


def _place(plan: Plan, opening: str, side: Side) -> PlaceBed:
    protection = protection_of(plan, side)
    own = protection.opening.get(opening)

    def given(key: str, default: Any = None) -> Any:
        value = setting(protection, own, key)
        return default if value is None else value

    alpha, lengths, values = _alpha(protection, own)
    return PlaceBed(
        opening=opening,
        side=side,
        length_m=given("length_m"),
        bed_level_m=given("bed_level_m"),
        chezy_m05_s=given("chezy_m05_s"),
        spreading=given("spreading", "fixed-rate" if given("widening", 0.0) > 0.0 else "none"),
        widening=given("widening", 0.0),
        alpha=alpha,
        alpha_lengths_m=lengths,
        alpha_values=values,
        alpha_basis=given("alpha_basis", "integral"),
        local_velocity_factor=given("local_velocity_factor", 1.0),
        failure_slope_cot=given("failure_slope_cot"),
        upstream_slope_cot=given("upstream_slope_cot"),
        depth_margin_factor=given("depth_margin_factor", 1.0),
        start_depth_m=given("start_depth_m", 0.0),
        growth_factor=given("growth_factor", 1.0),
        stop_depth_m=given("stop_depth_m"),
        stop_slope_cot=given("stop_slope_cot"),
        stop_slope_height_m=given("stop_slope_height_m"),
        d50_mm=given("d50_mm", plan.bed.d50_mm),
        own_d50=given("d50_mm") is not None,
    )


def _alpha(side: PlaceOverride, own: PlaceOverride | None) -> tuple[float | None, tuple[float, ...], tuple[float, ...]]:
    """Return the given alpha, or lengths and values of its table; what the opening has goes before the side's."""
    for source in (own, side):
        if source is not None and source.alpha is not None:
            return source.alpha, (), ()
        if source is not None and source.alpha_lengths_m is not None and source.alpha_values is not None:
            return None, source.alpha_lengths_m, source.alpha_values
    return None, (), ()
