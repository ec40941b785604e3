import numpy as np
import pytest

from tidescour.bed.alpha import alpha_factor
from tidescour.bed.history import bed_history, covered_mean
from tidescour.bed.threshold import critical_velocity
from tidescour.bed.water import kinematic_viscosity, submerged_relative_density
from tidescour.errors import DomainError, PlanError
from tidescour.plan.models import Water
from tidescour.plan.models_bed import Bed, BedLayer

SAND = Bed(d50_mm=0.25)


def history(flow, stage, place, bed=SAND, length_m=None, layer=None):
    return bed_history(stage, flow, flow.openings[0], place, bed, Water(), length_m, layer)


def test_velocity_on_either_side_is_continuity(sine_stage, stage_plan, place):
    flow = sine_stage()
    discharge = flow.openings[0].discharge_m3_s
    for side, sign in (("basin", 1.0), ("sea", -1.0)):
        found = history(flow, stage_plan(), place(side)).velocity_m_s
        # Level 0.5 over a bed at -9.5: 10 m; 400 m wide.
        np.testing.assert_allclose(found, np.maximum(sign * discharge, 0.0) / 4000.0, atol=1e-12)


def test_widening_and_local_factor_enter_the_velocity(sine_stage, stage_plan, place):
    spread = place(spreading="fixed-rate", widening=0.125, local_velocity_factor=1.2)
    wide = history(sine_stage(), stage_plan(), spread).velocity_m_s
    # B = 400 + 2 x 0.125 x 90 = 422.5 m.
    np.testing.assert_allclose(np.max(wide), 1.2 * 4000.0 / (422.5 * 10.0), rtol=1e-4)
    longer = history(sine_stage(), stage_plan(), spread, length_m=800.0)
    np.testing.assert_allclose(np.max(longer.velocity_m_s), 1.2 * 4000.0 / (600.0 * 10.0), rtol=1e-4)
    assert longer.protection_length_m == 800.0


def test_depth_is_that_of_the_receiving_side_at_the_same_time(sine_stage, stage_plan, place):
    tide = np.sin(np.linspace(0.0, 4.0 * np.pi, 1491))
    flow = sine_stage(sea=tide, basin=0.3 * tide)
    np.testing.assert_allclose(history(flow, stage_plan(), place("sea")).depth_m, tide + 9.5)
    np.testing.assert_allclose(history(flow, stage_plan(), place("basin")).depth_m, 0.3 * tide + 9.5)
    assert history(flow, stage_plan(), place("sea")).reference_depth_m == pytest.approx(9.5, abs=1e-9)


def test_zero_of_the_velocity_is_that_of_the_discharge(sine_stage, stage_plan, place):
    tide = 3.0 * np.sin(np.linspace(0.0, 4.0 * np.pi, 1491) + 1.0)
    flow = sine_stage(sea=tide, basin=tide)
    discharge = flow.openings[0].discharge_m3_s
    for side, sign in (("basin", 1.0), ("sea", -1.0)):
        signed = history(flow, stage_plan(), place(side, bed_level_m=-9.0)).signed_velocity_m_s
        np.testing.assert_array_equal(np.sign(signed), np.sign(sign * discharge))
        turn = np.flatnonzero(signed[:-1] * signed[1:] < 0.0)
        share, wanted = (v[turn] / (v[turn] - v[turn + 1]) for v in (signed, discharge))
        np.testing.assert_allclose(share, wanted, atol=1e-3)


def test_bed_may_fall_dry_while_the_flow_goes_the_other_way(sine_stage, stage_plan, place):
    discharge = sine_stage().openings[0].discharge_m3_s
    basin = np.where(discharge > 0.0, 1.0, -1.0)
    found = history(sine_stage(basin=basin), stage_plan(alpha_basin=3.0), place(bed_level_m=-0.5, d50_mm=0.2))
    assert np.isfinite(found.signed_velocity_m_s).all()
    assert np.all(found.signed_velocity_m_s[discharge < 0.0] < 0.0)


def test_flow_over_a_dry_bed_is_refused_with_its_time(sine_stage, stage_plan, place):
    with pytest.raises(DomainError, match=r"'main gap', basin side: at 2027-04-01T00:02:00Z .* bed_level_m = 0.6"):
        history(sine_stage(), stage_plan(), place(bed_level_m=0.6))


def test_a_bed_over_the_mean_level_has_no_reference(sine_stage, stage_plan, place):
    discharge = sine_stage().openings[0].discharge_m3_s
    basin = np.where(discharge > 0.0, 1.0, -3.0)
    with pytest.raises(DomainError, match=r"lies 1\.\d\d m over the mean level"):
        history(sine_stage(basin=basin), stage_plan(alpha_basin=3.0), place(bed_level_m=0.5))


