"""Alpha that each way of counting a tide would need for one depth."""

import numpy as np
import pytest
from scipy.special import gamma as gamma_function

from tidescour.scour.chain import chain_place
from tidescour.scour.comparison import alpha_in_rule, equal_alphas
from tidescour.scour.durations import effective_duration
from tidescour.scour.laws import LAWS
from tidescour.scour.records import RULES, CycleSet, RowDurations

TIDE = 12.42 * 3600.0


def tides(count, step=54.0):
    time = np.arange(0.0, count * TIDE + step / 2.0, step)
    return time, 2.0 * np.pi * time / TIDE


def whole(count):
    edges = TIDE * np.arange(count + 1)
    return CycleSet(start_s=edges[:-1], end_s=edges[1:])


def depth_of(bed, cycles, law, rule):
    """Depth from a flat bed under one rule, through hours and chain."""
    row = RowDurations(layers=(effective_duration(bed, cycles, law, None),))
    return chain_place([row], law, 0.0, rule)[0].end_depth_m


@pytest.mark.parametrize("name", ["explicit", "time-scale"])
def test_without_a_threshold_the_alphas_of_a_sine_are_closed(bed_row, law_of, name):
    # Depths go with alpha^q. Over a half tide <sin^p> = Gamma((p + 1) / 2) / (sqrt(pi) Gamma(p / 2 + 1)); the integral
    # gives <sin^(q / 0.4)>^0.4, its mean <sin^q>, over the whole tide half of that and 2^0.4, the peak 1, the mean
    # velocity (2 / pi)^q.
    def mean_of_power(p):
        return gamma_function((p + 1.0) / 2.0) / (np.sqrt(np.pi) * gamma_function(p / 2.0 + 1.0))

    time, phase = tides(2, step=27.0)
    law = law_of(name)
    q = law.velocity_exponent
    strict, mean = mean_of_power(q / 0.4) ** 0.4, mean_of_power(q)
    found = equal_alphas(bed_row(time, 1.4 * np.sin(phase), critical=1e-12), whole(2), law, 2.5)
    depths = (strict, mean, 0.5 * mean * 2.0**0.4, 1.0, (2.0 / np.pi) ** q)
    wanted = [2.5 * (strict / depth) ** (1.0 / q) for depth in depths]
    assert found == pytest.approx(wanted, rel=1e-5)
    # An alpha found with the mean over the whole tide is nearly one and a half times that of the integral.
    assert found[2] / found[0] == pytest.approx(1.461, abs=5e-3)


@pytest.mark.parametrize("name", LAWS)
@pytest.mark.parametrize("swing", [0.0, 0.6])
def test_the_alpha_found_gives_the_depth_of_the_integral_in_its_own_rule(bed_row, law_of, name, swing):
    time, phase = tides(4)
    law = law_of(name)

    def bed(factor=1.0):
        return bed_row(
            time,
            1.4 * np.sin(phase) * (1.0 + 0.2 * np.cos(phase / 4.0)),
            depth=9.0 + swing * np.sin(phase + 0.5),
            alpha=factor * (2.2 + swing * np.sin(phase / 8.0)),
        )

    alpha = bed().alpha_ref
    wanted = depth_of(bed(), whole(4), law, "integral")
    found = equal_alphas(bed(), whole(4), law, alpha)
    assert found[0] == alpha
    # The published saturating form jumps where the equilibrium is as deep as the water: so do means over few steps.
    near = 2e-3 if name == "saturating" else 1e-5
    for rule, needed in zip(RULES, found, strict=True):
        assert depth_of(bed(needed / alpha), whole(4), law, rule) == pytest.approx(wanted, rel=near)
    assert found[3] < alpha < found[1] < found[2]
    assert alpha < found[4]


@pytest.mark.parametrize("rule", RULES)
def test_alpha_of_a_rule_in_another_and_back(bed_row, rule):
    time, phase = tides(3)
    law = LAWS["explicit"].function(1.65)

    def bed(alpha):
        return bed_row(time, 1.4 * np.sin(phase), alpha=alpha)

    moved = alpha_in_rule(bed(2.4), whole(3), law, rule, "integral")
    assert depth_of(bed(moved), whole(3), law, "integral") == pytest.approx(
        depth_of(bed(2.4), whole(3), law, rule), rel=1e-5
    )
    assert alpha_in_rule(bed(moved), whole(3), law, "integral", rule) == pytest.approx(2.4, rel=1e-5)


def test_alpha_scales_with_velocities(bed_row):
    # Threshold and velocity times 3: the same alphas.
    time, phase = tides(2)
    law = LAWS["explicit"].function(1.65)
    one, three = (
        equal_alphas(bed_row(time, k * np.sin(phase), critical=k * 0.45), whole(2), law, 2.5) for k in (1.0, 3.0)
    )
    assert three == pytest.approx(one, rel=1e-6)


def test_there_is_no_alpha_where_nothing_moves_or_none_serves(bed_row):
    time, phase = tides(2)
    law = LAWS["explicit"].function(1.65)
    still = bed_row(time, 0.1 * np.sin(phase))
    assert np.isnan(equal_alphas(still, whole(2), law, 2.5)).all()
    away = bed_row(time, -np.abs(np.sin(phase)), alpha=np.nan)
    assert np.isnan(equal_alphas(away, whole(2), law, np.nan)).all()
    assert np.isnan(alpha_in_rule(away, whole(2), law, "flow-mean", "integral"))
    # One short burst in a tide at rest, hardly over 0 otherwise: the mean velocity would need far more than 20 times.
    burst = bed_row(time, np.where(np.abs(time - 0.5 * TIDE) < 120.0, 3.0, 1e-3), critical=0.45)
    assert np.isnan(equal_alphas(burst, whole(2), law, 2.5)[4])
