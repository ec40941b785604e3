"""How many hours of its worst velocity a stage is worth."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.bed.history import row_name
from tidescour.bed.records import BedHistory
from tidescour.errors import DomainError, Finding
from tidescour.scour.laws import PowerLaw, growth_rate
from tidescour.scour.records import CycleSet, EffectiveDuration
from tidescour.units import SECONDS_PER_HOUR, FloatArray

WEAK_REFERENCE: Final = 2.0
"""Effective over true hours from which an own reference is called weak (common practice, no source)."""


def effective_duration(
    bed: BedHistory, cycles: CycleSet, law: PowerLaw, reference_velocity_m_s: float | None
) -> EffectiveDuration:
    """Effective duration of one row under the three tide rules, cycle by cycle.

    With E = max(alpha u - u_c, 0), a law h = c E**q h0**r t**gamma and a reference E_ref, h0_ref:

    - integral: Int (E / E_ref)**(q / gamma) (h0 / h0_ref)**(r / gamma) dt, the tide chained in small steps;
    - flow-mean: [mean / (E_ref**q h0_ref**r)]**(1 / gamma) times the counted time, with the mean of E**q h0**r over
      the time with u > 0, that time counted;
    - cycle-mean: the same with the whole cycle.

    Parameters
    ----------
    bed : BedHistory
        What the bed feels, at the solver's steps; linear between, zero of u included.
    cycles : CycleSet
        What to integrate over; steps outside the cycles count for nothing.
    law : PowerLaw
        Growth law.
    reference_velocity_m_s : float or None
        Velocity that the hours refer to [m/s]; None for the row's own peak. Depths do not depend on it.

    Returns
    -------
    EffectiveDuration
        Hours, not negative; 0 throughout where nothing moves.

    Raises
    ------
    DomainError
        If a given reference velocity, with alpha, does not pass the critical velocity.

    References
    ----------
    d(h**(1 / gamma)) / dt = (c E**q h0**r)**(1 / gamma) for growth by equivalent time; trapezoid rule between steps,
    zeros of u and ends of cycles.
    """
    peak = float(np.max(bed.velocity_m_s[bed.covered], initial=0.0))
    velocity, alpha = _reference(bed, peak, reference_velocity_m_s)
    excess = 0.0 if peak == 0.0 else max(alpha * velocity - bed.critical_velocity_m_s, 0.0)
    integral, flow_mean, cycle_mean = np.zeros((3, cycles.start_s.size))
    rate = 0.0
    if excess > 0.0:
        integral, flow_mean, cycle_mean = _hours(bed, cycles, law, excess)
        rate = float(growth_rate(law, excess, bed.reference_depth_m))
    return EffectiveDuration(
        stage=bed.stage,
        opening=bed.opening,
        side=bed.side,
        reference_velocity_m_s=velocity,
        alpha=alpha,
        critical_velocity_m_s=bed.critical_velocity_m_s,
        reference_depth_m=bed.reference_depth_m,
        reference_excess_m_s=excess,
        growth_rate=rate,
        cycles=cycles,
        integral_h=integral,
        flow_mean_h=flow_mean,
        cycle_mean_h=cycle_mean,
        peak_velocity_m_s=peak,
        findings=() if reference_velocity_m_s is not None else _hours_findings(bed, cycles, float(integral.sum())),
    )


def _hours_findings(bed: BedHistory, cycles: CycleSet, effective_h: float) -> tuple[Finding, ...]:
    """Tell where the own reference is so weak that the hours mean little; the depth does not depend on them."""
    covered_h = float(np.sum(cycles.end_s - cycles.start_s)) / SECONDS_PER_HOUR
    if effective_h <= WEAK_REFERENCE * covered_h:
        return ()
    return (
        Finding(
            severity="note",
            code="weak-reference",
            where=row_name(bed.stage, bed.opening, bed.side),
            message=(
                f"{effective_h:.0f} effective hours in {covered_h:.0f} h: alpha of the mean crest brings the peak "
                "velocity hardly over the threshold, so that its hours are worth little. The depth is not touched; "
                "scour.reference_velocity_m_s sets another reference"
            ),
        ),
    )


def _reference(bed: BedHistory, peak_m_s: float, given_m_s: float | None) -> tuple[float, float]:
    """Choose reference velocity and alpha: given, the row's peak, or those at the largest excess where alpha varies."""
    critical = bed.critical_velocity_m_s
    if peak_m_s == 0.0:
        return float("nan"), float("nan")
    if given_m_s is not None:
        if not bed.alpha_ref * given_m_s > critical:
            raise DomainError(
                f"{row_name(bed.stage, bed.opening, bed.side)}: scour.reference_velocity_m_s = {given_m_s:g} times "
                f"alpha = {bed.alpha_ref:.3f} does not pass the critical velocity of {critical:.3f} m/s; write more "
                f"than {critical / bed.alpha_ref:.3f}, or leave the key out"
            )
        return given_m_s, bed.alpha_ref
    if bed.alpha_ref * peak_m_s > critical:
        return peak_m_s, bed.alpha_ref
    attack = np.where(bed.covered, bed.alpha * bed.velocity_m_s, 0.0)
    worst = int(np.argmax(attack))
    if attack[worst] > critical:
        return float(bed.velocity_m_s[worst]), float(bed.alpha[worst])
    return peak_m_s, bed.alpha_ref


