"""Levels on both sides and the flow through each opening, for the recomputation beside this file."""

import csv
import math
import warnings
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from datetime import UTC, datetime
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
from formulas import Array, crest_flow, given_flow
from scipy.integrate import solve_ivp
from scipy.interpolate import CubicSpline

HOUR = 3600.0
STEP_S = 20.0
SPIN_UP_DAYS = 20.0
METRES = {"m": 1.0, "cm": 0.01, "m3/s": 1.0, "m/s": 1.0}
EPOCH = datetime(1970, 1, 1, tzinfo=UTC)

Table = dict[str, Any]


@dataclass(frozen=True)
class Piece:
    """A stretch of one stage without a hole: levels at the step of this program."""

    time_s: Array
    level_m: dict[str, Array]


@dataclass(frozen=True)
class Flow:
    """What runs through one opening in one piece; flood positive; `end_m_s` only where it is given."""

    discharge_m3_s: Array
    gap_m_s: Array
    mean_width_m: Array
    end_m_s: Array | None


def seconds(moment: datetime) -> float:
    return (moment - EPOCH).total_seconds()


def read_samples(folder: Path, entry: Table, files: list[str], column: str) -> tuple[Array, Array]:
    """Time [s since 1970 UTC] and value of every good row, in the order of time."""
    hours, minutes = (int(part) for part in entry.get("utc_offset", "+00:00").split(":"))
    offset_s = 3600.0 * hours + 60.0 * minutes
    good: list[tuple[float, float]] = []
    for path in sorted(path for pattern in files for path in folder.glob(pattern)):
        with path.open(encoding="utf-8") as lines:
            for row in csv.DictReader(lines):
                value = float(row[column])
                if value not in entry.get("missing", [-999.0]):
                    stamp = datetime.fromisoformat(row[entry.get("time", "time")])
                    moment = seconds(stamp) if stamp.tzinfo else seconds(stamp.replace(tzinfo=UTC)) - offset_s
                    good.append((moment, value * METRES[entry["unit"]] + entry.get("shift_m", 0.0)))
    time_s, value = np.array(sorted(good)).T
    return time_s, value


def read_series(plan: Table, folder: Path, name: str) -> tuple[Array, Array]:
    entry = plan["series"][name]
    return read_samples(folder, entry, [entry["file"]], entry.get("value", "level_m"))


def predicted_sea(plan: Table, folder: Path, start_s: float, end_s: float) -> CubicSpline:
    """Mean + factor x tide + set-up, from constants, on ten-minute steps; utide with every selection switched off."""
    import utide

    tide = plan["tide"]
    with (folder / tide["sea_constants"]).open(encoding="utf-8") as lines:
        constants = {row["constituent"]: row for row in csv.DictReader(lines)}
    time_s = np.arange(start_s - 7200.0, end_s + 7200.0, 600.0)
    stamps = (time_s * 1000.0).astype("int64").astype("datetime64[ms]")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        options = {"lat": plan["site"]["latitude_deg"], "trend": False, "conf_int": "none", "verbose": False}
        any_signal = np.cos(np.arange(1440.0))
        frame = utide.solve(stamps[:1440], any_signal, constit=list(constants), method="ols", nodal=True, **options)
        frame.A = np.array([float(constants[name]["amplitude_m"]) for name in frame.name])
        frame.g = np.array([float(constants[name]["phase_deg"]) for name in frame.name])
        frame.mean = 0.0
        level = utide.reconstruct(stamps, frame, min_SNR=0, min_PE=0, verbose=False).h
    return CubicSpline(time_s, tide["sea_mean_m"] + tide.get("sea_factor", 1.0) * level + tide.get("set_up_m", 0.0))


def steps(start_s: float, end_s: float) -> Array:
    return np.linspace(start_s, end_s, math.ceil((end_s - start_s) / STEP_S) + 1)


def holes(time_s: Array) -> list[tuple[float, float]]:
    wide = np.flatnonzero(np.diff(time_s) > HOUR + 1e-6)
    return [(float(time_s[i]), float(time_s[i + 1])) for i in wide]


def spline_between_holes(time_s: Array, level_m: Array, at_s: Array) -> Array:
    """Cubic spline of the run of samples that `at_s` lies in."""
    cuts = [0, *(np.flatnonzero(np.diff(time_s) > HOUR + 1e-6) + 1), len(time_s)]
    for first, last in pairwise(cuts):
        if time_s[first] <= at_s[0] and at_s[-1] <= time_s[last - 1]:
            return CubicSpline(time_s[first:last], level_m[first:last])(at_s)
    raise ValueError("not covered")


