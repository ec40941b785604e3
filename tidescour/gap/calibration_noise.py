"""Noise of recorded levels: an autoregressive model of the residuals, and rows made white by it, across holes too."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse
from scipy.sparse.linalg import splu
from scipy.stats import chi2

from tidescour.units import M2_PERIOD_H, SECONDS_PER_HOUR, BoolArray, FloatArray, read_only

FINEST_STEP_S = 600.0
"""Finer records are thinned to 400 to 900 s: between neighbours is little news and the noise model stays short."""

LONGEST_MEMORY_S = 6.0 * SECONDS_PER_HOUR
"""The noise model looks no further back: half a tide, so that it cannot take the tide itself for noise."""

PAIRS_A_COEFFICIENT = 20
SMALLEST_VARIANCE = 1e-18
NOTHING_NEW = 1e-9
TIDAL_HARMONICS = (1, 2, 3)
TIDAL_WAVES = 2 * len(TIDAL_HARMONICS)
TIDAL_PROBABILITY = 0.99

Whiten = Callable[[FloatArray], FloatArray]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Grid:
    """Even cells in time and the samples that stand in them.

    Parameters
    ----------
    step_s : float
        Length of a cell [s].
    sample : (m,) array of int
        Samples used, in order of time.
    cell : (m,) array of int
        The cell of each, from 0, increasing; a hole is a cell without a sample.
    """

    step_s: float
    sample: NDArray[np.int64]
    cell: NDArray[np.int64]

    @property
    def count(self) -> int:
        """Cells from the first sample to the last."""
        return int(self.cell[-1]) + 1


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Noise:
    """An autoregressive process by its reflection coefficients (order p) and the variance of its innovations.

    Parameters
    ----------
    reflection : (p,) array
        Between -1 and 1; p = 0 is white noise.
    innovation_variance : float
        Variance of what cannot be foretold from the values before, positive [unit of the values, squared].
    """

    reflection: FloatArray
    innovation_variance: float

    def __post_init__(self) -> None:
        """Check ranges; keep a read-only copy."""
        object.__setattr__(self, "reflection", read_only(self.reflection))
        if not np.all(np.abs(self.reflection) < 1.0) or not self.innovation_variance > 0.0:
            raise ValueError("reflection coefficients must lie within -1 and 1, the variance must be positive")

    @property
    def variance(self) -> float:
        """Variance of the process itself."""
        return float(self.innovation_variance / np.prod(1.0 - self.reflection**2))


def even_grid(time_s: FloatArray, known: BoolArray) -> Grid:
    """Return even cells over irregular instants, one known sample at most in each, the one nearest to its centre.

    Parameters
    ----------
    time_s : (n,) array
        Instants, increasing [s].
    known : (n,) bool array
        Samples that may be used, at least two.
    """
    samples = np.flatnonzero(known)
    times = time_s[samples] - time_s[samples[0]]
    usual = float(np.median(np.diff(times)))
    step = usual * max(1, round(FINEST_STEP_S / usual))
    cell = np.rint(times / step).astype(np.int64)
    order = np.lexsort((np.abs(times - cell * step), cell))
    cells, first = np.unique(cell[order], return_index=True)
    return Grid(step_s=step, sample=samples[order[first]], cell=cells)


def predictors(reflection: FloatArray) -> list[FloatArray]:
    """Return the prediction-error filters of order 0, 1, ... p, each beginning with 1 (Levinson's recursion)."""
    filters = [np.ones(1)]
    for value in reflection:
        last = np.append(filters[-1], 0.0)
        filters.append(last + value * last[::-1])
    return filters


def fit_noise(grid: Grid, residual: FloatArray, fitted: int) -> Noise:
    """Return the autoregressive noise of residuals, its order by Akaike's criterion.

    Parameters
    ----------
    grid : Grid
        Cells of the residuals.
    residual : (m,) array
        One for each sample of the grid, finite.
    fitted : int
        Parameters that were fitted; the variance is taken over the number of values less these.

    References
    ----------
    Burg's reflection coefficients, pairs pooled over the stretches between holes; Akaike's criterion. From memory:
    Kay, Modern Spectral Estimation (1988), chapters 7 and 13.
    """
    forward = np.full(grid.count, np.nan)
    forward[grid.cell] = residual
    backward = forward
    count = residual.size
    variance = [max(float(np.mean(residual**2)), SMALLEST_VARIANCE)]
    reflection: list[float] = []
    for order in range(1, int(LONGEST_MEMORY_S / grid.step_s) + 1):
        ahead, behind = forward[1:], backward[:-1]
        pairs = np.isfinite(ahead) & np.isfinite(behind)
        power = float(np.sum(ahead[pairs] ** 2 + behind[pairs] ** 2))
        if np.count_nonzero(pairs) < PAIRS_A_COEFFICIENT * order or power == 0.0:
            break
        value = -2.0 * float(np.sum(ahead[pairs] * behind[pairs])) / power
        if 1.0 - value**2 < NOTHING_NEW:
            break
        forward, backward = ahead + value * behind, behind + value * ahead
        reflection.append(value)
        variance.append(variance[-1] * (1.0 - value**2))
    criterion = count * np.log(variance) + 2.0 * np.arange(len(variance))
    best = int(np.argmin(criterion))
    noise = Noise(reflection=np.array(reflection[:best]), innovation_variance=variance[best])
    white = whitening(noise, grid)(residual)
    scale = float(white @ white) / max(count - fitted, 1)
    return Noise(
        reflection=noise.reflection,
        innovation_variance=max(noise.innovation_variance * scale, SMALLEST_VARIANCE),
    )


def _whitening_matrix(noise: Noise, count: int) -> sparse.csr_array:
    """Return the lower band matrix that makes `count` even values of the process white, with unit variance."""
    filters = predictors(noise.reflection)
    order = min(len(filters) - 1, count - 1)
    band = np.zeros((count, order + 1))
    variance = noise.variance * np.cumprod(np.concatenate(([1.0], 1.0 - noise.reflection**2)))
    for early in range(order):
        band[early, : early + 1] = filters[early] / np.sqrt(variance[early])
    band[order:] = filters[order] / np.sqrt(variance[order])
    row, lag = np.indices(band.shape)
    past = lag <= row
    return sparse.csr_array((band[past], (row[past], (row - lag)[past])), shape=(count, count))


def whitening(noise: Noise, grid: Grid) -> Whiten:
    """Return the function that makes rows of samples white, with unit variance.

    The whitened rows W x have W'W = the inverse of the covariance of the samples, exactly: cells without a sample are
    filled with what the model expects there, given all others, which is the same as leaving them out.

    Parameters
    ----------
    noise : Noise
        The process.
    grid : Grid
        Where the samples stand.

    Returns
    -------
    function
        From (m,) or (m, c) rows of samples to (cells,) or (cells, c).
    """
    matrix = _whitening_matrix(noise, grid.count)
    seen = sparse.csr_array(matrix[:, grid.cell])
    holes = np.setdiff1d(np.arange(grid.count), grid.cell)
    if holes.size == 0:
        return lambda samples: np.asarray(seen @ samples)
    unseen = sparse.csr_array(matrix[:, holes])
    solver = splu(sparse.csc_matrix(unseen.T @ unseen))

    def whitened(samples: FloatArray) -> FloatArray:
        rows = seen @ samples
        return np.asarray(rows - unseen @ solver.solve(unseen.T @ rows))

    return whitened


def correlation_time_s(noise: Noise, step_s: float) -> float:
    """Return the integral of the autocorrelation from zero to infinity [s]: the e-folding time where order is one.

    Half a step for white noise.
    """
    gain = float(predictors(noise.reflection)[-1].sum())
    return 0.5 * step_s * noise.innovation_variance / gain**2 / noise.variance


def tidal_waves(time_s: FloatArray) -> FloatArray:
    """Return cosines and sines of the M2 tide and of its second and third harmonic, (m, 6)."""
    phases = 2.0 * np.pi / (M2_PERIOD_H * SECONDS_PER_HOUR) * np.outer(time_s - time_s[0], TIDAL_HARMONICS)
    return np.hstack((np.cos(phases), np.sin(phases)))


def between_tides(time_s: FloatArray, residual: FloatArray) -> FloatArray:
    """Return residuals less what repeats with the tide: the noise is fitted to these, and the rest held against it."""
    waves = tidal_waves(time_s)
    return np.asarray(residual - waves @ np.linalg.lstsq(waves, residual, rcond=None)[0])


def tidal_excess(
    whiten: Whiten, time_s: FloatArray, white_change: FloatArray, white_residual: FloatArray
) -> tuple[float, int]:
    """Return by how much residuals at the tide's periods exceed the noise model, and in how many directions.

    What a wrong model leaves behind repeats with the tide, as do the levels that the parameters move, so that noise
    between tides tells nothing of it. Residuals are laid on the M2 tide and its second and third harmonic, less what
    the parameters can take up; where their mean square is beyond chance, it is the measure of the noise there.

    Parameters
    ----------
    whiten : function
        Of the levels.
    time_s : (m,) array
        Instants of the samples.
    white_change, white_residual : (cells, p) and (cells,) array
        Whitened change for each parameter and whitened residual.

    Returns
    -------
    factor : float
        Mean square over that of the noise model; 1 where it is within chance (99 %).
    directions : int
        Degrees of freedom of that mean square; 0 where the factor is 1.

    References
    ----------
    Common practice in the analysis of variance, no source for this use.
    """
    waves = whiten(tidal_waves(time_s))
    waves = waves - white_change @ np.linalg.lstsq(white_change, waves, rcond=1e-8)[0]
    directions, sizes, _ = np.linalg.svd(waves, full_matrices=False)
    own = directions[:, sizes > 0.01 * sizes[0]]
    rank = own.shape[1]
    factor = float(np.sum((own.T @ white_residual) ** 2)) / rank
    if factor <= chi2.ppf(TIDAL_PROBABILITY, rank) / rank:
        return 1.0, 0
    return factor, rank
