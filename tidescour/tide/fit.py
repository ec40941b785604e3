"""From a record, or a table of constants, to the tide of one side."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from tidescour.errors import Finding, FitError, PlanError
from tidescour.gauge.records import GaugeRecord
from tidescour.plan.kinds import Side
from tidescour.plan.models import Tide
from tidescour.tide.choice import ConstituentChoice, check_constituents, choose_constituents, missing_neighbours
from tidescour.tide.design import design_condition
from tidescour.tide.library import (
    SMALLEST_LATITUDE_DEG,
    constituent_frequencies,
    fitted_names,
    name_problem,
    predicted_tide,
    solve_constants,
)
from tidescour.tide.records import TideConstants, TideFit
from tidescour.units import SECONDS_PER_DAY, SECONDS_PER_HOUR, FloatArray, utc_text

SHORTEST_RECORD_S: Final = 15.0 * SECONDS_PER_DAY

MANY_SAMPLES: Final = 100_000
"""A fit of more is thinned where it can be: the library takes 9 to 12 kB a sample."""

SCREENING_SAMPLES: Final = 6_000
"""Enough for a fit that only serves to find samples far from the tide: four months at 30 min."""

MOST_SAMPLES: Final = 200_000
"""About 2 GB in the library: 22 years of hours."""

THINNED_STEPS_S: Final = (600.0, 1200.0, 1800.0, 3600.0)

CONDITION_WARNED: Final = 10.0
CONDITION_REFUSED: Final = 50.0
"""Condition numbers of a fit (common practice, no source)."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Samples:
    """The good samples of one gauge, or of a part of its record."""

    side: Side
    time_s: FloatArray
    level_m: FloatArray
    step_s: float

    @property
    def span_s(self) -> float:
        """Time between the first and the last sample [s]."""
        return float(self.time_s[-1] - self.time_s[0])

    @property
    def share(self) -> float:
        """Samples over those that a gapless record would have in the span."""
        return min(1.0, self.time_s.size / (1.0 + round(self.span_s / self.step_s)))

    @property
    def length_s(self) -> float:
        """Time that the samples stand for [s], one step each, never more than the span and a step."""
        return (self.span_s + self.step_s) * self.share

    def part(self, start_s: float, end_s: float) -> _Samples:
        """Return the samples from `start_s` to `end_s`, both included."""
        inside = (self.time_s >= start_s) & (self.time_s <= end_s)
        return _Samples(side=self.side, time_s=self.time_s[inside], level_m=self.level_m[inside], step_s=self.step_s)

    def thinned(self, step_s: float) -> _Samples:
        """Return the first sample of every full `step_s` of the clock."""
        first = np.flatnonzero(np.diff(np.floor(self.time_s / step_s), prepend=-np.inf))
        return _Samples(side=self.side, time_s=self.time_s[first], level_m=self.level_m[first], step_s=step_s)


def fit_record(record: GaugeRecord, options: Tide, latitude_deg: float, many_samples: int = MANY_SAMPLES) -> TideFit:
    """Harmonic constants of one record, from its good samples (flags 1 and 2).

    Parameters
    ----------
    record : GaugeRecord
        One gauge; samples flagged 3, 4 or 9 do not enter.
    options : Tide
        `constituents` and `infer` of the plan.
    latitude_deg : float
        Latitude, -90 to 90 [degrees].
    many_samples : int
        More are thinned to a coarser step where the constituents allow it; `SCREENING_SAMPLES` serve a fit that the
        record is only held against.

    Returns
    -------
    TideFit
        `explained_share` is NaN for a record that does not vary. The findings tell of thinned samples, neighbours
        that cannot be told apart or are missing, and an ill-conditioned fit.

    Raises
    ------
    FitError
        If the good samples stand for under 15 days, are too many to fit at once, cannot tell the constituents apart
        (condition number over 50), or the list or the inference of the plan cannot be used.
    """
    samples = _good_samples(record)
    choice = _choice(samples.span_s, samples.share, samples.step_s, options)
    return _fit(samples, choice, options, latitude_deg, many_samples)


def fit_pair(sea: GaugeRecord, basin: GaugeRecord, options: Tide, latitude_deg: float) -> tuple[TideFit, TideFit]:
    """Harmonic constants of both sides on the span that both records share, with one list of constituents.

    With ``auto`` the list is what the record with fewer good samples, and the coarser step, can bear.

    Parameters
    ----------
    sea, basin : GaugeRecord
        The two gauges.
    options, latitude_deg
        As in `fit_record`.

    Raises
    ------
    FitError
        As in `fit_record`, and if the records share under 15 days.
    """
    whole = (_good_samples(sea), _good_samples(basin))
    start_s = max(float(samples.time_s[0]) for samples in whole)
    end_s = min(float(samples.time_s[-1]) for samples in whole)
    parts = tuple(samples.part(start_s, end_s) for samples in whole)
    for samples in parts:
        _check_length(samples, "of the span that both records share")
    shorter = min(parts, key=lambda samples: samples.span_s * samples.share)
    coarser_step_s = max(samples.step_s for samples in parts)
    choice = _choice(shorter.span_s, shorter.share, coarser_step_s, options)
    sea_fit, basin_fit = (_fit(samples, choice, options, latitude_deg) for samples in parts)
    return sea_fit, basin_fit


