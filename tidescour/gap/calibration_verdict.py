"""What a calibration cannot tell: refusals before and after the fit, and findings beside its numbers."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy.stats import chi2

from tidescour.errors import Finding, FitError
from tidescour.gap.calibration_records import Estimate, Evidence, Simulate
from tidescour.units import M2_PERIOD_H, SECONDS_PER_HOUR, FloatArray

WHERE = "calibration"

MOVED = 0.1
"""Sensitivity is told for 10 % more coefficient or area and for 0.1 m of offset."""

DETERMINED_LOGARITHM = float(np.log(1.25))
DETERMINED_OFFSET_M = 0.1
"""A number is of use when its 95 % interval is within a factor of 1.25, or 0.1 m, either way: judgement, no source."""

FEWEST_TIDES = 2.0
STILL_M = 1e-6
STILL_PART = 1e-6
"""Levels that move less, and discharges by less than this part of their standard error, do not move."""

SMALLEST_HEAD_M = 0.01
HEAD_OVER_NOISE = 2.0
LEAST_SIGNAL, WEAK_SIGNAL = 0.2, 0.5
"""Change for 10 % over the noise below which nothing is told, or with care: judgement, no source. A rms head of twice
the noise gives about 0.4."""

TIED = 0.95
COEFFICIENTS, AREA_FACTORS, OFFSET_M = (0.1, 3.0), (0.5, 2.0), 0.5
"""Beyond these an estimate asks for another cause: judgement, no source."""

WORDS = {
    "coefficient": "the coefficient",
    "area_factor": "the area factor",
    "datum_offset_m": "the offset of the datum",
}


def is_determined(name: str, half_width: float) -> bool:
    """Return whether half a 95 % interval, of the logarithm or [m] of the offset, is narrow enough to be of use."""
    return half_width <= (DETERMINED_OFFSET_M if name == "datum_offset_m" else DETERMINED_LOGARITHM)


def refuse_unfittable(names: tuple[str, ...], start: FloatArray, simulate: Simulate, evidence: Evidence) -> None:
    """Refuse what no fit should be tried on.

    Parameters
    ----------
    names, start, simulate, evidence
        As `estimate` takes them.

    Raises
    ------
    FitError
        If the levels cover less than two tides, or neither levels nor discharges move with a parameter.
    """
    known = evidence.level_time_s[np.isfinite(evidence.level_m)]
    steps = np.diff(known)
    covered_h = float(np.minimum(steps, SECONDS_PER_HOUR).sum()) / SECONDS_PER_HOUR
    if covered_h < FEWEST_TIDES * M2_PERIOD_H:
        raise FitError(
            f"calibration: {known.size} basin levels cover {covered_h:.3g} h; at least {FEWEST_TIDES:g} tides "
            f"({FEWEST_TIDES * M2_PERIOD_H:.3g} h) are needed after what is held back; give a longer span in "
            "[calibration], or hold back less"
        )
    first = simulate(start)
    for place, name in enumerate(names):
        if name == "datum_offset_m":
            continue
        more = start.copy()
        more[place] *= 1.0 + MOVED
        then = simulate(more)
        levels = np.abs(then.level_m - first.level_m)
        discharges = np.abs(then.discharge_m3_s - first.discharge_m3_s) / evidence.standard_error_m3_s
        if levels.max() < STILL_M and (discharges.size == 0 or discharges.max() < STILL_PART):
            raise FitError(
                f"calibration: nothing moves when {WORDS[name]} is raised by a tenth: no water passes the openings in "
                "that span; compare crest_level_m of [[calibration.opening]] with the levels, or choose a span in "
                "which the gap ran"
            )


def refuse_untellable(estimate: Estimate, head_m: FloatArray) -> None:
    """Refuse an estimate of coefficient or area factor that rests on noise.

    Parameters
    ----------
    estimate : Estimate
        The fit.
    head_m : (n,) array
        Sea level less routed basin level in the span [m]; NaN is left out.

    Raises
    ------
    FitError
        If measured discharges do not tell a parameter, and the head is under 1 cm (root mean square), or under twice
        the noise of the levels while 10 % more of the parameter moves them by less than a fifth of that noise.
    """
    head_rms_m = float(np.sqrt(np.nanmean(np.square(head_m))))
    for place, name in enumerate(estimate.names):
        if name == "datum_offset_m":
            continue
        if estimate.discharge_count and estimate.discharge_signal[place] >= LEAST_SIGNAL:
            continue
        signal = float(estimate.level_signal[place])
        faint = signal < LEAST_SIGNAL and head_rms_m < HEAD_OVER_NOISE * estimate.residual_std_m
        if head_rms_m < SMALLEST_HEAD_M or faint:
            raise FitError(
                f"calibration: a wide gap tells nothing of {WORDS[name]}: sea and basin stand {head_rms_m:.2g} m apart "
                f"(root mean square), and 10 % more of it moves the basin by {signal * estimate.residual_std_m:.2g} m, "
                f"against {estimate.residual_std_m:.2g} m of noise; calibrate on a span with a narrower gap, or leave "
                f"{name} out of fit"
            )


def _finding(severity: str, code: str, message: str) -> Finding:
    return Finding(severity="warning" if severity == "warning" else "note", code=code, where=WHERE, message=message)


def _undetermined(found: Estimate) -> list[Finding]:
    """Return what the evidence leaves open, and what it fixes nevertheless."""
    findings = []
    for name, value, low, high, determined in zip(
        found.names, found.estimate, found.ci95_low, found.ci95_high, found.determined, strict=True
    ):
        if not determined:
            if np.isfinite(high):
                told = (
                    f"{name} = {value:.3g} may lie anywhere between {low:.3g} and {high:.3g} (95 %): too wide for use"
                )
            else:
                told = f"{name}: the evidence sets no bounds; {value:.3g} is only where the search came to rest"
            findings.append(_finding("warning", "not-determined", told))
    if found.ratio is None or not np.isfinite(found.ratio.ci95_high):
        return findings
    pair = found.correlation[found.names.index("coefficient"), found.names.index("area_factor")]
    if abs(pair) > TIED:
        cause = "measured discharges are needed for each alone" if found.discharge_count == 0 else "use them as a pair"
        findings.append(
            _finding(
                "note",
                "tied-parameters",
                f"coefficient and area_factor move together (correlation {pair:.3f}): levels fix their ratio, "
                f"{found.ratio.estimate:.3g} ({found.ratio.ci95_low:.3g} to {found.ratio.ci95_high:.3g}); {cause}",
            )
        )
    return findings


def _implausible(found: Estimate) -> list[Finding]:
    """Return estimates that ask for another cause than the one that was fitted."""
    findings = []
    for name, value, determined in zip(found.names, found.estimate, found.determined, strict=True):
        if name == "datum_offset_m":
            low, high, cause = -OFFSET_M, OFFSET_M, "look at the datums of both gauges"
        elif name == "coefficient":
            low, high, cause = *COEFFICIENTS, "look at crest and width of the openings, and at the basin's storage"
        else:
            low, high, cause = *AREA_FACTORS, "look at the basin's storage and at what else fills it"
        if determined and not low <= value <= high:
            findings.append(
                _finding(
                    "warning",
                    "at-odds-with-physics",
                    f"{name} = {value:.3g} is outside {low:g} to {high:g}: the fit takes up something else; {cause}",
                )
            )
    return findings


def _noisy(found: Estimate) -> list[Finding]:
    """Return what the residuals say against the model."""
    findings = []
    if found.tidal_excess > 1.0:
        findings.append(
            _finding(
                "warning",
                "tidal-residual",
                f"residuals at the tide's periods are {np.sqrt(found.tidal_excess):.2g} times the noise between them: "
                "what is left is not weather but the model (storage by level, length of the basin, lag or position of "
                "a gauge); the noise of the levels was raised by that factor, for what the fit cannot see of it",
            )
        )
    count = found.discharge_count
    if count and found.chi_square > chi2.ppf(0.95, count):
        findings.append(
            _finding(
                "warning",
                "discharges-disagree",
                f"measured discharges lie {np.sqrt(found.chi_square / count):.2g} standard errors from the fit (root "
                f"mean square of {count}); their standard errors were widened by that factor",
            )
        )
    for place, name in enumerate(found.names):
        weak = found.level_signal[place] < WEAK_SIGNAL and not found.discharge_signal[place] >= WEAK_SIGNAL
        if name != "datum_offset_m" and weak:
            moved_m = float(found.level_signal[place]) * found.residual_std_m
            findings.append(
                _finding(
                    "warning",
                    "weak-signal",
                    f"10 % more of {name} moves the basin by {moved_m:.2g} m only, against "
                    f"{found.residual_std_m:.2g} m of noise: a small error of datum or clock counts for as much",
                )
            )
    return findings


def findings_of(found: Estimate, settled: bool) -> Estimate:
    """Return the estimate with what a reader must know of it.

    Parameters
    ----------
    found : Estimate
        The fit.
    settled : bool
        Whether parameters and noise came to rest.
    """
    findings = [*_undetermined(found), *_implausible(found), *_noisy(found)]
    if not settled:
        findings.append(
            _finding("warning", "not-settled", "parameters and noise did not come to rest; estimates are preliminary")
        )
    return replace(found, findings=(*found.findings, *findings))
