"""One growth factor a place from soundings of its hole, and the depth that follows from it: no sampling, no search."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Final

import numpy as np
from scipy.special import ndtr

from tidescour.errors import DomainError
from tidescour.scour.chain import growth_curve
from tidescour.scour.laws import GrowthLaw
from tidescour.scour.records import RowDurations, Rule
from tidescour.study.spans import rows_between
from tidescour.units import FloatArray, read_only

PERCENTILES: Final = (0.05, 0.50, 0.95)
"""Shares of the percentiles of every factor and depth, in their order."""

_NODES: Final = 81
_ENOUGH: Final = 64
"""So many likely nodes are enough: steps of at most a sixth of a standard deviation."""
_REACH: Final = 8.0
_UNLIKELY: Final = 12.5
"""How far under the highest the logarithm of a density is cut off: five standard deviations of a normal one."""
_MOST_PASSES: Final = 8
_LEAST_SPREAD: Final = 1e-12
_HALVINGS: Final = 50


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Hole:
    """What a hole grows by.

    Parameters
    ----------
    rows : tuple of RowDurations
        Rows of one place in the order of the stages.
    law : GrowthLaw
        Growth law.
    rule : str
        Tide rule that drives growth.
    start_s, end_s : float
        First and last moment of the programme, seconds since 1970.
    start_depth_m : float
        Depth at `start_s` [m], taken as known.
    growth_factor : float
        Of the plan; the factor of the soundings multiplies it.
    """

    rows: tuple[RowDurations, ...]
    law: GrowthLaw
    rule: Rule
    start_s: float
    end_s: float
    start_depth_m: float
    growth_factor: float = 1.0


@dataclass(frozen=True, slots=True, kw_only=True)
class DepthSounding:
    """A sounded depth below the original bed [m] with its standard error [m]; `time_s` is seconds since 1970.

    `upper_slope_cot` is the slope 1 in n of the hole's upper part, NaN where it was not measured.
    """

    time_s: float
    depth_m: float
    standard_error_m: float
    upper_slope_cot: float = float("nan")

    def __post_init__(self) -> None:
        """Check the range."""
        if not (self.depth_m >= 0.0 and self.standard_error_m > 0.0):
            raise DomainError(
                f"a sounded depth of {self.depth_m:g} m must not be negative, its standard error of "
                f"{self.standard_error_m:g} m must be positive"
            )


@dataclass(frozen=True, slots=True, kw_only=True)
class Scatter:
    """Standard deviations: of the logarithm of the factor beforehand, and of growth over that growth."""

    prior: float
    growth: float

    def __post_init__(self) -> None:
        """Check the range."""
        if not (self.prior > 0.0 and self.growth >= 0.0):
            raise DomainError(f"scatter must be positive beforehand and not negative in growth: {self}")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FactorFit:
    """What soundings tell of a factor, on even steps of its logarithm.

    Parameters
    ----------
    log_factor, weight : (n,) array
        Logarithm of the factor, and its share; shares add up to 1.
    depth_m, variance_m2 : (n,) array
        With each factor, depth at the last sounding [m] and its variance [m2].
    last_s : float
        The last sounding; without any, the start of the programme.
    innovation : (k,) array
        By sounding, how far it lies from what the law with the factor and the soundings before it foretell, over the
        standard deviation of that; mean over the factors.
    """

    log_factor: FloatArray
    weight: FloatArray
    depth_m: FloatArray
    variance_m2: FloatArray
    last_s: float
    innovation: FloatArray

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in ("log_factor", "weight", "depth_m", "variance_m2", "innovation"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
        if not self.log_factor.shape == self.weight.shape == self.depth_m.shape == self.variance_m2.shape:
            raise ValueError("log_factor, weight, depth_m and variance_m2 must have one length")

    @property
    def factor(self) -> FloatArray:
        """(3,) array: `PERCENTILES` of the factor."""
        return np.exp(mixture_percentiles(self.weight, self.log_factor, np.zeros_like(self.log_factor)))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DepthBand:
    """Depth over time: `time_s` (m,), seconds since 1970, and `depth_m` (3, m), its `PERCENTILES` [m]."""

    time_s: FloatArray
    depth_m: FloatArray

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        object.__setattr__(self, "time_s", read_only(self.time_s))
        object.__setattr__(self, "depth_m", read_only(self.depth_m))
        if self.depth_m.shape != (len(PERCENTILES), *self.time_s.shape):
            raise ValueError("depth_m must have three rows as long as time_s")


def growth_along(
    hole: Hole, depth_m: float, from_s: float, to_s: float, factor: float = 1.0
) -> tuple[FloatArray, FloatArray]:
    """Depth of a hole from one moment to another, at the ends of cycles between.

    Parameters
    ----------
    hole : Hole
        What it grows by.
    depth_m : float
        Depth at `from_s` [m], not negative.
    from_s, to_s : float
        Moments, seconds since 1970.
    factor : float
        Multiplies the hole's own growth factor, positive.

    Returns
    -------
    (m,) array, (m,) array
        Moments and depths [m], `from_s` with `depth_m` first, `to_s` last.

    Raises
    ------
    DomainError
        As `growth_curve`.
    """
    return _along(_span(hole, from_s, to_s), hole, depth_m, factor)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Span:
    """The rows of a hole between two moments."""

    rows: tuple[RowDurations, ...]
    from_s: float
    to_s: float


def _span(hole: Hole, from_s: float, to_s: float) -> _Span:
    return _Span(rows=rows_between(hole.rows, from_s, to_s), from_s=from_s, to_s=to_s)


def _along(span: _Span, hole: Hole, depth_m: float, factor: float) -> tuple[FloatArray, FloatArray]:
    if not span.to_s > span.from_s:
        return np.array([span.from_s]), np.array([depth_m])
    curve = growth_curve(span.rows, hole.law, depth_m, hole.rule, factor * hole.growth_factor)
    inside = (curve.time_s > span.from_s) & (curve.time_s < span.to_s)
    last_m = float(curve.depth_m[-1]) if curve.depth_m.size else depth_m
    time_s = np.concatenate([[span.from_s], curve.time_s[inside], [span.to_s]])
    return time_s, np.concatenate([[depth_m], curve.depth_m[inside], [last_m]])


def fit_factor(hole: Hole, soundings: Sequence[DepthSounding], scatter: Scatter) -> FactorFit:
    """Factor by which a hole grows deeper than its law has it, as soundings tell.

    Parameters
    ----------
    hole : Hole
        What it grows by.
    soundings : sequence of DepthSounding
        In the order of time, after the start; none leaves the factor as it is known beforehand.
    scatter : Scatter
        Of the factor beforehand, and of growth.

    Returns
    -------
    FactorFit
        On factors that differ evenly in their logarithm, as far as they are likely.

    Raises
    ------
    DomainError
        If soundings are out of order or outside the programme.

    References
    ----------
    ln f is normal with mean 0 beforehand, soundings are normal with their standard errors. With each factor a Kalman
    filter follows the depth: it is advanced from sounding to sounding by equivalent time, its variance by the square
    of how much a deeper start changes the depth (over a standard deviation either way) and by (scatter x growth)**2;
    then it is brought towards the sounding. Without scatter of growth, the depth is that of the law with a constant
    factor. A mean of depths that are not negative is not negative. Errors of two soundings are taken as independent: a
    common one, as of a datum, is not in the interval.
    """
    times = [hole.start_s, *(sounding.time_s for sounding in soundings)]
    if any(later <= before for before, later in pairwise(times)) or times[-1] > hole.end_s:
        raise DomainError("soundings must lie after the start and not after the end of the programme, in order")
    spans = [_span(hole, *each) for each in pairwise(times)]
    low, high = -_REACH * scatter.prior, _REACH * scatter.prior
    for _ in range(_MOST_PASSES):
        nodes = np.linspace(low, high, _NODES)
        log_density, depth_m, variance_m2, innovation = _filtered(hole, soundings, spans, scatter, nodes)
        log_density += -0.5 * (nodes / scatter.prior) ** 2
        best = int(np.argmax(log_density))
        if best in (0, _NODES - 1):
            # Soundings far from all that was expected: look farther that way.
            low, high = (low - (high - low), high) if best == 0 else (low, high + (high - low))
            continue
        likely = np.flatnonzero(log_density > np.max(log_density) - _UNLIKELY)
        if likely.size > _ENOUGH:
            break
        low, high = nodes[max(likely[0] - 1, 0)], nodes[min(likely[-1] + 1, _NODES - 1)]
    weight = np.exp(log_density - np.max(log_density))
    weight /= np.sum(weight)
    return FactorFit(
        log_factor=nodes,
        weight=weight,
        depth_m=depth_m,
        variance_m2=variance_m2,
        last_s=times[-1],
        innovation=weight @ innovation,
    )


def _filtered(
    hole: Hole,
    soundings: Sequence[DepthSounding],
    spans: Sequence[_Span],
    scatter: Scatter,
    log_factor: FloatArray,
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Return, by factor, the logarithm of the likelihood, last depth and variance, and innovations by sounding."""
    log_likelihood = np.zeros(log_factor.size)
    depth_m, variance_m2 = np.full(log_factor.size, hole.start_depth_m), np.zeros(log_factor.size)
    innovation = np.empty((log_factor.size, len(soundings)))
    for number, (sounding, span) in enumerate(zip(soundings, spans, strict=True)):
        for node, factor in enumerate(np.exp(log_factor)):
            _, depths, variances = _advanced(
                span, hole, float(depth_m[node]), float(variance_m2[node]), float(factor), scatter.growth
            )
            depth_m[node], variance_m2[node] = depths[-1], variances[-1]
        total = variance_m2 + sounding.standard_error_m**2
        apart = sounding.depth_m - depth_m
        innovation[:, number] = apart / np.sqrt(total)
        log_likelihood += -0.5 * (innovation[:, number] ** 2 + np.log(total))
        depth_m = depth_m + variance_m2 / total * apart
        variance_m2 = variance_m2 * sounding.standard_error_m**2 / total
    return log_likelihood, depth_m, variance_m2, innovation


