"""The tables of a calibration, and the lines of a plan that follow from it."""

from __future__ import annotations

import json
from collections.abc import Iterator
from itertools import combinations
from typing import Any

import numpy as np

from tidescour.gap.calibrating import Calibrated
from tidescour.gap.calibration_records import Estimate, Interval
from tidescour.gap.calibration_verdict import is_determined
from tidescour.gap.discharges import DischargeSeries
from tidescour.gap.levels import splined
from tidescour.handoff.columns import (
    CALIBRATION_COLUMNS,
    CAMPAIGN_COLUMNS,
    CORRELATION_COLUMNS,
    DISCHARGE_COLUMNS,
    LEVEL_COLUMNS,
    SCORE_COLUMNS,
)
from tidescour.handoff.tables import ResultTable, table_from_rows, utc_texts
from tidescour.plan.models import Basin, Plan

EVERY_S = 600.0
MOST_SLACKS = 10
RATIO = "coefficient_over_area_factor"


def calibration_tables(found: Calibrated) -> tuple[ResultTable, ...]:
    """Return the tables of a calibration: estimates, correlations, levels, scores, campaigns and discharges."""
    return (
        estimates_table(found),
        _correlations_table(found),
        _levels_table(found),
        scores_table(found),
        campaigns_table(found),
        _discharges_table(found),
    )


def estimates_table(found: Calibrated) -> ResultTable:
    """Return one row a parameter, and one for the ratio of coefficient and area factor where both were fitted."""
    estimate = found.estimate
    rows = [
        _estimate_row(name, Interval(estimate=value, ci95_low=low, ci95_high=high), known)
        for name, value, low, high, known in zip(
            estimate.names,
            estimate.estimate.tolist(),
            estimate.ci95_low.tolist(),
            estimate.ci95_high.tolist(),
            estimate.determined.tolist(),
            strict=True,
        )
    ]
    if estimate.ratio is not None:
        low, high = estimate.ratio.ci95_low, estimate.ratio.ci95_high
        known = low > 0.0 and is_determined(RATIO, 0.5 * float(np.log(high / low)))
        rows.append(_estimate_row(RATIO, estimate.ratio, known))
    return table_from_rows("calibration", CALIBRATION_COLUMNS, rows)


def _estimate_row(name: str, interval: Interval, known: bool) -> tuple[Any, ...]:
    endless = np.isinf(interval.ci95_high)
    ends = (np.nan, np.nan) if endless else (interval.ci95_low, interval.ci95_high)
    return name, np.nan if endless else interval.estimate, *ends, "yes" if known else "no"


def _correlations_table(found: Calibrated) -> ResultTable:
    names, correlation = found.estimate.names, found.estimate.correlation
    rows = [
        (names[one], names[other], float(correlation[one, other])) for one, other in combinations(range(len(names)), 2)
    ]
    return table_from_rows("correlations", CORRELATION_COLUMNS, rows)


def _levels_table(found: Calibrated) -> ResultTable:
    times = found.time_s[:: max(round(EVERY_S / (found.time_s[1] - found.time_s[0])), 1)]
    held_from_s = next((part.start_s for part in found.parts if part.name == "held back"), np.inf)
    after = np.where(times < held_from_s, "fitted", "held back")
    part = np.where(times < found.fitted_from_s, "settling", after)

    def at(level: Any) -> Any:
        return np.interp(times, found.time_s, level)

    recorded = splined(times, found.record_time_s, found.record_level_m)
    values = (times, part, at(found.level_sea_m), recorded, at(found.level_routed_m), at(found.level_guess_m))
    return ResultTable(name="levels", columns=LEVEL_COLUMNS, values=values)


def scores_table(found: Calibrated) -> ResultTable:
    """Return one row a part and method: how well levels are met."""
    rows = (
        (
            part.name,
            method,
            part.start_s,
            part.end_s,
            score.count,
            score.rms_m,
            score.bias_m,
            score.range_error_m,
            score.phase_error_s / 60.0,
        )
        for part in found.parts
        for method, score in (("routed", part.routed), ("guess", part.guess))
    )
    return table_from_rows("scores", SCORE_COLUMNS, rows)


