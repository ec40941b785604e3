"""How the depth of a hole follows from the depth that a pure power law would give, and back.

Every growth law here is h = s G((k t)**gamma / s): a rate k [m**(1 / gamma) per hour], a scale s [m] and a shape G. The
state k t is what adds up while the flow stays the same; when the flow changes, the depth is kept and the state is that
which the new flow's curve has at this depth. With G(y) = y the scale drops out and states add up whatever the flow.
"""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from tidescour.compiled import compiled
from tidescour.units import FloatArray

POWER: Final = 0
SATURATING: Final = 1
MODEL_CURVE: Final = 2


@compiled
def depth_of_state(shape: int, curve: FloatArray, exponent: float, state: float, scale: float) -> float:
    """Depth [m] at a state [m**(1 / gamma)] on the curve of a scale [m]; `curve` as in `GrowthLaw`."""
    if state <= 0.0:
        return 0.0
    power = math.pow(state, exponent)
    if shape == POWER:
        return power
    if shape == SATURATING:
        return -scale * math.expm1(-power / scale) if scale > 0.0 else 0.0
    return scale * math.exp(_interpolated(math.log(power / scale) / exponent, curve[0], curve[1], exponent))


@compiled
def state_of_depth(shape: int, curve: FloatArray, exponent: float, depth: float, scale: float) -> float:
    """State [m**(1 / gamma)] at which the curve of a scale [m] has a depth [m]; infinite where it never has."""
    if depth <= 0.0:
        return 0.0
    if shape == POWER:
        return math.pow(depth, 1.0 / exponent)
    if shape == SATURATING:
        return math.pow(-scale * math.log1p(-depth / scale), 1.0 / exponent) if depth < scale else math.inf
    time = _interpolated(math.log(depth / scale), curve[1], curve[0], 1.0 / exponent)
    return math.pow(scale, 1.0 / exponent) * math.exp(time)


@compiled
def _interpolated(value: float, known: FloatArray, wanted: FloatArray, first_slope: float) -> float:
    """Linear between rows; under the first with the slope of the pure power law, over the last with its own."""
    last = known.size - 1
    if value <= known[0]:
        return float(wanted[0]) + first_slope * (value - float(known[0]))
    at = min(int(np.searchsorted(known, value)), last)
    slope = float((wanted[at] - wanted[at - 1]) / (known[at] - known[at - 1]))
    return float(wanted[at - 1]) + slope * (value - float(known[at - 1]))


@compiled
def depths_of_states(
    shape: int, curve: FloatArray, exponent: float, state: FloatArray, scale: float, depth: FloatArray
) -> None:
    """Fill `depth` with the depths at states on one curve."""
    for at in range(state.size):
        depth[at] = depth_of_state(shape, curve, exponent, state[at], scale)


@compiled
def states_of_depths(
    shape: int, curve: FloatArray, exponent: float, depth: FloatArray, scale: float, state: FloatArray
) -> None:
    """Fill `state` with the states of depths on one curve."""
    for at in range(depth.size):
        state[at] = state_of_depth(shape, curve, exponent, depth[at], scale)


@compiled
def chain_steps(
    shape: int,
    curve: FloatArray,
    exponent: float,
    rate: FloatArray,
    scale: FloatArray,
    hours: FloatArray,
    cycle: np.ndarray,
    depth_at_end: FloatArray,
) -> None:
    """Grow a hole from a flat bed through steps, each with its own flow, by equivalent time.

    `rate` and `scale` are those of each step, `hours` its length, `cycle` the cycle that it belongs to (one that
    `depth_at_end` does not have: it counts for nothing). Fills `depth_at_end` with the depth after each cycle [m].
    """
    depth = 0.0
    for at in range(rate.size):
        if cycle[at] >= depth_at_end.size:
            continue
        if rate[at] > 0.0 and scale[at] > 0.0:
            state = state_of_depth(shape, curve, exponent, depth, scale[at])
            if state < math.inf:
                grown = depth_of_state(shape, curve, exponent, state + rate[at] * hours[at], scale[at])
                depth = max(depth, grown)
        depth_at_end[cycle[at]] = depth
