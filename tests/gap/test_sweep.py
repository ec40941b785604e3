"""What a gap would do at other crests and widths, against a general solver and closed forms."""

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.interpolate import CubicSpline

from tidescour.gap import sweep
from tidescour.gap.levels import Waters
from tidescour.gap.sweep import closure_sweep, low_waters, tide_slices
from tidescour.gauge.records import GivenSeries, InputFile
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.tide.fit import fit_from_table

FLOOD, EBB = 0, 1
SPRING, MEAN, NEAP = 0, 1, 2
QUANTITIES = ("head_m", "gap_velocity_m_s", "unit_discharge_m2_s")
BASIN = Basin(level_m=(0.0,), area_m2=(2.0e7,))


def tide(amplitudes, mean_m=0.0, **changes):
    names = ("M2", "S2")[: len(amplitudes)]
    fit = fit_from_table(names, np.array(amplitudes), np.zeros(len(amplitudes)), mean_m, 53.0)
    return Waters(sea_fit=fit, series={}, **changes)


def opening(**changes):
    values = {"name": "gap", "crest_level_m": -10.0, "width_m": 500.0, "relation": "broad-crest"}
    return {**values, "parameters": {"coefficient": 0.95}, **changes}


def stage(*openings):
    return Stage.model_validate(
        {
            "name": "first",
            "start": "2027-04-01T00:00:00Z",
            "end": "2027-04-21T00:00:00Z",
            "opening": openings or (opening(),),
        }
    )


@pytest.fixture(scope="module")
def pure():
    """The sweep of the tabled case; the factor undoes the nodal change of M2, so that the amplitude is 1.5 m."""
    range_m = closure_sweep(few_rungs(stage()), BASIN, tide([1.5])).tides[MEAN].range_m
    return closure_sweep(stage(), BASIN, tide([1.5], sea_factor=3.0 / range_m))


@pytest.fixture
def short_ladders(monkeypatch):
    monkeypatch.setattr(sweep, "CREST_RUNGS", 4)
    monkeypatch.setattr(sweep, "WIDTH_RUNGS", 3)


def few_rungs(planned):
    """Return a stage that is cheap to sweep: shut, and with a profile instead of a width."""
    shut = planned.opening[0].model_copy(
        update={"crest_level_m": 50.0, "width_m": None, "profile_points": ((0.0, 50.0), (9.0, 50.0))}
    )
    return planned.model_copy(update={"opening": (shut,)})


def columns(curve, tide_number=MEAN):
    """Return (n, 7): heads, velocities and unit discharges, flood then ebb, and the mean basin level."""
    peaks = [getattr(curve, name)[:, tide_number] for name in QUANTITIES]
    return np.column_stack([*peaks, curve.mean_basin_level_m])


def test_peaks_by_crest_are_those_of_a_general_solver(pure, published):
    rows = np.array(published("closure_by_crest_and_width.csv").tolist())
    for row in rows[rows[:, 1] == 500.0]:
        settled = np.isfinite(pure.crest.head_m[:, MEAN, FLOOD])
        found = CubicSpline(pure.crest.value_m[settled], columns(pure.crest)[settled])(row[0])
        # The ladder stands 0.8 m apart: what lies between is good to some two digits.
        assert found == pytest.approx(row[2:], rel=0.02, abs=0.003)


def test_peaks_by_width_are_those_of_a_general_solver(pure, published):
    rows = np.array(published("closure_by_crest_and_width.csv").tolist())
    for row in rows[rows[:, 0] == -10.0]:
        found = CubicSpline(-np.log(pure.width.value_m), columns(pure.width))(-np.log(row[1]))
        assert found == pytest.approx(row[2:], rel=0.02, abs=0.003)


def test_the_first_rungs_are_the_stage_itself(pure, published):
    whole = np.array(published("closure_by_crest_and_width.csv").tolist())[0]
    assert (pure.crest.value_m[0], pure.width.value_m[0]) == (-10.0, 500.0)
    for curve in (pure.crest, pure.width):
        assert columns(curve)[0] == pytest.approx(whole[2:], rel=2e-3, abs=5e-5)


