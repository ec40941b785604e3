"""Records of a sweep: peaks in the main opening by crest level and by width."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

from tidescour.errors import Finding
from tidescour.units import FloatArray, read_only

TideName = Literal["spring", "mean", "neap"]
TIDES: Final[tuple[TideName, TideName, TideName]] = ("spring", "mean", "neap")
DIRECTIONS: Final = ("flood", "ebb")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SweptTide:
    """One tide of the window, from low water to low water at sea, and its range [m]."""

    name: TideName
    start_s: float
    end_s: float
    range_m: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SweepCurve:
    """Peaks in the main opening along a ladder of crest levels or of widths.

    Parameters
    ----------
    value_m : (n,) array
        Crest levels [m above datum], rising, or widths at the crest [m], falling.
    head_m, gap_velocity_m_s, unit_discharge_m2_s : (n, 3, 2) array
        Largest in each tide (in the order of `TIDES`) and direction (of `DIRECTIONS`), not negative; the unit discharge
        is that over the mean width of the control section. NaN where it hangs on the basin level of long before.
    mean_basin_level_m : (n,) array
        Over all whole tides of the window [m above datum]; NaN likewise.
    """

    value_m: FloatArray
    head_m: FloatArray
    gap_velocity_m_s: FloatArray
    unit_discharge_m2_s: FloatArray
    mean_basin_level_m: FloatArray

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in ("value_m", "head_m", "gap_velocity_m_s", "unit_discharge_m2_s", "mean_basin_level_m"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
        if self.value_m.ndim != 1 or self.mean_basin_level_m.shape != self.value_m.shape:
            raise ValueError("value_m and mean_basin_level_m must be two rows of one length")
        for key in ("head_m", "gap_velocity_m_s", "unit_discharge_m2_s"):
            if getattr(self, key).shape != (self.value_m.size, len(TIDES), len(DIRECTIONS)):
                raise ValueError(f"{key} must have a value for each rung, tide and direction")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ClosureSweep:
    """The main opening of a stage at other crests, and at other widths.

    Parameters
    ----------
    stage, opening : str
        The stage whose other openings stay as they are at its start, and the opening that is swept; no opening where
        nothing could be swept.
    tides : tuple of SweptTide
        Spring, mean and neap tide; none where nothing could be swept.
    crest : SweepCurve or None
        By crest level at the width of the start of the stage.
    width : SweepCurve or None
        By width at the crest level of the start of the stage.
    findings : tuple of Finding
        Why something was not swept.
    """

    stage: str
    opening: str = ""
    tides: tuple[SweptTide, ...] = ()
    crest: SweepCurve | None = None
    width: SweepCurve | None = None
    findings: tuple[Finding, ...] = ()
