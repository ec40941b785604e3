"""Coefficient, storage and datum of a basin from its recorded levels and measured discharges, with honest intervals."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.optimize import least_squares
from scipy.stats import t as student

from tidescour.errors import DomainError, FitError
from tidescour.gap.calibration_noise import (
    TIDAL_WAVES,
    Grid,
    Noise,
    Whiten,
    between_tides,
    correlation_time_s,
    even_grid,
    fit_noise,
    tidal_excess,
    whitening,
)
from tidescour.gap.calibration_records import CALIBRATED, Estimate, Evidence, Interval, Simulate
from tidescour.gap.calibration_verdict import MOVED, findings_of, is_determined, refuse_unfittable
from tidescour.units import SECONDS_PER_HOUR, BoolArray, FloatArray

LOGARITHM_STEP = 1e-3
"""Step of the central differences, in the logarithms and in metres of offset."""

PULL = 0.3
"""Weight, in units of 1, that holds directions which the evidence leaves open near the start: a standard deviation of
3.3 in a logarithm. Where a parameter is known within 5 % it moves the estimate by less than 1e-3 of that. It does not
enter the intervals."""

FURTHEST = 5.0
"""The search for a logarithm ends a factor e^5 = 150 from the start."""

FIRST_NOISE_M = 0.02
"""White noise of the first round, which is ordinary least squares: taken from the residuals at the start, noise would
take up what the parameters are there for, a wrong datum first of all."""

MOST_ROUNDS = 8
SETTLED = 0.02
"""Rounds between parameters and noise end when no parameter moves by more than this part of its standard error."""

LEAST_SIZE = 1e-9
"""Singular values smaller than this part of the largest are rounding."""

ENDLESS = 7.0
"""A half width of a logarithm (a factor of 1000), or of the offset [m], beyond which an interval has no ends."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Weights:
    """How to make the rows white, first the levels on the grid, then the discharges, and the noise behind it."""

    noise: Noise
    whiten: Whiten
    levels: int
    standard_error_m3_s: FloatArray
    widening: float = 1.0
    excess: float = 1.0
    excess_directions: int = 0

    def __call__(self, rows: FloatArray) -> FloatArray:
        """Return the rows, (m + k,) or (m + k, c), with unit variance."""
        levels = self.whiten(rows[: self.levels]) / np.sqrt(self.excess)
        discharges = (rows[self.levels :].T / (self.widening * self.standard_error_m3_s)).T
        return np.concatenate((levels, discharges))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Model:
    """The basin model seen from the fitted numbers: logarithms where positive."""

    simulate: Simulate
    logarithmic: BoolArray
    grid: Grid
    measured: FloatArray

    def natural(self, numbers: FloatArray) -> FloatArray:
        """Return the parameters as they are."""
        return np.where(self.logarithmic, np.exp(np.where(self.logarithmic, numbers, 0.0)), numbers)

    def simulated(self, numbers: FloatArray) -> FloatArray:
        """Return levels on the grid and discharges, one row."""
        found = self.simulate(self.natural(numbers))
        row = np.concatenate((found.level_m[self.grid.sample], found.discharge_m3_s))
        if not np.all(np.isfinite(row)):
            raise FitError(
                f"calibration: the routed basin gives no number at coefficient, area or offset "
                f"{', '.join(f'{value:.3g}' for value in self.natural(numbers))}; check the openings and the storage"
            )
        return row

    def residual(self, numbers: FloatArray) -> FloatArray:
        """Return measured less simulated."""
        return self.measured - self.simulated(numbers)

    def change(self, numbers: FloatArray) -> FloatArray:
        """Return the derivative of the simulated row, a column for each number."""
        steps = LOGARITHM_STEP * np.eye(numbers.size)
        columns = [self.simulated(numbers + step) - self.simulated(numbers - step) for step in steps]
        return np.stack(columns, axis=1) / (2.0 * LOGARITHM_STEP)


def _weighed(model: _Model, evidence: Evidence, residual: FloatArray, change: FloatArray) -> _Weights:
    """Return weights from what a fit left over: noise between the tides, its excess at their periods, discharges."""
    grid, levels = model.grid, model.grid.sample.size
    time_s = evidence.level_time_s[grid.sample]
    noise = fit_noise(grid, between_tides(time_s, residual[:levels]), change.shape[1] + TIDAL_WAVES)
    whiten = whitening(noise, grid)
    excess, directions = tidal_excess(whiten, time_s, whiten(change[:levels]), whiten(residual[:levels]))
    misfit = (residual[levels:] / evidence.standard_error_m3_s) ** 2
    return _Weights(
        noise=noise,
        whiten=whiten,
        levels=levels,
        standard_error_m3_s=evidence.standard_error_m3_s,
        widening=max(1.0, float(np.sqrt(misfit.mean()))) if misfit.size else 1.0,
        excess=excess,
        excess_directions=directions,
    )


