"""Random plans from text to required length: a result that holds, or a refusal that says where and why."""

import re
from collections import Counter
from datetime import UTC, datetime, timedelta
from types import SimpleNamespace

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tidescour import pipeline
from tidescour.errors import TidescourError
from tidescour.pipeline.places import place_result, rows_at, surface_beds
from tidescour.pipeline.preparing import cases_of, prepared, stage_flows
from tidescour.pipeline.sensitivity import sensitivities
from tidescour.plan.loader import read_plan
from tidescour.scour.chain import final_depth
from tidescour.scour.laws import LAWS
from tidescour.scour.length import chained

START = datetime(2027, 4, 1, tzinfo=UTC)
SERIES_STEP_S = 600.0
M2_S = 44714.0
CURVE = "time_over_t1,depth_over_water_depth\n0.001,0.08\n0.05,0.4\n1,1\n10,1.7\n"

OF_A_PLACE = {
    "bed dry": "the bed at the end of the protection is dry",
    "bed over the mean level": "over the mean level, so that scour has no reference depth",
    "alpha outside the formula": "alpha cannot be computed",
    "alpha outside the table": "is outside the lengths for which alpha is known",
    "reference under the threshold": "does not pass the critical velocity",
    "reference not deep enough": "has an equilibrium depth of",
}
OF_A_STAGE = {
    "flow over a dry crest": "over a dry crest",
    "no sea before a routed stage": "let this stage start where the one before it ends",
}
"""What a plan here may be refused for, and the words that say it."""


def between(low, high, digits=3):
    return st.floats(low, high).map(lambda value: round(value, digits))


def rarely(mostly, seldom):
    """Draw of the first, and one time in some of the second."""
    return st.integers(0, 14).flatmap(lambda number: seldom if number == 7 else mostly)


def one_of(**choices):
    """Draw one of some keys with its value, or nothing for the key "none"."""
    return st.one_of(
        *(
            st.just({}) if key == "none" else value.map(lambda found, key=key: {key: found})
            for key, value in choices.items()
        )
    )


@st.composite
def side_keys(draw, crests_m):
    """Keys of one side of the protection, behind crests from the lowest to the highest of these."""
    bed = draw(rarely(between(-14.0, -6.0, 1), between(-6.0, -1.0, 1)))
    keys = {
        "bed_level_m": bed,
        "length_m": draw(between(0.0, 160.0, 1)),
        "failure_slope_cot": draw(between(3.0, 20.0, 1)),
        "chezy_m05_s": draw(between(30.0, 70.0, 1)),
    }
    if draw(st.booleans()):
        keys["depth_margin_factor"] = draw(between(1.0, 1.5))
    if draw(st.booleans()):
        keys["growth_factor"] = draw(between(0.5, 2.0))
    if draw(st.booleans()):
        keys["start_depth_m"] = draw(between(0.0, 4.0))
    if draw(st.booleans()):
        keys["local_velocity_factor"] = draw(between(1.0, 1.5))
    if draw(st.booleans()):
        keys["upstream_slope_cot"] = draw(between(1.5, 12.0))
    spreading = draw(st.sampled_from([None, "none", "fixed-rate", "plane-jet"]))
    if spreading:
        keys["spreading"] = spreading
    if spreading:
        # Over that of the whole side, also where it is none.
        keys["widening"] = draw(between(0.01, 0.2)) if spreading == "fixed-rate" else 0.0
    return keys | draw(alpha_keys(bed, keys["length_m"], crests_m))


@st.composite
def alpha_keys(draw, bed_m, length_m, crests_m):
    """Keys that alpha follows from, nearly always inside their evidence."""
    source = draw(st.sampled_from(["formula", "given", "table"]))
    careful = draw(rarely(st.just(True), st.just(False)))
    if source == "table":
        lengths = draw(st.lists(between(5.0, 300.0, 0), min_size=2, max_size=4, unique=True))
        values = draw(st.lists(between(1.6, 4.0), min_size=len(lengths), max_size=len(lengths)))
        inside = round(min(max(length_m, min(lengths)), max(lengths)), 1)
        return {
            "alpha_lengths_m": sorted(lengths),
            "alpha_values": sorted(values, reverse=True),
            "length_m": inside if careful else length_m,
        }
    sill_m = max(crests_m) - bed_m
    if source == "given" or (careful and (min(crests_m) <= bed_m or sill_m > -0.7 * bed_m)):
        return {"alpha": draw(between(1.5, 4.5))}
    return {"length_m": round(max(length_m, 6.0 * sill_m + 1.0), 1)} if careful else {}


