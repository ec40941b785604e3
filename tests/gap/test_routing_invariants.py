"""What holds for the routed basin whatever its openings: every relation, any section, any storage."""

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from tidescour.gap.openings import opening_set
from tidescour.gap.relations import RELATIONS
from tidescour.gap.routing import GAMMA, Forcing, basin_levels
from tidescour.gap.storage import largest_area, storage_from_area, storage_from_volume, stored_volumes
from tidescour.plan.models import Opening

GRAVITY = 9.81
VISIBLE_M = 1e-4
"""A step that would carry the basin past the level it tends to by more than this is taken again."""

EXAMPLE = {
    "broad-crest": {"coefficient": 0.95},
    "narrow-crest": {"coefficient": 1.08},
    "open-gap": {"coefficient": 0.9, "channel_area_sea_m2": 4e5, "channel_area_basin_m2": 4e5},
    "orifice": {"height_m": 2.5, "coefficient": 0.9},
    "culvert": {"height_m": 2.5, "length_m": 40.0, "manning_s_m13": 0.014},
    "ebb-flap": {"height_m": 2.5, "coefficient": 0.8, "opening_head_m": 0.05},
    "flood-flap": {"height_m": 2.5, "coefficient": 0.8, "opening_head_m": 0.05},
    "rubble-dam": {"porosity": 0.4, "stone_m": 0.6, "length_m": 25.0},
}


def tide(times):
    return 1.5 * np.sin(1.405e-4 * times) + 0.4 * np.sin(2.0 * np.pi / 43200.0 * times) + 0.1 * np.sin(2.81e-4 * times)


def constant(times):
    return np.full_like(times, 0.4)


def drive(openings, sea, step, steps, inflow=0.0):
    """Return the forcing of openings, some with a sea level of their own about zero."""
    times = np.arange(steps + 1) * step
    own = [each for each in openings if each.sea_lag_s != 0.0 or each.sea_factor != 1.0 or each.sea_shift_m != 0.0]

    def levels(instants):
        rows = [sea(instants)]
        rows += [each.sea_factor * sea(instants - each.sea_lag_s) + each.sea_shift_m for each in own]
        return np.ascontiguousarray(np.column_stack(rows))

    return Forcing(
        step_s=step,
        sea_level_m=levels(times),
        sea_level_between_m=levels(times[:-1] + GAMMA * step),
        given_discharge_m3_s=np.full(steps + 1, inflow),
        given_discharge_between_m3_s=np.full(steps, inflow),
    )


# Any openings, any basin


@st.composite
def surveyed(draw):
    """Points of a profile: walls, several valleys, one at least a metre wide."""
    count = draw(st.integers(3, 9))
    steps = draw(st.lists(st.sampled_from([0.0, 1.0, 7.5, 40.0]), min_size=count, max_size=count))
    levels = draw(st.lists(st.integers(-16, 4).map(lambda n: 0.5 * n), min_size=count, max_size=count))
    steps[-1] += 1.0
    assume(len(set(levels)) > 1)
    return tuple(zip(np.cumsum(steps).tolist(), levels, strict=True))


@st.composite
def openings(draw, relation=None, own_sea=True):
    name = relation or draw(st.sampled_from(list(RELATIONS)))
    keys = {"name": "gap", "relation": name, "parameters": dict(EXAMPLE[name])}
    if draw(st.booleans()):
        points = draw(surveyed())
        lowest = min(level for _, level in points)
        fills = draw(st.tuples(st.floats(0.0, 3.0), st.floats(0.0, 3.0)))
        keys |= {"profile": "survey.csv", "profile_points": points}
        keys |= {"crest_level_m": lowest + fills[0], "crest_level_end_m": lowest + fills[1]}
    else:
        crests = draw(st.tuples(st.floats(-12.0, 3.0), st.floats(-12.0, 3.0)))
        widths = draw(st.tuples(st.floats(-1.0, 3.0), st.floats(-1.0, 3.0)))
        keys |= {"crest_level_m": crests[0], "crest_level_end_m": crests[1], "side_slope": draw(st.floats(0.0, 8.0))}
        keys |= {"width_m": 10.0 ** widths[0], "width_end_m": 10.0 ** widths[1]}
    if name == "broad-crest":
        approach = {
            f"approach_{key}_{side}_m": value
            for side in draw(st.sampled_from([(), ("sea",), ("sea", "basin")]))
            for key, value in (("width", 5000.0), ("bed", -13.0))
        }
        keys["parameters"] |= approach | draw(st.sampled_from([{}, {"modular_limit": 0.8}]))
    if own_sea and draw(st.booleans()):
        keys |= {"sea_lag_s": draw(st.floats(-3600.0, 3600.0)), "sea_factor": draw(st.floats(0.7, 1.3))}
        keys |= {"sea_shift_m": draw(st.floats(-0.3, 0.3))}
    return Opening.model_validate(keys)


@st.composite
def storages(draw, smallest=4.5):
    """Basins up to 10000 ha, by area or by volume, their flats up to five times as large as their channels."""
    level = np.array([-3.0, -1.0, 0.0, 0.5, 2.0])
    size = 10.0 ** draw(st.floats(smallest, 8.0))
    growth = np.sort(draw(st.lists(st.floats(1.0, 5.0), min_size=5, max_size=5)))
    if draw(st.booleans()):
        return storage_from_area(level, size * growth)
    return storage_from_volume(level, np.concatenate(([0.0], np.cumsum(size * growth[1:] * np.diff(level)))))


steps_s = st.sampled_from([1.0, 60.0, 3600.0])


