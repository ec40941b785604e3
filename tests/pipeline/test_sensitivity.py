"""What each input is worth, against closed forms of a steady river through two widths."""

import numpy as np
import pytest
from scipy.optimize import brentq

from tidescour.bed.water import kinematic_viscosity, submerged_relative_density
from tidescour.pipeline.sensitivity import sensitivities

RIVER_M3_S, WATER_M, ALPHA, CRITICAL_M_S = 3000.0, 10.1, 2.4, 0.42
MARGIN, FACTOR, SLOPE = 1.2, 1.3, 8.0
DENSITY = submerged_relative_density(10.0, 30.0, 2650.0)
DESIGN = f"alpha = {ALPHA}\ndepth_margin_factor = {MARGIN}\ngrowth_factor = {FACTOR}"
STAGES = ((300.0, 6.0 * 24.0), (240.0, 8.0 * 24.0))
"""Width [m] and hours of both."""


def powers(velocity=1.0, alpha=ALPHA, critical=CRITICAL_M_S, water=WATER_M, widening_m=0.0):
    """Excess of both stages [m/s] and hours, with changed inputs."""
    for width, hours in STAGES:
        yield alpha * velocity * RIVER_M3_S / ((width + widening_m) * water) - critical, hours


def explicit(hours=1.0, factor=FACTOR, density=DENSITY, water=WATER_M, **changes):
    """Depth by the explicit law: h^2.5 of the stages adds up."""
    state = sum(
        (excess**1.7 * water**0.2 / (10.0 * density**0.7)) ** 2.5 * hours * own
        for excess, own in powers(water=water, **changes)
    )
    return factor * state**0.4


def time_scale():
    """The same by h0 (t / t1)^0.4, t1 = 330 h0^2 Delta^1.7 / E^4.3."""
    return FACTOR * WATER_M * sum(hours / t1_h for hours, t1_h in in_time_scales()) ** 0.4


def in_time_scales():
    return [(hours, 330.0 * WATER_M**2 * DENSITY**1.7 / excess**4.3) for excess, hours in powers()]


def saturating_by_turbulence():
    """Equivalent time on h_e (1 - exp(ln(1 - h0 / h_e) (t / t1)^0.4)), r0 = (alpha - 1.5) / 5."""
    depth = 0.0
    omega = 1.0 + 3.0 * (ALPHA - 1.5) / 5.0
    for (width, _), (hours, t1_h) in zip(STAGES, in_time_scales(), strict=True):
        limit = WATER_M * (omega * RIVER_M3_S / (width * WATER_M) / CRITICAL_M_S - 1.0)
        bend = np.log1p(-WATER_M / limit)
        start_h = t1_h * (np.log1p(-depth / limit) / bend) ** 2.5
        depth = -limit * np.expm1(bend * ((start_h + hours) / t1_h) ** 0.4)
    return FACTOR * depth


BASE_M = explicit()
CLOSED = {
    "velocity at the end of the protection, or alpha, 10 % higher": explicit(velocity=1.1),
    "critical velocity 10 % lower": explicit(critical=0.9 * CRITICAL_M_S),
    "every stage 10 % longer, with the same tides": 1.1**0.4 * BASE_M,
    "growth factor 30 % higher": 1.3 * BASE_M,
    "submerged relative density in the growth law 5 % lower": 0.95**-0.7 * BASE_M,
    "growth law time-scale": time_scale(),
    "growth law saturating, equilibrium turbulence": saturating_by_turbulence(),
    "bed at the end of the protection 0.5 m higher, same discharges": explicit(water=WATER_M - 0.5),
    "flow spreading as a plane jet": BASE_M,
}


def by_change(outcome, plan, side="sea"):
    case, result = outcome(plan)[side]
    return {each.change: each for each in sensitivities(case, result, DENSITY)}


@pytest.fixture
def found(make_plan, wide, narrow, outcome):
    """What the sea side's inputs are worth in the plan with a margin and a growth factor."""
    return by_change(outcome, make_plan(wide, narrow, alpha=DESIGN))


