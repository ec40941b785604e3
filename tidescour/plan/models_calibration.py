"""Keys of a calibration and of measured discharges as typed records."""

from __future__ import annotations

from typing import Annotated, Final, Literal

from pydantic import AfterValidator, AwareDatetime, Field

from tidescour.plan.kinds import Filled, Finite, PlanModel, Positive

FitName = Literal["coefficient", "area_factor", "datum_offset_m"]

ALL_OPENINGS: Final = "all"
"""What a measured discharge may name instead of one opening; the loader leaves it empty."""


def _one_name_for_all(name: str) -> str:
    return "" if name == ALL_OPENINGS else name


class Discharge(PlanModel):
    """One measured discharge (`[[discharge]]`, or a row of `calibration.discharge_file`)."""

    time: AwareDatetime
    """When it was measured, with an offset from UTC."""
    opening: Annotated[str, AfterValidator(_one_name_for_all)] = ""
    """Opening of the calibration or of the basin; empty or "all" for the sum of all of them."""
    discharge_m3_s: Finite
    """Discharge, positive in the flood direction [m3/s]."""
    standard_error_m3_s: Positive
    """Its standard error [m3/s]."""


class CalibrationSpan(PlanModel):
    """What a calibration has besides its openings."""

    start: AwareDatetime
    """Start of the records that are used, with an offset from UTC."""
    end: AwareDatetime
    """End of the records that are used, with an offset from UTC."""
    fit: Annotated[tuple[FitName, ...], Field(min_length=1, json_schema_extra={"uniqueItems": True})]
    """What is estimated: coefficient, area_factor, datum_offset_m, or some of them."""
    hold_back: Annotated[float, Field(ge=0, le=0.5, allow_inf_nan=False)] = 0.25
    """Share of the span, at its end, that is predicted and not fitted."""
    discharge_file: Filled | None = None
    """Table of measured discharges, .csv or .xlsx, with the columns time, opening, discharge_m3_s and
    standard_error_m3_s; beside or instead of [[discharge]]."""
