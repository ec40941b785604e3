import dataclasses

import numpy as np
import pytest

from tidescour.errors import Finding
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.gauge.records import GaugeRecord
from tidescour.handoff.results_tables import (
    cycles_table,
    durations_table,
    final_depth_m,
    findings_table,
    growth_table,
    protection_table,
    records_table,
    sweep_table,
    tides_table,
    velocities_table,
)
from tidescour.handoff.tables import csv_bytes
from tidescour.plan.kinds import TIDE_RULES
from tidescour.scour.records import RULES, CycleSet

HOURS = ("integral_h", "flow_mean_h", "cycle_mean_h", "peak_held_h", "mean_held_h", "flow_h")

# Headings as the public contract has them.
HEADINGS = {
    "durations": "stage,opening,side,start,end,duration_h,cycles,reference_velocity_m_s,alpha,critical_velocity_m_s,"
    "reference_depth_m,effective_duration_integral_h,effective_duration_flow_mean_h,effective_duration_cycle_mean_h,"
    "effective_duration_h,stage_depth_m,equivalent_start_h,start_depth_m,end_depth_m,peak_gap_velocity_m_s,"
    "peak_end_velocity_m_s,share_percent,effective_duration_spent_h,growth_factor,turbulence,mean_end_velocity_m_s,"
    "flow_duration_h,"
    "equilibrium_depth_half_alpha_m,equilibrium_depth_turbulence_m,bed_layer",
    "cycles": "stage,opening,cycle,start,end,tidal_range_m,peak_flood_velocity_m_s,peak_ebb_velocity_m_s,"
    "basin_effective_integral_h,basin_effective_flow_mean_h,basin_effective_cycle_mean_h,"
    "sea_effective_integral_h,sea_effective_flow_mean_h,sea_effective_cycle_mean_h",
    "velocities": "time_utc,stage,opening,level_sea_m,level_basin_m,head_m,discharge_m3_s,gap_velocity_m_s,"
    "end_velocity_basin_m_s,end_velocity_sea_m_s",
    "growth": "time_utc,stage,opening,side,depth_m",
    "protection": "opening,side,failure_slope_cot,final_depth_m,final_depth_integral_m,final_depth_flow_mean_m,"
    "final_depth_cycle_mean_m,length_given_m,length_required_m,alpha_at_required,final_depth_raised_sea_m,"
    "length_required_raised_sea_m,depth_margin_factor,length_single_slide_m,length_minimum_m,upstream_slope_cot,length_reached,"
    "final_depth_peak_held_m,final_depth_mean_held_m",
    "sweep": "opening,varied,value_m,tide,direction,peak_head_m,peak_gap_velocity_m_s,peak_unit_discharge_m2_s,"
    "mean_basin_level_m",
    "tides": "side,constituent,amplitude_m,phase_deg,amplitude_ci95_m,phase_ci95_deg",
    "records": "side,time_utc,level_m,flag",
    "findings": "severity,code,where,message",
}


def tables(results):
    return (
        durations_table(results),
        cycles_table(results),
        velocities_table(results),
        growth_table(results),
        protection_table(results),
        sweep_table(results.sweep),
        tides_table(results.fits),
        records_table(results.records),
        findings_table(results.findings),
    )


def rows(table):
    text = csv_bytes(table).decode("utf-8").splitlines()
    headings = text[0].split(",")
    return [dict(zip(headings, line.split(","), strict=True)) for line in text[1:]]


def replace_flow(results, **changes):
    """Return the results with the first stage's flow changed."""
    flow = dataclasses.replace(results.flows[0], **changes)
    return dataclasses.replace(results, flows=(flow, *results.flows[1:]))


def test_every_table_has_the_headings_of_the_contract(results):
    for table in tables(results):
        assert csv_bytes(table).decode("utf-8").splitlines()[0] == HEADINGS[table.name]


def test_tables_without_results_have_headings_alone(results):
    empty = dataclasses.replace(results, flows=(), places=(), raised_sea=None, fits=(), records=(), findings=())
    for table in tables(empty):
        assert csv_bytes(table).decode("utf-8") == HEADINGS[table.name] + "\n"


def test_durations_come_by_stage_then_by_place(results):
    order = [(row["stage"], row["opening"], row["side"]) for row in rows(durations_table(results))]
    expected = [
        (stage, opening, side)
        for stage in ("sill to -6", "sill to -4")
        for opening in ("main gap", "shoal")
        for side in ("sea", "basin")
    ]
    assert order == expected


