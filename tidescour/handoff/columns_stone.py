"""The columns of the tables of stone and filter, which are for screening only."""

from __future__ import annotations

from typing import Final

from tidescour.bed.stone import OWN_SHIELDS, SCREENING_ONLY, STABILITY
from tidescour.handoff.columns import OPENING, STAGE, TIME_UTC, Column

STATUS: Final = Column(name="status", kind="text", meaning=f"what the row is for: {SCREENING_ONLY}")


def size_column(form: str) -> str:
    """Return the heading under which the size of a stability form stands."""
    return f"stone_{form.replace('-', '_')}_m"


def shields_column(form: str) -> str:
    """Return the heading under which the Shields parameter of a stability form stands."""
    return f"shields_parameter_{form.replace('-', '_')}"


STONE_COLUMNS: Final = (
    STAGE,
    OPENING,
    Column(name="direction", kind="text", meaning="flood (sea to basin) or ebb"),
    Column(
        name="location",
        kind="text",
        meaning="crest, downstream slope or end of protection; the last two on the side that receives the flow",
    ),
    TIME_UTC,
    Column(
        name="velocity_m_s",
        kind="number",
        meaning="highest velocity at that location in the stage, m/s: of the contracted jet on the crest, of the whole "
        "head on the slope, depth-mean at the end of the protection",
    ),
    Column(name="head_m", kind="number", meaning="upstream less downstream level at that moment, m"),
    Column(
        name="unit_discharge_m2_s",
        kind="number",
        meaning="discharge per metre of width at that moment, m2/s: of the mean width of the control section, or at "
        "the end of the protection",
    ),
    Column(
        name="depth_m",
        kind="number",
        meaning="water over the stone at that moment, m: in the control section, of the jet on the slope, over the bed",
    ),
    Column(
        name="turbulence_factor",
        kind="number",
        may_be_empty=True,
        meaning="K_T by which turbulence raises the velocity in the forms of Shields and Pilarczyk (k_t^2 is its "
        "square), from memory",
    ),
    Column(
        name="stone_relative_density",
        kind="number",
        meaning="Delta: density of the stone over that of the water, less 1, in all forms",
    ),
    *(
        Column(
            name=shields_column(form),
            kind="number",
            meaning=f"psi of the {form.capitalize()} form: that of the plan, or {own:g} (from memory)",
        )
        for form, own in OWN_SHIELDS.items()
    ),
    Column(name="stability_factor", kind="number", meaning="phi of the Pilarczyk form"),
    Column(name="slope_factor", kind="number", meaning="k_sl of the Pilarczyk form"),
    *(
        Column(
            name=size_column(form), kind="number", may_be_empty=True, meaning=f"{entry.title}, m; empty without answer"
        )
        for form, entry in STABILITY.items()
    ),
    Column(name="assumption", kind="text", meaning="where velocity, depth and turbulence factor come from"),
    STATUS,
)

FILTER_COLUMNS: Final = (
    Column(name="layer", kind="text", meaning="layer of the filter, from the bed upward"),
    Column(name="on", kind="text", meaning="layer under it; empty where the rule looks at the layer alone"),
    Column(name="rule", kind="text", meaning="name of the rule, as the list of formulas has it"),
    Column(name="says", kind="text", meaning="the rule, F for the layer and B for the one under it"),
    Column(name="ratio", kind="number", may_be_empty=True, meaning="ratio of grain sizes, a bare number"),
    Column(name="limit", kind="number", meaning="strict limit of the ratio, a bare number"),
    Column(name="other_limit", kind="number", meaning="the other limit in use; the same where there is but one"),
    Column(name="holds", kind="text", meaning="yes, no, between the limits in use, or not known"),
    STATUS,
)
