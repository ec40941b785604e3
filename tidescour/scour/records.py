"""Records of scour: cycles, effective durations, growth and required length."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Final, Literal

import numpy as np

from tidescour.errors import Finding
from tidescour.plan.kinds import TIDE_RULES, Side, TideRule
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CycleSet:
    """The cycles of one opening in one stage: `start_s` and `end_s` of each, seconds since 1970, in order.

    Together they cover the covered part of the stage once. `findings` tells of stretches cut without a turn.
    """

    start_s: FloatArray
    end_s: FloatArray
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes and order; keep read-only copies."""
        object.__setattr__(self, "start_s", read_only(self.start_s))
        object.__setattr__(self, "end_s", read_only(self.end_s))
        if self.start_s.shape != self.end_s.shape or self.start_s.ndim != 1:
            raise ValueError("start_s and end_s must have one length")
        if np.any(self.end_s <= self.start_s) or np.any(self.start_s[1:] < self.end_s[:-1]):
            raise ValueError("cycles must run forward and not overlap")


HELD_RULES: Final = ("peak-held", "mean-held")
"""What is often done by hand instead of a tide rule: one velocity held over all the time with flow."""

Rule = TideRule | Literal["peak-held", "mean-held"]
RULES: Final[tuple[Rule, ...]] = (*TIDE_RULES, "peak-held", "mean-held")
"""The tide rules, and the two velocities held, in the order of every comparison."""

