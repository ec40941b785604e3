"""Growth of one place from stage to stage."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np

from tidescour.bed.history import place_name
from tidescour.errors import DomainError, Finding
from tidescour.plan.models import Stage, TideRule
from tidescour.scour.laws import PowerLaw
from tidescour.scour.records import ChainStep, EffectiveDuration, GrowthCurve
from tidescour.units import SECONDS_PER_HOUR, FloatArray, seconds_since_epoch, utc_text

DEEP, TOO_DEEP = 1.5, 2.0
"""Depth of the hole over the water depth from which the growth law is doubtful, and beyond its evidence."""


def rule_hours(duration: EffectiveDuration, rule: TideRule) -> FloatArray:
    """(m,) array of effective hours of each cycle under one tide rule."""
    hours = {"integral": duration.integral_h, "flow-mean": duration.flow_mean_h, "cycle-mean": duration.cycle_mean_h}
    return hours[rule]


def chain_place(
    durations: Sequence[EffectiveDuration], law: PowerLaw, start_depth_m: float, rule: TideRule
) -> tuple[ChainStep, ...]:
    """Growth of one place through its stages by equivalent time.

    Parameters
    ----------
    durations : sequence of EffectiveDuration
        Rows of one place in the order of the stages.
    law : PowerLaw
        Growth law.
    start_depth_m : float
        Depth of the hole when the first stage starts [m], not negative.
    rule : {"integral", "flow-mean", "cycle-mean"}
        Tide rule that drives growth.

    Returns
    -------
    tuple of ChainStep
        One a row.

    Raises
    ------
    DomainError
        If the start depth is negative.

    References
    ----------
    h_n**(1 / gamma) = h_0**(1 / gamma) + sum of A_i**(1 / gamma) t_i: equivalent time without its huge numbers.
    """
    _check_start(start_depth_m)
    gains = [row.growth_rate * float(np.sum(rule_hours(row, rule))) for row in durations]
    all_gains = sum(gains)
    steps = []
    state, depth = start_depth_m ** (1.0 / law.time_exponent), start_depth_m
    for row, gain in zip(durations, gains, strict=True):
        start, grows = depth, gain > 0.0
        equivalent = state / row.growth_rate if grows else float("nan")
        state += gain
        depth = state**law.time_exponent if grows else depth
        steps.append(
            ChainStep(
                stage_depth_m=gain**law.time_exponent,
                equivalent_start_h=equivalent,
                start_depth_m=start,
                end_depth_m=depth,
                share=gain / all_gains if all_gains > 0.0 else float("nan"),
            )
        )
    return tuple(steps)


def growth_curve(
    durations: Sequence[EffectiveDuration], law: PowerLaw, start_depth_m: float, rule: TideRule
) -> GrowthCurve:
    """Depth of one place at the end of every cycle; arguments and errors as `chain_place`.

    Returns
    -------
    GrowthCurve
        Starts with the start of the first cycle and the start depth; so does each stage that does not touch the one
        before.
    """
    _check_start(start_depth_m)
    time_s: list[FloatArray] = []
    depth_m: list[FloatArray] = []
    stage: list[str] = []
    state, until = start_depth_m ** (1.0 / law.time_exponent), -np.inf
    for row in durations:
        cycles = row.cycles
        states = state + np.cumsum(row.growth_rate * rule_hours(row, rule))
        # Nothing grows before a stage that does not touch the one before: the curve stays level until it starts.
        apart = cycles.start_s.size > 0 and cycles.start_s[0] > until
        if apart:
            time_s.append(cycles.start_s[:1])
            depth_m.append(np.array([state**law.time_exponent]))
        time_s.append(cycles.end_s)
        depth_m.append(states**law.time_exponent)
        stage += [row.stage] * (apart + cycles.end_s.size)
        if states.size:
            state, until = float(states[-1]), float(cycles.end_s[-1])
    return GrowthCurve(
        time_s=np.concatenate([*time_s, np.empty(0)]),
        depth_m=np.concatenate([*depth_m, np.empty(0)]),
        stage=tuple(stage),
    )


def depth_findings(durations: Sequence[EffectiveDuration], steps: Sequence[ChainStep]) -> tuple[Finding, ...]:
    """Find whether the hole of one place outgrows the evidence of the growth laws.

    Parameters
    ----------
    durations, steps : sequences of one length
        Rows of one place and their growth.

    Returns
    -------
    tuple of Finding
        None or one: a warning over 1.5, an error over 2 times the water depth, of the row where it is worst.
    """
    growing = [
        (step.end_depth_m / row.reference_depth_m, row, step)
        for row, step in zip(durations, steps, strict=True)
        if row.reference_depth_m > 0.0
    ]
    worst, row, step = max(growing, key=lambda each: each[0], default=(0.0, None, None))
    if row is None or step is None or worst <= DEEP:
        return ()
    return (
        Finding(
            severity="error" if worst > TOO_DEEP else "warning",
            code="hole-deeper-than-evidence",
            where=place_name(row.opening, row.side),
            message=(
                f"the hole becomes {step.end_depth_m:.2f} m deep in stage {row.stage!r}, {worst:.2f} times the water "
                f"depth of {row.reference_depth_m:.2f} m there: growth laws were found with holes of up to 1 to "
                f"{DEEP:g} times"
            ),
        ),
    )


def gap_findings(stages: Sequence[Stage]) -> tuple[Finding, ...]:
    """Warn of time between one stage and the next, in which nothing grows."""
    findings = []
    for before, after in pairwise(stages):
        hours = (after.start - before.end).total_seconds() / SECONDS_PER_HOUR
        if hours > 0.0:
            findings.append(
                Finding(
                    severity="warning",
                    code="gap-between-stages",
                    where=f"stage {after.name!r}",
                    message=(
                        f"{hours:.1f} h lie between the end of stage {before.name!r} at "
                        f"{utc_text(seconds_since_epoch(before.end))} and this one's start: nothing grows in them"
                    ),
                )
            )
    return tuple(findings)


def _check_start(start_depth_m: float) -> None:
    if not start_depth_m >= 0.0:
        raise DomainError(f"start_depth_m = {start_depth_m:g} must not be negative")
