"""Records of a tide: constants, and a fit with what it rests on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tidescour.errors import Finding
from tidescour.plan.kinds import Side
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TideConstants:
    """Harmonic constants of one place: all that a prediction needs.

    Parameters
    ----------
    constituents : tuple of str
        Names as the tide library knows them, such as ``M2``; no two alike.
    amplitude_m : (n,) array
        Amplitudes [m], not negative.
    phase_deg : (n,) array
        Greenwich phase lags [degrees], 0 to 360.
    mean_m : float
        Mean level above the site datum [m].
    latitude_deg : float
        Latitude, for the nodal corrections [degrees].
    """

    constituents: tuple[str, ...]
    amplitude_m: FloatArray
    phase_deg: FloatArray
    mean_m: float
    latitude_deg: float

    def __post_init__(self) -> None:
        """Check shapes and ranges; keep read-only copies."""
        object.__setattr__(self, "amplitude_m", read_only(self.amplitude_m))
        object.__setattr__(self, "phase_deg", read_only(self.phase_deg))
        if not self.amplitude_m.shape == self.phase_deg.shape == (len(self.constituents),):
            raise ValueError("constituents, amplitude_m and phase_deg must have one length")
        if len(set(self.constituents)) != len(self.constituents):
            raise ValueError("a constituent stands twice")
        if np.any(~np.isfinite(self.amplitude_m)) or np.any(self.amplitude_m < 0.0):
            raise ValueError("amplitudes must be finite and not negative")
        if np.any(~np.isfinite(self.phase_deg)):
            raise ValueError("phases must be finite")
        if not (np.isfinite(self.mean_m) and -90.0 <= self.latitude_deg <= 90.0):
            raise ValueError("the mean must be finite and the latitude within -90 to 90 degrees")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TideFit:
    """Constants of one side and what they rest on.

    Parameters
    ----------
    side : {"sea", "basin"}
        Which gauge, or which side a table of constants stands for.
    constants : TideConstants
        The result.
    source : {"record", "table"}
        Fitted to a record, or read from a table of constants.
    start_s, end_s : float
        First and last good sample of the fit, seconds since 1970; NaN for a table.
    samples : int
        Good samples in the fit; 0 for a table.
    explained_share : float
        Share of the variance of the record that the tide explains; NaN for a table.
    residual_std_m : float
        Standard deviation of what is left [m]; NaN for a table.
    choice : str
        In words, how the constituents were chosen and which were left out.
    findings : tuple of Finding
        What a reader must know.
    """

    side: Side
    constants: TideConstants
    source: str
    start_s: float
    end_s: float
    samples: int
    explained_share: float
    residual_std_m: float
    choice: str
    findings: tuple[Finding, ...] = ()
