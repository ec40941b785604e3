"""Findings where gap and basin leave the range of their model; expected numbers are worked out beside each test."""

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError
from tidescour.gap.levels import Waters
from tidescour.gap.limits import limit_findings
from tidescour.gap.limits_basin import level_error
from tidescour.gap.limits_gap import inertia_number, repletion_coefficient
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gap.stage import stage_flow
from tidescour.gauge.records import GivenSeries, InputFile
from tidescour.plan.models import Basin, Inflow, Opening, Stage
from tidescour.plan.models_bed import PlaceBed
from tidescour.tide.fit import fit_from_table

PUBLISHED = Path(__file__).parent.parent / "published"
OMEGA = 2.0 * np.pi / (12.4206012 * 3600.0)
START_S = 1806537600.0  # 2027-04-01T00:00:00Z
TIMES = START_S + np.arange(0.0, 6.0 * 12.4206012 * 3600.0, 60.0)
PHASE = OMEGA * (TIMES - START_S) + 0.1
SEA = fit_from_table(("M2", "S2"), np.array([1.5, 0.4]), np.array([40.0, 80.0]), 0.1, 53.0)
WIDE = Basin(level_m=(-4.0, 4.0), area_m2=(1.0e7, 2.0e7))


def opening(name="gap", **changes):
    values = {"name": name, "crest_level_m": -6.0, "width_m": 100.0, "relation": "broad-crest"}
    return Opening.model_validate({**values, "parameters": {"coefficient": 0.95}, **changes})


def stage(*openings, days=3, **changes):
    return Stage.model_validate(
        {
            "name": "first",
            "start": "2027-04-01T00:00:00Z",
            "end": f"2027-04-{1 + days:02d}T00:00:00Z",
            "opening": openings or [opening()],
            **changes,
        }
    )


def through(discharge, velocity, name="gap", sea=None, **changes):
    level = np.zeros(TIMES.size) if sea is None else sea
    values = {
        "level_sea_m": level,
        "crest_level_m": np.full(TIMES.size, -6.0),
        "width_m": np.full(TIMES.size, 100.0),
        "discharge_m3_s": np.broadcast_to(discharge, TIMES.shape),
        "gap_velocity_m_s": np.broadcast_to(velocity, TIMES.shape),
        "flow_width_m": np.full(TIMES.size, 100.0),
    }
    return OpeningFlow(name=name, **{**values, **changes})


def flow(*openings, sea=None, basin=None, **changes):
    tide = np.sin(PHASE) if sea is None else sea
    values = {
        "stage": "first",
        "time_s": TIMES,
        "level_sea_m": tide,
        "level_basin_m": np.broadcast_to(0.5 * tide if basin is None else basin, TIMES.shape),
        "covered": np.ones(TIMES.size, dtype=bool),
        "measured": False,
        "routed": True,
        "openings": openings or (through(1000.0 * np.cos(PHASE), np.cos(PHASE)),),
        "inflow_m3_s": np.zeros(TIMES.size),
    }
    return StageFlow(**{**values, **changes})


def place(side, length_m, name="gap"):
    return PlaceBed(
        opening=name,
        side=side,
        length_m=length_m,
        bed_level_m=-9.0,
        chezy_m05_s=45.0,
        widening=0.0,
        alpha=None,
        alpha_basis="integral",
        local_velocity_factor=1.0,
        failure_slope_cot=6.0,
        start_depth_m=0.0,
        d50_mm=0.25,
    )


def told(code, *args):
    """Return the findings of a code."""
    planned, found, basin, *rest = args
    return [finding for finding in limit_findings(planned, found, basin, *(rest or [()])) if finding.code == code]


def only(code, *args):
    """Return the one finding of a code."""
    (finding,) = told(code, *args)
    return finding


def test_a_stage_inside_all_limits_has_no_findings():
    assert limit_findings(stage(), flow(), WIDE, ()) == ()
    assert limit_findings(stage(), flow(routed=False), None, ()) == ()
    assert limit_findings(stage(), flow(routed=False), Basin(), ()) == ()


# One wet area


