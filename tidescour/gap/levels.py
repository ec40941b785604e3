"""Levels of a stage on any instants: from the tide, a gauge or a given series, holes kept as holes."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from tidescour.errors import FitError, PlanError, RecordError
from tidescour.gauge.records import GaugeRecord, GivenSeries
from tidescour.plan.kinds import Side
from tidescour.plan.models import Opening
from tidescour.tide.predict import predicted_level
from tidescour.tide.records import TideFit
from tidescour.units import SECONDS_PER_DAY, SECONDS_PER_HOUR, FloatArray, read_only, utc_text

TIDE_NODE_S = 600.0
"""Step at which the tide is predicted before it is brought to the solver's steps: M4 loses 1e-5 of its amplitude."""

LONGEST_INTERPOLATED_S = SECONDS_PER_HOUR + 0.5
"""Between good samples further apart than an hour (and a rounded stamp) lies a hole."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Waters:
    """All that levels and given flows can come from; None where the plan has none.

    `sea_factor` and `set_up_m` change the predicted sea level only.
    """

    sea_record: GaugeRecord | None = None
    basin_record: GaugeRecord | None = None
    sea_fit: TideFit | None = None
    basin_fit: TideFit | None = None
    series: Mapping[str, GivenSeries]
    sea_factor: float = 1.0
    set_up_m: float = 0.0

    def record(self, side: Side) -> GaugeRecord | None:
        """Return the gauge of one side."""
        return self.sea_record if side == "sea" else self.basin_record

    def fit(self, side: Side) -> TideFit | None:
        """Return the tide of one side."""
        return self.sea_fit if side == "sea" else self.basin_fit


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LevelHistory:
    """Levels [m above datum] at the instants asked for, finite throughout; `covered` is False inside holes."""

    level_m: FloatArray
    covered: NDArray[np.bool_]

    def __post_init__(self) -> None:
        """Check finiteness; keep read-only copies."""
        object.__setattr__(self, "level_m", read_only(self.level_m))
        if not np.all(np.isfinite(self.level_m)) or self.level_m.shape != self.covered.shape:
            raise ValueError("levels must be finite and as long as covered")


def splined(time_s: FloatArray, sample_time_s: FloatArray, sample: FloatArray) -> FloatArray:
    """Bring samples to other instants by cubic splines, each piece between holes alone.

    Parameters
    ----------
    time_s : (n,) array
        Instants wanted, seconds since 1970, increasing.
    sample_time_s, sample : (m,) array
        Samples, increasing in time, finite.

    Returns
    -------
    (n,) array
        Values; NaN outside the samples and where two of them are more than an hour apart.
    """
    near = (sample_time_s >= time_s[0] - SECONDS_PER_DAY) & (sample_time_s <= time_s[-1] + SECONDS_PER_DAY)
    stamps, values = sample_time_s[near], sample[near]
    result = np.full(time_s.shape, np.nan)
    breaks = np.flatnonzero(np.diff(stamps) > LONGEST_INTERPOLATED_S) + 1
    for piece, heights in zip(np.split(stamps, breaks), np.split(values, breaks), strict=True):
        if piece.size == 0:
            continue
        inside = slice(*np.searchsorted(time_s, [piece[0] - 1e-6, piece[-1] + 1e-6]))
        if piece.size == 1:
            result[inside] = heights[0]
        else:
            result[inside] = CubicSpline(piece, heights)(time_s[inside])
    return result


def tide_levels(fit: TideFit, time_s: FloatArray, factor: float = 1.0, set_up_m: float = 0.0) -> FloatArray:
    """Return predicted levels [m above datum] at close instants, through nodes ten minutes apart."""
    first = np.floor(time_s[0] / TIDE_NODE_S) - 3.0
    last = np.ceil(time_s[-1] / TIDE_NODE_S) + 3.0
    nodes = np.arange(first, last + 1.0) * TIDE_NODE_S
    return np.asarray(CubicSpline(nodes, predicted_level(fit.constants, nodes, factor, set_up_m))(time_s))


def given_values(series: GivenSeries, time_s: FloatArray, stage: str) -> FloatArray:
    """Return a given series at the instants of a stage: levels by cubic spline, flows linearly.

    Raises
    ------
    RecordError
        If the series does not cover the instants or has a hole of over an hour among them.
    """
    stamps = series.time_s
    if stamps[0] > time_s[0] + 1e-3 or stamps[-1] < time_s[-1] - 1e-3:
        raise RecordError(
            f"{series.file.path}: series {series.name!r} runs from {utc_text(stamps[0])} to {utc_text(stamps[-1])} and "
            f"does not cover stage {stage!r}, {utc_text(time_s[0])} to {utc_text(time_s[-1])}"
        )
    first = int(np.searchsorted(stamps, time_s[0], side="right")) - 1
    last = int(np.searchsorted(stamps, time_s[-1], side="left"))
    steps = np.diff(stamps[max(first, 0) : last + 1])
    if steps.size and steps.max() > LONGEST_INTERPOLATED_S:
        at = stamps[max(first, 0) + int(np.argmax(steps))]
        raise RecordError(
            f"{series.file.path}: series {series.name!r} has a hole of {steps.max() / SECONDS_PER_HOUR:.3g} h after "
            f"{utc_text(at)}, inside stage {stage!r}; a given series may have none over 1 h"
        )
    if series.quantity == "level":
        held = np.clip(time_s, stamps[0], stamps[-1])
        return splined(held, stamps, series.value)
    return np.interp(time_s, stamps, series.value)


def _measured(record: GaugeRecord, time_s: FloatArray) -> FloatArray:
    good = record.good
    return splined(time_s, record.time_s[good], record.level_m[good])


def _samples_around(record: GaugeRecord, time_s: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the good samples among the instants, and the last before and the first after them."""
    stamps, levels = record.time_s[record.good], record.level_m[record.good]
    around = slice(
        max(int(np.searchsorted(stamps, time_s[0], side="right")) - 1, 0),
        int(np.searchsorted(stamps, time_s[-1], side="left")) + 1,
    )
    return stamps[around], levels[around]


