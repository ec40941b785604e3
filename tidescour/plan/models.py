"""The plan file as typed records: every key, its default and its own limits.

Names are those of the keys in the file. What needs more than one key to judge stands in `tidescour.plan.rules`.
"""

from __future__ import annotations

from datetime import datetime
from pathlib import Path
from typing import Annotated, Literal

from pydantic import AwareDatetime, BaseModel, ConfigDict, Field

Side = Literal["sea", "basin"]
SIDES: tuple[Side, Side] = ("sea", "basin")
TideRule = Literal["integral", "flow-mean", "cycle-mean"]
TIDE_RULES: tuple[TideRule, TideRule, TideRule] = ("integral", "flow-mean", "cycle-mean")
Unit = Literal["m", "cm", "mm", "ft"]
Stamp = Literal["instant", "mean-preceding", "mean-centred", "mean-following"]
Quantity = Literal["level", "discharge", "velocity"]

Finite = Annotated[float, Field(allow_inf_nan=False)]
Positive = Annotated[float, Field(gt=0, allow_inf_nan=False)]
NotNegative = Annotated[float, Field(ge=0, allow_inf_nan=False)]
Name = Annotated[str, Field(min_length=1)]
Column = str | Annotated[int, Field(ge=0)]


class PlanModel(BaseModel):
    """A table of the plan: closed, frozen, no silent conversion of text to numbers."""

    model_config = ConfigDict(extra="forbid", frozen=True, populate_by_name=True)


class Site(PlanModel):
    """Where the works are."""

    name: Name
    datum: Name
    latitude_deg: Annotated[float, Field(ge=-90, le=90, allow_inf_nan=False)]


class Water(PlanModel):
    """Water at the bed."""

    temperature_c: Annotated[float, Field(ge=-2, le=40, allow_inf_nan=False)] = 10.0
    salinity_g_kg: Annotated[float, Field(ge=0, le=42, allow_inf_nan=False)] = 30.0


class Clock(PlanModel):
    """How stamps of a file are read; shared by gauge records and given series."""

    time: Column | tuple[Column, Column] = "time"
    time_format: Name = "iso"
    utc_offset: str | None = None
    time_zone: str | None = None
    stamp: Stamp = "instant"
    averaging_s: Positive | None = None
    missing: tuple[Finite, ...] = (-999.0,)
    clock_shift_s: Finite = 0.0


class RecordSource(Clock):
    """The files of one gauge and how they are read (`[records.sea]`, `[records.basin]`)."""

    files: Annotated[tuple[Name, ...], Field(min_length=1)]
    layout: Name = "columns"
    level: Column = "level_m"
    unit: Unit
    positive: Literal["up", "down"] = "up"
    sensor_range_m: tuple[Finite, Finite] | None = None
    shift_m: Finite = 0.0
    exclude: tuple[tuple[AwareDatetime, AwareDatetime], ...] = ()


class Records(PlanModel):
    """The two gauges."""

    sea: RecordSource | None = None
    basin: RecordSource | None = None


class Correction(PlanModel):
    """A dated correction of one gauge, with its evidence in words."""

    side: Side
    start: Annotated[AwareDatetime, Field(alias="from")]
    end: Annotated[AwareDatetime, Field(alias="to")]
    shift_m: Finite = 0.0
    clock_shift_s: Finite = 0.0
    clock_drift_s_per_day: Finite = 0.0
    evidence: Name


class Series(Clock):
    """A given series of levels, discharges or velocities (`[series.NAME]`)."""

    file: Name
    quantity: Quantity
    value: Column = "level_m"
    unit: Literal["m", "cm", "mm", "ft", "m3/s", "m/s"]


class Tide(PlanModel):
    """How the tide is fitted and carried to the calendar of the works."""

    constituents: Literal["auto"] | Annotated[tuple[Name, ...], Field(min_length=1)] = "auto"
    infer: dict[str, tuple[Name, Positive, Finite]] = {}
    sea_constants: Name | None = None
    sea_mean_m: Finite | None = None
    sea_factor: Positive = 1.0
    set_up_m: Finite = 0.0


