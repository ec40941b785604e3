"""The whole job in one piece: what must hold between its results, on the sample and on small plans."""

import csv
import json
import re
from dataclasses import replace
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

from tidescour import pipeline
from tidescour.bed.history import bed_history
from tidescour.cli.main import exit_code
from tidescour.gap.levels import Waters
from tidescour.gap.stage import stage_flow
from tidescour.handoff.document import handoff_document
from tidescour.pipeline import places as of_place
from tidescour.plan.loader import read_plan
from tidescour.plan.places import places
from tidescour.scour.cycles import stage_cycles
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS
from tidescour.scour.records import CycleSet
from tidescour.tide.fit import fit_from_table

TERNHOLM = Path(__file__).parent.parent / "sample_series" / "ternholm" / "plan.toml"
FILES = {
    "handoff.json",
    "provenance.json",
    "durations.csv",
    "cycles.csv",
    "velocities.csv",
    "growth.csv",
    "protection.csv",
    "sweep.csv",
    "tides.csv",
    "records.csv",
    "findings.csv",
    "comparison.csv",
    "length_curve.csv",
    "sensitivity.csv",
    "layers.csv",
    "stone.csv",
    "filter.csv",
    "methods.csv",
    "load_cases.csv",
}


@pytest.fixture(scope="module")
def sample(tmp_path_factory):
    """Run the sample once and return its result folder."""
    folder = tmp_path_factory.mktemp("sample") / "results"
    assert exit_code(["run", str(TERNHOLM), "--out", str(folder), "--quiet"]) == 0
    return folder


def rows(folder, name):
    with (folder / f"{name}.csv").open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def number(text):
    return float(text) if text else np.nan


def test_a_run_writes_every_file_of_the_contract(sample):
    assert {path.name for path in sample.iterdir()} - {"figures"} == FILES
    assert {path.suffix for path in (sample / "figures").iterdir()} == {".png", ".svg"}


def test_every_row_gives_its_own_depth_from_its_reference(sample):
    document = json.loads((sample / "handoff.json").read_text(encoding="utf-8"))
    law = document["law"]
    for row in document["durations"]:
        excess = row["alpha"] * row["reference_velocity_m_s"] - row["critical_velocity_m_s"]
        depth = (
            law["coefficient_m_s_h"]
            * excess ** law["velocity_exponent"]
            * row["reference_depth_m"] ** law["depth_exponent"]
            * row["effective_duration_h"] ** law["time_exponent"]
        )
        assert depth == pytest.approx(row["stage_depth_m"], rel=1e-9)


def test_cycles_add_up_to_durations(sample):
    cycles = rows(sample, "cycles")
    for row in rows(sample, "durations"):
        own = [c for c in cycles if c["stage"] == row["stage"] and c["opening"] == row["opening"]]
        assert int(row["cycles"]) == len(own)
        for rule in ("integral", "flow_mean", "cycle_mean"):
            total = sum(float(c[f"{row['side']}_effective_{rule}_h"]) for c in own)
            assert total == pytest.approx(float(row[f"effective_duration_{rule}_h"]), rel=1e-9)


def test_each_place_grows_on_from_the_stage_before(sample):
    table = rows(sample, "durations")
    for row in rows(sample, "protection"):
        own = [r for r in table if r["opening"] == row["opening"] and r["side"] == row["side"]]
        for before, after in pairwise(own):
            assert float(after["start_depth_m"]) == float(before["end_depth_m"])
            assert float(after["end_depth_m"]) >= float(after["start_depth_m"])
        assert sum(float(r["share_percent"]) for r in own) == pytest.approx(100.0, rel=1e-9)
        assert float(row["final_depth_integral_m"]) >= float(row["final_depth_flow_mean_m"])
        assert float(row["final_depth_flow_mean_m"]) >= float(row["final_depth_cycle_mean_m"])
        grown = [r for r in rows(sample, "growth") if r["opening"] == row["opening"] and r["side"] == row["side"]]
        assert float(grown[-1]["depth_m"]) == pytest.approx(float(row["final_depth_m"]), rel=1e-9)


