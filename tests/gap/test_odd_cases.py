"""The odd cases of a closure: relations at the end of their range, and stages that few plans have."""

import numpy as np
import pytest
from scipy.optimize import brentq

from tidescour.errors import DomainError, RecordError
from tidescour.gap.levels import Waters
from tidescour.gap.limits import limit_findings
from tidescour.gap.openings import opening_rows, opening_set
from tidescour.gap.stage import stage_flow
from tidescour.gap.storage import storage_from_area, storage_from_volume
from tidescour.gauge.records import GivenSeries, InputFile
from tidescour.plan.models import Basin, Opening, Stage
from tidescour.tide.fit import fit_from_table

GRAVITY = 9.81
CULVERT = {"height_m": 2.5, "length_m": 40.0, "manning_s_m13": 0.014}
DAM = {"porosity": 0.4, "stone_m": 0.6, "length_m": 25.0}


# Relations at the end of their range


def discharge(parameters, crest, width, sea, basin, **keys):
    opening = Opening.model_validate(
        {"name": "gap", "crest_level_m": crest, "width_m": width, "relation": "broad-crest", "parameters": parameters}
        | keys
    )
    rows = opening_rows(opening_set([opening]), 0, np.atleast_1d(sea), np.atleast_1d(basin))
    return rows[0]


@pytest.mark.parametrize(
    "parameters",
    [
        {"coefficient": 0.95, "approach_width_sea_m": 80.0, "approach_bed_sea_m": -6.0},
        {"coefficient": 1.0, "approach_width_sea_m": 100.0, "approach_bed_sea_m": -6.0},
        {"coefficient": 1.3, "approach_width_sea_m": 110.0, "approach_bed_sea_m": -6.0},
        {"coefficient": 0.9, "modular_limit": 0.95, "approach_width_sea_m": 120.0, "approach_bed_sea_m": -7.0},
    ],
)
def test_a_drowned_gap_that_leads_more_than_its_approach_has_no_value(parameters):
    # With coefficient x area over the approach's area, sqrt(1 - share^2) of the closed form is not real: the equation
    # holds for any discharge at no head.
    drowned, free, ebb, level = discharge(
        parameters, -6.0, 100.0, np.array([1.0, 1.0, 0.5, 1.0]), np.array([0.9, -5.9, 1.0, 1.0])
    )
    assert np.isnan(drowned)
    assert 0.0 < free <= parameters["approach_width_sea_m"] * np.sqrt(GRAVITY) * 8.0**1.5
    assert ebb < 0.0
    assert level == 0.0


@pytest.mark.parametrize(("width", "bed"), [(1.0, -0.5), (1.2, -2.0), (5.0, -2.0)])
@pytest.mark.parametrize("limit", [0.7, 0.85, 0.95])
def test_a_modular_limit_changes_nothing_of_a_free_crest_with_an_approach(width, bed, limit):
    # Free flow is q = m (2/3)^1.5 sqrt(g) E^1.5 with E = h + q^2 / (2 g (W (h + p))^2) in both cases: the lower root.
    approach = {"coefficient": 0.9, "approach_width_sea_m": width, "approach_bed_sea_m": bed}
    found = discharge(approach | {"modular_limit": limit}, 0.0, 1.0, 3.0, 1.0)[0]

    def excess(flow):
        energy = 3.0 + (flow / (width * (3.0 - bed))) ** 2 / (2.0 * GRAVITY)
        return 0.9 * (2.0 / 3.0) ** 1.5 * np.sqrt(GRAVITY) * energy**1.5 - flow

    flows = np.linspace(0.0, width * np.sqrt(GRAVITY) * (3.0 - bed) ** 1.5, 4001)
    first = np.flatnonzero(excess(flows) <= 0.0)[0]
    assert found == pytest.approx(brentq(excess, flows[first - 1], flows[first]), rel=1e-9)