def _solve(model: _Model, weights: _Weights, first: FloatArray, anchor: FloatArray) -> FloatArray:
    """Return the numbers that make the sum of squares least, open directions held near the anchor."""
    reach = np.where(model.logarithmic, FURTHEST, np.inf)

    def rows(numbers: FloatArray) -> FloatArray:
        return np.concatenate((weights(model.residual(numbers)), PULL * (numbers - anchor)))

    def slopes(numbers: FloatArray) -> FloatArray:
        return np.vstack((-weights(model.change(numbers)), PULL * np.eye(numbers.size)))

    bounds = (anchor - reach, anchor + reach)
    found = least_squares(rows, first, jac=slopes, bounds=bounds, xtol=1e-6, ftol=1e-8, gtol=None, max_nfev=50)
    return np.asarray(found.x)


def _spread(white_change: FloatArray) -> FloatArray:
    """Return R with R'R = the inverse of J'J; a direction that nothing measures gets a spread next to infinite.

    A deviation of a sum of parameters is the length of R times its weights: exact where the covariance itself would
    lose the sum among the large numbers of an open direction.
    """
    _, sizes, directions = np.linalg.svd(white_change, full_matrices=False)
    least = LEAST_SIZE * max(float(sizes.max()), np.finfo(np.float64).tiny)
    return np.asarray(directions / np.maximum(sizes, least)[:, np.newaxis])


def _interval(centre: float, half: float, logarithmic: bool) -> Interval:
    """Return estimate and ends, as they are; 0 and infinite where half the width is endless."""
    if not half < ENDLESS:
        return Interval(
            estimate=float(np.exp(centre)) if logarithmic else centre,
            ci95_low=0.0 if logarithmic else -np.inf,
            ci95_high=np.inf,
        )
    low, middle, high = centre - half, centre, centre + half
    if logarithmic:
        low, middle, high = (float(np.exp(value)) for value in (low, middle, high))
    return Interval(estimate=middle, ci95_low=low, ci95_high=high)


def _signals(change: FloatArray, weights: _Weights, level_std_m: float) -> tuple[FloatArray, FloatArray]:
    """Return the change of levels and discharges (rms) for a tenth more of each number, over the noise."""
    levels = MOVED * np.sqrt(np.mean(change[: weights.levels] ** 2, axis=0)) / level_std_m
    if weights.standard_error_m3_s.size == 0:
        return levels, np.full(levels.shape, np.nan)
    moved = change[weights.levels :] / (weights.widening * weights.standard_error_m3_s)[:, np.newaxis]
    return levels, MOVED * np.sqrt(np.mean(moved**2, axis=0))


def _started(
    names: tuple[str, ...], start: FloatArray, simulate: Simulate, evidence: Evidence
) -> tuple[_Model, FloatArray]:
    """Return the model and the numbers that the search starts from, or refuse."""
    if not names or len(set(names)) != len(names) or any(name not in CALIBRATED for name in names):
        raise DomainError(
            f"calibration: cannot fit {', '.join(names) or 'nothing'}; fit one or more of {', '.join(CALIBRATED)}"
        )
    logarithmic = np.array([name != "datum_offset_m" for name in names])
    if start.shape != (len(names),) or not np.all(np.isfinite(start)) or np.any(start[logarithmic] <= 0.0):
        raise DomainError(
            f"calibration: start values {start.tolist()} for {', '.join(names)}: one finite number for each is needed, "
            "above 0 for coefficient and area_factor"
        )
    refuse_unfittable(names, start, simulate, evidence)
    grid = even_grid(evidence.level_time_s, np.isfinite(evidence.level_m))
    measured = np.concatenate((evidence.level_m[grid.sample], evidence.discharge_m3_s))
    model = _Model(simulate=simulate, logarithmic=logarithmic, grid=grid, measured=measured)
    return model, np.where(logarithmic, np.log(np.where(logarithmic, start, 1.0)), start)


