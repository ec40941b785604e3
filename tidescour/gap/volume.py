"""Volume by head against volume by storage: whether a basin level belongs to the gap that it is used for."""

from __future__ import annotations

import numpy as np

from tidescour.errors import Finding
from tidescour.gap.records import StageFlow
from tidescour.gap.storage import basin_storage, stored_volumes
from tidescour.plan.models import Basin
from tidescour.units import FloatArray

AGREES = (0.85, 1.15)


def zero_times(time_s: FloatArray, value: FloatArray) -> FloatArray:
    """Return the instants at which a row of samples passes zero, by linear interpolation; a touch counts once."""
    turns = np.flatnonzero((value[:-1] < 0.0) != (value[1:] < 0.0))
    share = value[turns] / (value[turns] - value[turns + 1])
    return np.asarray(time_s[turns] + share * (time_s[turns + 1] - time_s[turns]))


def accumulated(time_s: FloatArray, rate: FloatArray) -> FloatArray:
    """Return the integral of a rate from the first instant to each, by the trapezoid rule."""
    return np.concatenate(([0.0], np.cumsum(0.5 * (rate[1:] + rate[:-1]) * np.diff(time_s))))


def half_tide_volumes(flow: StageFlow, basin: Basin) -> tuple[float, float]:
    """Return the water that passed the openings and that the storage took up, summed over half tides [m3].

    Both are sums of magnitudes between zeros of the head inside the covered stretches; the second is the change of
    volume less the inflow.
    """
    discharge = np.sum([opening.discharge_m3_s for opening in (*flow.openings, *flow.side_openings)], axis=0)
    passed = accumulated(flow.time_s, discharge)
    stored = stored_volumes(basin_storage(basin), flow.level_basin_m) - accumulated(flow.time_s, flow.inflow_m3_s)
    by_head = by_storage = 0.0
    edges = np.flatnonzero(np.diff(flow.covered.astype(np.int8), prepend=0, append=0))
    for first, after in zip(edges[0::2], edges[1::2], strict=True):
        stretch = slice(first, after)
        times = flow.time_s[stretch]
        marks = np.concatenate(([times[0]], zero_times(times, flow.head_m[stretch]), [times[-1]]))
        by_head += float(np.abs(np.diff(np.interp(marks, times, passed[stretch]))).sum())
        by_storage += float(np.abs(np.diff(np.interp(marks, times, stored[stretch]))).sum())
    return by_head, by_storage


def volume_findings(flow: StageFlow, basin: Basin) -> tuple[Finding, ...]:
    """Return an error where the flow by head and the change of storage disagree by more than 15 %."""
    if any(opening.given_end_velocity_m_s is not None for opening in flow.openings):
        return (
            Finding(
                severity="note",
                code="volume-not-checked",
                where=f"stage {flow.stage!r}",
                message="an opening has a given velocity and no discharge, so that the flow was not held against the "
                "basin's storage",
            ),
        )
    by_head, by_storage = half_tide_volumes(flow, basin)
    ratio = by_head / by_storage if by_storage > 0.0 else np.inf
    if AGREES[0] <= ratio <= AGREES[1] or by_head == by_storage == 0.0:
        return ()
    return (
        Finding(
            severity="error",
            code="volume-check",
            where=f"stage {flow.stage!r}",
            message=f"through the openings went {by_head:.3g} m3 by the head, the basin's storage took up "
            f"{by_storage:.3g} m3 (half tides summed, ratio {ratio:.2f}, allowed 0.85 to 1.15): the basin level does "
            "not belong to this gap, or coefficient, area or datums are wrong; route the basin instead",
        ),
    )
