from pathlib import Path

import pytest

from tidescour.errors import PlanError
from tidescour.plan.choices import Choices
from tidescour.plan.loader import read_plan
from tidescour.plan.models import Plan
from tidescour.table import Parameter

# An invented gap; every kind of table stands in it once.
PLAN = """
[site]
name = "Invented gap"
datum = "site datum"
latitude_deg = 53.4

[records.sea]
files = ["sea_*.csv"]
utc_offset = "+00:00"
unit = "m"
sensor_range_m = [-4.0, 5.0]
exclude = [[2026-02-01T00:00:00Z, 2026-02-02T00:00:00Z]]

[records.basin]
files = ["basin.csv"]
time = ["date", "clock"]
level = 2
time_format = "%d-%m-%Y %H:%M"
time_zone = "Europe/Amsterdam"
unit = "cm"
stamp = "mean-centred"
averaging_s = 600

[[correction]]
side = "basin"
from = 2026-03-01T00:00:00Z
to = 2026-03-20T00:00:00Z
shift_m = 0.12
evidence = "levelled again"

[series.storm]
file = "storm.csv"
quantity = "level"
utc_offset = "+00:00"
unit = "m"

[series.model]
file = "model.csv"
quantity = "discharge"
value = "q"
utc_offset = "+00:00"
unit = "m3/s"

[series.jet]
file = "jet.csv"
quantity = "velocity"
value = "u"
utc_offset = "+00:00"
unit = "m/s"

[tide]
constituents = ["M2", "S2", "N2"]
infer = { K2 = ["S2", 0.272, 0.0] }

[basin]
level_m = [-3.0, 0.0, 3.0]
area_m2 = [1.4e7, 2.0e7, 2.6e7]

[bed]
d50_mm = 0.25
d90_mm = 0.40

[protection.basin]
length_m = 90
bed_level_m = -9.0
chezy_m05_s = 40.0
failure_slope_cot = 6.0

[protection.basin.opening."shoal"]
bed_level_m = -3.0
d50_mm = 0.2

[protection.sea]
length_m = 80.0
bed_level_m = -8.5
alpha = 2.4
failure_slope_cot = 7.0

[scour]
law = "explicit"

[[stage]]
name = "sill to -6"
start = 2027-04-01T00:00:00Z
end = 2027-05-11T00:00:00+02:00

[[stage.opening]]
name = "main gap"
crest_level_m = -6.0
crest_level_end_m = -5.0
width_m = 400.0
relation = "broad-crest"
coefficient = 0.95

[[stage.opening]]
name = "shoal"
crest_level_m = -2.0
width_m = 250
relation = "broad-crest"
coefficient = 1

[[stage]]
name = "sill to -4"
start = 2027-05-11T00:00:00Z
end = 2027-06-20T00:00:00Z
sea = "measured"
basin = "measured"

[[stage.opening]]
name = "main gap"
crest_level_m = -4.0
width_m = 400.0
alpha_basin = 3.0
relation = "stone"
porosity = 0.4
stone_m = 0.6
"""


