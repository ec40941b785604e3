"""Keys of the bed, its protection, the growth of holes and the stone, as typed records."""

from __future__ import annotations

from typing import Annotated, Final, Literal

from pydantic import Field

from tidescour.plan.kinds import (
    Alpha,
    Filled,
    Finite,
    GrowthFactor,
    HoleSlope,
    Name,
    NotNegative,
    PlanModel,
    Positive,
    Sentence,
    Side,
    SlideSlope,
    TideRule,
    UpToFive,
)

GrainDensity = Annotated[float, Field(gt=1100, le=8000, allow_inf_nan=False)]
Percent = Annotated[float, Field(ge=0, le=100, allow_inf_nan=False)]
Equilibrium = Literal["half-alpha", "turbulence"]


class BedLayer(PlanModel):
    """A layer under the sand at the surface (`[[bed.layer]]`), met when the hole reaches it."""

    name: Name
    """Name. One line of up to 80 printable characters."""
    top_level_m: Finite
    """Top of the layer [m above the datum]."""
    d50_mm: Positive | None = None
    """Median grain size [mm]."""
    critical_velocity_m_s: Positive | None = None
    """Depth-mean critical velocity, given instead of computed [m/s]."""
    critical_velocity_evidence: Sentence | None = None
    """Erosion tests behind a critical velocity of a layer with fines, in words."""
    fines_percent: Percent | None = None
    """Share of silt and clay under 0.063 mm by mass [%]."""


class Bed(PlanModel):
    """The bed material behind the protection."""

    d50_mm: Positive | None = None
    """Median grain size [mm]."""
    d90_mm: Positive | None = None
    """Grain size that 90 % by mass is finer than [mm]."""
    grain_density_kg_m3: GrainDensity = 2650.0
    """Density of the grains [kg/m3]."""
    shields: Filled = "soulsby"
    """Form of the Shields curve."""
    velocity_profile: Filled = "chezy"
    """From the friction velocity to the depth mean."""
    roughness_d50: Annotated[float, Field(gt=0, le=100, allow_inf_nan=False)] = 2.5
    """Bed roughness in the critical velocity over d50; 2 to 3 in use (from memory)."""
    critical_velocity_m_s: Positive | None = None
    """Depth-mean critical velocity, given instead of computed [m/s]."""
    critical_velocity_evidence: Sentence | None = None
    """Erosion tests behind a critical velocity of a bed with fines, in words."""
    fines_percent: Percent | None = None
    """Share of silt and clay under 0.063 mm by mass [%]."""
    layer: tuple[BedLayer, ...] = ()
    """Layers under the surface, from the top down."""


class PlaceOverride(PlanModel):
    """What one opening has different on one side (`[protection.SIDE.opening.NAME]`); None keeps the side's value."""

    length_m: NotNegative | None = None
    """Length from the toe of the sill to the end of the protection [m]."""
    bed_level_m: Finite | None = None
    """Original bed at the end of the protection [m above the datum]."""
    chezy_m05_s: Positive | None = None
    """Chezy coefficient of the protection [m^0.5/s]."""
    spreading: Filled | None = None
    """How the flow spreads over the protection."""
    widening: Annotated[float, Field(ge=0, le=1, allow_inf_nan=False)] | None = None
    """Lateral spreading of the flow, per side and metre of length; 0 is none, 0.125 is 1 in 8."""
    alpha: Alpha | None = None
    """Disturbance factor, given instead of computed; 1.5 to 4.5 in use (from memory)."""
    alpha_lengths_m: Annotated[tuple[Positive, ...], Field(min_length=2)] | None = None
    """Lengths of protection for which the disturbance factor is known, increasing [m]; instead of alpha."""
    alpha_values: Annotated[tuple[Alpha, ...], Field(min_length=2)] | None = None
    """Disturbance factor at each of alpha_lengths_m, not increasing, linear between; 1.5 to 4.5 in use."""
    alpha_basis: TideRule | None = None
    """The tide rule with which the given alpha was found."""
    local_velocity_factor: UpToFive | None = None
    """Local over mean velocity, at dam heads; 1.2 to 1.5 there (from memory)."""
    failure_slope_cot: SlideSlope | None = None
    """Slope 1 in n after a slide; 6 for normally packed, 15 to 20 for loose sand (common practice, no source)."""
    upstream_slope_cot: HoleSlope | None = None
    """Slope 1 in n of the hole towards the protection before a slide, given instead of computed; such as 3."""
    depth_margin_factor: Annotated[float, Field(ge=1, le=5, allow_inf_nan=False)] | None = None
    """Margin: multiplies the final depth in the required length; 1 is no margin, 1.5 half as deep again."""
    start_depth_m: NotNegative | None = None
    """Depth of a hole that is there when the first stage starts [m]."""
    growth_factor: GrowthFactor | None = None
    """Multiplies the depth of the growth law at this place, as found from soundings; 1 is the law as it is."""
    stop_depth_m: Positive | None = None
    """Depth of the hole at which the works stop [m below the original bed]."""
    stop_slope_cot: HoleSlope | None = None
    """Upper slope 1 in n at which the works stop; such as 3."""
    stop_slope_height_m: Positive | None = None
    """Height over which that slope is taken, from the end of the protection down [m]."""
    d50_mm: Positive | None = None
    """Median grain size at this place [mm]."""