def fit_from_table(
    constituents: Sequence[str],
    amplitude_m: FloatArray,
    phase_deg: FloatArray,
    mean_m: float,
    latitude_deg: float,
) -> TideFit:
    """Sea tide from a table of constants, where there is no sea record.

    Parameters
    ----------
    constituents : sequence of str
        Names as the fit has them; no two alike.
    amplitude_m, phase_deg : (n,) array
        Amplitudes [m], not negative, and Greenwich phase lags [degrees, any turn]; finite.
    mean_m : float
        Mean sea level above the site datum [m].
    latitude_deg : float
        Latitude, -90 to 90 [degrees].

    Returns
    -------
    TideFit
        `source` is ``table``; what a record would tell is NaN.

    Raises
    ------
    PlanError
        If a name is unknown or stands twice, or a number is out of range; all problems at once.
    """
    amplitude_m, phase_deg = np.asarray(amplitude_m, dtype=np.float64), np.asarray(phase_deg, dtype=np.float64)
    if not len(constituents) == amplitude_m.size == phase_deg.size:
        raise PlanError("tide.sea_constants: each constituent needs one amplitude_m and one phase_deg")
    problems = [problem for name in constituents if (problem := name_problem(name)) is not None]
    problems += [f"{name} stands twice" for name in dict.fromkeys(constituents) if list(constituents).count(name) > 1]
    for name, amplitude, phase in zip(constituents, amplitude_m, phase_deg, strict=True):
        if not (np.isfinite(amplitude) and amplitude >= 0.0):
            problems.append(f"{name}: amplitude_m {amplitude} must be finite and not negative")
        if not np.isfinite(phase):
            problems.append(f"{name}: phase_deg {phase} must be finite")
    if not constituents:
        problems.append("the table holds no constituent")
    if not np.isfinite(mean_m):
        problems.append(f"tide.sea_mean_m {mean_m} must be finite")
    if problems:
        raise PlanError(*(f"tide.sea_constants: {problem}" for problem in problems))
    return TideFit(
        side="sea",
        constants=TideConstants(
            constituents=tuple(constituents),
            amplitude_m=amplitude_m,
            phase_deg=phase_deg % 360.0,
            mean_m=float(mean_m),
            latitude_deg=latitude_deg,
        ),
        source="table",
        start_s=float("nan"),
        end_s=float("nan"),
        samples=0,
        explained_share=float("nan"),
        residual_std_m=float("nan"),
        choice=f"given in a table: {len(constituents)} constituents",
        findings=(*_yearly_phases(constituents), *_latitude_note(latitude_deg)),
    )


def _yearly_phases(constituents: Sequence[str]) -> tuple[Finding, ...]:
    """Warn of constituents whose phase depends on who counts it.

    The turn is the longitude of the sun's perigee (283 degrees in 2016, 1.7 more a century), and a right angle for S1.
    """
    found = [name for name in ("SA", "S1") if name in constituents]
    if not found:
        return ()
    message = (
        f"{' and '.join(found)}: phases are counted from the perigee of the sun here; most lists of agencies count SA "
        "from the equinox and S1 from the mean sun, then add 77 degrees to SA and 193 degrees to S1"
    )
    return (Finding(severity="warning", code="phase-reference", where="tide.sea_constants", message=message),)


def _good_samples(record: GaugeRecord) -> _Samples:
    good = record.good
    if np.count_nonzero(good) < 2:
        raise FitError(f"{record.side} record: no good samples, so no tide; {_remedy(record.side)}")
    samples = _Samples(side=record.side, time_s=record.time_s[good], level_m=record.level_m[good], step_s=record.step_s)
    _check_length(samples, f"from {utc_text(samples.time_s[0])} to {utc_text(samples.time_s[-1])}")
    return samples


def _check_length(samples: _Samples, where: str) -> None:
    length_s = samples.length_s if samples.time_s.size > 1 else 0.0
    if length_s < SHORTEST_RECORD_S:
        raise FitError(
            f"{samples.side} record: {length_s / SECONDS_PER_HOUR:.1f} h of good samples {where}, a tide needs "
            f"{SHORTEST_RECORD_S / SECONDS_PER_HOUR:.0f} h (15 days); {_remedy(samples.side)}"
        )


def _remedy(side: Side) -> str:
    if side == "sea":
        return "give a longer record in records.sea, or constants in tide.sea_constants with tide.sea_mean_m"
    return 'give a longer record in records.basin, or stages with basin = "routed" or "measured"'


