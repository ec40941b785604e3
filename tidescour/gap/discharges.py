"""Discharges of one gap from several sources side by side: volumes, peaks and slack over the span of a campaign."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from scipy.signal import savgol_coeffs

from tidescour.errors import DomainError
from tidescour.gap.volume import zero_times
from tidescour.units import M2_PERIOD_H, SECONDS_PER_HOUR, FloatArray, read_only

SMOOTHED_S = SECONDS_PER_HOUR
FEWEST_POINTS = 5
LONGEST_PAUSE_S = 3.0 * SECONDS_PER_HOUR
SLACK_PART = 0.02
SLACK_ERRORS = 2.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DischargeSeries:
    """Discharge of one gap by one source.

    Parameters
    ----------
    source : str
        Such as ``measured``, ``by head``, ``by storage``, ``routed``.
    time_s : (n,) array
        Instants, increasing.
    discharge_m3_s : (n,) array
        Positive from sea to basin; NaN where there is none.
    standard_error_m3_s : (n,) array
        Standard error of each value; NaN where it is not known.
    independent : bool
        Errors of different instants are independent, so that a volume has a standard error too.
    """

    source: str
    time_s: FloatArray
    discharge_m3_s: FloatArray
    standard_error_m3_s: FloatArray
    independent: bool = False

    def __post_init__(self) -> None:
        """Check shapes and order; keep read-only copies."""
        for key in ("time_s", "discharge_m3_s", "standard_error_m3_s"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != (self.time_s.size,):
                raise ValueError(f"{self.source}: {key} must be as long as time_s")
        if self.time_s.size < 2 or not np.all(np.diff(self.time_s) > 0.0):
            raise ValueError(f"{self.source}: time_s must increase and hold at least two instants")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TidalDischarge:
    """What one source says of a span.

    Parameters
    ----------
    source : str
        As in the series.
    start_s, end_s : float
        The span, seconds since 1970.
    flood_volume_m3, ebb_volume_m3 : float
        What ran in and out, not negative; NaN where the series has a hole in the span.
    flood_volume_error_m3, ebb_volume_error_m3 : float
        Standard errors; NaN where the errors are not known or not independent.
    flood_peak_m3_s, ebb_peak_m3_s : float
        Largest value in each direction, not negative, as sampled; 0 where there was none, NaN as above.
    flood_peak_time_s, ebb_peak_time_s : float
        When; NaN where there was none.
    slack_time_s : (k,) array
        When the discharge passed zero; where it does so several times within its error, the middle.
    """

    source: str
    start_s: float
    end_s: float
    flood_volume_m3: float
    ebb_volume_m3: float
    flood_volume_error_m3: float
    ebb_volume_error_m3: float
    flood_peak_m3_s: float
    ebb_peak_m3_s: float
    flood_peak_time_s: float
    ebb_peak_time_s: float
    slack_time_s: FloatArray

    def __post_init__(self) -> None:
        """Keep a read-only copy."""
        object.__setattr__(self, "slack_time_s", read_only(self.slack_time_s))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CampaignComparison:
    """All sources over the span that they share with one campaign.

    Parameters
    ----------
    start_s, end_s : float
        The common span.
    whole_flood, whole_ebb : bool
        Whether every flood, and every ebb, in it runs from slack to slack by the measurements, so that its volume is
        that of a half tide.
    rows : tuple of TidalDischarge
        One a source, the measured first.
    """

    start_s: float
    end_s: float
    whole_flood: bool
    whole_ebb: bool
    rows: tuple[TidalDischarge, ...]


def storage_discharge(
    time_s: FloatArray,
    level_m: FloatArray,
    area_at: Callable[[FloatArray], FloatArray],
    inflow_m3_s: FloatArray,
) -> DischargeSeries:
    """Return the discharge by storage, A(z) dz/dt - inflow, from a smoothed measured level.

    Level and slope are those of a parabola fitted to about an hour of samples around each instant (five samples at
    least). What such a parabola loses of the slope of an M2 tide, 0.6 to 0.9 % (3.6 % where levels are half an hour
    apart), is put back. Nothing is said within half of that time from a hole or an end. The standard error is that of
    the slope under the scatter of the samples around the parabolas, taken as independent from sample to sample.

    Parameters
    ----------
    time_s, level_m : (n,) array
        Even steps (a twentieth of a step may be off) and levels of the basin [m]; NaN in holes.
    area_at : function
        From levels to the basin's area [m2].
    inflow_m3_s : (n,) array
        What else runs into the basin at these instants.

    Returns
    -------
    DischargeSeries
        Positive from sea to basin; NaN near holes and ends.

    Raises
    ------
    DomainError
        If shapes differ, steps are uneven or there are too few samples.

    References
    ----------
    Savitzky and Golay (1964), Anal. Chem. 36(8), 1627-1639: local polynomials as running sums (as in scipy.signal).
    """
    if time_s.ndim != 1 or time_s.shape != level_m.shape or time_s.shape != inflow_m3_s.shape:
        raise DomainError("discharge by storage: time, level and inflow must be three rows of one length")
    steps = np.diff(time_s)
    if time_s.size < FEWEST_POINTS or np.ptp(steps) > 0.05 * np.median(steps):
        raise DomainError(
            f"discharge by storage needs at least {FEWEST_POINTS} evenly stepped levels; put NaN where there is none"
        )
    step_s = float(np.median(steps))
    points = min(max(FEWEST_POINTS, 2 * round(0.5 * SMOOTHED_S / step_s) + 1), (time_s.size - 1) // 2 * 2 + 1)
    half = points // 2
    smooth_weight = savgol_coeffs(points, 2, use="dot")
    slope_weight = savgol_coeffs(points, 2, deriv=1, delta=step_s, use="dot")
    speed = 2.0 * np.pi / (M2_PERIOD_H * SECONDS_PER_HOUR)
    slope_weight /= float(slope_weight @ np.sin(speed * step_s * np.arange(-half, half + 1))) / speed
    windows = np.lib.stride_tricks.sliding_window_view(np.pad(level_m, half, constant_values=np.nan), points)
    level, slope = windows @ smooth_weight, windows @ slope_weight
    # Left over at the middle of a window is a part 1 - w0 of the variance of a sample, w0 its own weight.
    scatter = level_m - level
    known = np.isfinite(scatter)
    deviation_m = np.sqrt(np.mean(scatter[known] ** 2) / (1.0 - smooth_weight[half])) if known.any() else np.nan
    area = np.full(level.shape, np.nan)
    area[known] = area_at(level[known])
    return DischargeSeries(
        source="by storage",
        time_s=time_s,
        discharge_m3_s=area * slope - inflow_m3_s,
        standard_error_m3_s=area * deviation_m * float(np.linalg.norm(slope_weight)),
    )


def campaign_spans(time_s: FloatArray, longest_pause_s: float = LONGEST_PAUSE_S) -> tuple[tuple[float, float], ...]:
    """Return first and last instant of each campaign: measurements with no longer pause than 3 h between them.

    A single measurement is no campaign.
    """
    breaks = np.flatnonzero(np.diff(time_s) > longest_pause_s) + 1
    return tuple((float(part[0]), float(part[-1])) for part in np.split(time_s, breaks) if part.size > 1)


def _slack_band(flow_m3_s: FloatArray, standard_error_m3_s: FloatArray) -> FloatArray:
    """Return below what size a discharge cannot be told from slack."""
    errors = np.nan_to_num(standard_error_m3_s, nan=0.0)
    return np.maximum(SLACK_ERRORS * errors, SLACK_PART * float(np.abs(flow_m3_s).max()))


def slack_times(series: DischargeSeries, start_s: float, end_s: float) -> FloatArray:
    """Return when the discharge turned in a span, noise around zero counted once.

    A turn lies between values of either sign that are beyond two standard errors and 2 % of the peak (common practice,
    no source); where the series passes zero several times between them, it is the middle of the first and the last.

    Parameters
    ----------
    series : DischargeSeries
        NaN is left out.
    start_s, end_s : float
        The span.
    """
    inside = (series.time_s >= start_s) & (series.time_s <= end_s) & np.isfinite(series.discharge_m3_s)
    times, flows = series.time_s[inside], series.discharge_m3_s[inside]
    if times.size < 2:
        return np.empty(0)
    sure = np.flatnonzero(np.abs(flows) > _slack_band(flows, series.standard_error_m3_s[inside]))
    turns = []
    for before, after in pairwise(sure):
        if flows[before] * flows[after] < 0.0:
            zeros = zero_times(times[before : after + 1], flows[before : after + 1])
            turns.append(0.5 * (zeros[0] + zeros[-1]))
    return np.array(turns)


def _cut(series: DischargeSeries, start_s: float, end_s: float) -> tuple[FloatArray, FloatArray]:
    """Return instants and values from start to end, with both ends and the zeros put in linearly."""
    inside = (series.time_s > start_s) & (series.time_s < end_s)
    times = np.concatenate(([start_s], series.time_s[inside], [end_s]))
    flows = np.interp(times, series.time_s, series.discharge_m3_s)
    zeros = zero_times(times, flows)
    times, first = np.unique(np.concatenate((times, zeros)), return_index=True)
    return times, np.concatenate((flows, np.zeros(zeros.size)))[first]


def _volume_error(series: DischargeSeries, start_s: float, end_s: float, sign: float) -> float:
    """Return the standard error of the volume in one direction, by the trapezoid rule's weights."""
    inside = (series.time_s >= start_s) & (series.time_s <= end_s)
    times, flows, errors = (row[inside] for row in (series.time_s, series.discharge_m3_s, series.standard_error_m3_s))
    if not series.independent or times.size < 2:
        return float("nan")
    steps = np.diff(times)
    weights = 0.5 * (np.append(steps, 0.0) + np.append(0.0, steps))
    return float(np.linalg.norm((weights * errors)[sign * flows > 0.0]))