def test_every_change_of_a_steady_river_has_its_closed_form(found):
    for change, depth_m in CLOSED.items():
        each = found.pop(change)
        assert each.depth_change_m == pytest.approx(depth_m - BASE_M, rel=5e-3, abs=5e-3), change
        # Behind a given alpha the length is slope times margin times depth.
        assert each.length_change_m == pytest.approx(SLOPE * MARGIN * each.depth_change_m, abs=1e-5), change
    flatter = found.pop("failure slope flatter by 1 (1 in n + 1)")
    assert flatter.depth_change_m == 0.0
    assert flatter.length_change_m == pytest.approx(MARGIN * BASE_M, rel=2e-3)
    # h_e = h0 (0.5 x 2.4 u / 0.42 - 1) = 18.5 m in the wide stage, under twice the water depth.
    jump = found.pop("growth law saturating, equilibrium half-alpha")
    assert np.isnan([jump.depth_change_m, jump.length_change_m]).all()
    assert "stage 'wide': the equilibrium depth of 18.47 m is under 2 times the water depth" in jump.why_empty
    spread = found.pop("flow spreading 1 in 8 to either side")
    assert spread.depth_change_m == pytest.approx(explicit(widening_m=0.25 * 90.0) - BASE_M, rel=5e-3)
    length_m = brentq(lambda length: SLOPE * MARGIN * explicit(widening_m=0.25 * length) - length, 20.0, 200.0)
    assert spread.length_change_m == pytest.approx(length_m - SLOPE * MARGIN * BASE_M, abs=0.1)
    # The threshold is given, so that no grain can change it, and the protection has no Chezy coefficient.
    assert not found


def threshold(d50_mm):
    """Soulsby's Shields curve at 10 degrees and 30 g/kg, and 18 log10(12 h0 / 2.5 d50)."""
    grain_m = d50_mm / 1000.0
    size = grain_m * (9.81 * DENSITY / kinematic_viscosity(10.0, 30.0) ** 2) ** (1.0 / 3.0)
    shields = 0.30 / (1.0 + 1.2 * size) + 0.055 * (1.0 - np.exp(-0.02 * size))
    return 18.0 * np.log10(12.0 * WATER_M / (2.5 * grain_m)) * np.sqrt(shields * DENSITY * grain_m)


GRAIN = "d50 at the surface 20 % finer"
CLAY = '[[bed.layer]]\nname = "silt"\ntop_level_m = -9.0\n'
BARE = ("critical_velocity_m_s = 0.42\n[prot", "d50_mm = 0.6\n[prot")


@pytest.mark.parametrize(
    ("layer", "replaced", "d50_mm"),
    [
        ("", [BARE], 0.6),
        (f"{CLAY}d50_mm = 0.3\n", [BARE], 0.3),
        # Given for the bed, but the layer at the surface has its own grain.
        (f"{CLAY}d50_mm = 0.3\n", [], 0.3),
        # The place's own grain goes before the layer.
        (f"{CLAY}d50_mm = 0.3\n", [BARE, ("length_m = 90.0", "length_m = 90.0\nd50_mm = 0.8")], 0.8),
    ],
    ids=["bed", "layer over a bed with grain", "layer over a bed without", "place"],
)
def test_a_finer_grain_is_that_of_the_surface(make_plan, reread, wide, narrow, outcome, layer, replaced, d50_mm):
    make_plan(wide, narrow, alpha=DESIGN, more=layer)
    each = by_change(outcome, reread(*replaced))[GRAIN]
    finer, own = (explicit(critical=threshold(share * d50_mm)) for share in (0.8, 1.0))
    assert each.depth_change_m == pytest.approx(finer - own, rel=2e-2)
    assert each.length_change_m == pytest.approx(SLOPE * MARGIN * each.depth_change_m, abs=1e-5)


BOTH = ("critical_velocity_m_s = 0.42\n[prot", "critical_velocity_m_s = 0.42\nd50_mm = 0.6\n[prot")


@pytest.mark.parametrize(
    ("layer", "replaced"),
    [
        ("", BOTH),
        (f"{CLAY}critical_velocity_m_s = 0.5\n", BARE),
        (f"{CLAY}d50_mm = 0.3\ncritical_velocity_m_s = 0.5\n", BARE),
    ],
    ids=["bed with a grain", "layer", "layer with a grain"],
)
def test_no_grain_changes_a_threshold_that_is_given(make_plan, reread, wide, outcome, layer, replaced):
    make_plan(wide, alpha=DESIGN, more=layer)
    assert GRAIN not in by_change(outcome, reread(replaced))


@pytest.mark.parametrize(("layer", "d50_mm"), [("", 0.6), (f"{CLAY}d50_mm = 0.3\n", 0.3)], ids=["bed", "layer"])
def test_the_slope_of_the_growing_hole_has_the_grain_of_the_surface(
    make_plan, reread, wide, narrow, outcome, layer, d50_mm
):
    # beta = arcsin(3e-4 u^2 / (Delta g d50) + 0.11 + 0.75 r0) of the narrow stage, which digs most (Hoffmans and
    # Pilarczyk 1995, from memory).
    make_plan(wide, narrow, alpha=DESIGN, more=layer)
    _, result = outcome(reread(BARE))["sea"]
    velocity = RIVER_M3_S / (240.0 * WATER_M)
    sine = 3e-4 * velocity**2 / (DENSITY * 9.81 * d50_mm / 1000.0) + 0.11 + 0.75 * 0.18
    assert result.required.upstream_slope_cot == pytest.approx(np.sqrt(1.0 - sine**2) / sine, rel=2e-3)
