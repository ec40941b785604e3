"""What a stage costs by being late: more depth behind the protection, and more protection."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import timedelta
from math import isnan

from tidescour.errors import Finding
from tidescour.gauge.records import InputFile
from tidescour.plan.kinds import Side
from tidescour.plan.models import Plan, Stage
from tidescour.plan.models_bed import PlaceBed


@dataclass(frozen=True, slots=True, kw_only=True)
class Extra:
    """What is added to the final depth of a place and to the length that it needs [m]; NaN where not known."""

    depth_m: float
    length_m: float


NOTHING = Extra(depth_m=0.0, length_m=0.0)
NOT_KNOWN = Extra(depth_m=float("nan"), length_m=float("nan"))


@dataclass(frozen=True, slots=True, kw_only=True)
class DelayRow:
    """One stage so many weeks late, and what this adds at one place.

    `own_stay` is that of the longer stage alone, all others growing as planned; `calendar` has every later stage
    moved to the tides of its new dates.
    """

    stage: str
    weeks_late: int
    opening: str
    side: Side
    own_stay: Extra
    calendar: Extra


@dataclass(frozen=True, slots=True, kw_only=True)
class PlannedPlace:
    """A place as planned: its depth after the last stage and the length that it needs [m]."""

    place: PlaceBed
    final_depth_m: float
    required_length_m: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DelayStudy:
    """Every stage late by every number of weeks, at every place, against the plan.

    `rows` are in the order of stages, weeks and places; `files` holds every input beside the plan.
    """

    plan: Plan
    weeks: tuple[int, ...]
    places: tuple[PlannedPlace, ...]
    rows: tuple[DelayRow, ...]
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...]

    def of(self, stage: str, place: PlaceBed) -> tuple[DelayRow, ...]:
        """Return the rows of one stage at one place, by weeks."""
        return tuple(
            row for row in self.rows if (row.stage, row.opening, row.side) == (stage, place.opening, place.side)
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class StageCost:
    """What one stage costs at its worst place by being late: the rows of fewest and of most weeks there.

    The worst place is that which the own longer stay of most weeks deepens most: spring and neap, and what moves in
    the stage, have evened out by then.
    """

    fewest: DelayRow
    most: DelayRow

    @property
    def stage(self) -> str:
        """Name of the stage."""
        return self.most.stage


def stage_costs(study: DelayStudy) -> tuple[StageCost, ...]:
    """Return what each stage costs at its worst place, in the order of the stages.

    Parameters
    ----------
    study : DelayStudy
        All delays.

    Returns
    -------
    tuple of StageCost
        Without the stages that could not be moved, or have no result.
    """
    costs = []
    for stage in study.plan.stage:
        known = [
            rows
            for each in study.places
            if (rows := [row for row in study.of(stage.name, each.place) if not isnan(row.own_stay.depth_m)])
        ]
        if known:
            worst = max(known, key=lambda rows: rows[-1].own_stay.depth_m)
            costs.append(StageCost(fewest=worst[0], most=worst[-1]))
    return tuple(costs)


def per_week(metres: float, row: DelayRow) -> float:
    """Return what a row adds, over its weeks [m per week]; NaN stays NaN."""
    return metres / row.weeks_late


def first_to_shorten(costs: Sequence[StageCost]) -> StageCost | None:
    """Return the stage that deepens its worst hole most per week; None where none deepens any."""
    deepening = [cost for cost in costs if cost.most.own_stay.depth_m > 0.0]
    return max(deepening, key=lambda cost: per_week(cost.most.own_stay.depth_m, cost.most), default=None)


def prolonged(stage: Stage, weeks: int) -> Stage:
    """Return a stage that ends so many weeks later; what moves in it moves slower to the same end."""
    return stage.model_copy(update={"end": stage.end + timedelta(weeks=weeks)})


def moved(stage: Stage, weeks: int) -> Stage:
    """Return a stage that comes so many weeks later."""
    late = timedelta(weeks=weeks)
    return stage.model_copy(update={"start": stage.start + late, "end": stage.end + late})


def bound_to_its_time(stage: Stage) -> str:
    """Return in words what binds a stage to the time of its records or series; empty where nothing does."""
    sources = [
        f'{side} = "measured"' if source == "measured" else f"series {source!r}"
        for side, source in (("sea", stage.sea), ("basin", stage.basin))
        if source not in ("tide", "routed")
    ]
    given = (name for opening in stage.opening for name in (opening.discharge_series, opening.end_velocity_series))
    sources += [f"series {name!r}" for name in given if name is not None]
    return " and ".join(dict.fromkeys(sources))
