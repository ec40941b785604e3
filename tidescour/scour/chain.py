"""Growth of one place from stage to stage."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from tidescour.bed.history import place_name
from tidescour.errors import DomainError, Finding
from tidescour.plan.models import Stage
from tidescour.scour.curves import depth_at, state_at
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import ChainStep, EffectiveDuration, GrowthCurve, LayerReached, RowDurations, Rule
from tidescour.units import SECONDS_PER_HOUR, FloatArray, seconds_since_epoch, utc_text

DEEP, TOO_DEEP = 1.5, 2.0
"""Depth of the hole over the water depth from which the growth law is doubtful, and beyond its evidence."""


def chain_place(
    rows: Sequence[RowDurations], law: GrowthLaw, start_depth_m: float, rule: Rule, growth_factor: float = 1.0
) -> tuple[ChainStep, ...]:
    """Growth of one place through its stages by equivalent time.

    Parameters
    ----------
    rows : sequence of RowDurations
        Rows of one place in the order of the stages.
    law : GrowthLaw
        Growth law.
    start_depth_m : float
        Depth of the hole when the first stage starts [m], not negative.
    rule : str
        Tide rule, or velocity held, that drives growth.
    growth_factor : float
        Multiplies the law's depth, positive.

    Returns
    -------
    tuple of ChainStep
        One a row.

    Raises
    ------
    DomainError
        If the start depth is negative or the factor not positive.

    References
    ----------
    On each stage's own curve the time is sought at which it has the depth that is there, and growth goes on from it.
    For a power law this is h_n**(1 / gamma) = h_0**(1 / gamma) + sum of A_i**(1 / gamma) t_i. A layer of the bed has
    its own curve; the part of a cycle in which its top is reached is in proportion to the effective hours.
    """
    _check(start_depth_m, growth_factor)
    steps: list[ChainStep] = []
    depth = start_depth_m
    for row in rows:
        grown = _grow(row, law, rule, depth, growth_factor)
        first, *later = grown.spells
        of_start = row.layers[first.layer]
        hours = of_start.total_h(rule)
        flat_m = growth_factor * float(depth_at(law, of_start.growth_rate * hours, of_start.scale_m))
        steps.append(
            ChainStep(
                stage_depth_m=flat_m if hours != 0.0 else 0.0,
                equivalent_start_h=first.equivalent_start_h,
                start_depth_m=depth,
                end_depth_m=grown.end_depth_m,
                share=sum(row.layers[each.layer].power_rate * each.effective_duration_h for each in grown.spells),
                layer=first.layer,
                spent_h=first.effective_duration_h,
                reached=tuple(later),
            )
        )
        depth = grown.end_depth_m
    total = sum(step.share for step in steps)
    return tuple(replace(step, share=step.share / total if total > 0.0 else float("nan")) for step in steps)


def final_depth(steps: Sequence[ChainStep], start_depth_m: float) -> float:
    """Return the depth after the last stage [m]; that at the start where there is no stage."""
    return steps[-1].end_depth_m if steps else start_depth_m


def growth_curve(
    rows: Sequence[RowDurations], law: GrowthLaw, start_depth_m: float, rule: Rule, growth_factor: float = 1.0
) -> GrowthCurve:
    """Depth of one place at the end of every cycle; arguments and errors as `chain_place`.

    Returns
    -------
    GrowthCurve
        Starts with the start of the first cycle and the start depth; so does each stage that does not touch the one
        before.
    """
    _check(start_depth_m, growth_factor)
    time_s: list[FloatArray] = []
    depth_m: list[FloatArray] = []
    stage: list[str] = []
    depth, until = start_depth_m, -np.inf
    for row in rows:
        cycles = row.cycles
        grown = _grow(row, law, rule, depth, growth_factor)
        # Nothing grows before a stage that does not touch the one before: the curve stays level until it starts.
        apart = cycles.start_s.size > 0 and cycles.start_s[0] > until
        if apart:
            time_s.append(cycles.start_s[:1])
            depth_m.append(np.array([depth]))
        time_s.append(cycles.end_s)
        depth_m.append(grown.depth_m)
        stage += [row.layers[0].stage] * (apart + cycles.end_s.size)
        if grown.depth_m.size:
            depth, until = grown.end_depth_m, float(cycles.end_s[-1])
    return GrowthCurve(
        time_s=np.concatenate([*time_s, np.empty(0)]),
        depth_m=np.concatenate([*depth_m, np.empty(0)]),
        stage=tuple(stage),
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Grown:
    """Growth through one row: depth at the end of each cycle, and the spell in each layer, the first where it began."""

    depth_m: FloatArray
    start_depth_m: float
    spells: tuple[LayerReached, ...]

    @property
    def end_depth_m(self) -> float:
        return float(self.depth_m[-1]) if self.depth_m.size else self.start_depth_m


def _grow(
    row: RowDurations,
    law: GrowthLaw,
    rule: Rule,
    start_depth_m: float,
    growth_factor: float,
) -> _Grown:
    """Grow a hole through a row, layer by layer.

    The factor multiplies every depth of the law: the law's own curves are followed at depth over factor.
    """
    cycles = row.cycles
    tops = [*row.top_depth_m, np.inf]
    depths = np.empty(cycles.start_s.size)
    shares = np.ones_like(depths)
    depth, layer, cycle = start_depth_m, row.at_depth(start_depth_m), 0
    time_s = float(cycles.start_s[0]) if depths.size else float("nan")
    spells: list[LayerReached] = []
    while True:
        of_layer = row.layers[layer]
        hours = of_layer.hours(rule)[cycle:] * shares[cycle:]
        along, start_h = _along(of_layer, law, depth, hours, growth_factor)
        beyond = np.flatnonzero(along >= tops[layer + 1])
        within = int(beyond[0]) if beyond.size else hours.size
        depths[cycle : cycle + within] = along[:within]
        spent_h = float(np.sum(hours[:within]))
        cycle += within
        if beyond.size:
            state = float(state_at(law, tops[layer + 1] / growth_factor, of_layer.scale_m))
            last_h = state / of_layer.growth_rate - start_h - spent_h
            left = min(max(1.0 - last_h / hours[within], 0.0), 1.0)
            shares[cycle] *= left
            spent_h += (1.0 - left) * float(hours[within])
        spells.append(
            LayerReached(
                layer=layer,
                depth_m=depth,
                time_s=time_s,
                equivalent_start_h=start_h,
                effective_duration_h=spent_h,
            )
        )
        if not beyond.size:
            return _Grown(depth_m=depths, start_depth_m=start_depth_m, spells=tuple(spells))
        end_s = float(cycles.end_s[cycle])
        time_s = end_s - float(shares[cycle]) * (end_s - float(cycles.start_s[cycle]))
        layer, depth = layer + 1, tops[layer + 1]


def _along(
    of_layer: EffectiveDuration, law: GrowthLaw, depth_m: float, hours: FloatArray, growth_factor: float
) -> tuple[FloatArray, float]:
    """Depth after each of the hours on one curve, and the time on it at the start, NaN where nothing grows."""
    rate, scale = of_layer.growth_rate, of_layer.scale_m
    state = float(state_at(law, depth_m / growth_factor, scale)) if rate > 0.0 else np.inf
    if np.any(np.isnan(hours)):
        return np.full(hours.shape, np.nan), float("nan")
    if not (np.sum(hours) > 0.0 and np.isfinite(state)):
        return np.full(hours.shape, depth_m), float("nan")
    grown = growth_factor * depth_at(law, state + rate * np.cumsum(hours), scale)
    return np.maximum(grown, depth_m), state / rate


def depth_findings(rows: Sequence[RowDurations], steps: Sequence[ChainStep]) -> tuple[Finding, ...]:
    """Find whether the hole of one place outgrows the evidence of the growth laws.

    Parameters
    ----------
    rows, steps : sequences of one length
        Rows of one place and their growth.

    Returns
    -------
    tuple of Finding
        None or one: a warning over 1.5, an error over 2 times the water depth, of the row where it is worst.
    """
    growing = [
        (step.end_depth_m / row.layers[0].reference_depth_m, row.layers[0], step)
        for row, step in zip(rows, steps, strict=True)
        if row.layers[0].reference_depth_m > 0.0
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


def _check(start_depth_m: float, growth_factor: float) -> None:
    if not start_depth_m >= 0.0:
        raise DomainError(f"start_depth_m = {start_depth_m:g} must not be negative")
    if not growth_factor > 0.0:
        raise DomainError(f"growth_factor = {growth_factor:g} must be positive")