def test_a_duration_row_tells_length_times_and_share(results):
    first = rows(durations_table(results))[0]
    assert (first["start"], first["end"]) == ("2027-04-01T00:00:00Z", "2027-04-07T00:00:00Z")
    assert float(first["duration_h"]) == 6 * 24
    row = results.places[0].rows[0]
    assert int(first["cycles"]) == len(row.duration.cycles.start_s)
    assert float(first["share_percent"]) == pytest.approx(100.0 * row.chain[0].share, rel=1e-11)


def test_shares_of_a_place_make_a_hundred_percent(results):
    share = {}
    for row in rows(durations_table(results)):
        place = (row["opening"], row["side"])
        share[place] = share.get(place, 0.0) + float(row["share_percent"])
    assert len(share) == 4
    assert list(share.values()) == pytest.approx([100.0] * 4, abs=1e-9)


@pytest.mark.parametrize("rule", TIDE_RULES)
def test_the_rule_of_the_plan_drives(make_results, rule):
    results = make_results(rule=rule, openings=("gap",))
    own = f"effective_duration_{rule.replace('-', '_')}_h"
    for row, place in zip(rows(durations_table(results)), [*results.places, *results.places], strict=True):
        assert row["effective_duration_h"] == row[own]
        step = place.rows[("sill to -6", "sill to -4").index(row["stage"])].chain[TIDE_RULES.index(rule)]
        assert float(row["end_depth_m"]) == pytest.approx(step.end_depth_m, rel=1e-11)
    for row in rows(protection_table(results)):
        assert row["final_depth_m"] == row[f"final_depth_{rule.replace('-', '_')}_m"]


def test_the_law_gives_the_depth_of_a_row_back(results):
    # explicit law in its own form: h = E^1.7 h0^0.2 t^0.4 / (10 Delta^0.7), t in hours (Breusers, from memory)
    for row in rows(durations_table(results)):
        excess = float(row["alpha"]) * float(row["reference_velocity_m_s"]) - float(row["critical_velocity_m_s"])
        hours = float(row["effective_duration_h"])
        depth = excess**1.7 * float(row["reference_depth_m"]) ** 0.2 * hours**0.4 / (10.0 * 1.6**0.7)
        assert depth == pytest.approx(float(row["stage_depth_m"]), rel=1e-9)


def test_a_place_without_flow_has_empty_cells_and_no_depth(make_results):
    results = make_results(still_place="shoal")
    still = [row for row in rows(durations_table(results)) if row["opening"] == "shoal"]
    assert len(still) == 4
    for row in still:
        assert row["alpha"] == row["reference_velocity_m_s"] == row["equivalent_start_h"] == row["share_percent"] == ""
        assert row["effective_duration_h"] == row["stage_depth_m"] == row["end_depth_m"] == "0"
    assert [row["alpha_at_required"] for row in rows(protection_table(results))][2:] == ["", ""]


def test_cycles_add_up_to_durations(results):
    total = {}
    for row in rows(cycles_table(results)):
        for side in ("sea", "basin"):
            for rule in ("integral", "flow_mean", "cycle_mean"):
                key = (row["stage"], row["opening"], side, rule)
                total[key] = total.get(key, 0.0) + float(row[f"{side}_effective_{rule}_h"])
    for row in rows(durations_table(results)):
        for rule in ("integral", "flow_mean", "cycle_mean"):
            expected = float(row[f"effective_duration_{rule}_h"])
            assert total[row["stage"], row["opening"], row["side"], rule] == pytest.approx(expected, rel=1e-9)


def test_cycles_count_from_one_in_each_stage(results):
    numbers = [int(row["cycle"]) for row in rows(cycles_table(results)) if row["opening"] == "shoal"]
    counts = [len(place_row.duration.cycles.start_s) for place_row in results.places[2].rows]
    assert numbers == [number for count in counts for number in range(1, count + 1)]


def sine_run(results, step_s):
    """Return the first stage with a sea of 2 sin and a gap velocity of 3 sin - 1, cut at two whole periods."""
    period = 43200.0
    time_s = np.arange(0.0, 2.0 * period + 1.0, step_s)
    sine = np.sin(2.0 * np.pi * time_s / period)
    gap = OpeningFlow(
        name="main gap",
        level_sea_m=2.0 * sine + 0.5,
        crest_level_m=np.zeros_like(time_s),
        width_m=np.ones_like(time_s),
        discharge_m3_s=3.0 * sine - 1.0,
        gap_velocity_m_s=3.0 * sine - 1.0,
        flow_width_m=np.ones_like(time_s),
    )
    flow = StageFlow(
        stage="sill to -6",
        time_s=time_s,
        level_sea_m=2.0 * sine + 0.5,
        level_basin_m=np.zeros_like(time_s),
        covered=np.ones(time_s.shape, dtype=bool),
        measured=False,
        routed=True,
        openings=(gap,),
        inflow_m3_s=np.zeros_like(time_s),
    )
    cycles = CycleSet(start_s=[0.0, period], end_s=[period, 2.0 * period])
    nothing = np.zeros(2)
    place = results.places[0]
    duration = dataclasses.replace(place.rows[0].duration, cycles=cycles, **dict.fromkeys(HOURS, nothing))
    row = dataclasses.replace(place.rows[0], duration=duration)
    places = (dataclasses.replace(place, rows=(row,)),)
    return dataclasses.replace(results, flows=(flow,), places=places)


