"""What moves the bed of one row, at the solver's steps, zeros of the velocity and ends of cycles."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tidescour.bed.records import BedHistory
from tidescour.plan.kinds import TideRule
from tidescour.scour.curves import curve_of, equilibrium_ratio, growth_rate
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import CycleSet
from tidescour.scour.shapes import MODEL_CURVE, chain_steps
from tidescour.units import SECONDS_PER_HOUR, FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Samples:
    """One row, ready to be integrated.

    Parameters
    ----------
    velocity_m_s, alpha, turbulence, depth_m : (n,) array
        Signed velocity, disturbance factor, relative turbulence and water depth.
    step_h : (n - 1,) array
        Length of each step.
    cycle : (n - 1,) int array
        Cycle of each step; `count` where it lies in none.
    flow_h, whole_h : (m,) array
        Hours of each cycle with flow to this side, and all of its hours.
    critical_velocity_m_s, reference_depth_m : float
        Of the row.
    """

    velocity_m_s: FloatArray
    alpha: FloatArray
    turbulence: FloatArray
    depth_m: FloatArray
    step_h: FloatArray
    cycle: NDArray[np.intp]
    flow_h: FloatArray
    whole_h: FloatArray
    critical_velocity_m_s: float
    reference_depth_m: float

    @property
    def mean_velocity_m_s(self) -> float:
        """Mean velocity over the time with flow to this side [m/s]; 0 without any."""
        hours = float(np.sum(self.flow_h))
        if hours == 0.0:
            return 0.0
        towards = np.maximum(self.velocity_m_s, 0.0)
        return float(np.sum(self.by_cycle(0.5 * (towards[:-1] + towards[1:])))) / hours

    def by_cycle(self, step_means: FloatArray) -> FloatArray:
        """(m,) array of integrals over each cycle [times hours], from means over steps."""
        return _sums(self.cycle, self.step_h * step_means, self.whole_h.size)


def row_samples(bed: BedHistory, cycles: CycleSet) -> Samples:
    """Return one row at the solver's steps, with zeros of the velocity and ends of cycles between them."""
    time_s, velocity, alpha, turbulence, depth = _refined(bed, cycles)
    step_h = np.diff(time_s) / SECONDS_PER_HOUR
    cycle = _cycle_of_steps(time_s, cycles)
    # The sign does not change within a step: its sum tells it, whatever rounding leaves of a zero at one end.
    flowing = velocity[:-1] + velocity[1:] > 0.0
    return Samples(
        velocity_m_s=velocity,
        alpha=alpha,
        turbulence=turbulence,
        depth_m=depth,
        step_h=step_h,
        cycle=cycle,
        flow_h=_sums(cycle, step_h * flowing, cycles.start_s.size),
        whole_h=(cycles.end_s - cycles.start_s) / SECONDS_PER_HOUR,
        critical_velocity_m_s=bed.critical_velocity_m_s,
        reference_depth_m=bed.reference_depth_m,
    )


def growth_by_cycle(samples: Samples, law: GrowthLaw, rule: TideRule, alpha_factor: float = 1.0) -> FloatArray:
    """Growth of one row from a flat bed, cycle by cycle, under one tide rule.

    Parameters
    ----------
    samples : Samples
        From `row_samples`.
    law : GrowthLaw
        Growth law.
    rule : {"integral", "flow-mean", "cycle-mean"}
        Tide rule.
    alpha_factor : float
        Multiplies alpha.

    Returns
    -------
    (m,) array
        For a power law the state [m**(1 / gamma)] that each cycle adds, else the depth after it [m].
    """
    rate, scale = _rates(samples, law, alpha_factor)
    step_scale = 0.5 * (scale[:-1] + scale[1:])
    if rule == "integral":
        step_rate = 0.5 * (rate[:-1] + rate[1:])
        if law.is_power:
            return samples.by_cycle(step_rate)
        return _chained(law, step_rate, step_scale, samples.step_h, samples.cycle, samples.whole_h.size)
    strength = rate**law.time_exponent
    total = samples.by_cycle(0.5 * (strength[:-1] + strength[1:]))
    if rule == "flow-mean":
        hours, counted = samples.flow_h, samples.velocity_m_s[:-1] + samples.velocity_m_s[1:] > 0.0
        step_scale = step_scale * counted
    else:
        hours = samples.whole_h
    mean_rate = _mean(total, hours) ** (1.0 / law.time_exponent)
    if law.is_power:
        return mean_rate * hours
    mean_scale = _mean(samples.by_cycle(step_scale), hours)
    return _chained(law, mean_rate, mean_scale, hours, np.arange(hours.size), hours.size)


