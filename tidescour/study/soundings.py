"""What soundings say about a programme: factor and forecast of each place, days on which works stop."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np

from tidescour.bed.history import place_name
from tidescour.errors import Finding
from tidescour.gauge.records import InputFile
from tidescour.plan.models import Plan, Stage
from tidescour.plan.models_bed import PlaceBed
from tidescour.scour.laws import GrowthLaw
from tidescour.study.growth_factor import DepthBand, DepthSounding, Hole, Scatter, fit_factor, forecast, growth_along
from tidescour.study.stops import StopDate, stop_dates, stop_findings
from tidescour.units import SECONDS_PER_DAY, FloatArray, read_only, seconds_since_epoch, utc_text


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Forecast:
    """A place from its last sounding (without any, the start of the programme) to the end, at the ends of cycles.

    Parameters
    ----------
    band : DepthBand
        Percentiles of the depth.
    as_planned_m : (m,) array
        Depth of the law with the plan's own factor from the start on [m].
    restart_m, restart_unscaled_m : (m,) array
        Depth of the law from the last sounded depth on, with the factor found and with the plan's own [m]; NaN without
        a sounding.
    plain_ratio_m : (m,) array
        As planned times the sounded over the planned depth at the last sounding [m]; NaN without one, or where that
        planned depth is 0.
    """

    band: DepthBand
    as_planned_m: FloatArray
    restart_m: FloatArray
    restart_unscaled_m: FloatArray
    plain_ratio_m: FloatArray

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in ("as_planned_m", "restart_m", "restart_unscaled_m", "plain_ratio_m"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
            if getattr(self, key).shape != self.band.time_s.shape:
                raise ValueError(f"{key} must be as long as the band")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SoundedPlace:
    """One place with its soundings, in the order of time; none where it was not sounded.

    Parameters
    ----------
    place : PlaceBed
        Opening and side.
    soundings : tuple of DepthSounding
        In the order of time.
    growth_factor : (3,) array
        Percentiles of the factor that multiplies the law's depth, the plan's own included.
    prior_factor : (3,) array
        The same before any sounding.
    as_planned_m, with_factor_m, innovation : (k,) array
        At each sounding, depth of the law from the start with the plan's own factor and with that found [m], and how
        far the sounding lies from what was to be expected, over its standard deviation.
    hindcast_time_s, hindcast_m : (m,) array
        Depth as planned over the whole programme [m], seconds since 1970.
    forecast : Forecast
        From the last sounding on.
    stops : tuple of StopDate
        One a criterion that the plan has.
    findings : tuple of Finding
        What a reader must know.
    """

    place: PlaceBed
    soundings: tuple[DepthSounding, ...]
    growth_factor: FloatArray
    prior_factor: FloatArray
    as_planned_m: FloatArray
    with_factor_m: FloatArray
    innovation: FloatArray
    hindcast_time_s: FloatArray
    hindcast_m: FloatArray
    forecast: Forecast
    stops: tuple[StopDate, ...]
    findings: tuple[Finding, ...]

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in (
            "growth_factor",
            "prior_factor",
            "as_planned_m",
            "with_factor_m",
            "innovation",
            "hindcast_time_s",
            "hindcast_m",
        ):
            object.__setattr__(self, key, read_only(getattr(self, key)))
        if self.hindcast_time_s.shape != self.hindcast_m.shape:
            raise ValueError("hindcast_m must be as long as hindcast_time_s")
        for key in ("as_planned_m", "with_factor_m", "innovation"):
            if getattr(self, key).shape != (len(self.soundings),):
                raise ValueError(f"{key} must have one value a sounding")

    @property
    def hardly_told(self) -> bool:
        """Whether the factor is about as uncertain as it was without soundings."""
        return _hardly_told(self.growth_factor, self.prior_factor)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SoundingResults:
    """Everything that soundings say: places in the order of the plan, files beside the plan, findings of all steps."""

    plan: Plan
    law: GrowthLaw
    places: tuple[SoundedPlace, ...]
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...]


def programme_span(stages: Sequence[Stage]) -> tuple[float, float]:
    """Return the first start and the last end of stages, seconds since 1970."""
    return (
        min(seconds_since_epoch(stage.start) for stage in stages),
        max(seconds_since_epoch(stage.end) for stage in stages),
    )


def soundings_at(plan: Plan, place: PlaceBed) -> tuple[DepthSounding, ...]:
    """Return the soundings of one place in the order of time, as depths below its original bed."""
    soundings = (
        DepthSounding(
            time_s=seconds_since_epoch(each.date),
            depth_m=each.depth_m if each.depth_m is not None else place.bed_level_m - (each.bed_level_m or 0.0),
            standard_error_m=each.standard_error_m,
            upper_slope_cot=float("nan") if each.upper_slope_cot is None else each.upper_slope_cot,
        )
        for each in plan.sounding
        if (each.opening, each.side) == (place.opening, place.side)
    )
    return tuple(sorted(soundings, key=lambda each: each.time_s))


def sounded_place(place: PlaceBed, hole: Hole, soundings: Sequence[DepthSounding], scatter: Scatter) -> SoundedPlace:
    """Estimate the growth factor of one place and carry its forecast on from the last sounding.

    Parameters
    ----------
    place : PlaceBed
        Length, slope, margin and criteria.
    hole : Hole
        What it grows by.
    soundings : sequence of DepthSounding
        In the order of time; none leaves the band that is known beforehand.
    scatter : Scatter
        Of the factor beforehand, and of growth.

    Returns
    -------
    SoundedPlace
        With warnings where soundings hardly tell, lie far from what was known or follow no one factor, and for each
        limit that is near or reached.

    Raises
    ------
    DomainError
        As `fit_factor`.
    """
    fit = fit_factor(hole, soundings, scatter)
    band = forecast(hole, fit, scatter)
    factor = fit.factor
    median = float(factor[1]) if soundings else 1.0
    times = [sounding.time_s for sounding in soundings]
    as_planned_m, with_factor_m = (depths_at(hole, times, each) for each in (1.0, median))
    found = _forecast(hole, band, soundings, median)
    stops = stop_dates(place, soundings, band)
    prior = fit_factor(hole, (), scatter).factor
    time_s, depth_m = growth_along(hole, hole.start_depth_m, hole.start_s, hole.end_s)
    return SoundedPlace(
        place=place,
        soundings=tuple(soundings),
        growth_factor=hole.growth_factor * factor,
        prior_factor=hole.growth_factor * prior,
        as_planned_m=as_planned_m,
        with_factor_m=with_factor_m,
        innovation=fit.innovation,
        hindcast_time_s=time_s,
        hindcast_m=depth_m,
        forecast=found,
        stops=stops,
        findings=(
            *_factor_findings(place, soundings, factor, prior, fit.innovation, scatter),
            *stop_findings(place, stops),
        ),
    )


def depths_at(hole: Hole, times_s: Sequence[float], factor: float) -> FloatArray:
    """(k,) array of depths [m] of the law from the start on, at moments in order, with a factor on the plan's own."""
    depths, depth_m, from_s = np.empty(len(times_s)), hole.start_depth_m, hole.start_s
    for at, to_s in enumerate(times_s):
        depth_m = float(growth_along(hole, depth_m, from_s, to_s, factor)[1][-1])
        depths[at], from_s = depth_m, to_s
    return depths


