"""Discharge relations against published and closed forms, and the contract that every entry of the table keeps."""

from pathlib import Path
from typing import get_args

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from tidescour.errors import DomainError
from tidescour.gap.relations import KERNELS, NUMBERS_AT_MOST, RELATIONS, opening_discharge, relation_numbers
from tidescour.gap.rubble import forchheimer
from tidescour.gap.section import Section, profile_layers, trapezoid_section
from tidescour.table import Confidence

PUBLISHED = Path(__file__).parent.parent / "published"
GRAVITY = 9.81
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
ONE_WAY = {"ebb-flap": "flood-flap", "flood-flap": "ebb-flap"}
DIMENSIONS = {"-": 0.0, "m": 1.0, "m2": 2.0, "m2/s": 1.5, "s/m^(1/3)": 1.0 / 6.0}
"""Powers of the length scale with which numbers grow in a model with the same Froude number."""

VALLEY = [(0.0, 4.0), (30.0, -1.0), (60.0, -1.0), (70.0, -4.0), (90.0, -3.0), (140.0, 1.0), (180.0, 5.0)]
every_relation = pytest.mark.parametrize("relation", RELATIONS)
levels = st.floats(-8.0, 8.0)


def sections(crest=-4.0):
    return st.one_of(
        st.builds(lambda b, m: trapezoid_section(crest, b, m), st.floats(0.5, 500.0), st.floats(0.0, 6.0)),
        st.just(Section(crest_level_m=crest, layers=profile_layers(*np.array(VALLEY).T))),
        st.just(Section(crest_level_m=-2.0, layers=profile_layers(*np.array(VALLEY).T))),
    )


def flow(relation, section, sea, basin, **numbers):
    values = EXAMPLE[relation] | numbers
    return opening_discharge(relation, values, section, np.array([float(sea)]), np.array([float(basin)]))[0]


def rectangle(width=1.0):
    return trapezoid_section(0.0, width)


def table(name):
    rows = np.genfromtxt(PUBLISHED / name, delimiter=",", comments="#")
    return rows[np.isfinite(rows[:, -1])]


# Broad crest


@pytest.mark.parametrize(
    ("downstream", "discharge"),
    # Energy at the control section, h1 = 3 m, per metre of width; free flow is the maximum over the crest depth:
    # Encyclopaedia Britannica, 11th ed. (1910), Hydraulics, section 44.
    [(0.0, 8.85889), (2.0, 8.85889), (2.5, 7.83023), (2.7, 6.55049), (2.9, 4.06207), (3.0, 0.0)],
)
def test_a_rectangular_crest_follows_the_energy_equation_free_and_drowned(downstream, discharge):
    found = flow("broad-crest", rectangle(), 3.0, downstream, coefficient=1.0)
    assert found == pytest.approx(discharge, rel=1e-6, abs=1e-12)


def test_discharge_and_its_slope_are_continuous_where_the_crest_drowns():
    below, at, above = (flow("broad-crest", rectangle(), 3.0, 2.0 + step) for step in (-1e-4, 0.0, 1e-4))
    assert below == pytest.approx(at, rel=1e-12)
    assert (above - at) / 1e-4 == pytest.approx(0.0, abs=1e-3)


@pytest.mark.parametrize(
    ("ratio", "share"),
    # q / q_free by h2 / h1, four digits, evaluated from q = m h2 sqrt(2 g (h1 - h2)) apart from this program.
    [(0.70, 0.9961), (0.75, 0.9743), (0.80, 0.9295), (0.85, 0.8553), (0.90, 0.7394), (0.95, 0.5519), (0.99, 0.2572)],
)
def test_drowning_reduces_the_free_discharge_by_the_tabled_share(ratio, share):
    drowned, free = (flow("broad-crest", rectangle(), 2.0, tail) for tail in (2.0 * ratio, 0.0))
    assert drowned / free == pytest.approx(share, abs=0.5e-4)


@pytest.mark.parametrize("row", table("energy_minimum_trapezoid.csv"), ids=lambda row: f"b{row[0]:g}-m{row[1]:g}")
def test_a_trapezoid_lets_pass_what_is_critical_at_its_least_energy(row):
    width, slope, _, discharge = row
    section = trapezoid_section(0.0, width, slope)
    assert flow("broad-crest", section, 3.0, 0.0, coefficient=1.0) == pytest.approx(discharge, rel=1e-5)


