"""How long the bed protection must be, so that a slide of the hole's slope does not reach the sill."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Final

import numpy as np
from scipy.optimize import brentq

from tidescour.bed.alpha import REATTACHMENT
from tidescour.bed.history import flow_towards, place_name, sill_height
from tidescour.bed.slope import slide_retreat
from tidescour.errors import DomainError, Finding
from tidescour.gap.records import StageFlow
from tidescour.plan.models_bed import PlaceBed
from tidescour.scour.chain import chain_place, final_depth
from tidescour.scour.curves import state_at
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import (
    ChainStep,
    EffectiveDuration,
    GrowthCurve,
    LengthCurve,
    RequiredLength,
    RowDurations,
    Rule,
)
from tidescour.units import FloatArray

LENGTHS_TRIED: Final = 30
"""How often a longer protection is tried where the depth rises with its length."""


def minimum_length(flows: Sequence[StageFlow], place: PlaceBed) -> float:
    """Six times the highest sill over the bed with flow towards this side; no less than the table of alpha begins.

    Parameters
    ----------
    flows : sequence of StageFlow
        All stages; those without this opening, and uncovered samples, do not count.
    place : PlaceBed
        Opening, side and bed level.

    Returns
    -------
    float
        Length [m], not negative; 0 without flow, or where the crest never stands above the bed. Where alpha comes from
        the place's own table, at least its shortest length.
    """
    highest = 0.0
    for flow in flows:
        for opening in flow.openings:
            if opening.name == place.opening:
                flowing = flow.covered & (flow_towards(opening, place.side) > 0.0)
                highest = max(highest, float(np.max(sill_height(opening, place)[flowing], initial=0.0)))
    return max(REATTACHMENT * highest, *place.alpha_lengths_m[:1], 0.0)


def slope_length(final_depth_m: Callable[[float], float], failure_slope_cot: float, minimum_m: float) -> float:
    """Length that equals the failure slope times the final depth of the hole behind it.

    Parameters
    ----------
    final_depth_m : callable
        Final depth [m] behind a protection of a given length [m]; not negative, and not rising with the length
        without end.
    failure_slope_cot : float
        Slope 1 in n after a slide, positive.
    minimum_m : float
        Shortest length [m], not negative.

    Returns
    -------
    float
        Length [m], to a micrometre; the minimum where the slope asks for no more.

    Raises
    ------
    DomainError
        If the slope is not positive, the minimum is negative, or the depth rises with the length without end or has
        no value.

    References
    ----------
    L = n h(L) has at most one root over the minimum where h does not rise with L, and it is not longer than n times
    the depth behind the minimum (Dutch closure practice, from memory). A saturating law whose equilibrium depth is
    little over the water depth grows faster for a lower one: there h may rise with L for a while, and longer lengths
    are tried.
    """
    if not (failure_slope_cot > 0.0 and minimum_m >= 0.0):
        raise DomainError(f"slope 1 in {failure_slope_cot:g} must be positive, length {minimum_m:g} m not negative")

    def shortage(length_m: float) -> float:
        return failure_slope_cot * final_depth_m(length_m) - length_m

    longest = failure_slope_cot * final_depth_m(minimum_m)
    if np.isnan(longest):
        raise DomainError(f"behind a protection of {minimum_m:g} m the final depth has no value")
    if longest <= minimum_m:
        return minimum_m
    for _ in range(LENGTHS_TRIED):
        left = shortage(longest)
        if abs(left) <= 1e-9 * longest:
            return longest
        if left < 0.0:
            return float(brentq(shortage, minimum_m, longest, xtol=1e-6, rtol=1e-12))
        longest += left
    raise DomainError("the final depth rises with the length of the protection: no required length can be found")


def nearby_length(
    final_depth_m: Callable[[float], float], failure_slope_cot: float, minimum_m: float, start_m: float
) -> float:
    """Length as `slope_length` has it, from a start that is near it, in three evaluations.

    Parameters
    ----------
    final_depth_m, failure_slope_cot, minimum_m
        As in `slope_length`.
    start_m : float
        Length near the one sought [m].

    Returns
    -------
    float
        Length [m]; a secant's third point, off by millimetres where the depth bends little between start and length, by
        centimetres over a layer's top.

    Raises
    ------
    DomainError
        Whatever `final_depth_m` raises.
    """

    def shortage(length_m: float) -> float:
        return failure_slope_cot * final_depth_m(length_m) - length_m

    before = max(start_m, minimum_m)
    short_before = shortage(before)
    at = max(before + short_before, minimum_m)
    for _ in range(2):
        if at == before:
            break
        short_at = shortage(at)
        after = max(at - short_at * (at - before) / (short_at - short_before), minimum_m)
        before, short_before, at = at, short_at, after
    return at


def allowed_depth(place: PlaceBed) -> float:
    """Return the depth for which the given length of a place is just enough by the slope rule [m]."""
    return place.length_m / (place.failure_slope_cot * place.depth_margin_factor)


def required_length(
    place: PlaceBed,
    minimum_m: float,
    rows_at: Callable[[float], Sequence[RowDurations]],
    law: GrowthLaw,
    rule: Rule,
    upstream_slope_cot: float = float("nan"),
) -> RequiredLength:
    """Length of protection that one place needs.

    Parameters
    ----------
    place : PlaceBed
        Failure slope, margin, start depth, growth factor and names.
    minimum_m : float
        From `minimum_length` [m].
    rows_at : callable
        Rows of the place, in the order of the stages, computed anew for a given length [m]. Each row's own peak
        serves as reference: a given reference may fall under the threshold of a longer protection, and the depth
        does not depend on it (of a saturating law hardly, where a hole is there at the start).
    law : GrowthLaw
        Growth law.
    rule : str
        Tide rule that drives growth.
    upstream_slope_cot : float
        Slope 1 in this of the hole towards the protection before a slide; NaN where it is not known.

    Returns
    -------
    RequiredLength
        With a note where the minimum governs, and a warning where the place's own length is shorter. The length by a
        single slide is NaN without a slope before it that is steeper.

    Raises
    ------
    DomainError
        As `slope_length`, and whatever `rows_at` raises.

    References
    ----------
    L = n x margin x final depth(L); or, for one slide that takes as much from above as it leaves below,
    L = (n - slope before) / 2 x margin x final depth(L). Where that is under the least length, it is the bare retreat
    behind the least length, which does not govern.
    """

    def designed_depth(length_m: float) -> float:
        return place.depth_margin_factor * final_depth(
            chained(place, rows_at(length_m), law, rule), place.start_depth_m
        )

    length = slope_length(designed_depth, place.failure_slope_cot, minimum_m)
    rows = rows_at(length)
    steps = chained(place, rows, law, rule)
    governed = length == minimum_m
    final = final_depth(steps, place.start_depth_m)
    main = main_row(rows, steps)
    return RequiredLength(
        length_m=length,
        minimum_m=minimum_m,
        final_depth_m=final,
        alpha=float("nan") if main is None else main.alpha,
        governed_by_minimum=governed,
        upstream_slope_cot=upstream_slope_cot,
        single_slide_m=_single_slide(designed_depth, place.failure_slope_cot, upstream_slope_cot, minimum_m),
        findings=(
            *_minimum_findings(place, minimum_m, final, governed),
            *_shortage_findings(place, length),
            *_table_findings(place, length),
            *_slope_findings(place, upstream_slope_cot),
        ),
    )


def chained(place: PlaceBed, rows: Sequence[RowDurations], law: GrowthLaw, rule: Rule) -> tuple[ChainStep, ...]:
    """Growth of a place through its rows, from its own start and with its own growth factor."""
    return chain_place(rows, law, place.start_depth_m, rule, place.growth_factor)


def main_row(rows: Sequence[RowDurations], steps: Sequence[ChainStep]) -> EffectiveDuration | None:
    """Return the row with the largest share in the growth of its place; None where nothing grows."""
    shares = [step.share for step in steps]
    if not any(share > 0.0 for share in shares):
        return None
    largest = int(np.argmax(shares))
    return rows[largest].layers[steps[largest].layer]


def length_curve(
    place: PlaceBed,
    lengths_m: FloatArray,
    rows_at: Callable[[float], Sequence[RowDurations]],
    law: GrowthLaw,
    rule: Rule,
    reference: EffectiveDuration,
) -> LengthCurve:
    """How length, disturbance, duration and depth of a place depend on each other.

    Parameters
    ----------
    place, rows_at, law, rule
        As in `required_length`.
    lengths_m : (n,) array
        Lengths of protection [m], increasing.
    reference : EffectiveDuration
        Row whose curve the hours of the whole programme refer to.

    Returns
    -------
    LengthCurve
        Hours are those that the reference's own curve takes to the final depth from a flat bed; NaN where it does not
        reach so deep.
    """
    alphas, hours, depths = np.full((3, lengths_m.size), np.nan)
    for at, length in enumerate(lengths_m.tolist()):
        rows = rows_at(length)
        steps = chained(place, rows, law, rule)
        main = main_row(rows, steps)
        depths[at] = final_depth(steps, place.start_depth_m)
        state = float(state_at(law, depths[at] / place.growth_factor, reference.scale_m))
        if reference.growth_rate > 0.0 and np.isfinite(state):
            hours[at] = state / reference.growth_rate
        if main is not None:
            alphas[at] = main.alpha
    return LengthCurve(length_m=lengths_m, alpha=alphas, effective_duration_h=hours, final_depth_m=depths)


def time_reached(curve: GrowthCurve, depth_m: float) -> float:
    """Return when a growing hole first has a depth, seconds since 1970, linear between points; NaN where never."""
    deep = np.flatnonzero(curve.depth_m >= depth_m)
    if not deep.size:
        return float("nan")
    at = int(deep[0])
    if at == 0:
        return float(curve.time_s[0])
    before, after = curve.depth_m[at - 1], curve.depth_m[at]
    share = (depth_m - before) / (after - before)
    return float(curve.time_s[at - 1] + share * (curve.time_s[at] - curve.time_s[at - 1]))


def _single_slide(
    final_depth_m: Callable[[float], float], cot_after: float, cot_before: float, minimum_m: float
) -> float:
    """Return the length that equals the retreat of one slide; where that is under the least, the bare retreat."""
    if not cot_before < cot_after:
        return float("nan")
    retreat = slide_retreat(1.0, cot_before, cot_after)
    length = slope_length(final_depth_m, retreat, minimum_m)
    return length if length > minimum_m else retreat * final_depth_m(minimum_m)


def _slope_findings(place: PlaceBed, upstream_slope_cot: float) -> tuple[Finding, ...]:
    if not upstream_slope_cot >= place.failure_slope_cot:
        return ()
    return (
        Finding(
            severity="warning",
            code="slope-before-flatter",
            where=place_name(place.opening, place.side),
            message=(
                f"the slope of the hole before a slide, 1 in {upstream_slope_cot:.3g}, is not steeper than the "
                f"1 in {place.failure_slope_cot:g} after it: no length by a single slide; look at failure_slope_cot"
            ),
        ),
    )


def _table_findings(place: PlaceBed, length_m: float) -> tuple[Finding, ...]:
    if not place.alpha_lengths_m or length_m <= place.alpha_lengths_m[-1]:
        return ()
    return (
        Finding(
            severity="note",
            code="alpha-beyond-table",
            where=place_name(place.opening, place.side),
            message=(
                f"the required length of {length_m:.1f} m is longer than the {place.alpha_lengths_m[-1]:g} m up to "
                f"which alpha is given: the last alpha of {place.alpha_values[-1]:g} is held, which is cautious"
            ),
        ),
    )


def _shortage_findings(place: PlaceBed, length_m: float) -> tuple[Finding, ...]:
    if length_m <= place.length_m:
        return ()
    return (
        Finding(
            severity="warning",
            code="protection-too-short",
            where=place_name(place.opening, place.side),
            message=f"the protection of {place.length_m:.1f} m is shorter than the {length_m:.1f} m required",
        ),
    )


def _minimum_findings(place: PlaceBed, minimum_m: float, final_depth_m: float, governed: bool) -> tuple[Finding, ...]:
    if not governed:
        return ()
    return (
        Finding(
            severity="note",
            code="minimum-length",
            where=place_name(place.opening, place.side),
            message=(
                f"the slope of 1 in {place.failure_slope_cot:g} behind a hole of {final_depth_m:.2f} m asks for no "
                f"more than the least length of {minimum_m:.1f} m, {_minimum_reason(place, minimum_m)}"
            ),
        ),
    )


def _minimum_reason(place: PlaceBed, minimum_m: float) -> str:
    if place.alpha_lengths_m and minimum_m == place.alpha_lengths_m[0]:
        return "the shortest for which alpha is given"
    return "six times the highest sill over the bed with flow"