def _hours(
    bed: BedHistory, cycles: CycleSet, law: PowerLaw, reference_excess_m_s: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Effective hours of each cycle: integral, flow-mean, cycle-mean."""
    time_s, velocity, attack, depth = _refined(bed, cycles)
    relative = np.zeros_like(velocity)
    moving = attack > bed.critical_velocity_m_s
    relative[moving] = ((attack[moving] - bed.critical_velocity_m_s) / reference_excess_m_s) ** law.velocity_exponent
    # A depth under zero is possible only where no cycle counts.
    relative[moving] *= (np.maximum(depth[moving], 0.0) / bed.reference_depth_m) ** law.depth_exponent
    strict = np.zeros_like(velocity)
    strict[moving] = relative[moving] ** (1.0 / law.time_exponent)
    step_h = np.diff(time_s) / SECONDS_PER_HOUR
    cycle = _cycle_of_steps(time_s, cycles)
    count = cycles.start_s.size
    # The sign does not change within a step: its sum tells it, whatever rounding leaves of a zero at one end.
    flowing = velocity[:-1] + velocity[1:] > 0.0
    total = _sums(cycle, step_h * 0.5 * (relative[:-1] + relative[1:]), count)
    integral = _sums(cycle, step_h * 0.5 * (strict[:-1] + strict[1:]), count)
    flow_h = _sums(cycle, step_h * flowing, count)
    whole_h = (cycles.end_s - cycles.start_s) / SECONDS_PER_HOUR
    return integral, _mean_hours(total, flow_h, law), _mean_hours(total, whole_h, law)


def _mean_hours(total_h: FloatArray, counted_h: FloatArray, law: PowerLaw) -> FloatArray:
    mean = np.divide(total_h, counted_h, out=np.zeros_like(total_h), where=counted_h > 0.0)
    return np.asarray(mean ** (1.0 / law.time_exponent) * counted_h, dtype=np.float64)


def _refined(bed: BedHistory, cycles: CycleSet) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Time, signed u, alpha u and h0 at the solver's steps, at the zeros of u and at the ends of cycles."""
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

    velocity = np.insert(signed, where, value)
    return np.insert(bed.time_s, where, added), velocity, with_added(bed.alpha) * velocity, with_added(bed.depth_m)


def _cycle_of_steps(time_s: FloatArray, cycles: CycleSet) -> NDArray[np.intp]:
    """(n - 1,) int array: the cycle that each step lies in, or one more than the last where it lies in none."""
    middle = 0.5 * (time_s[:-1] + time_s[1:])
    cycle = np.searchsorted(cycles.start_s, middle, side="right") - 1
    outside = (cycle < 0) | (middle >= cycles.end_s[cycle])
    return np.where(outside, cycles.start_s.size, cycle)


def _sums(cycle: NDArray[np.intp], values: FloatArray, count: int) -> FloatArray:
    return np.asarray(np.bincount(cycle, weights=values, minlength=count + 1)[:count], dtype=np.float64)
