"""The results of a run as one record: what tables, figures and the hand-off are made from."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from tidescour.bed.layers import BedLayers
from tidescour.bed.records import BedHistory
from tidescour.bed.stone_records import FilterScreening, StoneScreening
from tidescour.errors import Finding
from tidescour.gap.calibrating import Calibrated
from tidescour.gap.records import StageFlow
from tidescour.gap.sweep_records import ClosureSweep
from tidescour.gauge.records import GaugeRecord, InputFile
from tidescour.plan.models import Plan, Stage
from tidescour.plan.models_bed import PlaceBed
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import (
    RULES,
    ChainStep,
    EffectiveDuration,
    LengthCurve,
    RequiredLength,
    RowDurations,
    Rule,
)
from tidescour.study.storms import LoadCases
from tidescour.table import Entry
from tidescour.tide.records import TideFit
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DurationRow:
    """One stage, opening and side: what the bed felt, how long it counts, and the growth it gave.

    Parameters
    ----------
    stage : Stage
        Of the plan.
    bed : BedHistory
        What the bed felt, with the layer at the surface.
    durations : RowDurations
        The row in every layer of the bed.
    duration : EffectiveDuration
        That of the layer in which the hole lies when the stage starts, under the rule that drives growth.
    chain : tuple of ChainStep
        Growth under each of `RULES`, in their order; the first three are the tide rules.
    equal_alpha : tuple of float
        Alpha with which each of `RULES` gives the depth of the integral from a flat bed; NaN where there is none.
    peak_gap_velocity_m_s : float
        Highest velocity in the gap towards this side, NaN where the end velocity is given.
    """

    stage: Stage
    bed: BedHistory
    durations: RowDurations
    duration: EffectiveDuration
    chain: tuple[ChainStep, ...]
    equal_alpha: tuple[float, ...]
    peak_gap_velocity_m_s: float

    def __post_init__(self) -> None:
        """Check that every rule has its growth."""
        if not len(self.chain) == len(self.equal_alpha) == len(RULES):
            raise ValueError("chain and equal_alpha must have one entry a rule")

    def step(self, rule: Rule) -> ChainStep:
        """Growth under one rule."""
        return self.chain[RULES.index(rule)]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Sensitivity:
    """What one input's change does at one place: to the final depth behind the given length, and to the required one.

    `change` says in words what was changed, such as ``velocity at the end of the protection 10 % higher``; NaN where
    there is no result with the change, for the reason given in `why_empty`.
    """

    change: str
    depth_change_m: float
    length_change_m: float
    why_empty: str = ""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PlaceResult:
    """One place: its rows in the order of the stages, its growth in time and the length it needs.

    `growth_time_s` and `growth_depth_m` are taken at cycle ends under the rule that drives, starting with the start
    of the first stage; `growth_stage` names the stage of each point. `length_reached_s` is when the hole becomes so
    deep that the given length is no longer enough, NaN where it never does; `length_curve` is None where nothing
    grows.
    """

    place: PlaceBed
    layers: BedLayers
    rows: tuple[DurationRow, ...]
    growth_time_s: FloatArray
    growth_depth_m: FloatArray
    growth_stage: tuple[str, ...]
    required: RequiredLength
    length_reached_s: float
    length_curve: LengthCurve | None
    sensitivities: tuple[Sensitivity, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        object.__setattr__(self, "growth_time_s", read_only(self.growth_time_s))
        object.__setattr__(self, "growth_depth_m", read_only(self.growth_depth_m))
        if not self.growth_time_s.shape == self.growth_depth_m.shape == (len(self.growth_stage),):
            raise ValueError("growth arrays must have one length")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RaisedSea:
    """What a sea tide larger than the plan's would do: its factor; final depths and required lengths of the places."""

    sea_factor: float
    final_depth_m: tuple[float, ...]
    length_required_m: tuple[float, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RunResults:
    """Everything that a run found out.

    `records` holds the gauges read, `fits` the tides used, `flows` one entry a stage, `places` one entry a place;
    `raised_sea` the result with a larger sea tide, None where no stage takes the tide or there is no result; `sweep`
    the main opening at other crests and widths; `stone` and `filters` the screening of both; `methods` what the run
    used, in the order of the steps; `load_cases` the storms beside the programme; `files` every input beside the plan;
    `findings` all of them in the order of the steps.
    """

    plan: Plan
    law: GrowthLaw
    submerged_relative_density: float
    records: tuple[GaugeRecord, ...]
    fits: tuple[TideFit, ...]
    flows: tuple[StageFlow, ...]
    places: tuple[PlaceResult, ...]
    raised_sea: RaisedSea | None
    sweep: ClosureSweep
    stone: StoneScreening
    filters: FilterScreening
    methods: tuple[Entry[Any], ...]
    load_cases: LoadCases
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CalibrationResults:
    """Everything that a calibration found out; `files` holds every input beside the plan."""

    plan: Plan
    calibrated: Calibrated
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...]
