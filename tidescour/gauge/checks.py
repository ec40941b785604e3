"""The table of checks on one record, and their flags rolled up into it. Levels are never altered."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import DomainError, Finding
from tidescour.gauge.flags import rolled_up
from tidescour.gauge.records import FAIL, MISSING, NOT_EVALUATED, SUSPECT, GaugeRecord
from tidescour.gauge.spikes import LONGEST_SPIKE, spike_flags
from tidescour.gauge.stuck import FLAT_RANGE_M, stuck_flags
from tidescour.gauge.wording import counted
from tidescour.table import Entry, symbols
from tidescour.units import SECONDS_PER_HOUR, FlagArray, FloatArray, utc_text

MOST_TIMES_LISTED: Final = 3


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CheckOutcome:
    """Flags of one check, (n,) of int8, 2 where it did not run, and what it found."""

    flag: FlagArray
    findings: tuple[Finding, ...] = ()


Check = Callable[[GaugeRecord, FloatArray | None], CheckOutcome]


def check_record(record: GaugeRecord, predicted_level_m: FloatArray | None) -> GaugeRecord:
    """Run every check and roll the flags up.

    Parameters
    ----------
    record : GaugeRecord
        As read.
    predicted_level_m : (n,) array or None
        Predicted level at each stamp [m above datum], finite; None where there is no fit, then the checks that need
        it are not evaluated.

    Returns
    -------
    GaugeRecord
        The same levels; each flag the worst that was given, 2 only where nothing ran.

    Raises
    ------
    DomainError
        If the prediction is not one finite level a stamp.
    """
    if predicted_level_m is not None and (
        predicted_level_m.shape != record.time_s.shape or not np.all(np.isfinite(predicted_level_m))
    ):
        raise DomainError(f"records.{record.side}: the prediction must be one finite level a stamp")
    flag = record.flag
    findings = list(record.findings)
    for check in CHECKS.values():
        outcome = check.function(record, predicted_level_m)
        flag = rolled_up(flag, outcome.flag)
        findings += outcome.findings
    return replace(record, flag=flag, findings=tuple(findings))


def spike_check(record: GaugeRecord, predicted_level_m: FloatArray | None) -> CheckOutcome:
    """Flag one to three samples that leave the residual and return; not evaluated without a prediction."""
    where = f"records.{record.side}"
    flag = np.full(record.time_s.shape, NOT_EVALUATED, dtype=np.int8)
    if predicted_level_m is None:
        text = "spikes not looked for: there is no prediction to take from the levels"
        return CheckOutcome(
            flag=flag, findings=(Finding(severity="note", code="check-not-evaluated", where=where, message=text),)
        )
    usable = _usable(record)
    residual_m = record.level_m[usable] - predicted_level_m[usable]
    spikes = spike_flags(record.time_s[usable], record.level_m[usable], residual_m, _longest_step(record))
    flag[usable] = spikes.flag
    text = (
        f"over {spikes.threshold_m:.3f} m (suspect, 3) or {2.0 * spikes.threshold_m:.3f} m (fail, 4) from the running "
        f"median of the residual, for at most {LONGEST_SPIKE} samples"
    )
    return CheckOutcome(flag=flag, findings=_summary(record, flag, "spike", text))


def stuck_check(record: GaugeRecord, predicted_level_m: FloatArray | None) -> CheckOutcome:
    """Flag levels that stand still longer than slack water explains; on the basin side suspect at most."""
    flag = np.full(record.time_s.shape, NOT_EVALUATED, dtype=np.int8)
    usable = _usable(record)
    runs = stuck_flags(
        record.time_s[usable], record.level_m[usable], _longest_step(record), may_fail=record.side == "sea"
    )
    flag[usable] = runs.flag
    allowed_h = sorted({f"{threshold_s / SECONDS_PER_HOUR:.2f}" for threshold_s in runs.threshold_s})
    text = (
        f"within {FLAT_RANGE_M:g} m for over {' to '.join(allowed_h)} h, by the slack of the tide around (suspect, 3"
        f"{'; fail, 4, from twice that' if record.side == 'sea' else ''})"
    )
    return CheckOutcome(flag=flag, findings=_summary(record, flag, "stuck", text))


def _usable(record: GaugeRecord) -> NDArray[np.bool_]:
    return np.asarray(np.isfinite(record.level_m) & (record.flag != FAIL) & (record.flag != MISSING))


def _longest_step(record: GaugeRecord) -> float:
    """Beyond this step neighbours in the file are no neighbours in time [s]."""
    return max(3.0 * record.step_s, SECONDS_PER_HOUR)


def _summary(record: GaugeRecord, flag: FlagArray, code: str, text: str) -> tuple[Finding, ...]:
    judged = np.flatnonzero(flag != NOT_EVALUATED)
    hit = np.isin(flag[judged], (SUSPECT, FAIL))
    if not hit.any():
        return ()
    first_of_run = judged[hit & ~np.concatenate([[False], hit[:-1]])]
    times = ", ".join(utc_text(time_s) for time_s in record.time_s[first_of_run[:MOST_TIMES_LISTED]])
    more = f" and {first_of_run.size - MOST_TIMES_LISTED} more" if first_of_run.size > MOST_TIMES_LISTED else ""
    suspect, failed = int((flag == SUSPECT).sum()), int((flag == FAIL).sum())
    found = f"{counted(suspect, 'sample')} suspect and {failed} failed of {record.time_s.size}"
    message = f"{found}, from {times}{more}: {text}"
    return (Finding(severity="warning", code=code, where=f"records.{record.side}", message=message),)


CHECKS: Final[dict[str, Entry[Check]]] = {
    "spike": Entry(
        name="spike",
        title="spikes on the residual",
        function=spike_check,
        says="x = r - median of the seven r around: suspect where |x| is over the larger of 0.10 m and 4 times 1.4826 "
        "MAD, failed over twice that, for at most three samples on one side that are reached and left in a jump",
        symbols=symbols(
            ("x", "m", "height of a sample"),
            ("r", "m", "level minus prediction"),
            ("MAD", "m", "median of |x - median of x|"),
        ),
        validity="needs a prediction; one to three samples, 0.10 m or more",
        source="QARTOD manual for water level 2.1 (2021), test 6, on the residual and with robust thresholds",
        confidence="common practice",
        left_by=("check-not-evaluated",),
        leads_to=("spike",),
    ),
    "stuck": Entry(
        name="stuck",
        title="stuck values",
        function=stuck_check,
        says="suspect where a level stays within 0.001 m for longer than the larger of 1800 s and 1.5 times 2 "
        "arccos(1 - 0.03 m / a) / w; failed from twice that, at sea only",
        symbols=symbols(
            ("a", "m", "half the range in the 25 h before or after, the smaller"),
            ("w", "rad/s", "frequency of M2"),
        ),
        validity="semidiurnal tides; at least three samples and half an hour",
        source="QARTOD manual for water level 2.1 (2021), test 8, by duration scaled with the tide",
        confidence="common practice",
        leads_to=("stuck",),
    ),
}
