import dataclasses
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.bed.stone import STABILITY, izbash_embedded, izbash_exposed, pilarczyk_stone, shields_stone
from tidescour.bed.stone_records import StoneDemand
from tidescour.errors import DomainError

BASE = StoneDemand(
    velocity_m_s=3.0,
    depth_m=8.0,
    turbulence_factor=1.2,
    relative_density=1.58537,
    shields=None,
    stability_factor=0.75,
    slope_factor=1.0,
)
FORMS = sorted(STABILITY)
ROOT_OF_LOG = 18.0 / math.log(10.0)


def demand(**changes):
    return dataclasses.replace(BASE, **changes)


def test_izbash_of_the_check(published):
    for row in published("izbash_1935_stone.csv"):
        asked = demand(velocity_m_s=row["velocity_m_s"], relative_density=row["relative_density"])
        # Half the last digit, and the relative density rounded to 5 decimals.
        assert izbash_embedded(asked) == pytest.approx(row["embedded_m"], abs=7e-6)
        assert izbash_exposed(asked) == pytest.approx(row["exposed_m"], abs=8e-6)


def test_shields_of_the_checks(published):
    for row in published("schiereck_2012_shields_stone.csv"):
        asked = demand(
            velocity_m_s=row["velocity_m_s"],
            depth_m=row["depth_m"],
            turbulence_factor=row["turbulence_factor"],
            relative_density=row["relative_density"],
        )
        assert shields_stone(asked) == pytest.approx(row["size_m"], abs=5.1e-5)


def test_pilarczyk_of_the_checks(published):
    for row in published("pilarczyk_1995_stone.csv"):
        asked = demand(
            velocity_m_s=row["velocity_m_s"],
            depth_m=row["depth_m"],
            turbulence_factor=math.sqrt(row["turbulence_squared"]),
            relative_density=row["relative_density"],
        )
        assert pilarczyk_stone(asked) == pytest.approx(row["size_m"], abs=5.1e-5)


@given(st.floats(1e-4, 0.8), st.floats(0.2, 40.0), st.floats(0.8, 3.0), st.floats(0.4, 3.0), st.floats(0.02, 0.06))
@settings(max_examples=60, deadline=None)
def test_shields_gives_back_the_stone_whose_velocity_it_is_asked_for(share, depth, factor, density, shields):
    size = share * depth
    chezy = 18.0 * math.log10(12.0 * depth / (2.0 * size))
    velocity = chezy * math.sqrt(shields * density * size) / factor
    asked = demand(
        velocity_m_s=velocity, depth_m=depth, turbulence_factor=factor, relative_density=density, shields=shields
    )
    # Near 0.81 of the depth the size changes much for little velocity.
    assert shields_stone(asked) == pytest.approx(size, rel=1e-9 if share < 0.7 else 1e-5)


@given(st.floats(1e-4, 20.0), st.floats(0.2, 40.0), st.floats(0.8, 3.0), st.floats(0.5, 1.5), st.floats(0.5, 1.0))
@settings(max_examples=60, deadline=None)
def test_pilarczyk_gives_back_the_stone_whose_velocity_it_is_asked_for(share, depth, factor, stability, slope):
    size = share * depth
    profile = (1.0 + depth / size) ** -0.2
    strength = BASE.relative_density / stability * (0.05 / 0.035) * slope
    velocity = math.sqrt(2.0 * 9.81 * size * strength / profile) / factor
    asked = demand(
        velocity_m_s=velocity,
        depth_m=depth,
        turbulence_factor=factor,
        shields=0.05,
        stability_factor=stability,
        slope_factor=slope,
    )
    assert pilarczyk_stone(asked) == pytest.approx(size, rel=1e-9)


@pytest.mark.parametrize("form", FORMS)
def test_size_grows_as_velocity_squared_where_the_depth_grows_with_it(form):
    size = STABILITY[form].function
    for k in (0.3, 2.0, 5.0):
        scaled = demand(velocity_m_s=3.0 * k, depth_m=8.0 * k**2)
        assert size(scaled) == pytest.approx(k**2 * size(BASE), rel=1e-9)


@pytest.mark.parametrize("form", FORMS)
def test_velocity_squared_over_relative_density_is_what_counts(form):
    size = STABILITY[form].function
    heavier = demand(velocity_m_s=3.0 * math.sqrt(1.5), relative_density=1.5 * BASE.relative_density)
    assert size(heavier) == pytest.approx(size(BASE), rel=1e-9)


@pytest.mark.parametrize("form", ["shields", "pilarczyk"])
def test_turbulence_counts_as_velocity_and_shallow_water_asks_for_more(form):
    size = STABILITY[form].function
    assert size(demand(turbulence_factor=2.4, velocity_m_s=1.5)) == pytest.approx(size(BASE), rel=1e-9)
    assert size(demand(depth_m=4.0)) > size(BASE) > size(demand(depth_m=16.0))


@pytest.mark.parametrize("form", FORMS)
def test_still_water_asks_for_no_stone_and_nan_passes_through(form):
    size = STABILITY[form].function
    assert size(demand(velocity_m_s=0.0)) == 0.0
    assert math.isnan(size(demand(velocity_m_s=math.nan)))
    if not form.startswith("izbash"):
        assert math.isnan(size(demand(depth_m=math.nan)))
        assert math.isnan(size(demand(turbulence_factor=math.nan)))


def test_shields_has_no_stone_where_the_water_is_too_shallow():
    # The most that it can hold: d C^2 at d = 6 h / e^2, so K_T u = 18 / ln 10 x 2 sqrt(0.03 Delta 6 h) / e.
    most = ROOT_OF_LOG * 2.0 * math.sqrt(0.03 * BASE.relative_density * 6.0 * 0.5) / math.e
    at_most = demand(velocity_m_s=most * (1.0 - 1e-12), depth_m=0.5, turbulence_factor=1.0)
    assert shields_stone(at_most) == pytest.approx(0.5 * 6.0 / math.e**2, rel=1e-4)
    with pytest.raises(DomainError, match=r"water of 0\.5 m is too shallow at .* take Izbash's forms there"):
        shields_stone(dataclasses.replace(at_most, velocity_m_s=most * 1.001))


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"velocity_m_s": -1.0}, "must not be negative"),
        ({"depth_m": 0.0}, "depth_m = 0 must be positive"),
        ({"relative_density": -0.1}, "relative_density = -0.1 must be positive"),
        ({"shields": 0.0}, "shields = 0 must be positive"),
        ({"slope_factor": 0.0}, "slope_factor = 0 must be positive"),
    ],
)
def test_what_no_form_can_take_is_refused(changes, message):
    with pytest.raises(DomainError, match=message):
        demand(**changes)


@pytest.mark.parametrize("form", FORMS)
def test_every_form_says_its_source_its_range_and_which_size_it_gives(form):
    entry = STABILITY[form]
    assert "from memory" in entry.source
    assert entry.validity
    assert "size d" in entry.title or "D_n50" in entry.title
