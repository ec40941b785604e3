"""Predicted basin levels against those held back, and the guess that needs no basin model: a + b sea(t - lag)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.optimize import minimize_scalar

from tidescour.errors import DomainError, FitError
from tidescour.gap.levels import LONGEST_INTERPOLATED_S, splined
from tidescour.units import M2_PERIOD_H, SECONDS_PER_HOUR, FloatArray

M2_PERIOD_S = M2_PERIOD_H * SECONDS_PER_HOUR
FULL_TIDE = 0.9
LAGS_S = np.arange(-3600.0, 5.0 * SECONDS_PER_HOUR + 1.0, 600.0)
LAG_TOLERANCE_S = 0.1
FEWEST_LEVELS = 20


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LevelScore:
    """How well a predicted level meets the recorded one; all are predicted less recorded.

    Parameters
    ----------
    count : int
        Instants at which both are known.
    rms_m, bias_m : float
        Root mean square and mean of the difference.
    range_error_m : float
        Mean over whole tides of highest less lowest level; NaN without a whole tide.
    phase_error_s : float
        How much later the M2 tide stands in the prediction; NaN without a tide of record.
    """

    count: int
    rms_m: float
    bias_m: float
    range_error_m: float
    phase_error_s: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LaggedSea:
    """The guess basin = level_m + factor x sea(t - lag_s), with the rms of what it leaves [m]."""

    level_m: float
    factor: float
    lag_s: float
    rms_m: float


def _range_error(time_s: FloatArray, predicted_m: FloatArray, recorded_m: FloatArray) -> float:
    """Return the mean difference of the ranges over tides of which 90 % is known."""
    tide = np.floor((time_s - time_s[0]) / M2_PERIOD_S).astype(np.int64)
    covered_s = np.minimum(np.diff(time_s, append=time_s[-1]), LONGEST_INTERPOLATED_S)
    errors = [
        np.ptp(predicted_m[tide == number]) - np.ptp(recorded_m[tide == number])
        for number in np.unique(tide)
        if covered_s[tide == number].sum() >= FULL_TIDE * M2_PERIOD_S
    ]
    return float(np.mean(errors)) if errors else float("nan")


def _phase_error(time_s: FloatArray, predicted_m: FloatArray, recorded_m: FloatArray) -> float:
    """Return the lag of the predicted M2 tide behind the recorded one, fitted at the same instants [s]."""
    if time_s[-1] - time_s[0] < M2_PERIOD_S:
        return float("nan")
    angles = 2.0 * np.pi * (time_s - time_s[0]) / M2_PERIOD_S
    waves = [np.ones_like(angles)] + [
        wave for order in (1, 2) for wave in (np.cos(order * angles), np.sin(order * angles))
    ]
    fitted = np.linalg.lstsq(np.stack(waves, axis=1), np.stack((predicted_m, recorded_m), axis=1), rcond=None)[0]
    predicted, recorded = fitted[1] - 1j * fitted[2]
    return float(-np.angle(predicted * np.conj(recorded)) / (2.0 * np.pi) * M2_PERIOD_S)


def level_score(time_s: FloatArray, predicted_m: FloatArray, recorded_m: FloatArray) -> LevelScore:
    """Return how a predicted level compares with a record.

    Parameters
    ----------
    time_s : (n,) array
        Instants, increasing [s].
    predicted_m, recorded_m : (n,) array
        Levels on one datum [m]; NaN in either leaves the instant out.

    Raises
    ------
    DomainError
        If shapes differ, or less than two instants have both.

    References
    ----------
    Definitions of rms, bias, range and phase: common practice, no source.
    """
    if not time_s.shape == predicted_m.shape == recorded_m.shape:
        raise DomainError("score of a level: time, prediction and record must have one length")
    known = np.isfinite(predicted_m) & np.isfinite(recorded_m)
    if np.count_nonzero(known) < 2:
        raise DomainError("score of a level: prediction and record share less than two instants")
    times, predicted, recorded = time_s[known], predicted_m[known], recorded_m[known]
    difference = predicted - recorded
    return LevelScore(
        count=times.size,
        rms_m=float(np.sqrt(np.mean(difference**2))),
        bias_m=float(difference.mean()),
        range_error_m=_range_error(times, predicted, recorded),
        phase_error_s=_phase_error(times, predicted, recorded),
    )


def _fitted(shifted_m: FloatArray, level_m: FloatArray) -> tuple[float, float, float]:
    """Return level, factor and mean square of what is left, over the instants that have both."""
    known = np.isfinite(shifted_m) & np.isfinite(level_m)
    if np.count_nonzero(known) < FEWEST_LEVELS:
        return float("nan"), float("nan"), np.inf
    sea, basin = shifted_m[known], level_m[known]
    away = sea - sea.mean()
    power = float(away @ away)
    factor = float(away @ basin) / power if power > 0.0 else 0.0
    level = float(basin.mean()) - factor * float(sea.mean())
    return level, factor, float(np.mean((basin - level - factor * sea) ** 2))


def fit_lagged_sea(
    sea_time_s: FloatArray, sea_level_m: FloatArray, time_s: FloatArray, level_m: FloatArray
) -> LaggedSea:
    """Fit basin = a + b sea(t - lag) by least squares: what a calibration must beat to be worth its while.

    Parameters
    ----------
    sea_time_s, sea_level_m : (m,) array
        Sea record; NaN left out, holes of over an hour stay holes; cubic splines between samples.
    time_s, level_m : (n,) array
        Basin record, NaN left out.

    Returns
    -------
    LaggedSea
        With a lag from -1 to 5 h, to a tenth of a second.

    Raises
    ------
    FitError
        If the records share less than 20 instants.
    """
    known = np.isfinite(sea_level_m)
    stamps, sea = sea_time_s[known], sea_level_m[known]

    def left(lag_s: float) -> float:
        return _fitted(splined(time_s - lag_s, stamps, sea), level_m)[2]

    errors = np.array([left(float(lag)) for lag in LAGS_S])
    if not np.isfinite(errors.min()):
        raise FitError(
            f"the guess from the sea alone: sea and basin records share less than {FEWEST_LEVELS} levels in that span"
        )
    best = float(LAGS_S[np.argmin(errors)])
    around = (max(best - 600.0, float(LAGS_S[0])), min(best + 600.0, float(LAGS_S[-1])))
    lag_s = float(minimize_scalar(left, bounds=around, method="bounded", options={"xatol": LAG_TOLERANCE_S}).x)
    level, factor, square = _fitted(splined(time_s - lag_s, stamps, sea), level_m)
    return LaggedSea(level_m=level, factor=factor, lag_s=lag_s, rms_m=float(np.sqrt(square)))


def lagged_sea_level(
    guess: LaggedSea, sea_time_s: FloatArray, sea_level_m: FloatArray, time_s: FloatArray
) -> FloatArray:
    """Return the guess at other instants; NaN where the sea record has a hole of over an hour or ends."""
    known = np.isfinite(sea_level_m)
    return guess.level_m + guess.factor * splined(time_s - guess.lag_s, sea_time_s[known], sea_level_m[known])