class Protection(PlaceOverride):
    """The bed protection on one side, where that side's hole starts."""

    opening: dict[str, PlaceOverride] = Field(default_factory=dict)
    """What single openings have different."""


class Protections(PlanModel):
    """The bed protection on both sides."""

    sea: Protection = Protection()
    """Sea side: its hole is dug by the ebb."""
    basin: Protection = Protection()
    """Basin side: its hole is dug by the flood."""


class Scour(PlanModel):
    """The growth law and the rule that brings the tide into it.

    `curve_points` holds the rows of `curve_file`, which the loader reads: time over t1, depth over water depth.
    """

    law: Filled = "explicit"
    """Growth law."""
    tide: TideRule = "integral"
    """Which of the three tide rules drives the growth."""
    reference_velocity_m_s: Positive | None = None
    """One reference velocity for every row instead of each row's own peak [m/s]."""
    time_constant: Annotated[float, Field(ge=1, le=1e5, allow_inf_nan=False)] | None = None
    """K of the time scale t1 = K h0^2 Delta^1.7 / (alpha u - u_c)^4.3 [h m^2.3 s^-4.3], instead of 330."""
    time_exponent: Annotated[float, Field(gt=0, lt=1, allow_inf_nan=False)] | None = None
    """Exponent of the time in the laws with a time scale, instead of 0.4; 0.34 to 0.40 in use (from memory)."""
    equilibrium: Equilibrium = "half-alpha"
    """Equilibrium depth of the saturating law: (0.5 alpha u - u_c) / u_c or ((1 + 3 r0) u - u_c) / u_c times h0."""
    curve_file: Filled | None = None
    """Table of a physical model with the columns time_over_t1 and depth_over_water_depth."""
    curve_source: Sentence | None = None
    """Which physical model the curve comes from, in words."""
    curve_points: tuple[tuple[float, float], ...] = ()
    """Time over t1 and depth over water depth."""


class Stone(PlanModel):
    """Numbers of the screening of stone sizes; what is left out has the default of its formula."""

    density_kg_m3: GrainDensity = 2650.0
    """Density of the stone [kg/m3]."""
    shields: Annotated[float, Field(gt=0, le=0.2, allow_inf_nan=False)] | None = None
    """Shields parameter that the stone may reach; left out, 0.03 in the Shields form and 0.035 in Pilarczyk's."""
    stability_factor: UpToFive = 0.75
    """Factor phi of the Pilarczyk form on the crest and the slope: 0.75 for a continuous layer."""
    edge_stability_factor: UpToFive = 1.5
    """The same at the end of the protection: 1.0 to 1.5 for edges and transitions."""
    slope_factor: Annotated[float, Field(gt=0, le=1, allow_inf_nan=False)] = 1.0
    """Factor k_sl of the Pilarczyk form on the downstream slope; under 1 where that is steep."""


class Grading(PlanModel):
    """One layer of a closed filter (`[[filter]]`), the bed first, then each layer upward."""

    name: Name
    """Name. One line of up to 80 printable characters."""
    d10_mm: Positive | None = None
    """Grain size that 10 % by mass is finer than [mm]."""
    d15_mm: Positive
    """Grain size that 15 % by mass is finer than [mm]."""
    d60_mm: Positive | None = None
    """Grain size that 60 % by mass is finer than [mm]."""
    d85_mm: Positive
    """Grain size that 85 % by mass is finer than [mm]."""


class PlaceBed(PlanModel):
    """The protection and bed of one place: an opening and a side, overrides applied.

    `own_d50` tells that `d50_mm` is given for the place itself and is not the grain of `[bed]`.
    """

    opening: str
    side: Side
    length_m: NotNegative
    bed_level_m: Finite
    chezy_m05_s: Positive | None
    spreading: str = "none"
    widening: NotNegative
    alpha: Positive | None
    alpha_lengths_m: tuple[float, ...] = ()
    alpha_values: tuple[float, ...] = ()
    alpha_basis: TideRule
    local_velocity_factor: Positive
    failure_slope_cot: Positive
    upstream_slope_cot: Positive | None = None
    depth_margin_factor: float = 1.0
    start_depth_m: NotNegative
    growth_factor: Positive = 1.0
    stop_depth_m: Positive | None = None
    stop_slope_cot: Positive | None = None
    stop_slope_height_m: Positive | None = None
    d50_mm: Positive | None
    own_d50: bool = False


DEFAULT_TIME_CONSTANT: Final = 330.0
DEFAULT_TIME_EXPONENT: Final = 0.4
SATURATING: Final = "saturating"
MODEL_CURVE: Final = "model-curve"
LAWS_WITH_TIME_SCALE: Final = ("time-scale", SATURATING, MODEL_CURVE)
MOST_FINES_OF_SAND: Final = 10.0
"""Share of fines [%] over which a soil may be cohesive (from memory)."""
