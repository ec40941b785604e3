"""Discharges of a calibration side by side: by head, by storage, routed and as measured."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tidescour.gap.basin_model import ALL, BasinModel, measured_rows
from tidescour.gap.discharges import (
    CampaignComparison,
    DischargeSeries,
    compare_discharges,
    known_span,
    storage_discharge,
    tidal_discharge,
)
from tidescour.gap.forcing import basin_inflow
from tidescour.gap.levels import Waters, splined
from tidescour.gap.openings import OpeningSet
from tidescour.gap.smoothing import smoothed_level
from tidescour.gap.storage import scaled_storage, wet_areas
from tidescour.plan.models import Basin
from tidescour.plan.models_calibration import Discharge
from tidescour.units import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CampaignTable:
    """Discharges at one opening, or at all together, side by side over the campaigns or the whole span.

    `measured` tells whether there was a campaign; `series` are the curves behind the rows, the measured last.
    """

    opening: str
    measured: bool
    comparisons: tuple[CampaignComparison, ...]
    series: tuple[DischargeSeries, ...]


def campaign_tables(
    model: BasinModel,
    openings: OpeningSet,
    area_factor: float,
    routed: FloatArray,
    time_s: FloatArray,
    level_m: FloatArray,
    basin: Basin,
    waters: Waters,
    discharges: tuple[Discharge, ...],
) -> tuple[CampaignTable, ...]:
    """Return the discharges side by side: of all openings, and of each at which something was measured.

    Parameters
    ----------
    model : BasinModel
        The basin.
    openings : OpeningSet
        With the coefficients in use.
    area_factor : float
        Times the storage of the plan.
    routed : (n,) array
        Routed basin level at the model's steps [m above datum].
    time_s, level_m : (m,) array
        Good samples of the basin record on that datum; smoothed here for the discharge by head.
    basin : Basin
        Its inflows.
    waters : Waters
        Where given series are found.
    discharges : tuple of Discharge
        Measured ones.
    """
    recorded = splined(model.time_s, time_s, smoothed_level(time_s, level_m))
    known = np.isfinite(recorded) & model.seas.covered
    times, values, errors, places = measured_rows(discharges, model.openings)
    tables = []
    for place in (ALL, *np.unique(places[places != ALL]).tolist()):
        name = "" if place == ALL else model.openings[place].name
        # Where a record has a hole there is no head, and no discharge by it.
        by_head = model.discharge(openings, place, np.where(known, recorded, routed))
        series = [
            _series("by head", model.time_s, np.where(known, by_head, np.nan)),
            _series("routed", model.time_s, model.discharge(openings, place, routed)),
        ]
        if place == ALL and (stored := _by_storage(model, area_factor, time_s, level_m, basin, waters)) is not None:
            series.insert(1, stored)
        here = places == place
        measured = _measured(times[here], values[here], errors[here])
        if measured is None and place != ALL:
            continue
        if measured is not None:
            comparisons = compare_discharges(measured, tuple(series))
            series.append(measured)
        else:
            comparisons = _whole_span(series)
        tables.append(
            CampaignTable(opening=name, measured=measured is not None, comparisons=comparisons, series=tuple(series))
        )
    return tuple(tables)


def _measured(times: FloatArray, values: FloatArray, errors: FloatArray) -> DischargeSeries | None:
    """Return measurements as a series, those of one instant as their weighted mean; None for less than two instants."""
    instants, row = np.unique(times, return_inverse=True)
    if instants.size < 2:
        return None
    weight = np.bincount(row, errors**-2.0)
    return DischargeSeries(
        source="measured",
        time_s=instants,
        discharge_m3_s=np.bincount(row, values * errors**-2.0) / weight,
        standard_error_m3_s=np.sqrt(1.0 / weight),
        independent=True,
    )


def _series(source: str, time_s: FloatArray, discharge: FloatArray) -> DischargeSeries:
    return DischargeSeries(
        source=source,
        time_s=time_s,
        discharge_m3_s=discharge,
        standard_error_m3_s=np.full(time_s.shape, np.nan),
    )


def _by_storage(
    model: BasinModel, area_factor: float, time_s: FloatArray, level_m: FloatArray, basin: Basin, waters: Waters
) -> DischargeSeries | None:
    """Return the discharge by storage on even steps of the record; None where it is too short."""
    step = float(np.median(np.diff(time_s)))
    even = model.time_s[0] + step * np.arange(int((model.time_s[-1] - model.time_s[0]) / step) + 1)
    if even.size < 5:
        return None
    storage = scaled_storage(model.storage, area_factor)
    return storage_discharge(
        even,
        splined(even, time_s, level_m),
        lambda level: wet_areas(storage, level),
        basin_inflow(basin, waters, even, "calibration"),
    )


def _whole_span(series: list[DischargeSeries]) -> tuple[CampaignComparison, ...]:
    """Return the sources over the span that all know, where none of them has a hole in it."""
    spans = [known_span(each) for each in series]
    start, end = max(span[0] for span in spans), min(span[1] for span in spans)
    if not start < end:
        return ()
    rows = tuple(tidal_discharge(each, start, end) for each in series)
    return (CampaignComparison(start_s=start, end_s=end, whole_flood=False, whole_ebb=False, rows=rows),)
