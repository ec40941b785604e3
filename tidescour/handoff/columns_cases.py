"""The columns of the tables of delays and of load cases."""

from __future__ import annotations

from typing import Final

from tidescour.handoff.columns import OPENING, SIDE, STAGE, Column


def _change(what: str, how: str, meaning: str) -> Column:
    return Column(
        name=f"{what}_change_{how}_m",
        kind="number",
        may_be_empty=True,
        meaning=f"{meaning}, m; empty where there is no result",
    )


_OWN_STAY: Final = "by the longer stay in this stage alone, all others growing as planned"
_CALENDAR: Final = "with every later stage moved to the tides of its new dates"
_DEPTH: Final = "more final depth behind the given length"
_LENGTH: Final = "more length required"

DELAY_COLUMNS: Final = (
    STAGE,
    Column(name="weeks_late", kind="count", meaning="weeks by which the stage ends later"),
    OPENING,
    SIDE,
    _change("depth", "own_stay", f"{_DEPTH} {_OWN_STAY}"),
    _change("depth", "calendar", f"{_DEPTH} {_CALENDAR}"),
    _change("length", "own_stay", f"{_LENGTH} {_OWN_STAY}"),
    _change("length", "calendar", f"{_LENGTH} {_CALENDAR}"),
    Column(name="final_depth_planned_m", kind="number", meaning="scour depth after the last stage as planned, m"),
    Column(name="length_required_planned_m", kind="number", meaning="length required as planned, m"),
)

LOAD_CASE_COLUMNS: Final = (
    Column(name="load_case", kind="text", meaning="storm beside the programme, and not part of it"),
    Column(name="stage", kind="text", meaning="stage at whose end the storm comes, with the gap as it is then"),
    OPENING,
    SIDE,
    Column(name="start", kind="time", meaning="start of the storm, UTC: the end of the stage"),
    Column(name="end", kind="time", meaning="end of the storm, UTC"),
    Column(name="highest_sea_level_m", kind="number", meaning="highest sea level of the storm, m above the site datum"),
    Column(name="peak_gap_velocity_m_s", kind="number", meaning="highest velocity in the gap towards this side, m/s"),
    Column(
        name="peak_end_velocity_m_s",
        kind="number",
        meaning="highest velocity at the end of the protection towards this side, m/s",
    ),
    Column(name="depth_before_m", kind="number", meaning="scour depth at the end of the stage, m, by the driving rule"),
    Column(name="depth_after_m", kind="number", meaning="scour depth after the storm, m"),
    Column(name="depth_allowed_m", kind="number", meaning="depth for which the given length is just enough, m"),
    Column(
        name="length_required_after_m",
        kind="number",
        meaning="length required for the depth after the storm, computed anew behind it, m",
    ),
    Column(
        name="final_depth_m",
        kind="number",
        meaning="scour depth at the end of the programme if it goes on as planned after the storm, m",
    ),
    Column(name="length_required_final_m", kind="number", meaning="length required for that final depth, m"),
)
