import math
from pathlib import Path

import numpy as np
import pytest

from tidescour.bed.records import BedHistory
from tidescour.bed.stone import STABILITY
from tidescour.bed.stone_screening import stone_screening
from tidescour.gap.records import OpeningFlow, StageFlow
from tidescour.plan.models import Opening, Plan, Site, Water
from tidescour.plan.models_bed import Stone


@pytest.fixture(scope="session")
def screen(stage_plan):
    """Screen one stage: the sea 1 m over the basin, the crest `over` m under the basin, and its end velocity."""

    def build(over=2.0, stone=None, **changes):
        numbers = {"relation": "broad-crest", "parameters": {"coefficient": 1.0}} | changes
        opening = Opening(name="main gap", crest_level_m=-over, width_m=100.0, **numbers)
        stage = stage_plan().model_copy(update={"opening": (opening,)})
        plan = Plan(
            folder=Path("invented"),
            file=Path("invented/plan.toml"),
            site=Site(name="gap", datum="datum", latitude_deg=53.0),
            # rho 1023.34306 kg/m3: check value of UNESCO 44.
            water=Water(temperature_c=25.0, salinity_g_kg=35.0),
            stone=stone or Stone(),
            stage=(stage,),
        )
        time_s = np.array([1.8e9, 1.8e9 + 60.0])
        velocity = math.sqrt(2.0 * 9.81)
        unknown = np.full(2, np.nan)
        given = opening.end_velocity_series is not None
        one = OpeningFlow(
            name="main gap",
            level_sea_m=np.ones(2),
            crest_level_m=np.full(2, -over),
            width_m=np.full(2, 100.0),
            discharge_m3_s=unknown if given else np.full(2, 100.0 * over * velocity),
            gap_velocity_m_s=unknown if given else np.full(2, velocity),
            flow_width_m=np.full(2, 100.0),
            given_end_velocity_m_s=np.full(2, 2.0) if given else None,
        )
        flow = StageFlow(
            stage=stage.name,
            time_s=time_s,
            level_sea_m=np.ones(2),
            level_basin_m=np.zeros(2),
            covered=np.ones(2, dtype=bool),
            measured=False,
            routed=False,
            openings=(one,),
            inflow_m3_s=np.zeros(2),
        )
        rows = [
            BedHistory(
                stage=stage.name,
                opening="main gap",
                side=side,
                time_s=time_s,
                covered=flow.covered,
                signed_velocity_m_s=np.full(2, 2.0 if side == "basin" else -2.0),
                depth_m=np.full(2, 8.0),
                alpha=np.full(2, 2.5),
                alpha_ref=2.5,
                turbulence=np.full(2, 0.2),
                turbulence_ref=0.2,
                critical_velocity_m_s=0.45,
                reference_depth_m=8.0,
                protection_length_m=90.0,
                submerged_relative_density=1.59,
            )
            for side in ("sea", "basin")
        ]
        return stone_screening(plan, [flow], rows)

    return build


def sizes(screening):
    return {each.load.location: dict(zip(STABILITY, each.size_m, strict=True)) for each in screening.sizes}


def test_izbash_takes_the_velocity_head_and_the_density_of_the_stone_in_this_water(screen):
    found = sizes(screen(stone=Stone(density_kg_m3=2800.0)))["crest"]
    # Velocity head 1 m; 2800 / 1023.34306 - 1.
    density = 2800.0 / 1023.34306 - 1.0
    assert found["izbash-embedded"] == pytest.approx(1.0 / 1.44 / density, rel=1e-8)
    assert found["izbash-exposed"] == pytest.approx(1.0 / 0.7396 / density, rel=1e-8)


def test_the_end_is_an_edge_and_the_slope_factor_is_for_the_slope(screen):
    found = {each.load.location: each.demand for each in screen(stone=Stone(slope_factor=0.8)).sizes}
    assert {where: (each.stability_factor, each.slope_factor) for where, each in found.items()} == {
        "crest": (0.75, 1.0),
        "downstream slope": (0.75, 0.8),
        "end of protection": (1.5, 1.0),
    }


def test_each_form_has_its_own_shields_parameter_unless_the_plan_gives_one(screen):
    own = sizes(screen())["end of protection"]
    both = sizes(screen(stone=Stone(shields=0.03)))["end of protection"]
    assert both["shields"] == own["shields"]
    assert both["pilarczyk"] > own["pilarczyk"]
    # d^0.8 (d + h)^0.2 goes with 1 / psi.
    grown = both["pilarczyk"] ** 0.8 * (both["pilarczyk"] + 8.0) ** 0.2
    before = own["pilarczyk"] ** 0.8 * (own["pilarczyk"] + 8.0) ** 0.2
    assert grown / before == pytest.approx(0.035 / 0.03, rel=1e-9)


def test_every_screening_says_what_it_is_and_which_numbers_it_took(screen):
    finding = screen().findings[0]
    assert (finding.severity, finding.code) == ("note", "stone-screening")
    assert "screening only, not a design of the protection" in finding.message
    assert "0.03 (Shields form) and 0.035 (Pilarczyk), from memory" in finding.message


def test_where_a_form_has_no_size_the_others_stand_and_the_reason_is_told_once(screen):
    screening = screen(over=0.3)
    found = sizes(screening)
    assert math.isnan(found["crest"]["shields"])
    assert found["crest"]["pilarczyk"] > 0.0
    without = [finding for finding in screening.findings if finding.code == "stone-without-size"]
    assert [finding.where for finding in without] == ["stone, crest", "stone, downstream slope"]
    assert without[0].message.startswith(
        "in 1 of its rows, the first in stage 'sill', opening 'main gap', flood: shields has no size: water of 0.3 m"
    )
    assert "too shallow" in without[0].message


def test_sizes_over_a_fifth_of_the_depth_are_told(screen):
    deep, shallow = screen(over=40.0), screen(over=2.1)
    assert [finding.code for finding in deep.findings] == ["stone-screening"]
    told = {(finding.where, finding.message.split(": ")[1].split()[0]): finding for finding in shallow.findings[1:]}
    codes = {(form, finding.code) for (_, form), finding in told.items()}
    # The form that a finding is about is the only one whose range it says was left.
    assert codes >= {("shields", "shields-in-shallow-water"), ("pilarczyk", "pilarczyk-in-shallow-water")}
    assert codes <= {(form, code) for form in STABILITY for code in STABILITY[form].left_by}
    size = sizes(shallow)["downstream slope"]["pilarczyk"]
    message = told["stone, downstream slope", "pilarczyk"].message
    assert f"asks for {size:.2f} m in 2.10 m of water" in message


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"relation": "rubble-dam", "parameters": {}}, "water runs between the stones"),
        ({"relation": None, "end_velocity_series": "model"}, "that in the gap is not known"),
    ],
)
def test_openings_without_a_velocity_over_the_stone_are_named(screen, changes, words):
    screening = screen(**changes)
    assert [size.load.location for size in screening.sizes] == ["end of protection"]
    finding = next(finding for finding in screening.findings if finding.code == "stone-not-judged")
    assert finding.where == "stage 'sill', opening 'main gap'"
    assert words in finding.message
