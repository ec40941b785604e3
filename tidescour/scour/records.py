"""Records of scour: cycles, effective durations, growth and required length."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tidescour.errors import Finding
from tidescour.plan.models import Side
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


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class EffectiveDuration:
    """Effective durations of one row: a stage, an opening and a side.

    Parameters
    ----------
    stage, opening : str
        Names in the plan.
    side : {"sea", "basin"}
        Side of the hole.
    reference_velocity_m_s, alpha, critical_velocity_m_s, reference_depth_m : float
        What the durations refer to; with them the law gives the row's own depth. NaN where the row has no flow.
    reference_excess_m_s : float
        alpha u_ref - u_c, 0 where nothing moves [m/s].
    growth_rate : float
        A_ref ** (1 / gamma): m ** (1 / gamma) per hour at the reference; 0 where nothing moves.
    cycles : CycleSet
        The parts that the arrays below belong to.
    integral_h, flow_mean_h, cycle_mean_h : (m,) array
        Effective hours of each cycle under the three tide rules.
    peak_velocity_m_s : float
        Highest velocity at the end of the protection towards this side [m/s].
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
    reference_excess_m_s: float
    growth_rate: float
    cycles: CycleSet
    integral_h: FloatArray
    flow_mean_h: FloatArray
    cycle_mean_h: FloatArray
    peak_velocity_m_s: float
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in ("integral_h", "flow_mean_h", "cycle_mean_h"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != self.cycles.start_s.shape:
                raise ValueError(f"{key} must have one value a cycle")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ChainStep:
    """Growth of one place through one stage under one tide rule.

    `equivalent_start_h` is the time on this stage's own curve at which it would have the depth that it starts with;
    NaN where nothing grows. `stage_depth_m` is the depth from a flat bed. Depths in m, `share` of the place's sum.
    """

    stage_depth_m: float
    equivalent_start_h: float
    start_depth_m: float
    end_depth_m: float
    share: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RequiredLength:
    """Length of protection that one place needs.

    `alpha` belongs to the stage with the largest share at `length_m`, NaN without flow; `minimum_m` is six times the
    highest sill over the bed; `governed_by_minimum` where the slope rule asks for less.
    """

    length_m: float
    minimum_m: float
    final_depth_m: float
    alpha: float
    governed_by_minimum: bool
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