@pytest.mark.parametrize("row", table("energy_approach_velocity.csv"), ids=lambda row: f"p{row[0]:g}")
def test_the_approach_velocity_is_that_of_the_tranquil_root(row):
    below, discharge = row
    found = flow(
        "broad-crest", rectangle(), 3.0, 0.0, coefficient=1.0, approach_width_sea_m=1.0, approach_bed_sea_m=-below
    )
    assert found == pytest.approx(discharge, abs=0.6e-5)


def test_the_approach_velocity_of_a_drowned_crest_is_the_closed_form():
    # q = m h2 sqrt(2 g (h1 - h2)) / sqrt(1 - (m h2 / (h1 + p))^2), from energy: m 0.95, p 2, h1 3, h2 2.6 m.
    approach = {"approach_width_basin_m": 1.0, "approach_bed_basin_m": -2.0}
    found = flow("broad-crest", rectangle(), 2.6, 3.0, coefficient=0.95, **approach)
    assert found == pytest.approx(-7.95840, abs=1e-5)
    assert flow("broad-crest", rectangle(), 3.0, 2.6, coefficient=0.95, **approach) == pytest.approx(6.91953, abs=1e-5)


def test_a_gap_as_wide_and_deep_as_its_approach_passes_no_more_than_is_critical_there():
    most = np.sqrt(GRAVITY) * 3.0**1.5
    approach = {"approach_width_sea_m": 1.0, "approach_bed_sea_m": 0.0}
    assert flow("broad-crest", rectangle(), 3.0, 0.0, coefficient=1.3, **approach) == pytest.approx(most, rel=1e-12)
    assert flow("broad-crest", rectangle(), 3.0, 0.0, coefficient=0.9, **approach) < most


def test_a_gentle_back_face_keeps_the_flow_free_up_to_its_modular_limit():
    # Beyond the limit S: q = m_sub h2 sqrt(2 g (H - h2)), m_sub = 0.3849 m / (S sqrt(1 - S)); 1.0758 m for S = 0.80.
    free = flow("broad-crest", rectangle(), 3.0, 0.0, coefficient=0.9)
    limited = {"coefficient": 0.9, "modular_limit": 0.8}
    assert flow("broad-crest", rectangle(), 3.0, 2.399, **limited) == pytest.approx(free, rel=1e-12)
    drowned = 0.9 * 1.0758 * 2.7 * np.sqrt(2.0 * GRAVITY * 0.3)
    assert flow("broad-crest", rectangle(), 3.0, 2.7, **limited) == pytest.approx(drowned, rel=5e-5)
    assert flow("broad-crest", rectangle(), 3.0, 2.7, coefficient=0.9, modular_limit=0.6) == flow(
        "broad-crest", rectangle(), 3.0, 2.7, coefficient=0.9
    )


def test_the_velocity_over_a_back_face_has_no_step_at_its_modular_limit():
    numbers = relation_numbers("broad-crest", {"coefficient": 0.9, "modular_limit": 0.8})
    kernel = RELATIONS["broad-crest"].function
    rows = [kernel(3.0, tail, 0.0, trapezoid_section(0.0, 1.0).layers, numbers) for tail in (2.4 - 1e-7, 2.4 + 1e-7)]
    before, after = (discharge / area for discharge, area, _ in rows)
    assert after == pytest.approx(before, rel=2e-3)


# Narrow crest


@pytest.mark.parametrize("row", table("villemonte_1947_submergence.csv"), ids=lambda row: f"{row[0]:g}")
def test_a_narrow_crest_drowns_after_villemonte(row):
    ratio, share = row
    drowned, free = (flow("narrow-crest", rectangle(), 3.0, tail) for tail in (3.0 * ratio, 0.0))
    assert drowned / free == pytest.approx(share, abs=0.5e-4)


def test_a_triangular_notch_drowns_with_the_exponent_of_its_free_law():
    notch = trapezoid_section(0.0, 1e-9, 1.0)
    drowned, free = (flow("narrow-crest", notch, 1.0, tail) for tail in (0.6, 0.0))
    assert drowned / free == pytest.approx((1.0 - 0.6**2.5) ** 0.385, rel=1e-6)


# Open gap


@pytest.mark.parametrize("row", table("borda_carnot_open_gap.csv"), ids=lambda row: f"{row[0]:g}")
def test_an_open_gap_wins_back_the_head_of_its_expansion(row):
    area, discharge = row
    deep = trapezoid_section(-1e6, area / 1e6)
    channels = {"channel_area_sea_m2": 6000.0, "channel_area_basin_m2": 6000.0}
    assert flow("open-gap", deep, 0.2, 0.0, **channels) == pytest.approx(discharge, rel=6e-6)


