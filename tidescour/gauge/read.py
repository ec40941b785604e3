"""From the files of a gauge to one record on the site datum and on UTC; the same for given series."""

from __future__ import annotations

import glob
import hashlib
from collections.abc import Sequence
from pathlib import Path
from typing import Final

import numpy as np

from tidescour.errors import Finding, RecordError, Severity
from tidescour.gauge.content import file_text
from tidescour.gauge.corrections import corrected
from tidescour.gauge.flags import rolled_up
from tidescour.gauge.joining import in_order, joined
from tidescour.gauge.layouts import LAYOUTS
from tidescour.gauge.missing import refuse_unlisted, without_listed
from tidescour.gauge.raw import RawColumns, Reading
from tidescour.gauge.records import (
    FAIL,
    MISSING,
    NOT_EVALUATED,
    PASS,
    GaugeRecord,
    GivenSeries,
    InputFile,
)
from tidescour.gauge.wording import counted
from tidescour.plan.kinds import Side
from tidescour.plan.models import Correction, RecordSource, Series
from tidescour.units import (
    METRES_PER_UNIT,
    SECONDS_PER_HOUR,
    FlagArray,
    FloatArray,
    seconds_since_epoch,
    utc_text,
)

MOST_NAMES_LISTED: Final = 20
LARGEST_RANGE_M: Final = 30.0
"""No tide with surge comes near: the largest known range is some 16 m."""


def read_gauge(source: RecordSource, side: Side, corrections: tuple[Correction, ...], folder: Path) -> GaugeRecord:
    """Read the files of one gauge.

    Order: missing values as in the file, unit, sign, sensor range (flag 4), shift; stamps: clock shift, middle of the
    averaging window, corrections; then what the plan excludes (flag 4, ``[from, to)``). No row is added.

    Parameters
    ----------
    source : RecordSource
        What the plan says on the gauge.
    side : {"sea", "basin"}
        Where it stands.
    corrections : tuple of Correction
        Dated corrections of the plan; those of the other side are left alone.
    folder : Path
        Where relative names start.

    Returns
    -------
    GaugeRecord
        Flags 9 missing; 4 out of the sensor's range, excluded, doubled or infinite; 1 where the sensor's range was
        checked; else 2.

    Raises
    ------
    RecordError
        If a file is missing or cannot be read with certainty; the message says where and what to write instead.
    """
    where = f"records.{side}"
    if source.layout not in LAYOUTS:
        raise RecordError(f"{where}: layout = {source.layout!r}; it must be one of {', '.join(LAYOUTS)}")
    files: list[InputFile] = []
    parts: list[RawColumns] = []
    for path in matching_files(source.files, folder, where):
        name = _plan_path(path, folder)
        reading = Reading(
            where=f"{where}: {name}",
            table=where,
            clock=source,
            value=source.level,
            value_key="level",
            unit=source.unit,
        )
        part, file = _read_file(path, name, source.layout, reading)
        parts.append(part)
        files.append(file)
    raw = joined(parts, [file.path for file in files], where)
    refuse_unlisted(raw, source, where, nines_only=False)
    findings = list(raw.findings)

    sign = -1.0 if source.positive == "down" else 1.0
    sensor_m = sign * METRES_PER_UNIT[source.unit] * raw.value
    flag = raw.flag
    if source.sensor_range_m is not None:
        in_range, found = _sensor_range(sensor_m, raw.time_s, source.sensor_range_m, where)
        flag = rolled_up(flag, in_range)
        findings += found
    own = [correction for correction in corrections if correction.side == side]
    moved = corrected(raw.time_s, sensor_m + source.shift_m, source, own, where)
    findings += moved.findings
    excluded, found = _excluded(moved.time_s, source, where)
    flag = rolled_up(flag, excluded)
    step_s = commonest_step(moved.time_s)
    usable = (flag != MISSING) & (flag != FAIL)
    _check_range(moved.level_m[usable], source, where)
    findings += _gaps(moved.time_s[usable], step_s, where)
    return GaugeRecord(
        side=side,
        time_s=moved.time_s,
        level_m=moved.level_m,
        flag=flag,
        step_s=step_s,
        files=tuple(files),
        findings=(*findings, *found),
    )