def test_only_covered_samples_count(sine_stage, stage_plan, place):
    covered = np.ones(1491, dtype=bool)
    covered[100:200] = False
    basin = np.where(covered, 0.5, -20.0)
    found = history(sine_stage(basin=basin, covered=covered), stage_plan(), place())
    assert found.reference_depth_m == pytest.approx(10.0)
    assert not found.findings


def test_covered_mean_is_the_trapezoid_rule():
    time, values = np.array([0.0, 1.0, 3.0, 4.0, 5.0]), np.array([0.0, 2.0, 4.0, 100.0, 6.0])
    covered = np.array([True, True, True, False, True])
    # (1 x 1 + 3 x 2) / 3 hours.
    assert covered_mean(time, values, covered) == pytest.approx(7.0 / 3.0)
    assert covered_mean(time, 2.0 * values, covered) == pytest.approx(14.0 / 3.0)
    with pytest.raises(DomainError, match="no part of the stage is covered"):
        covered_mean(time, values, np.zeros(5, dtype=bool))


def test_alpha_of_the_stage_goes_before_that_of_the_place_before_the_formula(sine_stage, stage_plan, place):
    flow = sine_stage()
    assert history(flow, stage_plan(alpha_basin=3.0), place(alpha=2.4)).alpha_ref == 3.0
    assert history(flow, stage_plan(alpha_sea=3.0), place(alpha=2.4)).alpha_ref == 2.4
    # D 3.5, h0 10, L 90, C 40.
    formula = float(alpha_factor(np.array([3.5]), 10.0, 90.0, 40.0)[0])
    found = history(flow, stage_plan(alpha_sea=3.0), place())
    assert found.alpha_ref == pytest.approx(formula)
    np.testing.assert_allclose(found.alpha, formula)


def test_alpha_follows_a_moving_crest(sine_stage, stage_plan, place):
    found = history(sine_stage(crest=(-7.5, -4.5)), stage_plan(), place())
    flowing = found.velocity_m_s > 0.0
    sill = np.linspace(2.0, 5.0, 1491)
    np.testing.assert_allclose(found.alpha[flowing], alpha_factor(sill[flowing], 10.0, 90.0, 40.0), rtol=1e-9)
    assert found.alpha_ref == pytest.approx(float(alpha_factor(np.array([3.5]), 10.0, 90.0, 40.0)[0]))


@pytest.mark.parametrize(
    ("crest", "length", "message"),
    [
        (-10.0, 90.0, r"at 2027-04-01T00:02:00Z .* 0.50 m under the bed .* given 2\.\d+.*Write alpha_basin = \.\.\."),
        (
            -1.4,
            90.0,
            r"'sill', opening 'main gap', basin side.* 8.10 m over that bed, over 0.8 .* 10.00 m.*given 4.58",
        ),
        (-6.5, 18.0, r"protection of 18.0 m is not longer than 6 times the crest's height of 3.00 m"),
    ],
)
def test_a_sill_outside_the_formula_is_refused_with_what_to_write(
    sine_stage, stage_plan, place, crest, length, message
):
    with pytest.raises(DomainError, match=message):
        history(sine_stage(crest=(crest, crest)), stage_plan(), place(length_m=length))


def test_a_mean_crest_without_flow_may_be_outside_the_formula(sine_stage, stage_plan, place):
    flow = sine_stage(crest=(-6.0, 6.0), discharge=np.where(np.arange(1491) < 200, 4000.0, 0.0))
    found = history(flow, stage_plan(), place())
    # D 9.5, h0 10, L 90, C 40 in the formula, evidence or not: sqrt(0.0225 x 0.05^-2 x (33/66.7 + 1)^-1.08 + ...).
    turbulence = np.sqrt(0.0225 * 0.05**-2 * (33.0 / 66.7 + 1.0) ** -1.08 + 1.45 * 9.81 / 40.0**2)
    assert found.alpha_ref == pytest.approx(1.5 + 5.0 * turbulence)
    assert np.nanmax(found.alpha[found.velocity_m_s > 0.0]) < 3.2
    hopeless = sine_stage(crest=(-6.0, 30.0), discharge=np.where(np.arange(1491) < 100, 4000.0, 0.0))
    with pytest.raises(DomainError, match=r"at the stage's mean crest .*has no value there"):
        history(hopeless, stage_plan(), place(length_m=40.0))
    assert history(flow, stage_plan(alpha_basin=3.0), place()).alpha_ref == 3.0


