"""The basin as it was, seen from its parameters: what they change, what they leave, and which levels are evidence."""

import math

import numpy as np
import pytest

from tidescour.errors import DomainError, FitError, RecordError
from tidescour.gap.basin_model import (
    ALL,
    SETTLING_S,
    Adjustment,
    basin_model,
    coefficient_column,
    measured_rows,
    opening_place,
    usable_levels,
)
from tidescour.gap.levels import Waters
from tidescour.gauge.records import GaugeRecord, GivenSeries, InputFile
from tidescour.plan.models import Basin, Calibration, Opening
from tidescour.plan.models_calibration import Discharge
from tidescour.tide.fit import fit_from_table
from tidescour.units import seconds_since_epoch

FILE = InputFile(path="invented.csv", sha256="0" * 64)
START_S = 1772323200.0  # 2026-03-01T00:00:00Z
DAYS = 6
TIME_S = START_S + np.arange(-144, (DAYS + 1) * 144) * 600.0
M2_S = 12.4206012 * 3600.0
SEA_M = 1.5 * np.cos(2.0 * np.pi * (TIME_S - START_S) / M2_S)
AREA_M2 = 2.0e7
BASIN = Basin(level_m=(0.0,), area_m2=(AREA_M2,))
NONE = np.empty(0)


def opening(name="gap", relation="broad-crest", coefficient=0.9, **changes):
    values = {"name": name, "crest_level_m": -5.0, "width_m": 200.0, "relation": relation}
    return {**values, "parameters": {"coefficient": coefficient}, **changes}


def calibration(*openings, fit=("coefficient",)):
    return Calibration.model_validate(
        {
            "start": "2026-03-01T00:00:00Z",
            "end": f"2026-03-{1 + DAYS:02d}T00:00:00Z",
            "fit": fit,
            "opening": openings or (opening(),),
        }
    )


def gauge(side, level_m, time_s=TIME_S, flag=None):
    flag = np.ones(time_s.size) if flag is None else flag
    return GaugeRecord(side=side, time_s=time_s, level_m=level_m, flag=flag, step_s=600.0, files=(FILE,))


def waters(sea=None, basin=None, **others):
    return Waters(
        sea_record=sea or gauge("sea", SEA_M),
        basin_record=basin or gauge("basin", 0.5 * SEA_M),
        **{"series": {}, **others},
    )


def side_opening(**changes):
    return Opening.model_validate(opening(name="sluice", coefficient=0.7, width_m=20.0, **changes))


def adjustment(model, names):
    return Adjustment(
        model=model, names=names, level_time_s=TIME_S[200:400], discharge_time_s=NONE,
        discharge_opening=np.empty(0, dtype=np.int64),
    )  # fmt: skip


def numbers_of(model, openings, name):
    place = [each.name for each in model.openings].index(name)
    return openings.numbers[place, coefficient_column(model.openings[place])]


def test_coefficients_of_all_openings_change_in_proportion_and_side_openings_keep_theirs():
    culvert = opening("culvert", "orifice", 0.6, crest_level_m=-3.0, width_m=10.0)
    culvert["parameters"] = {"coefficient": 0.6, "height_m": 2.0}
    planned = calibration(opening(coefficient=0.9), culvert)
    basin = BASIN.model_copy(update={"side_opening": (side_opening(),)})
    model = basin_model(planned, basin, waters())
    before = model.opening_set.numbers.copy()
    changed = model.with_coefficient(1.35)
    assert model.first_coefficient() == 0.9
    assert numbers_of(model, changed, "gap") == pytest.approx(1.35)
    assert numbers_of(model, changed, "culvert") == pytest.approx(0.6 * 1.5)
    assert numbers_of(model, changed, "sluice") == 0.7
    # Nothing else of an opening is touched, and nothing of the plan's own numbers.
    np.testing.assert_array_equal(np.sort(changed.numbers[2]), np.sort(before[2]))
    np.testing.assert_array_equal(model.opening_set.numbers, before)


