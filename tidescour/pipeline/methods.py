"""Which methods one run uses: those of every step, and of each table what its plan chose."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Any

from tidescour.bed.filters import FILTER_RULES
from tidescour.bed.shields import SHIELDS
from tidescour.bed.spreading import SPREADINGS
from tidescour.bed.threshold import PROFILES
from tidescour.gap import methods as gap_methods
from tidescour.gap.relations import RELATIONS
from tidescour.gauge.checks import CHECKS
from tidescour.pipeline.choices import method_entries
from tidescour.plan.kinds import SIDES
from tidescour.plan.models import Opening, Plan
from tidescour.plan.places import places
from tidescour.scour.laws import LAWS
from tidescour.study import methods as study_methods
from tidescour.table import Entry


def run_methods(plan: Plan) -> tuple[Entry[Callable[..., Any]], ...]:
    """Return the methods that a run of a plan uses, in the order of the steps.

    Parameters
    ----------
    plan : Plan
        As read for a run.

    Returns
    -------
    tuple of Entry
        What the plan chose from each table, and the methods that are not chosen, but for those that it has no use for,
        such as the routing of a basin whose levels are given, or alpha where it gives every one.
    """
    tables = (RELATIONS, SHIELDS, PROFILES, SPREADINGS, LAWS)
    not_chosen = {name for table in tables for name in table} - set(_chosen(plan))
    of_other_commands = {entry.name for entry in (*gap_methods.CALIBRATION_METHODS, *study_methods.METHODS)}
    unused = not_chosen | of_other_commands | set(_without_use(plan))
    return tuple(entry for entry in method_entries() if entry.name not in unused)


def _chosen(plan: Plan) -> Iterator[str]:
    yield plan.scour.law
    if not _threshold_given(plan):
        yield from (plan.bed.shields, plan.bed.velocity_profile)
    yield from (place.spreading for place in places(plan))
    yield from (opening.relation for opening in _openings(plan) if opening.relation is not None)


def _without_use(plan: Plan) -> Iterator[str]:
    levels = {stage.basin for stage in plan.stage}
    if "routed" not in levels:
        yield from ("basin-routing", "basin-length")
    if plan.basin is None:
        yield from ("inertia-number", "spring-neap-sweep")
    if plan.basin is None or levels <= {"routed"}:
        yield "volume-check"
    if _threshold_given(plan):
        yield from ("critical-velocity", "water-viscosity")
    if _alpha_given(plan):
        yield "alpha"
    if not plan.bed.layer:
        yield "layers"
    if plan.bed.d90_mm is None or _threshold_given(plan):
        yield "closed-form-threshold"
    if plan.records.sea is None and plan.records.basin is None:
        yield from CHECKS
    if not plan.filter:
        yield from FILTER_RULES


def _openings(plan: Plan) -> Iterator[Opening]:
    for stage in plan.stage:
        yield from stage.opening
    if plan.basin is not None:
        yield from plan.basin.side_opening


def _threshold_given(plan: Plan) -> bool:
    layers = all(layer.critical_velocity_m_s is not None for layer in plan.bed.layer)
    return plan.bed.critical_velocity_m_s is not None and layers


def _alpha_given(plan: Plan) -> bool:
    """Tell whether no place needs the formula for alpha in any stage."""
    given = {(place.opening, place.side) for place in places(plan) if place.alpha is not None or place.alpha_lengths_m}
    return all(
        (opening.name, side) in given or (opening.alpha_sea if side == "sea" else opening.alpha_basin) is not None
        for opening in (each for stage in plan.stage for each in stage.opening)
        for side in SIDES
    )
