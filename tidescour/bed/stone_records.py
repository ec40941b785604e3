"""Records of the screening of stone and filters: what loads a stone, the sizes it asks for, the ratios of a filter."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from tidescour.errors import DomainError, Finding

Direction = Literal["flood", "ebb"]
Location = Literal["crest", "downstream slope", "end of protection"]
LOCATIONS: tuple[Location, Location, Location] = ("crest", "downstream slope", "end of protection")

Verdict = Literal["yes", "between the limits in use", "no", "not known"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StoneDemand:
    """What a stability form needs to know; NaN where a number is not known.

    Parameters
    ----------
    velocity_m_s : float
        Velocity at the stone [m/s], not negative.
    depth_m : float
        Water depth over the stone [m], positive.
    turbulence_factor : float
        K_T, by which turbulence raises the velocity; its square is k_t^2.
    relative_density : float
        Density of the stone over that of the water, less 1; positive.
    shields : float or None
        Shields parameter that the stone may reach; None for that of each form.
    stability_factor, slope_factor : float
        phi and k_sl of the Pilarczyk form, positive.
    """

    velocity_m_s: float
    depth_m: float
    turbulence_factor: float
    relative_density: float
    shields: float | None
    stability_factor: float
    slope_factor: float

    def __post_init__(self) -> None:
        """Refuse what no form can take.

        Raises
        ------
        DomainError
            If the velocity is negative, or another number not positive.
        """
        if self.velocity_m_s < 0.0:
            raise DomainError(f"velocity_m_s = {self.velocity_m_s:g} must not be negative: give its magnitude")
        for name in ("depth_m", "turbulence_factor", "relative_density", "shields", "stability_factor", "slope_factor"):
            value = getattr(self, name)
            if value is not None and value <= 0.0:
                raise DomainError(f"{name} = {value:g} must be positive")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StoneLoad:
    """What loads the stone at one location: a stage, an opening and a direction of flow, when it is fastest.

    Parameters
    ----------
    stage, opening : str
        Names in the plan.
    direction : {"flood", "ebb"}
        Where the water runs: from sea to basin or back.
    location : {"crest", "downstream slope", "end of protection"}
        Where the stone lies; the slope and the end are those of the side that receives the flow.
    time_s : float
        When the velocity there is highest, seconds since 1970.
    velocity_m_s : float
        Highest velocity there [m/s].
    head_m : float
        Upstream less downstream level then [m]; negative where a given discharge runs against it.
    unit_discharge_m2_s : float
        Discharge per metre of width then [m2/s].
    depth_m : float
        Water over the stone then [m].
    turbulence_factor : float
        K_T that is assumed; NaN where the turbulence is not known.
    assumption : str
        Where velocity, depth and K_T come from, in words.
    """

    stage: str
    opening: str
    direction: Direction
    location: Location
    time_s: float
    velocity_m_s: float
    head_m: float
    unit_discharge_m2_s: float
    depth_m: float
    turbulence_factor: float
    assumption: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StoneSize:
    """The sizes that one load asks for [m], in the order of `STABILITY`; NaN where a form has none."""

    load: StoneLoad
    demand: StoneDemand
    size_m: tuple[float, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StoneScreening:
    """Stone sizes of a whole programme, and what a reader must know beside them."""

    sizes: tuple[StoneSize, ...]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FilterCheck:
    """One rule for one layer of a closed filter.

    Parameters
    ----------
    layer, under : str
        The layer and the one under it; `under` is empty where the rule looks at the layer alone.
    rule : str
        Name in the table of filter rules.
    ratio : float
        What the rule compares; NaN where a grain size is not given.
    limit, other_limit : float
        The strict limit, and the other one in use; one and the same where there is one.
    holds : {"yes", "between the limits in use", "no", "not known"}
        Whether the ratio keeps to the limits.
    """

    layer: str
    under: str
    rule: str
    ratio: float
    limit: float
    other_limit: float
    holds: Verdict


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FilterScreening:
    """The checks of a filter, layer by layer upward, and what a reader must know beside them."""

    checks: tuple[FilterCheck, ...]
    findings: tuple[Finding, ...]
