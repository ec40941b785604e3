"""Defaults that a plan takes because it does not write the key, each with what it means."""

from __future__ import annotations

from collections.abc import Iterator

from pydantic import BaseModel

from tidescour.errors import Finding
from tidescour.plan.kinds import SIDES, Side
from tidescour.plan.models import Plan
from tidescour.plan.models_bed import (
    DEFAULT_TIME_CONSTANT,
    DEFAULT_TIME_EXPONENT,
    LAWS_WITH_TIME_SCALE,
    SATURATING,
    Bed,
    BedLayer,
    Protection,
)
from tidescour.plan.places import opening_names, protection_of, setting

# Table, key, unit and why it matters; the value is the model's own default. A value out of the literature that was
# not looked up again says so.
_DEFAULTS = (
    (
        "water",
        "temperature_c",
        "degrees Celsius",
        "enters the critical velocity by the viscosity (formula from memory)",
    ),
    ("water", "salinity_g_kg", "g/kg", "enters the density of the water, and the critical velocity"),
    ("bed", "grain_density_kg_m3", "kg/m3", "is that of quartz and enters the growth law and the critical velocity"),
    ("bed", "shields", "", "is the form of the Shields curve behind the critical velocity (from memory)"),
    ("bed", "velocity_profile", "", "leads from the friction velocity to the depth-mean critical one (from memory)"),
    ("bed", "roughness_d50", "d50", "is the bed roughness behind the critical velocity; 2 to 3 in use (from memory)"),
    ("scour", "law", "", "is the growth law (Breusers 1966 and 1967, from memory)"),
    ("scour", "tide", "", "is the rule by which the tide drives the growth"),
    ("stone", "density_kg_m3", "kg/m3", "is that of common rock and enters the screening of stone sizes"),
    ("stone", "shields", "", "is the Shields parameter that stone may reach in that screening (from memory)"),
    ("stone", "stability_factor", "", "is phi of a continuous layer in the Pilarczyk form (from memory)"),
    ("stone", "edge_stability_factor", "", "is phi of edges and transitions in the Pilarczyk form (from memory)"),
    ("stone", "slope_factor", "", "is k_sl of a gentle slope in the Pilarczyk form (from memory)"),
)
_ONLY_FOR_COMPUTED_THRESHOLD = (
    ("water", "temperature_c"),
    ("bed", "shields"),
    ("bed", "velocity_profile"),
    ("bed", "roughness_d50"),
)
_DEFAULTS_OF_PREDICTED_SEA = (
    ("tide", "sea_factor", "", "leaves the sea tide as it was while the gap was open"),
    ("tide", "set_up_m", "m", "means no surge and no change of mean sea level"),
)
_DEFAULTS_OF_SOUNDINGS = (
    ("soundings", "prior_scatter", "", "is the scatter of ln(growth factor) before soundings (published, from memory)"),
    ("soundings", "growth_scatter", "", "is the scatter of growth from one to the next (common practice, no source)"),
)
_DEFAULTS_OF_TIME_SCALES = (
    ("scour", "time_constant", "", "is K of the time scale t1 (Breusers 1966 and 1967, from memory)"),
    ("scour", "time_exponent", "", "is the exponent of the time; 0.34 to 0.40 in use for plane flow (from memory)"),
)
_DEFAULTS_OF_SATURATING = (
    ("scour", "equilibrium", "", "is h0 (0.5 alpha u - u_c) / u_c; the other form gives another depth (from memory)"),
)
# Defaults of keys that the models leave empty, for a formula to fill.
_FILLED_BY_FORMULA = {
    "time_constant": f"{DEFAULT_TIME_CONSTANT:g} h m^2.3 s^-4.3",
    "time_exponent": f"{DEFAULT_TIME_EXPONENT:g}",
    "shields": "0.03 (Shields form) and 0.035 (Pilarczyk form)",
}
# Keys of a place, of which the first is named and any stands for all; the default and what it means.
_DEFAULTS_OF_PLACES = (
    (("spreading", "widening"), "none", "no lateral spreading between the gap and the end of the protection"),
    (("local_velocity_factor",), "1", "no velocity above the mean over the width, as there is at dam heads"),
    (("growth_factor",), "1", "the growth law as it is, not scaled by soundings"),
    (("depth_margin_factor",), "1", "no margin on the depth in the required length"),
)


def defaults_taken(plan: Plan) -> Iterator[Finding]:
    """Return a note for each default that enters a number of a plan and was not written there."""
    yield from _table_defaults(plan)
    for side in SIDES:
        yield from _place_defaults(plan, side)


def _table_defaults(plan: Plan) -> Iterator[Finding]:
    predicted = any(stage.sea == "tide" for stage in plan.stage)
    soils: tuple[Bed | BedLayer, ...] = (plan.bed, *plan.bed.layer)
    threshold_given = all(soil.critical_velocity_m_s is not None for soil in soils)
    not_needed = _ONLY_FOR_COMPUTED_THRESHOLD if threshold_given else ()
    defaults = (
        *_DEFAULTS,
        *(_DEFAULTS_OF_PREDICTED_SEA if predicted else ()),
        *(_DEFAULTS_OF_TIME_SCALES if plan.scour.law in LAWS_WITH_TIME_SCALE else ()),
        *(_DEFAULTS_OF_SATURATING if plan.scour.law == SATURATING else ()),
        *(_DEFAULTS_OF_SOUNDINGS if plan.sounding else ()),
    )
    for name, key, unit, meaning in defaults:
        table: BaseModel = getattr(plan, name)
        if key in table.model_fields_set or (name, key) in not_needed:
            continue
        value = getattr(table, key)
        value = _FILLED_BY_FORMULA[key] if value is None else value
        shown = value if isinstance(value, str) else f"{value:g} {unit}".rstrip()
        yield default_note(f"{name}.{key}", f"{key} was not given; the default {shown} {meaning}")


def _place_defaults(plan: Plan, side: Side) -> Iterator[Finding]:
    protection = protection_of(plan, side)
    names = opening_names(plan)
    for keys, default, meaning in _DEFAULTS_OF_PLACES:
        without = [name for name in names if not gives(protection, name, *keys)]
        if without:
            message = f"{keys[0]} was not given for {', '.join(without)}; the default {default} means {meaning}"
            yield default_note(f"protection.{side}.{keys[0]}", message)


def gives(protection: Protection, name: str, *keys: str) -> bool:
    """Return whether the protection of one side gives any of these keys to an opening."""
    own = protection.opening.get(name)
    return any(setting(protection, own, key) is not None for key in keys)


def default_note(where: str, message: str) -> Finding:
    """Return the note on one default."""
    return Finding(severity="note", code="default-used", where=where, message=message)
