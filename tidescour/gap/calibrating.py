"""A calibration from records to its verdict: estimate, held-back part, and the discharges side by side."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tidescour.errors import Finding
from tidescour.gap.basin_model import (
    ALL,
    Adjustment,
    BasinModel,
    basin_model,
    coefficient_column,
    measured_rows,
    usable_levels,
)
from tidescour.gap.calibration import estimate
from tidescour.gap.calibration_records import Estimate, Evidence
from tidescour.gap.calibration_verdict import WEAK_SIGNAL, refuse_untellable
from tidescour.gap.discharges import (
    CampaignComparison,
    DischargeSeries,
    compare_discharges,
    known_span,
    storage_discharge,
    tidal_discharge,
)
from tidescour.gap.drift import drift_findings, weekly_coefficients
from tidescour.gap.forcing import basin_inflow
from tidescour.gap.held_back import LaggedSea, LevelScore, fit_lagged_sea, lagged_sea_level, level_score
from tidescour.gap.levels import Waters, splined
from tidescour.gap.openings import OpeningSet
from tidescour.gap.storage import scaled_storage, wet_areas
from tidescour.gauge.records import GaugeRecord
from tidescour.plan.models import Basin, Calibration
from tidescour.plan.models_calibration import Discharge
from tidescour.units import FloatArray, read_only

FEWEST_HELD_BACK = 20


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Part:
    """How the routed level, and the guess from the sea alone, meet the record in one part of the span.

    Parameters
    ----------
    name : {"fitted", "held back"}
        Which part.
    start_s, end_s : float
        Its ends, seconds since 1970.
    routed, guess : LevelScore
        Of the fitted basin, and of the sea tide scaled and lagged as fits the fitted part best.
    """

    name: str
    start_s: float
    end_s: float
    routed: LevelScore
    guess: LevelScore


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CampaignTable:
    """Discharges at one opening, or at all together, side by side over the campaigns or the whole span.

    `measured` tells whether there was a campaign; `series` are the curves behind the rows, the measured last.
    """

    opening: str
    measured: bool
    comparisons: tuple[CampaignComparison, ...]
    series: tuple[DischargeSeries, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Calibrated:
    """All that a calibration found out.

    Parameters
    ----------
    estimate : Estimate
        The parameters.
    used : tuple of (str, float)
        The parameters by name as levels and discharges here were computed with: the estimates; but where only the
        ratio of coefficient and area factor is known, that ratio with the storage as the plan has it.
    coefficients : tuple of (str, float)
        Coefficient by opening, as fitted together; empty where it was not fitted.
    time_s, level_sea_m, level_routed_m, level_guess_m : (n,) array
        Steps, recorded sea, routed basin and the guess from the sea alone [m, datum of the sea record].
    record_time_s, record_level_m : (m,) array
        Good samples of the basin record, shifted to that datum.
    fitted_from_s, fitted_to_s : float
        The part of the record that was fitted.
    guess : LaggedSea
        The guess.
    parts : tuple of Part
        The fitted part, and what was held back where there is enough of it.
    campaigns : tuple of CampaignTable
        Discharges side by side.
    findings : tuple of Finding
        What a reader must know.
    """

    estimate: Estimate
    used: tuple[tuple[str, float], ...]
    coefficients: tuple[tuple[str, float], ...]
    time_s: FloatArray
    level_sea_m: FloatArray
    level_routed_m: FloatArray
    level_guess_m: FloatArray
    record_time_s: FloatArray
    record_level_m: FloatArray
    fitted_from_s: float
    fitted_to_s: float
    guess: LaggedSea
    parts: tuple[Part, ...]
    campaigns: tuple[CampaignTable, ...]
    findings: tuple[Finding, ...]

    def __post_init__(self) -> None:
        """Keep read-only copies."""
        for key in (
            "time_s",
            "level_sea_m",
            "level_routed_m",
            "level_guess_m",
            "record_time_s",
            "record_level_m",
        ):
            object.__setattr__(self, key, read_only(getattr(self, key)))


def calibrate_basin(
    calibration: Calibration, basin: Basin, waters: Waters, record: GaugeRecord, discharges: tuple[Discharge, ...]
) -> Calibrated:
    """Estimate coefficient, storage and datum from both gauges and measured discharges.

    Parameters
    ----------
    calibration : Calibration
        Span, what to fit, and the gap as it was then.
    basin : Basin
        Storage, inflows and side openings.
    waters : Waters
        Records, tides for their holes, and given series.
    record : GaugeRecord
        The basin gauge.
    discharges : tuple of Discharge
        Measured discharges; all are fitted, wherever in the span they lie.

    Raises
    ------
    FitError
        If the records cannot tell: no head, a shut gap, too short.
    RecordError, PlanError, DomainError
        If records or openings cannot serve.
    """
    model = basin_model(calibration, basin, waters)
    good = record.good & (record.time_s >= model.time_s[0]) & (record.time_s <= model.time_s[-1])
    time_s, level_m = record.time_s[good], record.level_m[good]
    split_s = float(model.time_s[-1] - calibration.hold_back * (model.time_s[-1] - model.time_s[0]))
    usable = usable_levels(model, time_s)
    fitted = usable & (time_s <= split_s)
    times, values, errors, places = measured_rows(discharges, model.openings)
    evidence = Evidence(
        level_time_s=time_s[fitted],
        level_m=level_m[fitted],
        discharge_time_s=times,
        discharge_m3_s=values,
        standard_error_m3_s=errors,
        discharge_opening=places,
    )
    adjustment = Adjustment(
        model=model,
        names=tuple(calibration.fit),
        level_time_s=evidence.level_time_s,
        discharge_time_s=times,
        discharge_opening=places,
    )
    found = estimate(adjustment.names, adjustment.start(), adjustment, evidence)
    used = _parameters_in_use(found)
    openings, area_factor, offset = adjustment.parts(used)
    routed = model.routed(openings, area_factor, offset)
    sea = model.seas.stage.level_m
    refuse_untellable(found, sea - routed)
    known_sea = np.where(model.seas.stage.covered, sea, np.nan)
    guess = fit_lagged_sea(model.time_s, known_sea, evidence.level_time_s, evidence.level_m + offset)
    guessed = lagged_sea_level(guess, model.time_s, known_sea, model.time_s)
    parts = _parts(model, time_s, level_m + offset, (fitted, usable & ~fitted), routed, guessed)
    campaigns = _campaigns(model, openings, area_factor, routed, time_s, level_m + offset, basin, waters, discharges)
    return Calibrated(
        estimate=found,
        used=tuple(zip(found.names, used.tolist(), strict=True)),
        coefficients=_coefficients(model, openings) if "coefficient" in found.names else (),
        time_s=model.time_s,
        level_sea_m=sea,
        level_routed_m=routed,
        level_guess_m=guessed,
        record_time_s=time_s,
        record_level_m=level_m + offset,
        fitted_from_s=float(evidence.level_time_s[0]),
        fitted_to_s=float(evidence.level_time_s[-1]),
        guess=guess,
        parts=parts,
        campaigns=campaigns,
        findings=(*found.findings, *_drift(found, used, evidence, adjustment), *_part_findings(parts)),
    )


def _drift(found: Estimate, used: FloatArray, evidence: Evidence, adjustment: Adjustment) -> tuple[Finding, ...]:
    if "coefficient" not in found.names:
        return ()
    place = found.names.index("coefficient")
    if found.level_signal[place] < WEAK_SIGNAL:
        return ()
    weekly = weekly_coefficients(evidence.level_time_s, evidence.level_m, adjustment, used, place)
    return drift_findings(weekly, float(used[place]))


def _parameters_in_use(found: Estimate) -> FloatArray:
    """Return the estimates; where only their ratio is known, the coefficient that goes with the plan's storage."""
    used = np.array(found.estimate)
    if found.ratio is not None and not np.any(found.determined[_pair(found)]):
        used[_pair(found)] = found.ratio.estimate, 1.0
    return used


