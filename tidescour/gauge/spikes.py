"""Spikes: one to a few samples that leave the residual and return."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from scipy.ndimage import median_filter

from tidescour.errors import DomainError
from tidescour.gauge.records import FAIL, PASS, SUSPECT
from tidescour.units import FlagArray, FloatArray

LONGEST_SPIKE: Final = 3
"""Samples."""
SMALLEST_SPIKE_M: Final = 0.10
ROBUST_DEVIATIONS: Final = 4.0
NORMAL_PER_MAD: Final = 1.4826
"""Standard deviation of a normal distribution over its median absolute deviation: 1 / 0.67449."""
EDGE_SHARE: Final = 0.75
"""A spike jumps by at least this share of its height on both sides; the tip of a sharp low water by half of it."""
CONTINUED_SHARE: Final = 0.5
"""Nor does the level, continued from either side, come nearer to it than this share of its height."""
CONTINUED_FROM: Final = 3
"""Samples through which the level is continued: a parabola follows the turn of an hourly tide."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Spikes:
    """Flags (n,) of int8, 1, 3 or 4, and the threshold from which a sample is suspect [m]."""

    flag: FlagArray
    threshold_m: float


def spike_flags(time_s: FloatArray, level_m: FloatArray, residual_m: FloatArray, longest_step_s: float) -> Spikes:
    """Flag what stands out of the residual for at most three samples.

    The height of a sample is its distance from the running median of seven. It is suspect over the larger of 0.10 m
    and four robust standard deviations of all heights, failed over twice that, if it belongs to at most three samples
    in a row on one side that are reached and left in a jump, in the residual and in the level itself. A surge of many
    hours moves the median with it and is none of them; nor is a corner in the residual where the level runs on
    smoothly past a gate or a drying sill that the prediction does not know.

    Parameters
    ----------
    time_s : (n,) array
        Stamps [s], increasing.
    level_m, residual_m : (n,) array
        Level, and level minus prediction [m], finite.
    longest_step_s : float
        Beyond this step the series is cut, and each piece judged for itself [s].

    Returns
    -------
    Spikes
        1 pass, 3 suspect, 4 fail.

    Raises
    ------
    DomainError
        If shapes differ or a level or residual is not finite.

    References
    ----------
    Common practice, no source; thresholds in the manner of QARTOD water level (2021), test 6, on the residual.
    """
    if not time_s.shape == level_m.shape == residual_m.shape or not np.all(np.isfinite(level_m + residual_m)):
        raise DomainError("spikes need finite levels and residuals, one a stamp")
    flag = np.full(time_s.shape, PASS, dtype=np.int8)
    if time_s.size == 0:
        return Spikes(flag=flag, threshold_m=SMALLEST_SPIKE_M)
    cuts = np.flatnonzero(np.diff(time_s) > longest_step_s) + 1
    pieces = np.split(residual_m, cuts)
    heights = [piece - median_filter(piece, size=2 * LONGEST_SPIKE + 1, mode="mirror") for piece in pieces]
    height_m = np.concatenate(heights)
    deviation_m = NORMAL_PER_MAD * float(np.median(np.abs(height_m - np.median(height_m))))
    threshold_m = max(SMALLEST_SPIKE_M, ROBUST_DEVIATIONS * deviation_m)
    begin = 0
    for piece, height in zip(pieces, heights, strict=True):
        here = slice(begin, begin + piece.size)
        flag[here] = _piece_flags(time_s[here], level_m[here], piece, height, threshold_m)
        begin += piece.size
    return Spikes(flag=flag, threshold_m=threshold_m)


def _piece_flags(
    time_s: FloatArray, level_m: FloatArray, residual_m: FloatArray, height_m: FloatArray, threshold_m: float
) -> FlagArray:
    flag = np.full(residual_m.shape, PASS, dtype=np.int8)
    side = np.where(np.abs(height_m) > threshold_m, np.sign(height_m), 0.0)
    bounds = np.flatnonzero(np.diff(side)) + 1
    starts, ends = np.append(0, bounds), np.append(bounds, side.size)
    for start, end in zip(starts, ends, strict=True):
        if side[start] == 0.0 or end - start > LONGEST_SPIKE or end - start == side.size:
            continue
        run = slice(start, end)
        onto = residual_m[start] - residual_m[start - 1] if start else np.inf * side[start]
        off = residual_m[end - 1] - residual_m[end] if end < side.size else np.inf * side[start]
        highest_m = float(np.max(np.abs(height_m[run])))
        before = slice(max(start - CONTINUED_FROM, 0), start)
        after = slice(end, end + CONTINUED_FROM)
        continued_m = min(
            _distance_from_continuation(time_s, level_m, before, start),
            _distance_from_continuation(time_s, level_m, after, end - 1),
        )
        jumps = min(onto * side[start], off * side[start]) >= EDGE_SHARE * highest_m
        if jumps and continued_m >= CONTINUED_SHARE * highest_m:
            flag[run] = np.where(np.abs(height_m[run]) > 2.0 * threshold_m, FAIL, SUSPECT)
    return flag


def _distance_from_continuation(time_s: FloatArray, level_m: FloatArray, known: slice, at: int) -> float:
    """Distance of a level from the polynomial through the samples beside it [m]; infinite where there are none."""
    from_s, levels = time_s[known] - time_s[at], level_m[known]
    if levels.size == 0:
        return np.inf
    continued = 0.0
    for i in range(levels.size):
        others = np.delete(from_s, i)
        continued += levels[i] * float(np.prod(-others / (from_s[i] - others)))
    return abs(float(level_m[at]) - continued)
