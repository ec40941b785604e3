"""The tables of stone and filter: screening only, and so labelled in every row."""

from __future__ import annotations

from typing import Final

from tidescour.bed.filters import FILTER_RULES
from tidescour.bed.stone import OWN_SHIELDS, SCREENING_ONLY, shields_parameter
from tidescour.bed.stone_records import FilterScreening, StoneScreening
from tidescour.handoff.columns_stone import FILTER_COLUMNS, STONE_COLUMNS
from tidescour.handoff.tables import ResultTable, table_from_rows

STONE_LABEL: Final = (
    f"Stone sizes and filter ratios are {SCREENING_ONLY}. The load cases are the crest of the sill, in free flow too, "
    "its downstream slope and the edge at the end of the protection: stone on the crest is loaded by the velocity on "
    "the crest, not by that at the end of the protection. The forms stand side by side and none is chosen; Izbash "
    "gives the size of the stone, Shields and Pilarczyk D_n50 = 0.84 d50. Sizes are those of the moment of the highest "
    "velocity. Waves, single events at dam heads and dumping tolerances are not counted; the sand-tightness of "
    "geotextile or mattress and the ballast of edges are separate checks."
)


def stone_table(screening: StoneScreening) -> ResultTable:
    """Return one row a stage, opening, direction and location, with the sizes of all forms and their numbers."""
    rows = (
        (
            size.load.stage,
            size.load.opening,
            size.load.direction,
            size.load.location,
            size.load.time_s,
            size.load.velocity_m_s,
            size.load.head_m,
            size.load.unit_discharge_m2_s,
            size.load.depth_m,
            size.load.turbulence_factor,
            size.demand.relative_density,
            *(shields_parameter(form, size.demand) for form in OWN_SHIELDS),
            size.demand.stability_factor,
            size.demand.slope_factor,
            *size.size_m,
            size.load.assumption,
            SCREENING_ONLY,
        )
        for size in screening.sizes
    )
    return table_from_rows("stone", STONE_COLUMNS, rows)


def filter_table(screening: FilterScreening) -> ResultTable:
    """Return one row a layer and rule; headings alone where the plan has no filter."""
    rows = (
        (
            check.layer,
            check.under,
            check.rule,
            FILTER_RULES[check.rule].says,
            check.ratio,
            check.limit,
            check.other_limit,
            check.holds,
            SCREENING_ONLY,
        )
        for check in screening.checks
    )
    return table_from_rows("filter", FILTER_COLUMNS, rows)
