"""Values that stand for "nothing measured": those that the plan lists, and those that it does not."""

from __future__ import annotations

from typing import Final

import numpy as np

from tidescour.errors import Finding, RecordError
from tidescour.gauge.raw import RawColumns, Reading
from tidescour.gauge.records import MISSING
from tidescour.gauge.wording import counted
from tidescour.plan.models import Clock
from tidescour.units import BoolArray, FloatArray, utc_text

SENTINEL_SPREADS: Final = 10.0
NINES_SPREADS: Final = 3.0
SENTINEL_REPEATS: Final = 3
SENTINEL_JUMP: Final = 0.8
USUAL_STEPS: Final = 2.0
"""A value within so many large steps of those before and after it lies among them."""


def without_listed(raw: RawColumns, reading: Reading) -> RawColumns:
    """Values that the plan lists as missing become NaN with flag 9.

    Parameters
    ----------
    raw : RawColumns
        One file, in file order.
    reading : Reading
        What the plan says on it.

    Returns
    -------
    RawColumns
        With a note that counts them. Where only the default of the plan lists them and some lie among the values
        around, as an ordinary level would, a warning.
    """
    missing = np.isin(raw.value, reading.clock.missing)
    if not missing.any():
        return raw
    first = int(np.argmax(missing))
    listed = ", ".join(f"{value:g}" for value in np.unique(raw.value[missing]))
    text = (
        f"{listed} on {counted(int(missing.sum()), 'row')}, first line {raw.line[first]} "
        f"({utc_text(raw.time_s[first])}), taken for missing, flagged 9"
    )
    findings = [Finding(severity="note", code="missing-values", where=reading.where, message=text)]
    ordinary = _among_others(raw.value, missing)
    if ordinary and "missing" not in reading.clock.model_fields_set:
        text = (
            f"{listed} lies among the values around it on {counted(ordinary, 'row')}: an ordinary value in "
            f'"{reading.unit}"? Write missing = [] in [{reading.table}] if it was measured, else missing = [{listed}]'
        )
        findings.append(Finding(severity="warning", code="missing-among-values", where=reading.where, message=text))
    return RawColumns(
        time_s=raw.time_s,
        value=np.where(missing, np.nan, raw.value),
        flag=np.where(missing, MISSING, raw.flag).astype(np.int8),
        line=raw.line,
        part=raw.part,
        findings=(*raw.findings, *findings),
    )


def refuse_unlisted(raw: RawColumns, clock: Clock, where: str, *, nines_only: bool) -> None:
    """Refuse a record with a value that looks as if it stood for missing, and one with fewer than two values.

    Raises
    ------
    RecordError
        With the line of the plan to write.
    """
    value = raw.value
    if np.isfinite(value).sum() < 2:
        raise RecordError(
            f"{where}: {counted(value.size, 'row')} with fewer than two values; give a file that holds a record"
        )
    unlisted = unlisted_missing_values(value, nines_only=nines_only)
    if not unlisted:
        return
    first = int(np.argmax(value == unlisted[0]))
    counts = ", ".join(f"{number:g} on {counted(int((value == number).sum()), 'row')}" for number in unlisted)
    listed = ", ".join(f"{number:.10g}" for number in (*clock.missing, *unlisted))
    raise RecordError(
        f"{where}: {counts} (first on line {raw.line[first]}, {utc_text(raw.time_s[first])}) far from all others, as "
        f"if for missing values; write missing = [{listed}] in [{where}]"
    )


def unlisted_missing_values(value: FloatArray, *, nines_only: bool) -> list[float]:
    """Values that stand for "missing" though the plan does not list them.

    A candidate is the largest or smallest number of the column. It must lie far from the middle of the others (10
    times what holds 90 % of them; 3 times for numbers of nines only, such as -99.99 or 9999), come at least three
    times (nines: once), and be reached and left in one jump: a flood that stays at its peak is none.

    Parameters
    ----------
    value : (n,) array
        Numbers as read, in file order; NaN is left out.
    nines_only : bool
        Look for numbers of nines only (discharges and velocities may rest at one value and burst to another).

    Returns
    -------
    list of float
        In the order found, often empty.

    References
    ----------
    Common practice, no source.
    """
    left = value[np.isfinite(value)]
    found: list[float] = []
    while left.size:
        candidates = [float(extreme) for extreme in (left.min(), left.max())]
        hit = next((c for c in candidates if _stands_for_missing(c, left, nines_only=nines_only)), None)
        if hit is None:
            break
        found.append(hit)
        left = left[left != hit]
    return found


def _stands_for_missing(candidate: float, value: FloatArray, *, nines_only: bool) -> bool:
    here = value == candidate
    others = value[~here]
    nines = set(f"{abs(candidate):.10g}".replace(".", "")) == {"9"} and abs(candidate) > 9.0
    if others.size < 3 or not (nines or (not nines_only and here.sum() >= SENTINEL_REPEATS)):
        return False
    low, middle, high = np.quantile(others, (0.05, 0.5, 0.95))
    distance = abs(candidate - middle)
    if not 0.0 < (NINES_SPREADS if nines else SENTINEL_SPREADS) * (high - low) < distance:
        return False
    edge = here[1:] != here[:-1]
    jumps = np.abs(np.diff(value))[edge]
    return bool(np.all(jumps >= SENTINEL_JUMP * distance))


def _among_others(value: FloatArray, missing: BoolArray) -> int:
    """How many of the values marked lie within a few usual steps of the other values before and after them."""
    others = np.flatnonzero(~missing & np.isfinite(value))
    if others.size < 3:
        return 0
    here = np.flatnonzero(missing)
    here = here[(here > others[0]) & (here < others[-1])]
    after = np.searchsorted(others, here)
    usual = USUAL_STEPS * float(np.quantile(np.abs(np.diff(value[others])), 0.95))
    near = [np.abs(value[others[beside]] - value[here]) <= usual for beside in (after - 1, after)]
    return int(np.sum(near[0] & near[1]))
