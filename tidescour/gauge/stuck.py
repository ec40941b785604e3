"""Stuck values: a level that stands still longer than slack water explains."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from tidescour.errors import DomainError
from tidescour.gauge.records import FAIL, PASS, SUSPECT
from tidescour.units import M2_PERIOD_H, SECONDS_PER_HOUR, FlagArray, FloatArray

FLAT_RANGE_M: Final = 0.001
ROUNDING_M: Final = 1e-9
"""Two values a millimetre apart differ, whatever their last binary digits."""
SLACK_RANGE_M: Final = 0.03
SLACK_MARGIN: Final = 1.5
SHORTEST_STUCK_S: Final = 1800.0
FEWEST_SAMPLES: Final = 3
AMPLITUDE_WINDOW_S: Final = 25.0 * SECONDS_PER_HOUR
"""Two tides and a bit: the daily inequality is inside."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StuckRuns:
    """Flags (n,) of int8, 1, 3 or 4, and shortest and longest threshold that was applied to a run [s]."""

    flag: FlagArray
    threshold_s: tuple[float, float]


def slack_time(amplitude_m: FloatArray | float) -> FloatArray:
    """How long a semidiurnal tide stays within 0.03 m of high or low water.

    Parameters
    ----------
    amplitude_m : array or float
        Amplitude [m], not negative.

    Returns
    -------
    array
        2 arccos(1 - 0.03 / amplitude) / omega [s]; a whole period where the tide stays within 0.03 m altogether.

    Raises
    ------
    DomainError
        If an amplitude is negative or not a number.
    """
    amplitude = np.asarray(amplitude_m, dtype=np.float64)
    if not np.all(amplitude >= 0.0):
        raise DomainError(f"amplitude {amplitude_m} m must not be negative")
    angular_1_s = 2.0 * np.pi / (M2_PERIOD_H * SECONDS_PER_HOUR)
    below = 1.0 - SLACK_RANGE_M / np.maximum(amplitude, 0.5 * SLACK_RANGE_M)
    return np.asarray(2.0 * np.arccos(below) / angular_1_s)


def stuck_flags(time_s: FloatArray, level_m: FloatArray, longest_step_s: float, *, may_fail: bool) -> StuckRuns:
    """Flag samples that stand within a millimetre for too long.

    Too long is more than half an hour and more than 1.5 times the slack time of the tide around: half its range in
    the 25 h before and after, the smaller of the two, so that the dying tide of a basin is measured by itself.

    Parameters
    ----------
    time_s : (n,) array
        Stamps [s], increasing.
    level_m : (n,) array
        Levels [m], finite.
    longest_step_s : float
        A run does not reach over a longer step [s].
    may_fail : bool
        Flag 4 from twice the threshold; False on the basin side, where a closing gap holds the level still.

    Returns
    -------
    StuckRuns
        1 pass, 3 suspect, 4 fail.

    Raises
    ------
    DomainError
        If shapes differ or a level is not finite.

    References
    ----------
    Common practice, no source; a flat-line test as QARTOD water level (2021), test 8, with a duration for its count.
    """
    if time_s.shape != level_m.shape or not np.all(np.isfinite(level_m)):
        raise DomainError("stuck values need finite levels, one a stamp")
    flag = np.full(time_s.shape, PASS, dtype=np.int8)
    thresholds = []
    for start, end in _flat_runs(time_s, level_m, longest_step_s):
        duration_s = time_s[end - 1] - time_s[start]
        if end - start < FEWEST_SAMPLES or duration_s <= SHORTEST_STUCK_S:
            continue
        slack_s = float(slack_time(_amplitude_around(time_s, level_m, start, end)))
        threshold_s = max(SHORTEST_STUCK_S, SLACK_MARGIN * slack_s)
        if duration_s > threshold_s:
            flag[start:end] = FAIL if may_fail and duration_s > 2.0 * threshold_s else SUSPECT
            thresholds.append(threshold_s)
    return StuckRuns(flag=flag, threshold_s=(min(thresholds), max(thresholds)) if thresholds else (0.0, 0.0))


def _flat_runs(time_s: FloatArray, level_m: FloatArray, longest_step_s: float) -> list[tuple[int, int]]:
    """Stretches ``[start, end)`` within a millimetre, one after another.

    Each begins where the one before was left. Stretches in which neighbours already differ are passed over at once.
    """
    still = (np.abs(np.diff(level_m)) < FLAT_RANGE_M - ROUNDING_M) & (np.diff(time_s) <= longest_step_s)
    change = np.diff(np.concatenate([[0], still.astype(np.int8), [0]]))
    runs = []
    for first, last in zip(np.flatnonzero(change == 1), np.flatnonzero(change == -1), strict=True):
        levels = level_m[first : last + 1].tolist()
        start, low, high = 0, levels[0], levels[0]
        for i, level in enumerate(levels):
            low, high = min(low, level), max(high, level)
            if high - low >= FLAT_RANGE_M - ROUNDING_M:
                runs.append((int(first) + start, int(first) + i))
                start, low, high = i, level, level
        runs.append((int(first) + start, int(first) + len(levels)))
    return runs


def _amplitude_around(time_s: FloatArray, level_m: FloatArray, start: int, end: int) -> float:
    before = level_m[np.searchsorted(time_s, time_s[start] - AMPLITUDE_WINDOW_S) : start]
    after = level_m[end : np.searchsorted(time_s, time_s[end - 1] + AMPLITUDE_WINDOW_S)]
    halves = [0.5 * float(np.ptp(levels)) for levels in (before, after) if levels.size >= FEWEST_SAMPLES]
    return min(halves, default=0.0)
