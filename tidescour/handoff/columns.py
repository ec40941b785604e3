"""The columns of every table of results: name, kind, meaning with unit, and whether a cell may be empty."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

Kind = Literal["text", "time", "count", "number"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column of a table of results.

    Parameters
    ----------
    name : str
        Heading, with the unit.
    kind : {"text", "time", "count", "number"}
        What its cells hold; times are seconds since 1970 and written as UTC text.
    meaning : str
        One line for a reader, with the unit in words.
    may_be_empty : bool
        Numbers only: NaN is allowed and written as an empty cell.
    """

    name: str
    kind: Kind
    meaning: str
    may_be_empty: bool = False


def _text(name: str, meaning: str) -> Column:
    return Column(name=name, kind="text", meaning=meaning)


def _time(name: str, meaning: str) -> Column:
    return Column(name=name, kind="time", meaning=meaning)


def _count(name: str, meaning: str) -> Column:
    return Column(name=name, kind="count", meaning=meaning)


def _number(name: str, meaning: str) -> Column:
    return Column(name=name, kind="number", meaning=meaning)


def _gap(name: str, meaning: str) -> Column:
    return Column(name=name, kind="number", meaning=meaning, may_be_empty=True)


STAGE: Final = _text("stage", "closure stage")
OPENING: Final = _text("opening", "opening in the dam; the same name from stage to stage is the same place")
SIDE: Final = _text("side", "side of the hole: basin (dug by the flood) or sea (dug by the ebb)")
TIME_UTC: Final = _time("time_utc", "moment, UTC")

DURATION_COLUMNS: Final = (
    STAGE,
    OPENING,
    SIDE,
    _time("start", "start of the stage, UTC, included"),
    _time("end", "end of the stage, UTC, not included"),
    _number("duration_h", "length of the stage in hours"),
    _count("cycles", "number of cycles and parts of cycles in the stage"),
    _gap("reference_velocity_m_s", "velocity at the end of the protection that the effective durations refer to, m/s"),
    _gap("alpha", "disturbance factor at the reference; empty in a row without flow"),
    _gap("critical_velocity_m_s", "critical depth-mean velocity of the bed at the reference depth, m/s"),
    _gap("reference_depth_m", "mean water depth over the original bed at the end of the protection, m"),
    _number("effective_duration_integral_h", "effective duration in hours, tide chained in small steps"),
    _number(
        "effective_duration_flow_mean_h", "effective duration in hours, mean over the time with flow of each cycle"
    ),
    _number("effective_duration_cycle_mean_h", "effective duration in hours, mean over each whole cycle"),
    _number("effective_duration_h", "effective duration in hours under the tide rule that drives growth"),
    _number("stage_depth_m", "scour depth from a flat bed by this stage alone, m"),
    _gap(
        "equivalent_start_h",
        "hours on this stage's own curve at which it has the depth that it starts with; empty where nothing grows",
    ),
    _number("start_depth_m", "scour depth at the start of the stage, m below the original bed"),
    _number("end_depth_m", "scour depth at the end of the stage, m below the original bed"),
    _gap("peak_gap_velocity_m_s", "highest velocity in the gap towards this side, m/s; empty where velocity is given"),
    _gap("peak_end_velocity_m_s", "highest velocity at the end of the protection towards this side, m/s"),
    _gap("share_percent", "share of the stage in the growth of its place, percent; empty where the place never grows"),
)

RULE_COLUMNS: Final = {"integral": "integral", "flow-mean": "flow_mean", "cycle-mean": "cycle_mean"}
"""Tide rules as they stand in column names."""

CYCLE_SIDES: Final = ("basin", "sea")
"""Order of the sides in the columns of `cycles.csv`."""

