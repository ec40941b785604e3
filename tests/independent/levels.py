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
from scipy.integrate import cumulative_trapezoid, solve_ivp
from scipy.interpolate import CubicSpline
from sections import gate_flow, read_survey, survey_flow

HOUR = 3600.0
STEP_S = 20.0
SPIN_UP_DAYS = 20.0
OWN_SEA = {"lag_s": 0.0, "factor": 1.0, "shift_m": 0.0}
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
    crest, width = opening["crest_level_m"], opening.get("width_m", math.nan)
    crest_rise = opening.get("crest_level_end_m", crest) - crest
    width_rise = opening.get("width_end_m", width) - width
    slope, coefficient = opening.get("side_slope", 0.0), opening.get("coefficient", 1.0)

    def section(at_s: float) -> tuple[float, float, float, float]:
        part = min(max((at_s - start_s) / (end_s - start_s), 0.0), 1.0)
        return crest + part * crest_rise, width + part * width_rise, slope, coefficient

    return section


def flow_through(folder: Path, stage: Table, opening: Table) -> Callable[[float, float, float], tuple[float, ...]]:
    """Discharge, wet area and mean width by time, sea and basin level."""
    section = section_at(stage, opening)
    if opening.get("relation") == "orifice":
        return lambda at_s, sea_m, basin_m: (gate_flow(sea_m, basin_m, opening),)
    if "profile" in opening:
        survey, coefficient = read_survey(folder / opening["profile"]), opening["coefficient"]
        return lambda at_s, sea_m, basin_m: survey_flow(sea_m, basin_m, section(at_s)[0], coefficient, survey, opening)
    return lambda at_s, sea_m, basin_m: crest_flow(sea_m, basin_m, section(at_s))


def sea_at(plan: Table, folder: Path, stage: Table, opening: Table, sea: CubicSpline) -> Callable[[Any], Any]:
    """The sea level that an opening meets: later, and about the mean larger or higher."""
    lag_s, factor, shift_m = (opening.get(f"sea_{key}", usual) for key, usual in OWN_SEA.items())
    if (lag_s, factor, shift_m) == tuple(OWN_SEA.values()):
        return sea
    mean_m = float(np.mean(read_series(plan, folder, stage["sea"])[1]))
    return lambda at_s: mean_m + factor * (sea(at_s - lag_s) - mean_m) + shift_m


def inflow(plan: Table, folder: Path, given: list[str]) -> Callable[[float], float]:
    """What runs into the basin by other ways than openings with a relation, by time."""
    basin = plan["basin"]
    sources = basin.get("inflow", [])
    steady = basin.get("inflow_m3_s", 0.0) + sum(source.get("discharge_m3_s", 0.0) for source in sources)
    names = [*given, *(source["series"] for source in sources if "series" in source)]
    series = [read_series(plan, folder, name) for name in names]
    return lambda at_s: steady + sum(float(np.interp(at_s, *each)) for each in series)


def volume_of(basin: Table, folder: Path) -> tuple[Array, Array]:
    """Levels and the volume below each: of a table, or by trapezoids every 5 mm of an area that is linear between."""
    if "table" in basin:
        with (folder / basin["table"]).open(encoding="utf-8") as lines:
            rows = [(float(row["level_m"]), float(row["volume_m3"])) for row in csv.DictReader(lines)]
        level_m, volume_m3 = np.array(rows).T
        return level_m, volume_m3
    level_m = np.arange(basin["level_m"][0] - 3.0, basin["level_m"][-1] + 3.0, 0.005)
    area_m2 = np.interp(level_m, basin["level_m"], basin["area_m2"])
    return level_m, cumulative_trapezoid(area_m2, level_m, initial=0.0)


def route(plan: Table, folder: Path, stage: Table, sea: CubicSpline, start_m: float, time_s: Array) -> Array:
    """Basin level at `time_s`: dV/dt = sum of Q + inflow, by LSODA."""
    level_m, volume_m3 = volume_of(plan["basin"], folder)
    given = [opening["discharge_series"] for opening in stage["opening"] if "discharge_series" in opening]
    more = inflow(plan, folder, given)
    openings = [*stage["opening"], *plan["basin"].get("side_opening", [])]
    related = [
        (sea_at(plan, folder, stage, opening, sea), flow_through(folder, stage, opening))
        for opening in openings
        if "discharge_series" not in opening
    ]

    def gain(at_s: float, state: Array) -> list[float]:
        basin_m = float(np.interp(state[0], volume_m3, level_m))
        return [more(at_s) + sum(flow(at_s, float(own(at_s)), basin_m)[0] for own, flow in related)]

    start_m3 = float(np.interp(start_m, level_m, volume_m3))
    options = {"rtol": 1e-8, "atol": 1e-8 * float(np.ptp(volume_m3)) / float(np.ptp(level_m)), "max_step": 300.0}
    solved = solve_ivp(gain, (time_s[0], time_s[-1]), [start_m3], "LSODA", time_s, **options)
    return np.interp(solved.y[0], volume_m3, level_m)


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


def own_pieces(plan: Table, folder: Path, stage: Table, opening: Table, pieces: list[Piece]) -> list[Piece]:
    """The pieces of a stage with the sea level that one opening meets."""
    if not any(f"sea_{key}" in opening for key in OWN_SEA):
        return pieces
    own = sea_at(plan, folder, stage, opening, CubicSpline(*read_series(plan, folder, stage["sea"])))
    return [Piece(piece.time_s, piece.level_m | {"sea": own(piece.time_s)}) for piece in pieces]


def opening_flow(plan: Table, folder: Path, stage: Table, opening: Table, piece: Piece) -> Flow:
    section, passing = section_at(stage, opening), flow_through(folder, stage, opening)
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
        if given:
            columns.append(given_flow(imposed[i], sea_m, basin_m, section(at_s)))
        else:
            columns.append(passing(at_s, sea_m, basin_m))
    discharge, area, width = np.array(columns).T
    gap = np.divide(discharge, area, out=np.zeros_like(area), where=area > 0.0)
    return Flow(discharge, gap, width, None)
