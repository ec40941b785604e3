"""Rules of a plan that need more than one key: records, series, tide, basin and bed."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator
from itertools import pairwise
from zoneinfo import ZoneInfo, available_timezones

from tidescour.plan.draft import Draft
from tidescour.plan.models import SIDES, Basin, Bed, Clock, Correction, RecordSource, Series, StageSpan, Tide
from tidescour.plan.problems import KeyPath, Problem, found, listed, suggestion
from tidescour.units import METRES_PER_UNIT

UNITS_OF_QUANTITY = {"level": tuple(METRES_PER_UNIT), "discharge": ("m3/s",), "velocity": ("m/s",)}
LEVEL_WORDS = ("tide", "measured", "routed")
"""What a stage may write for a level besides the name of a series."""

_OFFSET = re.compile(r"[+-](0\d|1[0-4]):[0-5]\d")


def something_to_read(draft: Draft) -> Iterator[Problem]:
    """Refuse a plan with neither record nor constants, where only these are to be read."""
    if not any(draft.has("records", side) for side in SIDES) and not draft.has("tide", "sea_constants"):
        message = "missing; write [records.sea] or [records.basin], or tide.sea_constants"
        yield Problem(path=("records",), message=message, only_for="records")


def one_clock(draft: Draft) -> Iterator[Problem]:
    """Refuse a file with two clocks, and a clock that is none; without any, every stamp must carry its offset."""
    for path, clock in draft.each(Clock):
        if clock.utc_offset is not None and clock.time_zone is not None:
            message = "stands beside utc_offset; leave out one of the two"
            yield Problem(path=(*path, "time_zone"), message=message)
        if clock.utc_offset is not None and not _OFFSET.fullmatch(clock.utc_offset):
            message = f"found {found(clock.utc_offset)}; needs hours and minutes such as +01:00 or -05:30"
            yield Problem(path=(*path, "utc_offset"), message=message)
        if clock.time_zone is not None and not _is_time_zone(clock.time_zone):
            message = f"found {found(clock.time_zone)}; {suggestion(clock.time_zone, available_timezones())}"
            yield Problem(path=(*path, "time_zone"), message=message)


def _is_time_zone(name: str) -> bool:
    try:
        ZoneInfo(name)
    except (KeyError, ValueError, OSError):
        return False
    return True


def time_format_is_known(draft: Draft) -> Iterator[Problem]:
    """Refuse a time format that is no word known here and holds no strptime directive."""
    for path, clock in draft.each(Clock):
        if clock.time_format not in ("iso", "excel") and "%" not in clock.time_format:
            message = (
                f'found {found(clock.time_format)}; needs "iso", "excel" or a strptime format such as "%d-%m-%Y %H:%M"'
            )
            yield Problem(path=(*path, "time_format"), message=message)


def means_have_a_length(draft: Draft) -> Iterator[Problem]:
    """Refuse a mean without length in time, and an instant with one."""
    for path, clock in draft.each(Clock):
        if clock.stamp != "instant" and clock.averaging_s is None:
            message = f'missing; stamp = "{clock.stamp}" needs the length of the mean in seconds'
            yield Problem(path=(*path, "averaging_s"), message=message)
        if clock.stamp == "instant" and clock.averaging_s is not None:
            message = 'stands beside stamp = "instant"; leave it out, or write which mean the stamps stand for'
            yield Problem(path=(*path, "averaging_s"), message=message)


def ranges_run_upwards(draft: Draft) -> Iterator[Problem]:
    """Refuse a sensor range or an excluded spell that runs backwards."""
    for path, source in draft.each(RecordSource):
        if source.sensor_range_m is not None and source.sensor_range_m[0] >= source.sensor_range_m[1]:
            message = f"found {found(source.sensor_range_m)}; needs the lower level first"
            yield Problem(path=(*path, "sensor_range_m"), message=message)
        for position, (start, end) in enumerate(source.exclude):
            if start >= end:
                message = f"found {found((start, end))}; needs the earlier time first"
                yield Problem(path=(*path, "exclude", position), message=message)


def corrections_correct_something(draft: Draft) -> Iterator[Problem]:
    """Refuse a correction that runs backwards, does nothing, or has no record to correct."""
    for path, correction in draft.each(Correction):
        if correction.start >= correction.end:
            message = f"found {found(correction.end)}, not after from = {found(correction.start)}"
            yield Problem(path=(*path, "to"), message=message)
        if not (correction.shift_m or correction.clock_shift_s or correction.clock_drift_s_per_day):
            message = "does nothing; give shift_m, clock_shift_s or clock_drift_s_per_day"
            yield Problem(path=path, message=message)
        if not draft.has("records", correction.side):
            message = f'found "{correction.side}", but there is no [records.{correction.side}]'
            yield Problem(path=(*path, "side"), message=message)


def series_fit_their_quantity(draft: Draft) -> Iterator[Problem]:
    """Refuse a unit of another quantity, and a name that means another source."""
    for path, series in draft.each(Series):
        units = UNITS_OF_QUANTITY[series.quantity]
        if series.unit not in units:
            message = f'found "{series.unit}"; {series.quantity} needs {listed(units)}'
            yield Problem(path=(*path, "unit"), message=message)
    names = draft.written.get("series")
    for name in names if isinstance(names, dict) else ():
        if name in LEVEL_WORDS:
            message = "means another source of a level in a stage; choose another name"
            yield Problem(path=("series", name), message=message)


def constituents_are_known(draft: Draft) -> Iterator[Problem]:
    """Refuse constituents that are unknown or stand twice, and inferring one that is fitted or from one that is not."""
    tide = draft.part(Tide, "tide")
    if tide is None:
        return
    known = draft.choices.constituents
    fitted = () if tide.constituents == "auto" else tide.constituents
    path: KeyPath
    for position, name in enumerate(fitted):
        path = ("tide", "constituents", position)
        yield from _unknown_constituent(path, name, known)
        if name in fitted[:position]:
            yield Problem(path=path, message=f'"{name}" stands twice')
    for name, (reference, _, _) in tide.infer.items():
        path = ("tide", "infer", name)
        yield from _unknown_constituent(path, name, known)
        yield from _unknown_constituent((*path, 0), reference, known)
        if name in fitted:
            yield Problem(path=path, message="is inferred, so leave it out of tide.constituents")
        if reference == name or reference in tide.infer:
            yield Problem(path=(*path, 0), message=f'"{reference}" is inferred itself; infer from one that is fitted')
        elif fitted and reference not in fitted and reference in known:
            yield Problem(path=(*path, 0), message=f'"{reference}" is not in tide.constituents; add it there')


def _unknown_constituent(path: KeyPath, name: str, known: Collection[str]) -> Iterator[Problem]:
    if name not in known:
        yield Problem(path=path, message=f"found {found(name)}; {suggestion(name, known)}")


def one_source_of_the_sea_tide(draft: Draft) -> Iterator[Problem]:
    """Refuse constants without their mean, and beside a sea record that no stage uses itself."""
    tide = draft.part(Tide, "tide")
    if tide is None:
        return
    if tide.sea_constants is not None and tide.sea_mean_m is None:
        message = "missing; tide.sea_constants needs the mean sea level in m above the datum"
        yield Problem(path=("tide", "sea_mean_m"), message=message)
    if tide.sea_constants is None and tide.sea_mean_m is not None:
        message = "belongs to tide.sea_constants; without it the mean is that of the sea record: leave it out"
        yield Problem(path=("tide", "sea_mean_m"), message=message)
    stages = [stage for _, stage in draft.each(StageSpan)]
    if tide.sea_constants and draft.has("records", "sea") and stages and all(s.sea != "measured" for s in stages):
        message = (
            'stands instead of a sea record, but [records.sea] is there and no stage has sea = "measured"; '
            "leave out one of the two"
        )
        yield Problem(path=("tide", "sea_constants"), message=message)


def basin_grows_with_its_level(draft: Draft) -> Iterator[Problem]:
    """Refuse levels that do not increase, areas that decrease, and lists of two lengths."""
    basin = draft.part(Basin, "basin")
    if basin is None:
        return
    if len(basin.level_m) != len(basin.area_m2):
        message = f"has {len(basin.area_m2)} values where level_m has {len(basin.level_m)}"
        yield Problem(path=("basin", "area_m2"), message=message)
    for position, (below, above) in enumerate(pairwise(basin.level_m), start=1):
        if above <= below:
            message = f"found {above:g} after {below:g}; levels must increase"
            yield Problem(path=("basin", "level_m", position), message=message)
    for position, (below, above) in enumerate(pairwise(basin.area_m2), start=1):
        if above < below:
            message = f"found {above:g} after {below:g}; the wet area cannot decrease with the level"
            yield Problem(path=("basin", "area_m2", position), message=message)


def bed_is_graded(draft: Draft) -> Iterator[Problem]:
    """Refuse a coarse grain size below the median one."""
    bed = draft.part(Bed, "bed")
    if bed is not None and bed.d50_mm is not None and bed.d90_mm is not None and bed.d90_mm < bed.d50_mm:
        yield Problem(path=("bed", "d90_mm"), message=f"found {bed.d90_mm:g}, below d50_mm = {bed.d50_mm:g}")
