"""A small closure: a sea, a river and one gap that is narrowed, with a depth in closed form."""

import pytest

from tidescour import pipeline
from tidescour.bed.water import submerged_relative_density
from tidescour.pipeline.inputs import tidal_inputs
from tidescour.pipeline.places import place_result, surface_beds
from tidescour.pipeline.preparing import cases_of, given_series, stage_flows, waters_of
from tidescour.plan.loader import read_plan
from tidescour.scour.laws import LAWS

RIVER_M3_S, SEA_M, BED_M, ALPHA, CRITICAL_M_S = 3000.0, 0.1, -10.0, 2.4, 0.42
SITE = f"""
[site]
name = "Invented gap"
datum = "invented datum"
latitude_deg = 54.0
[tide]
sea_constants = "constants.csv"
sea_mean_m = {SEA_M}
[basin]
level_m = [-3.0, 3.0]
area_m2 = [1.5e7, 1.5e7]
inflow_m3_s = RIVER
start_level_m = 0.25
[bed]
critical_velocity_m_s = {CRITICAL_M_S}
[protection.basin]
length_m = 90.0
bed_level_m = {BED_M}
alpha = {ALPHA}
failure_slope_cot = 8.0
[protection.sea]
length_m = 90.0
bed_level_m = {BED_M}
alpha = {ALPHA}
failure_slope_cot = 8.0
[series.storm]
file = "storm.csv"
quantity = "level"
unit = "m"
utc_offset = "+00:00"
"""
STAGE = """
[[stage]]
name = "{name}"
start = 2027-{start}T00:00:00Z
end = 2027-{end}T00:00:00Z
sea = "{sea}"
[[stage.opening]]
name = "gap"
crest_level_m = -6.0
width_m = {width}
relation = "broad-crest"
coefficient = 0.95
"""
_WIDE = {"name": "wide", "start": "04-01", "end": "04-07", "sea": "tide", "width": 300}
_NARROW = {"name": "narrow", "start": "04-07", "end": "04-15", "sea": "tide", "width": 240}


@pytest.fixture
def wide():
    """Return a stage of six days."""
    return _WIDE


@pytest.fixture
def narrow():
    """Return the stage of eight days that follows it."""
    return _NARROW


@pytest.fixture
def make_plan(tmp_path):
    """Return the builder of plans: stages, the river, the tide as rows of constants, and more lines."""

    def build(*stages, river=RIVER_M3_S, tide="M2,0.00001,0", more="", alpha=f"alpha = {ALPHA}"):
        text = (
            SITE.replace("RIVER", str(river)).replace(f"alpha = {ALPHA}", alpha)
            + more
            + "".join(STAGE.format(**stage) for stage in stages)
        )
        (tmp_path / "constants.csv").write_text(f"constituent,amplitude_m,phase_deg\n{tide}\n", encoding="utf-8")
        rows = (f"2027-04-{day:02d}T{hour:02d}:00:00Z,0.1" for day in range(1, 17) for hour in range(24))
        (tmp_path / "storm.csv").write_text("time,level_m\n" + "\n".join(rows) + "\n", encoding="utf-8")
        path = tmp_path / "plan.toml"
        path.write_text(text, encoding="utf-8")
        return read_plan(path, pipeline.plan_choices())

    return build


@pytest.fixture
def reread(tmp_path):
    """Return what reads the plan that was made once more, with pieces of its text replaced."""

    def again(*replaced):
        path = tmp_path / "plan.toml"
        text = path.read_text(encoding="utf-8")
        for old, new in replaced:
            assert old in text
            text = text.replace(old, new)
        path.write_text(text, encoding="utf-8")
        return read_plan(path, pipeline.plan_choices())

    return again


@pytest.fixture(scope="session")
def outcome():
    """Return what a plan does at its opening: the case and the result, by side."""
    return _outcome


def _outcome(plan):
    law = LAWS[plan.scour.law].function(submerged_relative_density(10.0, 30.0, 2650.0), plan.scour)
    waters = waters_of(plan, tidal_inputs(plan), given_series(plan))
    cases = cases_of(plan, law, stage_flows(plan, waters, lambda step: None))
    beds = surface_beds(cases)
    return {each.place.side: (each, place_result(each, beds[each.place.opening, each.place.side])) for each in cases}


@pytest.fixture(scope="session")
def river_depth():
    """Return the depth by the explicit law in closed form: states add up, each h^2.5 / t of its own width."""
    return _river_depth


def _river_depth(days):
    water, density = SEA_M - BED_M, submerged_relative_density(10.0, 30.0, 2650.0)
    state = 0.0
    for name, width in (("wide", 300.0), ("narrow", 240.0)):
        excess = ALPHA * RIVER_M3_S / (width * water) - CRITICAL_M_S
        state += (excess**1.7 * water**0.2 / (10.0 * density**0.7)) ** 2.5 * 24.0 * days[name]
    return state**0.4
