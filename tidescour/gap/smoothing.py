"""Levels without the noise of their sensor, for a head that is a small difference of two of them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy.signal import savgol_filter

from tidescour.gauge.records import GaugeRecord
from tidescour.units import SECONDS_PER_HOUR, FloatArray

SMOOTHED_S = SECONDS_PER_HOUR
FEWEST_POINTS = 5
UNEVEN = 0.05


def smoothed_level(time_s: FloatArray, level_m: FloatArray) -> FloatArray:
    """Return levels smoothed by a parabola through about an hour of samples around each.

    Noise of a sensor of 1 cm becomes hundreds of cubic metres a second in a wide gap whose head is a few centimetres,
    and a basin routed through it seems to pass more water than it does. An M2 tide loses less than 1e-4 of its
    amplitude. Stretches between holes, or with other steps, are smoothed alone; those with fewer than five samples, or
    with steps of over 15 minutes, stay as they are.

    Parameters
    ----------
    time_s, level_m : (n,) array
        Samples, increasing in time, finite.

    Returns
    -------
    (n,) array
        Levels [m].

    References
    ----------
    Savitzky and Golay (1964), Anal. Chem. 36(8), 1627-1639; the window: common practice, no source.
    """
    result = level_m.copy()
    steps = np.diff(time_s)
    if steps.size == 0:
        return result
    step_s = float(np.median(steps))
    points = 2 * round(0.5 * SMOOTHED_S / step_s) + 1
    if points < FEWEST_POINTS:
        return result
    breaks = np.flatnonzero(np.abs(steps - step_s) > UNEVEN * step_s) + 1
    for first, after in zip([0, *breaks], [*breaks, time_s.size], strict=True):
        if after - first >= points:
            result[first:after] = savgol_filter(level_m[first:after], points, 2)
    return result


def smoothed_record(record: GaugeRecord) -> GaugeRecord:
    """Return a gauge record whose good samples are smoothed, each stretch between holes and flagged samples alone."""
    level = np.array(record.level_m)
    level[record.good] = smoothed_level(record.time_s[record.good], record.level_m[record.good])
    return replace(record, level_m=level)
