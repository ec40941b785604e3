"""From the text of stamps to seconds on UTC, by one explicit format for the whole column."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding, RecordError
from tidescour.gauge.raw import Reading
from tidescour.gauge.wording import counted
from tidescour.gauge.zones import OFFSET, offset_seconds, utc_from_zone, zone_offset_seconds
from tidescour.units import SECONDS_PER_DAY, FloatArray, utc_text

ISO: Final = re.compile(rf"(\d{{4}}-\d\d-\d\d[T ]\d\d:\d\d(?::\d\d(?:[.,]\d{{1,9}})?)?) ?({OFFSET})?", re.ASCII)
TRAILING_OFFSET: Final = re.compile(rf"(.*\S)\s*({OFFSET})", re.ASCII)
MIDNIGHT_24: Final = re.compile(r"(?<![:\d])24:00(:00)?(?![:.\d])")
SECOND_60: Final = re.compile(r"(?<=:\d\d:)60(?!\d)")
EXCEL_EPOCH_S: Final = -25569.0 * SECONDS_PER_DAY
"""1899-12-30, from which the 1900 system counts correctly after its false 29 February 1900."""
FIRST_TRUE_SERIAL: Final = 61.0
LAST_SERIAL: Final = 2958465.0
NOTABLE_SNAP_S: Final = 0.5e-3
FIRST_YEAR, LAST_YEAR = 1800, 2200
"""No gauge is older, no plan looks further."""
USUAL_FORMATS: Final = (
    "%Y-%m-%d %H:%M",
    "%Y-%m-%d %H:%M:%S",
    "%Y/%m/%d %H:%M",
    "%Y/%m/%d %H:%M:%S",
    "%d/%m/%Y %H:%M",
    "%m/%d/%Y %H:%M",
    "%d/%m/%Y %H:%M:%S",
    "%m/%d/%Y %H:%M:%S",
    "%m/%d/%Y %I:%M %p",
    "%d-%m-%Y %H:%M",
    "%d-%m-%Y %H:%M:%S",
    "%d.%m.%Y %H:%M",
    "%d.%m.%Y %H:%M:%S",
    "%d-%b-%Y %H:%M",
    "%d-%b-%Y %H:%M:%S",
    "%Y%m%d %H:%M",
    "%Y%m%d%H%M",
    "%Y%m%d%H%M%S",
)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ClockReadings:
    """What the stamps say before any zone is applied.

    Parameters
    ----------
    local_s : (n,) array
        Reading of the clock as if it were UTC [s since 1970]; NaN where the text does not follow the format.
    offset_s : (n,) array
        Offset that the stamp itself carries [s east of UTC]; NaN where none.
    at_24, at_60 : int
        Stamps at 24:00 and with a 60th second that were carried over.
    snapped_s : float
        Largest rounding of a serial date [s].
    """

    local_s: FloatArray
    offset_s: FloatArray
    at_24: int = 0
    at_60: int = 0
    snapped_s: float = 0.0


def clock_readings(cells: Sequence[str], time_format: str, where: str) -> ClockReadings:
    """Read stamps by one format; what does not follow it becomes NaN, nothing is guessed.

    Parameters
    ----------
    cells : sequence of str
        Stamps; where date and time stand apart, joined by a blank.
    time_format : str
        ``iso``, ``excel`` or a strptime format.
    where : str
        Name for messages.

    Returns
    -------
    ClockReadings
        In the order of `cells`.

    Raises
    ------
    RecordError
        If the format leaves the moment open (no year, two-digit year, 12-hour clock without am and pm, named zone).
    """
    if time_format == "excel":
        return _serial_readings(cells)
    if time_format == "iso":
        bodies, offsets = _split_offsets(cells, ISO)
        pattern = "ISO8601"
    else:
        pattern = time_format
        _check_format(pattern, where)
        if pattern.endswith("%z"):
            pattern = pattern.removesuffix("%z").rstrip()
            bodies, offsets = _split_offsets(cells, TRAILING_OFFSET)
        else:
            bodies, offsets = list(cells), [None] * len(cells)
    local_s = _parsed(bodies, pattern, where)
    at_24 = at_60 = 0
    failed = np.flatnonzero(np.isnan(local_s))
    rolled = [(i, bodies[i]) for i in failed.tolist() if MIDNIGHT_24.search(bodies[i])]
    if rolled:
        days = _parsed([MIDNIGHT_24.sub(r"00:00\1", body) for _, body in rolled], pattern, where) + SECONDS_PER_DAY
        local_s[[i for i, _ in rolled]] = days
        at_24 = int(np.isfinite(days).sum())
    leaps = [(i, bodies[i]) for i in failed.tolist() if SECOND_60.search(bodies[i])]
    if leaps:
        seconds = _parsed([SECOND_60.sub("59", body) for _, body in leaps], pattern, where) + 1.0
        local_s[[i for i, _ in leaps]] = seconds
        at_60 = int(np.isfinite(seconds).sum())
    kinds = {text: np.nan if text is None else offset_seconds(text, where) for text in set(offsets)}
    offset_s = np.array([kinds[text] for text in offsets], dtype=np.float64)
    return ClockReadings(local_s=local_s, offset_s=offset_s, at_24=at_24, at_60=at_60)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Stamps:
    """Stamps on UTC [s since 1970], one a cell, and what was put right."""

    time_s: FloatArray
    findings: tuple[Finding, ...] = ()


def utc_stamps(cells: Sequence[str], lines: NDArray[np.int64], reading: Reading) -> Stamps:
    """Stamps on UTC.

    Parameters
    ----------
    cells : sequence of str
        Stamps as text, in file order.
    lines : (n,) array of int
        Line of each, for messages.
    reading : Reading
        Format, and the offset or zone that the plan gives.

    Returns
    -------
    Stamps
        Finite, in file order.

    Raises
    ------
    RecordError
        If a stamp does not follow the format or is outside the years 1800 to 2200, the offset from UTC is unknown or
        contradicted, or a local time is missing or doubled by a change of the clock.
    """
    clock, where = reading.clock, reading.where
    readings = clock_readings(cells, clock.time_format, where)
    local_s, offset_s = readings.local_s, readings.offset_s
    bad = np.flatnonzero(np.isnan(local_s))
    if bad.size:
        first = int(bad[0])
        raise RecordError(
            f"{where} line {lines[first]}: {cells[first]!r} is no stamp of time_format = {clock.time_format!r} "
            f"({bad.size} of {counted(len(cells), 'row')}){_suggestion(cells)}"
        )
    _check_years(local_s, cells, lines, where)
    aware = np.isfinite(offset_s)
    if aware.any() and not aware.all():
        with_offset, without = int(np.argmax(aware)), int(np.argmin(aware))
        raise RecordError(
            f"{where}: stamps with an offset (line {lines[with_offset]}: {cells[with_offset]!r}) and without "
            f"(line {lines[without]}: {cells[without]!r}) in one column; write the offset on every row or on none"
        )
    findings = _notes(readings, where)
    if aware.all():
        _check_against_plan(local_s, offset_s, cells, lines, reading)
        kinds = Counter(offset_s.tolist())
        if len(kinds) > 1:
            counts = ", ".join(
                f"{seconds / 3600:+g} h on {counted(count, 'row')}" for seconds, count in sorted(kinds.items())
            )
            text = f"stamps carry different offsets, all brought to UTC: {counts}"
            findings.append(Finding(severity="note", code="mixed-offsets", where=where, message=text))
        return Stamps(time_s=local_s - offset_s, findings=tuple(findings))
    if clock.utc_offset is not None:
        return Stamps(time_s=local_s - offset_seconds(clock.utc_offset, reading.where), findings=tuple(findings))
    if clock.time_zone is not None:
        in_zone = utc_from_zone(local_s, clock.time_zone, lines, where)
        if in_zone.doubled:
            rows = counted(in_zone.doubled, "row")
            text = f"{rows} in a doubled hour of {clock.time_zone} placed by the order of the rows"
            findings.append(Finding(severity="note", code="doubled-hour", where=where, message=text))
        return Stamps(time_s=in_zone.time_s, findings=tuple(findings))
    first_rows = ", ".join(repr(cell) for cell in cells[:3])
    raise RecordError(
        f"{where}: the stamps carry no offset from UTC ({first_rows}) and the plan gives none; write in "
        f'[{reading.table}] utc_offset = "+00:00" (the clock\'s own offset), or time_zone = "Europe/Amsterdam" '
        "if the clock followed legal time with summer time"
    )


def _serial_readings(cells: Sequence[str]) -> ClockReadings:
    days = np.full(len(cells), np.nan)
    for i, cell in enumerate(cells):
        try:
            days[i] = float(cell.replace(",", "."))
        except ValueError:
            continue
    days[~((days >= FIRST_TRUE_SERIAL) & (days <= LAST_SERIAL))] = np.nan
    exact_s = days * SECONDS_PER_DAY + EXCEL_EPOCH_S
    local_s = np.rint(exact_s)
    known = np.isfinite(local_s)
    snapped_s = float(np.max(np.abs(local_s - exact_s), where=known, initial=0.0))
    return ClockReadings(local_s=local_s, offset_s=np.full(len(cells), np.nan), snapped_s=snapped_s)


def _split_offsets(cells: Sequence[str], pattern: re.Pattern[str]) -> tuple[list[str], list[str | None]]:
    """Text before the offset, and the offset; where `pattern` does not fit, an empty text that no format accepts."""
    matches = [pattern.fullmatch(cell) for cell in cells]
    bodies = ["" if match is None else match[1] for match in matches]
    return bodies, [None if match is None else match[2] for match in matches]


def _parsed(bodies: Sequence[str], pattern: str, where: str) -> FloatArray:
    import pandas as pd  # half a second, only where files are read

    if pattern == "ISO8601" and any("," in body for body in bodies):
        bodies = [body.replace(",", ".") for body in bodies]
    try:
        parsed = pd.to_datetime(pd.Series(bodies, dtype=object), format=pattern, errors="coerce")
    except ValueError as fault:
        raise RecordError(f"{where}: time_format = {pattern!r} cannot be used: {fault}") from fault
    moments = parsed.to_numpy().astype("datetime64[us]")
    return np.where(np.isnat(moments), np.nan, moments.astype(np.int64) / 1e6)


def _check_format(pattern: str, where: str) -> None:
    directives = set(re.findall(r"%-?(.)", pattern.replace("%%", "")))
    remedy = None
    if "y" in directives:
        remedy = "a two-digit year leaves the century open; write the years with four digits and use %Y"
    elif "Y" not in directives:
        remedy = "it has no year (%Y); allowed are iso, excel or a strptime format such as %d-%m-%Y %H:%M"
    elif "j" not in directives and not ("d" in directives and directives & {"m", "b", "B"}):
        remedy = "it needs the day and the month (%d and %m, %b or %B) or the day of the year (%j)"
    elif ("p" in directives) != ("I" in directives):
        remedy = "a 12-hour clock needs both %I and %p; %H is the 24-hour clock"
    elif "Z" in directives:
        remedy = "names of zones are not unique; use %z for offsets such as +0100, or time_zone in the plan"
    elif "z" in directives and not pattern.endswith("%z"):
        remedy = "%z can stand at the end only"
    if remedy:
        raise RecordError(f"{where}: time_format = {pattern!r}: {remedy}")


def _suggestion(cells: Sequence[str]) -> str:
    """Name the formats that read a sample of the whole column, for the message."""
    sample = list(cells[:: max(1, len(cells) // 500)])
    if np.isfinite(_serial_readings(sample).local_s).all():
        return '; it looks like the day number of a spreadsheet: write time_format = "excel"'
    if np.isfinite(clock_readings(sample, "iso", "").local_s).all():
        return '; every row sampled follows time_format = "iso"'
    fitting = [pattern for pattern in USUAL_FORMATS if np.isfinite(_parsed(sample, pattern, "")).all()]
    if not fitting:
        return "; write the format of the whole column, such as %d-%m-%Y %H:%M, or mend the rows"
    undecided = " (which of them cannot be told from the rows)" if len(fitting) > 1 else ""
    return "; write time_format = " + " or ".join(f'"{pattern}"' for pattern in fitting) + undecided


def _notes(readings: ClockReadings, where: str) -> list[Finding]:
    found = []
    if readings.at_24:
        found.append(("midnight-24", f"{counted(readings.at_24, 'stamp')} at 24:00 read as 00:00 of the next day"))
    if readings.at_60:
        found.append(("leap-second", f"{counted(readings.at_60, 'stamp')} with second 60 read as the next second"))
    if readings.snapped_s > NOTABLE_SNAP_S:
        found.append(("serial-dates", f"serial dates rounded to the second, at most {readings.snapped_s:.3f} s"))
    return [Finding(severity="note", code=code, where=where, message=text) for code, text in found]


def _check_years(local_s: FloatArray, cells: Sequence[str], lines: NDArray[np.int64], where: str) -> None:
    first_s, end_s = (
        float(np.datetime64(f"{year}-01-01", "s").astype(np.int64)) for year in (FIRST_YEAR, LAST_YEAR + 1)
    )
    outside = np.flatnonzero((local_s < first_s) | (local_s >= end_s))
    if outside.size:
        first = int(outside[0])
        raise RecordError(
            f"{where} line {lines[first]}: {cells[first]!r} is outside the years {FIRST_YEAR} to {LAST_YEAR} "
            f"({counted(outside.size, 'row')}); mend the stamp, or correct time_format"
        )


def _check_against_plan(
    local_s: FloatArray, offset_s: FloatArray, cells: Sequence[str], lines: NDArray[np.int64], reading: Reading
) -> None:
    clock = reading.clock
    if clock.utc_offset is not None:
        expected_s = np.full(local_s.shape, offset_seconds(clock.utc_offset, reading.where))
        key = f'utc_offset = "{clock.utc_offset}"'
    elif clock.time_zone is not None:
        expected_s = zone_offset_seconds(local_s - offset_s, clock.time_zone, reading.where)
        key = f'time_zone = "{clock.time_zone}"'
    else:
        return
    against = np.flatnonzero(offset_s != expected_s)
    if against.size:
        first = int(against[0])
        raise RecordError(
            f"{reading.where} line {lines[first]}: the stamp {cells[first]!r} carries another offset than {key} in "
            f"[{reading.table}] ({utc_text(local_s[first] - offset_s[first])} by the stamp; "
            f"{counted(against.size, 'row')}); take the key out if the stamps are right"
        )