@pytest.mark.parametrize("tail", [2.5, 2.75, 2.85, 2.95])
@pytest.mark.parametrize("limit", [0.7, 0.8, 0.95])
def test_a_crest_with_modular_limit_and_approach_solves_both_equations_at_once(tail, limit):
    # As above, and beyond the limit q = 0.3849 m / (S sqrt(1 - S)) h2 sqrt(2 g (E - h2)), 0.3849 = sqrt(4 / 27); W 1.5,
    # p 1 m. The first energy that serves is looked for by trying.
    approach = {"coefficient": 0.9, "approach_width_sea_m": 1.5, "approach_bed_sea_m": -1.0, "modular_limit": limit}
    found = discharge(approach, 0.0, 1.0, 3.0, tail)[0]

    def flow(energy):
        free = 0.9 * (2.0 / 3.0) ** 1.5 * np.sqrt(GRAVITY) * energy**1.5
        share = 0.9 * np.sqrt(4.0 / 27.0) / (limit * np.sqrt(1.0 - limit))
        drowned = share * tail * np.sqrt(2.0 * GRAVITY * np.maximum(energy - tail, 0.0))
        return np.where(tail > limit * energy, drowned, free)

    def excess(energy):
        return 3.0 + (flow(energy) / (1.5 * 4.0)) ** 2 / (2.0 * GRAVITY) - energy

    energies = np.linspace(3.0, 5.0, 20001)
    first = np.flatnonzero(excess(energies) <= 0.0)[0]
    assert found == pytest.approx(float(flow(brentq(excess, energies[first - 1], energies[first]))), rel=1e-8)


def test_a_narrow_approach_is_refused_in_a_routed_stage_with_stage_time_and_remedy():
    wide = {"coefficient": 1.0, "approach_width_sea_m": 390.0, "approach_bed_sea_m": -6.0}
    expected = (
        r"stage 'first', or the tides before it: relation broad-crest of opening 1 of 1 has no value "
        r".* h after the start.*approach_width"
    )
    with pytest.raises(DomainError, match=expected):
        stage_flow(stage(opening(parameters=wide)), BASIN, TIDAL, 0.3)
    channels = {"coefficient": 0.9, "channel_area_sea_m2": 1500.0, "channel_area_basin_m2": 2500.0}
    shoal = opening(name="shoal", width_m=20.0)
    unequal = opening(relation="open-gap", parameters=channels)
    with pytest.raises(DomainError, match=r"open-gap of opening 2 of 2 has no value .* correct channel_area_sea_m2"):
        stage_flow(stage(shoal, unequal), BASIN, TIDAL, 0.3)


def test_the_foot_of_a_wall_without_width_passes_nothing():
    # Soundings down a wall reach -9 m, the bed lies at -3 m: under it there is no area, with a modular limit or not.
    foot = ((0.0, -9.0), (0.0, -3.0), (50.0, -3.0), (50.0, 2.0))
    survey = {"profile": "survey.csv", "profile_points": foot}
    levels = np.array([-5.0, -3.0, 0.0]), np.array([-7.0, -5.0, -0.5])
    for limit in ({}, {"modular_limit": 0.8}):
        found = discharge({"coefficient": 0.95} | limit, -9.0, None, *levels, **survey)
        assert found[:2].tolist() == [0.0, 0.0]
        assert found[2] > 0.0


# A whole stage

FILE = InputFile(path="invented.csv", sha256="0" * 64)
SEA = fit_from_table(("M2", "S2"), np.array([1.5, 0.4]), np.array([40.0, 80.0]), 0.1, 53.0)
TIDAL = Waters(sea_fit=SEA, series={})
BASIN = Basin(level_m=(-3.0, 0.0, 3.0), area_m2=(1.4e7, 2.0e7, 2.6e7))
START_S = 1806537600.0  # 2027-04-01T00:00:00Z
TEN_MINUTES = START_S + np.arange(-6, 3 * 144 + 7) * 600.0
DAYS_S = 3 * 86400.0


