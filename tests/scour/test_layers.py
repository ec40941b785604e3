"""Growth through layers of the bed."""

from itertools import pairwise

import numpy as np
import pytest

from tidescour.errors import DomainError
from tidescour.scour.chain import chain_place, growth_curve
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS
from tidescour.scour.records import RULES, CycleSet, RowDurations

HOUR = 3600.0
TIDE = 12.42 * HOUR
LAW = LAWS["explicit"].function(1.65)


@pytest.fixture
def layered(bed_row):
    """A row in layers, each with its critical velocity, of some tides from a time on."""

    def build(law, criticals, tops, peak=1.5, tides=20, start=0.0, cycles_h=12.42):
        time = start + np.arange(0.0, tides * TIDE + 36.0, 72.0)
        velocity = peak * np.sin(2.0 * np.pi * (time - start) / TIDE)
        edges = start + np.arange(0.0, time[-1] - start + 1.0, cycles_h * HOUR)
        cycles = CycleSet(start_s=edges[:-1], end_s=edges[1:])
        layers = [
            effective_duration(bed_row(time, velocity, critical=critical), cycles, law, None) for critical in criticals
        ]
        return RowDurations(layers=tuple(layers), top_depth_m=tuple(tops))

    return build


def test_two_layers_against_a_plain_integration(layered):
    # Own loop over minutes: dS = (c E^1.7 h0^0.2)^2.5 dt with u_c of the layer in which the hole ends; h = S^0.4. Where
    # a cycle is cut the package shares its hours in proportion, so that cycles of an hour come near the loop.
    row = layered(LAW, (0.45, 1.2), (0.0, 2.0), cycles_h=1.0)
    (step,) = chain_place([row], LAW, 0.0, "integral")
    time = np.arange(0.0, row.cycles.end_s[-1], 60.0) + 30.0
    velocity = np.maximum(1.5 * np.sin(2.0 * np.pi * time / TIDE), 0.0)
    state, met = 0.0, np.nan
    for moment, speed in zip(time, velocity, strict=True):
        below = state**0.4 >= 2.0
        if below and np.isnan(met):
            met = moment
        excess = max(2.5 * speed - (1.2 if below else 0.45), 0.0)
        state += (0.1 * 1.65**-0.7 * excess**1.7 * 10.0**0.2) ** 2.5 / 60.0
    assert step.end_depth_m == pytest.approx(state**0.4, rel=2e-3)
    (reached,) = step.reached
    assert (reached.layer, reached.depth_m) == (1, 2.0)
    assert reached.time_s == pytest.approx(met, abs=0.25 * HOUR)
    # Each layer alone would give another depth altogether.
    alone = [chain_place([layered(LAW, (critical,), (0.0,))], LAW, 0.0, "integral")[0] for critical in (0.45, 1.2)]
    assert alone[1].end_depth_m < 0.95 * step.end_depth_m < 0.95 * alone[0].end_depth_m


@pytest.mark.parametrize("name", LAWS)
@pytest.mark.parametrize("factor", [1.0, 1.3])
def test_a_layer_of_the_same_sand_changes_nothing(layered, law_of, name, factor):
    law = law_of(name, 1.65)
    plain = layered(law, (0.45,), (0.0,))
    layers = layered(law, (0.45, 0.45, 0.45), (0.0, 0.9, 2.3))
    for rule in RULES:
        one, other = (chain_place([row], law, 0.2, rule, factor)[0] for row in (plain, layers))
        assert other.end_depth_m == pytest.approx(one.end_depth_m, rel=1e-11)
        np.testing.assert_allclose(
            growth_curve([layers], law, 0.2, rule, factor).depth_m,
            growth_curve([plain], law, 0.2, rule, factor).depth_m,
            rtol=1e-11,
        )
    assert [reached.layer for reached in chain_place([layers], law, 0.2, "integral", factor)[0].reached] == [1, 2]