def test_a_coefficient_is_not_cut_at_the_limit_of_its_relation():
    # A plan may not write more than 3; the search may pass there, and an estimate beyond is told, not hidden.
    model = basin_model(calibration(), BASIN, waters())
    adjusted = adjustment(model, ("coefficient",))
    at_limit, beyond = (adjusted(np.array([value])).level_m for value in (3.0, 6.0))
    assert numbers_of(model, model.with_coefficient(6.0), "gap") == 6.0
    assert np.abs(beyond - at_limit).max() > 1e-3


def test_the_first_opening_with_a_coefficient_stands_for_all():
    stones = opening("dam", "rubble-dam")
    stones["parameters"] = {"porosity": 0.4, "stone_m": 0.5, "length_m": 20.0}
    model = basin_model(calibration(stones, opening(coefficient=0.8)), BASIN, waters())
    assert coefficient_column(model.openings[0]) is None
    assert model.first_coefficient() == 0.8
    changed = model.with_coefficient(1.6)
    np.testing.assert_array_equal(changed.numbers[0], model.opening_set.numbers[0])
    dam_only = basin_model(calibration(stones, fit=("area_factor",)), BASIN, waters())
    with pytest.raises(DomainError, match="none of its openings has a coefficient"):
        dam_only.first_coefficient()


def test_the_discharge_of_all_sums_the_gap_side_openings_and_given_series(broad_crest):
    pumped = side_opening(relation=None, discharge_series="pump").model_copy(update={"name": "pump", "parameters": {}})
    basin = BASIN.model_copy(update={"side_opening": (pumped, side_opening())})
    pump = GivenSeries(name="pump", quantity="discharge", time_s=TIME_S[::6], value=12.0 + 0.0 * TIME_S[::6], file=FILE)
    model = basin_model(calibration(), basin, waters(series={"pump": pump}))
    level = np.full(model.time_s.size, 0.3)
    apart = [model.discharge(model.opening_set, place, level) for place in range(3)]
    # Smoothed by a parabola over an hour, an M2 tide loses less than 1e-4 of its amplitude.
    sea = 1.5 * np.cos(2.0 * np.pi * (model.time_s - START_S) / M2_S)
    by_hand = np.array([broad_crest(outside, 0.3, -5.0, 0.9 * 200.0) for outside in sea])
    away = np.abs(sea - 0.3) > 0.1
    np.testing.assert_allclose(apart[0][away], by_hand[away], rtol=1e-3)
    np.testing.assert_allclose(apart[1], 12.0)
    np.testing.assert_allclose(apart[2], apart[0] * 0.7 * 20.0 / (0.9 * 200.0), rtol=1e-12)
    np.testing.assert_allclose(model.discharge(model.opening_set, ALL, level), sum(apart), rtol=1e-12)


def test_an_opening_with_a_sea_level_of_its_own_meets_that():
    far = opening("far", sea_lag_s=1800.0, sea_factor=0.8, sea_shift_m=0.1)
    model = basin_model(calibration(opening(), far), BASIN, waters())
    own = model.seas.at(model.openings[1]).level_m
    mean = SEA_M.mean()
    sea = 1.5 * np.cos(2.0 * np.pi * (model.time_s - 1800.0 - START_S) / M2_S)
    np.testing.assert_allclose(own, mean + 0.8 * (sea - mean) + 0.1, atol=2e-4)
    # At its own level the flow of that opening is nothing.
    assert np.abs(model.discharge(model.opening_set, 1, own)).max() == 0.0


def shut_model(inflow_m3_s=0.0):
    dry = opening(crest_level_m=50.0)
    basin = BASIN.model_copy(update={"inflow_m3_s": inflow_m3_s})
    return basin_model(calibration(dry), basin, waters(basin=gauge("basin", np.full(TIME_S.size, 0.2))))


