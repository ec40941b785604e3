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
        of_start = row.layers[grown.layer]
        hours = of_start.total_h(rule)
        steps.append(
            ChainStep(
                stage_depth_m=growth_factor * float(depth_at(law, of_start.growth_rate * hours, of_start.scale_m))
                if hours != 0.0
                else 0.0,
                equivalent_start_h=grown.equivalent_start_h,
                start_depth_m=depth,
                end_depth_m=grown.end_depth_m,
                share=of_start.power_rate * hours,
                layer=grown.layer,
                reached=grown.reached,
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


def advanced_depth(
    rows: Sequence[RowDurations],
    law: GrowthLaw,
    rule: Rule,
    depth_m: float,
    from_s: float,
    to_s: float,
    growth_factor: float = 1.0,
) -> float:
    """Depth of one place at a moment, from its depth at an earlier one.

    Parameters
    ----------
    rows, law, rule, growth_factor
        As in `chain_place`.
    depth_m : float
        Depth at `from_s` [m], not negative.
    from_s, to_s : float
        Moments, seconds since 1970; the growth of a cycle cut by one of them is in proportion to its time.

    Returns
    -------
    float
        Depth at `to_s` [m]; that at `from_s` where `to_s` is not later.

    Raises
    ------
    DomainError
        As `chain_place`.
    """
    _check(depth_m, growth_factor)
    for row in rows:
        cycles = row.cycles
        inside = np.minimum(cycles.end_s, to_s) - np.maximum(cycles.start_s, from_s)
        counted = np.clip(inside / (cycles.end_s - cycles.start_s), 0.0, 1.0)
        if np.any(counted > 0.0):
            depth_m = _grow(row, law, rule, depth_m, growth_factor, counted).end_depth_m
    return depth_m


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Grown:
    """Growth through one row: depth at the end of each cycle, and what `ChainStep` tells of it."""

    depth_m: FloatArray
    start_depth_m: float
    layer: int
    equivalent_start_h: float
    reached: tuple[LayerReached, ...]

    @property
    def end_depth_m(self) -> float:
        return float(self.depth_m[-1]) if self.depth_m.size else self.start_depth_m


def _grow(
    row: RowDurations,
    law: GrowthLaw,
    rule: Rule,
    start_depth_m: float,
    growth_factor: float,
    counted: FloatArray | float = 1.0,
) -> _Grown:
    """Grow a hole through a row, layer by layer; `counted` is the share of each cycle's hours that counts.

    The factor multiplies every depth of the law: the law's own curves are followed at depth over factor.
    """
    tops = [*row.top_depth_m, np.inf]
    depth = start_depth_m
    first_layer = layer = row.at_depth(start_depth_m)
    depths = np.empty(row.cycles.start_s.size)
    shares = np.broadcast_to(np.asarray(counted, dtype=np.float64), depths.shape).copy()
    equivalent = float("nan")
    reached: list[LayerReached] = []
    cycle = 0
    while True:
        of_layer = row.layers[layer]
        hours = of_layer.hours(rule)[cycle:] * shares[cycle:]
        along, start_h = _along(of_layer, law, depth, hours, growth_factor)
        if layer == first_layer:
            equivalent = start_h
        beyond = np.flatnonzero(along >= tops[layer + 1])
        if not beyond.size:
            depths[cycle:] = along
            break
        at = cycle + int(beyond[0])
        depths[cycle:at] = along[: beyond[0]]
        before_h = start_h + float(np.sum(hours[: beyond[0]]))
        state = float(state_at(law, tops[layer + 1] / growth_factor, of_layer.scale_m))
        needed_h = state / of_layer.growth_rate - before_h
        left = min(max(1.0 - needed_h / hours[beyond[0]], 0.0), 1.0)
        shares[at] *= left
        end_s, start_s = row.cycles.end_s[at], row.cycles.start_s[at]
        layer, cycle, depth = layer + 1, at, tops[layer + 1]
        reached.append(LayerReached(layer=layer, depth_m=depth, time_s=float(end_s - shares[at] * (end_s - start_s))))
    return _Grown(
        depth_m=depths,
        start_depth_m=start_depth_m,
        layer=first_layer,
        equivalent_start_h=equivalent,
        reached=tuple(reached),
    )


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
