"""Growth along curves that may bend, through layers, under five ways of counting the tide; for `rebend.py`.

A hole grows along h = h_e (1 - exp(-(k / h_e) t^gamma)), which is the plain power k t^gamma where h_e is infinite.
"""

import math
from dataclasses import dataclass

import numpy as np
from formulas import Array
from scipy.optimize import brentq


@dataclass(frozen=True)
class Curve:
    """Strength k [m h^-gamma] and the depth h_e [m] towards which the curve bends."""

    strength: float
    limit_m: float

    def depth_m(self, time_h: float, gamma: float) -> float:
        if self.strength <= 0.0 or self.limit_m <= 0.0:
            return 0.0
        straight = self.strength * time_h**gamma
        return straight if math.isinf(self.limit_m) else -self.limit_m * math.expm1(-straight / self.limit_m)

    def time_h(self, depth_m: float, gamma: float) -> float:
        """Time at which a hole from a flat bed has this depth; infinite where it never has."""
        if depth_m <= 0.0:
            return 0.0
        if self.strength <= 0.0 or depth_m >= self.limit_m:
            return math.inf
        bent = depth_m if math.isinf(self.limit_m) else -self.limit_m * math.log1p(-depth_m / self.limit_m)
        return (bent / self.strength) ** (1.0 / gamma)

    def grown_m(self, depth_m: float, time_h: float, gamma: float) -> float:
        """Depth after some more time, by equivalent time."""
        before_h = self.time_h(depth_m, gamma)
        return depth_m if math.isinf(before_h) else max(depth_m, self.depth_m(before_h + time_h, gamma))


@dataclass(frozen=True)
class Growth:
    """The law of a plan: its power of the excess, and K Delta^1.7 or the factor of the explicit form."""

    name: str
    gamma: float
    delta: float
    constant: float
    equilibrium: str = ""

    def curves(self, moved: Array, excess: Array, depth_m: Array, mean_depth_m: float) -> tuple[Array, Array]:
        """Strength and limit at each moment; `moved` is omega u / u_c - 1."""
        if self.name == "explicit":
            return excess**1.7 * depth_m**0.2 / (10.0 * self.delta**0.7), np.full_like(excess, math.inf)
        speed = (excess**4.3 / (self.constant * depth_m**2 * self.delta**1.7)) ** self.gamma  # t1^-gamma
        if self.name == "time-scale":
            return depth_m * speed, np.full_like(excess, math.inf)
        over = np.maximum(moved, 0.0)
        # Where h_e is under the depth the bend is (h0 / h_e), and strength h0 / t1^gamma.
        high = over > 1.0
        bend = np.where(high, -np.log1p(-1.0 / np.where(high, over, 2.0)) * over, 1.0)
        still = over <= 0.0
        return np.where(still, 0.0, bend * depth_m * speed), over * mean_depth_m


def along(curves: list[tuple[float, float]], hours: Array, gamma: float) -> Array:
    """Depth from a flat bed after each span, every span on a curve of its own."""
    depth_m, depths = 0.0, []
    for (strength, limit_m), span_h in zip(curves, hours.tolist(), strict=True):
        if strength > 0.0 and depth_m < limit_m:
            depth_m = Curve(strength, limit_m).grown_m(depth_m, span_h, gamma)
        depths.append(depth_m)
    return np.array(depths)


@dataclass(frozen=True)
class Counted:
    """One row in one layer under one rule: the reference's curve and its hours, cycle by cycle."""

    curve: Curve
    hours: Array


def walk(
    layers: list[Counted], tops_m: list[float], start_m: float, gamma: float
) -> tuple[Array, list[int], list[float]]:
    """Depth at the end of each cycle (over the growth factor), the layer at the bottom there, hours in each layer.

    The part of a cycle that is left when the next top is reached counts by its effective hours.
    """
    depth_m = start_m
    layer = sum(depth_m >= top_m for top_m in tops_m)
    depths, at_bottom = [], []
    spent_h = [0.0 for _ in layers]
    for cycle in range(len(layers[0].hours)):
        left = 1.0
        while left > 0.0:
            counted = layers[layer]
            hours = left * float(counted.hours[cycle])
            after_m = counted.curve.grown_m(depth_m, hours, gamma)
            top_m = tops_m[layer] if layer < len(tops_m) else math.inf
            if after_m < top_m:
                depth_m, left = after_m, 0.0
                spent_h[layer] += hours
                continue
            needed_h = counted.curve.time_h(top_m, gamma) - counted.curve.time_h(depth_m, gamma)
            left *= 1.0 - needed_h / hours
            spent_h[layer] += needed_h
            depth_m, layer = top_m, layer + 1
        depths.append(depth_m)
        at_bottom.append(layer)
    return np.array(depths), at_bottom, spent_h


def held_alike(depth_by_factor, wanted_m: float) -> float:
    """Factor on alpha that brings a depth to the wanted one; not a number outside 1/20 to 20."""
    if not depth_by_factor(0.05) < wanted_m < depth_by_factor(20.0):
        return math.nan
    return float(brentq(lambda factor: depth_by_factor(factor) - wanted_m, 0.05, 20.0, xtol=1e-9))
