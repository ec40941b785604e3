"""How many hours of its worst velocity a stage is worth."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np

from tidescour.bed.alpha import implied_turbulence
from tidescour.bed.history import row_name
from tidescour.bed.records import BedHistory
from tidescour.errors import DomainError, Finding
from tidescour.plan.kinds import TIDE_RULES
from tidescour.scour.curves import curve_of, depth_at, equilibrium_ratio, growth_rate, state_at
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import RULES, CycleSet, EffectiveDuration, Rule
from tidescour.scour.samples import Samples, growth_by_cycle, row_samples
from tidescour.scour.shapes import SATURATING
from tidescour.units import SECONDS_PER_HOUR, FloatArray

WEAK_REFERENCE: Final = 2.0
"""Effective over true hours from which an own reference is called weak (common practice, no source)."""


class _Reference(NamedTuple):
    """What hours refer to: velocity, alpha and r0 at the end of the protection."""

    velocity_m_s: float
    alpha: float
    turbulence: float


class _Curve(NamedTuple):
    """The law's curve at a reference: excess, rates of its power part and of itself, scale."""

    excess_m_s: float
    power_rate: float
    rate: float
    scale_m: float


def effective_duration(
    bed: BedHistory,
    cycles: CycleSet,
    law: GrowthLaw,
    reference_velocity_m_s: float | None,
    rules: tuple[Rule, ...] = RULES,
) -> EffectiveDuration:
    """Effective duration of one row under the three tide rules, cycle by cycle, and with one velocity held.

    With E = max(alpha u - u_c, 0), a power law h = c E**q h0**r t**gamma and a reference E_ref, h0_ref:

    - integral: Int (E / E_ref)**(q / gamma) (h0 / h0_ref)**(r / gamma) dt, the tide chained in small steps;
    - flow-mean: [mean / (E_ref**q h0_ref**r)]**(1 / gamma) times the counted time, with the mean of E**q h0**r over
      the time with u > 0, that time counted;
    - cycle-mean: the same with the whole cycle.

    For any other law the hole is chained from a flat bed, step by step (integral) or cycle by cycle with the means of
    the law's rate and scale, and the hours are those that the reference's own curve takes to the same depths.

    Parameters
    ----------
    bed : BedHistory
        What the bed feels, at the solver's steps; linear between, zero of u included.
    cycles : CycleSet
        What to integrate over; steps outside the cycles count for nothing.
    law : GrowthLaw
        Growth law.
    reference_velocity_m_s : float or None
        Velocity that the hours refer to [m/s]; None for the row's own peak. Depths from a flat bed do not depend on it,
        nor do any of a power law.
    rules : tuple of str
        Which rules' hours are computed, at least one; those of the others are NaN.

    Returns
    -------
    EffectiveDuration
        Hours, not negative; 0 throughout where nothing moves.

    Raises
    ------
    DomainError
        If a given reference velocity, with alpha, does not pass the critical velocity, or its curve does not reach
        the depth that the row has from a flat bed.

    References
    ----------
    d(h**(1 / gamma)) / dt = (c E**q h0**r)**(1 / gamma) for growth by equivalent time; trapezoid rule between steps,
    zeros of u and ends of cycles.
    """
    samples = row_samples(bed, cycles)
    peak = float(np.max(bed.velocity_m_s[bed.covered], initial=0.0))
    reference = _reference(bed, peak, reference_velocity_m_s)
    curve = _curve_at(bed, law, reference)
    count = cycles.start_s.size
    hours: dict[Rule, FloatArray] = {rule: np.full(count, 0.0 if rule in rules else np.nan) for rule in RULES}
    if curve.excess_m_s > 0.0:
        grown = row_growth(bed, law, samples, peak, rules)
        reference, curve = _deep_enough(bed, law, grown, reference, curve, given=reference_velocity_m_s is not None)
        hours |= {rule: _hours(law, values, curve) for rule, values in grown.items()}
    critical, depth = bed.critical_velocity_m_s, bed.reference_depth_m
    half_alpha, turbulence = (
        max(float(equilibrium_ratio(form, *_attack(reference), critical)), 0.0) * depth
        for form in ("half-alpha", "turbulence")
    )
    return EffectiveDuration(
        stage=bed.stage,
        opening=bed.opening,
        side=bed.side,
        reference_velocity_m_s=reference.velocity_m_s,
        alpha=reference.alpha,
        critical_velocity_m_s=critical,
        reference_depth_m=depth,
        turbulence=reference.turbulence,
        reference_excess_m_s=curve.excess_m_s,
        growth_rate=curve.rate,
        power_rate=curve.power_rate,
        scale_m=curve.scale_m,
        equilibrium_half_alpha_m=half_alpha,
        equilibrium_turbulence_m=turbulence,
        cycles=cycles,
        integral_h=hours["integral"],
        flow_mean_h=hours["flow-mean"],
        cycle_mean_h=hours["cycle-mean"],
        peak_held_h=hours["peak-held"],
        mean_held_h=hours["mean-held"],
        flow_h=samples.flow_h,
        peak_velocity_m_s=peak,
        mean_velocity_m_s=samples.mean_velocity_m_s,
        findings=() if reference_velocity_m_s is not None else _hours_findings(bed, cycles, hours["integral"]),
    )


