"""Where a basin leaves the range of its model: one area, its table's end, its length, a river that it cannot drain."""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from tidescour.errors import DomainError, Finding, Severity
from tidescour.gap.layers import EXTENT, GROWTH
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.storage import basin_storage, stored_volumes, wet_areas
from tidescour.plan.models import Basin
from tidescour.units import GRAVITY_M_S2, M2_PERIOD_H, SECONDS_PER_DAY, SECONDS_PER_HOUR

M2_FREQUENCY_RAD_S: Final = 2.0 * math.pi / (M2_PERIOD_H * SECONDS_PER_HOUR)
TIDAL_DAY_S: Final = 2.0 * M2_PERIOD_H * SECONDS_PER_HOUR

LARGEST_LEVEL_ERROR = 0.05
SHALLOW_M = 1.0
"""Basins with a tide are seldom shallower on average; common practice, no source."""
MOST_KEPT = 0.25
"""Share of a river that spring and neap may keep in a basin for a tidal day; common practice, no source."""


def all_openings(flow: StageFlow) -> tuple[OpeningFlow, ...]:
    """Return the flows through the openings of a stage and those beside the gap."""
    return (*flow.openings, *flow.side_openings)


def mean_area(flow: StageFlow, basin: Basin) -> float:
    """Return the wet area of the basin at its mean level in the stage [m2]."""
    mean = flow.level_basin_m[flow.covered].mean(keepdims=True)
    return float(wet_areas(basin_storage(basin), mean)[0])


def constant_area_findings(flow: StageFlow, basin: Basin) -> tuple[Finding, ...]:
    """Return a note where a routed basin has one wet area at all levels."""
    layers = basin_storage(basin).layers
    area = float(layers[:, EXTENT].max())
    one_area = np.ptp(layers[:, EXTENT]) <= 1e-9 * area and np.all(layers[:, GROWTH] == 0.0)
    if not flow.routed or not one_area:
        return ()
    return (
        Finding(
            severity="note",
            code="constant-area",
            where="basin",
            message=f"the basin has one wet area, {area:.3g} m2, at all levels: tidal flats make flood and ebb differ, "
            "so that this is not the cautious choice for both sides of the gap; give the area by level",
        ),
    )


def range_findings(flow: StageFlow, basin: Basin) -> tuple[Finding, ...]:
    """Return a warning where a routed level leaves the basin's table."""
    low, high = float(flow.level_basin_m.min()), float(flow.level_basin_m.max())
    inside = low >= basin.level_m[0] and high <= basin.level_m[-1]
    if not flow.routed or len(basin.level_m) == 1 or inside:
        return ()
    return (
        Finding(
            severity="warning",
            code="basin-level-range",
            where=f"stage {flow.stage!r}",
            message=f"the basin level runs from {low:.2f} to {high:.2f} m, beyond the table of "
            f"{'volumes' if basin.volume_m3 else 'areas'} ({basin.level_m[0]:g} to {basin.level_m[-1]:g} m), where "
            "the area is held constant",
        ),
    )


def level_error(length_m: float, depth_m: float) -> float:
    """Return how much larger the M2 tide is at the head of a basin than at its mouth, as a share.

    Parameters
    ----------
    length_m, depth_m : float
        Length along the tide and mean depth [m], positive.

    Returns
    -------
    float
        1 / cos(k L) - 1 with k = w / sqrt(g h); infinite from a quarter of the wave's length on.

    Raises
    ------
    DomainError
        If length or depth is not positive.

    References
    ----------
    Standing wave without friction in a channel of one depth with a closed head, as in any text on long waves (Lamb
    1932, Hydrodynamics, ch. 8, from memory). Friction makes the error larger.
    """
    if not (length_m > 0.0 and depth_m > 0.0):
        raise DomainError(f"length {length_m:g} m and depth {depth_m:g} m of a basin must be positive")
    phase = M2_FREQUENCY_RAD_S / math.sqrt(GRAVITY_M_S2 * depth_m) * length_m
    return 1.0 / math.cos(phase) - 1.0 if phase < 0.5 * math.pi else math.inf


def _depth_for(length_m: float) -> float:
    """Return the depth [m] at which a basin of that length is as uneven as is let pass."""
    phase = math.acos(1.0 / (1.0 + LARGEST_LEVEL_ERROR))
    return (M2_FREQUENCY_RAD_S * length_m / phase) ** 2 / GRAVITY_M_S2


def _depth_in_table(flow: StageFlow, basin: Basin) -> float | None:
    """Return the mean depth over the lowest level of the table [m]; None where the table does not reach down."""
    mean = float(flow.level_basin_m[flow.covered].mean())
    if len(basin.level_m) < 2 or basin.level_m[0] >= mean:
        return None
    low, high = stored_volumes(basin_storage(basin), np.array([basin.level_m[0], mean]))
    return float(high - low) / mean_area(flow, basin)


