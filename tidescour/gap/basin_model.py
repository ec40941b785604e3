"""The basin as it was while both gauges were there: recorded sea in, basin level and discharges out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from tidescour.errors import DomainError, RecordError
from tidescour.gap.calibration_records import Simulated
from tidescour.gap.forcing import Seas, even_steps, exchanging, stage_forcing, stage_seas, with_points_between
from tidescour.gap.levels import Waters, given_values, side_levels
from tidescour.gap.openings import OpeningSet, opening_rows, opening_set
from tidescour.gap.relations import RELATIONS
from tidescour.gap.routing import Forcing, basin_levels
from tidescour.gap.smoothing import smoothed_record
from tidescour.gap.storage import Storage, basin_storage, scaled_storage
from tidescour.plan.models import Basin, Calibration, Opening, Stage
from tidescour.plan.models_calibration import Discharge
from tidescour.units import SECONDS_PER_HOUR, BoolArray, FloatArray, read_only, seconds_since_epoch, utc_text

SETTLING_S = 24.84 * SECONDS_PER_HOUR
"""Two tides after the start, in which the recorded level that the routing starts from is forgotten or nearly so."""

ALL = -1
"""Place of a discharge measured over all openings together."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BasinModel:
    """A basin ready to be routed through the span of its records with other coefficients, storage or datum.

    Parameters
    ----------
    openings : tuple of Opening
        Those of the calibration, then those beside the gap.
    calibrated : int
        How many of them are of the calibration: the coefficients of these are changed together.
    opening_set : OpeningSet
        Those with a relation, for the kernels.
    forcing : Forcing
        The recorded sea level and given flows.
    storage : Storage
        As the plan has it.
    time_s : (n,) array
        Steps, seconds since 1970.
    seas : Seas
        Sea levels at the steps.
    start_level_m : float
        Recorded basin level at the first step [m, datum of the basin record].
    given_m3_s : mapping as tuple of (int, (n,) array)
        Given discharges by the place of their opening.
    """

    openings: tuple[Opening, ...]
    calibrated: int
    opening_set: OpeningSet
    forcing: Forcing
    storage: Storage
    time_s: FloatArray
    seas: Seas
    start_level_m: float
    given_m3_s: tuple[tuple[int, FloatArray], ...]

    def first_coefficient(self) -> float:
        """Return the coefficient, as the plan has it, that stands for all: that of the first opening with one.

        Raises
        ------
        DomainError
            If no opening of the calibration has a coefficient.
        """
        for k, opening in enumerate(self.openings[: self.calibrated]):
            column = coefficient_column(opening)
            if column is not None:
                return float(self.opening_set.numbers[k, column])
        raise DomainError("calibration: none of its openings has a coefficient to fit")

    def with_coefficient(self, coefficient: float) -> OpeningSet:
        """Return the openings with coefficients changed together, so that the first is as asked for."""
        share = coefficient / self.first_coefficient()
        numbers = self.opening_set.numbers.copy()
        for k, opening in enumerate(self.openings[: self.calibrated]):
            column = coefficient_column(opening)
            if column is not None:
                numbers[k, column] *= share
        return self.opening_set._replace(numbers=numbers)

    def routed(self, openings: OpeningSet, area_factor: float, datum_offset_m: float) -> FloatArray:
        """Return basin levels at the steps [m, datum of the sea record]."""
        storage = scaled_storage(self.storage, area_factor)
        return basin_levels(openings, self.forcing, storage, self.start_level_m + datum_offset_m).level_m

    def discharge(self, openings: OpeningSet, place: int, level_m: FloatArray) -> FloatArray:
        """Return the discharge at the steps of one opening, or of `ALL`, for a basin level [m3/s, flood positive]."""
        places = range(len(self.openings)) if place == ALL else (place,)
        given = dict(self.given_m3_s)
        related = [k for k, opening in enumerate(self.openings) if opening.relation is not None]
        total = np.zeros(level_m.shape)
        for each in places:
            if each in given:
                total = total + given[each]
            else:
                sea = self.seas.at(self.openings[each]).level_m
                total = total + opening_rows(openings, related.index(each), sea, level_m)[0]
        return total


def coefficient_column(opening: Opening) -> int | None:
    """Return the place of the coefficient among the numbers of an opening's relation; None without one."""
    if opening.relation is None:
        return None
    names = [parameter.name for parameter in RELATIONS[opening.relation].parameters]
    return names.index("coefficient") if "coefficient" in names else None