CYCLE_COLUMNS: Final = (
    STAGE,
    OPENING,
    _count("cycle", "number of the cycle in its stage, from 1"),
    _time("start", "start of the cycle or of its part, UTC"),
    _time("end", "end of the cycle or of its part, UTC"),
    _number("tidal_range_m", "highest less lowest sea level in that part, m"),
    _gap("peak_flood_velocity_m_s", "highest gap velocity from sea to basin, m/s; empty where velocity is given"),
    _gap("peak_ebb_velocity_m_s", "highest gap velocity from basin to sea, m/s; empty where velocity is given"),
    *(
        _gap(f"{side}_effective_{rule}_h", f"effective hours of the cycle on the {side} side, {name} rule")
        for side in CYCLE_SIDES
        for name, rule in RULE_COLUMNS.items()
    ),
)

VELOCITY_COLUMNS: Final = (
    TIME_UTC,
    STAGE,
    OPENING,
    _gap("level_sea_m", "sea level, m above the site datum; empty in holes of the records"),
    _gap("level_basin_m", "basin level, m above the site datum"),
    _gap("head_m", "sea level minus basin level, m"),
    _gap("discharge_m3_s", "discharge, m3/s, positive from sea to basin"),
    _gap("gap_velocity_m_s", "velocity in the control section, m/s, positive from sea to basin"),
    _gap("end_velocity_basin_m_s", "velocity at the end of the protection on the basin side, m/s, 0 on the ebb"),
    _gap("end_velocity_sea_m_s", "velocity at the end of the protection on the sea side, m/s, 0 on the flood"),
)

GROWTH_COLUMNS: Final = (
    TIME_UTC,
    STAGE,
    OPENING,
    SIDE,
    _number("depth_m", "scour depth, m below the original bed"),
)

PROTECTION_COLUMNS: Final = (
    OPENING,
    SIDE,
    _number("failure_slope_cot", "cotangent of the slope after a slide: 1 in this"),
    _number("final_depth_m", "scour depth at the end of the programme under the tide rule that drives growth, m"),
    *(
        _number(f"final_depth_{rule}_m", f"scour depth at the end of the programme, {name} rule, m")
        for name, rule in RULE_COLUMNS.items()
    ),
    _number("length_given_m", "length of the protection in the plan, m from the toe of the sill"),
    _number("length_required_m", "length of the protection that the slope rule asks for, m from the toe of the sill"),
    _gap("alpha_at_required", "disturbance factor at that length in the stage with the largest share"),
    _gap(
        "final_depth_raised_sea_m",
        "final depth under the driving rule with sea_factor 0.05 higher, m; empty where no stage takes the tide",
    ),
    _gap("length_required_raised_sea_m", "required length with sea_factor 0.05 higher, m"),
)

SIDE_OF_GAUGE: Final = _text("side", "side where the gauge stands: sea or basin")

TIDE_COLUMNS: Final = (
    SIDE_OF_GAUGE,
    _text("constituent", "name of the tidal constituent"),
    _number("amplitude_m", "amplitude, m"),
    _number("phase_deg", "Greenwich phase lag, degrees"),
    _gap("amplitude_ci95_m", "half width of the 95 % interval of the amplitude, m; empty where not known"),
    _gap("phase_ci95_deg", "half width of the 95 % interval of the phase, degrees; empty where not known"),
)

RECORD_COLUMNS: Final = (
    SIDE_OF_GAUGE,
    TIME_UTC,
    _gap("level_m", "level, m above the site datum; empty where missing"),
    _count("flag", "1 pass, 2 not evaluated, 3 suspect, 4 fail, 9 missing"),
)

FINDING_COLUMNS: Final = (
    _text("severity", "note (fixed or assumed), warning (look), error (a number should not be used as it is)"),
    _text("code", "short name of the finding"),
    _text("where", "key path, file and line, or stage, opening and side"),
    _text("message", "what was found and what it means"),
)

