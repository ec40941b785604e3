"""Where gap and basin together leave the range of their model: inertia, and a head too small to tell."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from tidescour.errors import DomainError, Finding
from tidescour.gap.limits_basin import M2_FREQUENCY_RAD_S, all_openings, mean_area
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.plan.models_bed import PlaceBed
from tidescour.units import GRAVITY_M_S2

LARGEST_INERTIA = 0.15
LARGEST_REPLETION = 10.0
LEAST_HEAD_M = 0.02
"""Two gauges that are levelled well still differ by about half of it; common practice, no source."""


def _half_range(flow: StageFlow) -> float:
    return 0.5 * float(np.ptp(flow.level_sea_m[flow.covered]))


def inertia_number(length_m: float, basin_area_m2: float, gap_area_m2: float) -> float:
    """Return K2, whose square is the head of inertia over the tide's amplitude where the basin follows the tide.

    Parameters
    ----------
    length_m : float
        Length along the flow over which the water is speeded up [m], positive.
    basin_area_m2, gap_area_m2 : float
        Wet areas of basin and gap [m2], positive.

    Returns
    -------
    float
        w sqrt(L A_b / (g A_g)) with the frequency w of M2.

    Raises
    ------
    DomainError
        If one of them is not positive.

    References
    ----------
    King (1974), in US Army Corps of Engineers, Coastal Engineering Manual, EM 1110-2-1100, Part II, ch. 6.
    """
    if not (length_m > 0.0 and basin_area_m2 > 0.0 and gap_area_m2 > 0.0):
        raise DomainError(
            f"length {length_m:g} m, basin {basin_area_m2:g} m2 and gap {gap_area_m2:g} m2 must be positive"
        )
    return M2_FREQUENCY_RAD_S * math.sqrt(length_m * basin_area_m2 / (GRAVITY_M_S2 * gap_area_m2))


def _flow_area(flow: StageFlow, through: OpeningFlow) -> float:
    """Return the mean area of an opening's control section while water runs [m2]; 0 where none does."""
    running = flow.covered & (through.gap_velocity_m_s != 0.0) & np.isfinite(through.gap_velocity_m_s)
    if not running.any():
        return 0.0
    return float(np.mean(through.discharge_m3_s[running] / through.gap_velocity_m_s[running]))


def _flow_length(opening: Opening, places: Sequence[PlaceBed]) -> float:
    """Return the length of an opening along the flow [m]: given, its barrel's, or that of both its protections."""
    written = opening.flow_length_m or opening.parameters.get("length_m")
    return written or sum(place.length_m for place in places if place.opening == opening.name)


def _is_guess(opening: Opening) -> bool:
    return opening.flow_length_m is None and "length_m" not in opening.parameters


def inertia_findings(stage: Stage, flow: StageFlow, basin: Basin, places: Sequence[PlaceBed]) -> tuple[Finding, ...]:
    """Return a warning where the inertia of the water in the gap matters.

    K2 alone is large too for a short gap that is almost shut, through which too little runs to matter; so that it is
    the head of inertia at the stage's own discharge, K2^2 Q / (w a A_b) of the amplitude a, that must be over 0.15^2:
    K2 over 0.15 where the basin follows the tide. Openings side by side share the head: their areas over lengths add.
    """
    pairs = zip((*stage.opening, *basin.side_opening), all_openings(flow), strict=True)
    running = [
        (opening, through, area, _flow_length(opening, places))
        for opening, through in pairs
        if not through.given and (area := _flow_area(flow, through)) > 0.0
    ]
    known = [row for row in running if row[3] > 0.0]
    half_range, basin_area = _half_range(flow), mean_area(flow, basin)
    if not known or half_range == 0.0:
        return ()
    gap_area = sum(area for _, _, area, _ in known)
    length = gap_area / sum(area / length for _, _, area, length in known)
    number = inertia_number(length, basin_area, gap_area)
    discharge = np.sum([through.discharge_m3_s for _, through, _, _ in known], axis=0)[flow.covered]
    fullness = 0.5 * float(np.ptp(discharge)) / (M2_FREQUENCY_RAD_S * half_range * basin_area)
    share = number**2 * fullness
    if share <= LARGEST_INERTIA**2:
        return ()
    guessed = any(_is_guess(opening) for opening, _, _, _ in known)
    left_out = [opening.name for opening, _, _, length in running if length == 0.0]
    message = (
        f"speeding the water up takes about {100.0 * share:.1f} % of the tide's half range of {half_range:.2f} m, and "
        f"the model leaves that out (K2 = {number:.2f}; length "
        f"{length:.4g} m{', guessed from the protections' if guessed else ''}, gap {gap_area:.3g} m2, basin "
        f"{basin_area:.3g} m2); "
        + (f"{', '.join(left_out)} without a length left out; " if left_out else "")
        + ("give flow_length_m of the opening, or " if guessed or left_out else "")
        + "give levels from a model with inertia as series"
    )
    return (Finding(severity="warning", code="inertia", where=f"stage {flow.stage!r}", message=message),)


