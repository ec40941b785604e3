"""Discharge relations against closed forms, and the contract that every entry of the table keeps."""

from pathlib import Path
from typing import get_args

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError
from tidescour.gap.relations import KERNELS, PARAMETERS_AT_MOST, RELATIONS, opening_discharge, relation_parameters
from tidescour.gap.section import critical_depth, section_area
from tidescour.table import Confidence

PUBLISHED = Path(__file__).parent.parent / "published"
MIDDLING = {name: {p.name: 0.5 * (p.low + p.high) for p in entry.parameters} for name, entry in RELATIONS.items()}
every_relation = pytest.mark.parametrize("relation", RELATIONS)


def broad_crest(upstream, downstream, width=1.0, slope=0.0, coefficient=1.0):
    sea, basin = np.atleast_1d(np.asarray(upstream, float)), np.atleast_1d(np.asarray(downstream, float))
    return opening_discharge("broad-crest", {"coefficient": coefficient}, sea, basin, width, slope)


@pytest.mark.parametrize(
    ("downstream", "discharge"),
    # Energy at the control section, h1 = 3 m, per metre of width; free flow is the maximum over the crest depth:
    # Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, section 44.
    [(0.0, 8.85889), (2.0, 8.85889), (2.5, 7.83023), (2.7, 6.55049), (2.9, 4.06207), (3.0, 0.0)],
)
def test_a_rectangular_crest_follows_the_energy_equation_free_and_drowned(downstream, discharge):
    assert broad_crest(3.0, downstream)[0] == pytest.approx(discharge, rel=1e-6, abs=1e-12)


def test_discharge_and_its_slope_are_continuous_where_the_crest_drowns():
    below, at, above = broad_crest([3.0] * 3, [2.0 - 1e-4, 2.0, 2.0 + 1e-4])
    assert below == pytest.approx(at, rel=1e-12)
    assert (above - at) / 1e-4 == pytest.approx(0.0, abs=1e-3)


@pytest.mark.parametrize(
    ("ratio", "share"),
    # methods of energy: q / q_free by h2 / h1, four digits, evaluated from q = m h2 sqrt(2 g (h1 - h2)).
    [(0.70, 0.9961), (0.75, 0.9743), (0.80, 0.9295), (0.85, 0.8553), (0.90, 0.7394), (0.95, 0.5519), (0.99, 0.2572)],
)
def test_drowning_reduces_the_free_discharge_by_the_tabled_share(ratio, share):
    assert broad_crest(2.0, 2.0 * ratio)[0] / broad_crest(2.0, 0.0)[0] == pytest.approx(share, abs=0.5e-4)


TRAPEZOID = np.genfromtxt(PUBLISHED / "energy_minimum_trapezoid.csv", delimiter=",", skip_header=4)


@pytest.mark.parametrize("row", TRAPEZOID, ids=lambda row: f"b{row[0]:g}-m{row[1]:g}")
def test_a_trapezoid_is_critical_at_the_depth_of_least_energy(row):
    width, slope, depth, discharge = row
    assert critical_depth(3.0, width, slope) == pytest.approx(depth, rel=1e-5)
    assert broad_crest(3.0, 0.0, width, slope)[0] == pytest.approx(discharge, rel=1e-5)


@pytest.mark.parametrize("factor", [0.25, 4.0])
def test_free_discharge_scales_with_head_to_three_halves_and_with_width(factor):
    base = broad_crest(2.0, 0.0, 10.0)[0]
    assert broad_crest(2.0 * factor, 0.0, 10.0)[0] == pytest.approx(base * factor**1.5, rel=1e-12)
    assert broad_crest(2.0, 0.0, 10.0 * factor)[0] == pytest.approx(base * factor, rel=1e-12)


def test_all_lengths_scaled_scale_a_trapezoid_by_five_halves():
    base = broad_crest(2.0, 1.7, 10.0, 3.0)[0]
    assert broad_crest(8.0, 6.8, 40.0, 3.0)[0] == pytest.approx(base * 4.0**2.5, rel=1e-12)


def test_the_critical_depth_of_a_nearly_triangular_section_is_four_fifths():
    assert critical_depth(3.0, 1e-12, 2.0) == pytest.approx(2.4, rel=1e-9)
    assert section_area(2.0, 10.0, 1.5) == pytest.approx(26.0)


@every_relation
def test_no_head_gives_no_flow(relation):
    depth = np.array([0.0, 0.3, 5.0])
    assert np.all(opening_discharge(relation, MIDDLING[relation], depth, depth, 50.0) == 0.0)


@every_relation
def test_a_dry_crest_gives_no_flow(relation):
    assert opening_discharge(relation, MIDDLING[relation], np.zeros(1), np.zeros(1), 50.0)[0] == 0.0


@every_relation
def test_a_missing_depth_gives_a_missing_discharge(relation):
    rows = opening_discharge(relation, MIDDLING[relation], np.array([np.nan, 2.0]), np.array([1.0, 1.0]), 50.0)
    assert np.isnan(rows[0])
    assert np.isfinite(rows[1])


@every_relation
@given(
    sea=st.floats(0.0, 30.0),
    basin=st.floats(0.0, 30.0),
    rise=st.floats(0.0, 3.0),
    width=st.floats(0.1, 2000.0),
    slope=st.floats(0.0, 10.0),
)
@settings(max_examples=200, deadline=None)
def test_swapped_levels_flip_the_sign_and_discharge_is_monotone(relation, sea, basin, rise, width, slope):
    def flow(sea_depth, basin_depth):
        depths = np.array([sea_depth]), np.array([basin_depth])
        return opening_discharge(relation, MIDDLING[relation], *depths, width, slope)[0]

    here = flow(sea, basin)
    slack = 1e-9 * max(abs(here), 1.0)
    assert flow(basin, sea) == pytest.approx(-here, abs=1e-12)
    assert flow(sea + rise, basin) >= here - slack
    assert flow(sea, basin + rise) <= here + slack


@every_relation
def test_an_entry_says_its_range_source_and_how_sure(relation):
    entry = RELATIONS[relation]
    assert entry.name == relation
    assert entry.validity
    assert entry.source
    assert entry.confidence in get_args(Confidence)
    assert len(entry.parameters) <= PARAMETERS_AT_MOST
    assert len(KERNELS) == len(RELATIONS)


def test_numbers_outside_their_range_are_refused():
    with pytest.raises(DomainError, match="coefficient = 0 must be over 0"):
        relation_parameters("broad-crest", {"coefficient": 0.0})
    with pytest.raises(DomainError, match="coefficient = nan"):
        relation_parameters("broad-crest", {})
    with pytest.raises(DomainError, match="is not in the table; it has broad-crest"):
        relation_parameters("broadcrest", {})
    with pytest.raises(DomainError, match="a depth over the crest is negative"):
        broad_crest(-1.0, 0.0)
    with pytest.raises(DomainError, match="must be two rows of one length"):
        broad_crest([1.0, 2.0], [1.0])
    with pytest.raises(DomainError, match="width 0 m must be positive"):
        broad_crest(1.0, 0.0, width=0.0)
