"""The columns of the tables of soundings: factors, depths, forecasts, stops and the programme."""

from __future__ import annotations

from typing import Final

from tidescour.handoff.columns import OPENING, SIDE, STAGE, TIME_UTC, Column


def _number(name: str, meaning: str, *, may_be_empty: bool = False) -> Column:
    return Column(name=name, kind="number", meaning=meaning, may_be_empty=may_be_empty)


def _time(name: str, meaning: str) -> Column:
    return Column(name=name, kind="time", meaning=meaning, may_be_empty=True)


FACTOR_COLUMNS: Final = (
    OPENING,
    SIDE,
    _number(
        "growth_factor",
        "multiplies the depth of the growth law, as growth_factor of the plan does: median of what the soundings tell; "
        "without soundings that of the plan",
    ),
    _number("growth_factor_p05", "with a chance of 5 % it is smaller"),
    _number("growth_factor_p95", "with a chance of 5 % it is larger"),
    Column(name="soundings", kind="count", meaning="number of soundings of this place"),
    _number("growth_factor_in_plan", "that of the plan, against which the soundings are weighed"),
    _number("prior_p05", "with a chance of 5 % it was smaller, before any sounding"),
    _number("prior_p95", "with a chance of 5 % it was larger, before any sounding"),
)

SOUNDED_COLUMNS: Final = (
    TIME_UTC,
    OPENING,
    SIDE,
    _number("sounded_depth_m", "sounded depth, m below the original bed"),
    _number("standard_error_m", "its standard error, m"),
    _number("hindcast_m", "depth of the law from the start on, with the growth factor of the plan, m"),
    _number("hindcast_with_factor_m", "the same with the growth factor found, m"),
    _number(
        "standardised_error",
        "sounded less foretold depth over the standard deviation of that difference; foretold from the soundings "
        "before it",
    ),
    _number(
        "upper_slope_cot",
        "cotangent of the hole's upper slope towards the protection: 1 in this; empty where not sounded",
        may_be_empty=True,
    ),
)

FORECAST_COLUMNS: Final = (
    TIME_UTC,
    OPENING,
    SIDE,
    _number("depth_p05_m", "with a chance of 5 % the scour depth is smaller, m below the original bed"),
    _number("depth_p50_m", "median of the scour depth, m"),
    _number("depth_p95_m", "with a chance of 5 % the scour depth is larger, m"),
    _number("as_planned_m", "depth of the law from the start on, with the growth factor of the plan, m"),
    _number(
        "restart_m",
        "depth of the law from the last sounded depth on, with the growth factor found, m; empty without soundings",
        may_be_empty=True,
    ),
    _number(
        "restart_unscaled_m",
        "depth of the law from the last sounded depth on, with the growth factor of the plan, m; for comparison",
        may_be_empty=True,
    ),
    _number(
        "plain_ratio_m",
        "as planned, times last sounded over planned depth, m; for comparison",
        may_be_empty=True,
    ),
)

STOP_COLUMNS: Final = (
    OPENING,
    SIDE,
    Column(
        name="criterion",
        kind="text",
        meaning="length (given length too short by the slope rule), depth (stop_depth_m) or slope (stop_slope_cot)",
    ),
    _number("limit_depth_m", "depth at which it is reached, m below the original bed", may_be_empty=True),
    _number("limit_slope_cot", "cotangent of the slope at which it is reached: 1 in this", may_be_empty=True),
    Column(
        name="state",
        kind="text",
        meaning="reached, expected (by the median, within the programme), possible (by the 95 % end of the band "
        "alone), not expected; slopes are not forecast: reached, not reached when last sounded, or not sounded",
    ),
    _time("reached", "when it was found reached, UTC"),
    _time("expected_p50", "when the median of the forecast reaches it, UTC; empty where not within the programme"),
    _time("expected_p95", "when the 95 % end of the forecast reaches it, UTC: earlier with a chance of 5 %"),
    _time("slope_last_sounded", "when a slope was last sounded, UTC; empty of depths, and where none was"),
    _number("last_slope_cot", "cotangent of that slope: 1 in this", may_be_empty=True),
)

PROGRAMME_COLUMNS: Final = (
    STAGE,
    _time("planned_start", "start that was planned, UTC; empty where the plan does not tell"),
    _time("planned_end", "end that was planned, UTC"),
    _time("start", "start, UTC"),
    _time("end", "end, UTC"),
    _number("start_days_late", "start after the planned one, days; negative where earlier", may_be_empty=True),
    _number("end_days_late", "end after the planned one, days; negative where earlier", may_be_empty=True),
    Column(name="sea", kind="text", meaning="sea level of the stage: tide, measured or the name of a series"),
    Column(name="basin", kind="text", meaning="basin level: routed, measured, tide or the name of a series"),
)
