"""Layers and sections against plain geometry and an independent search for the largest discharge."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError
from tidescour.gap.layers import content_at, extent_at, layers_from_content, layers_from_extent, level_of
from tidescour.gap.section import (
    Section,
    control_level,
    crest_area,
    profile_layers,
    strips_discharge,
    trapezoid_section,
)

GRAVITY = 9.81
levels = st.floats(-5.0, 9.0)


@st.composite
def profiles(draw):
    count = draw(st.integers(2, 12))
    steps = draw(st.lists(st.sampled_from([0.0, 1.0, 7.5, 40.0]), min_size=count, max_size=count))
    heights = draw(st.lists(st.integers(-8, 10).map(lambda n: 0.5 * n), min_size=count, max_size=count))
    distance = np.cumsum(steps)
    distance[-1] += 1.0
    return distance, np.array(heights)


def wet_area(distance, ground, level):
    """Area under water by clipping each straight piece, vertices at the water line added."""
    total = 0.0
    for x0, x1, z0, z1 in zip(distance[:-1], distance[1:], ground[:-1], ground[1:], strict=True):
        low, high = max(level - max(z0, z1), 0.0), max(level - min(z0, z1), 0.0)
        if z0 == z1:
            total += (x1 - x0) * low
        else:
            # Depth runs linearly from `high` to `low` over the wet part of the piece.
            wet = (high - low) / abs(z1 - z0) * (x1 - x0)
            total += 0.5 * (high + low) * wet
    return total


@given(profile=profiles(), level=levels)
@settings(max_examples=300, deadline=None)
def test_the_layers_of_a_profile_hold_its_wet_area(profile, level):
    distance, ground = profile
    layers = profile_layers(distance, ground)
    area = crest_area(level, float(ground.min()), layers)
    assert area == pytest.approx(wet_area(distance, ground, level), rel=1e-10, abs=1e-10)


@given(profile=profiles(), level=levels, rise=st.floats(1e-4, 2.0))
@settings(max_examples=100, deadline=None)
def test_the_extent_of_layers_is_the_growth_of_their_content(profile, level, rise):
    layers = profile_layers(*profile)
    nodes = np.append(layers[:, 0], np.inf)
    k = np.searchsorted(nodes, level, side="right") - 1
    if k < 0 or level + rise >= nodes[k + 1]:
        return
    grown = content_at(level + rise, layers) - content_at(level, layers)
    mean = 0.5 * (extent_at(level, layers) + extent_at(level + rise, layers))
    assert grown == pytest.approx(mean * rise, rel=1e-9, abs=1e-9)


@given(profile=profiles(), downstream=levels, head=st.floats(0.01, 6.0), fill=st.floats(0.0, 2.0))
@settings(max_examples=300, deadline=None)
def test_the_control_section_passes_the_most_of_all_levels(profile, downstream, head, fill):
    distance, ground = profile
    layers = profile_layers(distance, ground)
    crest = float(ground.min()) + fill
    energy = max(downstream, crest) + head
    level = control_level(energy, downstream, crest, layers)
    assert max(downstream, crest) <= level <= energy
    tried = np.linspace(max(downstream, crest), energy, 4001)
    passed = [crest_area(z, crest, layers) * np.sqrt(energy - z) for z in tried]
    best = crest_area(level, crest, layers) * np.sqrt(energy - level)
    assert best >= max(passed) * (1.0 - 1e-9)
    assert best <= max(passed) * (1.0 + 1e-4) + 1e-9


@pytest.mark.parametrize(
    ("width", "slope", "depth"),
    # From H = y + A / (2 T) for H = 3 m, as in any open-channel text: tests/published/energy_minimum_trapezoid.csv.
    [(20.0, 2.0, 2.10384), (100.0, 2.0, 2.02530), (1e-12, 2.0, 2.4), (1.0, 0.0, 2.0)],
)
def test_a_trapezoid_and_its_surveyed_profile_are_critical_at_the_same_depth(width, slope, depth):
    trapezoid = trapezoid_section(0.0, width, slope)
    assert control_level(3.0, -9.0, 0.0, trapezoid.layers) == pytest.approx(depth, rel=1e-5)
    half = 0.5 * width
    across = np.array([-half - 10.0 * slope, -half, half, half + 10.0 * slope])
    surveyed = profile_layers(across, np.array([10.0, 0.0, 0.0, 10.0]))
    assert control_level(3.0, -9.0, 0.0, surveyed) == pytest.approx(depth, rel=1e-5)


def test_of_two_critical_depths_the_one_that_passes_more_is_taken():
    # A gully of 2 m in a flat of 100 m, 2 m higher: with the water just over the flat the gully decides, with more the
    # flat. Values by search over all levels, above.
    gully = profile_layers(
        np.array([0.0, 0.0, 49.0, 49.0, 51.0, 51.0, 100.0, 100.0]), np.array([9.0, 2.0, 2.0, 0.0, 0.0, 2.0, 2.0, 9.0])
    )
    assert control_level(2.05, -9.0, 0.0, gully) == pytest.approx(2.05 * 2.0 / 3.0, rel=1e-12)
    assert control_level(6.0, -9.0, 0.0, gully) > 2.0


@pytest.mark.parametrize(
    ("width", "slope", "strips", "section"),
    # Methods of strips against the section as one, H = 3 m, coefficient 1: triangle 1.36392 against 1.26778 m H^2.5
    # (integral of 1.70489 H^1.5 over the slope against the critical section), trapezoid 219.70 against 213.55 m3/s.
    [(0.0, 2.0, 1.36392 * 2.0 * 3.0**2.5, 1.26778 * 2.0 * 3.0**2.5), (20.0, 2.0, 219.70, 213.55)],
)
def test_strips_pass_more_than_the_section_as_one(width, slope, strips, section):
    across = np.array([0.0, 3.0 * slope, 3.0 * slope + width, 6.0 * slope + width])
    ground = np.array([3.0, 0.0, 0.0, 3.0])
    assert strips_discharge(3.0, across, ground, 0.0) == pytest.approx(strips, rel=2e-4)
    layers = profile_layers(across, ground)
    level = control_level(3.0, -1.0, 0.0, layers)
    whole = crest_area(level, 0.0, layers) * np.sqrt(2.0 * GRAVITY * (3.0 - level))
    assert whole == pytest.approx(section, rel=3e-5)


def test_layers_scale_with_extent_and_invert():
    level, area = np.array([-3.0, 0.0, 3.0]), np.array([1.4e7, 2.0e7, 2.6e7])
    layers, double = layers_from_extent(level, area), layers_from_extent(level, 2.0 * area)
    for z in (-5.0, -3.0, -1.0, 0.0, 2.0, 7.0):
        assert content_at(z, double) == pytest.approx(2.0 * content_at(z, layers), rel=1e-14)
        assert level_of(content_at(z, layers), layers) == pytest.approx(z, abs=1e-9)
    # Trapezoids by hand: 3 m of 1.7e7 m2 on average.
    assert content_at(0.0, layers) == pytest.approx(5.1e7)
    assert content_at(-4.0, layers) == pytest.approx(-1.4e7)
    assert content_at(4.0, layers) == pytest.approx(5.1e7 + 6.9e7 + 2.6e7)


def test_a_content_that_is_linear_between_levels_has_steps_in_its_extent():
    layers = layers_from_content(np.array([0.0, 1.0, 3.0]), np.array([10.0, 30.0, 130.0]))
    assert [content_at(z, layers) for z in (-1.0, 0.0, 0.5, 2.0, 4.0)] == pytest.approx(
        [-10.0, 10.0, 20.0, 80.0, 180.0]
    )
    assert [extent_at(z, layers) for z in (0.5, 1.0, 9.0)] == pytest.approx([20.0, 50.0, 50.0])
    assert level_of(105.0, layers) == pytest.approx(2.5)


def test_what_is_no_section_is_refused():
    with pytest.raises(DomainError, match="width 0 m must be positive"):
        trapezoid_section(0.0, 0.0)
    with pytest.raises(DomainError, match="side slope -1 not negative"):
        trapezoid_section(0.0, 1.0, -1.0)
    with pytest.raises(DomainError, match="two points at least, with distances that do not decrease"):
        profile_layers(np.array([0.0, 2.0, 1.0]), np.zeros(3))
    with pytest.raises(DomainError, match="the profile has no width"):
        profile_layers(np.array([0.0, 0.0]), np.array([1.0, 0.0]))
    with pytest.raises(DomainError, match="crest -2 m lies under the lowest point of the section, -1 m"):
        Section(crest_level_m=-2.0, layers=profile_layers(np.array([0.0, 5.0]), np.array([-1.0, 2.0])))
    with pytest.raises(DomainError, match="levels must increase"):
        layers_from_extent(np.array([0.0, 0.0]), np.array([1.0, 2.0]))
    with pytest.raises(DomainError, match="two rows of one length"):
        layers_from_extent(np.array([0.0, 1.0]), np.array([1.0]))
    with pytest.raises(DomainError, match="two levels at least"):
        layers_from_content(np.array([0.0]), np.array([1.0]))