@st.composite
def plans(draw, most_stages=3, hours_of_stage=(48, 96)):
    """Everything that a plan and its series are written from."""
    stages = draw(st.integers(1, most_stages))
    names = draw(st.sampled_from([("gap",), ("gap", "shoal")]))
    crests = {name: draw(rarely(between(-9.0, -6.0, 1), between(-11.0, 0.0, 1))) for name in names}
    flows = {name: draw(st.sampled_from(["relation", "discharge", "velocity"])) for name in names}
    routed = "velocity" not in flows.values() and draw(st.integers(0, 5)) == 0
    begin, spans, heights = 0.0, [], list(crests.values())
    for number in range(stages):
        hours = draw(st.integers(*hours_of_stage))
        begin += draw(st.sampled_from([0, 0, 6])) if number else 0
        openings = []
        for name in names:
            raised = draw(between(0.0, 1.0, 1))
            opening = {"name": name, "crest_level_m": crests[name], "width_m": draw(between(40.0, 500.0, 0))}
            if draw(st.booleans()):
                opening["crest_level_end_m"] = crests[name] + raised
            crests[name] += raised
            heights.append(crests[name])
            if draw(st.integers(0, 3)) == 0:
                opening["alpha_basin"] = draw(between(1.5, 4.5))
            opening |= (
                {"relation": "broad-crest", "coefficient": 0.95}
                if flows[name] == "relation"
                else {f"{'end_velocity' if flows[name] == 'velocity' else 'discharge'}_series": f"of {name}"}
            )
            openings.append(opening)
        spans.append((begin, begin + hours, openings))
        begin += hours
    law = draw(st.sampled_from(sorted(LAWS)))
    scour = {"law": law, "tide": draw(st.sampled_from(["integral", "flow-mean", "cycle-mean"]))}
    if law == "saturating":
        scour["equilibrium"] = draw(st.sampled_from(["half-alpha", "turbulence"]))
    if law == "model-curve":
        scour |= {"curve_file": "curve.csv", "curve_source": "flume of the works"}
    if law != "explicit":
        scour |= draw(one_of(none=st.none(), time_exponent=between(0.34, 0.7), time_constant=between(200.0, 500.0)))
    if draw(st.integers(0, 4)) == 0:
        scour["reference_velocity_m_s"] = draw(between(0.2, 3.0))
    bed = draw(one_of(d50_mm=between(0.1, 0.6), critical_velocity_m_s=between(0.2, 0.8)))
    tops = sorted(draw(st.lists(between(-18.0, -4.0, 1), max_size=2, unique=True)), reverse=True)
    layers = [
        {"name": f"layer {number}", "top_level_m": top}
        | draw(one_of(d50_mm=between(0.1, 2.0), critical_velocity_m_s=between(0.2, 3.0)))
        for number, top in enumerate(tops)
    ]
    return SimpleNamespace(
        spans=spans,
        scour=scour,
        bed=bed,
        layers=layers,
        protection={side: draw(side_keys(heights)) for side in ("sea", "basin")},
        own=draw(st.none() | side_keys(heights)) if len(names) == 2 else None,
        flows=flows,
        routed=routed,
        end_h=begin,
        sea_m=draw(between(0.5, 2.5)),
        basin_share=draw(between(0.2, 1.0)),
        lag_s=draw(between(0.0, 9000.0, 0)),
        peak={
            name: draw(rarely(between(0.8, 2.5), between(0.0, 0.8))) * (1500.0 if flows[name] == "discharge" else 1.0)
            for name in names
        },
        residual=draw(between(-0.6, 0.6)),
    )


def toml(value):
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, list):
        return f"[{', '.join(toml(each) for each in value)}]"
    return f"{value!r}"


def table(header, keys):
    return f"{header}\n" + "".join(f"{key} = {toml(value)}\n" for key, value in keys.items())