def test_velocities_have_the_sign_of_the_head_and_one_side_at_a_time(sample):
    table = rows(sample, "velocities")
    for row in table[:: max(len(table) // 500, 1)]:
        head, discharge = float(row["head_m"]), float(row["discharge_m3_s"])
        assert head == pytest.approx(float(row["level_sea_m"]) - float(row["level_basin_m"]), abs=1e-9)
        assert discharge * head >= 0.0
        assert float(row["end_velocity_basin_m_s"]) * float(row["end_velocity_sea_m_s"]) == 0.0


def test_provenance_lists_inputs_and_nothing_of_this_machine_stands_in_the_handoff(sample):
    text = (sample / "handoff.json").read_text(encoding="utf-8")
    provenance = json.loads(text)["provenance"]
    assert {entry["file"] for entry in provenance["inputs"]} >= {"ternholm_sea_2026-10.csv", "ternholm_basin.csv.gz"}
    assert str(TERNHOLM.parent) not in text
    assert not re.search(r'"(started|host|command_line)"', text)


def test_the_same_run_again_replaces_its_results_and_an_edit_stops_it(tmp_path, capsys):
    plan = small_plan(tmp_path, {"name": "a", "start": "2027-04-01T00:00:00Z", "end": "2027-04-03T00:00:00Z"})
    command = ["run", "--no-figures", str(plan.file), "--out", str(tmp_path / "results"), "--quiet"]
    assert exit_code(command) == exit_code(command) == 0
    edited = tmp_path / "results" / "durations.csv"
    before = edited.read_bytes()
    edited.write_bytes(before + b"my own remark\n")
    assert exit_code(command) == 3
    assert "durations.csv was changed" in capsys.readouterr().err
    assert edited.read_bytes() == before + b"my own remark\n"


SMALL = """
[site]
name = "Invented gap"
datum = "invented datum"
latitude_deg = 54.0
[tide]
sea_constants = "constants.csv"
sea_mean_m = 0.1
[basin]
level_m = [-3.0, 0.0, 3.0]
area_m2 = [1.0e7, 1.6e7, 2.0e7]
start_level_m = 0.4
[bed]
critical_velocity_m_s = 0.42
[protection.basin]
length_m = 90.0
bed_level_m = -10.0
alpha = 2.4
failure_slope_cot = 8.0
[protection.sea]
length_m = 90.0
bed_level_m = -10.0
alpha = 2.4
failure_slope_cot = 8.0
"""

STAGE = """
[[stage]]
name = "{name}"
start = {start}
end = {end}
[[stage.opening]]
name = "gap"
crest_level_m = {crest}
{more}width_m = 300.0
relation = "broad-crest"
coefficient = 0.95
"""


def small_plan(tmp_path, *stages, **changes):
    text = SMALL + "".join(STAGE.format(**{"crest": -6.0, "more": "", **stage}) for stage in stages)
    for old, new in changes.values():
        assert old in text
        text = text.replace(old, new)
    (tmp_path / "constants.csv").write_text(
        "constituent,amplitude_m,phase_deg\nM2,1.4,40\nS2,0.4,80\nM4,0.1,15\n", encoding="utf-8"
    )
    path = tmp_path / "plan.toml"
    path.write_text(text, encoding="utf-8")
    return read_plan(path, pipeline.plan_choices())


WHOLE = ({"name": "a", "start": "2027-04-01T00:00:00Z", "end": "2027-04-21T00:00:00Z"},)
SPLIT = (
    {"name": "a", "start": "2027-04-01T00:00:00Z", "end": "2027-04-11T05:37:00Z"},
    {"name": "b", "start": "2027-04-11T05:37:00Z", "end": "2027-04-21T00:00:00Z"},
)


def final_depths(results):
    return {
        (place.place.side, rule): place.rows[-1].chain[position].end_depth_m
        for place in results.places
        for position, rule in enumerate(("integral", "flow-mean", "cycle-mean"))
    }


def test_splitting_a_stage_changes_no_depth_under_the_integral_and_little_under_the_means(tmp_path):
    whole = final_depths(pipeline.run(small_plan(tmp_path, *WHOLE)))
    split = final_depths(pipeline.run(small_plan(tmp_path, *SPLIT)))
    for side in ("sea", "basin"):
        assert split[side, "integral"] == pytest.approx(whole[side, "integral"], abs=1e-6)
        # A mean taken over a cut tide is another mean: the size of the change is all that can be held.
        for rule in ("flow-mean", "cycle-mean"):
            assert split[side, rule] == pytest.approx(whole[side, rule], rel=0.05)
    assert split["basin", "cycle-mean"] != whole["basin", "cycle-mean"]


def test_splitting_a_stage_whose_alpha_and_threshold_are_computed_changes_little(tmp_path):
    computed = {
        "alpha": ("alpha = 2.4\n", "chezy_m05_s = 40.0\n"),
        "bed": ("critical_velocity_m_s = 0.42", "d50_mm = 0.25"),
    }
    whole = final_depths(pipeline.run(small_plan(tmp_path, *WHOLE, **computed)))
    split = final_depths(pipeline.run(small_plan(tmp_path, *SPLIT, **computed)))
    # h0_ref is a mean over the stage, so that two halves have two of them.
    for side in ("sea", "basin"):
        assert split[side, "integral"] == pytest.approx(whole[side, "integral"], rel=2e-3)


LAWED = """[scour]
law = "{law}"
{numbers}
[[bed.layer]]
name = "clay"
top_level_m = -11.2
critical_velocity_m_s = 0.7
[protection.basin]
growth_factor = 1.3
"""


def power_depth(law, row):
    """Return the depth of the law's power part at a row's reference and effective duration."""
    excess = row["alpha"] * row["reference_velocity_m_s"] - row["critical_velocity_m_s"]
    strength = law["coefficient_m_s_h"] * excess ** law["velocity_exponent"]
    strength *= row["reference_depth_m"] ** law["depth_exponent"]
    return strength * row["effective_duration_h"] ** law["time_exponent"]


def saturated_depth(row, power, form):
    depth, final = row["reference_depth_m"], row[f"equilibrium_depth_{form}_m"]
    bending = -(final / depth) * np.log(1.0 - depth / final) if final > depth else 1.0
    return final * (1.0 - np.exp(-bending * power / final))


def curved_depth(row, power, law):
    times, depths = (np.array([each[key] for each in law["curve"]]) for key in law["curve"][0])
    time_over_t1 = (power / row["reference_depth_m"]) ** (1.0 / law["time_exponent"])
    if time_over_t1 < times[0]:
        return row["reference_depth_m"] * depths[0] * (time_over_t1 / times[0]) ** law["time_exponent"]
    return row["reference_depth_m"] * np.exp(np.interp(np.log(time_over_t1), np.log(times), np.log(depths)))


@pytest.mark.parametrize(
    ("law", "numbers"),
    [
        ("explicit", ""),
        ("time-scale", "time_constant = 250.0\ntime_exponent = 0.38"),
        ("saturating", ""),
        ("saturating", 'equilibrium = "turbulence"'),
        ("model-curve", 'curve_file = "curve.csv"\ncurve_source = "invented"'),
    ],
)
def test_every_law_gives_each_row_back_from_the_hand_off_alone(tmp_path, law, numbers):
    curve = "time_over_t1,depth_over_water_depth\n0.0001,0.03\n0.01,0.2\n1,1\n20,2.2\n"
    (tmp_path / "curve.csv").write_text(curve, encoding="utf-8")
    stages = (
        {"name": "a", "start": "2027-04-01T00:00:00Z", "end": "2027-04-05T00:00:00Z"},
        {"name": "b", "start": "2027-04-05T00:00:00Z", "end": "2027-04-08T00:00:00Z", "crest": -5.5},
    )
    plan = small_plan(tmp_path, *stages, law=("[protection.basin]\n", LAWED.format(law=law, numbers=numbers)))
    document = handoff_document(pipeline.run(plan), {})
    told = document["law"]
    assert (told["name"], told["shape"]) == (law, law if law in ("saturating", "model-curve") else "power")
    assert {row["bed_layer"] for row in document["durations"]} == {"surface", "clay"}
    for row in document["durations"]:
        power = power_depth(told, row)
        if told["shape"] == "saturating":
            depth = saturated_depth(row, power, told["equilibrium"].replace("-", "_"))
        else:
            depth = curved_depth(row, power, told) if told["curve"] else power
        assert row["stage_depth_m"] == pytest.approx(row["growth_factor"] * depth, rel=1e-9)
        assert row["growth_factor"] == (1.3 if row["side"] == "basin" else 1.0)


def test_halving_the_step_moves_no_duration_by_half_a_percent(tmp_path):
    plan = small_plan(tmp_path, {**WHOLE[0], "more": "crest_level_end_m = -4.0\n"})
    table = fit_from_table(("M2", "S2", "M4"), np.array([1.4, 0.4, 0.1]), np.array([40.0, 80.0, 15.0]), 0.1, 54.0)
    law = LAWS["explicit"].function(1.6)
    found = []
    for longest_step_s in (60.0, 30.0):
        flow = stage_flow(plan.stage[0], plan.basin, Waters(sea_fit=table, series={}), 0.4, longest_step_s)
        cycles = stage_cycles(flow, flow.openings[0])
        for place in places(plan):
            bed = bed_history(plan.stage[0], flow, flow.openings[0], place, plan.bed, plan.water)
            row = effective_duration(bed, cycles, law, 1.5)
            found.append([row.integral_h.sum(), row.flow_mean_h.sum(), row.cycle_mean_h.sum(), row.peak_velocity_m_s])
    coarse, fine = np.array(found[:2]), np.array(found[2:])
    np.testing.assert_allclose(coarse[:, :3], fine[:, :3], rtol=5e-3)
    np.testing.assert_allclose(coarse[:, 3], fine[:, 3], rtol=1e-3)


def test_the_depth_does_not_depend_on_the_reference(tmp_path):
    own = final_depths(pipeline.run(small_plan(tmp_path, *WHOLE)))
    plan = small_plan(tmp_path, *WHOLE)
    given = plan.model_copy(update={"scour": plan.scour.model_copy(update={"reference_velocity_m_s": 0.9})})
    results = pipeline.run(given)
    assert final_depths(results) == pytest.approx(own, rel=1e-9)
    assert {row.duration.reference_velocity_m_s for place in results.places for row in place.rows} == {0.9}


def test_the_required_length_is_the_slope_times_the_depth_behind_it(tmp_path):
    plan = small_plan(
        tmp_path,
        {**WHOLE[0], "crest": -8.0},
        alpha=("alpha = 2.4\n", "chezy_m05_s = 40.0\n"),
    )
    for result in pipeline.run(plan).places:
        length = result.required.length_m
        assert not result.required.governed_by_minimum
        assert length == pytest.approx(8.0 * result.required.final_depth_m, rel=1e-6)
        again = plan.model_copy(
            update={
                "protection": plan.protection.model_copy(
                    update={
                        result.place.side: getattr(plan.protection, result.place.side).model_copy(
                            update={"length_m": length}
                        )
                    }
                )
            }
        )
        same = next(r for r in pipeline.run(again).places if r.place.side == result.place.side)
        assert same.rows[-1].chain[0].end_depth_m == pytest.approx(result.required.final_depth_m, rel=1e-9)


def test_a_hole_that_is_there_grows_on(tmp_path):
    plan = small_plan(tmp_path, *WHOLE, deep=("alpha = 2.4\n", "alpha = 2.4\nstart_depth_m = 3.0\n"))
    for result in pipeline.run(plan).places:
        step = result.rows[0].chain[0]
        assert step.start_depth_m == 3.0
        assert step.end_depth_m == pytest.approx((3.0**2.5 + step.stage_depth_m**2.5) ** 0.4, rel=1e-9)


def test_findings_are_told_once(tmp_path):
    findings = pipeline.run(small_plan(tmp_path, *SPLIT)).findings
    assert len(findings) == len(set(findings))


def test_the_inputs_of_a_run_are_not_touched(tmp_path):
    plan = small_plan(tmp_path, *WHOLE)
    before = plan.model_dump_json()
    results = pipeline.run(plan)
    assert plan.model_dump_json() == before
    assert replace(results, findings=()).flows is results.flows
    with pytest.raises(ValueError, match="read-only"):
        results.flows[0].level_sea_m[0] = 0.0


APART = (
    {"name": "a", "start": "2027-04-01T00:00:00Z", "end": "2027-04-05T00:00:00Z"},
    {"name": "b", "start": "2027-04-06T00:00:00Z", "end": "2027-04-10T00:00:00Z"},
)


def test_a_routed_stage_apart_from_the_one_before_starts_anew(tmp_path):
    results = pipeline.run(small_plan(tmp_path, *APART))
    alone = pipeline.run(small_plan(tmp_path, APART[1], start=("start_level_m = 0.4\n", "")))
    assert results.flows[0].level_basin_m[0] == 0.4
    np.testing.assert_array_equal(results.flows[1].level_basin_m, alone.flows[0].level_basin_m)
    assert [f.code for f in results.findings if f.severity == "warning"] == ["tide-only", "gap-between-stages"]


def test_the_length_follows_the_rule_that_drives(tmp_path):
    computed = {"alpha": ("alpha = 2.4\n", "chezy_m05_s = 40.0\n")}
    plan = small_plan(tmp_path, {**WHOLE[0], "crest": -8.0}, **computed)
    gentle = plan.model_copy(update={"scour": plan.scour.model_copy(update={"tide": "cycle-mean"})})
    for strict, mean in zip(pipeline.run(plan).places, pipeline.run(gentle).places, strict=True):
        assert mean.required.length_m < strict.required.length_m
        assert mean.required.length_m in (
            pytest.approx(8.0 * mean.required.final_depth_m, rel=1e-6),
            mean.required.minimum_m,
        )


def write_short_record(tmp_path):
    rows = [
        f"2027-03-{28 + day:02d}T{hour:02d}:00:00Z,{0.5 * np.sin(hour / 2.0):.3f}"
        for day in range(4)
        for hour in range(24)
    ]
    for day in range(1, 4):
        rows += [f"2027-04-{day:02d}T{hour:02d}:00:00Z,{0.5 * np.sin(hour / 2.0):.3f}" for hour in range(24)]
    (tmp_path / "sea.csv").write_text("time,level_m\n" + "\n".join(rows) + "\n", encoding="utf-8")


def test_a_table_of_constants_serves_beside_a_sea_record_too_short_for_a_fit(tmp_path):
    write_short_record(tmp_path)
    stages = (
        {"name": "a", "start": "2027-04-01T00:00:00Z", "end": "2027-04-03T00:00:00Z"},
        {"name": "b", "start": "2027-04-03T00:00:00Z", "end": "2027-04-05T00:00:00Z"},
    )
    plan = small_plan(
        tmp_path,
        *stages,
        record=("[tide]", '[records.sea]\nfiles = ["sea.csv"]\nunit = "m"\n[tide]'),
        measured=('name = "a"\n', 'name = "a"\nsea = "measured"\n'),
    )
    results = pipeline.run(plan)
    assert [fit.source for fit in results.fits] == ["table"]
    assert results.flows[0].measured
    assert not results.flows[1].measured


def test_a_peak_inside_a_hole_is_no_peak(tmp_path):
    flow = pipeline.run(small_plan(tmp_path, *WHOLE)).flows[0]
    velocity = flow.openings[0].gap_velocity_m_s
    highest = int(np.argmax(velocity))
    covered = np.ones(velocity.size, dtype=bool)
    covered[highest - 100 : highest + 100] = False
    visit = of_place.Visit(
        stage=None,
        flow=replace(flow, covered=covered),
        opening=flow.openings[0],
        cycles=CycleSet(start_s=[0], end_s=[1]),
    )
    assert of_place.peak_gap_velocity(visit, "basin") == np.max(velocity[covered]) < velocity[highest]


def test_results_of_a_plan_with_absolute_paths_tell_nothing_of_the_machine(tmp_path):
    here = tmp_path.as_posix()
    write_short_record(tmp_path)
    plan = small_plan(
        tmp_path,
        {"name": "a", "start": "2027-04-01T00:00:00Z", "end": "2027-04-03T00:00:00Z"},
        record=("[tide]", f'[records.sea]\nfiles = ["{here}/sea*.csv"]\nunit = "m"\n[tide]'),
        constants=('"constants.csv"', f'"{here}/constants.csv"'),
        measured=('name = "a"\n', 'name = "a"\nsea = "measured"\n'),
    )
    folder = tmp_path / "out"
    assert exit_code(["run", "--no-figures", "--quiet", str(plan.file), "--out", str(folder)]) == 0
    handoff = (folder / "handoff.json").read_text(encoding="utf-8")
    assert here not in handoff
    assert '"file": "sea.csv"' in handoff
    assert '"file": "constants.csv"' in handoff