@pytest.mark.parametrize(
    "basin",
    [
        Basin(level_m=(0.0,), area_m2=(2.0e7,)),
        Basin(level_m=(-4.0, 0.0, 4.0), area_m2=(2.0e7, 2.0e7, 2.0e7)),
        Basin(level_m=(-4.1, 0.3, 4.0), volume_m3=(0.0, 4.4 * 2.0e7, 8.1 * 2.0e7)),
    ],
    ids=["one row", "equal areas", "straight volumes"],
)
def test_one_wet_area_at_all_levels_is_a_note(basin):
    finding = only("constant-area", stage(), flow(), basin)
    assert (finding.severity, finding.where) == ("note", "basin")
    assert "one wet area, 2e+07 m2" in finding.message
    assert told("constant-area", stage(), flow(routed=False), basin) == []


# The end of the table


def test_a_routed_level_beyond_the_table_is_a_warning():
    table = (-0.2, 0.6)
    finding = only("basin-level-range", stage(), flow(), Basin(level_m=table, area_m2=(1.0e7, 2.0e7)))
    assert finding.severity == "warning"
    assert "from -0.50 to 0.50 m, beyond the table of areas (-0.2 to 0.6 m)" in finding.message
    finding = only("basin-level-range", stage(), flow(), Basin(level_m=(*table, 0.7), volume_m3=(0.0, 8.0e6, 1.0e7)))
    assert "beyond the table of volumes (-0.2 to 0.7 m)" in finding.message
    measured = flow(routed=False)
    assert told("basin-level-range", stage(), measured, Basin(level_m=table, area_m2=(1.0e7, 2.0e7))) == []


# Length of the basin


@pytest.mark.parametrize(("phase", "percent", "half_digit"), [(0.1, 0.5, 0.05), (0.2, 2.0, 0.05), (0.3, 4.7, 0.05)])
def test_the_level_error_is_that_of_a_standing_wave(phase, percent, half_digit):
    # 1 / cos(k L) - 1: a standing wave in a closed channel (Lamb 1932, Hydrodynamics, ch. 8, from memory).
    length = phase * np.sqrt(9.81 * 5.0) / OMEGA
    assert 100.0 * level_error(length, 5.0) == pytest.approx(percent, abs=half_digit)


def test_the_level_error_grows_without_bound_to_a_quarter_of_the_wave():
    wave = 12.4206012 * 3600.0 * np.sqrt(9.81 * 8.0)
    # cos 60 degrees is one half: a sixth of the wave doubles the tide.
    assert level_error(wave / 6.0, 8.0) == pytest.approx(1.0, rel=1e-9)
    assert level_error(0.25 * wave, 8.0) > 1e6
    assert level_error(0.3 * wave, 8.0) == np.inf
    # In 8 m of water it is 5 % at 19.5 km: w L / sqrt(g h) = 0.3093, whose cosine is 1 / 1.0500.
    assert level_error(19500.0, 8.0) == pytest.approx(0.05, abs=3e-4)


@settings(max_examples=30, deadline=None)
@given(length=st.floats(10.0, 1e4), depth=st.floats(2.0, 30.0), factor=st.floats(0.1, 3.0))
def test_the_level_error_keeps_when_the_depth_goes_with_the_square_of_the_length(length, depth, factor):
    scaled = level_error(factor * length, factor**2 * depth)
    assert scaled == pytest.approx(level_error(length, depth), rel=1e-9, abs=1e-14)


@pytest.mark.parametrize(("length", "depth"), [(0.0, 5.0), (1e4, -1.0), (np.nan, 5.0), (1e4, np.nan)])
def test_a_basin_without_length_or_depth_has_no_level_error(length, depth):
    with pytest.raises(DomainError, match="must be positive"):
        level_error(length, depth)


def test_a_long_basin_is_a_warning_with_the_error_at_its_head():
    # k L = 0.5: 14 %.
    length = 0.5 * np.sqrt(9.81 * 4.0) / OMEGA
    long = WIDE.model_copy(update={"length_m": length, "depth_m": 4.0})
    finding = only("basin-length", stage(), flow(), long)
    assert (finding.severity, finding.where) == ("warning", "basin")
    assert f"length of {length:.0f} m and a depth of 4 m the tide at the basin's head is 14 % larger" in finding.message
    assert "give it as a series" in finding.message
    assert told("basin-length", stage(), flow(), long.model_copy(update={"length_m": 0.6 * length})) == []
    assert told("basin-length", stage(), flow(routed=False), long) == []


def test_a_basin_over_a_quarter_of_the_wave_is_an_error():
    long = WIDE.model_copy(update={"length_m": 80e3, "depth_m": 4.0})
    finding = only("basin-length", stage(), flow(), long)
    assert finding.severity == "error"
    assert "longer than a quarter of the tidal wave" in finding.message