def test_an_inflow_fills_a_shut_basin_by_its_volume_over_the_scaled_area():
    adjusted = adjustment(shut_model(10.0), ("area_factor", "datum_offset_m"))
    found = adjusted(np.array([1.25, 0.3])).level_m
    # From the recorded 0.2 m at the start: V = Q t, whatever the datum of the gauge.
    np.testing.assert_allclose(found, 0.2 + 10.0 * (TIME_S[200:400] - START_S) / (1.25 * AREA_M2), atol=1e-9)


def test_the_datum_lifts_the_start_and_is_taken_off_again():
    # With no flow the gauge reads what it read, on whatever datum.
    found = adjustment(shut_model(), ("datum_offset_m",))(np.array([-7.0])).level_m
    np.testing.assert_allclose(found, 0.2, atol=1e-12)
    openings = shut_model().opening_set
    np.testing.assert_allclose(shut_model().routed(openings, 1.0, -7.0), -6.8, atol=1e-12)


@pytest.mark.parametrize("factor", [0.5, 3.0])
def test_coefficient_and_area_times_one_factor_change_no_level_and_scale_the_discharge(factor):
    # A dz/dt = m q(z): both times k leave the level as it is, and m q is k times as large.
    model = basin_model(calibration(), BASIN, waters())
    once, more = model.with_coefficient(0.9), model.with_coefficient(0.9 * factor)
    level = model.routed(once, 1.0, 0.0)
    np.testing.assert_allclose(model.routed(more, factor, 0.0), level, atol=1e-7)
    flow = model.discharge(once, 0, level)
    np.testing.assert_allclose(model.discharge(more, 0, level), factor * flow, rtol=1e-12)


def test_a_sea_read_upside_down_gives_a_basin_upside_down_where_the_gap_is_deep():
    # An orifice far under water knows heads only, so that the sign of all levels can be turned.
    drowned = opening("barrel", "orifice", crest_level_m=-40.0, width_m=100.0)
    drowned["parameters"] = {"coefficient": 0.8, "height_m": 4.0, "contraction": 1.0}
    names = ("coefficient", "datum_offset_m")
    levels = [
        adjustment(
            basin_model(
                calibration(drowned), BASIN, waters(gauge("sea", sign * SEA_M), gauge("basin", 0.5 * sign * SEA_M))
            ),
            names,
        )(np.array([0.7, sign * 0.1])).level_m
        for sign in (1.0, -1.0)
    ]
    np.testing.assert_allclose(levels[1], -levels[0], atol=1e-6)


def test_parameters_start_where_the_plan_has_them():
    model = basin_model(calibration(opening(coefficient=0.85)), BASIN, waters())
    adjusted = adjustment(model, ("datum_offset_m", "area_factor", "coefficient"))
    assert adjusted.start().tolist() == [0.0, 1.0, 0.85]
    openings, area_factor, offset = adjusted.parts(np.array([0.2, 1.1, 0.9]))
    assert (area_factor, offset) == (1.1, 0.2)
    assert numbers_of(model, openings, "gap") == pytest.approx(0.9)
    openings, area_factor, offset = adjustment(model, ("datum_offset_m",)).parts(np.array([0.2]))
    assert (area_factor, offset) == (1.0, 0.2)
    assert openings is model.opening_set


def test_measured_discharges_are_taken_at_their_instant_and_opening():
    basin = BASIN.model_copy(update={"side_opening": (side_opening(),)})
    model = basin_model(calibration(), basin, waters())
    at = model.time_s[[700, 1500, 700]]
    adjusted = Adjustment(
        model=model,
        names=("coefficient",),
        level_time_s=TIME_S[200:210],
        discharge_time_s=at,
        discharge_opening=np.array([0, 1, ALL]),
    )
    found = adjusted(np.array([1.1])).discharge_m3_s
    level = model.routed(model.with_coefficient(1.1), 1.0, 0.0)
    flows = [model.discharge(model.with_coefficient(1.1), place, level) for place in (0, 1)]
    np.testing.assert_allclose(found, [flows[0][700], flows[1][1500], flows[0][700] + flows[1][700]], rtol=1e-12)