def written(plan, folder):
    """Write a plan with its series and return its path."""
    time_s = np.arange(-SERIES_STEP_S, plan.end_h * 3600.0 + 2.0 * SERIES_STEP_S, SERIES_STEP_S)
    stamps = [(START + timedelta(seconds=second)).strftime("%Y-%m-%dT%H:%M:%SZ") for second in time_s]
    phase = 2.0 * np.pi * time_s / M2_S
    lag = 2.0 * np.pi * plan.lag_s / M2_S
    series = {
        "sea side": ("level", plan.sea_m * np.sin(phase)),
        "basin side": ("level", plan.sea_m * plan.basin_share * np.sin(phase - lag)),
    }
    for name, kind in plan.flows.items():
        if kind != "relation":
            series[f"of {name}"] = (kind, plan.peak[name] * (np.cos(phase - lag) + plan.residual))
    units = {"level": "m", "discharge": "m3/s", "velocity": "m/s"}
    text = table("[site]", {"name": "gap", "datum": "site datum", "latitude_deg": 52.0})
    for number, (name, (quantity, values)) in enumerate(series.items()):
        rows = "".join(f"{stamp},{value:.6f}\n" for stamp, value in zip(stamps, values, strict=True))
        (folder / f"series{number}.csv").write_text(f"time,value\n{rows}", encoding="utf-8")
        keys = {"file": f"series{number}.csv", "quantity": quantity, "value": "value", "unit": units[quantity]}
        text += table(f'[series."{name}"]', keys)
    (folder / "curve.csv").write_text(CURVE, encoding="utf-8")
    if plan.routed:
        basin = {"level_m": [-4.0, 4.0], "area_m2": [8e6, 1.6e7], "start_level_m": 0.0}
        text += table("[basin]", basin)
    text += table("[bed]", plan.bed) + "".join(table("[[bed.layer]]", layer) for layer in plan.layers)
    for side, keys in plan.protection.items():
        text += table(f"[protection.{side}]", keys)
    if plan.own is not None:
        text += table("[protection.basin.opening.shoal]", plan.own)
    text += table("[scour]", plan.scour)
    for number, (begin, end, openings) in enumerate(plan.spans, start=1):
        text += f'[[stage]]\nname = "stage {number}"\n'
        text += "".join(
            f"{key} = {(START + timedelta(hours=hour)).isoformat()}\n" for key, hour in (("start", begin), ("end", end))
        )
        text += f'sea = "sea side"\nbasin = "{"routed" if plan.routed else "basin side"}"\n'
        text += "".join(table("[[stage.opening]]", opening) for opening in openings)
    path = folder / "plan.toml"
    path.write_text(text, encoding="utf-8")
    return path


def outcome(path):
    """Read a plan and do the steps of a run up to every place: not the larger sea tide, sweep, storms and stone."""
    plan = read_plan(path, pipeline.plan_choices())
    ready = prepared(plan)
    cases = cases_of(plan, ready.law, stage_flows(plan, ready.waters, pipeline.silent))
    beds = surface_beds(cases)
    results = [place_result(case, beds[case.place.opening, case.place.side]) for case in cases]
    return list(zip(cases, results, strict=True)), ready.submerged_relative_density


def check_refusal(error):
    """Every line of a refusal names its stage, the opening and side if it is of a place, and a reason; return these."""
    found = []
    for line in str(error).splitlines():
        of_place = re.match(r"stage 'stage \d', opening '(gap|shoal)', (sea|basin) side(, layer '[^']*')?: ", line)
        assert of_place or re.match(r"stage 'stage \d'(, opening '(gap|shoal)')?: ", line), line
        reasons = OF_A_PLACE if of_place else OF_A_STAGE
        (reason,) = [name for name, words in reasons.items() if words in line]
        found.append(reason)
    return found