def test_an_open_gap_in_wide_channels_is_contracted_alone():
    deep = trapezoid_section(-1e6, 3e-3)
    wide = {"channel_area_sea_m2": 9e8, "channel_area_basin_m2": 9e8}
    # 0.9 * 3000 * sqrt(2 g 0.2) = 5348.45 m3/s.
    assert flow("open-gap", deep, 0.2, 0.0, **wide) == pytest.approx(5348.45, rel=1e-5)


def test_an_open_gap_with_a_low_tailwater_passes_the_most_that_any_level_in_it_would():
    section, numbers = trapezoid_section(0.0, 10.0), {"channel_area_sea_m2": 400.0, "channel_area_basin_m2": 300.0}

    def passes(level):
        inverse = 1.0 / (0.9 * 10.0 * level)
        loss = (inverse - 1.0 / 300.0) ** 2 + 1.0 / 300.0**2 - 1.0 / 400.0**2
        return np.sqrt(2.0 * GRAVITY * (4.0 - level) / loss)

    most = passes(np.linspace(0.1, 3.999, 40001)).max()
    assert flow("open-gap", section, 4.0, 0.1, **numbers) == pytest.approx(most, rel=1e-6)


def test_an_open_gap_as_large_as_its_channels_has_no_value():
    channels = {"channel_area_sea_m2": 100.0, "channel_area_basin_m2": 130.0}
    assert np.isnan(flow("open-gap", trapezoid_section(0.0, 100.0), 1.1, 1.0, coefficient=1.0, **channels))


# Orifice, culvert, flaps


def test_a_gate_lets_pass_a_contracted_jet_a_critical_stream_or_a_drowned_one():
    # Free jet: q = c a sqrt(2 g (h1 - c a)), Cd = c / sqrt(1 + c a / h1) with the approach counted (Chow 1959, ch. 17,
    # from memory); h1 5 m, a 1 m, c 0.61: 0.5758 of a sqrt(2 g h1).
    gate = {"height_m": 1.0, "coefficient": 1.0, "contraction": 0.61}
    free = flow("orifice", rectangle(), 5.0, 0.0, **gate)
    assert free == pytest.approx(0.61 * np.sqrt(2.0 * GRAVITY * (5.0 - 0.61)), rel=1e-12)
    with_approach = free / np.sqrt(1.0 - (0.61 / 5.0) ** 2)
    assert with_approach / np.sqrt(2.0 * GRAVITY * 5.0) == pytest.approx(0.61 / np.sqrt(1.0 + 0.61 / 5.0), rel=1e-12)
    assert flow("orifice", rectangle(), 5.0, 3.0, **gate) == pytest.approx(0.61 * np.sqrt(2.0 * GRAVITY * 2.0))
    low = flow("broad-crest", rectangle(), 0.8, 0.3, coefficient=1.0)
    assert flow("orifice", rectangle(), 0.8, 0.3, **gate) == pytest.approx(low, rel=1e-12)


def test_a_full_culvert_loses_the_head_of_entrance_friction_and_exit():
    # Head = (1 + ke + 19.63 n^2 L / R^(4/3)) V^2 / 2g in SI, full barrel: FHWA (2012), HDS-5, ch. 3 (from memory).
    box = {"height_m": 2.0, "length_m": 60.0, "manning_s_m13": 0.013, "entrance_loss": 0.5, "contraction": 1.0}
    discharge = flow("culvert", rectangle(3.0), 5.0, 4.0, **box)
    velocity, radius = discharge / 6.0, 6.0 / 10.0
    head = (1.5 + 19.63 * 0.013**2 * 60.0 / radius ** (4.0 / 3.0)) * velocity**2 / (2.0 * GRAVITY)
    assert head == pytest.approx(1.0, rel=1e-3)
    twice = box | {"barrels": 2.0}
    assert flow("culvert", rectangle(3.0), 5.0, 4.0, **twice) < discharge


def test_the_entrance_of_a_short_culvert_lets_pass_less_than_its_barrel():
    short = {"height_m": 2.0, "length_m": 1.0, "manning_s_m13": 0.01, "entrance_loss": 0.1, "contraction": 0.61}
    gate = {"height_m": 2.0, "coefficient": 1.0, "contraction": 0.61}
    assert flow("culvert", rectangle(3.0), 9.0, 0.0, **short) == flow("orifice", rectangle(3.0), 9.0, 0.0, **gate)