def length_findings(flow: StageFlow, basin: Basin) -> tuple[Finding, ...]:
    """Return a warning where a routed basin is too long for one level; an error from a quarter of a wave on.

    A length that is not given is guessed as the root of the area at the mean level, a depth as what the table holds
    under the mean level over that area. Where there is no depth at all, a note says which one it takes.
    """
    if not flow.routed:
        return ()
    length = basin.length_m or math.sqrt(mean_area(flow, basin))
    depth = basin.depth_m or _depth_in_table(flow, basin)
    given = basin.length_m is not None and basin.depth_m is not None
    where = "basin" if given else f"stage {flow.stage!r}"
    shown = f"{length:.0f} m" if basin.length_m else f"{length:.2g} m (guessed: the root of its area)"
    if depth is None:
        least = _depth_for(length)
        if basin.length_m is None and least < SHALLOW_M:
            return ()
        message = (
            f"with a length of {shown} the basin's level is the same everywhere within "
            f"{100.0 * LARGEST_LEVEL_ERROR:.0f} % of the tide only where its mean depth is over {least:.2g} m; give "
            "basin.depth_m"
        )
        return (Finding(severity="note", code="basin-length", where=where, message=message),)
    error = level_error(length, depth)
    if error <= LARGEST_LEVEL_ERROR:
        return ()
    deep = f"{depth:g} m" if basin.depth_m else f"{depth:.2g} m (guessed: what the table holds over its area)"
    what = f"with a length of {shown} and a depth of {deep} "
    if math.isinf(error):
        what += "the basin is longer than a quarter of the tidal wave, so that it has no common level"
    else:
        what += (
            f"the tide at the basin's head is {100.0 * error:.0f} % larger than at the gap, more with friction, where "
            "one level is assumed"
        )
    remedy = (
        "; compute the basin level with a model of its channels and give it as a series"
        if given
        else "; give basin.length_m and basin.depth_m, or the basin level as a series"
    )
    severity: Severity = "error" if math.isinf(error) else "warning"
    return (Finding(severity=severity, code="basin-length", where=where, message=what + remedy),)


def river_findings(flow: StageFlow, basin: Basin) -> tuple[Finding, ...]:
    """Return what a river does to a routed basin in the last tidal day of a stage that lasts as long.

    An error where it brings more than the flood and over a quarter of it stays; a warning where the basin stands over
    the sea all the time without that.
    """
    last = flow.time_s >= flow.time_s[-1] - TIDAL_DAY_S
    if not flow.routed or last[0]:
        return ()
    times, level = flow.time_s[last], flow.level_basin_m[last]
    river_m3 = float(np.trapezoid(flow.inflow_m3_s[last], times))
    if river_m3 <= 0.0:
        return ()
    through = [opening.discharge_m3_s[last] for opening in all_openings(flow)]
    flood_m3 = sum(float(np.trapezoid(np.maximum(discharge, 0.0), times)) for discharge in through)
    start_m3, end_m3 = stored_volumes(basin_storage(basin), level[[0, -1]])
    kept = float(end_m3 - start_m3) / river_m3
    seconds = float(times[-1] - times[0])
    rise_m_day = float(level[-1] - level[0]) / seconds * SECONDS_PER_DAY
    highest_sea = max(float(opening.level_sea_m[last].max()) for opening in all_openings(flow))
    inflow = f"of the inflow of {river_m3 / seconds:.3g} m3/s"
    reached = f"rises {rise_m_day:.2g} m a day and ends at {level[-1]:.2f} m (highest sea {highest_sea:.2f} m)"
    remedy = "give the river another way out ([[basin.side_opening]]), a lower crest or a wider gap"
    if flood_m3 < river_m3 and kept > MOST_KEPT:
        dry = not any(np.any(discharge) for discharge in through)
        message = (
            f"the basin is closed: nothing {inflow} passes an opening in the last tidal day; its level {reached}; "
            if dry
            else f"the gap cannot drain the river: {inflow} {100.0 * kept:.0f} % stay in the basin in the last tidal "
            f"day; its level {reached}; "
        )
        return (Finding(severity="error", code="river-ponds", where=f"stage {flow.stage!r}", message=message + remedy),)
    if float(level.min()) > highest_sea:
        message = (
            f"the river ({river_m3 / seconds:.3g} m3/s) holds the basin at {level.min():.2f} to {level.max():.2f} m in "
            f"the last tidal day, over the highest sea ({highest_sea:.2f} m), so that no flood enters; see whether its "
            f"shores allow that, or {remedy}"
        )
        return (Finding(severity="warning", code="river-ponds", where=f"stage {flow.stage!r}", message=message),)
    return ()
