"""Offsets and legal time zones, with the doubled and the missing hour of summer time."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import RecordError
from tidescour.gauge.order import newest_first
from tidescour.gauge.wording import counted
from tidescour.units import FloatArray

if TYPE_CHECKING:
    from pandas import DatetimeIndex

OFFSET: Final = r"Z|[+-]\d\d(?::?\d\d)?"
"""An offset from UTC, in digits of ASCII."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ZonedStamps:
    """Stamps on UTC [s since 1970], and how many of them stood in a doubled hour."""

    time_s: FloatArray
    doubled: int


def offset_seconds(text: str, where: str) -> float:
    """Offset east of UTC [s] from ``Z``, ``+01:00``, ``+0100`` or ``+01``.

    Raises
    ------
    RecordError
        If the text is none of these or beyond 14 h.
    """
    digits = text[1:].replace(":", "").ljust(4, "0")
    hours, minutes = (int(digits[:2]), int(digits[2:])) if re.fullmatch(OFFSET, text, re.ASCII) else (99, 99)
    if minutes > 59 or 60 * hours + minutes > 14 * 60:
        raise RecordError(f'{where}: {text!r} is no offset from UTC; write it like "+01:00", at most 14 hours')
    return (-60.0 if text.startswith("-") else 60.0) * (60 * hours + minutes)


def zone_offset_seconds(time_s: FloatArray, zone: str, where: str) -> FloatArray:
    """Offset of a zone east of UTC [s] at moments given as seconds since 1970.

    Raises
    ------
    RecordError
        If the zone is unknown.
    """
    _check_zone(zone, where)
    utc = _index(time_s)
    return _seconds(utc.tz_localize("UTC").tz_convert(zone).tz_localize(None)) - _seconds(utc)


def utc_from_zone(local_s: FloatArray, zone: str, lines: NDArray[np.int64], where: str) -> ZonedStamps:
    """Bring readings of a legal clock to UTC.

    The hour that autumn doubles is told apart only by the order of the rows: one step back inside it, and stamps that
    increase across it, or all this upside down in a file with the newest row first. Everything else is refused.

    Parameters
    ----------
    local_s : (n,) array
        Readings as if they were UTC [s since 1970], finite, in file order.
    zone : str
        Name in the IANA list, such as ``Europe/Amsterdam``.
    lines : (n,) array of int
        Line of each reading, for messages.
    where : str
        Name for messages.

    Returns
    -------
    ZonedStamps
        In the same order.

    Raises
    ------
    RecordError
        If the zone is unknown, a reading falls into the hour that spring leaves out, or order does not tell the two
        hours of autumn apart.
    """
    _check_zone(zone, where)
    if newest_first(local_s):
        upside_down = utc_from_zone(local_s[::-1], zone, lines[::-1], where)
        return ZonedStamps(time_s=upside_down.time_s[::-1], doubled=upside_down.doubled)
    clock = _index(local_s)
    early = _utc_seconds(clock, zone, summer=True)
    late = _utc_seconds(clock, zone, summer=False)
    missing = np.flatnonzero(np.isnan(early))
    if missing.size:
        first = int(missing[0])
        raise RecordError(
            f"{where} line {lines[first]}: {clock[first]:%Y-%m-%d %H:%M:%S} does not exist in {zone} "
            f"({counted(missing.size, 'row')}): the clock left that hour out in spring; the file is "
            "not in that zone, write its utc_offset"
        )
    time_s = late.copy()
    doubled = np.flatnonzero(early != late)
    for run in np.split(doubled, np.flatnonzero(np.diff(doubled) > 1) + 1) if doubled.size else []:
        back = np.flatnonzero(np.diff(local_s[run]) <= 0.0)
        if back.size == 1:
            summer = run[: back[0] + 1]
            time_s[summer] = early[summer]
        around = time_s[max(run[0] - 1, 0) : run[-1] + 2]
        if back.size != 1 or np.any(np.diff(around) <= 0.0):
            raise RecordError(
                f"{where} lines {lines[run[0]]} to {lines[run[-1]]}: {clock[run[0]]:%Y-%m-%d %H:%M} to "
                f"{clock[run[-1]]:%H:%M} comes twice in {zone} when summer time ends, and the order of the rows does "
                "not tell which hour is meant; export the record with a fixed offset and write utc_offset"
            )
    return ZonedStamps(time_s=time_s, doubled=int(doubled.size))


def _check_zone(zone: str, where: str) -> None:
    try:
        ZoneInfo(zone)
    except (ZoneInfoNotFoundError, ValueError, OSError) as fault:
        raise RecordError(f'{where}: time_zone = {zone!r} is unknown; write one like "Europe/Amsterdam"') from fault


def _index(time_s: FloatArray) -> DatetimeIndex:
    from pandas import DatetimeIndex  # half a second, only where files are read

    return DatetimeIndex(np.rint(time_s * 1e6).astype(np.int64).astype("datetime64[us]"))


def _seconds(index: DatetimeIndex) -> FloatArray:
    moments = index.to_numpy().astype("datetime64[us]")
    return np.where(np.isnat(moments), np.nan, moments.astype(np.int64) / 1e6)


def _utc_seconds(clock: DatetimeIndex, zone: str, *, summer: bool) -> FloatArray:
    choice = np.full(len(clock), summer)
    zoned = clock.tz_localize(zone, ambiguous=choice, nonexistent="NaT")
    return _seconds(zoned.tz_convert("UTC").tz_localize(None))