class Basin(PlanModel):
    """Storage of the basin: wet area by level."""

    level_m: Annotated[tuple[Finite, ...], Field(min_length=1)]
    area_m2: Annotated[tuple[Positive, ...], Field(min_length=1)]
    inflow_m3_s: Finite = 0.0
    start_level_m: Finite | None = None


class Bed(PlanModel):
    """The bed material behind the protection."""

    d50_mm: Positive | None = None
    d90_mm: Positive | None = None
    grain_density_kg_m3: Annotated[float, Field(gt=1100, le=8000, allow_inf_nan=False)] = 2650.0
    shields: Name = "soulsby"
    roughness_d50: Positive = 2.5
    critical_velocity_m_s: Positive | None = None


class PlaceOverride(PlanModel):
    """What one opening has different on one side (`[protection.SIDE.opening.NAME]`); None keeps the side's value."""

    length_m: NotNegative | None = None
    bed_level_m: Finite | None = None
    chezy_m05_s: Positive | None = None
    widening: NotNegative | None = None
    alpha: Positive | None = None
    alpha_basis: TideRule | None = None
    local_velocity_factor: Positive | None = None
    failure_slope_cot: Positive | None = None
    start_depth_m: NotNegative | None = None
    d50_mm: Positive | None = None


class Protection(PlaceOverride):
    """The bed protection on one side, where that side's hole starts."""

    opening: dict[str, PlaceOverride] = {}


class Protections(PlanModel):
    """The bed protection on both sides."""

    sea: Protection = Protection()
    basin: Protection = Protection()


class Scour(PlanModel):
    """The growth law and the rule that brings the tide into it."""

    law: Name = "explicit"
    tide: TideRule = "integral"
    reference_velocity_m_s: Positive | None = None


class Programme(PlanModel):
    """A table of stages instead of `[[stage]]`."""

    file: Name


class Opening(PlanModel):
    """One opening of one stage.

    `parameters` holds the numbers that the table entry of `relation` asks for, such as ``coefficient``; in the file
    they stand beside the other keys.
    """

    name: Name
    crest_level_m: Finite
    crest_level_end_m: Finite | None = None
    width_m: Positive
    width_end_m: Positive | None = None
    side_slope: NotNegative = 0.0
    relation: Name | None = None
    parameters: dict[str, float] = {}
    alpha_sea: Positive | None = None
    alpha_basin: Positive | None = None
    discharge_series: Name | None = None
    end_velocity_series: Name | None = None


class Stage(PlanModel):
    """One closure stage, half-open in time."""

    name: Name
    start: AwareDatetime
    end: AwareDatetime
    sea: Name = "tide"
    basin: Name = "routed"
    opening: Annotated[tuple[Opening, ...], Field(min_length=1)]


class Plan(PlanModel):
    """A whole plan, checked; `folder` is where relative paths start."""

    folder: Path
    file: Path
    site: Site
    water: Water = Water()
    records: Records = Records()
    correction: tuple[Correction, ...] = ()
    series: dict[str, Series] = {}
    tide: Tide = Tide()
    basin: Basin | None = None
    bed: Bed = Bed()
    protection: Protections = Protections()
    scour: Scour = Scour()
    programme: Programme | None = None
    stage: tuple[Stage, ...] = ()


class PlaceBed(PlanModel):
    """The protection and bed of one place: an opening and a side, overrides applied."""

    opening: str
    side: Side
    length_m: NotNegative
    bed_level_m: Finite
    chezy_m05_s: Positive | None
    widening: NotNegative
    alpha: Positive | None
    alpha_basis: TideRule
    local_velocity_factor: Positive
    failure_slope_cot: Positive
    start_depth_m: NotNegative
    d50_mm: Positive | None