def basin_model(calibration: Calibration, basin: Basin, waters: Waters) -> BasinModel:
    """Return the basin of a calibration, ready to be routed; the sea record is smoothed, see `smoothed_level`.

    Raises
    ------
    RecordError, FitError, PlanError, DomainError
        If the records or given series do not cover the span, or an opening is not right.
    """
    stage = Stage(
        name="calibration",
        start=calibration.start,
        end=calibration.end,
        sea="measured",
        basin="measured",
        opening=calibration.opening,
    )
    if waters.sea_record is not None:
        waters = replace(waters, sea_record=smoothed_record(waters.sea_record))
    time_s = even_steps(seconds_since_epoch(stage.start), seconds_since_epoch(stage.end))
    instants = with_points_between(time_s)
    openings = (*stage.opening, *basin.side_opening)
    seas = stage_seas(stage, openings, waters, instants, bridge=True)
    recorded = side_levels("measured", "basin", waters, time_s, stage.name, bridge=False)
    if not recorded.covered[0]:
        raise RecordError(
            f"calibration: the basin gauge has no good sample within the hour at {utc_text(time_s[0])}, where the "
            "routing must start; write a later calibration.start"
        )
    return BasinModel(
        openings=openings,
        calibrated=len(stage.opening),
        opening_set=opening_set(exchanging(stage, basin)),
        forcing=stage_forcing(stage, basin, waters, instants, seas),
        storage=basin_storage(basin),
        time_s=time_s,
        seas=seas.every_second(),
        start_level_m=float(recorded.level_m[0]),
        given_m3_s=tuple(
            (k, given_values(waters.series[opening.discharge_series], time_s, stage.name))
            for k, opening in enumerate(openings)
            if opening.discharge_series is not None
        ),
    )


def opening_place(name: str, openings: Sequence[Opening]) -> int:
    """Return the place of an opening by its name, `ALL` for none."""
    return ALL if not name else [opening.name for opening in openings].index(name)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Adjustment:
    """From fitted parameters to what the model says at the instants of the evidence; see `Simulate`.

    Parameters
    ----------
    model : BasinModel
        The basin.
    names : tuple of str
        What is fitted; the others stay as the plan has them.
    level_time_s : (n,) array
        Instants of the recorded levels.
    discharge_time_s : (k,) array
        Instants of the measured discharges.
    discharge_opening : (k,) array of int
        Their openings, `ALL` for the sum.
    """

    model: BasinModel
    names: tuple[str, ...]
    level_time_s: FloatArray
    discharge_time_s: FloatArray
    discharge_opening: np.ndarray[tuple[int], np.dtype[np.int64]]

    def start(self) -> FloatArray:
        """Return the parameters as the plan has them."""
        plan = {"coefficient": 0.0, "area_factor": 1.0, "datum_offset_m": 0.0}
        if "coefficient" in self.names:
            plan["coefficient"] = self.model.first_coefficient()
        return np.array([plan[name] for name in self.names])

    def parts(self, parameters: FloatArray) -> tuple[OpeningSet, float, float]:
        """Return openings, area factor and offset of the datum [m] for the parameters."""
        given = dict(zip(self.names, parameters.tolist(), strict=True))
        openings = self.model.opening_set
        if "coefficient" in given:
            openings = self.model.with_coefficient(given["coefficient"])
        return openings, given.get("area_factor", 1.0), given.get("datum_offset_m", 0.0)

    def __call__(self, parameters: FloatArray) -> Simulated:
        """Return levels on the datum of the basin record, and discharges."""
        openings, area_factor, offset = self.parts(parameters)
        level = self.model.routed(openings, area_factor, offset)
        discharge = np.empty(self.discharge_time_s.shape)
        for place in np.unique(self.discharge_opening):
            here = self.discharge_opening == place
            flow = self.model.discharge(openings, int(place), level)
            discharge[here] = np.interp(self.discharge_time_s[here], self.model.time_s, flow)
        return Simulated(
            level_m=read_only(np.interp(self.level_time_s, self.model.time_s, level) - offset),
            discharge_m3_s=read_only(discharge),
        )


def measured_rows(
    discharges: Sequence[Discharge], openings: Sequence[Opening]
) -> tuple[FloatArray, FloatArray, FloatArray, np.ndarray[tuple[int], np.dtype[np.int64]]]:
    """Return instants [s], values and standard errors [m3/s], and places of measured discharges, in order of time."""
    ordered = sorted(discharges, key=lambda each: each.time)
    return (
        np.array([seconds_since_epoch(each.time) for each in ordered], dtype=np.float64),
        np.array([each.discharge_m3_s for each in ordered], dtype=np.float64),
        np.array([each.standard_error_m3_s for each in ordered], dtype=np.float64),
        np.array([opening_place(each.opening, openings) for each in ordered], dtype=np.int64),
    )


def usable_levels(model: BasinModel, time_s: FloatArray) -> BoolArray:
    """Return which instants of a basin record tell something: past the settling, and not in holes of the sea."""
    covered: BoolArray = np.interp(time_s, model.time_s, model.seas.covered.astype(np.float64)) > 1.0 - 1e-9
    settled: BoolArray = (time_s >= model.time_s[0] + SETTLING_S) & (time_s <= model.time_s[-1])
    return settled & covered
