"""Two gauges held against each other: same numbers, other unit, turned sign, time in common."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from tidescour.errors import Finding, RecordError
from tidescour.gauge.records import GaugeRecord
from tidescour.units import SECONDS_PER_DAY, SECONDS_PER_HOUR, FloatArray, utc_text

FEWEST_SAMPLES: Final = 24
SAME_SHARE: Final = 1e-4
"""Scatter of the difference over that of the level below which two records are one."""
LARGEST_DEVIATION_M: Final = 10.0
"""No tide has so large a standard deviation; the largest known is near 5 m."""
CLOSE_CORRELATION: Final = 0.9
TURNED_CORRELATION: Final = -0.7
UNIT_RATIOS: Final = {100.0: "cm", 1000.0: "mm"}
FEET_RATIO: Final = (3.0, 3.6)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CommonLevels:
    """Levels of both sides at the good stamps of the sea inside the time in common, (n,) arrays [m]."""

    sea_m: FloatArray
    basin_m: FloatArray


def check_pair(sea: GaugeRecord, basin: GaugeRecord) -> tuple[Finding, ...]:
    """Hold two records against each other.

    Parameters
    ----------
    sea, basin : GaugeRecord
        Both sides; only samples flagged 1 or 2 count.

    Returns
    -------
    tuple of Finding
        The time in common, and what to look at.

    Raises
    ------
    RecordError
        If both hold the same numbers, one is in another unit than the plan says, or one has its sign turned.
    """
    overlap = _overlap(sea, basin)
    common = common_levels(sea, basin)
    if common.sea_m.size < FEWEST_SAMPLES:
        return (overlap,)
    sea_m, basin_m = common.sea_m - common.sea_m.mean(), common.basin_m - common.basin_m.mean()
    sea_sd, basin_sd = float(sea_m.std()), float(basin_m.std())
    if not (sea_sd > 0.0 and basin_sd > 0.0):
        return (overlap,)
    if float((sea_m - basin_m).std()) < SAME_SHARE * sea_sd:
        raise RecordError(
            f"records.sea and records.basin hold the same numbers on {sea_m.size} stamps (apart from a constant): "
            f"{_files(sea)} and {_files(basin)}; give each side its own files or column (level = ...)"
        )
    correlation = float(np.mean(sea_m * basin_m)) / (sea_sd * basin_sd)
    if correlation < TURNED_CORRELATION:
        raise RecordError(
            f"records.sea and records.basin run against each other (correlation {correlation:.2f} over {sea_m.size} "
            'samples): one reads the depth to the water; write positive = "down" in its table'
        )
    _refuse_unit(sea_sd, basin_sd, correlation)
    ratio = max(sea_sd, basin_sd) / min(sea_sd, basin_sd)
    if FEET_RATIO[0] < ratio < FEET_RATIO[1] and correlation > CLOSE_CORRELATION:
        text = (
            f"the levels of the {_larger(sea_sd, basin_sd)} scatter {ratio:.2f} times those of the other side, near "
            "3.28: ordinary while a gap closes, but look whether one is in feet"
        )
        return (overlap, Finding(severity="warning", code="feet-ratio", where="records", message=text))
    return (overlap,)


def common_levels(sea: GaugeRecord, basin: GaugeRecord) -> CommonLevels:
    """Levels of both sides at the good stamps of the sea, the basin's linear between samples at most an hour apart.

    Parameters
    ----------
    sea, basin : GaugeRecord
        Both sides.

    Returns
    -------
    CommonLevels
        Empty where the records have no good sample in common.
    """
    time_s, level_m = basin.time_s[basin.good], basin.level_m[basin.good]
    at_s, sea_m = sea.time_s[sea.good], sea.level_m[sea.good]
    if time_s.size < 2:
        return CommonLevels(sea_m=np.zeros(0), basin_m=np.zeros(0))
    after = np.clip(np.searchsorted(time_s, at_s), 1, time_s.size - 1)
    near = time_s[after] - time_s[after - 1] <= max(SECONDS_PER_HOUR, 1.5 * basin.step_s)
    inside = (at_s >= time_s[0]) & (at_s <= time_s[-1]) & (near | (time_s[after] == at_s))
    return CommonLevels(sea_m=sea_m[inside], basin_m=np.interp(at_s[inside], time_s, level_m))


def _overlap(sea: GaugeRecord, basin: GaugeRecord) -> Finding:
    start_s, end_s = max(sea.time_s[0], basin.time_s[0]), min(sea.time_s[-1], basin.time_s[-1])
    if start_s >= end_s:
        text = (
            f"the records have no time in common: the sea's runs from {utc_text(sea.time_s[0])} to "
            f"{utc_text(sea.time_s[-1])}, the basin's from {utc_text(basin.time_s[0])} to {utc_text(basin.time_s[-1])}"
        )
        return Finding(severity="warning", code="no-overlap", where="records", message=text)
    days = (end_s - start_s) / SECONDS_PER_DAY
    text = f"both records run from {utc_text(start_s)} to {utc_text(end_s)}, {days:.1f} days"
    return Finding(severity="note", code="overlap", where="records", message=text)


def _refuse_unit(sea_sd_m: float, basin_sd_m: float, correlation: float) -> None:
    larger, smaller = max(sea_sd_m, basin_sd_m), min(sea_sd_m, basin_sd_m)
    ratio = larger / smaller
    factor = min(UNIT_RATIOS, key=lambda candidate: abs(np.log(ratio / candidate)))
    near = 0.5 * factor < ratio < 2.0 * factor
    side = _larger(sea_sd_m, basin_sd_m)
    if larger > LARGEST_DEVIATION_M:
        remedy = f'write unit = "{UNIT_RATIOS[factor]}" in [records.{side}]'
    elif near and correlation > CLOSE_CORRELATION:
        other = "basin" if side == "sea" else "sea"
        remedy = (
            f'write unit = "{UNIT_RATIOS[factor]}" in [records.{side}] if its levels are too large, or mend the unit '
            f"of [records.{other}] if those are {factor:g} times too small"
        )
    else:
        return
    raise RecordError(
        f"records.{side}: levels scatter {larger:.3g} m, {ratio:.0f} times those of the other side ({smaller:.3g} m): "
        f"another unit than the plan says; {remedy}"
    )


def _larger(sea_sd_m: float, basin_sd_m: float) -> str:
    return "sea" if sea_sd_m >= basin_sd_m else "basin"


def _files(record: GaugeRecord) -> str:
    return ", ".join(file.path for file in record.files)
