"""What moves the bed of one row, at the solver's steps, zeros of the velocity and ends of cycles."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.bed.alpha import implied_turbulence
from tidescour.bed.records import BedHistory
from tidescour.plan.kinds import TideRule
from tidescour.scour.curves import curve_of, equilibrium_ratio, growth_rate
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import CycleSet
from tidescour.scour.shapes import MODEL_CURVE, SATURATING, chain_steps
from tidescour.units import SECONDS_PER_HOUR, FloatArray

NEAR_SINGULAR: Final = 1.2
"""Equilibrium depth over water depth up to which a step of a saturating law is taken in finer ones."""

FINER: Final = 128
"""Parts of such a step: half the step then changes no effective duration by more than 0.5 %."""


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
    chezy_m05_s : float or None
        Chezy coefficient of the protection; None where it is not known.
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
    chezy_m05_s: float | None

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
        chezy_m05_s=bed.chezy_m05_s,
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
        Multiplies alpha; the relative turbulence is then that which goes with the larger one.

    Returns
    -------
    (m,) array
        For a power law the state [m**(1 / gamma)] that each cycle adds, else the depth after it [m].
    """
    if rule == "integral":
        step_rate, step_scale_m = _step_means(samples, law, alpha_factor, 1.0)
        if law.is_power:
            return samples.by_cycle(step_rate)
        return _chained(law, step_rate, step_scale_m, samples.step_h, samples.cycle, samples.whole_h.size)
    strength, step_scale_m = _step_means(samples, law, alpha_factor, law.time_exponent)
    if rule == "flow-mean":
        hours = samples.flow_h
        step_scale_m = step_scale_m * (samples.velocity_m_s[:-1] + samples.velocity_m_s[1:] > 0.0)
    else:
        hours = samples.whole_h
    mean_rate = _mean(samples.by_cycle(strength), hours) ** (1.0 / law.time_exponent)
    if law.is_power:
        return mean_rate * hours
    mean_scale = _mean(samples.by_cycle(step_scale_m), hours)
    return _chained(law, mean_rate, mean_scale, hours, np.arange(hours.size), hours.size)


def _step_means(samples: Samples, law: GrowthLaw, alpha_factor: float, power: float) -> tuple[FloatArray, FloatArray]:
    """Means over each step of a power of the law's rate, and of its scale."""
    turbulence, attack = samples.turbulence, alpha_factor * samples.alpha * samples.velocity_m_s
    if alpha_factor != 1.0:
        turbulence = implied_turbulence(alpha_factor * samples.alpha, samples.chezy_m05_s)
    felt = np.array([attack, samples.velocity_m_s, turbulence, samples.depth_m])
    rate, scale_m, ratio = _rates(samples, law, felt)
    means = [0.5 * (values[:-1] + values[1:]) for values in (rate**power, scale_m)]
    if law.shape == SATURATING:
        # Where the equilibrium depth passes the water depth, the rate grows without limit: finer steps there.
        near = np.flatnonzero(np.maximum(ratio[:-1], ratio[1:]) > 1.0)
        near = near[np.minimum(ratio[near], ratio[near + 1]) < NEAR_SINGULAR]
        share = (np.arange(FINER) + 0.5) / FINER
        inside = felt[:, near, None] * (1.0 - share) + felt[:, near + 1, None] * share
        rate, scale_m, _ = _rates(samples, law, inside)
        means[0][near], means[1][near] = np.mean(rate**power, axis=-1), np.mean(scale_m, axis=-1)
    return means[0], means[1]


def _rates(samples: Samples, law: GrowthLaw, felt: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Rate and scale of the law's curve, and h_e over h0, for alpha u, u, r0 and h0 in `felt`."""
    critical = samples.critical_velocity_m_s
    attack, velocity, turbulence, depth_m = felt
    # A depth under a millimetre is possible only where hardly anything flows; a law may have a negative power of it.
    depth_m = np.maximum(depth_m, 1e-3)
    moving = attack > critical
    depth, ratio = depth_m[moving], np.full(attack.shape, -1.0)
    ratio[moving] = equilibrium_ratio(law.equilibrium, attack[moving], velocity[moving], turbulence[moving], critical)
    rate = np.zeros_like(attack)
    scale_m = depth_m if law.shape == MODEL_CURVE else np.zeros_like(attack)
    rate[moving], scale_m[moving] = curve_of(
        law, growth_rate(law, attack[moving] - critical, depth), depth, ratio[moving], samples.reference_depth_m
    )
    return rate, scale_m, ratio


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
