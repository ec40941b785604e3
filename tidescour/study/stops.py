"""Days on which a hole uses up its length of protection, or the works stop."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np

from tidescour.bed.history import place_name
from tidescour.errors import Finding
from tidescour.plan.models_bed import PlaceBed
from tidescour.scour.length import time_reached
from tidescour.scour.records import GrowthCurve
from tidescour.study.growth_factor import DepthBand, DepthSounding
from tidescour.units import utc_text

Criterion = Literal["length", "depth", "slope"]
State = Literal["reached", "expected", "possible", "not expected", "not reached when last sounded", "not sounded"]

_NEAR: Final = 1.5
"""Times the slope at which the works stop, from which a sounded one is near it (judgement)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class StopDate:
    """When a place reaches a limit at which its length is used up or the works stop.

    Parameters
    ----------
    criterion : {"length", "depth", "slope"}
        The given length of protection, the depth at which the works stop, or the slope at which they do.
    limit_depth_m, limit_slope_cot : float
        The depth [m], or for the slope 1 in n; the other NaN.
    state : {"reached", "expected", "possible", "not expected", "not reached when last sounded", "not sounded"}
        Reached at a sounding; expected by the median within the programme; possible within it by the 95 % end of the
        band alone; not expected within it. Slopes are not forecast: reached, not reached when last sounded, or not
        sounded.
    reached_s, median_s, early_s : float
        When it was sounded, when the median has it and when the 95 % end has it: seconds since 1970, NaN where never.
    sounded_s, sounded_slope_cot : float
        When a slope was last sounded, seconds since 1970, and what it was: 1 in this. NaN of a depth, and where no
        slope was.
    """

    criterion: Criterion
    limit_depth_m: float
    limit_slope_cot: float
    state: State
    reached_s: float
    median_s: float
    early_s: float
    sounded_s: float = float("nan")
    sounded_slope_cot: float = float("nan")


def allowed_depth_m(place: PlaceBed) -> float:
    """Return the depth from which the slope rule asks for more than the given length of protection [m]."""
    return place.length_m / (place.failure_slope_cot * place.depth_margin_factor)


def stop_dates(place: PlaceBed, soundings: Sequence[DepthSounding], band: DepthBand) -> tuple[StopDate, ...]:
    """When one place reaches the depth that its length allows, and the criteria at which the works stop.

    Parameters
    ----------
    place : PlaceBed
        Length, slope, margin and criteria.
    soundings : sequence of DepthSounding
        In the order of time.
    band : DepthBand
        Forecast from the last of them on.

    Returns
    -------
    tuple of StopDate
        That of the length, then those that the plan has.
    """
    stops = [_depth_stop("length", allowed_depth_m(place), soundings, band)]
    if place.stop_depth_m is not None:
        stops.append(_depth_stop("depth", place.stop_depth_m, soundings, band))
    if place.stop_slope_cot is not None:
        stops.append(_slope_stop(place.stop_slope_cot, soundings))
    return tuple(stops)


def _depth_stop(criterion: Criterion, limit_m: float, soundings: Sequence[DepthSounding], band: DepthBand) -> StopDate:
    median_s, early_s = (
        time_reached(GrowthCurve(time_s=band.time_s, depth_m=depth_m, stage=("",) * band.time_s.size), limit_m)
        for depth_m in band.depth_m[1:]
    )
    begin_s = float(band.time_s[0])
    reached_s = next((each.time_s for each in soundings if each.depth_m >= limit_m), float("nan"))
    if np.isnan(reached_s) and median_s == begin_s:
        reached_s = begin_s
    state: State
    if not np.isnan(reached_s):
        state = "reached"
    elif not np.isnan(median_s):
        state = "expected"
    else:
        state = "not expected" if np.isnan(early_s) else "possible"
    return StopDate(
        criterion=criterion,
        limit_depth_m=limit_m,
        limit_slope_cot=float("nan"),
        state=state,
        reached_s=reached_s,
        median_s=median_s,
        early_s=early_s,
    )


def _slope_stop(limit_cot: float, soundings: Sequence[DepthSounding]) -> StopDate:
    sounded = [each for each in soundings if not np.isnan(each.upper_slope_cot)]
    reached_s = next((each.time_s for each in sounded if each.upper_slope_cot <= limit_cot), float("nan"))
    state: State = "reached"
    if np.isnan(reached_s):
        state = "not reached when last sounded" if sounded else "not sounded"
    return StopDate(
        criterion="slope",
        limit_depth_m=float("nan"),
        limit_slope_cot=limit_cot,
        state=state,
        reached_s=reached_s,
        median_s=float("nan"),
        early_s=float("nan"),
        sounded_s=sounded[-1].time_s if sounded else float("nan"),
        sounded_slope_cot=sounded[-1].upper_slope_cot if sounded else float("nan"),
    )


_SUBJECTS: Final[dict[Criterion, str]] = {
    "length": "the depth of {limit} m from which the given length is too short",
    "depth": "stop_depth_m = {limit}",
    "slope": "stop_slope_cot = {limit}",
}


def stop_subject(stop: StopDate) -> str:
    """Return the limit of a stop in words."""
    limit = stop.limit_slope_cot if stop.criterion == "slope" else stop.limit_depth_m
    return _SUBJECTS[stop.criterion].format(limit=f"{limit:.4g}")


def stop_findings(place: PlaceBed, stops: Sequence[StopDate]) -> Iterator[Finding]:
    """Find which limits of a place are reached (errors), come within the programme or are near (warnings)."""
    where = place_name(place.opening, place.side)
    for stop in stops:
        subject = stop_subject(stop)
        if stop.state == "reached":
            at = utc_text(round(stop.reached_s))
            yield Finding(severity="error", code="stop-reached", where=where, message=f"{subject} was reached by {at}")
        elif stop.state == "expected":
            message = (
                f"{subject} is expected on {utc_text(round(stop.median_s))} (median), and with a chance of 5 % "
                f"by {utc_text(round(stop.early_s))}"
            )
            yield Finding(severity="warning", code="stop-ahead", where=where, message=message)
        elif stop.state == "possible":
            message = f"{subject} is reached by {utc_text(round(stop.early_s))} with a chance of 5 %, not by the median"
            yield Finding(severity="warning", code="stop-ahead", where=where, message=message)
        elif stop.state == "not reached when last sounded":
            near = stop.sounded_slope_cot <= _NEAR * stop.limit_slope_cot
            message = (
                f"{subject}: slopes are not forecast; last sounded 1 in {stop.sounded_slope_cot:.3g} on "
                f"{utc_text(round(stop.sounded_s))}"
            )
            severity: Literal["warning", "note"] = "warning" if near else "note"
            yield Finding(severity=severity, code="slope-not-forecast", where=where, message=message)
        elif stop.state == "not sounded":
            message = f"{subject} cannot be judged: no sounding here has upper_slope_cot"
            yield Finding(severity="note", code="slope-not-sounded", where=where, message=message)
