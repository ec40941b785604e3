"""Constants, array helpers and the few conversions made at the door."""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
FlagArray = NDArray[np.int8]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

GRAVITY_M_S2: Final = 9.81
SECONDS_PER_HOUR: Final = 3600.0
SECONDS_PER_DAY: Final = 86400.0
M2_PERIOD_H: Final = 12.4206012
"""Period of the principal lunar tide [h]: 360 / 28.984104 degrees per hour (NOAA list of constituents)."""

METRES_PER_UNIT: Final[dict[str, float]] = {"m": 1.0, "cm": 0.01, "mm": 0.001, "ft": 0.3048}


def read_only(values: Any) -> FloatArray:
    """Return a read-only float64 copy of any array-like."""
    array = np.array(values, dtype=np.float64)
    array.flags.writeable = False
    return array


def seconds_since_epoch(moment: datetime) -> float:
    """Return an aware date-time as seconds since 1970-01-01T00:00:00Z; a naive one is refused."""
    if moment.tzinfo is None:
        raise ValueError(f"{moment.isoformat()} has no offset from UTC")
    return (moment - datetime(1970, 1, 1, tzinfo=UTC)).total_seconds()


def datetime64_utc(time_s: FloatArray) -> NDArray[np.datetime64]:
    """Return seconds since 1970 as naive UTC ``datetime64[ms]``, rounded to the millisecond."""
    return np.rint(np.asarray(time_s) * 1000.0).astype(np.int64).astype("datetime64[ms]")


def utc_text(time_s: float) -> str:
    """Return seconds since 1970 as ``2027-04-01T00:10:00Z``, with milliseconds only where there are any."""
    moment = np.datetime64(round(float(time_s) * 1000.0), "ms")
    text = str(moment)
    return (text[:-4] if text.endswith(".000") else text) + "Z"