def _rates(samples: Samples, law: GrowthLaw, alpha_factor: float) -> tuple[FloatArray, FloatArray]:
    """Rate and scale of the law's curve at each sample; 0 where nothing moves."""
    critical = samples.critical_velocity_m_s
    attack = alpha_factor * samples.alpha * samples.velocity_m_s
    moving = attack > critical
    # A depth under zero is possible only where no cycle counts; a law may have a negative power of it.
    depth = np.maximum(samples.depth_m, 1e-3)[moving]
    ratio = equilibrium_ratio(
        law.equilibrium, attack[moving], samples.velocity_m_s[moving], samples.turbulence[moving], critical
    )
    rate = np.zeros_like(attack)
    scale = np.maximum(samples.depth_m, 1e-3) if law.shape == MODEL_CURVE else np.zeros_like(attack)
    rate[moving], scale[moving] = curve_of(
        law, growth_rate(law, attack[moving] - critical, depth), depth, ratio, samples.reference_depth_m
    )
    return rate, scale


def _chained(
    law: GrowthLaw,
    rate: FloatArray,
    scale: FloatArray,
    hours: FloatArray,
    cycle: NDArray[np.intp],
    count: int,
) -> FloatArray:
    depth_m = np.zeros(count)
    chain_steps(law.shape, law.curve, law.time_exponent, rate, scale, hours, cycle, depth_m)
    return depth_m


def _mean(total: FloatArray, hours: FloatArray) -> FloatArray:
    return np.divide(total, hours, out=np.zeros_like(total), where=hours > 0.0)


def _refined(bed: BedHistory, cycles: CycleSet) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]:
    """Time, signed u, alpha, r0 and h0 at the solver's steps, at the zeros of u and at the ends of cycles."""
    signed = bed.signed_velocity_m_s
    change = np.flatnonzero(signed[:-1] * signed[1:] < 0.0)
    share = signed[change] / (signed[change] - signed[change + 1])
    zeros = bed.time_s[change] + share * np.diff(bed.time_s)[change]
    cuts = np.unique(np.concatenate([cycles.start_s, cycles.end_s]))
    added = np.concatenate([zeros, cuts])
    value = np.concatenate([np.zeros_like(zeros), np.interp(cuts, bed.time_s, signed)])
    order = np.argsort(added, kind="stable")
    added, value = added[order], value[order]
    where = np.searchsorted(bed.time_s, added)

    def with_added(values: FloatArray) -> FloatArray:
        return np.insert(values, where, np.interp(added, bed.time_s, values))

    return (
        np.insert(bed.time_s, where, added),
        np.insert(signed, where, value),
        with_added(bed.alpha),
        with_added(bed.turbulence),
        with_added(bed.depth_m),
    )


def _cycle_of_steps(time_s: FloatArray, cycles: CycleSet) -> NDArray[np.intp]:
    """(n - 1,) int array: the cycle that each step lies in, or one more than the last where it lies in none."""
    middle = 0.5 * (time_s[:-1] + time_s[1:])
    cycle = np.searchsorted(cycles.start_s, middle, side="right") - 1
    outside = (cycle < 0) | (middle >= cycles.end_s[cycle])
    return np.where(outside, cycles.start_s.size, cycle)


def _sums(cycle: NDArray[np.intp], values: FloatArray, count: int) -> FloatArray:
    return np.asarray(np.bincount(cycle, weights=values, minlength=count + 1)[:count], dtype=np.float64)
