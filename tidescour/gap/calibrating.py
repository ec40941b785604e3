"""A calibration from records to its verdict: estimate, held-back part, and the discharges side by side."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from tidescour.errors import Finding, FitError
from tidescour.gap.basin_model import (
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
from tidescour.gap.campaigns import CampaignTable, campaign_tables
from tidescour.gap.drift import drift_findings, weekly_coefficients
from tidescour.gap.held_back import LaggedSea, LevelScore, fit_lagged_sea, lagged_sea_level, level_score
from tidescour.gap.levels import Waters
from tidescour.gap.openings import OpeningSet
from tidescour.gap.relations import RELATIONS
from tidescour.gap.volume import AGREES
from tidescour.gauge.records import GaugeRecord
from tidescour.plan.models import Basin, Calibration
from tidescour.plan.models_calibration import Discharge
from tidescour.units import FloatArray, read_only

FEWEST_HELD_BACK = 20
LEAST_WET = 0.1


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
class Calibrated:
    """All that a calibration found out.

    Parameters
    ----------
    estimate : Estimate
        The parameters.
    used : Estimate
        What levels and discharges here were computed with: `estimate` itself; but where neither coefficient nor area
        factor is known by itself, an estimate of the others with the storage as the plan has it.
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
    used: Estimate
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
    _refuse_shut(model, time_s, level_m)
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
    used, adjustment = _in_use(found, adjustment, evidence)
    openings, area_factor, offset = adjustment.parts(used.estimate)
    routed = model.routed(openings, area_factor, offset)
    sea = model.seas.stage.level_m
    refuse_untellable(found, sea - routed)
    known_sea = np.where(model.seas.stage.covered, sea, np.nan)
    guess = fit_lagged_sea(model.time_s, known_sea, evidence.level_time_s, evidence.level_m + offset)
    guessed = lagged_sea_level(guess, model.time_s, known_sea, model.time_s)
    parts = _parts(model, time_s, level_m + offset, (fitted, usable & ~fitted), routed, guessed)
    campaigns = campaign_tables(
        model, openings, area_factor, routed, time_s, level_m + offset, basin, waters, discharges
    )
    return Calibrated(
        estimate=found,
        used=used,
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
        findings=(
            *found.findings,
            *_kept_storage(found, used),
            *(each for each in used.findings if each.code == "at-odds-with-physics" and each not in found.findings),
            *_beyond_table(model, openings),
            *_head_findings(campaigns),
            *_drift(used, evidence, adjustment),
            *_part_findings(parts),
        ),
    )


def _refuse_shut(model: BasinModel, time_s: FloatArray, level_m: FloatArray) -> None:
    """Refuse a calibration whose openings hardly let anything through by the recorded levels themselves."""
    highest = np.maximum(np.interp(time_s, model.time_s, model.seas.stage.level_m), level_m)
    related = [opening for opening in model.openings[: model.calibrated] if opening.relation is not None]
    wet = max((float(np.mean(highest > opening.crest_level_m)) for opening in related), default=0.0)
    if wet < LEAST_WET:
        raise FitError(
            "calibration: the gap is shut: the recorded levels stand over the crest of its openings in "
            f"{100.0 * wet:.0f} % of the span only; correct crest_level_m of "
            "[[calibration.opening]], or choose a span with an open gap"
        )


def _beyond_table(model: BasinModel, openings: OpeningSet) -> tuple[Finding, ...]:
    """Return a warning for each opening whose fitted coefficient the table of relations does not allow."""
    findings = []
    for k, opening in enumerate(model.openings[: model.calibrated]):
        column = coefficient_column(opening)
        if column is None:
            continue
        value, allowed = float(openings.numbers[k, column]), RELATIONS[str(opening.relation)].parameters[column]
        if not allowed.allows(value):
            findings.append(
                Finding(
                    severity="warning",
                    code="at-odds-with-physics",
                    where=f"calibration, opening {opening.name!r}",
                    message=f"coefficient = {value:.3g} is beyond the {allowed.high:g} that {opening.relation} allows, "
                    "so that no plan takes it: look at crest, width and storage, or choose another relation",
                )
            )
    return tuple(findings)


def _head_findings(campaigns: tuple[CampaignTable, ...]) -> tuple[Finding, ...]:
    """Return a warning where the flow by head and by storage, of all openings, disagree."""
    for table in campaigns:
        for comparison in table.comparisons if not table.opening else ():
            volume = {row.source: row.flood_volume_m3 + row.ebb_volume_m3 for row in comparison.rows}
            ratio = volume.get("by head", np.nan) / volume.get("by storage", np.nan)
            if np.isfinite(ratio) and not AGREES[0] <= ratio <= AGREES[1]:
                return (
                    Finding(
                        severity="warning",
                        code="head-and-storage-disagree",
                        where="calibration",
                        message=f"by the head {ratio:.2f} times as much water runs as by the basin's storage: the "
                        "head is near the noise of the gauges, or openings, storage or datums are wrong; do not use "
                        "measured levels on both sides for stages with such heads",
                    ),
                )
    return ()


def _in_use(found: Estimate, adjustment: Adjustment, evidence: Evidence) -> tuple[Estimate, Adjustment]:
    """Return the estimate to compute with; where at most a ratio is known, one with the storage as the plan has it."""
    pair = [name in ("coefficient", "area_factor") for name in found.names]
    if found.ratio is None or np.any(found.determined[pair]):
        return found, adjustment
    others = replace(adjustment, names=tuple(name for name in found.names if name != "area_factor"))
    return estimate(others.names, others.start(), others, evidence), others


def _kept_storage(found: Estimate, used: Estimate) -> tuple[Finding, ...]:
    if used is found:
        return ()
    values = ", ".join(f"{name} = {value:.3g}" for name, value in zip(used.names, used.estimate.tolist(), strict=True))
    return (
        Finding(
            severity="note",
            code="storage-kept",
            where="calibration",
            message="neither coefficient nor area_factor is known by itself, so that levels, discharges and the lines "
            f"for the plan are those of a second fit, with the storage as the plan has it: {values}",
        ),
    )


def _drift(used: Estimate, evidence: Evidence, adjustment: Adjustment) -> tuple[Finding, ...]:
    if "coefficient" not in used.names:
        return ()
    place = used.names.index("coefficient")
    if used.level_signal[place] < WEAK_SIGNAL:
        return ()
    weekly = weekly_coefficients(evidence.level_time_s, evidence.level_m, adjustment, used.estimate, place)
    return drift_findings(weekly, float(used.estimate[place]))


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