def _pair(found: Estimate) -> list[int]:
    return [found.names.index("coefficient"), found.names.index("area_factor")]


def _coefficients(model: BasinModel, openings: OpeningSet) -> tuple[tuple[str, float], ...]:
    return tuple(
        (opening.name, float(openings.numbers[k, column]))
        for k, opening in enumerate(model.openings[: model.calibrated])
        if (column := coefficient_column(opening)) is not None
    )


def _parts(
    model: BasinModel,
    time_s: FloatArray,
    level_m: FloatArray,
    chosen: tuple[np.ndarray[tuple[int], np.dtype[np.bool_]], ...],
    routed: FloatArray,
    guessed: FloatArray,
) -> tuple[Part, ...]:
    parts = []
    for name, where in zip(("fitted", "held back"), chosen, strict=True):
        if np.count_nonzero(where) < FEWEST_HELD_BACK:
            continue
        stamps, recorded = time_s[where], level_m[where]
        scores = [level_score(stamps, np.interp(stamps, model.time_s, curve), recorded) for curve in (routed, guessed)]
        parts.append(
            Part(name=name, start_s=float(stamps[0]), end_s=float(stamps[-1]), routed=scores[0], guess=scores[1])
        )
    return tuple(parts)


def _part_findings(parts: tuple[Part, ...]) -> tuple[Finding, ...]:
    if len(parts) < 2:
        return (
            Finding(
                severity="warning",
                code="nothing-held-back",
                where="calibration.hold_back",
                message="no part of the record was held back, so that nothing shows how well the basin predicts; write "
                "hold_back = 0.25, or a longer span",
            ),
        )
    held = parts[1]
    if held.routed.rms_m < held.guess.rms_m:
        return ()
    return (
        Finding(
            severity="warning",
            code="no-better-than-guess",
            where="calibration",
            message=f"the routed basin misses the held-back record by {100.0 * held.routed.rms_m:.1f} cm rms, the sea "
            f"tide scaled and lagged by {100.0 * held.guess.rms_m:.1f} cm: the openings, the storage or their change "
            "in that time are not as the plan says; later stages stand on them",
        ),
    )


