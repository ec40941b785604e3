"""The columns of every table of results: name, kind, meaning with unit, and whether a cell may be empty."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

from tidescour.plan.kinds import SIDES, TIDE_RULES
from tidescour.scour.records import HELD_RULES, RULES, Rule

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
        Numbers and times only: NaN is allowed and written as an empty cell.
    choices : tuple of str
        Text only: what its cells may hold; empty for any text.
    """

    name: str
    kind: Kind
    meaning: str
    may_be_empty: bool = False
    choices: tuple[str, ...] = ()


def _text(name: str, meaning: str, choices: tuple[str, ...] = ()) -> Column:
    return Column(name=name, kind="text", meaning=meaning, choices=choices)


def _time(name: str, meaning: str) -> Column:
    return Column(name=name, kind="time", meaning=meaning)


def _count(name: str, meaning: str) -> Column:
    return Column(name=name, kind="count", meaning=meaning)


def _number(name: str, meaning: str) -> Column:
    return Column(name=name, kind="number", meaning=meaning)


def _gap(name: str, meaning: str) -> Column:
    return Column(name=name, kind="number", meaning=meaning, may_be_empty=True)


RULE_COLUMNS: Final[dict[Rule, str]] = {rule: rule.replace("-", "_") for rule in RULES}
"""Tide rules and held velocities as they stand in column names."""

_RULE_WORDS: Final[dict[Rule, str]] = {
    "integral": "tide chained in small steps",
    "flow-mean": "mean over the time with flow of each cycle",
    "cycle-mean": "mean over each whole cycle",
    "peak-held": "the highest velocity held all the time with flow",
    "mean-held": "the mean velocity held all the time with flow",
}


STAGE: Final = _text("stage", "closure stage")
OPENING: Final = _text("opening", "opening in the dam; the same name from stage to stage is the same place")
SIDE: Final = _text("side", "side of the hole: basin (dug by the flood) or sea (dug by the ebb)", SIDES)
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
    *(
        _number(f"effective_duration_{RULE_COLUMNS[rule]}_h", f"effective duration in hours, {_RULE_WORDS[rule]}")
        for rule in TIDE_RULES
    ),
    _number("effective_duration_h", "effective duration in hours under the tide rule that drives growth"),
    _number("stage_depth_m", "scour depth from a flat bed by this stage alone, growth factor included, m"),
    _gap(
        "equivalent_start_h",
        "hours on this stage's own curve at which it has the depth that it starts with; empty where nothing grows",
    ),
    _number("start_depth_m", "scour depth at the start of the stage, m below the original bed"),
    _number("end_depth_m", "scour depth at the end of the stage, m below the original bed"),
    _gap("peak_gap_velocity_m_s", "highest velocity in the gap towards this side, m/s; empty where velocity is given"),
    _gap("peak_end_velocity_m_s", "highest velocity at the end of the protection towards this side, m/s"),
    _gap("share_percent", "share of the stage in the growth of its place, percent; empty where the place never grows"),
    _number(
        "effective_duration_spent_h",
        "effective hours, under the rule that drives, until the first layer in layers.csv is reached in this stage; "
        "all of effective_duration_h where none is. From equivalent_start_h on they lead to that top, or the end",
    ),
    _number("growth_factor", "factor of the place on every depth of the law, a bare number"),
    _gap("turbulence", "relative turbulence r0 at the end of the protection, at the reference; empty where not known"),
    _gap("mean_end_velocity_m_s", "mean of that velocity over the time with flow towards this side, m/s"),
    _number("flow_duration_h", "hours with flow towards this side"),
    _gap(
        "equilibrium_depth_half_alpha_m",
        "equilibrium depth by 0.5 alpha u, steady at the reference, m, without the growth factor; 0 where none",
    ),
    _gap("equilibrium_depth_turbulence_m", "the same by (1 + 3 r0) u, m; the two forms are never mixed"),
    _text(
        "bed_layer",
        "layer of the bed in which the hole lies when the stage starts, to which threshold and hours belong; surface "
        "for the sand of the bed itself",
    ),
)

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
        _gap(f"{side}_effective_{RULE_COLUMNS[rule]}_h", f"effective hours of the cycle, {side} side, {rule} rule")
        for side in CYCLE_SIDES
        for rule in TIDE_RULES
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
        _number(f"final_depth_{RULE_COLUMNS[rule]}_m", f"scour depth at the end of the programme, {rule} rule, m")
        for rule in TIDE_RULES
    ),
    _number("length_given_m", "length of the protection in the plan, m from the toe of the sill"),
    _number("length_required_m", "length of the protection that the slope rule asks for, m from the toe of the sill"),
    _gap("alpha_at_required", "disturbance factor at that length in the stage with the largest share"),
    _gap(
        "final_depth_raised_sea_m",
        "final depth under the driving rule with sea_factor 0.05 higher, m; empty where no stage takes the tide",
    ),
    _gap("length_required_raised_sea_m", "required length with sea_factor 0.05 higher, m"),
    _number("depth_margin_factor", "margin on the final depth in the required length, a bare number"),
    _gap(
        "length_single_slide_m",
        "length by the area balance of a single slide from the upstream slope, m; less than the slope rule asks for, "
        "as slides may follow each other, and it may be under length_minimum_m; empty where there is no such slope",
    ),
    _number("length_minimum_m", "least length: six sill heights, or where alpha by length begins, m"),
    _gap(
        "upstream_slope_cot",
        "cotangent of the slope towards the protection before a slide; empty where the formula leaves its range",
    ),
    Column(
        name="length_reached",
        kind="time",
        meaning="when the hole becomes so deep that the slope rule asks for more than the given length, UTC; empty "
        "where it does not",
        may_be_empty=True,
    ),
    *(
        _gap(
            f"final_depth_{RULE_COLUMNS[rule]}_m",
            f"scour depth at the end of the programme, m, with {_RULE_WORDS[rule]}: for comparison; empty where the "
            "law has no such depth",
        )
        for rule in HELD_RULES
    ),
)