def read_series(name: str, series: Series, folder: Path) -> GivenSeries:
    """Read a given series of levels, discharges or velocities.

    Parameters
    ----------
    name : str
        Name in the plan.
    series : Series
        What the plan says on it.
    folder : Path
        Where a relative name starts.

    Returns
    -------
    GivenSeries
        On UTC, in m, m3/s or m/s; missing rows are left out, with a note.

    Raises
    ------
    RecordError
        If the file is missing or cannot be read with certainty, or a stamp comes twice with other values.
    """
    where = f"series.{name}"
    paths = matching_files((series.file,), folder, where)
    if len(paths) > 1:
        listed = ", ".join(_plan_path(path, folder) for path in paths)
        raise RecordError(f"{where}: {series.file!r} fits {len(paths)} files ({listed}); name one")
    file_name = _plan_path(paths[0], folder)
    reading = Reading(
        where=f"{where}: {file_name}",
        table=where,
        clock=series,
        value=series.value,
        value_key="value",
        unit=series.unit,
    )
    raw, file = _read_file(paths[0], file_name, "columns", reading)
    refuse_unlisted(raw, series, where, nines_only=series.quantity != "level")
    doubled = np.flatnonzero((raw.flag == FAIL) & np.isfinite(raw.value))
    if doubled.size:
        first = int(doubled[0])
        raise RecordError(
            f"{where}: {file_name} line {raw.line[first]}: {utc_text(raw.time_s[first])} comes twice with other values"
            "; take one out"
        )
    value = raw.value * METRES_PER_UNIT.get(series.unit, 1.0)
    known = np.isfinite(value)
    findings = list(raw.findings)
    if not known.all():
        text = f"{int((~known).sum())} of {counted(known.size, 'row')} without a value left out"
        findings.append(Finding(severity="note", code="rows-left-out", where=where, message=text))
    moved = corrected(raw.time_s[known], value[known], series, (), where)
    return GivenSeries(
        name=name,
        quantity=series.quantity,
        time_s=moved.time_s,
        value=moved.level_m,
        file=file,
        findings=(*findings, *moved.findings),
    )


def matching_files(patterns: Sequence[str], folder: Path, where: str) -> tuple[Path, ...]:
    """Files that names or patterns of a plan stand for, each once, sorted within a pattern.

    Raises
    ------
    RecordError
        If a pattern fits no file, with what lies in the folder, or the system cannot look for it.
    """
    found: dict[Path, None] = {}
    for pattern in patterns:
        try:
            paths = _matching(pattern, folder)
            if not paths:
                raise RecordError(f"{where}: {pattern!r} fits no file; {_what_lies_in((folder / pattern).parent)}")
        except OSError as fault:
            raise RecordError(f"{where}: {pattern[:80]!r} cannot be looked for ({fault.strerror})") from fault
        found |= dict.fromkeys(paths)
    return tuple(found)


def commonest_step(time_s: FloatArray) -> float:
    """Commonest difference between stamps [s], to the millisecond; of several the smallest.

    Parameters
    ----------
    time_s : (n,) array
        Stamps [s], increasing, at least two.

    Returns
    -------
    float
        Positive.
    """
    steps, counts = np.unique(np.round(np.diff(time_s), 3), return_counts=True)
    return float(steps[np.argmax(counts)])


def _read_file(path: Path, name: str, layout: str, reading: Reading) -> tuple[RawColumns, InputFile]:
    try:
        content = path.read_bytes()
    except OSError as fault:
        raise RecordError(f"{reading.where}: cannot be read ({fault.strerror})") from fault
    text = file_text(content, reading.where)
    raw = LAYOUTS[layout].function(text.text, reading)
    raw = without_listed(raw.rows(np.arange(raw.time_s.size), *text.findings), reading)
    return in_order(raw, reading.where), InputFile(path=name, sha256=hashlib.sha256(content).hexdigest())


