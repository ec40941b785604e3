"""What a reader of results must know about the plan: defaults that were taken, and choices that need a look."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Iterator
from difflib import SequenceMatcher
from itertools import pairwise

from tidescour.errors import Finding
from tidescour.plan.defaults import default_note, defaults_taken, gives
from tidescour.plan.kinds import SIDES, Side
from tidescour.plan.models import Plan, Stage
from tidescour.plan.models_bed import MOST_FINES_OF_SAND, Bed, BedLayer
from tidescour.plan.places import opening_names, protection_of, setting

_NEAR = 0.85
"""Ratio of `difflib` from which one name may be a slip of the pen for another; common practice, no source."""

_FAULTS_TOLD = 3


def default_notes(plan: Plan) -> tuple[Finding, ...]:
    """Return notes on defaults that were not written in the plan, and warnings on choices that do not agree.

    Parameters
    ----------
    plan : Plan
        As read: it knows which of its keys were written.

    Returns
    -------
    tuple of Finding
        Code ``default-used`` (note) for each default that enters a number of this plan, with the words "from memory"
        where it was taken so from the literature; ``fines-not-credited`` (warning) for a soil with fines whose
        threshold is that of clean sand, ``fines-credited`` (warning) for one whose given threshold is said to come from
        erosion tests; ``alpha-basis`` (warning) for a place whose given alpha was found with another tide rule than
        the one that drives the growth; ``sea-change`` (warning) where stages take both levels from fitted tides and
        the plan changes that of the sea alone; ``soundings-not-complete`` (note) where a comparison with soundings
        would refuse the plan for them; ``opening-renamed`` (warning) where an opening that first stands after
        the first stage has the name of another but for case, blanks, hyphens and underscores, or nearly that of one
        which just went.
    """
    return (
        *defaults_taken(plan),
        *_fines(plan),
        *_alpha_basis(plan),
        *_sea_change(plan),
        *_sounding_faults(plan),
        *_openings_renamed(plan),
    )


def _fines(plan: Plan) -> Iterator[Finding]:
    layers = ((f"bed.layer {layer.name!r}", layer) for layer in plan.bed.layer)
    soils: tuple[tuple[str, Bed | BedLayer], ...] = (("bed", plan.bed), *layers)
    for where, soil in soils:
        if soil.fines_percent is None or soil.fines_percent <= MOST_FINES_OF_SAND:
            continue
        given = soil.critical_velocity_m_s
        if given is None:
            code = "fines-not-credited"
            message = (
                f"{soil.fines_percent:g} % of fines: over {MOST_FINES_OF_SAND:g} % a soil may be cohesive. The "
                "threshold used is that of clean sand of this d50_mm: cohesion can make it 2 to 4 times higher, but "
                "that falls once the top layer fails (from memory), and is not credited without erosion tests"
            )
        else:
            code = "fines-credited"
            message = (
                f"the critical velocity {given:g} m/s of a soil with {soil.fines_percent:g} % of fines is taken on "
                f"this evidence: {str(soil.critical_velocity_evidence).rstrip('. ')}. It falls once the top layer "
                "fails (from memory)"
            )
        yield Finding(severity="warning", code=code, where=where, message=message)


def _alpha_basis(plan: Plan) -> Iterator[Finding]:
    for name in opening_names(plan):
        for side in SIDES:
            protection = protection_of(plan, side)
            given = gives(protection, name, "alpha", "alpha_lengths_m") or _alpha_in_a_stage(plan, name, side)
            if not given:
                continue
            written = setting(protection, protection.opening.get(name), "alpha_basis")
            basis = written or "integral"
            where = f"protection.{side}.alpha_basis"
            if written is None:
                message = (
                    f"alpha of {name}, {side} side, is taken as found with the {basis} rule: no alpha_basis was given"
                )
                yield default_note(where, message)
            if basis != plan.scour.tide:
                message = (
                    f"alpha of {name}, {side} side, was found with the {basis} rule, but scour.tide = "
                    f'"{plan.scour.tide}" drives the growth: the same alpha gives another depth there'
                )
                yield Finding(severity="warning", code="alpha-basis", where=where, message=message)


def _alpha_in_a_stage(plan: Plan, name: str, side: Side) -> bool:
    return any(
        opening.name == name and (opening.alpha_sea if side == "sea" else opening.alpha_basin) is not None
        for stage in plan.stage
        for opening in stage.opening
    )


def _sea_change(plan: Plan) -> Iterator[Finding]:
    stages = [stage.name for stage in plan.stage if stage.basin == "tide"]
    if stages and (plan.tide.sea_factor != 1.0 or plan.tide.set_up_m != 0.0):
        message = (
            f"sea_factor = {plan.tide.sea_factor:g} and set_up_m = {plan.tide.set_up_m:g} m change the sea alone; the "
            f"basin keeps its own fitted tide in {', '.join(stages)}, so that the head takes all of the change"
        )
        yield Finding(severity="warning", code="sea-change", where="tide", message=message)


def _sounding_faults(plan: Plan) -> Iterator[Finding]:
    if faults := plan.sounding_faults:
        told, more = "; ".join(fault.rstrip(".") for fault in faults[:_FAULTS_TOLD]), len(faults) - _FAULTS_TOLD
        message = (
            f"soundings are not complete, or lie outside the programme; nothing here is computed from them, but "
            f"`tidescour soundings` would refuse the plan. {told}{f'; and {more} more' if more > 0 else ''}"
        )
        yield Finding(severity="note", code="soundings-not-complete", where="sounding", message=message)


def _openings_renamed(plan: Plan) -> Iterator[Finding]:
    known = list(_names(plan.stage[0])) if plan.stage else []
    for before, stage in pairwise(plan.stage):
        gone = [name for name in _names(before) if name not in _names(stage)]
        for name in (name for name in _names(stage) if name not in known):
            meant = _same_but_for_spelling(name, known) or _nearest(name, gone)
            known.append(name)
            if meant is not None:
                message = (
                    f'"{name}" first stands here and starts new holes, from a flat bed unless start_depth_m is given; '
                    f'did you mean "{meant}"?'
                )
                where = f"stage {stage.name!r}, opening {name!r}"
                yield Finding(severity="warning", code="opening-renamed", where=where, message=message)


def _names(stage: Stage) -> tuple[str, ...]:
    return tuple(opening.name for opening in stage.opening)


def _same_but_for_spelling(name: str, others: Iterable[str]) -> str | None:
    return next((other for other in others if _spelling(other) == _spelling(name)), None)


def _nearest(name: str, others: Iterable[str]) -> str | None:
    """Return the nearest of the names that may be slips for this one; other digits number another opening."""
    ratios = {
        other: SequenceMatcher(None, _spelling(name), _spelling(other)).ratio()
        for other in others
        if _digits(other) == _digits(name)
    }
    nearest = max(ratios, key=ratios.__getitem__, default=None)
    return nearest if nearest is not None and ratios[nearest] >= _NEAR else None


def _spelling(name: str) -> str:
    """Return a name without case, blanks, hyphens, underscores and signs that do not show."""
    folded = unicodedata.normalize("NFKC", name).casefold()
    return "".join(sign for sign in folded if unicodedata.category(sign) not in ("Zs", "Pd", "Pc", "Cf"))


def _digits(name: str) -> str:
    return "".join(sign for sign in name if sign.isdigit())
