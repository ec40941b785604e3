import numpy as np
import pytest

from tidescour.bed.alpha import relative_turbulence
from tidescour.bed.history import bed_history
from tidescour.errors import DomainError
from tidescour.plan.models import Water
from tidescour.plan.models_bed import Bed

TABLE = {"alpha_lengths_m": (60.0, 100.0, 200.0), "alpha_values": (3.0, 2.6, 2.4), "chezy_m05_s": None}


@pytest.fixture(scope="module")
def row(sine_stage, stage_plan, place):
    """Return what the bed feels on the basin side; `search_m` is a length of the search."""

    def build(crest=(-6.0, -6.0), search_m=None, stage_alpha=None, discharge=4000.0, **changes):
        flow = sine_stage(crest=crest, discharge=discharge)
        stage = stage_plan(alpha_basin=stage_alpha)
        return bed_history(stage, flow, flow.openings[0], place(**changes), Bed(d50_mm=0.25), Water(), search_m)

    return build


@pytest.mark.parametrize(("length", "expected"), [(60.0, 3.0), (70.0, 2.9), (100.0, 2.6), (150.0, 2.5), (200.0, 2.4)])
def test_alpha_of_the_table_is_linear_between_its_lengths(row, length, expected):
    found = row(length_m=length, **TABLE)
    assert found.alpha_ref == pytest.approx(expected)
    np.testing.assert_allclose(found.alpha, expected)
    assert row(search_m=length, **TABLE).alpha_ref == found.alpha_ref


def test_the_search_may_go_beyond_the_table_but_not_short_of_it(row):
    assert row(search_m=1000.0, **TABLE).alpha_ref == 2.4
    with pytest.raises(DomainError, match=r"59.0 m is outside the lengths .* from 60 to 200 m"):
        row(search_m=59.0, **TABLE)


@pytest.mark.parametrize("length", [59.0, 201.0])
def test_a_protection_outside_its_table_is_refused_with_what_to_write(row, length):
    with pytest.raises(
        DomainError, match=r"'sill', opening 'main gap', basin side: .* Write a length_m .*alpha_basin ="
    ):
        row(length_m=length, **TABLE)
    assert row(length_m=length, stage_alpha=2.5, **TABLE).alpha_ref == 2.5
    assert np.isnan(row(length_m=length, discharge=0.0, **TABLE).alpha_ref)


def test_alpha_of_the_stage_and_of_the_place_go_before_the_table(row):
    assert row(stage_alpha=3.3, **TABLE).alpha_ref == 3.3
    assert row(alpha=2.2, **TABLE).alpha_ref == 2.2
    assert row(**(TABLE | {"chezy_m05_s": 40.0})).alpha_ref == pytest.approx(2.7)


def test_turbulence_is_that_of_the_formula(row):
    for chezy in (40.0, 60.0):
        found = row(crest=(-7.5, -4.5), chezy_m05_s=chezy)
        flowing = found.velocity_m_s > 0.0
        sill = np.linspace(2.0, 5.0, 1491)[flowing]
        np.testing.assert_allclose(found.turbulence[flowing], relative_turbulence(sill, 10.0, 90.0, chezy), rtol=1e-9)
        mean = relative_turbulence(np.array([3.5]), 10.0, 90.0, chezy)
        np.testing.assert_allclose(found.turbulence_ref, mean, rtol=1e-9)


@pytest.mark.parametrize(
    ("alpha", "chezy", "expected"),
    [
        (3.0, 40.0, 0.3),
        (3.0, None, 0.3),
        (3.0, 60.0, 0.2),
        # sqrt(1.45 x 9.81) / C of uniform flow, 3.77151 / 60 and, where C is not known, / 40.
        (1.6, 60.0, 0.0628585),
        (1.2, None, 0.0942878),
    ],
)
def test_turbulence_of_a_given_alpha_is_that_of_the_formula_solved_for_it(row, alpha, chezy, expected):
    found = row(stage_alpha=alpha, chezy_m05_s=chezy)
    assert found.turbulence_ref == pytest.approx(expected, abs=2e-6)
    np.testing.assert_allclose(found.turbulence, found.turbulence_ref)


def test_without_flow_there_is_no_turbulence(row):
    found = row(discharge=0.0)
    assert np.isnan(found.turbulence).all()
    assert np.isnan(found.turbulence_ref)