def measured_pieces(plan: Table, folder: Path, stage: Table) -> list[Piece]:
    """Levels of both gauges between the holes of either."""
    records = {
        side: read_samples(folder, entry, entry["files"], entry.get("level", "level_m"))
        for side, entry in plan["records"].items()
    }
    edge_s, end_s = seconds(stage["start"]), seconds(stage["end"])
    spans = []
    for hole_start_s, hole_end_s in sorted(hole for time_s, _ in records.values() for hole in holes(time_s)):
        if hole_end_s > edge_s and hole_start_s < end_s:
            if hole_start_s > edge_s:
                spans.append((edge_s, hole_start_s))
            edge_s = max(edge_s, hole_end_s)
    spans.append((edge_s, end_s))
    return [
        Piece(at_s := steps(*span), {side: spline_between_holes(*record, at_s) for side, record in records.items()})
        for span in spans
    ]


def section_at(stage: Table, opening: Table) -> Callable[[float], tuple[float, float, float, float]]:
    """Crest, width, slope, coefficient by time: straight from start to end of the stage."""
    start_s, end_s = seconds(stage["start"]), seconds(stage["end"])
    crest, width = opening["crest_level_m"], opening["width_m"]
    crest_rise = opening.get("crest_level_end_m", crest) - crest
    width_rise = opening.get("width_end_m", width) - width
    slope, coefficient = opening.get("side_slope", 0.0), opening.get("coefficient", 1.0)

    def section(at_s: float) -> tuple[float, float, float, float]:
        part = min(max((at_s - start_s) / (end_s - start_s), 0.0), 1.0)
        return crest + part * crest_rise, width + part * width_rise, slope, coefficient

    return section


def route(plan: Table, folder: Path, stage: Table, sea: CubicSpline, start_m: float, time_s: Array) -> Array:
    """Basin level at `time_s`: A(z) dz/dt = sum of Q + inflow, by LSODA."""
    levels, areas, inflow = plan["basin"]["level_m"], plan["basin"]["area_m2"], plan["basin"].get("inflow_m3_s", 0.0)
    crests = [section_at(stage, opening) for opening in stage["opening"] if "discharge_series" not in opening]
    given = [
        read_series(plan, folder, opening["discharge_series"])
        for opening in stage["opening"]
        if "discharge_series" in opening
    ]

    def rise(at_s: float, state: Array) -> list[float]:
        sea_m, basin_m = float(sea(at_s)), float(state[0])
        total = inflow + sum(crest_flow(sea_m, basin_m, section(at_s))[0] for section in crests)
        total += sum(float(np.interp(at_s, *series)) for series in given)
        return [total / float(np.interp(basin_m, levels, areas))]

    span = (time_s[0], time_s[-1])
    solved = solve_ivp(rise, span, [start_m], "LSODA", time_s, rtol=1e-8, atol=1e-8, max_step=300.0)
    return solved.y[0]


def stage_pieces(plan: Table, folder: Path) -> Iterator[list[Piece]]:
    """Levels on both sides, stage by stage."""
    before: tuple[datetime, float] | None = None
    for stage in plan["stage"]:
        start_s, end_s = seconds(stage["start"]), seconds(stage["end"])
        if stage.get("sea", "tide") == "measured":
            yield measured_pieces(plan, folder, stage)
            continue
        time_s = steps(start_s, end_s)
        if stage.get("sea", "tide") == "tide":
            sea = predicted_sea(plan, folder, start_s - 86400.0 * SPIN_UP_DAYS, end_s)
        else:
            sea = CubicSpline(*read_series(plan, folder, stage["sea"]))
        if stage.get("basin", "routed") == "routed":
            if before and before[0] == stage["start"]:
                start_m = before[1]
            elif "start_level_m" in plan["basin"]:
                start_m = plan["basin"]["start_level_m"]
            else:
                ends_s = np.array([start_s - 86400.0 * SPIN_UP_DAYS, start_s])
                start_m = float(route(plan, folder, stage, sea, plan["tide"]["sea_mean_m"], ends_s)[-1])
            basin_m = route(plan, folder, stage, sea, start_m, time_s)
            before = stage["end"], float(basin_m[-1])
        else:
            basin_m = CubicSpline(*read_series(plan, folder, stage["basin"]))(time_s)
        yield [Piece(time_s, {"sea": sea(time_s), "basin": basin_m})]


def opening_flow(plan: Table, folder: Path, stage: Table, opening: Table, piece: Piece) -> Flow:
    section = section_at(stage, opening)
    given = opening.get("discharge_series", opening.get("end_velocity_series"))
    if "end_velocity_series" in opening:
        nothing = np.full_like(piece.time_s, np.nan)
        return Flow(nothing, nothing, nothing, np.interp(piece.time_s, *read_series(plan, folder, given)))
    if given:
        imposed = np.interp(piece.time_s, *read_series(plan, folder, given)).tolist()
    columns = []
    for i, (at_s, sea_m, basin_m) in enumerate(
        zip(piece.time_s.tolist(), piece.level_m["sea"].tolist(), piece.level_m["basin"].tolist(), strict=True)
    ):
        here = section(at_s)
        columns.append(given_flow(imposed[i], sea_m, basin_m, here) if given else crest_flow(sea_m, basin_m, here))
    discharge, area, width = np.array(columns).T
    gap = np.divide(discharge, area, out=np.zeros_like(area), where=area > 0.0)
    return Flow(discharge, gap, width, None)