def tidal_discharge(series: DischargeSeries, start_s: float, end_s: float) -> TidalDischarge:
    """Return volumes, peaks and slack of one series over a span, linear between its values.

    Parameters
    ----------
    series : DischargeSeries
        Must reach from start to end; a hole (NaN) between makes volumes and peaks NaN.
    start_s, end_s : float
        The span, start before end.

    Raises
    ------
    DomainError
        If the series does not reach from start to end, or the span is empty.
    """
    if not series.time_s[0] <= start_s < end_s <= series.time_s[-1]:
        raise DomainError(f"discharge {series.source}: the span to compare is empty or beyond the series")
    times, flows = _cut(series, start_s, end_s)
    volumes, peaks, peak_times = [], [], []
    for sign in (1.0, -1.0):
        directed = np.maximum(sign * flows, 0.0)
        volumes.append(float(np.trapezoid(directed, times)))
        peaks.append(float(directed.max()))
        peak_times.append(float(times[np.argmax(directed)]) if directed.max() > 0.0 else float("nan"))
    return TidalDischarge(
        source=series.source,
        start_s=start_s,
        end_s=end_s,
        flood_volume_m3=volumes[0],
        ebb_volume_m3=volumes[1],
        flood_volume_error_m3=_volume_error(series, start_s, end_s, 1.0),
        ebb_volume_error_m3=_volume_error(series, start_s, end_s, -1.0),
        flood_peak_m3_s=peaks[0],
        ebb_peak_m3_s=peaks[1],
        flood_peak_time_s=peak_times[0],
        ebb_peak_time_s=peak_times[1],
        slack_time_s=slack_times(series, start_s, end_s),
    )