HOUR_KEYS: Final = ("integral_h", "flow_mean_h", "cycle_mean_h", "peak_held_h", "mean_held_h", "flow_h")
"""Fields of `EffectiveDuration` that count the hours of each cycle."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class EffectiveDuration:
    """Effective durations of one row: a stage, an opening and a side, in one layer of the bed.

    Parameters
    ----------
    stage, opening : str
        Names in the plan.
    side : {"sea", "basin"}
        Side of the hole.
    reference_velocity_m_s, alpha, critical_velocity_m_s, reference_depth_m : float
        What the durations refer to; with them the law gives the row's own depth. NaN where the row has no flow.
    turbulence : float
        Relative turbulence r0 that goes with alpha; NaN where it is not known.
    reference_excess_m_s : float
        alpha u_ref - u_c, 0 where nothing moves [m/s].
    growth_rate, power_rate : float
        State that the law's curve gains per hour at the reference, and that of its power part:
        m ** (1 / gamma) per hour; 0 where nothing moves. They differ for a saturating law only.
    scale_m : float
        Scale of the law's curve at the reference: equilibrium depth of a saturating law, water depth of a model curve,
        infinite for a power law.
    equilibrium_half_alpha_m, equilibrium_turbulence_m : float
        Equilibrium depths by the two published forms, of the steady reference; NaN where not known.
    cycles : CycleSet
        The parts that the arrays below belong to.
    integral_h, flow_mean_h, cycle_mean_h : (m,) array
        Effective hours of each cycle under the three tide rules.
    peak_held_h, mean_held_h : (m,) array
        The same if the highest, or the mean, velocity ran all the time with flow; NaN where the reference's curve
        does not reach so deep.
    flow_h : (m,) array
        Hours of each cycle with flow to this side.
    peak_velocity_m_s, mean_velocity_m_s : float
        Highest velocity at the end of the protection towards this side, and its mean over the time with flow [m/s].
    findings : tuple of Finding
        What a reader must know.
    """

    stage: str
    opening: str
    side: Side
    reference_velocity_m_s: float
    alpha: float
    critical_velocity_m_s: float
    reference_depth_m: float
    turbulence: float
    reference_excess_m_s: float
    growth_rate: float
    power_rate: float
    scale_m: float
    equilibrium_half_alpha_m: float
    equilibrium_turbulence_m: float
    cycles: CycleSet
    integral_h: FloatArray
    flow_mean_h: FloatArray
    cycle_mean_h: FloatArray
    peak_held_h: FloatArray
    mean_held_h: FloatArray
    flow_h: FloatArray
    peak_velocity_m_s: float
    mean_velocity_m_s: float
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in HOUR_KEYS:
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != self.cycles.start_s.shape:
                raise ValueError(f"{key} must have one value a cycle")

    def scaled(self, factor: FloatArray | float) -> EffectiveDuration:
        """Return the same row with the hours of its cycles multiplied by a factor, one for all or one a cycle."""
        return replace(self, **{key: factor * getattr(self, key) for key in HOUR_KEYS})

    def hours(self, rule: Rule) -> FloatArray:
        """(m,) array of effective hours of each cycle under one rule."""
        by_rule: dict[Rule, FloatArray] = {
            "integral": self.integral_h,
            "flow-mean": self.flow_mean_h,
            "cycle-mean": self.cycle_mean_h,
            "peak-held": self.peak_held_h,
            "mean-held": self.mean_held_h,
        }
        return by_rule[rule]

    def total_h(self, rule: Rule) -> float:
        """Effective duration under one rule [h]."""
        return float(np.sum(self.hours(rule)))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RowDurations:
    """A row in every layer of its bed, as if the hole lay in that layer all the time.

    Parameters
    ----------
    layers : tuple of EffectiveDuration
        From the surface down; all with the same cycles.
    top_depth_m : tuple of float
        Depth of each layer's top below the original bed [m], 0 first, increasing.
    """

    layers: tuple[EffectiveDuration, ...]
    top_depth_m: tuple[float, ...] = (0.0,)

    def __post_init__(self) -> None:
        """Check that layers and depths belong together."""
        if len(self.layers) != len(self.top_depth_m) or self.top_depth_m[0] != 0.0:
            raise ValueError("each layer needs the depth of its top, the surface 0")
        if any(lower <= upper for upper, lower in pairwise(self.top_depth_m)):
            raise ValueError("layers must lie one under the other")

    @property
    def cycles(self) -> CycleSet:
        """The cycles of the row."""
        return self.layers[0].cycles

    def at_depth(self, depth_m: float) -> int:
        """Position of the layer in which a hole of this depth ends; at a layer's top, that layer."""
        return int(np.searchsorted(self.top_depth_m, depth_m, side="right")) - 1


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LayerReached:
    """A layer of the bed that a hole reaches, and what it grows there until the stage ends or the next layer comes.

    `layer` is its position, `depth_m` the depth of its top [m], `time_s` when it is reached (seconds since 1970). From
    `equivalent_start_h` on the layer's own curve the hole grows for `effective_duration_h` [h]; the first is NaN where
    nothing grows.
    """

    layer: int
    depth_m: float
    time_s: float
    equivalent_start_h: float
    effective_duration_h: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ChainStep:
    """Growth of one place through one stage under one rule.

    `equivalent_start_h` is the time on this stage's own curve at which it would have the depth that it starts with;
    NaN where nothing grows. `stage_depth_m` is the depth from a flat bed. Depths in m, `share` of the place's sum.
    `layer` is the position of the layer in which the hole lies when the stage starts, to which hours and depths from
    a flat bed belong, and `spent_h` the effective hours until the first of the layers in `reached` is met.
    """

    stage_depth_m: float
    equivalent_start_h: float
    start_depth_m: float
    end_depth_m: float
    share: float
    layer: int = 0
    spent_h: float = 0.0
    reached: tuple[LayerReached, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RequiredLength:
    """Length of protection that one place needs.

    `alpha` belongs to the stage with the largest share at `length_m`, NaN without flow; `minimum_m` is six times the
    highest sill over the bed, or the shortest length of the place's alpha table; `governed_by_minimum` where the slope
    rule asks for less. `single_slide_m` is the length by the area balance of one slide from `upstream_slope_cot`, both
    NaN where that slope is not known.
    """

    length_m: float
    minimum_m: float
    final_depth_m: float
    alpha: float
    governed_by_minimum: bool
    upstream_slope_cot: float = float("nan")
    single_slide_m: float = float("nan")
    findings: tuple[Finding, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class GrowthCurve:
    """Depth of one place at the ends of its cycles.

    `time_s` (seconds since 1970), `depth_m` [m] and `stage` (the stage of each point) have one length; the first
    point is the start of the first cycle.
    """

    time_s: FloatArray
    depth_m: FloatArray
    stage: tuple[str, ...]

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        object.__setattr__(self, "time_s", read_only(self.time_s))
        object.__setattr__(self, "depth_m", read_only(self.depth_m))
        if not self.time_s.shape == self.depth_m.shape == (len(self.stage),):
            raise ValueError("time_s, depth_m and stage must have one length")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LengthCurve:
    """How alpha, effective duration [h] and final depth [m] of a place depend on the length of its protection [m]."""

    length_m: FloatArray
    alpha: FloatArray
    effective_duration_h: FloatArray
    final_depth_m: FloatArray

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in ("length_m", "alpha", "effective_duration_h", "final_depth_m"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != self.length_m.shape:
                raise ValueError(f"{key} must be as long as length_m")
