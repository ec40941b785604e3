"""What drives the basin through a stage: steps, sea levels and given flows."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tidescour.gap.levels import LevelHistory, Waters, given_values, own_sea_levels, side_levels
from tidescour.gap.openings import has_own_sea
from tidescour.gap.routing import GAMMA, Forcing
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.units import BoolArray, FloatArray

LONGEST_STEP_S = 60.0


def even_steps(start_s: float, end_s: float, longest_s: float = LONGEST_STEP_S) -> FloatArray:
    """Return even instants from start to end, both included, at most `longest_s` apart."""
    return np.linspace(start_s, end_s, int(np.ceil((end_s - start_s) / longest_s - 1e-9)) + 1)


def with_points_between(time_s: FloatArray) -> FloatArray:
    """Return the steps with the solver's inner point of each step between them."""
    instants = np.empty(2 * time_s.size - 1)
    instants[0::2] = time_s
    instants[1::2] = time_s[:-1] + GAMMA * np.diff(time_s)
    return instants


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Seas:
    """The sea level of a stage, and that of each opening by name where it has its own."""

    stage: LevelHistory
    own: Mapping[str, LevelHistory]

    def at(self, opening: Opening) -> LevelHistory:
        """Return the sea level that an opening meets."""
        return self.own.get(opening.name, self.stage)

    @property
    def covered(self) -> BoolArray:
        """Where no sea level is inside a hole."""
        covered = self.stage.covered
        for each in self.own.values():
            covered = covered & each.covered
        return covered

    def every_second(self) -> Seas:
        """Return the levels at the steps alone, of levels with the solver's inner points between them."""
        return Seas(stage=_every_second(self.stage), own={name: _every_second(own) for name, own in self.own.items()})


def _every_second(level: LevelHistory) -> LevelHistory:
    return LevelHistory(level_m=level.level_m[0::2], covered=level.covered[0::2].copy())


def stage_seas(stage: Stage, openings: Sequence[Opening], waters: Waters, instants: FloatArray, bridge: bool) -> Seas:
    """Return the sea levels of a stage at instants, and those of openings with one of their own.

    Parameters
    ----------
    stage : Stage
        Where its sea level comes from.
    openings : sequence of Opening
        Those that may have one of their own.
    waters : Waters
        Tides, records and given series.
    instants : (n,) array
        Seconds since 1970, increasing.
    bridge : bool
        Holes of a measured level must be filled by a tide, for routing.

    Raises
    ------
    PlanError, FitError, RecordError
        If the source cannot serve.
    """
    sea = side_levels(stage.sea, "sea", waters, instants, stage.name, bridge=bridge)
    return Seas(
        stage=sea,
        own={
            opening.name: own_sea_levels(opening, stage.sea, waters, instants, stage.name, bridge, sea)
            for opening in openings
            if has_own_sea(opening)
        },
    )


def side_openings(basin: Basin | None) -> tuple[Opening, ...]:
    """Return the permanent openings beside the gap; none without a basin."""
    return () if basin is None else basin.side_opening


def basin_inflow(basin: Basin | None, waters: Waters, instants: FloatArray, stage: str) -> FloatArray:
    """Return what runs into the basin by other ways than openings [m3/s] at the instants of a stage.

    Raises
    ------
    RecordError
        If a series does not cover the stage.
    """
    total = np.full(instants.shape, 0.0 if basin is None else basin.inflow_m3_s)
    for inflow in () if basin is None else basin.inflow:
        if inflow.series is not None:
            total = total + given_values(waters.series[inflow.series], instants, stage)
        else:
            total = total + (inflow.discharge_m3_s or 0.0)
    return total


def stage_forcing(stage: Stage, basin: Basin, waters: Waters, instants: FloatArray, seas: Seas) -> Forcing:
    """Return what drives the basin through a stage.

    Parameters
    ----------
    stage : Stage
        Its openings.
    basin : Basin
        Inflows and side openings.
    waters : Waters
        Where given series are found.
    instants : (2 n + 1,) array
        Steps with the solver's inner points between them, as `with_points_between` gives them.
    seas : Seas
        Sea levels at these instants.

    Raises
    ------
    RecordError
        If a series does not cover the stage.
    """
    given = basin_inflow(basin, waters, instants, stage.name)
    for opening in (*stage.opening, *basin.side_opening):
        if opening.discharge_series is not None:
            given = given + given_values(waters.series[opening.discharge_series], instants, stage.name)
    own = [seas.own[opening.name].level_m for opening in exchanging(stage, basin) if has_own_sea(opening)]
    sea = np.column_stack([seas.stage.level_m, *own])
    return Forcing(
        step_s=float((instants[-1] - instants[0]) / (instants.size // 2)),
        sea_level_m=np.ascontiguousarray(sea[0::2]),
        sea_level_between_m=np.ascontiguousarray(sea[1::2]),
        given_discharge_m3_s=np.ascontiguousarray(given[0::2]),
        given_discharge_between_m3_s=np.ascontiguousarray(given[1::2]),
    )


def exchanging(stage: Stage, basin: Basin) -> tuple[Opening, ...]:
    """Return the openings that a routed basin exchanges water with by a relation."""
    return tuple(opening for opening in (*stage.opening, *basin.side_opening) if opening.relation is not None)
