"""What a reader must know to use a table of results: signs, sides, units, time, and what the numbers are not."""

from __future__ import annotations

from typing import Final

from tidescour.handoff.not_in_it import not_in_it_objects
from tidescour.handoff.stone_tables import STONE_LABEL
from tidescour.handoff.units_in_names import BARE_NUMBERS, UNIT_ENDINGS
from tidescour.plan.models import Plan

SIDES_TEXT: Final = (
    "The flood (sea to basin) digs the hole on the basin side, the ebb (basin to sea) the one on the sea side."
)
"""Stands on every table of results that a person sees."""

CAUTIONS: Final = (
    "These are estimates for beds of sand without cohesion. Check them against soundings, and where much depends on "
    "them against models and the advice of a specialist.",
    "A depth is that of the deepest point of a vertical section along the flow. At dam heads and abutments holes grow "
    "deeper, often more than one and a half times, unless the plan allows for it.",
    "The required length rests on the slope after a slide that the plan gives. Whether loose sand can liquefy or "
    "breach is a question for soil investigation, not for this calculation.",
    "The formula for alpha is out of its evidence where the jump is swept out, where the protection is shorter than "
    "six times the sill over the bed, and where the sill is over 0.8 of the depth. The growth law is out of its "
    "evidence for grains under 0.1 mm and for cohesive layers.",
    "The basin is taken as level from end to end, and the tide at sea as unchanged by the works but for sea_factor "
    "and set_up_m.",
    "Storm surges, waves, ships and river floods count only as far as the records, the series or the plan hold them.",
    "Delay does not add up in proportion: a longer stay in a stage deepens the hole at the rate of that stage.",
    "Sound the holes after each stage and calibrate again; agree beforehand at which depth or slope the works stop.",
    "Stone sizes and filters are not designed here.",
    "Coefficients taken by default come from the literature and are not facts of the site.",
    "An effective duration means nothing without its reference: velocity, alpha, critical velocity and depth of the "
    "same row.",
)


def conventions(plan: Plan) -> dict[str, object]:
    """Return the conventions of the results of a plan, in words and ready for JSON."""
    return {
        "sides": SIDES_TEXT,
        "place": "A place is an opening and a side; each has its own bed, protection and hole.",
        "signs": "Discharge and velocity are magnitudes towards the side of the row; only in velocities.csv discharge "
        "and gap velocity have a sign, positive in the flood direction. Head is sea level minus basin level.",
        "datum": plan.site.datum,
        "levels": "Metres above the datum, positive upward. Scour depths are metres below the original bed, positive "
        "downward. Water depths are over the original bed at the end of the protection.",
        "lengths": "Metres from the toe of the sill to the end of the protection.",
        "time": "UTC. A stage is half-open: its start belongs to it, its end does not.",
        "scour_time": "Hours, in the growth law and in every duration.",
        "gravity_m_s2": 9.81,
        "tide_rule": plan.scour.tide,
        "effective_duration": "Hours at the constant reference velocity that give the same depth from a flat bed as "
        "the tide does, each row with its own reference. effective_duration_h is that of the tide rule which drives "
        "growth; the three rules are always given side by side.",
        "equivalent_start": "Hours on the curve of a stage at which that curve has the depth that the place starts the "
        "stage with; growth goes on from there.",
        "share": "Share of a stage in the sum of effective durations of its place, all brought to one reference by "
        "the growth law.",
        "growth_factor": "Multiplies every depth that the law gives at a place, as found from soundings there; 1 is "
        "the law as it stands.",
        "comparison": "All rules refer to the same reference of their row. An alpha that was found from soundings with "
        "one rule belongs to that rule: alpha_for_same_depth is what the others need for the depth of the integral.",
        "length": "The required length is failure_slope_cot times depth_margin_factor times the final depth behind "
        "that same length, no less than six times the highest sill over the bed. That of a single slide is for "
        "comparison: slides follow each other.",
        "stone": STONE_LABEL,
        "units": {"endings": dict(UNIT_ENDINGS), "bare_numbers": list(BARE_NUMBERS)},
        "cautions": list(CAUTIONS),
        "not_in_it": not_in_it_objects(),
    }
