"""Alphas of a saturating law for one depth: none in its jump, and r0 that goes with a larger alpha."""

from dataclasses import replace

import numpy as np
import pytest

from tidescour.scour.chain import chain_place
from tidescour.scour.comparison import equal_alphas
from tidescour.scour.durations import effective_duration
from tidescour.scour.records import RULES, CycleSet, RowDurations

TIDE = 12.42 * 3600.0
CYCLES = CycleSet(start_s=TIDE * np.arange(3.0), end_s=TIDE * np.arange(1.0, 4.0))
TIME = np.arange(0.0, 3.0 * TIDE + 27.0, 54.0)


def sine(peak):
    return peak * np.sin(2.0 * np.pi * TIME / TIDE)


def depth_of(bed, law, rule):
    row = RowDurations(layers=(effective_duration(bed, CYCLES, law, None),))
    return chain_place([row], law, 0.0, rule)[0].end_depth_m


def test_a_growth_that_lies_in_the_jump_has_no_alpha(bed_row, law_of):
    # Held, the peak of 0.76 m/s has h_e = (0.5 x 2.5 x 0.76 - 0.45) / 0.45 h0 = 1.11 h0; whatever alpha brings it to h0
    # jumps over the depth of the integral, which lies between both sides of the jump.
    law = law_of("saturating", 1.65)
    bed = bed_row(TIME, sine(0.76))
    wanted = depth_of(bed, law, "integral")
    # Both sides of the jump at alpha u = 4 u_c: 10 (1 - exp(-(t / t1)^0.4)) under it, all of h_e over it.
    t1_h = 330.0 * 100.0 * 1.65**1.7 / 1.35**4.3
    under = 10.0 * -np.expm1(-((3.0 * 6.21 / t1_h) ** 0.4))
    assert under < wanted < 10.0
    found = dict(zip(RULES, equal_alphas(bed, CYCLES, law, 2.5), strict=True))
    assert found["integral"] == 2.5
    assert np.isnan(found["peak-held"])
    # Away from the jump there is one.
    assert np.isfinite(equal_alphas(bed_row(TIME, sine(1.4)), CYCLES, law, 2.5)).all()


def test_with_a_larger_alpha_comes_the_turbulence_that_goes_with_it(bed_row, law_of):
    # A protection of Chezy 50: f_C = 1.25, r0 = (alpha - 1.5) / (5 x 1.25), not under sqrt(1.45 g) / 50.
    law = law_of("saturating", 1.65, equilibrium="turbulence")

    def bed(alpha):
        turbulence = max((alpha - 1.5) / 6.25, np.sqrt(1.45 * 9.81) / 50.0)
        plain = bed_row(TIME, sine(1.3), alpha=alpha)
        return replace(plain, turbulence=np.full(TIME.size, turbulence), turbulence_ref=turbulence, chezy_m05_s=50.0)

    wanted = depth_of(bed(2.5), law, "integral")
    found = equal_alphas(bed(2.5), CYCLES, law, 2.5)
    for rule, alpha in zip(RULES, found, strict=True):
        assert depth_of(bed(alpha), law, rule) == pytest.approx(wanted, rel=2e-3), rule
    assert min(found) < 2.2
    assert max(found) > 3.0