def test_rows_of_discharges_stand_in_order_of_time_with_the_place_of_their_opening():
    def row(hour, name, value):
        return Discharge.model_validate(
            {
                "time": f"2026-03-03T{hour:02d}:30:00+01:00",
                "opening": name,
                "discharge_m3_s": value,
                "standard_error_m3_s": 0.1 * abs(value),
            }
        )

    openings = [Opening.model_validate(opening(name)) for name in ("gap", "sluice")]
    times, values, errors, places = measured_rows((row(9, "sluice", -5.0), row(8, "", 90.0)), openings)
    assert times.tolist() == [START_S + 2 * 86400.0 + 7.5 * 3600.0, START_S + 2 * 86400.0 + 8.5 * 3600.0]
    assert (values.tolist(), errors.tolist()) == ([90.0, -5.0], [9.0, 0.5])
    assert places.tolist() == [ALL, 1]
    assert opening_place("gap", openings) == 0
    assert all(rows.size == 0 for rows in measured_rows((), openings))


def test_a_hole_in_the_sea_record_leaves_evidence_out():
    tide = fit_from_table(("M2",), np.array([1.5]), np.array([0.0]), 0.0, 53.0)
    first, last = START_S + 3.0 * 86400.0, START_S + 3.5 * 86400.0
    kept = np.abs(TIME_S - 0.5 * (first + last)) >= 0.5 * (last - first)
    model = basin_model(calibration(), BASIN, waters(gauge("sea", SEA_M[kept], TIME_S[kept]), sea_fit=tide))
    usable = usable_levels(model, TIME_S)
    asked = (TIME_S >= START_S + SETTLING_S) & (TIME_S <= START_S + DAYS * 86400.0)
    np.testing.assert_array_equal(usable, asked & kept)
    assert math.isclose(SETTLING_S, 2.0 * M2_S, rel_tol=1e-4)


def test_a_hole_in_the_sea_record_without_a_tide_to_bridge_it_is_refused():
    kept = np.abs(TIME_S - START_S - 3.0 * 86400.0) > 7200.0
    with pytest.raises(FitError, match="the sea gauge has a hole at 2026-03-03T21:50:"):
        basin_model(calibration(), BASIN, waters(gauge("sea", SEA_M[kept], TIME_S[kept])))


def test_a_start_without_a_sample_in_the_basin_is_refused():
    late = TIME_S > START_S + 7200.0
    with pytest.raises(RecordError, match=r"no good sample within the hour at 2026-03-01T00:00:00Z.*later calibration"):
        basin_model(calibration(), BASIN, waters(basin=gauge("basin", 0.5 * SEA_M[late], TIME_S[late])))


def test_levels_that_are_missing_or_failed_do_not_start_the_basin():
    level, flag = 0.5 * SEA_M, np.ones(TIME_S.size)
    start = int(np.argmin(np.abs(TIME_S - START_S)))
    level[start - 1], flag[start - 1] = np.nan, 9
    level[start], flag[start] = 40.0, 4
    model = basin_model(calibration(), BASIN, waters(basin=gauge("basin", level, flag=flag)))
    # Between the neighbours, half an hour apart at high water.
    assert model.start_level_m == pytest.approx(0.75, abs=2e-3)
    assert model.time_s[0] == seconds_since_epoch(calibration().start)


def test_arguments_are_not_written_to():
    model = basin_model(calibration(), BASIN, waters())
    parameters = np.array([1.2, 0.9, 0.1])
    adjustment(model, ("coefficient", "area_factor", "datum_offset_m"))(parameters)
    assert parameters.tolist() == [1.2, 0.9, 0.1]