def test_range_and_peaks_of_a_cycle_are_those_of_a_sine(results):
    for row in rows(cycles_table(sine_run(results, 600.0))):
        assert float(row["tidal_range_m"]) == pytest.approx(4.0, abs=1e-12)
        assert float(row["peak_flood_velocity_m_s"]) == pytest.approx(2.0, abs=1e-12)
        assert float(row["peak_ebb_velocity_m_s"]) == pytest.approx(4.0, abs=1e-12)
        # a place on the sea side alone
        assert row["basin_effective_integral_h"] == ""


def test_a_cycle_shorter_than_a_step_takes_its_ends_by_interpolation(results):
    run = sine_run(results, 600.0)
    cycles = CycleSet(start_s=[150.0, 43200.0], end_s=[450.0, 86400.0])
    row = run.places[0].rows[0]
    row = dataclasses.replace(row, duration=dataclasses.replace(row.duration, cycles=cycles))
    run = dataclasses.replace(run, places=(dataclasses.replace(run.places[0], rows=(row,)),))
    rise = 2.0 * np.sin(2.0 * np.pi * 600.0 / 43200.0)
    assert float(rows(cycles_table(run))[0]["tidal_range_m"]) == pytest.approx(0.5 * rise, rel=1e-11)


def test_sides_with_different_cycles_are_refused(results):
    place = results.places[0]
    cycles = place.rows[0].duration.cycles
    shifted = CycleSet(start_s=cycles.start_s + 1.0, end_s=cycles.end_s + 1.0)
    row = dataclasses.replace(place.rows[0], duration=dataclasses.replace(place.rows[0].duration, cycles=shifted))
    wrong = dataclasses.replace(
        results, places=(dataclasses.replace(place, rows=(row, *place.rows[1:])), *results.places[1:])
    )
    with pytest.raises(ValueError, match="sill to -6, main gap: both sides must have the same cycles"):
        cycles_table(wrong)


def test_gap_velocities_are_empty_where_the_end_velocity_is_given(results):
    opening = results.flows[0].openings[0]
    unknown = np.full(opening.crest_level_m.shape, np.nan)
    given = dataclasses.replace(
        opening, discharge_m3_s=unknown, gap_velocity_m_s=unknown, given_end_velocity_m_s=unknown * 0.0, given=True
    )
    run = replace_flow(results, openings=(given, results.flows[0].openings[1]))
    first = rows(cycles_table(run))[0]
    assert first["peak_flood_velocity_m_s"] == first["peak_ebb_velocity_m_s"] == ""
    assert float(first["tidal_range_m"]) > 0.0
    first = rows(velocities_table(run))[0]
    assert first["discharge_m3_s"] == first["gap_velocity_m_s"] == ""
    assert first["end_velocity_basin_m_s"] != ""


def test_velocities_stand_on_whole_ten_minutes_and_leave_out_the_end_of_a_stage(results):
    mine = [row for row in rows(velocities_table(results)) if row["opening"] == "shoal"]
    times = [row["time_utc"] for row in mine]
    assert len(times) == len(set(times)) == 2 * 6 * 144
    assert times[0] == "2027-04-01T00:00:00Z"
    assert times[-1] == "2027-04-12T23:50:00Z"
    assert all(text.endswith("0:00Z") for text in times)
    assert [row["stage"] for row in mine if row["time_utc"] == "2027-04-07T00:00:00Z"] == ["sill to -4"]


def test_velocities_take_the_first_step_of_ten_minutes_where_steps_are_odd(results):
    run = sine_run(results, 7.0 * 60.0)
    times = [row["time_utc"][11:19] for row in rows(velocities_table(run))[:5]]
    # steps of 7 minutes: 0, 14, 21, 35, 42 are the first in 0-10, 10-20, 20-30, 30-40, 40-50
    assert times == ["00:00:00", "00:14:00", "00:21:00", "00:35:00", "00:42:00"]