@pytest.mark.parametrize(
    ("flap", "open_", "shut"), [("ebb-flap", (0.0, 2.0), (2.0, 0.0)), ("flood-flap", (2.0, 0.0), (0.0, 2.0))]
)
def test_a_flap_lets_one_direction_through(flap, open_, shut):
    section = trapezoid_section(-3.0, 8.0)
    orifice = {"height_m": 2.0, "coefficient": 0.8}
    numbers = orifice | {"opening_head_m": 0.0}
    assert flow(flap, section, *open_, **numbers) == pytest.approx(flow("orifice", section, *open_, **orifice))
    assert flow(flap, section, *shut, **EXAMPLE[flap]) == 0.0
    leaking = flow(flap, section, *shut, **orifice, leak=0.1)
    assert leaking == pytest.approx(0.1 * flow("orifice", section, *shut, **orifice))
    heavy = flow(flap, section, *open_, **orifice, opening_head_m=0.3)
    lower = [max(level, min(open_) + 0.3) for level in open_]
    assert heavy == pytest.approx(flow("orifice", section, *lower, **orifice))


def test_a_flap_that_its_head_cannot_open_passes_nothing():
    assert flow("ebb-flap", trapezoid_section(-3.0, 8.0), 0.0, 0.2, opening_head_m=0.3) == 0.0


# Rubble


@pytest.mark.parametrize("row", table("forchheimer_1901_rubble.csv"), ids=["ergun", "van-gent"])
def test_a_rubble_dam_follows_forchheimer_and_dupuit(row):
    alpha, beta, a, b, velocity, discharge = row
    found_a, found_b = forchheimer(0.4, 0.4, 1.35e-6, alpha, beta)
    assert found_b == pytest.approx(b, rel=2e-5)
    stone = {"porosity": 0.4, "stone_m": 0.4, "length_m": 20.0}
    turbulent = {"forchheimer_laminar": 1e-9, "forchheimer_turbulent": beta}
    assert flow("rubble-dam", rectangle(), 6.0, 5.0, **stone, **turbulent) == pytest.approx(discharge, rel=1e-5)
    if np.isfinite(a):
        assert found_a == pytest.approx(a, rel=1e-4)
        # A pipe of constant area: a dam drowned under its top, where the gradient is the same everywhere.
        drowned = stone | {"height_m": 2.0, "viscosity_m2_s": 1.35e-6}
        found = flow("rubble-dam", rectangle(), 10.0, 9.0, **drowned)
        assert found / 2.0 == pytest.approx(velocity, rel=1e-4)


def test_a_rubble_dam_of_fine_stone_is_laminar():
    # Dupuit: q = k (h1^2 - h2^2) / (2 L), k = 1 / a.
    fine = {"porosity": 0.4, "stone_m": 0.0015, "length_m": 20.0, "forchheimer_turbulent": 1e-9}
    a, _ = forchheimer(0.4, 0.0015, 1.35e-6, 150.0, 1e-9)
    expected = (36.0 - 25.0) / (2.0 * 20.0 * a)
    assert flow("rubble-dam", rectangle(), 6.0, 5.0, **fine) == pytest.approx(expected, rel=1e-6)


def test_both_parts_of_the_resistance_meet_in_the_equation_of_the_dam():
    numbers = {"porosity": 0.4, "stone_m": 0.01, "length_m": 20.0}
    a, b = forchheimer(0.4, 0.01, 1.35e-6, 150.0, 1.75)
    depth = np.linspace(2.0, 6.0, 200001)

    def length(q):
        return np.trapezoid(depth**2 / (a * depth + b * q), depth) / q - 20.0

    expected = brentq(length, 1e-6, 1.0)
    assert flow("rubble-dam", rectangle(), 6.0, 2.0, **numbers) == pytest.approx(expected, rel=1e-5)


# Contract of the table


@every_relation
@given(section=sections(), level=levels)
@settings(max_examples=40, deadline=None)
def test_no_head_gives_no_flow(relation, section, level):
    assert flow(relation, section, level, level) == 0.0


@every_relation
@given(section=sections(), sea=levels, basin=levels)
@settings(max_examples=40, deadline=None)
def test_a_dry_crest_gives_no_flow(relation, section, sea, basin):
    down = max(sea, basin) - section.crest_level_m
    if down > 0.0:
        sea, basin = (min(level - down, section.crest_level_m) for level in (sea, basin))
    assert flow(relation, section, sea, basin) == 0.0


@every_relation
def test_a_missing_level_gives_a_missing_discharge(relation):
    rows = opening_discharge(
        relation, EXAMPLE[relation], rectangle(20.0), np.array([np.nan, 2.0, 1.0]), np.array([1.0, np.nan, 1.0])
    )
    assert np.isnan(rows[:2]).all()
    assert np.isfinite(rows[2])