def test_a_guessed_length_and_depth_say_so():
    # Area at mean level 2.5e9 m2 over the bed at -4 m, walls upright: 50 km by 50 km, 4 m deep, so that
    # k L = 1.40519e-4 x 50000 / sqrt(9.81 x 4) = 1.1216 and 1 / cos - 1 = 1.30.
    large = Basin(level_m=(-4.0, 4.0), area_m2=(2.5e9, 2.5e9))
    centred = flow(basin=0.5 * np.sin(OMEGA * (TIMES - START_S)))
    finding = only("basin-length", stage(), centred, large)
    assert finding.where == "stage 'first'"
    assert "5e+04 m (guessed: the root of its area) and a depth of 4 m (guessed" in finding.message
    assert "130 % larger" in finding.message
    assert "give basin.length_m and basin.depth_m" in finding.message


def test_a_long_basin_without_any_depth_asks_for_one():
    # cos(k L) = 1 / 1.05 at k L = 0.30976, so that h = (1.40519e-4 x 20000 / 0.30976)^2 / 9.81 = 8.39 m.
    one_row = Basin(level_m=(0.0,), area_m2=(4.0e8,))
    assert told("basin-length", stage(), flow(), Basin(level_m=(0.5,), area_m2=(2.0e7,))) == []
    finding = only("basin-length", stage(), flow(basin=0.4 * np.sin(PHASE) - 0.1), one_row)
    assert finding.severity == "note"
    assert "over 8.4 m; give basin.depth_m" in finding.message
    # A length that was given is always answered: (1.40519e-4 x 4000 / 0.30976)^2 / 9.81 = 0.336 m.
    given_length = Basin(level_m=(0.5,), area_m2=(2.0e7,), length_m=4000.0)
    assert "over 0.34 m" in only("basin-length", stage(), flow(), given_length).message


# Rivers


def routed(planned, basin, start_m):
    return stage_flow(planned, basin, Waters(sea_fit=SEA, series={}), start_m)


def test_a_river_into_a_shut_basin_is_an_error_with_its_rise():
    # 100 m3/s x 86400 s over 1e7 m2 = 0.864 m a day; 2.59 m in three days.
    basin = Basin(level_m=(0.0,), area_m2=(1.0e7,), inflow_m3_s=100.0)
    shut = stage(opening(crest_level_m=50.0))
    finding = only("river-ponds", shut, routed(shut, basin, 0.0), basin)
    assert finding.severity == "error"
    assert "the basin is closed" in finding.message
    assert "inflow of 100 m3/s" in finding.message
    assert "rises 0.86 m a day and ends at 2.59 m" in finding.message


def test_a_stage_shorter_than_a_tidal_day_is_not_judged():
    basin = Basin(level_m=(0.0,), area_m2=(1.0e7,), inflow_m3_s=100.0)
    shut = stage(opening(crest_level_m=50.0), days=1)
    assert told("river-ponds", shut, routed(shut, basin, 0.0), basin) == []


def test_a_river_that_the_gap_cannot_drain_is_an_error():
    basin = Basin(level_m=(0.0,), area_m2=(2.0e7,), inflow=(Inflow(name="river", discharge_m3_s=100.0),))
    narrow = stage(opening(crest_level_m=-1.0, width_m=5.0))
    found = routed(narrow, basin, 0.0)
    finding = only("river-ponds", narrow, found, basin)
    assert finding.severity == "error"
    assert "the gap cannot drain the river: of the inflow of 100 m3/s" in finding.message
    assert f"ends at {found.level_basin_m[-1]:.2f} m" in finding.message
    # Shut it would rise by 0.43 m a day.
    rise = float(finding.message.split("rises ")[1].split(" m a day")[0])
    assert 0.25 * 0.43 < rise < 0.43


def test_a_river_that_spills_over_the_crest_is_a_warning():
    # Q = 1.70489 m B H^1.5, H = (100 / (1.70489 x 0.95 x 50))^(2/3) = 1.151 m over the crest at 3 m.
    basin = Basin(level_m=(0.0,), area_m2=(1.0e6,), inflow_m3_s=100.0)
    high = stage(opening(crest_level_m=3.0, width_m=50.0))
    finding = only("river-ponds", high, routed(high, basin, 4.1), basin)
    assert finding.severity == "warning"
    assert "holds the basin at 4.15 to 4.15 m" in finding.message