def _whole_half_tides(measured: DischargeSeries, start_s: float, end_s: float) -> tuple[bool, bool]:
    """Return whether no flood, and no ebb, is cut by an end of the span: the flow there is within the slack."""
    ends = np.interp([start_s, end_s], measured.time_s, measured.discharge_m3_s)
    band = _slack_band(measured.discharge_m3_s, measured.standard_error_m3_s)
    slack = np.interp([start_s, end_s], measured.time_s, band)
    return not bool(np.any(ends > slack)), not bool(np.any(ends < -slack))


def compare_discharges(
    measured: DischargeSeries, others: tuple[DischargeSeries, ...]
) -> tuple[CampaignComparison, ...]:
    """Return, for each campaign, what every source says over the span that all of them share.

    Parameters
    ----------
    measured : DischargeSeries
        Measurements at one opening, or at all together; campaigns are told apart by pauses of over 3 h.
    others : tuple of DischargeSeries
        The same flow by head, by storage, routed.

    Returns
    -------
    tuple of CampaignComparison
        A campaign that shares less than two measurements with the other sources is left out.
    """
    comparisons = []
    for first, last in campaign_spans(measured.time_s):
        start_s = max([first] + [known_span(series)[0] for series in others])
        end_s = min([last] + [known_span(series)[1] for series in others])
        if np.count_nonzero((measured.time_s >= start_s) & (measured.time_s <= end_s)) < 2:
            continue
        whole_flood, whole_ebb = _whole_half_tides(measured, start_s, end_s)
        comparisons.append(
            CampaignComparison(
                start_s=start_s,
                end_s=end_s,
                whole_flood=whole_flood,
                whole_ebb=whole_ebb,
                rows=tuple(tidal_discharge(series, start_s, end_s) for series in (measured, *others)),
            )
        )
    return tuple(comparisons)


def known_span(series: DischargeSeries) -> tuple[float, float]:
    """Return the first and the last instant with a value; an empty span, inf to -inf, where there is none."""
    known = series.time_s[np.isfinite(series.discharge_m3_s)]
    return (float(known[0]), float(known[-1])) if known.size else (np.inf, -np.inf)
