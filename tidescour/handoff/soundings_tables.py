"""The tables of soundings, the lines of a plan that follow from them, and the files of their result folder."""

from __future__ import annotations

import json
from datetime import datetime
from typing import Final

from tidescour.handoff.columns_soundings import (
    FACTOR_COLUMNS,
    FORECAST_COLUMNS,
    PROGRAMME_COLUMNS,
    SOUNDED_COLUMNS,
    STOP_COLUMNS,
)
from tidescour.handoff.results_tables import findings_table
from tidescour.handoff.tables import ResultTable, csv_bytes, table_from_rows
from tidescour.plan.models import Stage
from tidescour.study.soundings import SoundedPlace, SoundingResults, days_late
from tidescour.units import seconds_since_epoch

_HEAD: Final = (
    "# from `tidescour soundings`: put these in the place of the",
    "# plan's own; 90 % intervals stand behind. They are for",
    "# `tidescour run` and `tidescour delay`: a new run of",
    "# `tidescour soundings` with them and the same soundings",
    "# counts these twice.",
)


def soundings_files(results: SoundingResults) -> dict[str, bytes]:
    """Return the files of a comparison with soundings; figures come beside them."""
    files = {f"{table.name}.csv": csv_bytes(table) for table in soundings_tables(results)}
    return {**files, "plan_lines.toml": plan_lines(results).encode("utf-8")}


def soundings_tables(results: SoundingResults) -> tuple[ResultTable, ...]:
    """Return every table: factors, soundings, forecast, stops, programme and findings."""
    return (
        factors_table(results),
        sounded_table(results),
        forecast_table(results),
        stops_table(results),
        programme_table(results),
        findings_table(results.findings),
    )


def factors_table(results: SoundingResults) -> ResultTable:
    """Return one row a place: its growth factor, and how sure."""
    rows = (
        (
            each.place.opening,
            each.place.side,
            plan_factor(each),
            each.growth_factor[0],
            each.growth_factor[2],
            len(each.soundings),
            each.place.growth_factor,
            each.prior_factor[0],
            each.prior_factor[2],
        )
        for each in results.places
    )
    return table_from_rows("soundings", FACTOR_COLUMNS, rows)


def plan_factor(each: SoundedPlace) -> float:
    """Return the growth factor to be written into the plan: what the soundings tell, without any the plan's own."""
    return float(each.growth_factor[1]) if each.soundings else each.place.growth_factor


def sounded_table(results: SoundingResults) -> ResultTable:
    """Return one row a sounding, against the law without and with the factor."""
    rows = (
        (
            sounding.time_s,
            each.place.opening,
            each.place.side,
            sounding.depth_m,
            sounding.standard_error_m,
            planned_m,
            with_factor_m,
            innovation,
            sounding.upper_slope_cot,
        )
        for each in results.places
        for sounding, planned_m, with_factor_m, innovation in zip(
            each.soundings, each.as_planned_m, each.with_factor_m, each.innovation, strict=True
        )
    )
    return table_from_rows("sounded", SOUNDED_COLUMNS, rows)


def forecast_table(results: SoundingResults) -> ResultTable:
    """Return the forecast of each place at the ends of cycles from its last sounding on, and the plain ways beside."""
    rows = (
        (time_s, each.place.opening, each.place.side, *depths)
        for each in results.places
        for time_s, *depths in zip(
            each.forecast.band.time_s,
            *each.forecast.band.depth_m,
            each.forecast.as_planned_m,
            each.forecast.restart_m,
            each.forecast.restart_unscaled_m,
            each.forecast.plain_ratio_m,
            strict=True,
        )
    )
    return table_from_rows("forecast", FORECAST_COLUMNS, rows)


def stops_table(results: SoundingResults) -> ResultTable:
    """Return one row a place and criterion: when its length is used up, or the works stop."""
    rows = (
        (
            each.place.opening,
            each.place.side,
            stop.criterion,
            stop.limit_depth_m,
            stop.limit_slope_cot,
            stop.state,
            stop.reached_s,
            stop.median_s,
            stop.early_s,
            stop.sounded_s,
            stop.sounded_slope_cot,
        )
        for each in results.places
        for stop in each.stops
    )
    return table_from_rows("stops", STOP_COLUMNS, rows)


def programme_table(results: SoundingResults) -> ResultTable:
    """Return one row a stage: the dates planned before and those of the plan, and the levels of the computation."""
    return table_from_rows("programme", PROGRAMME_COLUMNS, (_programme_row(stage) for stage in results.plan.stage))


def _programme_row(stage: Stage) -> tuple[str | float, ...]:
    planned = [_seconds(moment) for moment in (stage.planned_start, stage.planned_end)]
    computed = [_seconds(moment) for moment in (stage.start, stage.end)]
    late = (days_late(*each) for each in zip(planned, computed, strict=True))
    return (stage.name, *planned, *computed, *late, stage.sea, stage.basin)


def _seconds(moment: datetime | None) -> float:
    return float("nan") if moment is None else seconds_since_epoch(moment)


def plan_lines(results: SoundingResults) -> str:
    """Return the lines to paste into the plan: the factor of each sounded place, with its interval."""
    lines = list(_HEAD)
    for each in results.places:
        if not each.soundings:
            continue
        name = json.dumps(each.place.opening, ensure_ascii=False)
        low, high = each.growth_factor[[0, 2]]
        if each.hardly_told:
            lines += ["", f"# {name}, {each.place.side} side: the soundings hardly tell"]
            continue
        lines += [
            "",
            f"[protection.{each.place.side}.opening.{name}]",
            f"growth_factor = {each.growth_factor[1]:.4g}  # {low:.4g} to {high:.4g}",
        ]
    return "\n".join(lines) + "\n"