def test_narrowing_raises_the_velocity_steadily_to_that_of_the_whole_head(pure):
    for direction, sign in ((FLOOD, 1.0), (EBB, -1.0)):
        velocity = pure.width.gap_velocity_m_s[:, MEAN, direction]
        assert np.all(np.diff(velocity) > 0.0)
        # m sqrt(2 g times the amplitude from the mean basin level): the limit of a shut gap, from the energy equation.
        limit = 0.95 * np.sqrt(2.0 * 9.81 * (1.5 - sign * pure.width.mean_basin_level_m[-1]))
        assert velocity[-1] == pytest.approx(limit, rel=0.015)
        assert velocity[-1] < limit


def test_raising_the_sill_has_its_fastest_flow_at_a_crest_between_and_in_the_flood(pure):
    flood, ebb = (pure.crest.gap_velocity_m_s[:, MEAN, direction] for direction in (FLOOD, EBB))
    fastest = int(np.argmax(flood))
    assert 0 < fastest < flood.size - 1
    assert np.all(np.diff(flood[: fastest + 1]) > 0.0)
    assert np.all(np.diff(flood[fastest:]) < 0.0)
    assert flood[fastest] > ebb[fastest]
    assert -3.0 < pure.crest.value_m[fastest] < -1.0


def test_the_basin_drifts_up_as_the_crest_rises(pure):
    mean = pure.crest.mean_basin_level_m[:-1]
    assert np.all(np.diff(mean) > -1e-4)
    assert abs(mean[0]) < 1e-3
    assert mean[-1] > 0.7


def test_over_the_highest_sea_level_nothing_runs_and_the_head_hangs_on_the_start(pure):
    assert pure.crest.value_m[-1] > 1.5
    assert np.all(pure.crest.gap_velocity_m_s[-1] == 0.0)
    assert np.all(pure.crest.unit_discharge_m2_s[-1] == 0.0)
    assert np.all(np.isnan(pure.crest.head_m[-1]))
    assert np.isnan(pure.crest.mean_basin_level_m[-1])


def test_spring_and_neap_have_the_ranges_of_their_tides():
    found = closure_sweep(few_rungs(stage()), BASIN, tide([1.2, 0.4]))
    m2 = closure_sweep(few_rungs(stage()), BASIN, tide([1.2])).tides[MEAN].range_m
    assert [each.name for each in found.tides] == ["spring", "mean", "neap"]
    ranges = [each.range_m for each in found.tides]
    # Within a tide of the very spring and neap, cos(0.5 x 24.4 degrees) = 0.98 of S2 is left.
    assert ranges[SPRING] == pytest.approx(m2 + 0.8, rel=0.01)
    assert ranges[NEAP] == pytest.approx(m2 - 0.8, rel=0.01)
    assert ranges[NEAP] < ranges[MEAN] < ranges[SPRING]
    for each in found.tides:
        assert 12.0 < (each.end_s - each.start_s) / 3600.0 < 13.0


@pytest.mark.usefixtures("short_ladders")
def test_a_larger_tide_runs_faster():
    found = closure_sweep(stage(), BASIN, tide([1.2, 0.4]))
    for curve in (found.crest, found.width):
        spring, mean, neap = np.moveaxis(curve.gap_velocity_m_s[:-1], 1, 0)
        assert np.all(spring > mean)
        assert np.all(mean > neap)


@pytest.mark.usefixtures("short_ladders")
def test_peaks_do_not_hang_on_where_the_basin_began(monkeypatch):
    found = closure_sweep(stage(), BASIN, tide([1.2, 0.4]))
    # No two basins agree by nothing: all run sixty days from the lowest and the highest sea level, and are compared.
    monkeypatch.setattr(sweep, "STARTS_AGREE_M", -1.0)
    monkeypatch.setattr(sweep, "PEAKS_AGREE", 1e-4)
    monkeypatch.setattr(sweep, "MEANS_AGREE_M", 1e-4)
    both = closure_sweep(stage(), BASIN, tide([1.2, 0.4]))
    assert columns(found.crest)[:-1] == pytest.approx(columns(both.crest)[:-1], rel=2e-3, abs=5e-4)
    assert columns(found.width) == pytest.approx(columns(both.width), rel=2e-3, abs=5e-4)


