"""Clock, averaging and dated corrections, in the order that the plan promises."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding, RecordError
from tidescour.gauge.wording import counted
from tidescour.plan.models import Clock, Correction
from tidescour.units import M2_PERIOD_H, SECONDS_PER_DAY, SECONDS_PER_HOUR, FloatArray, seconds_since_epoch, utc_text

NOTABLE_AVERAGING_S: Final = 1800.0
"""Half an hour: from there on a mean loses over 1 % of the quarter-diurnal tide."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Corrected:
    """Stamps and levels after all that the plan orders, and what it did."""

    time_s: FloatArray
    level_m: FloatArray
    findings: tuple[Finding, ...]


def averaging_shift_s(clock: Clock) -> float:
    """Seconds from the stamp of a mean to the middle of its window; 0 for instants and centred means."""
    half = 0.5 * (clock.averaging_s or 0.0)
    return {"instant": 0.0, "mean-centred": 0.0, "mean-preceding": -half, "mean-following": half}[clock.stamp]


def mean_gain(averaging_s: float, period_h: float) -> float:
    """Share of a wave's amplitude that is left in means over a window.

    Parameters
    ----------
    averaging_s : float
        Window [s], positive.
    period_h : float
        Period of the wave [h], positive.

    Returns
    -------
    float
        sin(x) / x with x = pi window / period; 1 for a window far shorter than the period.
    """
    return float(np.sinc(averaging_s / (period_h * SECONDS_PER_HOUR)))


def averaging_findings(clock: Clock, where: str) -> tuple[Finding, ...]:
    """Return what a reader must know where the file holds means instead of instants."""
    if clock.stamp == "instant" or clock.averaging_s is None:
        return ()
    shift_s = averaging_shift_s(clock)
    text = f"means over {clock.averaging_s:g} s, stamps moved by {shift_s:+g} s to the middle of the window"
    found = [Finding(severity="note", code="averaged", where=where, message=text)]
    if clock.averaging_s >= NOTABLE_AVERAGING_S:
        gains = ", ".join(f"{mean_gain(clock.averaging_s, M2_PERIOD_H / n):.3f} of M{2 * n}" for n in (1, 2, 3))
        text = f"means over {clock.averaging_s:g} s keep only {gains}: peaks and overtides are too low"
        found.append(Finding(severity="warning", code="averaging-damps", where=where, message=text))
    return tuple(found)


def corrected(
    time_s: FloatArray, level_m: FloatArray, clock: Clock, corrections: Sequence[Correction], where: str
) -> Corrected:
    """Move stamps and levels as the plan orders.

    Stamps: `clock_shift_s`, to the middle of the averaging window, then each correction. A correction takes the
    samples whose stamp as read lies in ``[from, to)``; several add up.

    Parameters
    ----------
    time_s, level_m : (n,) array
        Stamps as read, on UTC, increasing [s since 1970], and levels on the datum [m], NaN allowed.
    clock : Clock
        Shift and kind of stamp.
    corrections : sequence of Correction
        Those of this gauge.
    where : str
        Name for messages.

    Returns
    -------
    Corrected
        In the order given; a finding for each correction.

    Raises
    ------
    RecordError
        If corrected stamps collide or go out of order, naming the correction.
    """
    moved_s = time_s + (clock.clock_shift_s + averaging_shift_s(clock))
    moved_m = level_m.copy()
    findings = list(averaging_findings(clock, where))
    touched = []
    for correction in corrections:
        start_s, end_s = seconds_since_epoch(correction.start), seconds_since_epoch(correction.end)
        within = (time_s >= start_s) & (time_s < end_s)
        days = (time_s[within] - start_s) / SECONDS_PER_DAY
        shift_s = correction.clock_shift_s + correction.clock_drift_s_per_day * days
        moved_s[within] += shift_s
        moved_m[within] += correction.shift_m
        touched.append(within)
        findings.append(_report(correction, level_m[within], shift_s, where))
    _check_order(moved_s, touched, corrections, where)
    return Corrected(time_s=moved_s, level_m=moved_m, findings=tuple(findings))


def _label(correction: Correction) -> str:
    start, end = seconds_since_epoch(correction.start), seconds_since_epoch(correction.end)
    return f"[[correction]] of {correction.side} from {utc_text(start)} to {utc_text(end)}"


def _report(correction: Correction, level_m: FloatArray, shift_s: FloatArray, where: str) -> Finding:
    if level_m.size == 0:
        text = f"{_label(correction)} touches no sample; it is on the stamps as read, in UTC"
        return Finding(severity="warning", code="correction-idle", where=where, message=text)
    parts = [counted(level_m.size, "sample")]
    known = level_m[np.isfinite(level_m)]
    if correction.shift_m and known.size:
        before = float(known.mean())
        parts.append(f"mean level {before:.4f} m before, {before + correction.shift_m:.4f} m after")
    if correction.clock_shift_s or correction.clock_drift_s_per_day:
        parts.append(f"stamps moved by {shift_s[0]:+.1f} s at the first and {shift_s[-1]:+.1f} s at the last")
    text = f"{_label(correction)}: {', '.join(parts)}; evidence: {correction.evidence}"
    return Finding(severity="note", code="correction-applied", where=where, message=text)


def _check_order(
    time_s: FloatArray, touched: Sequence[NDArray[np.bool_]], corrections: Sequence[Correction], where: str
) -> None:
    back = np.flatnonzero(np.diff(time_s) <= 0.0)
    if back.size == 0:
        return
    first = int(back[0])
    guilty = [
        _label(correction)
        for correction, within in zip(corrections, touched, strict=True)
        if (within[first] or within[first + 1]) and (correction.clock_shift_s or correction.clock_drift_s_per_day)
    ]
    raise RecordError(
        f"{where}: {' and '.join(guilty)} brings samples to the same time or past each other at "
        f"{utc_text(time_s[first + 1])} ({counted(back.size, 'place')}); end it before the samples that it runs "
        "into, or take those out of the file"
    )
