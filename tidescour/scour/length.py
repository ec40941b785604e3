"""How long the bed protection must be, so that a slide of the hole's slope does not reach the sill."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from scipy.optimize import brentq

from tidescour.bed.alpha import REATTACHMENT
from tidescour.bed.history import flow_towards, place_name, sill_height
from tidescour.errors import DomainError, Finding
from tidescour.gap.records import StageFlow
from tidescour.plan.models import PlaceBed, TideRule
from tidescour.scour.chain import chain_place
from tidescour.scour.laws import PowerLaw
from tidescour.scour.records import EffectiveDuration, RequiredLength


def minimum_length(flows: Sequence[StageFlow], place: PlaceBed) -> float:
    """Six times the highest sill over the bed with flow towards this side, over all stages.

    Parameters
    ----------
    flows : sequence of StageFlow
        All stages; those without this opening, and uncovered samples, do not count.
    place : PlaceBed
        Opening, side and bed level.

    Returns
    -------
    float
        Length [m], not negative; 0 without flow, or where the crest never stands above the bed.
    """
    highest = 0.0
    for flow in flows:
        for opening in flow.openings:
            if opening.name == place.opening:
                flowing = flow.covered & (flow_towards(opening, place.side) > 0.0)
                highest = max(highest, float(np.max(sill_height(opening, place)[flowing], initial=0.0)))
    return REATTACHMENT * highest


def slope_length(final_depth_m: Callable[[float], float], failure_slope_cot: float, minimum_m: float) -> float:
    """Length that equals the failure slope times the final depth of the hole behind it.

    Parameters
    ----------
    final_depth_m : callable
        Final depth [m] behind a protection of a given length [m]; not negative, and not rising with the length.
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
        If the slope is not positive, the minimum is negative, or the depth rises with the length.

    References
    ----------
    L = n h(L) has at most one root over the minimum, because h does not rise with L (methods: Dutch closure practice,
    from memory); it is not longer than n times the depth behind the minimum.
    """
    if not (failure_slope_cot > 0.0 and minimum_m >= 0.0):
        raise DomainError(f"slope 1 in {failure_slope_cot:g} must be positive, length {minimum_m:g} m not negative")

    def shortage(length_m: float) -> float:
        return failure_slope_cot * final_depth_m(length_m) - length_m

    longest = failure_slope_cot * final_depth_m(minimum_m)
    if not longest > minimum_m:
        return minimum_m
    left = shortage(longest)
    if abs(left) <= 1e-9 * longest:
        return longest
    if left > 0.0:
        raise DomainError("the final depth rises with the length of the protection: no required length can be found")
    return float(brentq(shortage, minimum_m, longest, xtol=1e-6, rtol=1e-12))


def required_length(
    place: PlaceBed,
    minimum_m: float,
    durations_at: Callable[[float], Sequence[EffectiveDuration]],
    law: PowerLaw,
    rule: TideRule,
) -> RequiredLength:
    """Length of protection that one place needs.

    Parameters
    ----------
    place : PlaceBed
        Failure slope, start depth and names.
    minimum_m : float
        From `minimum_length` [m].
    durations_at : callable
        Rows of the place, in the order of the stages, computed anew for a given length [m]. Each row's own peak
        serves as reference: a given reference may fall under the threshold of a longer protection, and the depth
        does not depend on it.
    law : PowerLaw
        Growth law.
    rule : {"integral", "flow-mean", "cycle-mean"}
        Tide rule that drives growth.

    Returns
    -------
    RequiredLength
        With a note where the minimum governs, and a warning where the place's own length is shorter.

    Raises
    ------
    DomainError
        As `slope_length`, and whatever `durations_at` raises.
    """

    def final_depth(length_m: float) -> float:
        steps = chain_place(durations_at(length_m), law, place.start_depth_m, rule)
        return steps[-1].end_depth_m if steps else place.start_depth_m

    length = slope_length(final_depth, place.failure_slope_cot, minimum_m)
    rows = durations_at(length)
    steps = chain_place(rows, law, place.start_depth_m, rule)
    shares = [step.share for step in steps]
    governed = length == minimum_m
    final = steps[-1].end_depth_m if steps else place.start_depth_m
    return RequiredLength(
        length_m=length,
        minimum_m=minimum_m,
        final_depth_m=final,
        alpha=rows[int(np.argmax(shares))].alpha if any(share > 0.0 for share in shares) else float("nan"),
        governed_by_minimum=governed,
        findings=(*_minimum_findings(place, minimum_m, final, governed), *_shortage_findings(place, length)),
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
                f"more than the least length of {minimum_m:.1f} m, six times the highest sill over the bed with flow"
            ),
        ),
    )
