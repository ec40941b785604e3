"""Whether a basin stayed the same while its records were taken: the coefficient that each part would ask for."""

from __future__ import annotations

import numpy as np

from tidescour.errors import Finding
from tidescour.gap.calibration_records import Simulate
from tidescour.units import M2_PERIOD_H, SECONDS_PER_DAY, SECONDS_PER_HOUR, FloatArray

PART_S = 7.0 * SECONDS_PER_DAY
SHORTEST_S = 3.0 * SECONDS_PER_DAY
FEWEST_LEVELS_S = 2.0 * M2_PERIOD_H * SECONDS_PER_HOUR
STILL_M = 1e-6
CHANGE = 0.05
"""Half of the change of the coefficient from which sensitivity and bend are taken."""

APART = 0.1
"""Share by which parts may ask for other coefficients without a word: judgement, no source."""


def weekly_coefficients(
    time_s: FloatArray, level_m: FloatArray, simulate: Simulate, parameters: FloatArray, place: int
) -> FloatArray:
    """Return the coefficient that each week or so of a record would ask for by itself, other parameters held.

    One step of Gauss and Newton from the fit of the whole, with the mean of each part left free, for datum and weather
    are not the gap's.

    Parameters
    ----------
    time_s, level_m : (n,) array
        Recorded basin levels that were fitted [m, datum of the basin record].
    simulate : callable
        The basin model at these instants.
    parameters : (p,) array
        As fitted.
    place : int
        Which of them is the coefficient.

    Returns
    -------
    (w,) array
        Coefficients, one a part; fewer than two parts where the record is shorter than six days. A part is left out
        where holes leave less than two tides of levels, or its levels do not move with the coefficient.
    """
    span = time_s[-1] - time_s[0]
    count = max(round(span / PART_S), int(span >= 2.0 * SHORTEST_S) + 1)
    residual = level_m - simulate(parameters).level_m
    changed = []
    for factor in (1.0 + CHANGE, 1.0 - CHANGE):
        other = parameters.copy()
        other[place] *= factor
        changed.append(simulate(other).level_m)
    slope = (changed[0] - changed[1]) / (2.0 * CHANGE)
    part = np.minimum(((time_s - time_s[0]) / span * count).astype(np.int64), count - 1)
    covered_s = np.minimum(np.diff(time_s, append=time_s[-1]), SECONDS_PER_HOUR)
    found = []
    for number in range(count):
        here = part == number
        if covered_s[here].sum() < FEWEST_LEVELS_S or np.ptp(slope[here]) < STILL_M:
            continue
        lean, left = slope[here] - slope[here].mean(), residual[here] - residual[here].mean()
        found.append(parameters[place] * (1.0 + float(lean @ left) / float(lean @ lean)))
    return np.array(found)


def drift_findings(weekly: FloatArray, coefficient: float) -> tuple[Finding, ...]:
    """Return a warning where the weeks ask for coefficients that are far apart."""
    if weekly.size < 2 or np.max(np.abs(weekly / coefficient - 1.0)) <= APART:
        return ()
    listed = ", ".join(f"{value:.3g}" for value in weekly)
    return (
        Finding(
            severity="warning",
            code="basin-drifts",
            where="calibration",
            message=f"by themselves {weekly.size} equal parts of the fitted record would ask for coefficients of "
            f"{listed}, all together for {coefficient:.3g}: gap or basin changed in that time, or the model misses "
            "something; the interval of the estimate does not hold that",
        ),
    )