def _hours_findings(bed: BedHistory, cycles: CycleSet, integral_h: FloatArray) -> tuple[Finding, ...]:
    """Tell where the own reference is so weak that the hours mean little; the depth does not depend on them."""
    covered_h = float(np.sum(cycles.end_s - cycles.start_s)) / SECONDS_PER_HOUR
    effective_h = float(np.sum(integral_h))
    if not effective_h > WEAK_REFERENCE * covered_h:
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


def _reference(bed: BedHistory, peak_m_s: float, given_m_s: float | None) -> _Reference:
    """Choose what hours refer to: given, the row's peak, or the moment of the largest excess where alpha varies."""
    critical = bed.critical_velocity_m_s
    if peak_m_s == 0.0:
        return _Reference(float("nan"), float("nan"), float("nan"))
    if given_m_s is not None:
        if not bed.alpha_ref * given_m_s > critical:
            raise DomainError(
                f"{row_name(bed.stage, bed.opening, bed.side)}: scour.reference_velocity_m_s = {given_m_s:g} times "
                f"alpha = {bed.alpha_ref:.3f} does not pass the critical velocity of {critical:.3f} m/s; write more "
                f"than {critical / bed.alpha_ref:.3f}, or leave the key out"
            )
        return _Reference(given_m_s, bed.alpha_ref, bed.turbulence_ref)
    own = _Reference(peak_m_s, bed.alpha_ref, bed.turbulence_ref)
    if bed.alpha_ref * peak_m_s > critical:
        return own
    worst = _at_largest(bed, np.where(bed.covered, bed.alpha * bed.velocity_m_s, 0.0))
    return worst if worst.alpha * worst.velocity_m_s > critical else own


def _at_largest(bed: BedHistory, values: FloatArray) -> _Reference:
    at = int(np.argmax(values))
    return _Reference(float(bed.velocity_m_s[at]), float(bed.alpha[at]), float(bed.turbulence[at]))


def _attack(reference: _Reference) -> tuple[float, float, float]:
    """Return alpha u, u and r0 of a reference, for its equilibrium depth."""
    return reference.alpha * reference.velocity_m_s, reference.velocity_m_s, reference.turbulence


def _curve_at(bed: BedHistory, law: GrowthLaw, reference: _Reference) -> _Curve:
    """Return the law's curve at a reference and the row's mean depth; without an excess, one on which nothing grows."""
    critical, depth = bed.critical_velocity_m_s, bed.reference_depth_m
    excess = reference.alpha * reference.velocity_m_s - critical
    if not excess > 0.0:
        return _Curve(0.0, 0.0, 0.0, float("inf") if law.is_power else depth)
    power_rate = float(growth_rate(law, excess, depth))
    rate, scale = curve_of(law, power_rate, depth, equilibrium_ratio(law.equilibrium, *_attack(reference), critical))
    return _Curve(excess, power_rate, float(rate), float(scale))


