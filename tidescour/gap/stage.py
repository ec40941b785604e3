"""One closure stage: its steps, its levels, and the flow through its openings."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tidescour.errors import Finding, PlanError, RecordError
from tidescour.gap.flow import opening_flow
from tidescour.gap.levels import LevelHistory, Waters, given_values, side_levels
from tidescour.gap.records import StageFlow
from tidescour.gap.relations import CODES, PARAMETERS_AT_MOST, relation_parameters
from tidescour.gap.routing import GAMMA, Forcing, OpeningSet, basin_levels
from tidescour.gap.storage import Storage, storage_from_area
from tidescour.gap.volume import volume_findings
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.units import SECONDS_PER_DAY, SECONDS_PER_HOUR, BoolArray, FloatArray, seconds_since_epoch

LONGEST_STEP_S = 60.0
SPIN_UP_DAYS = (15.0, 60.0)
SPIN_UP_APART_M = 1.0
SPIN_UP_AGREES_M = 0.001
LEAST_COVERED_SHARE = 0.8
COARSE_SERIES_S = 900.0

FIRST_REMEDY = "write start_level_m in [basin]: the basin level at the start of the first stage"
LATER_REMEDY = "let this stage start where the one before it ends, so that the basin level is carried on"


def even_steps(start_s: float, end_s: float, longest_s: float = LONGEST_STEP_S) -> FloatArray:
    """Return even instants from start to end, both included, at most `longest_s` apart."""
    return np.linspace(start_s, end_s, int(np.ceil((end_s - start_s) / longest_s - 1e-9)) + 1)


def _opening_set(openings: tuple[Opening, ...], fixed_at_start: bool) -> OpeningSet:
    related = [opening for opening in openings if opening.relation is not None]

    def start_and_end(start: float, end: float | None) -> tuple[float, float]:
        return start, start if end is None or fixed_at_start else end

    return OpeningSet(
        code=np.array([CODES[str(opening.relation)] for opening in related], dtype=np.int64),
        parameters=np.array(
            [relation_parameters(str(opening.relation), opening.parameters) for opening in related], dtype=np.float64
        ).reshape(len(related), PARAMETERS_AT_MOST),
        crest_level_m=np.array(
            [start_and_end(opening.crest_level_m, opening.crest_level_end_m) for opening in related]
        ).reshape(len(related), 2),
        width_m=np.array([start_and_end(opening.width_m, opening.width_end_m) for opening in related]).reshape(
            len(related), 2
        ),
        side_slope=np.array([opening.side_slope for opening in related]),
    )


def _with_points_between(time_s: FloatArray) -> FloatArray:
    """Return the steps with the solver's inner point of each step between them."""
    instants = np.empty(2 * time_s.size - 1)
    instants[0::2] = time_s
    instants[1::2] = time_s[:-1] + GAMMA * np.diff(time_s)
    return instants