def _choice(span_s: float, share: float, step_s: float, options: Tide) -> ConstituentChoice:
    """Return what the plan asks for, inferred constituents and their references included."""
    if options.constituents == "auto":
        choice = choose_constituents(span_s, share, step_s)
    else:
        choice = check_constituents(options.constituents, options.infer.keys(), span_s, share, step_s)
    names = fitted_names(choice.names, options.infer)
    added = [reference for reference, _, _ in options.infer.values() if reference not in choice.names]
    if added:
        raise FitError(
            f"tide.infer: {', '.join(dict.fromkeys(added))} is not among the constituents to fit ({choice.text}); "
            "infer from one that is"
        )
    text = choice.text
    if options.infer:
        text += f"; inferred: {', '.join(f'{name} from {row[0]}' for name, row in options.infer.items())}"
    return ConstituentChoice(names=names, text=text, findings=choice.findings)


def _fit(
    samples: _Samples,
    choice: ConstituentChoice,
    options: Tide,
    latitude_deg: float,
    many_samples: int = MANY_SAMPLES,
) -> TideFit:
    where = f"records.{samples.side}"
    used = _fewer_samples(samples, choice.names, many_samples)
    free = [name for name in choice.names if name not in options.infer]
    condition = _condition_findings(used, free, where)
    constants = solve_constants(used.time_s, used.level_m, choice.names, options.infer, latitude_deg)
    residual_m = used.level_m - constants.mean_m - predicted_tide(constants, used.time_s)
    varies = float(np.ptp(used.level_m)) > 0.0
    return TideFit(
        side=samples.side,
        constants=constants,
        source="record",
        start_s=float(samples.time_s[0]),
        end_s=float(samples.time_s[-1]),
        samples=used.time_s.size,
        explained_share=1.0 - float(np.var(residual_m) / np.var(used.level_m)) if varies else float("nan"),
        residual_std_m=float(np.std(residual_m)),
        choice=choice.text,
        findings=(
            *choice.findings,
            *_thinning_note(samples, used, where),
            *condition,
            *missing_neighbours(choice.names, where),
            *_latitude_note(latitude_deg),
        ),
    )


def _fewer_samples(samples: _Samples, names: Sequence[str], many_samples: int) -> _Samples:
    """Return the samples, thinned to a coarser step where they are too many to fit at once.

    Thinned and not averaged: an average over a step would lower the faster constituents.
    """
    fastest_per_h = float(np.max(constituent_frequencies(names)))
    used = samples
    for step_s in THINNED_STEPS_S:
        slow_enough = fastest_per_h <= 0.4 * SECONDS_PER_HOUR / step_s
        if used.time_s.size > many_samples and step_s > samples.step_s and slow_enough:
            used = samples.thinned(step_s)
    if used.time_s.size > MOST_SAMPLES:
        raise FitError(
            f"{samples.side} record: {used.time_s.size} good samples are more than a fit can hold in memory "
            f"({MOST_SAMPLES}); exclude the earlier years in records.{samples.side}.exclude"
        )
    return used


def _thinning_note(samples: _Samples, used: _Samples, where: str) -> tuple[Finding, ...]:
    if used is samples:
        return ()
    message = (
        f"{samples.time_s.size} good samples are more than a fit needs or can hold: the first of every "
        f"{used.step_s / 60.0:g} min was used, {used.time_s.size} of them"
    )
    return (Finding(severity="note", code="samples-thinned", where=where, message=message),)


def _condition_findings(samples: _Samples, free: Sequence[str], where: str) -> tuple[Finding, ...]:
    condition = design_condition(samples.time_s, free)
    first, second = condition.pair
    found = f"{first} and {second} are hard to tell apart in these samples (condition number {condition.number:.0f}"
    if condition.number > CONDITION_REFUSED:
        raise FitError(
            f"{samples.side} record: {found}, at most {CONDITION_REFUSED:g}); leave the smaller one out of "
            "tide.constituents, infer it in tide.infer, or give a longer record"
        )
    if condition.number <= CONDITION_WARNED:
        return ()
    message = f"{found}, better under {CONDITION_WARNED:g}): their constants may be far off; infer the smaller one"
    return (Finding(severity="warning", code="fit-ill-conditioned", where=where, message=message),)


def _latitude_note(latitude_deg: float) -> tuple[Finding, ...]:
    if abs(latitude_deg) >= SMALLEST_LATITUDE_DEG:
        return ()
    message = (
        f"latitude {latitude_deg:g} degrees: the nodal corrections are those of {SMALLEST_LATITUDE_DEG:g} degrees, as "
        "their formulas fail at the equator"
    )
    return (Finding(severity="note", code="latitude-near-equator", where="site.latitude_deg", message=message),)