def _advanced(
    span: _Span, hole: Hole, depth_m: float, variance_m2: float, factor: float, growth_scatter: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return moments, and mean [m] and variance [m2] of the depth at each, from those at the first."""
    time_s, mean_m = _along(span, hole, depth_m, factor)
    spread = (growth_scatter * (mean_m - depth_m)) ** 2
    low_m, high_m = max(depth_m - np.sqrt(variance_m2), 0.0), depth_m + np.sqrt(variance_m2)
    if not high_m > low_m:
        return time_s, mean_m, spread
    low, high = (_along(span, hole, float(start), factor)[1] for start in (low_m, high_m))
    return time_s, mean_m, spread + ((high - low) / (high_m - low_m)) ** 2 * variance_m2


def forecast(hole: Hole, fit: FactorFit, scatter: Scatter) -> DepthBand:
    """Depth of a hole from the last sounding to the end of the programme.

    Parameters
    ----------
    hole, scatter
        As for `fit_factor`.
    fit : FactorFit
        What the soundings tell.

    Returns
    -------
    DepthBand
        At the last sounding and the ends of cycles after it; percentiles under 0 are set to 0.
    """
    span = _span(hole, fit.last_s, hole.end_s)
    advanced = [
        _advanced(span, hole, depth, variance, factor, scatter.growth)
        for depth, variance, factor in zip(
            fit.depth_m.tolist(), fit.variance_m2.tolist(), np.exp(fit.log_factor).tolist(), strict=True
        )
    ]
    mean_m, variance_m2 = (np.array([each[part] for each in advanced]) for part in (1, 2))
    depth_m = mixture_percentiles(fit.weight, mean_m, np.sqrt(variance_m2))
    return DepthBand(time_s=advanced[0][0], depth_m=np.maximum(depth_m, 0.0))


def mixture_percentiles(weight: FloatArray, mean: FloatArray, spread: FloatArray) -> FloatArray:
    """Percentiles of a mixture of normal distributions that goes on evenly between its parts.

    Parameters
    ----------
    weight : (n,) array
        Shares of the parts, in all 1.
    mean, spread : (n,) or (n, m) array
        Mean and standard deviation of each part, of m quantities side by side; n at least 2.

    Returns
    -------
    (3,) or (3, m) array
        The `PERCENTILES`.

    References
    ----------
    Each part stands for all that lies around it, so that 0.4 of the step to the next is added to its spread: enough to
    leave no ripples, too little to count beside the spread of the whole.
    """
    wide = np.hypot(spread, 0.4 * np.gradient(mean, axis=0))
    # Where all parts are one value without spread, that value comes back.
    low, high = np.min(mean - _REACH * wide, axis=0), np.max(mean + _REACH * wide, axis=0)
    wide = np.maximum(wide, _LEAST_SPREAD)
    return np.array([_percentile(share, weight, mean, wide, low, high) for share in PERCENTILES])


def _percentile(
    share: float, weight: FloatArray, mean: FloatArray, spread: FloatArray, low: FloatArray, high: FloatArray
) -> FloatArray:
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        under = weight @ ndtr((middle - mean) / spread) < share
        low, high = np.where(under, middle, low), np.where(under, high, middle)
    return np.asarray(0.5 * (low + high), dtype=np.float64)