@every_relation
@given(section=sections(), sea=levels, basin=levels)
@settings(max_examples=200, deadline=None)
def test_swapped_levels_flip_the_sign(relation, section, sea, basin):
    mirrored = ONE_WAY.get(relation, relation)
    here = flow(relation, section, sea, basin)
    assert flow(mirrored, section, basin, sea, **EXAMPLE[relation]) == pytest.approx(-here, abs=1e-12)
    assert here * (sea - basin) >= 0.0


@every_relation
@given(section=sections(), sea=levels, basin=levels, rise=st.floats(0.0, 3.0))
@settings(max_examples=300, deadline=None)
def test_discharge_rises_with_the_sea_and_falls_with_the_basin(relation, section, sea, basin, rise):
    here = flow(relation, section, sea, basin)
    slack = 1e-7 * max(abs(here), 1.0)
    assert flow(relation, section, sea + rise, basin) >= here - slack
    assert flow(relation, section, sea, basin + rise) <= here + slack


@pytest.mark.parametrize("limits", [{"modular_limit": 0.8}, {}])
@given(sea=levels, basin=levels, rise=st.floats(0.0, 3.0), width=st.floats(5.0, 200.0), bed=st.floats(-9.0, -4.5))
@settings(max_examples=200, deadline=None)
def test_a_broad_crest_with_an_approach_is_monotone_too(limits, sea, basin, rise, width, bed):
    section = trapezoid_section(-4.0, 5.0)
    approach = {
        f"approach_{key}_{side}_m": value
        for side in ("sea", "basin")
        for key, value in (("width", width), ("bed", bed))
    }
    here = flow("broad-crest", section, sea, basin, **approach, **limits)
    slack = 1e-6 * max(abs(here), 1.0)
    assert flow("broad-crest", section, sea + rise, basin, **approach, **limits) >= here - slack
    assert flow("broad-crest", section, sea, basin + rise, **approach, **limits) <= here + slack


@every_relation
@given(factor=st.floats(0.3, 3.0), sea=levels, basin=levels)
@settings(max_examples=60, deadline=None)
def test_a_model_with_the_same_froude_number_scales_by_five_halves(relation, factor, sea, basin):
    assume(abs(sea - basin) > 1e-3)  # a smaller head is the rounding of the levels
    numbers = {p.name: (EXAMPLE[relation].get(p.name, p.default), p.unit) for p in RELATIONS[relation].parameters}
    small = {name: value for name, (value, _) in numbers.items() if np.isfinite(value)}
    large = {name: value * factor ** DIMENSIONS[numbers[name][1]] for name, value in small.items()}
    base = opening_discharge(relation, small, trapezoid_section(-4.0, 20.0, 1.5), np.array([sea]), np.array([basin]))
    model = trapezoid_section(-4.0 * factor, 20.0 * factor, 1.5)
    found = opening_discharge(relation, large, model, np.array([sea * factor]), np.array([basin * factor]))
    np.testing.assert_allclose(found, base * factor**2.5, rtol=1e-9, atol=1e-12)


@every_relation
def test_area_and_width_of_the_control_section_belong_together(relation):
    numbers = relation_numbers(relation, EXAMPLE[relation])
    discharge, area, width = RELATIONS[relation].function(0.4, 1.0, -3.0, trapezoid_section(-3.0, 12.0).layers, numbers)
    assert discharge <= 0.0
    assert 0.0 < area <= 12.0 * 4.0
    assert width == pytest.approx(12.0)


@every_relation
def test_an_entry_says_its_range_source_and_how_sure(relation):
    entry = RELATIONS[relation]
    assert entry.name == relation
    assert entry.validity
    assert entry.source
    assert entry.confidence in get_args(Confidence)
    assert len(entry.parameters) <= NUMBERS_AT_MOST
    assert len(KERNELS) == len(RELATIONS) == len(EXAMPLE)
    assert {p.unit for p in entry.parameters} <= set(DIMENSIONS)


def test_numbers_outside_their_range_are_refused():
    with pytest.raises(DomainError, match="coefficient = 0 must be over 0"):
        relation_numbers("broad-crest", {"coefficient": 0.0})
    with pytest.raises(DomainError, match="coefficient = nan"):
        relation_numbers("broad-crest", {})
    with pytest.raises(DomainError, match="approach_width_sea_m needs approach_bed_sea_m"):
        relation_numbers("broad-crest", {"coefficient": 1.0, "approach_width_sea_m": 30.0})
    with pytest.raises(DomainError, match="is not in the table; it has broad-crest"):
        relation_numbers("broadcrest", {})
    with pytest.raises(DomainError, match="must be two rows of one length"):
        opening_discharge("broad-crest", EXAMPLE["broad-crest"], rectangle(), np.zeros(2), np.zeros(1))
