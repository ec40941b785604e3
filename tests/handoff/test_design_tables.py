"""Rules compared, length curve, what each input is worth, and layers of the bed."""

import dataclasses

import numpy as np
import pytest

from tidescour.handoff.design_tables import (
    comparison_table,
    largest_changes,
    layers_table,
    length_curve_table,
    sensitivity_table,
)
from tidescour.handoff.results_tables import durations_table, protection_table
from tidescour.handoff.tables import csv_bytes, row_objects
from tidescour.scour.records import RULES


def test_the_headings(results):
    found = {
        table.name: csv_bytes(table).decode("utf-8").splitlines()[0]
        for table in (
            comparison_table(results),
            length_curve_table(results),
            sensitivity_table(results),
            layers_table(results),
        )
    }
    assert found == {
        "comparison": "stage,opening,side,rule,effective_duration_h,stage_depth_m,end_depth_m,alpha,"
        "alpha_for_same_depth,drives",
        "length_curve": "opening,side,length_m,alpha,effective_duration_h,final_depth_m,slope_rule_length_m",
        "sensitivity": "opening,side,change,depth_change_m,length_change_m,why_empty",
        "layers": "stage,opening,side,layer,top_level_m,depth_m,time_utc,reference_velocity_m_s,alpha,"
        "critical_velocity_m_s,reference_depth_m,equivalent_start_h,effective_duration_h",
    }


def test_every_rule_has_a_row_with_its_own_depth_and_agrees_with_the_durations(results):
    rows = row_objects(comparison_table(results))
    durations = row_objects(durations_table(results))
    assert len(rows) == len(RULES) * len(durations)
    for at, row in enumerate(rows):
        duration = durations[at // len(RULES)]
        assert [row[key] for key in ("stage", "opening", "side")] == [
            duration[key] for key in ("stage", "opening", "side")
        ]
        assert row["rule"] == RULES[at % len(RULES)]
        # the explicit law by hand (Breusers, from memory)
        excess = duration["alpha"] * duration["reference_velocity_m_s"] - duration["critical_velocity_m_s"]
        depth = excess**1.7 * duration["reference_depth_m"] ** 0.2 * row["effective_duration_h"] ** 0.4
        assert row["stage_depth_m"] == pytest.approx(depth / (10.0 * 1.6**0.7), rel=1e-9)
        assert (row["drives"] == "yes") == (row["rule"] == "integral")
    driving = [row for row in rows if row["drives"] == "yes"]
    for row, duration in zip(driving, durations, strict=True):
        assert row["effective_duration_h"] == duration["effective_duration_h"]
        assert row["stage_depth_m"] == pytest.approx(duration["stage_depth_m"], rel=1e-12)
        assert row["end_depth_m"] == duration["end_depth_m"]


def test_the_last_row_of_each_rule_is_the_final_depth_of_its_place(results):
    last = {(row["opening"], row["side"], row["rule"]): row for row in row_objects(comparison_table(results))}
    for place in row_objects(protection_table(results)):
        for rule in RULES:
            key = f"final_depth_{rule.replace('-', '_')}_m"
            assert last[place["opening"], place["side"], rule]["end_depth_m"] == place[key]


def test_a_growth_factor_multiplies_the_depth_from_a_flat_bed(results):
    place = results.places[0]
    bed = place.place.model_copy(update={"growth_factor": 1.5})
    raised = dataclasses.replace(results, places=(dataclasses.replace(place, place=bed),))
    plain = dataclasses.replace(results, places=(place,))
    for before, after in zip(row_objects(comparison_table(plain)), row_objects(comparison_table(raised)), strict=True):
        assert after["stage_depth_m"] == pytest.approx(1.5 * before["stage_depth_m"], rel=1e-12)


def test_a_held_velocity_that_the_curve_does_not_reach_leaves_empty_cells(results):
    place = results.places[0]
    row = place.rows[0]
    nothing = np.full(row.duration.peak_held_h.shape, np.nan)
    step = dataclasses.replace(row.chain[3], end_depth_m=np.nan)
    row = dataclasses.replace(
        row,
        duration=dataclasses.replace(row.duration, peak_held_h=nothing),
        chain=(*row.chain[:3], step, row.chain[4]),
    )
    run = dataclasses.replace(results, places=(dataclasses.replace(place, rows=(row,)),), raised_sea=None)
    held = row_objects(comparison_table(run))[3]
    assert held["effective_duration_h"] is held["stage_depth_m"] is held["end_depth_m"] is None
    assert row_objects(protection_table(run))[0]["final_depth_peak_held_m"] is None


def test_a_row_without_flow_has_no_depth_and_no_alpha(make_results):
    rows = row_objects(comparison_table(make_results(still_place="shoal")))
    still = [row for row in rows if row["opening"] == "shoal"]
    assert len(still) == 4 * len(RULES)
    for row in still:
        assert row["effective_duration_h"] == row["stage_depth_m"] == 0.0
        assert row["alpha"] is row["alpha_for_same_depth"] is None


def test_the_length_curve_tells_what_slope_and_margin_ask_for(results):
    place = results.places[0]
    bed = place.place.model_copy(update={"depth_margin_factor": 1.25, "failure_slope_cot": 8.0})
    rows = row_objects(
        length_curve_table(dataclasses.replace(results, places=(dataclasses.replace(place, place=bed),)))
    )
    assert len(rows) == place.length_curve.length_m.size
    for row in rows:
        assert row["slope_rule_length_m"] == pytest.approx(10.0 * row["final_depth_m"], rel=1e-12)


def test_a_place_where_nothing_grows_has_no_length_curve(make_results):
    rows = row_objects(length_curve_table(make_results(still_place="shoal")))
    assert {row["opening"] for row in rows} == {"main gap"}


def test_a_change_without_a_result_says_why(results):
    rows = row_objects(sensitivity_table(results))
    assert len(rows) == 4 * 4
    empty = [row for row in rows if row["why_empty"]]
    assert {row["why_empty"] for row in empty} == {"invented refusal"}
    assert all(row["depth_change_m"] is row["length_change_m"] is None for row in empty)


def test_the_largest_changes_are_those_of_length(results):
    assert [each.length_change_m for each in largest_changes(results.places[0], 2)] == [7.5, 6.5]
    assert [each.length_change_m for each in largest_changes(results.places[0], 9)] == [7.5, 6.5, -2.5]


def test_a_layer_that_is_reached_has_its_level_depth_and_time(layered):
    # 1807000000 s after 1970 is 20914 days and 08:26:40
    lower = layered.places[0].rows[1].durations.layers[1]
    assert row_objects(layers_table(layered)) == [
        {
            "stage": "sill to -4",
            "opening": "main gap",
            "side": "sea",
            "layer": "clay",
            "top_level_m": -11.5,
            "depth_m": 2.5,
            "time_utc": "2027-04-06T08:26:40Z",
            "reference_velocity_m_s": lower.reference_velocity_m_s,
            "alpha": lower.alpha,
            "critical_velocity_m_s": lower.critical_velocity_m_s,
            "reference_depth_m": lower.reference_depth_m,
            "equivalent_start_h": 30.0,
            "effective_duration_h": 12.0,
        }
    ]


def test_a_row_names_the_layer_in_which_it_starts(layered):
    place = layered.places[0]
    row = place.rows[1]
    steps = tuple(dataclasses.replace(step, layer=1) for step in row.chain)
    rows = (place.rows[0], dataclasses.replace(row, chain=steps))
    run = dataclasses.replace(layered, places=(dataclasses.replace(place, rows=rows),))
    assert [each["bed_layer"] for each in row_objects(durations_table(run))] == ["surface", "clay"]
