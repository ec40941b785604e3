"""Growth through layers, recomputed from two tables of the hand-off alone: no record of the run is looked at."""

import types

import numpy as np
import pytest

from tidescour.bed.water import submerged_relative_density
from tidescour.handoff.design_tables import layers_table
from tidescour.handoff.results_tables import durations_table
from tidescour.handoff.tables import row_objects

LAYERS = "".join(
    f'[[bed.layer]]\nname = "{name}"\ntop_level_m = {top}\ncritical_velocity_m_s = {critical}\n'
    for name, top, critical in (("shells", -10.5, 0.7), ("silt", -11.4, 0.3), ("clay", -12.6, 0.9))
)
FACTOR = 0.9
TIDAL = {"river": 0.0, "tide": "M2,1.5,40\nS2,0.5,80", "alpha": f"chezy_m05_s = 45.0\ngrowth_factor = {FACTOR}"}


def own_depth_m(law, row, hours):
    """Depth from a flat bed on the curve of a row, by the law itself with the growth factor."""
    density, water_m = submerged_relative_density(10.0, 30.0, 2650.0), row["reference_depth_m"]
    attack = row["alpha"] * row["reference_velocity_m_s"]
    excess = attack - row["critical_velocity_m_s"]
    if law == "explicit":
        return FACTOR * excess**1.7 * water_m**0.2 * hours**0.4 / (10.0 * density**0.7)
    t1_h = 330.0 * water_m**2 * density**1.7 / excess**4.3
    limit_m = water_m * (0.5 * attack / row["critical_velocity_m_s"] - 1.0)
    return FACTOR * limit_m * (1.0 - np.exp(np.log(1.0 - water_m / limit_m) * (hours / t1_h) ** 0.4))


@pytest.fixture
def handed_off(make_plan, wide, narrow, outcome):
    """Return the rows of durations and of layers of a tide through layers, under one law."""

    def build(law):
        plan = make_plan(wide, narrow, more=f'{LAYERS}[scour]\nlaw = "{law}"\n', **TIDAL)
        results = types.SimpleNamespace(plan=plan, places=[result for _, result in outcome(plan).values()])
        return row_objects(durations_table(results)), row_objects(layers_table(results))

    return build


def spells(row, layers):
    """A row of the durations and the layers it reaches: each with its hours and the depths between which it is dug."""
    keys = ("stage", "opening", "side")
    reached = [each for each in layers if all(each[key] == row[key] for key in keys)]
    begins = [row["start_depth_m"], *(each["depth_m"] for each in reached)]
    hours = [row["effective_duration_spent_h"], *(each["effective_duration_h"] for each in reached)]
    return list(zip([row, *reached], hours, begins, [*begins[1:], row["end_depth_m"]], strict=True))


def dug_by(law, row, layers):
    """What a share is of: h^2.5 gained, or the hours in each layer times E^4.3 h0^0.5 there."""
    if law == "explicit":
        return row["end_depth_m"] ** 2.5 - row["start_depth_m"] ** 2.5
    return sum(
        hours
        * (each["alpha"] * each["reference_velocity_m_s"] - each["critical_velocity_m_s"]) ** 4.3
        * each["reference_depth_m"] ** 0.5
        for each, hours, _, _ in spells(row, layers)
    )


@pytest.mark.parametrize("law", ["explicit", "saturating"])
def test_equivalent_start_and_hours_lead_from_layer_to_layer_and_make_the_shares(handed_off, law):
    rows, layers = handed_off(law)
    assert {(row["side"], row["layer"]) for row in layers} >= {
        (side, name) for side in ("sea", "basin") for name in ("shells", "silt")
    }
    for row in rows:
        for each, hours, begin_m, end_m in spells(row, layers):
            start_h = each["equivalent_start_h"]
            assert own_depth_m(law, each, start_h) == pytest.approx(begin_m, rel=1e-9)
            assert own_depth_m(law, each, start_h + hours) == pytest.approx(end_m, rel=1e-9)
    for side in ("sea", "basin"):
        own = [row for row in rows if row["side"] == side]
        dug = np.array([dug_by(law, row, layers) for row in own])
        assert [row["share_percent"] for row in own] == pytest.approx((100.0 * dug / np.sum(dug)).tolist(), rel=1e-9)