@pytest.mark.parametrize("inflow", [0.0, -50.0, 10.0, 100.0])
@pytest.mark.parametrize("days", [1, 3, 5, 9])
def test_a_river_that_goes_out_with_the_ebb_has_no_finding(inflow, days):
    basin = Basin(level_m=(-3.0, 3.0), area_m2=(1.4e7, 2.6e7), inflow_m3_s=inflow)
    sill = stage(opening(crest_level_m=-0.5, width_m=300.0), days=days)
    assert told("river-ponds", sill, routed(sill, basin, 0.5), basin) == []


def test_a_polder_that_drains_by_a_flap_has_no_finding():
    flap = {"relation": "ebb-flap", "parameters": {"height_m": 4.0, "coefficient": 0.9}}
    sluice = stage(opening(crest_level_m=-3.0, width_m=20.0, **flap), days=6)
    basin = Basin(level_m=(-3.0, 3.0), area_m2=(1.0e6, 2.0e6), inflow_m3_s=10.0)
    assert told("river-ponds", sluice, routed(sluice, basin, -0.8), basin) == []


def test_a_surge_is_no_river():
    times = START_S + np.arange(0.0, 3.0 * 86400.0 + 1.0, 600.0)
    level = 1.5 * np.sin(OMEGA * times) + 0.5 * (times - START_S) / 86400.0
    file = InputFile(path="invented.csv", sha256="0" * 64)
    storm = GivenSeries(name="storm", quantity="level", time_s=times, value=level, file=file)
    basin = Basin(level_m=(0.0,), area_m2=(2.0e7,), inflow_m3_s=50.0)
    planned = stage(opening(width_m=400.0), sea="storm")
    found = stage_flow(planned, basin, Waters(series={"storm": storm}), float(level[0]))
    assert told("river-ponds", planned, found, basin) == []


# Inertia

INLET = np.genfromtxt(PUBLISHED / "usace_2002_inlet_numbers.csv", delimiter=",", names=True, skip_header=3)


def inlet_flow(peak_m_s=1.678, area=666.0, **changes):
    """Return the published inlet with the peak velocity that its equation of motion gives with inertia."""
    velocity = peak_m_s * np.cos(PHASE)
    return flow(through(area * velocity, velocity), sea=0.65 * np.sin(PHASE), **changes)


INLET_BASIN = Basin(level_m=(0.0,), area_m2=(1.9e7,))


def test_the_inertia_of_the_published_inlet():
    number = inertia_number(float(INLET["length_m"]), float(INLET["basin_area_m2"]), float(INLET["gap_area_m2"]))
    assert number == pytest.approx(float(INLET["k2"]), abs=0.005)
    # To more digits, w = 2 pi / 44712 s: 1.405257e-4 x sqrt(1088 x 1.9e7 / (9.81 x 666)) = 0.24996.
    assert number == pytest.approx(0.24996, rel=1e-4)


@pytest.mark.parametrize("factor", [0.5, 4.0])
def test_the_inertia_number_goes_with_the_root_of_length_and_basin_over_gap(factor):
    assert inertia_number(100.0 * factor, 1e7, 500.0) == pytest.approx(factor**0.5 * inertia_number(100.0, 1e7, 500.0))
    assert inertia_number(100.0, 1e7 * factor, 500.0) == pytest.approx(factor**0.5 * inertia_number(100.0, 1e7, 500.0))
    assert inertia_number(100.0, 1e7, 500.0 * factor) == pytest.approx(factor**-0.5 * inertia_number(100.0, 1e7, 500.0))


@pytest.mark.parametrize("wrong", [(0.0, 1e7, 500.0), (1.0, np.nan, 500.0), (1.0, 1e7, -1.0)])
def test_an_inertia_number_wants_positive_numbers(wrong):
    with pytest.raises(DomainError, match="must be positive"):
        inertia_number(*wrong)


def test_a_long_channel_is_a_warning_with_its_share_of_the_tide():
    # K2^2 Q / (w a A_b) = 0.06248 x 666 x 1.678 / (1.40519e-4 x 0.65 x 1.9e7) = 4.0 % of 0.65 m.
    finding = only("inertia", stage(opening(flow_length_m=1088.0)), inlet_flow(), INLET_BASIN)
    assert (finding.severity, finding.where) == ("warning", "stage 'first'")
    assert "(K2 = 0.25; " in finding.message
    assert "4.0 % of the tide's half range of 0.65 m" in finding.message
    assert "length 1088 m, gap 666 m2, basin 1.9e+07 m2" in finding.message
    assert "guessed" not in finding.message


