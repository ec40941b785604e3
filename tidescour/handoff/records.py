"""The results of a run as one record: what tables, figures and the hand-off are made from."""

from __future__ import annotations

from dataclasses import dataclass

from tidescour.bed.records import BedHistory
from tidescour.errors import Finding
from tidescour.gap.calibrating import Calibrated
from tidescour.gap.records import StageFlow
from tidescour.gap.sweep_records import ClosureSweep
from tidescour.gauge.records import GaugeRecord, InputFile
from tidescour.plan.models import PlaceBed, Plan, Stage
from tidescour.scour.laws import PowerLaw
from tidescour.scour.records import ChainStep, EffectiveDuration, RequiredLength
from tidescour.tide.records import TideFit
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DurationRow:
    """One stage, opening and side: what the bed felt, how long it counts, and the growth it gave.

    `chain` holds the growth under the three tide rules, in the order of `TIDE_RULES`. `peak_gap_velocity_m_s` is the
    highest velocity in the gap towards this side, NaN where the end velocity is given.
    """

    stage: Stage
    bed: BedHistory
    duration: EffectiveDuration
    chain: tuple[ChainStep, ChainStep, ChainStep]
    peak_gap_velocity_m_s: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PlaceResult:
    """One place: its rows in the order of the stages, its growth in time and the length it needs.

    `growth_time_s` and `growth_depth_m` are taken at cycle ends under the rule that drives, starting with the start
    of the first stage; `growth_stage` names the stage of each point.
    """

    place: PlaceBed
    rows: tuple[DurationRow, ...]
    growth_time_s: FloatArray
    growth_depth_m: FloatArray
    growth_stage: tuple[str, ...]
    required: RequiredLength

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        object.__setattr__(self, "growth_time_s", read_only(self.growth_time_s))
        object.__setattr__(self, "growth_depth_m", read_only(self.growth_depth_m))
        if not self.growth_time_s.shape == self.growth_depth_m.shape == (len(self.growth_stage),):
            raise ValueError("growth arrays must have one length")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RaisedSea:
    """What a sea tide larger than the plan's would do: its factor, and the same places in the same order."""

    sea_factor: float
    places: tuple[PlaceResult, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RunResults:
    """Everything that a run found out.

    `records` holds the gauges read, `fits` the tides used, `flows` one entry a stage, `places` one entry a place;
    `raised_sea` the result with a larger sea tide, None where no stage takes the tide or there is no result; `sweep`
    the main opening at other crests and widths; `files` every input beside the plan; `findings` all of them in the
    order of the steps.
    """

    plan: Plan
    law: PowerLaw
    submerged_relative_density: float
    records: tuple[GaugeRecord, ...]
    fits: tuple[TideFit, ...]
    flows: tuple[StageFlow, ...]
    places: tuple[PlaceResult, ...]
    raised_sea: RaisedSea | None
    sweep: ClosureSweep
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CalibrationResults:
    """Everything that a calibration found out; `files` holds every input beside the plan."""

    plan: Plan
    calibrated: Calibrated
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...]