def row_growth(
    bed: BedHistory,
    law: GrowthLaw,
    samples: Samples,
    peak_m_s: float,
    rules: tuple[Rule, ...] = RULES,
    alpha_factor: float = 1.0,
) -> dict[Rule, FloatArray]:
    """Growth of one row from a flat bed, cycle by cycle, under each of the rules.

    Parameters
    ----------
    bed, law
        As in `effective_duration`.
    samples : Samples
        From `row_samples`.
    peak_m_s : float
        Velocity of the rule that holds the peak [m/s]; velocities that are held go with the row's mean depth and the
        alpha of its mean crest.
    rules : tuple of str
        Which rules.
    alpha_factor : float
        Multiplies alpha; the relative turbulence is then that which goes with the larger one.

    Returns
    -------
    dict of (m,) arrays
        By rule: for a power law the state [m**(1 / gamma)] that each cycle adds, else the depth after it [m].
    """
    grown: dict[Rule, FloatArray] = {}
    for rule in rules:
        if rule == "peak-held" or rule == "mean-held":
            alpha = alpha_factor * bed.alpha_ref
            velocity = peak_m_s if rule == "peak-held" else samples.mean_velocity_m_s
            turbulence = bed.turbulence_ref
            if alpha_factor != 1.0:
                turbulence = float(implied_turbulence(np.array([alpha]), bed.chezy_m05_s)[0])
            curve = _curve_at(bed, law, _Reference(velocity, alpha, turbulence))
            gained = curve.rate * samples.flow_h
            grown[rule] = gained if law.is_power else depth_at(law, np.cumsum(gained), curve.scale_m)
        else:
            grown[rule] = growth_by_cycle(samples, law, rule, alpha_factor)
    return grown


def _deep_enough(
    bed: BedHistory,
    law: GrowthLaw,
    grown: dict[Rule, FloatArray],
    reference: _Reference,
    curve: _Curve,
    *,
    given: bool,
) -> tuple[_Reference, _Curve]:
    """Return a reference whose curve reaches the depth that the tide gives from a flat bed."""
    deepest = max((float(grown[rule][-1]) for rule in TIDE_RULES if rule in grown and grown[rule].size), default=0.0)
    if law.shape != SATURATING:
        return reference, curve
    if deepest <= curve.scale_m:
        return reference, curve
    if given:
        raise DomainError(
            f"{row_name(bed.stage, bed.opening, bed.side)}: scour.reference_velocity_m_s = "
            f"{reference.velocity_m_s:g} has an equilibrium depth of {curve.scale_m:.2f} m, but the tide digs "
            f"{deepest:.2f} m from a flat bed: write a higher one, or leave the key out"
        )
    ratio = equilibrium_ratio(
        law.equilibrium,
        bed.alpha * bed.velocity_m_s,
        bed.velocity_m_s,
        bed.turbulence,
        bed.critical_velocity_m_s,
    )
    best = _at_largest(bed, np.where(bed.covered & np.isfinite(ratio), ratio, -np.inf))
    return best, _curve_at(bed, law, best)


def _hours(law: GrowthLaw, grown: FloatArray, curve: _Curve) -> FloatArray:
    """Hours on the reference's curve that each cycle's growth takes; NaN from where the curve does not reach."""
    if law.is_power:
        return grown / curve.rate
    if curve.rate == 0.0:
        return np.where(grown == 0.0, 0.0, np.nan)
    # A hole that is full to the last digit has taken the hours to the digit before it, not infinitely many.
    full = law.shape == SATURATING and np.equal(grown, curve.scale_m)
    states = np.concatenate([[0.0], state_at(law, np.where(full, np.nextafter(grown, 0.0), grown), curve.scale_m)])
    return np.diff(np.where(np.isfinite(states), states, np.nan)) / curve.rate
