"""What is told where a hole meets layers, the ends of its law, or the depth at which the works stop."""

from dataclasses import replace

import pytest

from tidescour.bed.layers import BedLayers
from tidescour.plan.models_bed import BedLayer
from tidescour.scour.chain import chain_place
from tidescour.scour.law_findings import law_findings, layer_findings, stop_findings
from tidescour.scour.laws import LAWS
from tidescour.scour.records import GrowthCurve, RowDurations

H0 = 12.0
LAW = LAWS["explicit"].function(1.65)


def told(rows, law, start_depth_m=0.0):
    return law_findings(rows, chain_place(rows, law, start_depth_m, "integral"), law)


def by_equilibrium(duration_row, law, *ratios):
    return [
        duration_row(law, 1.2, 5.0, depth=H0, stage=f"{ratio:g}", start=1e6 * at, scale=ratio * H0)
        for at, ratio in enumerate(ratios)
    ]


@pytest.mark.parametrize("ratio", [0.0, 0.5, 1.5, 2.0])
def test_an_equilibrium_depth_near_the_jump_is_told(duration_row, law_of, ratio):
    law = law_of("saturating")
    (finding,) = told(by_equilibrium(duration_row, law, 3.0, ratio, 2.5), law)
    assert (finding.severity, finding.code) == ("warning", "small-equilibrium")
    assert finding.where == "opening 'main gap', basin side"
    assert "in 1 of 3 stages" in finding.message
    assert f"least in '{ratio:g}' with {ratio * H0:.2f} m in 12.00 m of water" in finding.message


def test_the_least_of_the_small_equilibria_is_named_and_a_large_one_is_no_matter(duration_row, law_of):
    law = law_of("saturating")
    (finding,) = told(by_equilibrium(duration_row, law, 1.5, 0.5, 1.9), law)
    assert "in 3 of 3 stages" in finding.message
    assert "least in '0.5' with 6.00 m" in finding.message
    assert told(by_equilibrium(duration_row, law, 3.0, 2.01), law) == ()
    # Under the threshold nothing moves, whatever its equilibrium.
    assert told([duration_row(law, 0.1, 5.0, scale=0.0)], law) == ()
    # A power law has none.
    assert told(by_equilibrium(duration_row, LAW, 0.5), LAW) == ()


def test_a_hole_beyond_the_curve_of_the_model_is_told(duration_row, law_of):
    # The model's curve ends at 1.9 times the water depth.
    law = law_of("model-curve")
    rows = [
        duration_row(law, 1.2, 1e-6, depth=depth, stage=name, scale=depth) for name, depth in (("a", 12), ("b", 11))
    ]
    (finding,) = told(rows, law, 1.95 * H0)
    assert (finding.severity, finding.code) == ("warning", "beyond-model-curve")
    # 1.95 x 12 / 11.
    assert "becomes 2.13 times as deep as the water in stage 'b'" in finding.message
    assert "curve ends at 1.90" in finding.message
    assert told(rows[:1], law, 1.85 * H0) == ()
    still = [replace(row, layers=(replace(row.layers[0], growth_rate=0.0),)) for row in rows]
    assert told(still, law, 1.95 * H0) == ()


def test_a_layer_that_is_met_has_its_own_threshold_and_that_of_the_layer_over_it(duration_row):
    criticals = (0.42, 0.61, 0.35)
    row = RowDurations(
        layers=tuple(duration_row(LAW, 1.2, 400.0, critical=each).layers[0] for each in criticals),
        top_depth_m=(0.0, 0.5, 1.5),
    )
    steps = chain_place([row], LAW, 0.0, "integral")
    layers = BedLayers(
        top_depth_m=(0.0, 0.5, 1.5),
        layers=(None, *(BedLayer(name=name, top_level_m=-10.0, d50_mm=1.0) for name in ("shells", "sand"))),
    )
    found = layer_findings([row], steps, layers)
    assert {(each.severity, each.code, each.where) for each in found} == {
        ("note", "layer-reached", "stage 'sill', opening 'main gap', basin side")
    }
    shells, sand = (each.message for each in found)
    assert shells.startswith("the hole reaches layer 'shells' at 0.50 m below the original bed at 1970-01-")
    assert shells.endswith("its critical velocity of 0.610 m/s counts from then on, instead of 0.420 m/s")
    assert sand.startswith("the hole reaches layer 'sand' at 1.50 m")
    assert sand.endswith("its critical velocity of 0.350 m/s counts from then on, instead of 0.610 m/s")


def test_the_day_on_which_the_works_stop_is_told(place):
    # From 3 m at midnight to 5 m at noon: 4 m at six.
    begin_s = 1_806_537_600.0
    curve = GrowthCurve(
        time_s=[begin_s, begin_s + 43200.0, begin_s + 86400.0],
        depth_m=[3.0, 5.0, 5.5],
        stage=("sill",) * 3,
    )
    (finding,) = stop_findings(place(stop_depth_m=4.0), curve, 5.5)
    assert (finding.severity, finding.code) == ("warning", "stop-in-programme")
    assert "reaches stop_depth_m = 4 at 2027-04-01T06:00:00Z and ends the programme 5.50 m deep" in finding.message
    assert stop_findings(place(stop_depth_m=5.51), curve, 5.5) == ()
    assert stop_findings(place(), curve, 5.5) == ()