def test_six_sill_heights_serve_the_search_but_not_a_plan(sine_stage, stage_plan, place):
    flow = sine_stage(crest=(-6.5, -6.5))
    assert np.isfinite(history(flow, stage_plan(), place(), length_m=18.0).alpha_ref)
    with pytest.raises(DomainError, match="not longer than 6 times"):
        history(flow, stage_plan(), place(), length_m=17.99)


def test_a_row_without_flow_needs_no_alpha(sine_stage, stage_plan, place):
    found = history(sine_stage(discharge=0.0), stage_plan(), place(length_m=1.0, chezy_m05_s=None))
    assert np.isnan(found.alpha).all()
    assert np.isnan(found.alpha_ref)
    assert not found.velocity_m_s.any()
    assert 0.3 < found.critical_velocity_m_s < 0.5
    dry = history(sine_stage(discharge=0.0), stage_plan(), place(bed_level_m=0.6))
    assert np.isnan(dry.critical_velocity_m_s)


def test_critical_velocity_is_computed_at_the_mean_depth_or_given(sine_stage, stage_plan, place):
    density, viscosity = submerged_relative_density(10.0, 30.0, 2650.0), kinematic_viscosity(10.0, 30.0)
    for d50, override in ((0.25, None), (0.4, 0.4)):
        found = history(sine_stage(), stage_plan(), place(d50_mm=override))
        wanted = critical_velocity("soulsby", "chezy", d50 / 1000.0, 10.0, density, viscosity, 2.5)
        assert found.critical_velocity_m_s == pytest.approx(wanted)
        assert found.submerged_relative_density == density
    given = history(sine_stage(), stage_plan(), place(), bed=Bed(critical_velocity_m_s=0.45))
    assert given.critical_velocity_m_s == 0.45
    bed = Bed(d50_mm=0.25, velocity_profile="log-law")
    wanted = critical_velocity("soulsby", "log-law", 0.25e-3, 10.0, density, viscosity, 2.5)
    assert history(sine_stage(), stage_plan(), place(), bed=bed).critical_velocity_m_s == pytest.approx(wanted)


def test_a_layer_brings_its_own_threshold_and_nothing_else(sine_stage, stage_plan, place):
    flow, at = sine_stage(), place(d50_mm=0.4, own_d50=True)
    sand = history(flow, stage_plan(), at)
    coarse = history(flow, stage_plan(), at, layer=BedLayer(name="gravel", top_level_m=-12.0, d50_mm=1.0))
    alone = history(flow, stage_plan(), place(), bed=Bed(d50_mm=1.0))
    assert coarse.critical_velocity_m_s == alone.critical_velocity_m_s > sand.critical_velocity_m_s
    np.testing.assert_array_equal(coarse.alpha, sand.alpha)
    np.testing.assert_array_equal(coarse.signed_velocity_m_s, sand.signed_velocity_m_s)
    clay = BedLayer(name="clay", top_level_m=-12.0, d50_mm=0.02, critical_velocity_m_s=0.9)
    found = history(flow, stage_plan(), at, bed=Bed(critical_velocity_m_s=0.3), layer=clay)
    assert found.critical_velocity_m_s == 0.9
    (finding,) = found.findings
    assert (finding.code, finding.where) == ("grain-outside-evidence", "opening 'main gap', basin side, layer 'clay'")


def test_a_layer_that_says_nothing_of_its_threshold_is_refused(sine_stage, stage_plan, place):
    with pytest.raises(PlanError, match=r"bed\.layer 'peat': give the grain size d50_mm, or critical_velocity_m_s"):
        history(sine_stage(), stage_plan(), place(), layer=BedLayer(name="peat", top_level_m=-12.0))
    rough = BedLayer(name="boulders", top_level_m=-12.0, d50_mm=1e5)
    with pytest.raises(DomainError, match=r"basin side, layer 'boulders': the depth of .* roughness"):
        history(sine_stage(), stage_plan(), place(), layer=rough)


def test_spreading_is_told_beside_what_the_cautious_way_gives(sine_stage, stage_plan, place):
    assert not history(sine_stage(), stage_plan(), place()).findings
    # Within six widths a plane jet is no slower.
    assert not history(sine_stage(), stage_plan(), place(spreading="plane-jet")).findings
    findings = history(sine_stage(), stage_plan(), place(spreading="fixed-rate", widening=0.25)).findings
    assert [(f.severity, f.code) for f in findings] == [("note", "spreading-lowers-velocity")]
    # 4000 / (445 x 10) and 4000 / (400 x 10).
    assert "at most 0.90 m/s; it would be 1.00 m/s with 'none', 1.00 m/s with 'plane-jet'" in findings[0].message
    assert "(fixed rate: 0.25 per side)" in findings[0].message
    jet = place(spreading="plane-jet", length_m=300.0)
    (finding,) = history(sine_stage(discharge=400.0, width=20.0), stage_plan(), jet).findings
    # 400 / (20 x 10) = 2; 3.5 / sqrt(30) of it; 20 of 20 + 2 x 300 / 8 m.
    assert "1.28 m/s; it would be 2.00 m/s with 'none', 0.42 m/s with 'fixed-rate'" in finding.message


