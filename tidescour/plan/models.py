"""The plan file as typed records: every key, its default and its own limits.

Names are those of the keys in the file; the line under a key is what it means, in the schema and in messages too.
What needs more than one key to judge stands in `tidescour.plan.rules`.
"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

from pydantic import AwareDatetime, Field

from tidescour.plan.kinds import (
    TIME_FORMAT_PATTERN,
    Alpha,
    ClockDrift,
    ClockShift,
    Filled,
    Finite,
    LevelShift,
    Name,
    NotNegative,
    Offset,
    PlanModel,
    Positive,
    SeaLag,
    Sentence,
    Side,
    TimeZone,
)
from tidescour.plan.models_bed import Bed, Grading, Protections, Scour, Stone
from tidescour.plan.models_calibration import CalibrationSpan, Discharge
from tidescour.plan.models_survey import LoadCase, Sounding, Soundings

Unit = Literal["m", "cm", "mm", "ft"]
Stamp = Literal["instant", "mean-preceding", "mean-centred", "mean-following"]
Quantity = Literal["level", "discharge", "velocity"]

Column = Filled | Annotated[int, Field(ge=0)]


class Site(PlanModel):
    """Where the works are."""

    name: Name
    """Name of the gap. One line of up to 80 printable characters."""
    datum: Name
    """Name of the site datum that all levels refer to, printed on every level axis. One line, up to 80 characters."""
    latitude_deg: Annotated[float, Field(ge=-90, le=90, allow_inf_nan=False)]
    """Latitude, positive north [degrees]."""


class Water(PlanModel):
    """Water at the bed."""

    temperature_c: Annotated[float, Field(ge=-2, le=40, allow_inf_nan=False)] = 10.0
    """Temperature [degrees Celsius]."""
    salinity_g_kg: Annotated[float, Field(ge=0, le=42, allow_inf_nan=False)] = 30.0
    """Salinity [g/kg]."""


class Clock(PlanModel):
    """How stamps of a file are read; shared by gauge records and given series."""

    time: Column | tuple[Column, Column] = "time"
    """Column of the stamps: name or number from 0; a list of two where date and time stand apart."""
    time_format: Annotated[str, Field(pattern=TIME_FORMAT_PATTERN)] = "iso"
    """How stamps are written: iso, excel, or a strptime format such as %d-%m-%Y %H:%M."""
    utc_offset: Offset | None = None
    """Fixed offset of the clock from UTC, such as +01:00; left out where every stamp carries its own."""
    time_zone: TimeZone | None = None
    """Legal time of the clock, such as Europe/Amsterdam; instead of utc_offset."""
    stamp: Stamp = "instant"
    """What a stamp stands for: an instant, or the end, middle or start of a mean."""
    averaging_s: Positive | None = None
    """Length of the mean [s]."""
    missing: tuple[Finite, ...] = (-999.0,)
    """Raw values that mean: nothing measured."""
    clock_shift_s: ClockShift = 0.0
    """Added to every stamp [s]."""


class RecordSource(Clock):
    """The files of one gauge and how they are read (`[records.sea]`, `[records.basin]`)."""

    files: Annotated[tuple[Filled, ...], Field(min_length=1)]
    """Paths or patterns such as sea_*.csv, relative to the plan; several files are joined."""
    layout: Filled = "columns"
    """Layout of the files."""
    level: Column = "level_m"
    """Column of the level: name or number from 0."""
    unit: Unit
    """Unit of the level in the files."""
    positive: Literal["up", "down"] = "up"
    """down for a reading of the depth to the water."""
    sensor_range_m: tuple[Finite, Finite] | None = None
    """Lowest and highest level that the sensor can read [m], before the shift."""
    shift_m: LevelShift = 0.0
    """Added to reach the site datum [m]."""
    exclude: tuple[tuple[AwareDatetime, AwareDatetime], ...] = ()
    """Spells that are not used: a list of [from, to]."""


class Records(PlanModel):
    """The two gauges."""

    sea: RecordSource | None = None
    """The gauge at sea."""
    basin: RecordSource | None = None
    """The gauge in the basin."""


class Correction(PlanModel):
    """A dated correction of one gauge, with its evidence in words."""

    side: Side
    """Which gauge."""
    start: Annotated[AwareDatetime, Field(alias="from")]
    """First stamp as read that is corrected."""
    end: Annotated[AwareDatetime, Field(alias="to")]
    """First stamp as read that is no longer corrected."""
    shift_m: LevelShift = 0.0
    """Added to the level [m]."""
    clock_shift_s: ClockShift = 0.0
    """Added to the stamps [s]."""
    clock_drift_s_per_day: ClockDrift = 0.0
    """Added to the stamps for each day since from [s/day]."""
    evidence: Sentence
    """Why, in words: who or what showed it. One line of up to 500 printable characters."""


class Series(Clock):
    """A given series of levels, discharges or velocities (`[series.NAME]`, one line of up to 80 characters)."""

    file: Filled
    """Path relative to the plan."""
    quantity: Quantity
    """level, discharge (positive flood) or velocity (at the end of the protection, positive flood)."""
    value: Column = "level_m"
    """Column of the values: name or number from 0."""
    unit: Literal["m", "cm", "mm", "ft", "m3/s", "m/s"]
    """Unit of the values in the file."""


class Tide(PlanModel):
    """How the tide is fitted and carried to the calendar of the works."""

    constituents: Literal["auto"] | Annotated[tuple[Filled, ...], Field(min_length=1)] = "auto"
    """auto, or a list of constituents."""
    infer: dict[str, tuple[Filled, Positive, Finite]] = Field(default_factory=dict)
    """Inferred constituents: K2 = ["S2", amplitude ratio, phase of S2 minus phase of K2 in degrees]."""
    sea_constants: Filled | None = None
    """Table of constants instead of a sea record: constituent, amplitude_m, phase_deg (Greenwich)."""
    sea_mean_m: Finite | None = None
    """Mean sea level that goes with sea_constants [m above the datum]."""
    sea_factor: Positive = 1.0
    """Multiplies the predicted sea tide about its mean."""
    set_up_m: Finite = 0.0
    """Added to the predicted sea level [m]."""


class Programme(PlanModel):
    """A table of stages instead of `[[stage]]`."""

    file: Filled
    """Path relative to the plan, .csv or .xlsx; one row a stage and opening."""


class Opening(PlanModel):
    """One opening: of a stage, beside the gap (`[[basin.side_opening]]`) or of a calibration.

    `parameters` holds the numbers of its `relation` that were written, such as ``coefficient``; in the file they stand
    beside the other keys. `profile_points` holds the open part of the surveyed `profile`, (distance, level) in m, empty
    without one; the loader reads it from the file, and the lowest of its levels is the crest where none was written.
    """

    name: Name
    """Name; the same name from stage to stage is the same place. One line of up to 80 printable characters."""
    profile: Filled | None = None
    """Surveyed profile across the gap, a table with the columns distance_m and level_m; instead of a width."""
    profile_from_m: Finite | None = None
    """Distance in the profile from which it is open [m]; left out, from its first point."""
    profile_to_m: Finite | None = None
    """Distance in the profile up to which it is open [m]; left out, to its last point."""
    profile_points: tuple[tuple[float, float], ...] = ()
    """Distance and level of the open part of the profile [m]."""
    crest_level_m: Finite
    """Crest at the start of the stage [m above the datum]; with a profile, the lowest point where it is left out."""
    crest_level_end_m: Finite | None = None
    """Crest at the end of the stage, linear in time between [m above the datum]."""
    width_m: Positive | None = None
    """Width at crest level at the start of the stage [m]; needed without a profile."""
    width_end_m: Positive | None = None
    """Width at crest level at the end of the stage, linear in time between [m]."""
    side_slope: NotNegative = 0.0
    """Slope of both sides, horizontal per vertical."""
    relation: Filled | None = None
    """Discharge relation."""
    parameters: dict[str, float] = Field(default_factory=dict)
    """Numbers of the relation."""
    sea_lag_s: SeaLag = 0.0
    """How much later the sea tide is at this opening than at sea [s]."""
    sea_factor: Positive = 1.0
    """Multiplies the sea level at this opening about its mean."""
    sea_shift_m: LevelShift = 0.0
    """Added to the sea level at this opening [m]."""
    flow_length_m: Positive | None = None
    """Length along the flow over which the water is speeded up, for the check of its inertia [m]."""
    alpha_sea: Alpha | None = None
    """Disturbance factor on the sea side in this stage, before protection.sea.alpha; 1.5 to 4.5 in use."""
    alpha_basin: Alpha | None = None
    """Disturbance factor on the basin side in this stage, before protection.basin.alpha; 1.5 to 4.5 in use."""
    discharge_series: Filled | None = None
    """Series of given discharge, instead of a relation."""
    end_velocity_series: Filled | None = None
    """Series of given velocity at the end of the protection, instead of a relation."""


class Inflow(PlanModel):
    """Water that runs into the basin by another way than an opening: a river, a pumping station."""

    name: Name
    """Name. One line of up to 80 printable characters."""
    discharge_m3_s: Finite | None = None
    """Steady discharge, positive into the basin [m3/s]."""
    series: Filled | None = None
    """Series of discharge, positive into the basin, instead of a steady one."""


class Basin(PlanModel):
    """Storage of the basin, and the water that runs in and out of it besides the gap.

    One of `area_m2` and `volume_m3` goes with `level_m`, the other is empty; the loader fills them from a `table`.
    """

    level_m: Annotated[tuple[Finite, ...], Field(min_length=1)] = ()
    """Levels, increasing [m above the datum]."""
    area_m2: Annotated[tuple[Positive, ...], Field(min_length=1)] = ()
    """Wet area at each level [m2], not decreasing."""
    volume_m3: Annotated[tuple[Finite, ...], Field(min_length=2)] = ()
    """Stored volume at each level [m3], increasing; instead of area_m2."""
    table: Filled | None = None
    """Table with the columns level_m and area_m2 or volume_m3; instead of the lists."""
    table_column: Literal["area_m2", "volume_m3"] | None = None
    """Which column of the table is taken; left out, area_m2 where the table has it, else volume_m3."""
    inflow_m3_s: Finite = 0.0
    """Steady inflow other than through the gap, such as a river [m3/s]."""
    start_level_m: Finite | None = None
    """Level at the start of the first stage [m above the datum], only where the start cannot be forgotten."""
    length_m: Positive | None = None
    """Length of the basin along the tide, for the check that its level is the same everywhere [m]."""
    depth_m: Positive | None = None
    """Mean depth of the basin, for the same check [m]."""
    inflow: tuple[Inflow, ...] = ()
    """Inflows by name, added to inflow_m3_s."""
    side_opening: tuple[Opening, ...] = ()
    """Permanent openings beside the gap, through which water runs in every routed stage; no scour is computed there."""


class StageSpan(PlanModel):
    """What a stage has besides its openings."""

    name: Name
    """Name of the stage. One line of up to 80 printable characters."""
    start: AwareDatetime
    """Start, with an offset from UTC."""
    end: AwareDatetime
    """End, with an offset from UTC; not in the stage itself."""
    sea: Filled = "tide"
    """Sea level: tide, measured, or the name of a level series."""
    basin: Filled = "routed"
    """Basin level: routed, measured, tide, or the name of a level series."""
    planned_start: AwareDatetime | None = None
    """Start that was planned, where the stage came at another time; for comparison only."""
    planned_end: AwareDatetime | None = None
    """End that was planned, for the same comparison."""


class Stage(StageSpan):
    """One closure stage, half-open in time."""

    opening: Annotated[tuple[Opening, ...], Field(min_length=1)]
    """The openings that water runs through in this stage."""


class Calibration(CalibrationSpan):
    """The gap as it was while both gauges were there, and what is to be estimated from their records."""

    opening: Annotated[tuple[Opening, ...], Field(min_length=1)]
    """The openings that water ran through then."""


class Plan(PlanModel):
    """A whole plan, checked; `folder` is where relative paths start.

    `sounding_faults` tells, with file and line, what a comparison with soundings would refuse the plan for; empty where
    that is what it was read for.
    """

    folder: Path
    file: Path
    sounding_faults: tuple[str, ...] = ()
    site: Site
    water: Water = Water()
    records: Records = Records()
    correction: tuple[Correction, ...] = ()
    series: dict[str, Series] = Field(default_factory=dict)
    tide: Tide = Tide()
    basin: Basin | None = None
    bed: Bed = Bed()
    protection: Protections = Protections()
    scour: Scour = Scour()
    programme: Programme | None = None
    stage: tuple[Stage, ...] = ()
    calibration: Calibration | None = None
    discharge: tuple[Discharge, ...] = ()
    soundings: Soundings = Soundings()
    sounding: tuple[Sounding, ...] = ()
    load_case: tuple[LoadCase, ...] = ()
    stone: Stone = Stone()
    filter: tuple[Grading, ...] = ()