@pytest.mark.parametrize("name", LAWS)
@pytest.mark.parametrize("factor", [1.0, 0.94, 1.27, 1.75])
def test_a_layer_that_does_not_move_stops_the_hole_at_its_top(layered, law_of, name, factor):
    law = law_of(name, 1.65)
    rows = [
        layered(law, (0.45, 9.0), (0.0, 0.46)),
        # Nothing moves here, in any layer; then all goes on.
        layered(law, (0.45, 9.0), (0.0, 0.46), peak=0.1, start=30.0 * TIDE),
        layered(law, (0.45, 9.0), (0.0, 0.46), start=60.0 * TIDE),
    ]
    steps = chain_place(rows, law, 0.0, "integral", factor)
    assert [step.end_depth_m for step in steps] == [0.46, 0.46, 0.46]
    assert [step.layer for step in steps] == [0, 1, 1]
    assert [len(step.reached) for step in steps] == [1, 0, 0]
    assert [step.share for step in steps] == [1.0, 0.0, 0.0]


def test_a_weaker_layer_under_a_stronger_one_is_dug_once_it_is_met(layered):
    held = chain_place([layered(LAW, (1.0,), (0.0,))], LAW, 0.0, "integral")[0].end_depth_m
    top = 0.8 * held
    found = chain_place([layered(LAW, (1.0, 0.3), (0.0, top))], LAW, 0.0, "integral")[0]
    assert found.end_depth_m > held
    assert [reached.depth_m for reached in found.reached] == [top]
    # A hole that is there already has met it.
    deep = chain_place([layered(LAW, (1.0, 0.3), (0.0, top))], LAW, top, "integral")[0]
    assert (deep.layer, deep.reached) == (1, ())


def test_layers_are_met_in_the_order_of_time(layered):
    row = layered(LAW, (0.3, 0.5, 0.4, 0.8), (0.0, 0.5, 1.0, 2.0))
    (step,) = chain_place([row], LAW, 0.0, "integral")
    assert [reached.layer for reached in step.reached] == [1, 2, 3]
    assert all(before.time_s < after.time_s for before, after in pairwise(step.reached))
    curve = growth_curve([row], LAW, 0.0, "integral")
    for reached in step.reached:
        # The curve is linear between ends of cycles; the moment lies in the cycle in which it passes the top.
        at = int(np.searchsorted(curve.time_s, reached.time_s))
        assert curve.depth_m[at - 1] < reached.depth_m <= curve.depth_m[at]


@pytest.mark.parametrize("name", ["explicit", "time-scale"])
def test_a_layered_stage_cut_in_two_digs_as_deep(layered, law_of, name):
    law = law_of(name, 1.65)
    whole = layered(law, (0.45, 0.9, 0.3), (0.0, 0.8, 1.9), tides=20)
    # Cut at the end of a cycle: the hours of a cycle that meets a layer are shared in proportion.
    parts = [
        layered(law, (0.45, 0.9, 0.3), (0.0, 0.8, 1.9), tides=tides, start=start * TIDE)
        for tides, start in ((7, 0), (13, 7))
    ]
    for rule in ("integral", "flow-mean", "cycle-mean"):
        one, two = (chain_place(rows, law, 0.1, rule) for rows in ([whole], parts))
        assert two[-1].end_depth_m == pytest.approx(one[-1].end_depth_m, rel=1e-9)
        assert sum(len(step.reached) for step in two) == len(one[0].reached)


def test_layers_that_do_not_lie_under_each_other_are_refused(layered):
    row = layered(LAW, (0.45, 0.6), (0.0, 1.0), tides=2)
    with pytest.raises(ValueError, match="one under the other"):
        RowDurations(layers=(*row.layers, row.layers[0]), top_depth_m=(0.0, 1.0, 1.0))
    with pytest.raises(ValueError, match="the surface 0"):
        RowDurations(layers=row.layers, top_depth_m=(0.5, 1.0))
    with pytest.raises(DomainError, match="must not be negative"):
        chain_place([row], LAW, -0.1, "integral")