def _forcing(stage: Stage, basin: Basin, waters: Waters, instants: FloatArray, sea: LevelHistory) -> Forcing:
    given = np.full(instants.shape, basin.inflow_m3_s)
    for opening in stage.opening:
        if opening.discharge_series is not None:
            given = given + given_values(waters.series[opening.discharge_series], instants, stage.name)
    return Forcing(
        step_s=float((instants[-1] - instants[0]) / (instants.size // 2)),
        sea_level_m=np.ascontiguousarray(sea.level_m[0::2]),
        sea_level_between_m=np.ascontiguousarray(sea.level_m[1::2]),
        given_discharge_m3_s=np.ascontiguousarray(given[0::2]),
        given_discharge_between_m3_s=np.ascontiguousarray(given[1::2]),
    )


def settled_start_level(
    stage: Stage, basin: Basin, waters: Waters, storage: Storage, remedy: str = FIRST_REMEDY
) -> float:
    """Return the basin level at the start of a stage [m above datum], whatever it was long before.

    Two basins that start one metre above and below mean sea run through the tides before the stage, with the geometry
    of its start; where they meet within a millimetre the start is forgotten.

    Raises
    ------
    PlanError
        If there is nothing to run on before the stage, or sixty days do not make them meet.
    """
    if stage.sea not in ("tide", "measured"):
        raise PlanError(
            f"stage {stage.name!r}: the sea level comes from series {stage.sea!r}, with nothing before it; {remedy}"
        )
    if any(opening.discharge_series is not None for opening in stage.opening):
        raise PlanError(f"stage {stage.name!r}: an opening has a given discharge, unknown before the stage; {remedy}")
    start = seconds_since_epoch(stage.start)
    openings = _opening_set(stage.opening, fixed_at_start=True)
    apart = np.inf
    for days in SPIN_UP_DAYS:
        instants = _with_points_between(even_steps(start - days * SECONDS_PER_DAY, start))
        sea = side_levels(stage.sea, "sea", waters, instants, stage.name, bridge=True)
        forcing = _forcing(stage, basin, waters, instants, sea)
        mean = float(sea.level_m.mean())
        low, high = (
            float(basin_levels(openings, forcing, storage, mean + offset).level_m[-1])
            for offset in (-SPIN_UP_APART_M, SPIN_UP_APART_M)
        )
        apart = abs(high - low)
        if apart <= SPIN_UP_AGREES_M:
            return 0.5 * (low + high)
    raise PlanError(
        f"stage {stage.name!r}: after {SPIN_UP_DAYS[-1]:.0f} days two basins that began 2 m apart still differ by "
        f"{apart:.3g} m, so that the start is not forgotten; {remedy}"
    )


def _routed(
    stage: Stage, basin: Basin, waters: Waters, time_s: FloatArray, start_level_m: float | None, remedy: str
) -> tuple[LevelHistory, FloatArray]:
    """Return sea levels and routed basin levels at the steps."""
    storage = storage_from_area(np.array(basin.level_m), np.array(basin.area_m2))
    start = settled_start_level(stage, basin, waters, storage, remedy) if start_level_m is None else start_level_m
    instants = _with_points_between(time_s)
    sea = side_levels(stage.sea, "sea", waters, instants, stage.name, bridge=True)
    forcing = _forcing(stage, basin, waters, instants, sea)
    routed = basin_levels(_opening_set(stage.opening, fixed_at_start=False), forcing, storage, start)
    return LevelHistory(level_m=sea.level_m[0::2], covered=sea.covered[0::2].copy()), routed.level_m


def _range_findings(stage: Stage, basin: Basin, level_m: FloatArray) -> tuple[Finding, ...]:
    low, high = float(level_m.min()), float(level_m.max())
    if len(basin.level_m) == 1 or (low >= basin.level_m[0] and high <= basin.level_m[-1]):
        return ()
    return (
        Finding(
            severity="warning",
            code="basin-level-range",
            where=f"stage {stage.name!r}",
            message=f"the basin level runs from {low:.2f} to {high:.2f} m, beyond the table of areas "
            f"({basin.level_m[0]:g} to {basin.level_m[-1]:g} m), where the area is held constant",
        ),
    )


def _coverage_findings(stage: Stage, covered: BoolArray, step_s: float) -> tuple[Finding, ...]:
    steps = covered[1:] & covered[:-1]
    share = float(steps.mean())
    if share == 1.0:
        return ()
    hours = float((~steps).sum()) * step_s / SECONDS_PER_HOUR
    where = f"stage {stage.name!r}"
    missing = f"{hours:.1f} h ({100.0 * (1.0 - share):.1f} %) of the measured levels are missing or not good"
    if share < LEAST_COVERED_SHARE:
        raise RecordError(f"{where}: {missing}; at least 80 % must be there. Shorten the stage or use the tide")
    return (
        Finding(
            severity="error",
            code="hole-in-record",
            where=where,
            message=f"{missing} in holes of over 1 h; they contribute nothing, so that effective durations and depths "
            "are too small by what happened in them",
        ),
    )


def _series_findings(stage: Stage, waters: Waters) -> tuple[Finding, ...]:
    names = {opening.discharge_series or opening.end_velocity_series for opening in stage.opening} - {None}
    return tuple(
        Finding(
            severity="warning",
            code="coarse-series",
            where=f"stage {stage.name!r}, series {name!r}",
            message=f"steps of up to {step / 60.0:.0f} min are taken linearly; peaks between them are lost "
            "(30 min lose 0.8 % of an M2 peak, 60 min 3.2 %); give 15 min or finer",
        )
        for name in sorted(str(name) for name in names)
        if (step := _longest_step(waters, name, stage)) > COARSE_SERIES_S + 0.5
    )


def _longest_step(waters: Waters, name: str, stage: Stage) -> float:
    stamps = waters.series[name].time_s
    inside = (stamps >= seconds_since_epoch(stage.start)) & (stamps <= seconds_since_epoch(stage.end))
    return float(np.diff(stamps[inside]).max(initial=0.0))


def stage_flow(
    stage: Stage,
    basin: Basin | None,
    waters: Waters,
    start_level_m: float | None = None,
    longest_step_s: float = LONGEST_STEP_S,
    remedy: str = FIRST_REMEDY,
) -> StageFlow:
    """Return the levels and flows of one stage.

    Parameters
    ----------
    stage : Stage
        The stage, its openings and where its levels come from.
    basin : Basin or None
        Storage and inflow; needed where the stage is routed, else it serves the volume check.
    waters : Waters
        Tides, records and given series.
    start_level_m : float, optional
        Basin level at the start of a routed stage; without it the start is found by running the tides before.
    longest_step_s : float
        The step is at most this long and divides the stage evenly [s].
    remedy : str
        What to write where the start of a routed stage cannot be found.

    Raises
    ------
    PlanError, RecordError, FitError, DomainError
        If levels or given series cannot serve; the message names the stage and what to write.
    """
    time_s = even_steps(seconds_since_epoch(stage.start), seconds_since_epoch(stage.end), longest_step_s)
    routed = stage.basin == "routed"
    findings: tuple[Finding, ...] = ()
    if routed:
        if basin is None:
            raise PlanError(f'stage {stage.name!r}: basin = "routed" needs [basin] with level_m and area_m2')
        sea, basin_level = _routed(stage, basin, waters, time_s, start_level_m, remedy)
        covered = sea.covered
        findings += _range_findings(stage, basin, basin_level)
    else:
        sea = side_levels(stage.sea, "sea", waters, time_s, stage.name, bridge=False)
        inside = side_levels(stage.basin, "basin", waters, time_s, stage.name, bridge=False)
        basin_level, covered = inside.level_m, sea.covered & inside.covered
    step_s = float(time_s[1] - time_s[0])
    findings += _coverage_findings(stage, covered, step_s) + _series_findings(stage, waters)
    openings = tuple(
        opening_flow(opening, waters, time_s, sea.level_m, basin_level, stage.name) for opening in stage.opening
    )
    flow = StageFlow(
        stage=stage.name,
        time_s=time_s,
        level_sea_m=sea.level_m,
        level_basin_m=basin_level,
        covered=covered,
        measured="measured" in (stage.sea, stage.basin),
        routed=routed,
        openings=openings,
        findings=findings,
    )
    if basin is None or routed:
        return flow
    return replace(flow, findings=findings + volume_findings(flow, basin))