def _forecast(hole: Hole, band: DepthBand, soundings: Sequence[DepthSounding], factor: float) -> Forecast:
    from_s = float(band.time_s[0])

    def on(depth_m: float, times_factor: float) -> FloatArray:
        return growth_along(hole, depth_m, from_s, hole.end_s, times_factor)[1]

    planned_now = float(depths_at(hole, [from_s], 1.0)[0])
    as_planned = on(planned_now, 1.0)
    nothing = np.full(band.time_s.shape, np.nan)
    if not soundings:
        return Forecast(
            band=band, as_planned_m=as_planned, restart_m=nothing, restart_unscaled_m=nothing, plain_ratio_m=nothing
        )
    last_m = soundings[-1].depth_m
    return Forecast(
        band=band,
        as_planned_m=as_planned,
        restart_m=on(last_m, factor),
        restart_unscaled_m=on(last_m, 1.0),
        plain_ratio_m=as_planned * (last_m / planned_now) if planned_now > 0.0 else nothing,
    )


_LEAST_SHARE: Final = 0.9
"""Width of the factor's interval over that beforehand, in logarithms, from which soundings hardly tell (judgement)."""
_FAR: Final = 3.0
"""Standard deviations from which a factor or a sounding is far off (judgement)."""


def _hardly_told(factor: FloatArray, prior: FloatArray) -> bool:
    return bool(np.log(factor[2] / factor[0]) >= _LEAST_SHARE * np.log(prior[2] / prior[0]))


