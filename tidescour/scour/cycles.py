"""Where one tide ends and the next begins."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.scour.records import CycleSet
from tidescour.units import M2_PERIOD_H, SECONDS_PER_HOUR, FloatArray, utc_text

NOISE_M: Final = 0.02
"""Head that a turn must pass on both sides of zero where a measured level enters [m] (common practice, no source)."""

NOISE_SHARE: Final = 1.0 / 20.0
"""The same as a share of the largest value, for computed heads and given series (common practice, no source)."""

SHORTEST_S: Final = 6.0 * SECONDS_PER_HOUR
LONGEST_S: Final = 30.0 * SECONDS_PER_HOUR
TIDE_S: Final = M2_PERIOD_H * SECONDS_PER_HOUR


def stage_cycles(flow: StageFlow, opening: OpeningFlow) -> CycleSet:
    """Cycles of one opening in one stage, each from one turn to flood to the next.

    Parameters
    ----------
    flow : StageFlow
        The head makes the turns, one set for all openings.
    opening : OpeningFlow
        One of `flow`; where its discharge or velocity is given, that series makes the turns instead.

    Returns
    -------
    CycleSet
        Cycles in order. The ends of the stage and holes of the records cut a cycle; stretches of more than 30 h
        without a turn are cut in equal parts, with a finding.

    References
    ----------
    Zero crossing with hysteresis, common practice; `turns_to_flood`.
    """
    curve = opening.signed_flow if opening.given else flow.head_m
    threshold = _threshold(curve[flow.covered], flow, opening)
    starts: list[FloatArray] = []
    ends: list[FloatArray] = []
    without: list[tuple[float, float]] = []
    for part in _stretches(flow.covered):
        time_s = flow.time_s[part]
        cuts = np.concatenate(
            [time_s[:1], turns_to_flood(time_s, curve[part], threshold), time_s[-1:]],
        )
        long = np.flatnonzero(np.diff(cuts) > LONGEST_S)
        without.extend((cuts[i], cuts[i + 1]) for i in long)
        cuts = np.concatenate([cuts, *(_equal_cuts(cuts[i], cuts[i + 1]) for i in long)])
        cuts.sort()
        starts.append(cuts[:-1])
        ends.append(cuts[1:])
    return CycleSet(
        start_s=np.concatenate(starts) if starts else np.empty(0),
        end_s=np.concatenate(ends) if ends else np.empty(0),
        findings=_findings(flow, opening, without),
    )


def turns_to_flood(time_s: FloatArray, curve: FloatArray, threshold: float) -> FloatArray:
    """Find the times at which a curve turns from ebb to flood, told from noise around zero.

    Parameters
    ----------
    time_s : (n,) array
        Seconds, increasing.
    curve : (n,) array
        Head, discharge or velocity, positive in the flood direction; finite.
    threshold : float
        A turn counts where the curve was below ``-threshold`` since the last counted turn and passes ``+threshold``
        before its next upward zero, over 6 h after the last counted turn.

    Returns
    -------
    (m,) array
        Upward zeros that count, linear between samples, increasing.
    """
    rising = np.flatnonzero((curve[:-1] <= 0.0) & (curve[1:] > 0.0))
    zeros = time_s[rising] - curve[rising] * np.diff(time_s)[rising] / np.diff(curve)[rising]
    # The curve between two upward zeros goes up first, then down: its highest value belongs to the zero before it,
    # its lowest to the zero after it.
    pieces = np.concatenate([[0], rising + 1])
    lows = np.minimum.reduceat(curve, pieces)[:-1]
    highs = np.maximum.reduceat(curve, pieces)[1:]
    counted: list[float] = []
    lowest = np.inf
    for zero, low, high in zip(zeros.tolist(), lows.tolist(), highs.tolist(), strict=True):
        lowest = min(lowest, low)
        late_enough = not counted or zero - counted[-1] > SHORTEST_S
        if lowest < -threshold and high > threshold and late_enough:
            counted.append(zero)
            lowest = np.inf
    return np.array(counted, dtype=np.float64)


def _threshold(covered_curve: FloatArray, flow: StageFlow, opening: OpeningFlow) -> float:
    largest = float(np.max(np.abs(covered_curve), initial=0.0))
    if opening.given:
        return NOISE_SHARE * largest
    return NOISE_M if flow.measured else min(NOISE_M, NOISE_SHARE * largest)


def _stretches(covered: NDArray[np.bool_]) -> Iterator[slice]:
    """Yield runs of covered samples, of at least two."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], covered, [False]]).astype(np.int8)))
    for first, stop in edges.reshape(-1, 2).tolist():
        if stop - first > 1:
            yield slice(first, stop)


def _equal_cuts(start_s: float, end_s: float) -> FloatArray:
    """Inner cuts that make parts as near one tide as can be."""
    fewer = int((end_s - start_s) // TIDE_S)
    parts = min((fewer, fewer + 1), key=lambda n: abs((end_s - start_s) / n - TIDE_S))
    return np.linspace(start_s, end_s, parts + 1)[1:-1]


def _findings(flow: StageFlow, opening: OpeningFlow, without: list[tuple[float, float]]) -> tuple[Finding, ...]:
    if not without:
        return ()
    hours = sum(end - start for start, end in without) / SECONDS_PER_HOUR
    source = f"the series given for opening {opening.name!r}" if opening.given else "the head"
    return (
        Finding(
            severity="warning",
            code="no-turn",
            where=f"stage {flow.stage!r}" + (f", opening {opening.name!r}" if opening.given else ""),
            message=(
                f"{source} does not turn to flood in {len(without)} stretches of over 30 h, {hours:.1f} h together, "
                f"the first from {utc_text(without[0][0])}: cut in equal parts near {M2_PERIOD_H:.2f} h"
            ),
        ),
    )