COMPARISON_COLUMNS: Final = (
    STAGE,
    OPENING,
    SIDE,
    _text("rule", "tide rule, or velocity held over all the time with flow", RULES),
    _gap(
        "effective_duration_h",
        "effective duration under the rule at the reference and in the layer of the row in durations.csv, hours; "
        "empty where the curve of that reference does not reach so deep",
    ),
    _gap("stage_depth_m", "scour depth from a flat bed by this stage alone under the rule, m"),
    _gap("end_depth_m", "scour depth at the end of the stage where every stage grows under the rule, m"),
    _gap("alpha", "disturbance factor at the reference; empty in a row without flow"),
    _gap(
        "alpha_for_same_depth",
        "disturbance factor with which the rule gives, from a flat bed, the depth of the integral; empty where none "
        "from a twentieth to twenty times does",
    ),
    _text("drives", "yes for the rule that drives growth, else no", ("yes", "no")),
)

LENGTH_CURVE_COLUMNS: Final = (
    OPENING,
    SIDE,
    _number("length_m", "length of the protection, m from the toe of the sill"),
    _gap("alpha", "disturbance factor at that length in the stage with the largest share; empty where nothing grows"),
    _gap(
        "effective_duration_h",
        "hours that the final depth takes from a flat bed on the curve of the stage with the largest share at the "
        "given length",
    ),
    _number("final_depth_m", "scour depth at the end of the programme behind that length, m"),
    _number("slope_rule_length_m", "length that this depth asks for, m: failure slope times margin times depth"),
)

SENSITIVITY_COLUMNS: Final = (
    OPENING,
    SIDE,
    _text("change", "the one input that is changed; flows stay those of the plan"),
    _gap("depth_change_m", "change of the final depth behind the given length, m"),
    _gap("length_change_m", "change of the required length, m"),
    _text("why_empty", "why there is no result with that change"),
)

LAYER_COLUMNS: Final = (
    STAGE,
    OPENING,
    SIDE,
    _text("layer", "layer of the bed that the hole reaches under the rule that drives growth"),
    _number("top_level_m", "top of the layer, m above the site datum"),
    _number("depth_m", "depth of its top below the original bed, m"),
    TIME_UTC,
    _gap("reference_velocity_m_s", "velocity that the hours in this layer refer to, m/s"),
    _gap("alpha", "disturbance factor at the reference"),
    _gap("critical_velocity_m_s", "critical depth-mean velocity of the layer at the reference depth, m/s"),
    _gap("reference_depth_m", "mean water depth over the original bed at the end of the protection, m"),
    _gap("equivalent_start_h", "hours on the layer's own curve at which it has that depth; empty where nothing grows"),
    _number("effective_duration_h", "effective hours in this layer until the stage ends or the next layer is reached"),
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
    _text(
        "severity",
        "note (fixed or assumed), warning (look), error (a number should not be used as it is)",
        ("note", "warning", "error"),
    ),
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
