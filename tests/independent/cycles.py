"""The search for cycles and integrals from edge to edge, for the recomputation beside this file."""

from itertools import pairwise

import numpy as np
from formulas import Array
from levels import HOUR, Flow, Piece, Table
from scipy.integrate import cumulative_trapezoid


def turns(time_s: Array, curve: Array, e: float) -> list[float]:
    """Upward zeros that count: below -e before, above +e after, the last of several, over 6 h apart."""
    found: list[float] = []
    was_low, zero_s = False, None
    for i in range(1, len(curve)):
        was_low = was_low or bool(curve[i - 1] < -e)
        if curve[i - 1] <= 0.0 < curve[i]:
            zero_s = float(time_s[i - 1] - curve[i - 1] * (time_s[i] - time_s[i - 1]) / (curve[i] - curve[i - 1]))
        if was_low and zero_s is not None and curve[i] > e:
            if not found or zero_s - found[-1] > 6.0 * HOUR:
                found.append(zero_s)
                was_low = False
            zero_s = None
    return found


def cycle_edges(piece: Piece, curve: Array, e: float) -> Array:
    """Edges of the cycles of one piece; a stretch over 30 h is cut in equal parts near 12.42 h."""
    marks = [piece.time_s[0], *turns(piece.time_s, curve, e), piece.time_s[-1]]
    edges = [marks[0]]
    for first, last in pairwise(marks):
        parts = max(1, round((last - first) / (12.42 * HOUR))) if last - first > 30.0 * HOUR else 1
        edges.extend(np.linspace(first, last, parts + 1)[1:])
    return np.array(edges)


def stage_edges(stage: Table, opening: Table, pieces: list[Piece], flows: list[Flow]) -> list[Array]:
    if "end_velocity_series" in opening:
        curves = [flow.end_m_s for flow in flows]
    elif "discharge_series" in opening:
        curves = [flow.discharge_m3_s for flow in flows]
    else:
        curves = [piece.level_m["sea"] - piece.level_m["basin"] for piece in pieces]
    twentieth = max(float(np.max(np.abs(curve))) for curve in curves) / 20.0
    if "end_velocity_series" in opening or "discharge_series" in opening:
        e = twentieth
    else:
        e = 0.02 if stage.get("sea") == "measured" else min(0.02, twentieth)
    return [cycle_edges(piece, curve, e) for piece, curve in zip(pieces, curves, strict=True)]


def between(time_s: Array, rate: Array, edges: Array) -> Array:
    """Integral of `rate` from edge to edge [hours x rate]."""
    return np.diff(np.interp(edges, time_s, cumulative_trapezoid(rate, time_s, initial=0.0))) / HOUR


def flowing_hours(time_s: Array, signed_u: Array, edges: Array) -> Array:
    """Hours with u > 0 from edge to edge, zeros by straight lines."""
    left, right = signed_u[:-1], signed_u[1:]
    share = np.where((left > 0.0) | (right > 0.0), 1.0, 0.0)
    cross = left * right < 0.0
    share[cross] = np.maximum(left[cross], right[cross]) / np.abs(left[cross] - right[cross])
    passed = np.concatenate(([0.0], np.cumsum(share * np.diff(time_s))))
    return np.diff(np.interp(edges, time_s, passed)) / HOUR