@given(
    several=st.lists(openings(), min_size=1, max_size=4),
    storage=storages(),
    start=st.floats(-3.0, 3.0),
    inflow=st.sampled_from([0.0, 0.0, 150.0, -20.0]),
    step=steps_s,
)
@settings(max_examples=150, deadline=None)
def test_any_openings_give_levels_that_balance_and_stay_between_those_they_meet(several, storage, start, inflow, step):
    forcing = drive(several, tide, step, 150, inflow)
    routed = basin_levels(opening_set(several), forcing, storage, start)
    level = routed.level_m
    assert np.all(np.isfinite(level))
    change = np.diff(stored_volumes(storage, level[[0, -1]]))[0]
    passed = routed.passed_volume_m3.sum() + routed.given_volume_m3
    assert abs(change - passed) <= 1e-9 * max(np.ptp(level), 1.0) * largest_area(storage)
    # No opening lets water run uphill, so that only an inflow carries the basin over all seas, or its loss under them.
    seas = np.concatenate([forcing.sea_level_m.ravel(), forcing.sea_level_between_m.ravel(), [start]])
    assert inflow > 0.0 or level.max() <= seas.max() + VISIBLE_M
    assert inflow < 0.0 or level.min() >= seas.min() - VISIBLE_M


@given(
    several=st.lists(openings(own_sea=False), min_size=1, max_size=3),
    storage=storages(),
    start=st.floats(-3.0, 3.0),
    step=st.sampled_from([1.0, 60.0]),
)
@settings(max_examples=120, deadline=None)
def test_a_basin_comes_to_a_steady_sea_without_passing_it(several, storage, start, step):
    level = basin_levels(opening_set(several), drive(several, constant, step, 120), storage, start).level_m
    side = np.sign(start - 0.4)
    assert np.all(side * (level - 0.4) >= -VISIBLE_M)
    assert np.all(side * np.diff(level) <= 2.0 * VISIBLE_M)


@given(
    several=st.lists(openings(own_sea=False), min_size=1, max_size=3), storage=storages(), start=st.floats(-2.0, 2.0)
)
@settings(max_examples=80, deadline=None)
def test_the_head_turns_at_most_once_while_the_sea_rises_or_falls(several, storage, start):
    # A basin that has come over a falling sea stays over it: any further turn is chatter of the solver.
    forcing = drive(several, tide, 60.0, 2200)
    sea = forcing.sea_level_m[:, 0]
    head = sea - basin_levels(opening_set(several), forcing, storage, start).level_m
    seen = np.abs(head) > VISIBLE_M
    turns = np.count_nonzero(np.diff(np.sign(head[seen])))
    extremes = np.count_nonzero(np.diff(np.sign(np.diff(sea))))
    assert turns <= extremes + 1


# In a basin that fills within a step the order of two basins is kept only to the error of that step.


@given(relation=st.sampled_from(list(RELATIONS)), data=st.data(), storage=storages(6.5))
@settings(max_examples=80, deadline=None)
def test_a_basin_that_starts_higher_stays_higher(relation, data, storage):
    opening = data.draw(openings(relation))
    low, high = sorted(data.draw(st.tuples(st.floats(-3.0, 3.0), st.floats(-3.0, 3.0))))
    forcing = drive([opening], tide, 60.0, 300)
    levels = [basin_levels(opening_set([opening]), forcing, storage, start).level_m for start in (low, high)]
    assert np.all(levels[1] - levels[0] >= -1e-3)


@pytest.mark.parametrize("relation", [name for name in RELATIONS if "coefficient" in EXAMPLE[name]])
@given(data=st.data(), storage=storages(6.5), factor=st.floats(0.3, 1.0))
@settings(max_examples=25, deadline=None)
def test_a_larger_coefficient_brings_a_basin_nearer_to_a_steady_sea(relation, data, storage, factor):
    larger = data.draw(openings(relation, own_sea=False))
    numbers = larger.parameters | {"coefficient": larger.parameters["coefficient"] * factor}
    smaller = larger.model_copy(update={"parameters": numbers})
    start = data.draw(st.floats(-3.0, 3.0))
    forcing = drive([larger], constant, 60.0, 200)
    near, far = (
        np.abs(basin_levels(opening_set([each]), forcing, storage, start).level_m - 0.4) for each in (larger, smaller)
    )
    assert np.all(near <= far + 1e-3)


MIRRORS = {"orifice": "orifice", "culvert": "culvert", "ebb-flap": "flood-flap", "flood-flap": "ebb-flap"}


@pytest.mark.parametrize("relation", MIRRORS)
@given(start=st.floats(-1.5, 1.5), width=st.floats(1.0, 300.0), area=st.floats(1e5, 1e8))
@settings(max_examples=15, deadline=None)
def test_a_tide_upside_down_gives_a_basin_upside_down_through_a_drowned_opening(relation, start, width, area):
    # The area of a drowned conduit does not know the level; a flap that opens the other way is its mirror.
    def levels(name, sign):
        keys = {"name": "gap", "crest_level_m": -20.0, "width_m": width, "relation": name}
        opening = Opening.model_validate(keys | {"parameters": EXAMPLE[relation]})
        storage = storage_from_area(np.array([0.0]), np.array([area]))
        forcing = drive([opening], lambda times: sign * tide(times), 60.0, 800)
        return basin_levels(opening_set([opening]), forcing, storage, sign * start).level_m

    np.testing.assert_allclose(levels(MIRRORS[relation], -1.0), -levels(relation, 1.0), atol=1e-6)