def estimate(names: tuple[str, ...], start: FloatArray, simulate: Simulate, evidence: Evidence) -> Estimate:
    """Estimate parameters of a basin model from recorded levels and measured discharges.

    Generalised least squares: residuals of levels are made white by an autoregressive model fitted to them, in turns
    with the parameters; residuals of discharges are taken in units of their standard errors, which are widened by the
    root of their mean square where that is over 1. The intervals are those of the linear model at the estimate with
    Student's factor for the number of independent values, and wider where the residuals repeat with the tide. They hold
    for noise, not for what is wrong with the model in the same way all the time, nor for an error that all measured
    discharges share.

    Parameters
    ----------
    names : tuple of str
        What to fit, out of `CALIBRATED`.
    start : (p,) array
        Values to start from, in the same order; positive for coefficient and area factor.
    simulate : function
        From parameters as they are to the model's levels and discharges at the instants of the evidence. It must take
        any coefficient and area factor within a factor of 150 of the start.
    evidence : Evidence
        What was measured.

    Returns
    -------
    Estimate
        Values, 95 % intervals, what is not determined, and findings.

    Raises
    ------
    DomainError
        If a name is not known, or a start value is missing or not positive.
    FitError
        If there are less than two tides of levels, nothing that is fitted moves anything, or the model gives no number.

    References
    ----------
    Seber and Wild, Nonlinear Regression (1989), chapter 6 (autoregressive errors), from memory; the tests hold the
    linear case against its textbook solution, and `tests/gap/calibration_coverage.py` counts how often the intervals
    hold the truth.
    """
    model, anchor = _started(names, np.asarray(start, dtype=np.float64), simulate, evidence)
    noise = Noise(reflection=np.empty(0), innovation_variance=FIRST_NOISE_M**2)
    weights = _Weights(
        noise=noise,
        whiten=whitening(noise, model.grid),
        levels=model.grid.sample.size,
        standard_error_m3_s=evidence.standard_error_m3_s,
    )
    numbers, settled = anchor, False
    for _ in range(MOST_ROUNDS):
        before, numbers = numbers, _solve(model, weights, numbers, anchor)
        residual, change = model.residual(numbers), model.change(numbers)
        weights = _weighed(model, evidence, residual, change)
        if np.all(np.abs(numbers - before) <= SETTLED * np.linalg.norm(_spread(weights(change)), axis=0)):
            settled = True
            break
    return findings_of(_estimate(names, model, numbers, weights, residual, change), settled)


def _estimate(
    names: tuple[str, ...],
    model: _Model,
    numbers: FloatArray,
    weights: _Weights,
    residual: FloatArray,
    change: FloatArray,
) -> Estimate:
    """Return the intervals from the fitted numbers and the noise around them."""
    grid, levels, discharges = model.grid, weights.levels, weights.standard_error_m3_s.size
    root = _spread(weights(change))
    correlation_s = correlation_time_s(weights.noise, grid.step_s)
    effective = min(float(levels), levels * grid.step_s / (2.0 * correlation_s))
    freedom = weights.excess_directions or max(effective + discharges - len(names), 1.0)
    factor = float(student.ppf(0.975, freedom))
    spread = np.linalg.norm(root, axis=0)
    intervals = [
        _interval(float(number), factor * float(deviation), bool(logarithmic))
        for number, deviation, logarithmic in zip(numbers, spread, model.logarithmic, strict=True)
    ]
    ratio = None
    if {"coefficient", "area_factor"} <= set(names):
        ends = np.array([{"coefficient": 1.0, "area_factor": -1.0}.get(name, 0.0) for name in names])
        ratio = _interval(float(ends @ numbers), factor * float(np.linalg.norm(root @ ends)), True)
    level_std_m = float(np.std(residual[:levels]))
    level_signal, discharge_signal = _signals(change, weights, max(level_std_m, 1e-12))
    chi_square = float(np.sum((residual[levels:] / weights.standard_error_m3_s) ** 2))
    return Estimate(
        names=names,
        estimate=np.array([interval.estimate for interval in intervals]),
        ci95_low=np.array([interval.ci95_low for interval in intervals]),
        ci95_high=np.array([interval.ci95_high for interval in intervals]),
        determined=np.array([is_determined(name, half) for name, half in zip(names, factor * spread, strict=True)]),
        covariance=root.T @ root,
        correlation=(root / spread).T @ (root / spread),
        ratio=ratio,
        residual_std_m=level_std_m,
        residual_correlation_time_h=correlation_s / SECONDS_PER_HOUR,
        level_count=levels,
        effective_count=effective,
        noise_order=weights.noise.reflection.size,
        discharge_count=discharges,
        chi_square=chi_square if discharges else np.nan,
        discharge_widening=weights.widening,
        tidal_excess=weights.excess,
        level_signal=level_signal,
        discharge_signal=discharge_signal,
    )