def repletion_coefficient(conveyance_m2: float, basin_area_m2: float, amplitude_m: float) -> float:
    """Return K, how easily the tide fills the basin: under 0.5 badly, over 2 almost wholly.

    Parameters
    ----------
    conveyance_m2 : float
        Coefficient times gap area: discharge over sqrt(2 g head) [m2], not negative.
    basin_area_m2, amplitude_m : float
        Wet area of the basin [m2] and amplitude of the sea tide [m], positive.

    Returns
    -------
    float
        m A_g sqrt(2 g a) / (w a A_b) with the frequency w of M2.

    Raises
    ------
    DomainError
        If the conveyance is negative, or area or amplitude is not positive.

    References
    ----------
    Keulegan (1967), in US Army Corps of Engineers, Coastal Engineering Manual, EM 1110-2-1100, Part II, ch. 6, with
    its loss coefficient F = 1 / m^2.
    """
    if not (conveyance_m2 >= 0.0 and basin_area_m2 > 0.0 and amplitude_m > 0.0):
        raise DomainError(
            f"conveyance {conveyance_m2:g} m2 must not be negative, basin {basin_area_m2:g} m2 and amplitude "
            f"{amplitude_m:g} m must be positive"
        )
    head = math.sqrt(2.0 * GRAVITY_M_S2 * amplitude_m)
    return conveyance_m2 * head / (M2_FREQUENCY_RAD_S * amplitude_m * basin_area_m2)


def _repletion(flow: StageFlow, basin: Basin) -> float:
    discharge = np.sum([opening.discharge_m3_s for opening in all_openings(flow)], axis=0)[flow.covered]
    scale = np.sqrt(2.0 * GRAVITY_M_S2 * np.abs(flow.head_m[flow.covered]))
    conveyance = float(np.abs(discharge).sum() / scale.sum()) if scale.any() else 0.0
    return repletion_coefficient(conveyance, mean_area(flow, basin), _half_range(flow))


def small_head_findings(flow: StageFlow, basin: Basin | None) -> tuple[Finding, ...]:
    """Return what it means that the head over the gap is tiny.

    A note where the basin is routed: the storage sets the flow there. A warning where levels of both sides are given
    and an opening follows a relation: the flow is then made of their difference.
    """
    half_range = _half_range(flow)
    head = math.sqrt(float(np.mean(flow.head_m[flow.covered] ** 2)))
    related = [opening for opening in all_openings(flow) if not opening.given]
    if half_range == 0.0 or not any(np.any(opening.discharge_m3_s) for opening in related):
        return ()
    if flow.routed and basin is not None:
        repletion = _repletion(flow, basin)
        if head >= LEAST_HEAD_M and repletion <= LARGEST_REPLETION:
            return ()
        message = (
            f"the typical head over the gap is {1000.0 * head:.0f} mm (root mean square; repletion coefficient "
            f"{repletion:.2g}): the basin follows the sea, its storage sets the velocities and the coefficient hardly "
            "matters, so that measured heads neither prove nor calibrate this stage; measure discharges"
        )
        return (Finding(severity="note", code="small-head", where=f"stage {flow.stage!r}", message=message),)
    if head >= LEAST_HEAD_M:
        return ()
    message = (
        f"the typical head over the gap is {1000.0 * head:.0f} mm (root mean square), under the "
        f"{1000.0 * LEAST_HEAD_M:.0f} mm that two gauges or tides can tell: the velocities are those of the difference "
        f'of nearly equal levels; write basin = "routed" for this stage'
    )
    return (Finding(severity="warning", code="small-head", where=f"stage {flow.stage!r}", message=message),)