def opening(**changes):
    values = {"name": "gap", "crest_level_m": -6.0, "width_m": 400.0, "relation": "broad-crest"}
    return Opening.model_validate({**values, "parameters": {"coefficient": 0.95}, **changes})


def stage(*of_the_stage, **changes):
    values = {"name": "first", "start": "2027-04-01T00:00:00Z", "end": "2027-04-04T00:00:00Z"}
    return Stage.model_validate({**values, "opening": of_the_stage, **changes})


def series(name, value, quantity, time_s=TEN_MINUTES):
    return GivenSeries(name=name, quantity=quantity, time_s=time_s, value=value, file=FILE)


def codes(planned, flow, basin):
    return [(finding.severity, finding.code) for finding in limit_findings(planned, flow, basin, ())]


def test_a_crest_over_every_tide_leaves_the_basin_where_it_is():
    planned = stage(opening(crest_level_m=9.0))
    flow = stage_flow(planned, BASIN, TIDAL, 0.3)
    assert np.all(flow.level_basin_m == 0.3)
    assert np.all(flow.openings[0].discharge_m3_s == 0.0)
    assert np.all(flow.openings[0].gap_velocity_m_s == 0.0)
    assert all(severity == "note" for severity, _ in codes(planned, flow, BASIN))


def test_a_head_of_nothing_moves_nothing():
    calm = Waters(series={"calm": series("calm", np.full(TEN_MINUTES.size, 0.3), "level")})
    planned = stage(opening(), opening(name="dam", relation="rubble-dam", parameters=DAM), sea="calm")
    flow = stage_flow(planned, BASIN, calm, 0.3)
    assert np.all(flow.level_basin_m == 0.3)
    assert all(np.all(each.gap_velocity_m_s == 0.0) for each in flow.openings)
    assert all(severity == "note" for severity, _ in codes(planned, flow, BASIN))


def test_a_gap_as_wide_as_its_basin_runs_as_fast_as_the_sea_rises():
    # Continuity with a basin that follows the sea: u = A dz/dt / (B (z - crest)), A 1e6 m2, B 500 m, crest -6 m.
    pond = Basin(level_m=(0.0,), area_m2=(1.0e6,))
    flow = stage_flow(stage(opening(width_m=500.0)), pond, TIDAL)
    rise = np.gradient(flow.level_sea_m, 60.0)
    expected = 1.0e6 * rise / (500.0 * (flow.level_sea_m + 6.0))
    assert np.abs(flow.head_m).max() < 1e-3
    np.testing.assert_allclose(flow.openings[0].gap_velocity_m_s, expected, atol=1e-3)
    assert np.abs(expected).max() > 0.05
    assert ("note", "small-head") in codes(stage(opening(width_m=500.0)), flow, pond)


def test_a_river_fills_a_closed_basin_by_its_table_of_volumes_and_is_an_error():
    table = Basin(level_m=(-2.0, 0.0, 3.0), volume_m3=(1.0e5, 4.1e6, 2.2e7), inflow_m3_s=20.0)
    planned = stage(opening(crest_level_m=9.0))
    flow = stage_flow(planned, table, TIDAL, -1.0)
    volume = 2.1e6 + 20.0 * (flow.time_s - flow.time_s[0])
    np.testing.assert_allclose(flow.level_basin_m, np.interp(volume, table.volume_m3, table.level_m), atol=1e-9)
    assert ("error", "river-ponds") in codes(planned, flow, table)
    side = opening(name="culvert", crest_level_m=-4.0, width_m=30.0, relation="culvert", parameters=CULVERT)
    drained = table.model_copy(update={"side_opening": (side,)})
    assert ("error", "river-ponds") not in codes(planned, stage_flow(planned, drained, TIDAL, -1.0), drained)