SWEEP_COLUMNS: Final = (
    OPENING,
    _text("varied", "what is varied, all else as at the start of the first stage: crest level or width"),
    _number("value_m", "crest level, m above the site datum, or width at the crest, m"),
    _text("tide", "spring, mean or neap: the tide of largest, median or smallest range at sea in a spring-neap cycle"),
    _text("direction", "flood (sea to basin) or ebb"),
    _gap("peak_head_m", "largest head in that tide and direction, m; empty where it hangs on what was long before"),
    _gap("peak_gap_velocity_m_s", "largest velocity in the control section, m/s"),
    _gap("peak_unit_discharge_m2_s", "largest discharge per metre of mean width of the control section, m2/s"),
    _gap("mean_basin_level_m", "mean basin level over the cycle, m above the site datum"),
)

CALIBRATION_COLUMNS: Final = (
    _text(
        "parameter",
        "what was estimated: coefficient (of the first opening that has one; the others in proportion), area_factor "
        "(times the plan's storage), datum_offset_m (added to the basin record, m), coefficient_over_area_factor",
    ),
    _gap("estimate", "estimate; empty where the records do not tell"),
    _gap("ci95_low", "lower end of the 95 % interval; empty where there is none"),
    _gap("ci95_high", "upper end of the 95 % interval; empty where there is none"),
    _text("determined", "yes where the interval is narrow enough for the number to be used, else no"),
)

CORRELATION_COLUMNS: Final = (
    _text("parameter", "one parameter; coefficient and area_factor by their logarithms"),
    _text("other", "another parameter"),
    _gap("correlation", "correlation of the two estimates"),
)

LEVEL_COLUMNS: Final = (
    TIME_UTC,
    _text("part", "settling, fitted or held back"),
    _number("level_sea_m", "recorded sea level, smoothed over an hour, m above the site datum"),
    _gap("level_recorded_m", "recorded basin level with the fitted offset, m above the site datum; empty in holes"),
    _number("level_routed_m", "basin level routed with the fitted parameters, m above the site datum"),
    _gap("level_guess_m", "sea level scaled and lagged, the guess without a basin, m above the site datum"),
)

SCORE_COLUMNS: Final = (
    _text("part", "fitted or held back"),
    _text("method", "routed basin, or the guess from the sea level scaled and lagged"),
    _time("start", "first sample of the part, UTC"),
    _time("end", "last sample of the part, UTC"),
    _count("samples", "recorded levels in the part"),
    _number("rms_m", "root mean square of computed less recorded level, m"),
    _number("bias_m", "mean of computed less recorded level, m"),
    _gap("range_error_m", "mean of computed less recorded tidal range, m; empty without a whole tide"),
    _gap("phase_error_min", "how much later the computed M2 tide is, minutes; empty without a tide"),
)

CAMPAIGN_COLUMNS: Final = (
    _text("opening", "opening where the discharge was measured; all for the sum of all openings"),
    _text("source", "measured, by head, by storage, or routed"),
    _time("start", "start of the span that is compared, UTC"),
    _time("end", "end of that span, UTC"),
    _gap("flood_volume_m3", "volume from sea to basin in the span, m3"),
    _gap("flood_volume_error_m3", "its standard error, m3; empty where errors are not independent"),
    _gap("ebb_volume_m3", "volume from basin to sea in the span, m3"),
    _gap("ebb_volume_error_m3", "its standard error, m3"),
    _gap("flood_peak_m3_s", "largest discharge from sea to basin, m3/s"),
    _gap("ebb_peak_m3_s", "largest discharge from basin to sea, m3/s"),
    _text("slacks", "times at which the discharge passed zero, UTC, apart by blanks; the first ten"),
)

DISCHARGE_COLUMNS: Final = (
    TIME_UTC,
    _text("opening", "opening; all for the sum of all openings"),
    _text("source", "measured, by head, by storage, or routed"),
    _gap("discharge_m3_s", "discharge, m3/s, positive from sea to basin"),
    _gap("standard_error_m3_s", "standard error, m3/s; empty where it is not known"),
)