@pytest.mark.usefixtures("short_ladders")
@pytest.mark.parametrize("factor", [0.1, 7.0])
def test_a_gap_and_a_basin_larger_by_one_factor_have_the_same_peaks(factor):
    waters = tide([1.2, 0.4])
    small = closure_sweep(stage(), BASIN, waters)
    large = closure_sweep(stage(opening(width_m=500.0 * factor)), basin(area_m2=(2.0e7 * factor,)), waters)
    for one, other in ((small.crest, large.crest), (small.width, large.width)):
        assert columns(other) == pytest.approx(columns(one), rel=1e-6, abs=1e-6, nan_ok=True)
    assert large.width.value_m == pytest.approx(factor * small.width.value_m)


@pytest.mark.usefixtures("short_ladders")
def test_another_datum_changes_levels_and_nothing_else():
    one = closure_sweep(stage(), BASIN, tide([1.2, 0.4]))
    waters, moved = tide([1.2, 0.4], mean_m=3.0), basin(level_m=(3.0,))
    other = closure_sweep(stage(opening(crest_level_m=-7.0)), moved, waters)
    assert other.crest.value_m == pytest.approx(one.crest.value_m + 3.0)
    assert columns(other.crest)[:, :6] == pytest.approx(columns(one.crest)[:, :6], rel=1e-6, abs=1e-6, nan_ok=True)
    assert other.crest.mean_basin_level_m == pytest.approx(one.crest.mean_basin_level_m + 3.0, abs=1e-6, nan_ok=True)


@pytest.mark.usefixtures("short_ladders")
def test_the_largest_opening_is_swept_and_the_others_stay():
    shoal = opening(name="shoal", crest_level_m=-3.0, width_m=400.0, width_end_m=1.0)
    both = closure_sweep(stage(shoal, opening()), BASIN, tide([1.2, 0.4]))
    assert both.opening == "gap"
    beside = basin(side_opening=(Opening.model_validate(opening(name="lock", crest_level_m=-3.0, width_m=400.0)),))
    lock = closure_sweep(stage(), beside, tide([1.2, 0.4]))
    assert columns(lock.width) == pytest.approx(columns(both.width), rel=1e-6, abs=1e-6)
    alone = closure_sweep(stage(), BASIN, tide([1.2, 0.4]))
    assert both.width.gap_velocity_m_s[-1, SPRING, FLOOD] < alone.width.gap_velocity_m_s[-1, SPRING, FLOOD]
    # With the shoal open the head is known also where the gap is shut.
    assert np.all(np.isfinite(both.crest.head_m))


@pytest.mark.usefixtures("short_ladders")
def test_an_inflow_lifts_the_basin_also_as_the_mean_of_a_series():
    times = 1806537600.0 + np.arange(0.0, 21.0 * 86400.0, 600.0)
    values = 150.0 + 50.0 * np.sign(np.sin(times / 7000.0))
    river = GivenSeries(
        name="river", quantity="discharge", time_s=times, value=values, file=InputFile(path="q.csv", sha256="0" * 64)
    )
    span = values[times <= 1806537600.0 + 20.0 * 86400.0].mean()
    varied = closure_sweep(
        stage(),
        basin(inflow=({"name": "river", "series": "river"},)),
        Waters(sea_fit=tide([1.2, 0.4]).sea_fit, series={"river": river}),
    )
    steady = closure_sweep(stage(), basin(inflow_m3_s=float(span)), tide([1.2, 0.4]))
    without = closure_sweep(stage(), BASIN, tide([1.2, 0.4]))
    assert columns(varied.width) == pytest.approx(columns(steady.width), rel=1e-3, abs=1e-3)
    assert np.all(steady.width.mean_basin_level_m > without.width.mean_basin_level_m)


@pytest.mark.usefixtures("short_ladders")
def test_a_gap_far_off_meets_its_own_sea():
    far = closure_sweep(stage(opening(sea_factor=1.2)), BASIN, tide([1.0, 0.3]))
    larger = closure_sweep(stage(), BASIN, tide([1.2, 0.36]))
    assert columns(far.width) == pytest.approx(columns(larger.width), rel=1e-6, abs=1e-6)