def check_place(case, result, scanned):
    """Check depth and required length of one place against a plain scan over so many lengths."""
    place, required = result.place, result.required
    rule = case.plan.scour.tide

    def needed(length_m):
        steps = chained(place, rows_at(case, length_m), case.law, rule)
        return place.failure_slope_cot * place.depth_margin_factor * final_depth(steps, place.start_depth_m)

    length, least = required.length_m, required.minimum_m
    wanted = place.failure_slope_cot * place.depth_margin_factor * required.final_depth_m
    assert np.isfinite([length, least, required.final_depth_m]).all()
    assert length >= least >= 0.0
    assert required.final_depth_m >= place.start_depth_m >= 0.0
    notes = [finding.code for finding in required.findings]
    assert ("minimum-length" in notes) == required.governed_by_minimum == (length == least)
    assert ("protection-too-short" in notes) == (length > place.length_m)
    scan = np.concatenate(
        [np.geomspace(max(least, 1.0), max(3.0 * length, 50.0), scanned), [length * 0.98, length * 1.02]]
    )
    surplus = {at: at - needed(at) for at in scan.tolist() if at >= least}
    if required.governed_by_minimum:
        assert wanted <= least + 1e-6
    elif case.plan.scour.law != "saturating":
        assert length == pytest.approx(wanted, rel=1e-6, abs=1e-5)
    else:
        # The form jumps where its equilibrium is as deep as the water: there the length is that of the jump.
        assert length + 1e-4 >= needed(length + 1e-4) - 1e-3
        assert length - 1e-4 <= needed(length - 1e-4) + 1e-3
    if case.plan.scour.law != "saturating":
        assert all(more >= -1e-5 for at, more in surplus.items() if at > length)
        assert all(more <= 1e-5 for at, more in surplus.items() if at < length)
    for row in result.rows:
        assert all(np.isfinite(row.step(each).end_depth_m) for each in ("integral", "flow-mean", "cycle-mean"))
    assert np.all(np.diff(result.growth_depth_m) >= 0.0)
    # Where nothing moves behind that length the hole stays as it was.
    if np.isnan(required.alpha):
        assert required.final_depth_m == place.start_depth_m


def check(plan, folder, counted, scanned=9):
    """Run one plan, check what comes of it, and count it; without a scan only what is cheap."""
    path = written(plan, folder)
    try:
        results, density = outcome(path)
    except TidescourError as error:
        counted.update(f"refused: {reason}" for reason in set(check_refusal(error)))
        counted["refused"] += 1
        return
    counted["result"] += 1
    for case, result in results:
        check_place(case, result, scanned)
        counted["place by the minimum" if result.required.governed_by_minimum else "place by the slope"] += 1
        counted["place that digs"] += any(row.step("integral").share > 0.0 for row in result.rows)
    # What each input is worth never ends a run.
    case, result = results[0]
    for each in sensitivities(case, result, density) if scanned else ():
        assert np.isfinite([each.depth_change_m, each.length_change_m]).all() or each.why_empty


@pytest.fixture(scope="session")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("random")


STEADY = {"deadline": None, "suppress_health_check": [HealthCheck.too_slow, HealthCheck.data_too_large]}


@given(plans(most_stages=2, hours_of_stage=(26, 40)))
@settings(max_examples=60, **STEADY)
def test_every_plan_gives_a_length_or_says_why_not(folder, plan):
    check(plan, folder, Counter(), scanned=0)


@pytest.mark.slow
def test_a_thousand_plans_give_a_length_or_say_why_not(folder):
    counted = Counter()

    @given(plans())
    @settings(max_examples=1000, **STEADY)
    def check_each(plan):
        check(plan, folder, counted)

    check_each()
    assert counted["result"] > 500
    assert counted["refused"] > 50
    print(dict(sorted(counted.items())))


def told(job):
    """Return what a job gives, or the text of its refusal."""
    try:
        return job()
    except TidescourError as error:
        return str(error)


@pytest.mark.slow
def test_the_whole_run_has_the_same_places_or_the_same_refusal(folder):
    @given(plans())
    @settings(max_examples=40, **STEADY)
    def check_each(plan):
        path = written(plan, folder)
        whole, steps = told(lambda: pipeline.run(read_plan(path, pipeline.plan_choices()))), told(lambda: outcome(path))
        if isinstance(steps, str):
            assert whole == steps
        else:
            wanted = [result.required.length_m for _, result in steps[0]]
            assert [place.required.length_m for place in whole.places] == wanted

    check_each()
