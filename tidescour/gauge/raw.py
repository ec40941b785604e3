"""What a layout is asked and what it returns: the seam between files and records."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from tidescour.errors import Finding
from tidescour.gauge.records import NOT_EVALUATED
from tidescour.plan.models import Clock, Column
from tidescour.units import FlagArray, FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """What the plan says on how one file is read.

    Parameters
    ----------
    where : str
        Key path in the plan and name of the file, for messages: ``records.sea: sea.csv``.
    table : str
        Key path in the plan alone, for the remedy in messages: ``records.sea``.
    clock : Clock
        Time columns, format, offset or zone, and missing values.
    value : str or int
        Column of the value, by name or 0-based position.
    value_key : {"level", "value"}
        Key that names that column in the plan, for messages.
    unit : str
        Unit of the value in the plan.
    """

    where: str
    table: str
    clock: Clock
    value: Column
    value_key: Literal["level", "value"]
    unit: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RawColumns:
    """Stamps and values of one or more files, in the order and the unit of the file.

    Parameters
    ----------
    time_s : (n,) array
        Stamps as read, on UTC [s since 1970]; in file order, finite.
    value : (n,) array
        Numbers as read; NaN where missing or not finite.
    flag : (n,) array of int8
        2 where nothing is known, 9 where missing, 4 where not finite, or what the agency's own code means.
    line : (n,) array of int
        Line in the file, counted from 1.
    part : (n,) array of int
        Which file, where several are joined.
    findings : tuple of Finding
        What was put right while reading.
    """

    time_s: FloatArray
    value: FloatArray
    flag: FlagArray
    line: NDArray[np.int64]
    part: NDArray[np.int64] = field(default_factory=lambda: np.zeros(0, dtype=np.int64))
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        """Check shapes; a record of a single file needs no `part`."""
        if self.part.size == 0 and self.time_s.size:
            object.__setattr__(self, "part", np.zeros(self.time_s.size, dtype=np.int64))
        for key in ("value", "flag", "line", "part"):
            if getattr(self, key).shape != self.time_s.shape:
                raise ValueError(f"{key} must be as long as time_s")
        if not np.all(np.isfinite(self.time_s)):
            raise ValueError("stamps must be finite")
        if np.any(np.isfinite(self.value) & (self.flag == 9)) or np.any(
            np.isnan(self.value) & (self.flag == NOT_EVALUATED)
        ):
            raise ValueError("a missing value must be NaN and flagged")

    def rows(self, index: NDArray[np.int64], *findings: Finding) -> RawColumns:
        """Return the rows at `index`, in that order, with further findings."""
        return RawColumns(
            time_s=self.time_s[index],
            value=self.value[index],
            flag=self.flag[index],
            line=self.line[index],
            part=self.part[index],
            findings=self.findings + findings,
        )


Layout = Callable[[str, Reading], RawColumns]
