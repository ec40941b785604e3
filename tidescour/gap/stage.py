"""One closure stage: its steps, its levels, and the flow through its openings."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tidescour.errors import DomainError, Finding, PlanError, RecordError
from tidescour.gap.flow import opening_flow
from tidescour.gap.forcing import (
    LONGEST_STEP_S,
    Seas,
    basin_inflow,
    even_steps,
    exchanging,
    side_openings,
    stage_forcing,
    stage_seas,
    with_points_between,
)
from tidescour.gap.levels import Waters, side_levels
from tidescour.gap.openings import opening_set
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.routing import basin_levels
from tidescour.gap.storage import Storage, basin_storage
from tidescour.gap.volume import volume_findings
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.units import SECONDS_PER_DAY, SECONDS_PER_HOUR, BoolArray, FloatArray, seconds_since_epoch, utc_text

SPIN_UP_DAYS = (15.0, 60.0)
SPIN_UP_APART_M = 1.0
SPIN_UP_AGREES_M = 0.001
LEAST_COVERED_SHARE = 0.8
COARSE_SERIES_S = 900.0

FIRST_REMEDY = "write start_level_m in [basin]: the basin level at the start of the first stage"
LATER_REMEDY = "let this stage start where the one before it ends, so that the basin level is carried on"


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
    start = seconds_since_epoch(stage.start)
    _refuse_unknown_before(stage, basin, waters, start - SPIN_UP_DAYS[0] * SECONDS_PER_DAY, remedy)
    openings = opening_set(exchanging(stage, basin), fixed_at_start=True)
    apart = np.inf
    for days in SPIN_UP_DAYS:
        instants = with_points_between(even_steps(start - days * SECONDS_PER_DAY, start))
        if days > SPIN_UP_DAYS[0]:
            _refuse_unknown_before(stage, basin, waters, instants[0], remedy)
        seas = stage_seas(stage, exchanging(stage, basin), waters, instants, bridge=True)
        forcing = stage_forcing(stage, basin, waters, instants, seas)
        mean = float(seas.stage.level_m.mean())
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


def _refuse_unknown_before(stage: Stage, basin: Basin, waters: Waters, first_s: float, remedy: str) -> None:
    """Refuse to run on tides before a stage where a given flow is not known from the first of them on."""
    names = [opening.discharge_series for opening in (*stage.opening, *basin.side_opening)]
    for name in (*names, *(inflow.series for inflow in basin.inflow)):
        if name is not None and waters.series[name].time_s[0] > first_s:
            raise PlanError(
                f"stage {stage.name!r}: series {name!r} gives a discharge that is unknown before "
                f"{utc_text(waters.series[name].time_s[0])}, and the tides before the stage need it from "
                f"{utc_text(first_s)}; {remedy}"
            )


def _routed(
    stage: Stage, basin: Basin, waters: Waters, time_s: FloatArray, start_level_m: float | None, remedy: str
) -> tuple[Seas, FloatArray]:
    """Return sea levels and routed basin levels at the steps."""
    storage = basin_storage(basin)
    start = settled_start_level(stage, basin, waters, storage, remedy) if start_level_m is None else start_level_m
    instants = with_points_between(time_s)
    seas = stage_seas(stage, (*stage.opening, *basin.side_opening), waters, instants, bridge=True)
    forcing = stage_forcing(stage, basin, waters, instants, seas)
    routed = basin_levels(opening_set(exchanging(stage, basin)), forcing, storage, start)
    return seas.every_second(), routed.level_m


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


def _series_findings(stage: Stage, basin: Basin | None, waters: Waters) -> tuple[Finding, ...]:
    openings = (*stage.opening, *side_openings(basin))
    names = {opening.discharge_series or opening.end_velocity_series for opening in openings}
    names |= {inflow.series for inflow in (() if basin is None else basin.inflow)}
    names -= {None}
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
        try:
            seas, basin_level = _routed(stage, basin, waters, time_s, start_level_m, remedy)
        except DomainError as error:
            names = ", ".join(f"{k} {opening.name!r}" for k, opening in enumerate(exchanging(stage, basin), start=1))
            raise DomainError(f"stage {stage.name!r}, or the tides before it: {error} (openings: {names})") from error
        covered = seas.covered
    else:
        seas = stage_seas(stage, (*stage.opening, *side_openings(basin)), waters, time_s, bridge=False)
        inside = side_levels(stage.basin, "basin", waters, time_s, stage.name, bridge=False)
        basin_level, covered = inside.level_m, seas.covered & inside.covered
    step_s = float(time_s[1] - time_s[0])
    findings += _coverage_findings(stage, covered, step_s) + _series_findings(stage, basin, waters)

    def flows(openings: tuple[Opening, ...]) -> tuple[OpeningFlow, ...]:
        return tuple(
            opening_flow(opening, waters, time_s, seas.at(opening), basin_level, stage.name) for opening in openings
        )

    flow = StageFlow(
        stage=stage.name,
        time_s=time_s,
        level_sea_m=seas.stage.level_m,
        level_basin_m=basin_level,
        covered=covered,
        measured="measured" in (stage.sea, stage.basin),
        routed=routed,
        openings=flows(stage.opening),
        side_openings=flows(side_openings(basin)),
        inflow_m3_s=basin_inflow(basin, waters, time_s, stage.name),
        findings=findings,
    )
    if basin is None or routed:
        return flow
    return replace(flow, findings=findings + volume_findings(flow, basin))