def test_velocities_keep_signs_of_the_flood_and_magnitudes_by_side(results):
    signs = set()
    for row in rows(velocities_table(results)):
        head, gap, discharge = (float(row[name]) for name in ("head_m", "gap_velocity_m_s", "discharge_m3_s"))
        basin, sea = float(row["end_velocity_basin_m_s"]), float(row["end_velocity_sea_m_s"])
        assert np.sign(head) == np.sign(gap) == np.sign(discharge)
        assert (basin > 0.0) == (gap > 0.0)
        assert (sea > 0.0) == (gap < 0.0)
        assert head == pytest.approx(float(row["level_sea_m"]) - float(row["level_basin_m"]), abs=1e-10)
        signs.add(np.sign(head))
    assert signs == {-1.0, 1.0}


def test_velocities_are_empty_in_holes_of_the_records(results):
    covered = np.ones(results.flows[0].time_s.shape, dtype=bool)
    covered[12:37] = False  # 01:00 to 03:00 in steps of 5 minutes
    empty = [row for row in rows(velocities_table(replace_flow(results, covered=covered))) if row["head_m"] == ""]
    assert {row["time_utc"][11:16] for row in empty} == {
        f"{minutes // 60:02d}:{minutes % 60:02d}" for minutes in range(60, 181, 10)
    }
    assert all(row["level_sea_m"] == row["gap_velocity_m_s"] == row["end_velocity_sea_m_s"] == "" for row in empty)


def test_growth_starts_with_the_first_stage_and_never_falls(results):
    for place in results.places:
        mine = [
            row
            for row in rows(growth_table(results))
            if (row["opening"], row["side"]) == (place.place.opening, place.place.side)
        ]
        depth = [float(row["depth_m"]) for row in mine]
        assert mine[0]["time_utc"] == "2027-04-01T00:00:00Z"
        assert depth == sorted(depth)
        assert depth[-1] == pytest.approx(place.rows[-1].chain[0].end_depth_m, rel=1e-9)


def test_protection_gives_the_last_depth_of_each_rule(results):
    for row, place in zip(rows(protection_table(results)), results.places, strict=True):
        ends = [step.end_depth_m for step in place.rows[-1].chain]
        columns = [f"final_depth_{rule.replace('-', '_')}_m" for rule in RULES]
        assert [float(row[name]) for name in columns] == pytest.approx(ends, rel=1e-11)
        assert row["length_given_m"] == "90"
        assert float(row["length_required_m"]) == pytest.approx(place.required.length_m, rel=1e-11)


def test_final_depth_of_a_place_that_no_stage_has_is_where_it_starts(results):
    place = results.places[0]
    bed = place.place.model_copy(update={"start_depth_m": 1.25})
    assert final_depth_m(dataclasses.replace(place, place=bed, rows=()), "integral") == 1.25


def test_effective_duration_is_the_sum_over_cycles(results):
    row = results.places[0].rows[0]
    duration = dataclasses.replace(
        row.duration,
        cycles=CycleSet(start_s=[0.0, 10.0], end_s=[10.0, 20.0]),
        integral_h=[1.0, 2.0],
        flow_mean_h=[3.0, 4.0],
        cycle_mean_h=[5.0, 6.5],
        peak_held_h=[7.0, 8.0],
        mean_held_h=[9.0, 10.25],
        flow_h=[1.0, 1.0],
    )
    assert [duration.total_h(rule) for rule in RULES] == [3.0, 7.0, 11.5, 15.0, 19.25]


def test_tides_leave_the_intervals_empty(results):
    assert csv_bytes(tides_table(results.fits)).decode("utf-8").splitlines()[1:] == [
        "sea,M2,1.5,10,,",
        "sea,S2,0.3,40,,",
    ]


def test_records_keep_every_row_with_its_flag():
    record = GaugeRecord(
        side="basin", time_s=[0.0, 600.0, 1200.0], level_m=[1.25, np.nan, -0.5], flag=[1, 9, 4], step_s=600.0, files=()
    )
    assert csv_bytes(records_table([record])).decode("utf-8").splitlines()[1:] == [
        "basin,1970-01-01T00:00:00Z,1.25,1",
        "basin,1970-01-01T00:10:00Z,,9",
        "basin,1970-01-01T00:20:00Z,-0.5,4",
    ]


def test_findings_come_in_the_order_of_the_steps():
    findings = [
        Finding(severity="warning", code="later", where="a", message="m"),
        Finding(severity="note", code="earlier", where="b", message="n"),
    ]
    assert csv_bytes(findings_table(findings)).decode("utf-8").splitlines()[1:] == [
        "warning,later,a,m",
        "note,earlier,b,n",
    ]