def test_over_its_table_a_basin_keeps_its_last_area_and_says_so():
    short = Basin(level_m=(-1.0, 0.5), area_m2=(1.0e7, 2.0e7), inflow_m3_s=100.0)
    planned = stage(opening(crest_level_m=9.0))
    flow = stage_flow(planned, short, TIDAL, 0.5)
    assert flow.level_basin_m[-1] == pytest.approx(0.5 + 100.0 * DAYS_S / 2.0e7, rel=1e-9)
    assert ("warning", "basin-level-range") in codes(planned, flow, short)


def test_an_opening_that_closes_over_the_stage_passes_nothing_in_the_end():
    flow = stage_flow(stage(opening(width_end_m=1e-6)), BASIN, TIDAL)
    passed = np.abs(flow.openings[0].discharge_m3_s)
    assert np.all(np.isfinite(flow.openings[0].gap_velocity_m_s))
    assert passed[-1] < 1e-4
    assert passed[: passed.size // 4].max() > 1000.0
    assert np.abs(np.diff(flow.level_basin_m))[-1] < 1e-5


@pytest.mark.parametrize("step", [1.0, 3600.0])
def test_given_discharges_of_any_step_fill_the_basin_by_their_trapezoids(step):
    times = np.arange(START_S, START_S + DAYS_S + step, step)
    pumped = 40.0 * np.sin((times - START_S) / 9000.0) + 30.0
    waters = Waters(sea_fit=SEA, series={"pumps": series("pumps", pumped, "discharge", times)})
    given_by = opening(name="station", relation=None, parameters={}, discharge_series="pumps")
    basin = Basin(level_m=(0.0,), area_m2=(1.0e7,))
    flow = stage_flow(stage(given_by), basin, waters, 0.0)
    volume = float(np.trapezoid(pumped, times))
    # Linear between samples, on steps of a minute: an hour's corner lies on a step, a second's curve is flat enough.
    assert flow.level_basin_m[-1] * 1.0e7 == pytest.approx(volume, rel=2e-5)
    coarse = [finding.code for finding in flow.findings]
    assert coarse == (["coarse-series"] if step > 900.0 else [])


@pytest.mark.parametrize("step", [1.0, 3600.0])
def test_given_sea_levels_of_any_step_route_as_the_curve_they_follow(step):
    def curve(times):
        return 1.4 * np.sin(1.405e-4 * (times - START_S)) + 0.2

    levels = {}
    for name, spacing in (("fine", 60.0), ("other", step)):
        times = np.arange(START_S - 7200.0, START_S + DAYS_S + 7200.0, spacing)
        waters = Waters(series={"storm": series("storm", curve(times), "level", times)})
        levels[name] = stage_flow(stage(opening(), sea="storm"), BASIN, waters, 0.2).level_basin_m
    np.testing.assert_allclose(levels["other"], levels["fine"], atol=2e-3 if step > 60.0 else 1e-6)


def test_several_inflows_add_up_and_must_cover_the_stage():
    times = TEN_MINUTES
    rain = series("rain", np.linspace(0.0, 30.0, times.size), "discharge")
    short = series("short", np.zeros(100), "discharge", times[:100])
    inflow = ({"name": "river", "discharge_m3_s": 12.0}, {"name": "loss", "discharge_m3_s": -2.0})
    basin = Basin.model_validate(
        {
            "level_m": (0.0,),
            "area_m2": (1.0e7,),
            "inflow_m3_s": 5.0,
            "inflow": (*inflow, {"name": "rain", "series": "rain"}),
        }
    )
    waters = Waters(sea_fit=SEA, series={"rain": rain, "short": short})
    flow = stage_flow(stage(opening(crest_level_m=9.0)), basin, waters, 0.0)
    mean = 15.0 + float(np.interp(START_S + 0.5 * DAYS_S, times, rain.value))
    assert flow.level_basin_m[-1] == pytest.approx(mean * DAYS_S / 1.0e7, rel=1e-9)
    np.testing.assert_allclose(flow.inflow_m3_s, 15.0 + np.interp(flow.time_s, times, rain.value), rtol=1e-12)
    dry = basin.model_copy(update={"inflow": (*basin.inflow, basin.inflow[2].model_copy(update={"series": "short"}))})
    with pytest.raises(RecordError, match=r"series 'short' runs from .* does not cover stage 'first'"):
        stage_flow(stage(opening()), dry, waters, 0.0)


WALLED = ((0.0, 2.0), (0.0, -3.0), (50.0, -3.0), (50.0, -1.0), (80.0, -1.0), (80.0, -6.0), (100.0, -6.0), (100.0, 2.0))


def test_a_surveyed_gap_of_walls_and_two_valleys_is_three_gaps_while_drowned():
    # Q = m A sqrt(2 g dz) with one level in the section; drowned, strips of one bed each take their share of A.
    survey = {"profile": "survey.csv", "profile_points": WALLED}
    sea, basin = np.array([1.0, 0.8]), np.array([0.9, 1.0])
    whole = discharge({"coefficient": 0.9}, -6.0, None, sea, basin, **survey)
    parts = [
        discharge({"coefficient": 0.9}, crest, width, sea, basin)
        for crest, width in ((-3.0, 50.0), (-1.0, 30.0), (-6.0, 20.0))
    ]
    np.testing.assert_allclose(whole, np.sum(parts, axis=0), rtol=1e-12)


def test_a_sill_that_rises_in_a_surveyed_gap_is_followed_step_by_step():
    survey = {"profile": "survey.csv", "profile_points": WALLED, "width_m": None}
    moving = opening(crest_level_m=-6.0, crest_level_end_m=0.5, **survey)
    flow = stage_flow(stage(moving), BASIN, TIDAL, 0.3)
    through = flow.openings[0]
    # Width at the crest by hand: 20 m in the deep valley, 70 m from -3 m, 100 m from -1 m.
    crest = through.crest_level_m
    np.testing.assert_allclose(crest, np.linspace(-6.0, 0.5, crest.size), atol=1e-12)
    expected = np.select([crest < -3.0, crest < -1.0], [20.0, 70.0], 100.0)
    at_a_berm = np.isclose(crest, -3.0) | np.isclose(crest, -1.0)
    np.testing.assert_array_equal(through.width_m[~at_a_berm], expected[~at_a_berm])
    for i in (0, 1500, 3000, 4000):
        level = flow.level_sea_m[i : i + 1], flow.level_basin_m[i : i + 1]
        still = discharge({"coefficient": 0.95}, crest[i], None, *level, **(survey | {"width_m": None}))
        assert through.discharge_m3_s[i] == pytest.approx(still[0], rel=1e-9, abs=1e-9)
    assert np.all(through.discharge_m3_s[flow.level_sea_m < np.minimum(crest, flow.level_basin_m)] <= 0.0)


def test_a_side_opening_joins_in_without_a_place_in_the_stage():
    culvert = opening(name="culvert", crest_level_m=-3.0, width_m=20.0)
    beside = BASIN.model_copy(update={"side_opening": (culvert,)})
    apart = stage_flow(stage(opening()), beside, TIDAL, 0.3)
    together = stage_flow(stage(opening(), culvert), BASIN, TIDAL, 0.3)
    np.testing.assert_array_equal(apart.level_basin_m, together.level_basin_m)
    assert [each.name for each in apart.openings] == ["gap"]
    np.testing.assert_array_equal(apart.side_openings[0].discharge_m3_s, together.openings[1].discharge_m3_s)


def test_a_basin_without_area_is_refused():
    with pytest.raises(DomainError, match="areas must be positive, and volumes must increase"):
        storage_from_area(np.array([0.0, 1.0]), np.array([0.0, 1.0e7]))
    with pytest.raises(DomainError, match="areas must be positive, and volumes must increase"):
        storage_from_volume(np.array([0.0, 1.0, 2.0]), np.array([0.0, 1.0e7, 1.0e7]))
