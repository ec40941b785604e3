"""Doubled stamps, and several files joined to one record."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding, RecordError
from tidescour.gauge.order import MOST_FAULTY_SHARE, sorted_rows
from tidescour.gauge.raw import RawColumns
from tidescour.gauge.records import FAIL
from tidescour.gauge.wording import counted
from tidescour.units import FloatArray, utc_text


def in_order(raw: RawColumns, where: str) -> RawColumns:
    """Rows of one file by increasing stamps, one row a stamp.

    A file that runs backwards is turned round; up to 1 % of rows out of order are sorted in. Of rows with one stamp
    the first with a value stays; where values differ it is flagged 4.

    Parameters
    ----------
    raw : RawColumns
        One file.
    where : str
        Name for messages.

    Returns
    -------
    RawColumns
        Stamps increasing.

    Raises
    ------
    RecordError
        If more than 1 % of the rows are out of order, or doubled with other values, or the clock was set back.
    """
    return _single(sorted_rows(raw, where), where)


def joined(parts: Sequence[RawColumns], names: Sequence[str], where: str) -> RawColumns:
    """One record from the files of a gauge, each in order.

    Parameters
    ----------
    parts : sequence of RawColumns
        Each with increasing stamps.
    names : sequence of str
        Name of each file, for messages.
    where : str
        Key path in the plan.

    Returns
    -------
    RawColumns
        Stamps increasing; `part` tells the file of each row.

    Raises
    ------
    RecordError
        If files overlap and do not agree, with both values.
    """
    if len(parts) == 1:
        return parts[0]
    whole = RawColumns(
        time_s=np.concatenate([part.time_s for part in parts]),
        value=np.concatenate([part.value for part in parts]),
        flag=np.concatenate([part.flag for part in parts]),
        line=np.concatenate([part.line for part in parts]),
        part=np.repeat(np.arange(len(parts)), [part.time_s.size for part in parts]),
        findings=tuple(finding for part in parts for finding in part.findings),
    )
    whole = whole.rows(np.argsort(whole.time_s, kind="stable"))
    groups = _shared_stamps(whole.time_s)
    clashing = [group for group in groups if _differ(whole.value[group])]
    if clashing:
        raise RecordError(_clash(whole, clashing, names, where))
    if not groups:
        return whole
    dropped = sum(group.stop - group.start - 1 for group in groups)
    first = utc_text(whole.time_s[groups[0].start])
    text = f"{counted(dropped, 'row')} that several files hold alike, from {first}, taken once"
    return _one_a_stamp(whole, groups, Finding(severity="note", code="overlap-merged", where=where, message=text))


def _single(raw: RawColumns, where: str) -> RawColumns:
    groups = _shared_stamps(raw.time_s)
    if not groups:
        return raw
    clashing = [group for group in groups if _differ(raw.value[group])]
    findings = []
    alike = sum(group.stop - group.start - 1 for group in groups if group not in clashing)
    if alike:
        text = (
            f"{counted(alike, 'row')} with the stamp of another and no other value, from {_first(raw, groups[0])}, "
            "left out"
        )
        findings.append(Finding(severity="note", code="repeated-rows", where=where, message=text))
    if clashing:
        spread = max(float(np.nanmax(raw.value[group]) - np.nanmin(raw.value[group])) for group in clashing)
        found = (
            f"{counted(len(clashing), 'stamp')} with two values up to {spread:g} apart (as in the file), first "
            f"{_first(raw, clashing[0])}"
        )
        if len(clashing) > max(1.0, MOST_FAULTY_SHARE * raw.time_s.size):
            raise RecordError(f"{where}: {found}; two series in one file? Give the file with one of them")
        text = f"{found}; one row of each kept and flagged 4. If the clock was set back there, all stamps after are off"
        findings.append(Finding(severity="warning", code="doubled-stamps", where=where, message=text))
    flag = raw.flag.copy()
    for group in clashing:
        flag[group] = np.where(np.isnan(raw.value[group]), flag[group], FAIL)
    flagged = RawColumns(
        time_s=raw.time_s, value=raw.value, flag=flag, line=raw.line, part=raw.part, findings=raw.findings
    )
    return _one_a_stamp(flagged, groups, *findings)


def _shared_stamps(time_s: FloatArray) -> list[slice]:
    """Stretches of more than one row with the same stamp."""
    start = np.flatnonzero(np.concatenate([[True], np.diff(time_s) > 0.0]))
    length = np.diff(np.append(start, time_s.size))
    return [slice(int(s), int(s + n)) for s, n in zip(start[length > 1], length[length > 1], strict=True)]


def _differ(value: FloatArray) -> bool:
    known = value[np.isfinite(value)]
    return known.size > 1 and bool(np.any(known != known[0]))


def _one_a_stamp(raw: RawColumns, groups: Sequence[slice], *findings: Finding) -> RawColumns:
    """First row with a value of each stretch."""
    keep = np.ones(raw.time_s.size, dtype=bool)
    for group in groups:
        keep[group] = False
        known = np.flatnonzero(np.isfinite(raw.value[group]))
        keep[group.start + (known[0] if known.size else 0)] = True
    return raw.rows(np.flatnonzero(keep), *findings)


def _first(raw: RawColumns, group: slice) -> str:
    return f"line {raw.line[group.start]} ({utc_text(raw.time_s[group.start])})"


def _clash(whole: RawColumns, clashing: Sequence[slice], names: Sequence[str], where: str) -> str:
    group = clashing[0]
    known = group.start + np.flatnonzero(np.isfinite(whole.value[group]))
    first, second = _two_unlike(whole.value, known)
    pairs = [whole.value[g][np.isfinite(whole.value[g])] for g in clashing]
    offset = float(np.median([pair[-1] - pair[0] for pair in pairs]))
    return (
        f"{where}: files overlap and disagree on {counted(len(clashing), 'stamp')}, first "
        f"{utc_text(whole.time_s[first])}: {names[whole.part[first]]} line {whole.line[first]} has "
        f"{whole.value[first]:g}, {names[whole.part[second]]} line {whole.line[second]} has {whole.value[second]:g} "
        f"(median difference {offset:+g}, unit of the files); name only the files that belong together, or cut the "
        "overlap"
    )


def _two_unlike(value: FloatArray, known: NDArray[np.int64]) -> tuple[int, int]:
    first = int(known[0])
    return first, int(next(i for i in known if value[i] != value[first]))