def test_what_is_missing_is_named(sine_stage, stage_plan, place):
    with pytest.raises(PlanError, match=r"bed: give the grain size d50_mm, or critical_velocity_m_s"):
        history(sine_stage(), stage_plan(), place(), bed=Bed())
    with pytest.raises(PlanError, match=r"protection\.basin: chezy_m05_s or alpha .* 'main gap'"):
        history(sine_stage(), stage_plan(), place(chezy_m05_s=None))
    with pytest.raises(DomainError, match=r"'sill', opening 'main gap', basin side: .*roughness"):
        history(sine_stage(), stage_plan(), place(), bed=Bed(d50_mm=0.25).model_copy(update={"roughness_d50": 1e6}))


@pytest.mark.parametrize(("d50", "reason"), [(0.09, "cohesion"), (2.1, "not tested"), (0.1, None), (2.0, None)])
def test_grains_outside_the_evidence_are_told(sine_stage, stage_plan, place, d50, reason):
    findings = history(sine_stage(), stage_plan(), place(), bed=Bed(d50_mm=d50)).findings
    assert [f.code for f in findings] == (["grain-outside-evidence"] if reason else [])
    assert history(sine_stage(), stage_plan(), place(d50_mm=d50), bed=Bed(d50_mm=0.3)).findings == findings
    assert all(f.severity == "warning" and reason in f.message for f in findings)


def test_a_threshold_far_from_the_closed_form_is_told(sine_stage, stage_plan, place):
    usual = Bed(d50_mm=0.25, d90_mm=0.40)
    assert not history(sine_stage(), stage_plan(), place(), bed=usual).findings
    far = Bed(d50_mm=0.25, d90_mm=0.40, grain_density_kg_m3=1500.0)
    (finding,) = history(sine_stage(), stage_plan(), place(), bed=far).findings
    assert (finding.severity, finding.code) == ("note", "threshold-forms-differ")
    # van Rijn 1984 by hand: 0.19 x 0.00025 ** 0.1 x log10(4 x 10 / 0.0004) = 0.19 x 0.43631 x 5.
    assert "gives 0.414 m/s" in finding.message
    for other in (
        Bed(d50_mm=0.25, grain_density_kg_m3=1500.0),
        Bed(d50_mm=0.25, d90_mm=0.4, critical_velocity_m_s=0.9),
    ):
        assert not history(sine_stage(), stage_plan(), place(), bed=other).findings


def test_a_given_velocity_is_taken_as_it_is(sine_stage, stage_plan, place):
    flow = sine_stage(velocity=1.5)
    for side, sign in (("basin", 1.0), ("sea", -1.0)):
        found = history(
            flow, stage_plan(), place(side, spreading="fixed-rate", widening=0.2, local_velocity_factor=1.4, alpha=2.0)
        )
        np.testing.assert_array_equal(found.signed_velocity_m_s, sign * flow.openings[0].given_end_velocity_m_s)


def test_supercritical_flow_is_one_error(sine_stage, stage_plan, place):
    # Froude number 1 at 9.905 m/s in 10 m; a sine with the peak 19.81 m/s is over it in 2/3 of the flood.
    findings = history(sine_stage(velocity=19.809), stage_plan(), place(alpha=2.0)).findings
    assert [(f.severity, f.code) for f in findings] == [("error", "swept-out-jump")]
    assert "67 % of the time with flow" in findings[0].message
    assert "Froude number up to 2.00" in findings[0].message
    assert "tailwater" not in findings[0].message


def test_a_swept_out_jump_is_an_error_though_the_flow_would_be_calm(sine_stage, stage_plan, place):
    # q = 10 m2/s under an energy of 12 m: y1 = 0.67073 m, y2 = 5.188 m by bisection and the formula of the jump; a
    # tailwater of 5 m does not hold it, at a Froude number of 10 / 5 / sqrt(5 g) = 0.29.
    flow = sine_stage(discharge=4000.0, sea=2.5, basin=-4.5)
    findings = history(flow, stage_plan(alpha_basin=3.0), place()).findings
    assert [(f.severity, f.code) for f in findings] == [("error", "swept-out-jump")]
    assert "Froude number up to 0.29" in findings[0].message
    assert "tailwater up to 0.19 m under" in findings[0].message
    held = sine_stage(discharge=4000.0, sea=2.5, basin=-4.3)
    assert not history(held, stage_plan(alpha_basin=3.0), place()).findings