def campaigns_table(found: Calibrated) -> ResultTable:
    """Return one row a campaign and source: volumes, peaks and slack."""
    rows = (
        (
            table.opening or "all",
            row.source,
            row.start_s,
            row.end_s,
            row.flood_volume_m3,
            row.flood_volume_error_m3,
            row.ebb_volume_m3,
            row.ebb_volume_error_m3,
            row.flood_peak_m3_s,
            row.ebb_peak_m3_s,
            " ".join(utc_texts(np.round(row.slack_time_s[:MOST_SLACKS]))),
        )
        for table in found.campaigns
        for comparison in table.comparisons
        for row in comparison.rows
    )
    return table_from_rows("campaigns", CAMPAIGN_COLUMNS, rows)


def _discharges_table(found: Calibrated) -> ResultTable:
    rows = (
        (time, table.opening or "all", series.source, value, error)
        for table in found.campaigns
        for series in table.series
        for time, value, error in _thinned(series)
    )
    return table_from_rows("discharges", DISCHARGE_COLUMNS, rows)


def _thinned(series: DischargeSeries) -> Iterator[tuple[float, float, float]]:
    """Return instants, values and errors, of a computed series every ten minutes or so."""
    step = float(np.median(np.diff(series.time_s)))
    every = 1 if series.source == "measured" else max(round(EVERY_S / step), 1)
    columns = (series.time_s, series.discharge_m3_s, series.standard_error_m3_s)
    return zip(*(column[::every].tolist() for column in columns), strict=True)


def plan_lines(plan: Plan, found: Calibrated) -> str:
    """Return the lines to paste into the plan: what was found, with its interval, and what was not."""
    lines = ["# from `tidescour calibrate`: put these in the place of the plan's own; 95 % intervals behind"]
    if found.used is not found.estimate:
        lines.append("# with the storage as the plan has it: area_factor is not known by itself")
    lines += _coefficient_lines(found)
    if plan.basin is not None and (factor := _known(found.used, "area_factor")) is not None:
        lines += ["", *_storage_lines(plan.basin, factor)]
    if plan.records.basin is not None and (offset := _known(found.used, "datum_offset_m")) is not None:
        shift, low, high = (plan.records.basin.shift_m + value for value in offset)
        lines += ["", "[records.basin]", f"shift_m = {shift:.4f}  # {low:.4f} to {high:.4f}"]
    return "\n".join(lines) + "\n"


def _known(estimate: Estimate, name: str) -> tuple[float, float, float] | None:
    """Return a number and the ends of its interval; None where it was not fitted or the records do not tell it."""
    if name not in estimate.names:
        return None
    k = estimate.names.index(name)
    if not estimate.determined[k]:
        return None
    return float(estimate.estimate[k]), float(estimate.ci95_low[k]), float(estimate.ci95_high[k])


def _coefficient_lines(found: Calibrated) -> list[str]:
    """Return a coefficient for each opening that has one."""
    if not found.coefficients:
        return []
    known = _known(found.used, "coefficient")
    if known is None:
        return [f"# coefficient of {name}: the records do not tell" for name, _ in found.coefficients]
    lines = ["# coefficients: for the same openings in each stage too"]
    for name, value in found.coefficients:
        low, high = (end * value / found.coefficients[0][1] for end in known[1:])
        lines += [
            "",
            "[[calibration.opening]]",
            f"name = {json.dumps(name, ensure_ascii=False)}",
            f"coefficient = {value:.4g}  # {low:.4g} to {high:.4g}",
        ]
    return lines


def _storage_lines(basin: Basin, known: tuple[float, float, float]) -> list[str]:
    """Return the storage of the plan times the factor; volumes with digits enough to increase still."""
    factor, low, high = known
    key, values, digits = ("volume_m3", basin.volume_m3, 9) if basin.volume_m3 else ("area_m2", basin.area_m2, 6)
    levels = ", ".join(f"{level:.9g}" for level in basin.level_m)
    scaled = ", ".join(f"{factor * value:.{digits}g}" for value in values)
    return [
        "[basin]" + ("  # instead of its table" if basin.table is not None else ""),
        f"level_m = [{levels}]",
        f"{key} = [{scaled}]  # times {factor:.4g}: {low:.4g} to {high:.4g}",
    ]
