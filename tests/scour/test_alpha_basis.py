"""A given alpha that was found with another tide rule than the one that drives growth."""

from datetime import UTC, datetime

import numpy as np
import pytest

from tidescour.plan.models import Opening, Stage
from tidescour.scour.comparison import alpha_basis_findings, alpha_in_rule
from tidescour.scour.laws import LAWS
from tidescour.scour.records import CycleSet

TIDE = 44712.0
TIME = np.arange(0.0, 2.0 * TIDE + 1.0, 120.0)
CYCLES = CycleSet(start_s=[0.0, TIDE], end_s=[TIDE, 2.0 * TIDE])
LAW = LAWS["explicit"].function(1.65)


def stage(**alphas):
    opening = Opening(name="main gap", crest_level_m=-6.0, width_m=100.0, relation="broad-crest", **alphas)
    return Stage(
        name="sill",
        start=datetime(2027, 4, 1, tzinfo=UTC),
        end=datetime(2027, 4, 2, tzinfo=UTC),
        opening=(opening,),
    )


@pytest.fixture
def bed(bed_row):
    return bed_row(TIME, 1.4 * np.sin(2.0 * np.pi * TIME / TIDE), alpha=2.4)


@pytest.mark.parametrize(
    ("of_place", "of_stage"),
    [
        ({"alpha": 2.4}, {}),
        ({"alpha_lengths_m": (50.0, 150.0), "alpha_values": (2.8, 2.0)}, {}),
        ({}, {"alpha_basin": 2.4}),
    ],
)
def test_the_note_tells_what_the_driving_rule_needs_wherever_alpha_is_given(place, bed, of_place, of_stage):
    own = place(alpha_basis="cycle-mean", **of_place)
    (note,) = alpha_basis_findings(own, [stage(**of_stage)], [bed], [CYCLES], LAW, "integral")
    # Under the integral less alpha does what the mean over the cycle needs more for.
    needed = alpha_in_rule(bed, CYCLES, LAW, "cycle-mean", "integral")
    assert needed < 2.4
    assert (note.severity, note.code, note.where) == (
        "note",
        "alpha-in-other-rule",
        "opening 'main gap', basin side",
    )
    assert note.message.endswith(f"integral needs {needed:.3g} instead of 2.4 in stage 'sill'")


def test_there_is_no_note_where_rules_agree_alpha_is_computed_or_nothing_moves(place, bed, bed_row):
    planned = stage()
    assert alpha_basis_findings(place(alpha=2.4), [planned], [bed], [CYCLES], LAW, "integral") == ()
    other = place(alpha_basis="flow-mean")
    assert alpha_basis_findings(other, [planned], [bed], [CYCLES], LAW, "integral") == ()
    assert alpha_basis_findings(other, [stage(alpha_sea=2.4)], [bed], [CYCLES], LAW, "integral") == ()
    still = bed_row(TIME, np.zeros_like(TIME), alpha=np.nan)
    given = place(alpha=2.4, alpha_basis="flow-mean")
    assert alpha_basis_findings(given, [planned], [still], [CYCLES], LAW, "integral") == ()
