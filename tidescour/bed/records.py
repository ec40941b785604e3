"""Records of what the bed feels at one place during one stage."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding
from tidescour.plan.kinds import Side
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BedHistory:
    """Velocity, depth and disturbance at the end of the protection: one stage, one opening, one side.

    Parameters
    ----------
    stage, opening : str
        Names in the plan.
    side : {"sea", "basin"}
        The side that receives the flow: the flood digs on the basin side, the ebb on the sea side.
    time_s : (n,) array
        The solver's steps, seconds since 1970.
    covered : (n,) bool array
        False inside holes of the records.
    signed_velocity_m_s : (n,) array
        Depth-mean velocity at the end of the protection [m/s], positive towards this side; where negative, the flow
        goes to the other side and this side has none (its magnitude there is that of the flow's direction only, and
        serves to place the zeros).
    depth_m : (n,) array
        Undisturbed water depth h0 at the end of the protection [m].
    alpha : (n,) array
        Disturbance factor; NaN throughout in a row without flow.
    alpha_ref : float
        That of the stage's mean crest; NaN in a row without flow.
    turbulence : (n,) array
        Relative turbulence r0 at the end of the protection that belongs to `alpha`; NaN where that is.
    turbulence_ref : float
        That which belongs to `alpha_ref`.
    critical_velocity_m_s : float
        Depth-mean critical velocity at `reference_depth_m`; NaN in a row without flow on a bed that falls dry.
    reference_depth_m : float
        Time mean of `depth_m` over the covered part of the stage [m].
    protection_length_m : float
        Length that the history was computed for [m].
    submerged_relative_density : float
        rho_s / rho - 1.
    chezy_m05_s : float or None
        Chezy coefficient of the protection, through which alpha and turbulence belong together; None where not known.
    findings : tuple of Finding
        What a reader must know.
    """

    stage: str
    opening: str
    side: Side
    time_s: FloatArray
    covered: NDArray[np.bool_]
    signed_velocity_m_s: FloatArray
    depth_m: FloatArray
    alpha: FloatArray
    alpha_ref: float
    turbulence: FloatArray
    turbulence_ref: float
    critical_velocity_m_s: float
    reference_depth_m: float
    protection_length_m: float
    submerged_relative_density: float
    chezy_m05_s: float | None = None
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in ("time_s", "signed_velocity_m_s", "depth_m", "alpha", "turbulence"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != self.time_s.shape:
                raise ValueError(f"{self.stage}: {key} must be as long as time_s")
        covered = np.array(self.covered, dtype=np.bool_)
        covered.flags.writeable = False
        object.__setattr__(self, "covered", covered)

    @property
    def velocity_m_s(self) -> FloatArray:
        """Velocity towards this side [m/s], 0 while the flow goes to the other."""
        return np.maximum(self.signed_velocity_m_s, 0.0)
