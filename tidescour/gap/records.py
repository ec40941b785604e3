"""Records of the water: the levels of a stage and the flow through its openings."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class OpeningFlow:
    """What runs through one opening of a stage, on the solver's steps.

    Parameters
    ----------
    name : str
        Name of the opening.
    level_sea_m : (n,) array
        Sea level that it meets [m above datum]: the stage's, or one of its own.
    crest_level_m, width_m : (n,) array
        Crest [m above datum] and width at the crest [m] at each step.
    discharge_m3_s : (n,) array
        Positive from sea to basin; NaN throughout where the end velocity is given.
    gap_velocity_m_s : (n,) array
        Velocity in the control section, positive from sea to basin; NaN throughout where the end velocity is given.
    flow_width_m : (n,) array
        Mean width of the control section, area over depth [m]; NaN where dry or not computed.
    given_end_velocity_m_s : (n,) array or None
        Velocity at the end of the protection, positive from sea to basin, where the plan gives it.
    given : bool
        Discharge or velocity comes from a series of the plan, so that its own turns cut the cycles.
    """

    name: str
    level_sea_m: FloatArray
    crest_level_m: FloatArray
    width_m: FloatArray
    discharge_m3_s: FloatArray
    gap_velocity_m_s: FloatArray
    flow_width_m: FloatArray
    given_end_velocity_m_s: FloatArray | None = None
    given: bool = False

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in ("level_sea_m", "crest_level_m", "width_m", "discharge_m3_s", "gap_velocity_m_s", "flow_width_m"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != self.level_sea_m.shape:
                raise ValueError(f"{key} has another shape than level_sea_m")
        if self.given_end_velocity_m_s is not None:
            object.__setattr__(self, "given_end_velocity_m_s", read_only(self.given_end_velocity_m_s))

    @property
    def signed_flow(self) -> FloatArray:
        """The series whose sign tells the direction: the given velocity, else the discharge."""
        return self.discharge_m3_s if self.given_end_velocity_m_s is None else self.given_end_velocity_m_s


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StageFlow:
    """Levels and flows of one stage, on the solver's steps from start to end, both included.

    Parameters
    ----------
    stage : str
        Name of the stage.
    time_s : (n,) array
        Seconds since 1970, increasing, evenly stepped.
    level_sea_m, level_basin_m : (n,) array
        Levels [m above datum]; finite, also in holes (bridged there for the routing only, or linear).
    covered : (n,) bool array
        False inside holes of the records: what happens there counts for nothing. Covered stretches begin and end on
        steps.
    measured : bool
        A measured level enters, so that turns must be told from noise.
    routed : bool
        The basin level was computed from storage.
    openings : tuple of OpeningFlow
        In the order of the plan.
    side_openings : tuple of OpeningFlow
        Permanent openings beside the gap, where no scour is computed.
    inflow_m3_s : (n,) array
        What runs into the basin by other ways than openings [m3/s].
    findings : tuple of Finding
        What a reader must know.
    """

    stage: str
    time_s: FloatArray
    level_sea_m: FloatArray
    level_basin_m: FloatArray
    covered: NDArray[np.bool_]
    measured: bool
    routed: bool
    openings: tuple[OpeningFlow, ...]
    side_openings: tuple[OpeningFlow, ...] = ()
    inflow_m3_s: FloatArray
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes and finiteness; keep read-only copies."""
        for key in ("time_s", "level_sea_m", "level_basin_m", "inflow_m3_s"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != self.time_s.shape or not np.all(np.isfinite(getattr(self, key))):
                raise ValueError(f"{self.stage}: {key} must be finite and as long as time_s")
        covered = np.array(self.covered, dtype=np.bool_)
        covered.flags.writeable = False
        object.__setattr__(self, "covered", covered)
        if covered.shape != self.time_s.shape:
            raise ValueError(f"{self.stage}: covered must be as long as time_s")
        if any(opening.crest_level_m.shape != self.time_s.shape for opening in self.openings):
            raise ValueError(f"{self.stage}: an opening has another length than time_s")

    @property
    def head_m(self) -> FloatArray:
        """Sea level minus basin level [m]."""
        return self.level_sea_m - self.level_basin_m