def _filled(level_m: FloatArray, time_s: FloatArray, record: GaugeRecord, fit: TideFit | None) -> FloatArray:
    """Fill holes by the fitted tide plus the residual taken linearly, without a tide linearly.

    Before the first good sample of the record and after its last the tide stands alone.
    """
    stamps, levels = _samples_around(record, time_s)
    if fit is None:
        return np.where(np.isfinite(level_m), level_m, np.interp(time_s, stamps, levels))
    tide = tide_levels(fit, time_s)
    if stamps.size:
        residual = levels - predicted_level(fit.constants, stamps)
        tide = tide + np.interp(time_s, stamps, residual, left=0.0, right=0.0)
    return np.where(np.isfinite(level_m), level_m, tide)


def side_levels(source: str, side: Side, waters: Waters, time_s: FloatArray, stage: str, bridge: bool) -> LevelHistory:
    """Return the levels of one side during a stage.

    Parameters
    ----------
    source : str
        ``tide``, ``measured`` or the name of a level series.
    side : {"sea", "basin"}
        Which side.
    waters : Waters
        Where levels come from.
    time_s : (n,) array
        Instants, seconds since 1970, increasing.
    stage : str
        Name of the stage, for messages.
    bridge : bool
        Holes of a measured level must be filled by a tide (for routing); else they may be filled linearly.

    Raises
    ------
    PlanError, FitError, RecordError
        If the source is not there, or cannot serve.
    """
    everywhere = np.ones(time_s.shape, dtype=np.bool_)
    if source == "tide":
        fit = waters.fit(side)
        if fit is None:
            raise FitError(f'stage {stage!r}: {side} = "tide" needs a fitted tide, and there is none for that side')
        changed = (waters.sea_factor, waters.set_up_m) if side == "sea" else (1.0, 0.0)
        return LevelHistory(level_m=tide_levels(fit, time_s, *changed), covered=everywhere)
    if source == "measured":
        record = waters.record(side)
        if record is None:
            raise PlanError(f'stage {stage!r}: {side} = "measured" needs [records.{side}]')
        level = _measured(record, time_s)
        covered = np.isfinite(level)
        if covered.all():
            return LevelHistory(level_m=level, covered=covered)
        if not bridge and not covered.any():
            raise RecordError(
                f"stage {stage!r}: the {side} gauge has no good sample between {utc_text(time_s[0])} and "
                f"{utc_text(time_s[-1])}"
            )
        fit = waters.fit(side)
        if bridge and fit is None:
            at = utc_text(np.floor(time_s[int(np.argmin(covered))]))
            raise FitError(
                f"stage {stage!r}: the {side} gauge has a hole at {at} that a routed basin must run through, and there "
                "is no fitted tide to bridge it; give at least 15 days of record, start_level_m in [basin] where the "
                "hole lies before the first stage, or a calibration.start after it"
            )
        return LevelHistory(level_m=_filled(level, time_s, record, fit), covered=covered)
    return LevelHistory(level_m=given_values(waters.series[source], time_s, stage), covered=everywhere)


def _mean_sea(source: str, waters: Waters, sea: LevelHistory) -> float:
    """Return the level about which an opening's own sea level swings: the same in all stages."""
    if source in ("tide", "measured"):
        if waters.sea_fit is not None:
            return waters.sea_fit.constants.mean_m + (waters.set_up_m if source == "tide" else 0.0)
        if waters.sea_record is not None:
            return float(waters.sea_record.level_m[waters.sea_record.good].mean())
        return float(sea.level_m.mean())
    return float(waters.series[source].value.mean())


def own_sea_levels(
    opening: Opening, source: str, waters: Waters, time_s: FloatArray, stage: str, bridge: bool, sea: LevelHistory
) -> LevelHistory:
    """Return the sea level at an opening far from the others: later, and about its mean larger or smaller.

    Parameters
    ----------
    opening : Opening
        Its lag [s], factor and shift [m]; without any the sea level of the stage is returned.
    source : str
        As in `side_levels`.
    waters : Waters
        Where levels come from.
    time_s : (n,) array
        Instants, seconds since 1970, increasing.
    stage : str
        Name of the stage, for messages.
    bridge : bool
        As in `side_levels`.
    sea : LevelHistory
        Sea level of the stage at these instants.

    Raises
    ------
    PlanError, FitError, RecordError
        If the source cannot serve at the earlier instants.
    """
    if opening.sea_lag_s != 0.0:
        sea = side_levels(source, "sea", waters, time_s - opening.sea_lag_s, stage, bridge)
    mean = _mean_sea(source, waters, sea)
    level = mean + opening.sea_factor * (sea.level_m - mean) + opening.sea_shift_m
    return LevelHistory(level_m=level, covered=sea.covered)