# The same gap with all that other kinds of openings, the basin and a calibration may have, and the tables it names.
FULL = (
    PLAN.replace(
        "level_m = [-3.0, 0.0, 3.0]\narea_m2 = [1.4e7, 2.0e7, 2.6e7]\n",
        """table = "hypsometry.csv"
table_column = "volume_m3"
length_m = 8000
depth_m = 4.5

[[basin.inflow]]
name = "river"
discharge_m3_s = 12

[[basin.inflow]]
name = "pumps"
series = "model"

[[basin.side_opening]]
name = "sluice"
crest_level_m = -3.0
width_m = 20.0
relation = "broad-crest"
coefficient = 0.9
sea_lag_s = 300
sea_factor = 1.02
sea_shift_m = -0.05
flow_length_m = 60
""",
    ).replace(
        "crest_level_m = -2.0\nwidth_m = 250\n", 'profile = "survey.csv"\nprofile_from_m = 10\nprofile_to_m = 30\n'
    )
    + """
[calibration]
start = 2026-03-01T00:00:00Z
end = 2026-04-01T00:00:00Z
fit = ["coefficient", "datum_offset_m"]
discharge_file = "campaign.csv"

[[calibration.opening]]
name = "gap of March"
profile = "survey.csv"
crest_level_m = -6.5
relation = "broad-crest"
coefficient = 0.95

[[discharge]]
time = 2026-03-10T09:30:00Z
discharge_m3_s = -2400
standard_error_m3_s = 120
"""
)
# The same plan with all that the design of the protection may have.
DESIGN = (
    FULL.replace(
        "d90_mm = 0.40\n",
        """d90_mm = 0.40
velocity_profile = "log-law"
critical_velocity_m_s = 0.9
fines_percent = 22
critical_velocity_evidence = "erosion tests on four cores"

[[bed.layer]]
name = "clean sand"
top_level_m = -11.0
d50_mm = 0.3
fines_percent = 2

[[bed.layer]]
name = "silty sand"
top_level_m = -14.0
d50_mm = 0.15
fines_percent = 15

[[bed.layer]]
name = "stiff clay"
top_level_m = -19.0
critical_velocity_m_s = 1.4
critical_velocity_evidence = "flume tests"
fines_percent = 60
""",
    )
    .replace(
        "failure_slope_cot = 6.0\n",
        """failure_slope_cot = 6.0
upstream_slope_cot = 3.0
spreading = "fixed-rate"
widening = 0.1
depth_margin_factor = 1.2
growth_factor = 0.9
stop_depth_m = 12
stop_slope_cot = 3.0
stop_slope_height_m = 5.0
""",
    )
    .replace(
        "bed_level_m = -3.0\n",
        """bed_level_m = -3.0
spreading = "plane-jet"
widening = 0
alpha_lengths_m = [60, 90, 150]
alpha_values = [2.6, 2.4, 2.4]
""",
    )
    .replace(
        'law = "explicit"\n',
        """law = "model-curve"
time_constant = 280
time_exponent = 0.38
curve_file = "curve.csv"
curve_source = "physical model 1 in 60"
""",
    )
    .replace('name = "sill to -6"\n', 'name = "sill to -6"\nplanned_start = 2027-03-15T00:00:00Z\n')
    .replace(
        "end = 2027-05-11T00:00:00+02:00\n",
        "end = 2027-05-11T00:00:00+02:00\nplanned_end = 2027-04-24T00:00:00Z\n",
    )
    + """
[soundings]
file = "soundings.csv"
prior_scatter = 0.25
growth_scatter = 0.05

[[sounding]]
date = 2027-05-20T12:00:00Z
opening = "main gap"
side = "basin"
depth_m = 3.6
standard_error_m = 0.3
upper_slope_cot = 4

[[load_case]]
name = "storm of ten years"
stage = "sill to -4"
series = "storm"

[stone]
density_kg_m3 = 2700
shields = 0.03
stability_factor = 0.75
edge_stability_factor = 1.25
slope_factor = 0.9

[[filter]]
name = "bed"
d10_mm = 0.12
d15_mm = 0.15
d60_mm = 0.28
d85_mm = 0.35

[[filter]]
name = "gravel"
d15_mm = 1.2
d85_mm = 4
"""
)
TABLES = {
    "curve.csv": "time_over_t1,depth_over_water_depth,note\n0.01,0.17,\n1,1.01,\n3,1.5,end of the test\n",
    "soundings.csv": (
        "date,opening,side,depth_m,bed_level_m,standard_error_m,upper_slope_cot\n"
        "2027-05-20T12:00:00Z,shoal,basin,1.2,,0.3,\n"
        "2027-06-10T14:00:00+02:00,main gap,basin,,-13.4,0.25,3.5\n"
    ),
    "hypsometry.csv": "level_m,area_m2,volume_m3\n-3,1.4e7,0\n0,2.0e7,5.1e7\n3,2.6e7,1.2e8\n",
    "survey.csv": "distance_m,level_m,note\n0,2,west\n10,-4,\n20,-7,\n40,-5,\n40,1,wall\n50,2,east\n",
    "campaign.csv": (
        "time,opening,discharge_m3_s,standard_error_m3_s\n"
        "2026-03-10T10:00:00Z,gap of March,1800,90\n"
        "2026-03-10T11:30:00+01:00,all,2100,100\n"
        "2026-03-10T11:00:00Z,sluice,25,3\n"
    ),
}


def changed(text: str, *changes: tuple[str, str]) -> str:
    """Return a text in which the first place of each old piece has become the new one."""
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new, 1)
    return text


def refused(folder: Path, text: str, choices: Choices, purpose: str = "run") -> tuple[str, ...]:
    """Return the problems that a plan is refused for."""
    path = folder / "plan.toml"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(PlanError) as caught:
        read_plan(path, choices, purpose)
    return caught.value.problems


@pytest.fixture(scope="session")
def plan_text():
    return PLAN


@pytest.fixture(scope="session")
def full_text():
    return FULL


@pytest.fixture(scope="session")
def design_text():
    return DESIGN


@pytest.fixture
def full_tables(tmp_path):
    """Write the tables that the full plans name; return a function that writes one of them with changes."""

    def write(file: str, *changes: tuple[str, str]) -> None:
        (tmp_path / file).write_text(changed(TABLES[file], *changes), encoding="utf-8")

    for file in TABLES:
        write(file)
    return write


@pytest.fixture(scope="session")
def edit():
    return changed


@pytest.fixture(scope="session")
def choices() -> Choices:
    return Choices(
        layouts=("columns",),
        shields=("soulsby", "van-rijn", "brownlie"),
        profiles=("chezy", "log-law"),
        spreadings=("none", "fixed-rate", "plane-jet"),
        laws=("explicit", "time-scale", "saturating", "model-curve"),
        constituents=("M2", "S2", "N2", "K2", "O1", "K1", "M4"),
        relations={
            "broad-crest": (
                Parameter(name="coefficient", unit="-", low=0.0, high=3.0, meaning="discharge coefficient"),
            ),
            "stone": (
                Parameter(name="porosity", unit="-", low=0.0, high=1.0, meaning="share of voids"),
                Parameter(name="stone_m", unit="m", low=0.0, high=5.0, meaning="size of the stone"),
            ),
        },
    )


@pytest.fixture
def read(tmp_path, choices):
    """Return a function that reads a plan text."""

    def read_text(text: str, purpose: str = "run") -> Plan:
        path = tmp_path / "plan.toml"
        path.write_text(text, encoding="utf-8")
        return read_plan(path, choices, purpose)

    return read_text


@pytest.fixture
def problems(tmp_path, choices):
    """Return a function that gives the problems of a plan text with changes."""

    def problems_of(*changes: tuple[str, str], text: str = PLAN, purpose: str = "run") -> tuple[str, ...]:
        return refused(tmp_path, changed(text, *changes), choices, purpose)

    return problems_of