def _matching(pattern: str, folder: Path) -> list[Path]:
    names = [pattern] if (folder / pattern).is_file() else sorted(glob.glob(pattern, root_dir=folder, recursive=True))
    return [folder / name for name in names if (folder / name).is_file()]


def _plan_path(path: Path, folder: Path) -> str:
    # Results name files as the plan does, and tell nothing of the machine.
    return path.relative_to(folder).as_posix() if path.is_relative_to(folder) else path.name


def _what_lies_in(folder: Path) -> str:
    if not folder.is_dir():
        return f"there is no folder {folder.name!r}"
    names = sorted(entry.name for entry in folder.iterdir())
    listed = ", ".join(names[:MOST_NAMES_LISTED]) or "nothing"
    more = f" and {len(names) - MOST_NAMES_LISTED} more" if len(names) > MOST_NAMES_LISTED else ""
    return f"the folder {folder.name!r} holds {listed}{more}"


def _check_range(level_m: FloatArray, source: RecordSource, where: str) -> None:
    """Refuse usable levels that no tide spans."""
    if level_m.size == 0:
        return
    low, high = np.quantile(level_m, (0.01, 0.99))
    if high - low > LARGEST_RANGE_M:
        raise RecordError(
            f"{where}: 98 % of the levels spread over {high - low:.0f} m, which no tide does; is it another unit than "
            f'unit = "{source.unit}" (cm, mm?), or the wrong column, level = {source.level!r}?'
        )


def _sensor_range(
    sensor_m: FloatArray, time_s: FloatArray, limits_m: tuple[float, float], where: str
) -> tuple[FlagArray, list[Finding]]:
    low, high = limits_m
    known = np.isfinite(sensor_m)
    outside = known & ~((sensor_m >= low) & (sensor_m <= high))
    flag = np.where(outside, FAIL, np.where(known, PASS, NOT_EVALUATED)).astype(np.int8)
    if not outside.any():
        return flag, []
    text = (
        f"{int(outside.sum())} of {counted(outside.size, 'sample')} outside the sensor's range {low:g} to {high:g} m, "
        f"flagged 4, first as read at {utc_text(time_s[int(np.argmax(outside))])}"
    )
    return flag, [Finding(severity="warning", code="sensor-range", where=where, message=text)]


def _excluded(time_s: FloatArray, source: RecordSource, where: str) -> tuple[FlagArray, list[Finding]]:
    flag = np.full(time_s.shape, NOT_EVALUATED, dtype=np.int8)
    findings = []
    for start, end in source.exclude:
        start_s, end_s = seconds_since_epoch(start), seconds_since_epoch(end)
        within = (time_s >= start_s) & (time_s < end_s)
        flag[within] = FAIL
        text = (
            f"{counted(int(within.sum()), 'sample')} from {utc_text(start_s)} to {utc_text(end_s)} excluded, flagged 4"
        )
        severity: Severity = "note" if within.any() else "warning"
        findings.append(Finding(severity=severity, code="excluded", where=where, message=text))
    return flag, findings


def _gaps(time_s: FloatArray, step_s: float, where: str) -> list[Finding]:
    """Report times over an hour between samples read; warn of one that is longer than the rest of the record."""
    between_s = np.diff(time_s)
    gaps = np.flatnonzero(between_s > max(SECONDS_PER_HOUR, 1.5 * step_s))
    if gaps.size == 0:
        return []
    longest = int(gaps[np.argmax(between_s[gaps])])
    hours = float(between_s[gaps].sum()) / SECONDS_PER_HOUR
    text = (
        f"{counted(gaps.size, 'gap')} over {max(1.0, 1.5 * step_s / SECONDS_PER_HOUR):g} h "
        f"between samples read, together {hours:.1f} h; the longest "
        f"{between_s[longest] / SECONDS_PER_HOUR:.1f} h from {utc_text(time_s[longest])}"
    )
    rest_s = time_s[-1] - time_s[0] - between_s[longest]
    severity: Severity = "warning" if between_s[longest] > rest_s else "note"
    if severity == "warning":
        text += ", more than all the rest of the record: is a stamp wrong?"
    return [Finding(severity=severity, code="gaps", where=where, message=text)]