def test_a_length_is_guessed_from_both_protections():
    places = (place("sea", 500.0), place("basin", 588.0), place("sea", 9e4, name="another"))
    finding = only("inertia", stage(), inlet_flow(), INLET_BASIN, places)
    assert "K2 = 0.25" in finding.message
    assert "1088 m, guessed from the protections" in finding.message
    assert "give flow_length_m" in finding.message
    assert told("inertia", stage(), inlet_flow(), INLET_BASIN, ()) == []


def test_a_barrel_has_the_length_that_its_relation_was_given():
    barrel = {"height_m": 3.0, "coefficient": 1.0, "length_m": 1088.0, "manning_s_m13": 0.013}
    culvert = stage(opening(relation="culvert", parameters=barrel))
    message = only("inertia", culvert, inlet_flow(), INLET_BASIN).message
    assert "K2 = 0.25" in message
    assert "guessed" not in message


def test_a_short_gap_has_no_inertia():
    # K2 = 0.25 x sqrt(180 / 1088) = 0.10.
    assert told("inertia", stage(opening(flow_length_m=180.0)), inlet_flow(), INLET_BASIN) == []


def test_a_short_gap_that_is_almost_shut_has_none_either():
    # K2 = 0.59, but the water takes L w u / g = 180 x 1.40519e-4 x 3.5 / 9.81 = 9 mm, 1.4 % of 0.65 m.
    assert inertia_number(180.0, 1.9e7, 20.0) == pytest.approx(0.59, abs=0.005)
    shut = inlet_flow(peak_m_s=3.5, area=20.0)
    assert told("inertia", stage(opening(flow_length_m=180.0)), shut, INLET_BASIN) == []


def test_a_steady_stream_needs_no_speeding_up():
    # A river of 1000 m3/s on top changes the discharge, not how it swings.
    velocity = 1.678 * np.cos(PHASE)
    with_river = flow(through(666.0 * velocity - 1000.0, velocity - 1000.0 / 666.0), sea=0.65 * np.sin(PHASE))
    planned = stage(opening(flow_length_m=1088.0))
    assert "4.0 % of the tide's half range" in only("inertia", planned, with_river, INLET_BASIN).message
    # 4.0 x 500 / 1088 = 1.8 %, under the 2.25 % that are let pass; 4.0 x 650 / 1088 = 2.4 % are not.
    assert told("inertia", stage(opening(flow_length_m=500.0)), with_river, INLET_BASIN) == []
    assert "2.4 %" in only("inertia", stage(opening(flow_length_m=650.0)), with_river, INLET_BASIN).message


def test_openings_side_by_side_share_their_inertia():
    velocity = 1.678 * np.cos(PHASE)
    pair = flow(through(300.0 * velocity, velocity), through(366.0 * velocity, velocity, "b"), sea=0.65 * np.sin(PHASE))
    planned = stage(opening(flow_length_m=1088.0), opening("b", flow_length_m=1088.0))
    assert only("inertia", planned, pair, INLET_BASIN).message == (
        only("inertia", stage(opening(flow_length_m=1088.0)), inlet_flow(), INLET_BASIN).message
    )
    # One without a length is told, and its water left out: K2 = 0.25 x sqrt(666 / 300) = 0.37.
    message = only("inertia", stage(opening(flow_length_m=1088.0), opening("b")), pair, INLET_BASIN).message
    assert "K2 = 0.37" in message
    assert "b without a length left out" in message


def test_a_given_flow_has_no_inertia_of_its_own():
    velocity = 1.678 * np.cos(PHASE)
    series = flow(through(666.0 * velocity, velocity, given=True), sea=0.65 * np.sin(PHASE))
    modelled = stage(opening(flow_length_m=1088.0, relation=None, parameters={}, discharge_series="model"))
    assert told("inertia", modelled, series, INLET_BASIN) == []


# A small head