def _factor_findings(
    place: PlaceBed,
    soundings: Sequence[DepthSounding],
    factor: FloatArray,
    prior: FloatArray,
    innovation: FloatArray,
    scatter: Scatter,
) -> Iterator[Finding]:
    """Find whether the soundings of a place can be trusted with its factor; `factor` is that on the plan's own."""
    if not soundings:
        return

    def found(severity: Literal["note", "warning"], code: str, message: str) -> Finding:
        return Finding(severity=severity, code=code, where=place_name(place.opening, place.side), message=message)

    if _hardly_told(factor, prior):
        yield found(
            "warning",
            "soundings-hardly-tell",
            "the soundings leave the growth factor about as uncertain as it was without them; sound again after more "
            "growth, or with a smaller error",
        )
    if abs(float(np.log(factor[1]))) > _FAR * scatter.prior:
        yield found(
            "warning",
            "factor-far-from-expected",
            f"a factor of {factor[1]:.2f} on the plan's own lies over {_FAR:g} times soundings.prior_scatter = "
            f"{scatter.prior:g} away from 1: look at bed level, velocities and soundings before it is used",
        )
    worst = int(np.argmax(np.abs(innovation)))
    if abs(float(innovation[worst])) > _FAR:
        yield found(
            "warning",
            "soundings-disagree",
            f"no one factor fits: the sounding of {utc_text(soundings[worst].time_s)} lies "
            f"{abs(float(innovation[worst])):.1f} standard deviations "
            f"{'over' if innovation[worst] > 0.0 else 'under'} what the best factor and the soundings before it "
            "foretell; check it, its standard error, start_depth_m and what the stage was like",
        )
    if place.growth_factor != 1.0:
        yield found(
            "note",
            "factor-in-plan",
            f"the plan has growth_factor = {place.growth_factor:g} already, and the soundings are weighed against it; "
            "if it came from them they count twice: leave it out to estimate it anew",
        )


def days_late(planned_s: float, actual_s: float) -> float:
    """Return how late something came [days], negative where early, NaN where nothing was planned."""
    return (actual_s - planned_s) / SECONDS_PER_DAY


def sounding_notes(plan: Plan, places: Sequence[SoundedPlace]) -> tuple[Finding, ...]:
    """Tell which places have the forecast that is known beforehand alone, and what the past was computed on."""
    bare = [place_name(each.place.opening, each.place.side) for each in places if not each.soundings]
    findings = []
    if bare:
        message = (
            f"no sounding of {'; '.join(bare)}: the growth factor stays that of the plan, and the band is the scatter "
            f"beforehand of {plan.soundings.prior_scatter:g} alone"
        )
        findings.append(Finding(severity="note", code="not-sounded", where="sounding", message=message))
    last_s = max(seconds_since_epoch(sounding.date) for sounding in plan.sounding)
    findings += [
        Finding(
            severity="note",
            code="hindcast-on-tide",
            where=f"stage {stage.name!r}",
            message='lies, or begins, before the last sounding and is computed on the predicted tide; sea = "measured" '
            "would compute it on what really happened",
        )
        for stage in plan.stage
        if stage.sea == "tide" and seconds_since_epoch(stage.start) < last_s
    ]
    return tuple(findings)
