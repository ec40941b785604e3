"""Rules of a plan that need more than one key: records, series, tide, basin and bed."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator

from tidescour.plan.draft import Draft
from tidescour.plan.kinds import NAME_LENGTH, NAME_NEEDS, NAME_PATTERN, SIDES
from tidescour.plan.models import Clock, Correction, RecordSource, Series, StageSpan, Tide
from tidescour.plan.models_bed import Bed
from tidescour.plan.problems import KeyPath, Problem, found, listed, suggestion
from tidescour.units import METRES_PER_UNIT

UNITS_OF_QUANTITY = {"level": tuple(METRES_PER_UNIT), "discharge": ("m3/s",), "velocity": ("m/s",)}
LEVEL_WORDS = ("tide", "measured", "routed")
"""What a stage may write for a level besides the name of a series."""


def something_to_read(draft: Draft) -> Iterator[Problem]:
    """Refuse a plan with neither record nor constants, where only these are to be read."""
    if not any(draft.has("records", side) for side in SIDES) and not draft.has("tide", "sea_constants"):
        message = "missing; write [records.sea] or [records.basin], or tide.sea_constants"
        yield Problem(path=("records",), message=message, only_for=("records",))


def one_clock(draft: Draft) -> Iterator[Problem]:
    """Refuse a file with two clocks; without any, every stamp must carry its offset."""
    for path, _ in draft.each_with(Clock):
        if draft.has(*path, "utc_offset") and draft.has(*path, "time_zone"):
            message = "stands beside utc_offset; leave out one of the two"
            yield Problem(path=(*path, "time_zone"), message=message)


def means_have_a_length(draft: Draft) -> Iterator[Problem]:
    """Refuse a mean without length in time, and an instant with one."""
    for path, clock in draft.each_with(Clock, "stamp"):
        has_length = draft.has(*path, "averaging_s")
        if clock.stamp != "instant" and not has_length:
            message = f'missing; stamp = "{clock.stamp}" needs the length of the mean in seconds'
            yield Problem(path=(*path, "averaging_s"), message=message)
        if clock.stamp == "instant" and has_length:
            message = 'stands beside stamp = "instant"; leave it out, or write which mean the stamps stand for'
            yield Problem(path=(*path, "averaging_s"), message=message)


def ranges_run_upwards(draft: Draft) -> Iterator[Problem]:
    """Refuse a sensor range or an excluded spell that runs backwards."""
    for path, source in draft.each_with(RecordSource, "sensor_range_m"):
        if source.sensor_range_m is not None and source.sensor_range_m[0] >= source.sensor_range_m[1]:
            message = f"found {found(source.sensor_range_m)}; needs the lower level first"
            yield Problem(path=(*path, "sensor_range_m"), message=message)
    for path, source in draft.each_with(RecordSource, "exclude"):
        for position, (start, end) in enumerate(source.exclude):
            if start >= end:
                message = f"found {found((start, end))}; needs the earlier time first"
                yield Problem(path=(*path, "exclude", position), message=message)


def corrections_correct_something(draft: Draft) -> Iterator[Problem]:
    """Refuse a correction that runs backwards, does nothing, or has no record to correct."""
    for path, correction in draft.each_with(Correction, "start", "end"):
        if correction.start >= correction.end:
            message = f"found {found(correction.end)}, not after from = {found(correction.start)}"
            yield Problem(path=(*path, "to"), message=message)
    for path, correction in draft.each_with(Correction, "shift_m", "clock_shift_s", "clock_drift_s_per_day"):
        if not (correction.shift_m or correction.clock_shift_s or correction.clock_drift_s_per_day):
            message = "does nothing; give shift_m, clock_shift_s or clock_drift_s_per_day"
            yield Problem(path=path, message=message)
    for path, correction in draft.each_with(Correction, "side"):
        if not draft.has("records", correction.side):
            message = f'found "{correction.side}", but there is no [records.{correction.side}]'
            yield Problem(path=(*path, "side"), message=message)


def series_fit_their_quantity(draft: Draft) -> Iterator[Problem]:
    """Refuse a unit of another quantity."""
    for path, series in draft.each_with(Series, "quantity", "unit"):
        units = UNITS_OF_QUANTITY[series.quantity]
        if series.unit not in units:
            message = f'found "{series.unit}"; {series.quantity} needs {listed(units)}'
            yield Problem(path=(*path, "unit"), message=message)


def series_have_own_names(draft: Draft) -> Iterator[Problem]:
    """Refuse a name that is none, and one that means another source of a level."""
    names = draft.written.get("series")
    for name in names if isinstance(names, dict) else ():
        if name in LEVEL_WORDS:
            message = "means another source of a level in a stage; choose another name"
            yield Problem(path=("series", name), message=message)
        elif len(name) > NAME_LENGTH or not re.fullmatch(NAME_PATTERN, name):
            message = f"its name needs {NAME_NEEDS}; at most {NAME_LENGTH} characters"
            yield Problem(path=("series", name), message=message)


def constituents_are_known(draft: Draft) -> Iterator[Problem]:
    """Refuse constituents that are unknown or stand twice."""
    for _, tide in draft.each_with(Tide, "constituents"):
        fitted = _fitted(tide)
        for position, name in enumerate(fitted):
            path = ("tide", "constituents", position)
            yield from _unknown_constituent(path, name, draft.choices.constituents)
            if name in fitted[:position]:
                yield Problem(path=path, message=f'"{name}" stands twice')


def inferred_constituents_have_a_reference(draft: Draft) -> Iterator[Problem]:
    """Refuse inferring what is unknown, what is fitted, or from a constituent that is not fitted."""
    known = draft.choices.constituents
    for at, tide in draft.each_with(Tide, "infer"):
        fitted = _fitted(tide) if draft.is_sound(at, "constituents") else ()
        for name, (reference, _, _) in tide.infer.items():
            path = (*at, "infer", name)
            yield from _unknown_constituent(path, name, known)
            yield from _unknown_constituent((*path, 0), reference, known)
            if name in fitted:
                yield Problem(path=path, message="is inferred, so leave it out of tide.constituents")
            if reference == name or reference in tide.infer:
                message = f'"{reference}" is inferred itself; infer from one that is fitted'
                yield Problem(path=(*path, 0), message=message)
            elif fitted and reference not in fitted and reference in known:
                yield Problem(path=(*path, 0), message=f'"{reference}" is not in tide.constituents; add it there')


def _fitted(tide: Tide) -> tuple[str, ...]:
    """Return the constituents that a plan lists itself."""
    return () if tide.constituents == "auto" else tide.constituents


def _unknown_constituent(path: KeyPath, name: str, known: Collection[str]) -> Iterator[Problem]:
    if name not in known:
        yield Problem(path=path, message=f"found {found(name)}; {suggestion(name, known)}")


def one_source_of_the_sea_tide(draft: Draft) -> Iterator[Problem]:
    """Refuse constants without their mean, and beside a sea record that neither a stage nor a calibration uses."""
    has_constants, has_mean = draft.has("tide", "sea_constants"), draft.has("tide", "sea_mean_m")
    if has_constants and not has_mean:
        message = "missing; tide.sea_constants needs the mean sea level in m above the datum"
        yield Problem(path=("tide", "sea_mean_m"), message=message)
    if has_mean and not has_constants:
        message = "belongs to tide.sea_constants; without it the mean is that of the sea record: leave it out"
        yield Problem(path=("tide", "sea_mean_m"), message=message)
    stages = list(draft.each_with(StageSpan))
    measured = [path for path, stage in stages if stage.sea == "measured" or not draft.is_sound(path, "sea")]
    used = measured or draft.has("calibration")
    if has_constants and draft.has("records", "sea") and stages and not used:
        message = (
            'stands instead of a sea record, but [records.sea] is there and no stage has sea = "measured"; '
            "leave out one of the two"
        )
        yield Problem(path=("tide", "sea_constants"), message=message)


def bed_is_graded(draft: Draft) -> Iterator[Problem]:
    """Refuse a coarse grain size below the median one."""
    for path, bed in draft.each_with(Bed, "d50_mm", "d90_mm"):
        if bed.d50_mm is not None and bed.d90_mm is not None and bed.d90_mm < bed.d50_mm:
            yield Problem(path=(*path, "d90_mm"), message=f"found {bed.d90_mm:g}, below d50_mm = {bed.d50_mm:g}")
