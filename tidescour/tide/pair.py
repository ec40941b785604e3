"""What the tides of both sides say about each other."""

from __future__ import annotations

from typing import Final

import numpy as np

from tidescour.errors import Finding, RecordError
from tidescour.tide.library import constituent_frequencies
from tidescour.tide.records import TideFit

LEAD_NOTICED_MIN: Final = 5.0
"""A lead of the basin over the sea under this is taken for an error of the clocks (common practice, no source)."""


def compare_fits(sea: TideFit, basin: TideFit) -> tuple[Finding, ...]:
    """Compare the principal lunar tide (M2) of both sides.

    A basin that is filled through the gap has a smaller tide that comes later. The lag is taken within half a period.

    Parameters
    ----------
    sea, basin : TideFit
        Tides of the two sides.

    Returns
    -------
    tuple of Finding
        A note with amplitude ratio and lag; a warning where the basin has the larger M2, or leads by over 5 min.

    Raises
    ------
    RecordError
        If the basin has the larger M2 and leads by over 5 min: the records are exchanged.
    """
    where = "records.sea, records.basin"
    constants = (sea.constants, basin.constants)
    if any("M2" not in each.constituents for each in constants):
        message = "M2 is not fitted on both sides, so amplitude ratio and lag of the basin are not known"
        return (Finding(severity="note", code="sides-not-compared", where=where, message=message),)
    place = [each.constituents.index("M2") for each in constants]
    amplitude_m = [float(each.amplitude_m[index]) for each, index in zip(constants, place, strict=True)]
    phase_deg = [float(each.phase_deg[index]) for each, index in zip(constants, place, strict=True)]
    if min(amplitude_m) <= 0.0:
        message = "one side has no M2, so amplitude ratio and lag of the basin are not known"
        return (Finding(severity="note", code="sides-not-compared", where=where, message=message),)
    minutes_per_degree = 60.0 / 360.0 / float(constituent_frequencies(["M2"])[0])
    lag_min = (np.remainder(phase_deg[1] - phase_deg[0] + 180.0, 360.0) - 180.0) * minutes_per_degree
    larger, leads = amplitude_m[1] > amplitude_m[0], lag_min < -LEAD_NOTICED_MIN
    found = (
        f"M2 is {amplitude_m[0]:.3f} m at sea and {amplitude_m[1]:.3f} m in the basin (ratio "
        f"{amplitude_m[1] / amplitude_m[0]:.3f}), the basin {'leads' if lag_min < 0.0 else 'lags'} by "
        f"{abs(lag_min):.1f} min"
    )
    if larger and leads:
        raise RecordError(
            f"{where}: {found}: the records are exchanged; write the files of the sea gauge under [records.sea] and "
            "those of the basin gauge under [records.basin]"
        )
    note = Finding(severity="note", code="sides-compared", where=where, message=found)
    warning = Finding(
        severity="warning",
        code="basin-larger" if larger else "basin-leads",
        where=where,
        message=f"{found}: a basin filled through the gap has the smaller tide and lags; look at datum, unit and clock",
    )
    return (note, warning) if larger or leads else (note,)