@pytest.mark.usefixtures("short_ladders")
def test_what_has_no_meaning_is_not_swept_and_says_so():
    channel = {"coefficient": 0.8, "channel_area_sea_m2": 2.0e4, "channel_area_basin_m2": 2.0e4}
    open_gap = closure_sweep(stage(opening(relation="open-gap", parameters=channel)), BASIN, tide([1.2]))
    assert open_gap.crest is None
    assert open_gap.width is not None
    assert messages(open_gap) == ["no curve by crest level: relation open-gap has no sill to raise"]
    points = ((0.0, 2.0), (20.0, -10.0), (480.0, -10.0), (500.0, 2.0))
    surveyed = stage().opening[0].model_copy(update={"width_m": None, "profile_points": points})
    profiled = closure_sweep(stage().model_copy(update={"opening": (surveyed,)}), BASIN, tide([1.2]))
    assert profiled.width is None
    assert profiled.crest is not None
    assert messages(profiled) == ["no curve by width: opening 'gap' has a profile"]
    shut = closure_sweep(stage(opening(crest_level_m=9.0)), BASIN, tide([1.2]))
    assert shut.crest is None
    assert messages(shut) == ["no curve by crest level: that of 'gap' is over the highest sea level"]


@pytest.mark.parametrize(
    ("planned", "storage", "waters", "reason"),
    [
        (stage(), None, tide([1.2]), "[basin] has no storage to route"),
        (stage(), BASIN, Waters(series={}), "there is no tide at sea to predict"),
        (stage(), BASIN, tide([0.0]), "the sea has no tide"),
        (
            stage(opening(), opening(name="sluice", relation=None, parameters={}, discharge_series="q")),
            BASIN,
            tide([1.2]),
            "opening 'sluice' has a given flow, which another gap would change",
        ),
        (
            stage(opening(relation="orifice", parameters={"coefficient": 0.9, "height_m": 2.0})),
            BASIN,
            tide([1.2]),
            "no opening has the relation of a gap (broad-crest, narrow-crest, open-gap)",
        ),
        (
            stage(
                opening(
                    relation="open-gap",
                    parameters={"coefficient": 1.0, "channel_area_sea_m2": 900.0, "channel_area_basin_m2": 6.0e3},
                )
            ),
            BASIN,
            tide([1.2]),
            "relation open-gap has no value for opening 'gap' at the highest sea level",
        ),
    ],
)
def test_a_plan_that_does_not_allow_it_has_no_curves_and_says_why(planned, storage, waters, reason):
    found = closure_sweep(planned, storage, waters)
    assert found.crest is None
    assert found.width is None
    assert messages(found) == [f"no curve by crest and width: {reason}"]
    assert [finding.severity for finding in found.findings] == ["note"]


def messages(found):
    return [finding.message for finding in found.findings]


def basin(**changes):
    return Basin.model_validate({**BASIN.model_dump(exclude_unset=True), **changes})


def test_low_waters_of_a_sine_are_where_it_is_lowest():
    samples = np.arange(5000.0)
    lows = low_waters(2.0 + 1.5 * np.sin(2.0 * np.pi * samples / 745.0))
    assert lows == pytest.approx(745.0 * (np.arange(6.0) + 0.75), abs=0.51)
    assert [(each.start, each.stop) for each in tide_slices(np.sin(2.0 * np.pi * samples / 745.0))] == [
        (int(first), int(last) + 1) for first, last in itertools.pairwise(lows)
    ]


def test_a_double_low_water_counts_once_and_still_water_not_at_all():
    angle = 2.0 * np.pi * np.arange(7450.0) / 745.0
    for double in (np.sin(angle) - 0.4 * np.cos(2.0 * angle), np.cos(angle) + 0.4 * np.cos(2.0 * angle)):
        lows = low_waters(double)
        assert lows.size >= 8
        assert np.diff(lows) == pytest.approx(745.0, abs=1.0)
    assert low_waters(np.full(500, 1.3)).size == 0
    assert tide_slices(np.full(500, 1.3)) == ()


@given(st.floats(0.01, 100.0), st.floats(-50.0, 50.0), st.floats(0.0, 6.0))
@settings(max_examples=40, deadline=None)
def test_low_waters_do_not_hang_on_datum_or_unit(factor, shift_m, phase):
    level = np.sin(2.0 * np.pi * np.arange(3000.0) / 745.0 + phase)
    assert np.abs(low_waters(shift_m + factor * level) - low_waters(level)).max() <= 30
