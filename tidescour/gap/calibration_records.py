"""Records of the calibration: what was measured, what a basin model says of it, and what was estimated."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding
from tidescour.units import BoolArray, FloatArray, read_only

CALIBRATED = ("coefficient", "area_factor", "datum_offset_m")
"""What can be estimated: the first two are positive and are fitted by their logarithms."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Simulated:
    """What a basin model says at the instants of the evidence.

    Parameters
    ----------
    level_m : (n,) array
        Basin level on the datum of the basin record [m]: the routed level less the offset of the datum; finite.
    discharge_m3_s : (k,) array
        Discharge at the instants and openings of the measured ones, positive from sea to basin; finite.
    """

    level_m: FloatArray
    discharge_m3_s: FloatArray


Simulate = Callable[[FloatArray], Simulated]
"""From the parameters, as they are (not their logarithms), in the order of the names, to what the model says."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Evidence:
    """What was measured in and at the gap.

    Parameters
    ----------
    level_time_s, level_m : (n,) array
        Recorded basin levels [m, datum of the basin record]; instants increasing, irregular or with holes; NaN where
        there is none.
    discharge_time_s, discharge_m3_s, standard_error_m3_s : (k,) array
        Measured discharges, positive from sea to basin, and their standard errors, positive; finite; k may be 0. The
        standard errors are taken as independent of each other.
    discharge_opening : (k,) array of int
        Which opening each belongs to, as the basin model counts them.
    """

    level_time_s: FloatArray
    level_m: FloatArray
    discharge_time_s: FloatArray
    discharge_m3_s: FloatArray
    standard_error_m3_s: FloatArray
    discharge_opening: NDArray[np.int64]

    def __post_init__(self) -> None:
        """Check shapes, order and signs; keep read-only copies."""
        for key in ("level_time_s", "level_m", "discharge_time_s", "discharge_m3_s", "standard_error_m3_s"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
        opening = np.array(self.discharge_opening, dtype=np.int64)
        opening.flags.writeable = False
        object.__setattr__(self, "discharge_opening", opening)
        if self.level_time_s.ndim != 1 or self.level_time_s.shape != self.level_m.shape:
            raise ValueError("level_time_s and level_m must be two rows of one length")
        if not np.all(np.diff(self.level_time_s) > 0.0):
            raise ValueError("level_time_s must increase")
        rows = (self.discharge_time_s, self.discharge_m3_s, self.standard_error_m3_s, opening)
        if any(row.shape != (self.discharge_time_s.size,) for row in rows):
            raise ValueError("the rows of the discharges must have one length")
        if not all(np.all(np.isfinite(row)) for row in rows) or not np.all(self.standard_error_m3_s > 0.0):
            raise ValueError("discharges must be finite and their standard errors positive")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Interval:
    """An estimate and the ends of its 95 % interval."""

    estimate: float
    ci95_low: float
    ci95_high: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Estimate:
    """What the evidence says of the parameters.

    Parameters
    ----------
    names : tuple of str
        The p parameters, out of `CALIBRATED`.
    estimate, ci95_low, ci95_high : (p,) array
        Values and the ends of their 95 % intervals; 0 and infinite where the evidence sets no bound.
    determined : (p,) bool array
        Whether the interval is narrow enough for the number to be used.
    covariance, correlation : (p, p) array
        Of the fitted numbers: logarithms of coefficient and area factor, the offset as it is [m].
    ratio : Interval or None
        Coefficient over area factor, where both were fitted.
    residual_std_m, residual_correlation_time_h : float
        Standard deviation of recorded less simulated levels, and the integral of its autocorrelation over time once
        what repeats with the tide is taken out.
    level_count : int
        Levels that were used, after thinning.
    effective_count : float
        How many independent values they are worth: their time over twice the correlation time, at most `level_count`.
    noise_order : int
        Order of the autoregressive model of the residuals.
    discharge_count : int
        Measured discharges.
    chi_square : float
        Sum of squares of the residuals of the discharges over their standard errors; NaN without any.
    discharge_widening : float
        Factor by which standard errors of the discharges were widened, at least 1.
    tidal_excess : float
        Factor, at least 1, by which the mean square of the residuals of the levels at tidal periods exceeds the noise
        model, whose variance was raised by it.
    level_signal, discharge_signal : (p,) array
        Change of the simulated levels and discharges (root mean square) for 10 % more, or 0.1 m, over the noise;
        discharges NaN without any.
    findings : tuple of Finding
        What a reader must know.
    """

    names: tuple[str, ...]
    estimate: FloatArray
    ci95_low: FloatArray
    ci95_high: FloatArray
    determined: BoolArray
    covariance: FloatArray
    correlation: FloatArray
    ratio: Interval | None
    residual_std_m: float
    residual_correlation_time_h: float
    level_count: int
    effective_count: float
    noise_order: int
    discharge_count: int
    chi_square: float
    discharge_widening: float
    tidal_excess: float
    level_signal: FloatArray
    discharge_signal: FloatArray
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        count = len(self.names)
        for key in ("estimate", "ci95_low", "ci95_high", "level_signal", "discharge_signal"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != (count,):
                raise ValueError(f"{key} must have one value for each of {', '.join(self.names)}")
        for key in ("covariance", "correlation"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != (count, count):
                raise ValueError(f"{key} must be square, a row for each of {', '.join(self.names)}")
        determined = np.array(self.determined, dtype=np.bool_)
        determined.flags.writeable = False
        object.__setattr__(self, "determined", determined)