def _campaigns(
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
    """Return the discharges side by side: of all openings, and of each at which something was measured."""
    recorded = splined(model.time_s, time_s, level_m)
    times, values, errors, places = measured_rows(discharges, model.openings)
    tables = []
    for place in (ALL, *np.unique(places[places != ALL]).tolist()):
        name = "" if place == ALL else model.openings[place].name
        # Where the record has a hole there is no head, and no discharge by it.
        by_head = model.discharge(openings, place, np.where(np.isfinite(recorded), recorded, routed))
        series = [
            _series("by head", model.time_s, np.where(np.isfinite(recorded), by_head, np.nan)),
            _series("routed", model.time_s, model.discharge(openings, place, routed)),
        ]
        if place == ALL and (stored := _by_storage(model, area_factor, time_s, level_m, basin, waters)) is not None:
            series.insert(1, stored)
        here = places == place
        enough = bool(np.count_nonzero(here) > 1 and np.all(np.diff(times[here]) > 0.0))
        if not enough and place != ALL:
            continue
        if enough:
            measured = DischargeSeries(
                source="measured",
                time_s=times[here],
                discharge_m3_s=values[here],
                standard_error_m3_s=errors[here],
                independent=True,
            )
            comparisons = compare_discharges(measured, tuple(series))
            series.append(measured)
        else:
            comparisons = _whole_span(series)
        tables.append(CampaignTable(opening=name, measured=enough, comparisons=comparisons, series=tuple(series)))
    return tuple(tables)


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
