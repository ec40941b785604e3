"""Records of what the gauges read."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, get_args

import numpy as np

from tidescour.errors import Finding
from tidescour.plan.kinds import Side
from tidescour.plan.models import Quantity
from tidescour.units import FlagArray, FloatArray, read_only

PASS: Final = 1
NOT_EVALUATED: Final = 2
SUSPECT: Final = 3
FAIL: Final = 4
MISSING: Final = 9
FLAGS: Final = (PASS, NOT_EVALUATED, SUSPECT, FAIL, MISSING)
"""Primary flags of UNESCO/IOC (2013), Ocean Data Standards volume 3, Manuals and Guides 54."""


def _check_time(time_s: FloatArray, what: str) -> None:
    if time_s.ndim != 1 or not np.all(np.isfinite(time_s)):
        raise ValueError(f"{what}: stamps must be one row of finite numbers")
    if np.any(np.diff(time_s) <= 0.0):
        raise ValueError(f"{what}: stamps must increase")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class InputFile:
    """A file that was read: path relative to the plan, SHA-256 in hexadecimal."""

    path: str
    sha256: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class GaugeRecord:
    """One gauge on the site datum and on UTC, a row only for a row read.

    Parameters
    ----------
    side : {"sea", "basin"}
        Where the gauge stands.
    time_s : (n,) array
        Seconds since 1970-01-01T00:00:00Z, increasing.
    level_m : (n,) array
        Level above the site datum [m]; NaN where missing.
    flag : (n,) array of int8
        1 pass, 2 not evaluated, 3 suspect, 4 fail, 9 missing.
    step_s : float
        Commonest step between stamps [s].
    files : tuple of InputFile
        What was read.
    findings : tuple of Finding
        What a reader must know.
    """

    side: Side
    time_s: FloatArray
    level_m: FloatArray
    flag: FlagArray
    step_s: float
    files: tuple[InputFile, ...]
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes, order of time and flags; keep read-only copies."""
        object.__setattr__(self, "time_s", read_only(self.time_s))
        object.__setattr__(self, "level_m", read_only(self.level_m))
        flag = np.array(self.flag, dtype=np.int8)
        flag.flags.writeable = False
        object.__setattr__(self, "flag", flag)
        if self.side not in get_args(Side):
            raise ValueError(f"side {self.side!r} must be sea or basin")
        if not self.time_s.shape == self.level_m.shape == self.flag.shape:
            raise ValueError("time_s, level_m and flag must have one shape")
        _check_time(self.time_s, self.side)
        if not np.all(np.isin(flag, FLAGS)):
            raise ValueError(f"flags must be among {FLAGS}")
        if np.any(np.isnan(self.level_m) & ~np.isin(flag, (MISSING, FAIL))):
            raise ValueError("a level that is not a number must be flagged 9 or 4")

    @property
    def good(self) -> np.ndarray:
        """(n,) bool array: samples flagged 1 or 2, the only ones that fits and flows use."""
        return np.asarray((self.flag == PASS) | (self.flag == NOT_EVALUATED))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class GivenSeries:
    """A series given in the plan: levels [m], discharges [m3/s] or velocities [m/s], positive flood, SI, UTC.

    Parameters
    ----------
    name : str
        Name in the plan.
    quantity : {"level", "discharge", "velocity"}
        What it holds.
    time_s, value : (n,) array
        Seconds since 1970 (increasing) and finite values; missing rows are left out.
    file : InputFile
        What was read.
    findings : tuple of Finding
        What a reader must know.
    """

    name: str
    quantity: Quantity
    time_s: FloatArray
    value: FloatArray
    file: InputFile
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes, order of time and finiteness; keep read-only copies."""
        object.__setattr__(self, "time_s", read_only(self.time_s))
        object.__setattr__(self, "value", read_only(self.value))
        if self.time_s.shape != self.value.shape:
            raise ValueError("time_s and value must have one shape")
        _check_time(self.time_s, self.name)
        if not np.all(np.isfinite(self.value)):
            raise ValueError(f"{self.name}: values must be finite")