def test_the_repletion_of_the_published_inlet():
    # K = 1 / (K2 sqrt(K1)) = 0.745, F = 2 L A_g K1 / (a A_b), m = 1 / sqrt(F); K2 is printed to 2 %.
    loss = (
        2.0 * INLET["length_m"] * INLET["gap_area_m2"] * INLET["k1"] / (INLET["amplitude_m"] * INLET["basin_area_m2"])
    )
    conveyance = float(INLET["gap_area_m2"] / np.sqrt(loss))
    expected = float(1.0 / (INLET["k2"] * np.sqrt(INLET["k1"])))
    assert repletion_coefficient(conveyance, 1.9e7, 0.65) == pytest.approx(expected, rel=0.021)


@pytest.mark.parametrize("factor", [0.25, 9.0])
def test_the_repletion_coefficient_scales_with_its_inputs(factor):
    one = repletion_coefficient(300.0, 1e7, 1.0)
    assert repletion_coefficient(300.0 * factor, 1e7, 1.0) == pytest.approx(factor * one)
    assert repletion_coefficient(300.0, 1e7 * factor, 1.0) == pytest.approx(one / factor)
    assert repletion_coefficient(300.0, 1e7, factor) == pytest.approx(one * factor**-0.5)


@pytest.mark.parametrize("wrong", [(-1.0, 1e7, 1.0), (1.0, 0.0, 1.0), (1.0, 1e7, np.nan)])
def test_a_repletion_coefficient_wants_a_basin_and_a_tide(wrong):
    with pytest.raises(DomainError, match="must be positive"):
        repletion_coefficient(*wrong)


def wide_gap(repletion, amplitude, **changes):
    """Return a basin that follows the sea: Q = w a A_b cos, head = a (cos / K)^2 with the sign of Q."""
    sea, turning = amplitude * np.sin(PHASE), np.cos(PHASE)
    discharge = OMEGA * amplitude * 2.0e7 * turning
    head = amplitude * np.abs(turning) * turning / repletion**2
    return flow(through(discharge, turning), sea=sea, basin=sea - head, **changes)


EVEN = Basin(level_m=(-8.0, 8.0), area_m2=(2.0e7, 2.0e7))


@pytest.mark.parametrize(
    ("repletion", "amplitude", "shown"),
    # Root mean square of cos^2 is sqrt(3 / 8): 1.5 / 144 x 0.61237 = 6.4 mm; 5 / 121 x 0.61237 = 25 mm.
    [(12.0, 1.5, "6 mm (root mean square; repletion coefficient 12)"), (11.0, 5.0, "25 mm")],
)
def test_a_gap_as_wide_as_its_basin_is_a_note_with_its_head(repletion, amplitude, shown):
    finding = only("small-head", stage(), wide_gap(repletion, amplitude), EVEN)
    assert finding.severity == "note"
    assert shown in finding.message


def test_given_levels_that_hardly_differ_are_a_warning():
    finding = only("small-head", stage(), wide_gap(12.0, 1.5, routed=False), None)
    assert finding.severity == "warning"
    assert "6 mm (root mean square), under the 20 mm" in finding.message
    assert 'write basin = "routed"' in finding.message
    assert only("small-head", stage(), wide_gap(12.0, 1.5, routed=False), EVEN) == finding


def test_an_ordinary_head_has_no_finding():
    # 1.5 / 25 x 0.61237 = 37 mm.
    assert told("small-head", stage(), wide_gap(5.0, 1.5), EVEN) == []
    assert told("small-head", stage(), wide_gap(5.0, 1.5, routed=False), EVEN) == []


def test_a_head_that_drives_nothing_has_no_finding():
    level = np.sin(PHASE)
    dry = flow(through(0.0, 0.0), sea=level, basin=level, routed=False)
    assert told("small-head", stage(), dry, None) == []
    given_velocity = through(np.nan, np.nan, given=True, given_end_velocity_m_s=np.cos(PHASE))
    assert told("small-head", stage(), flow(given_velocity, sea=level, basin=level, routed=False), None) == []


def test_what_happens_in_holes_counts_for_nothing():
    # In the hole both levels are bridged to one; outside the head is 0.3 m.
    covered = TIMES < START_S + 40 * 3600.0
    basin = np.where(covered, np.sin(PHASE) - 0.3, np.sin(PHASE))
    far = np.where(covered, 0.65, 9.0) * np.sin(PHASE)
    assert told("small-head", stage(), flow(basin=basin, covered=covered, routed=False), None) == []
    holed = flow(*inlet_flow().openings, sea=far, basin=0.0, covered=covered)
    message = only("inertia", stage(opening(flow_length_m=1088.0)), holed, INLET_BASIN).message
    assert "4.0 % of the tide's half range of 0.65 m" in message
