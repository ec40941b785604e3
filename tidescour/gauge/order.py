"""Order of the rows of one file: newest first, slips that are sorted in, and clocks that were set back."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from typing import Final

import numpy as np

from tidescour.errors import Finding, RecordError
from tidescour.gauge.raw import RawColumns
from tidescour.gauge.wording import counted
from tidescour.units import SECONDS_PER_HOUR, FloatArray, utc_text

MOST_FAULTY_SHARE: Final = 0.01
"""Share of rows out of order or doubled with other values that is still put right (common practice, no source)."""
FORWARD_JUMP: Final = 1.5
"""Usual steps; a longer one beside a step back makes up for it."""
ROWS_AROUND: Final = 10
SATURDAY: Final = 5
ENDS_OF_SUMMER_TIME: Final = (((3, 31), (4, 7)), ((10, 24), (11, 7)))
"""First and last day, as month and day, of the weekends on which summer time ends in most countries that have it."""


def newest_first(time_s: FloatArray) -> bool:
    """Whether most stamps lie before the one above."""
    return time_s.size > 1 and bool(np.median(np.diff(time_s)) < 0.0)


def sorted_rows(raw: RawColumns, where: str) -> RawColumns:
    """Rows of one file by stamps that do not decrease.

    A file that runs backwards is turned round. Up to 1 % of rows out of order are sorted in, where a jump forward
    beside the step back makes up for it.

    Parameters
    ----------
    raw : RawColumns
        One file.
    where : str
        Name for messages.

    Returns
    -------
    RawColumns
        Stamps not decreasing.

    Raises
    ------
    RecordError
        If more than 1 % of the rows are out of order, or a clock was set back: nothing makes up for the step back, so
        that the stamps before and after it are not of one clock.
    """
    if newest_first(raw.time_s):
        text = f"{raw.time_s.size} rows from the newest to the oldest, turned round"
        note = Finding(severity="note", code="reversed", where=where, message=text)
        raw = raw.rows(np.arange(raw.time_s.size)[::-1], note)
    _refuse_clock_set_back(raw, where)
    time_s = raw.time_s
    late = np.flatnonzero(time_s < np.maximum.accumulate(time_s))
    if late.size == 0:
        return raw
    first = int(late[0])
    leader = int(np.argmax(time_s[:first]))
    found = (
        f"{late.size} of {counted(time_s.size, 'row')} out of order, first line {raw.line[first]} "
        f"({utc_text(time_s[first])}) below line {raw.line[leader]} ({utc_text(time_s[leader])})"
    )
    if late.size > max(1.0, MOST_FAULTY_SHARE * time_s.size):
        raise RecordError(
            f"{where}: {found}; over {MOST_FAULTY_SHARE:.0%} is no slip: mend line {raw.line[leader]} if its stamp is "
            "wrong, check time_format (day and month?), or put the pieces of the file in order"
        )
    note = Finding(severity="note", code="out-of-order", where=where, message=f"{found}, sorted in")
    return raw.rows(np.argsort(time_s, kind="stable"), note)


def _refuse_clock_set_back(raw: RawColumns, where: str) -> None:
    """Refuse rows that fall back behind the row above and run on from there at the usual step."""
    time_s, step_s = raw.time_s, np.diff(raw.time_s)
    newest_s = np.maximum.accumulate(time_s)
    edge = np.diff(np.concatenate([[0], (time_s < newest_s).astype(np.int8), [0]]))
    for first, caught_up in zip(np.flatnonzero(edge == 1).tolist(), np.flatnonzero(edge == -1).tolist(), strict=True):
        usual_s = _usual_step(step_s, first, caught_up)
        # The step into the row above counts too: that row alone may have run ahead.
        if step_s[max(first - 2, 0) : caught_up].max() <= FORWARD_JUMP * usual_s:
            raise RecordError(_set_back(raw, first, float(newest_s[first]), usual_s, where))
    # Set back by one step, a clock stands still; whether a row came twice instead, only the calendar tells.
    standing = (np.flatnonzero((step_s == 0.0) & (np.diff(raw.value) != 0.0)) + 1).tolist()
    if standing and all(_summer_time_ends(time_s, step_s, row) for row in standing):
        raise RecordError(_set_back(raw, standing[0], float(time_s[standing[0]]), SECONDS_PER_HOUR, where))


def _usual_step(step_s: FloatArray, first: int, end: int) -> float:
    """Median of the steps forward around some rows [s]; 0 where there is none."""
    around = step_s[max(first - ROWS_AROUND, 0) : end + ROWS_AROUND]
    forward = around[around > 0.0]
    return float(np.median(forward)) if forward.size else 0.0


def _summer_time_ends(time_s: FloatArray, step_s: FloatArray, row: int) -> bool:
    """Whether a row of an hourly clock lies on a weekend on which summer time ends."""
    moment = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(seconds=float(time_s[row]))
    in_season = any(first <= (moment.month, moment.day) <= last for first, last in ENDS_OF_SUMMER_TIME)
    return in_season and moment.weekday() >= SATURDAY and _usual_step(step_s, row, row) == SECONDS_PER_HOUR


def _set_back(raw: RawColumns, row: int, newest_s: float, usual_s: float, where: str) -> str:
    minutes = (newest_s + usual_s - raw.time_s[row]) / 60.0
    return (
        f"{where} line {raw.line[row]}: the stamps go back to {utc_text(raw.time_s[row])} after {utc_text(newest_s)} "
        f"and run on from there: the clock was set back by {minutes:g} min, or pieces of the file are not in order. If "
        'the clock followed legal time, write time_zone = "Europe/Amsterdam" (or its own) instead of utc_offset; else '
        "mend the stamps of the part whose clock was wrong, or take out the rows of one part that overlap the other "
        "and write a [[correction]] with clock_shift_s"
    )
