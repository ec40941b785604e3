"""What a reader of results must know about the plan: defaults that were taken, and choices that do not agree."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Iterator
from difflib import SequenceMatcher
from itertools import pairwise

from pydantic import BaseModel

from tidescour.errors import Finding
from tidescour.plan.models import SIDES, Plan, Side, Stage
from tidescour.plan.places import opening_names, protection_of, setting

# Table, key, unit and why it matters; the value is the model's own default.
_DEFAULTS = (
    ("water", "temperature_c", "degrees Celsius", "enters the critical velocity through the viscosity"),
    ("water", "salinity_g_kg", "g/kg", "enters the density of the water, and the critical velocity"),
    ("bed", "grain_density_kg_m3", "kg/m3", "enters the growth law and the critical velocity"),
    ("bed", "shields", "", "is the form of the Shields curve behind the critical velocity"),
    ("bed", "roughness_d50", "d50", "is the bed roughness behind the critical velocity"),
    ("scour", "law", "", "is the growth law"),
    ("scour", "tide", "", "is the rule by which the tide drives the growth"),
)
_ONLY_FOR_COMPUTED_THRESHOLD = ("temperature_c", "shields", "roughness_d50")
_DEFAULTS_OF_PREDICTED_SEA = (
    ("tide", "sea_factor", "", "leaves the sea tide as it was while the gap was open"),
    ("tide", "set_up_m", "m", "means no surge and no change of mean sea level"),
)
_DEFAULTS_OF_PLACES = (
    ("widening", "0", "no lateral spreading between the gap and the end of the protection"),
    ("local_velocity_factor", "1", "no velocity above the mean over the width, as there is at dam heads"),
)
_NEAR = 0.85
"""Ratio of `difflib` from which one name may be a slip of the pen for another; common practice, no source."""


def default_notes(plan: Plan) -> tuple[Finding, ...]:
    """Return notes on defaults that were not written in the plan, and warnings on choices that do not agree.

    Parameters
    ----------
    plan : Plan
        As read: it knows which of its keys were written.

    Returns
    -------
    tuple of Finding
        Code ``default-used`` (note) for each default that enters a number of this plan; ``alpha-basis`` (warning) for
        a place whose given alpha was found with another tide rule than the one that drives the growth;
        ``sea-change`` (warning) where stages take both levels from fitted tides and the plan changes that of the sea
        alone; ``opening-renamed`` (warning) where an opening that first stands after the first stage has the name of
        another but for case, blanks, hyphens and underscores, or nearly that of one which just went.
    """
    return (
        *_table_defaults(plan),
        *(note for side in SIDES for note in _place_defaults(plan, side)),
        *_alpha_basis(plan),
        *_sea_change(plan),
        *_openings_renamed(plan),
    )


def _table_defaults(plan: Plan) -> Iterator[Finding]:
    predicted = any(stage.sea == "tide" for stage in plan.stage)
    threshold_given = plan.bed.critical_velocity_m_s is not None
    for name, key, unit, meaning in (*_DEFAULTS, *(_DEFAULTS_OF_PREDICTED_SEA if predicted else ())):
        table: BaseModel = getattr(plan, name)
        if key in table.model_fields_set or (threshold_given and key in _ONLY_FOR_COMPUTED_THRESHOLD):
            continue
        value = getattr(table, key)
        shown = value if isinstance(value, str) else f"{value:g} {unit}".rstrip()
        yield _default(f"{name}.{key}", f"{key} was not given; the default {shown} {meaning}")


def _place_defaults(plan: Plan, side: Side) -> Iterator[Finding]:
    protection = protection_of(plan, side)
    names = opening_names(plan)
    for key, default, meaning in _DEFAULTS_OF_PLACES:
        without = [name for name in names if setting(protection, protection.opening.get(name), key) is None]
        if without:
            message = f"{key} was not given for {', '.join(without)}; the default {default} means {meaning}"
            yield _default(f"protection.{side}.{key}", message)


def _alpha_basis(plan: Plan) -> Iterator[Finding]:
    for name in opening_names(plan):
        for side in SIDES:
            protection = protection_of(plan, side)
            own = protection.opening.get(name)
            if setting(protection, own, "alpha") is None and not _alpha_in_a_stage(plan, name, side):
                continue
            written = setting(protection, own, "alpha_basis")
            basis = written or "integral"
            where = f"protection.{side}.alpha_basis"
            if written is None:
                message = (
                    f"alpha of {name}, {side} side, is taken as found with the {basis} rule: no alpha_basis was given"
                )
                yield _default(where, message)
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


def _default(where: str, message: str) -> Finding:
    return Finding(severity="note", code="default-used", where=where, message=message)
