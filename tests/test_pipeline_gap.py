"""What a run says of gap and basin besides the plan's own numbers: a larger sea tide, the sweep, the model's range."""

import numpy as np
import pytest

from tidescour import pipeline
from tidescour.plan.loader import read_plan

PLAN = """
[site]
name = "small gap"
datum = "site datum"
latitude_deg = 54.0
[tide]
sea_constants = "constants.csv"
sea_mean_m = 0.1
sea_factor = {factor}
[basin]
level_m = [-3.0, 0.0, 3.0]
area_m2 = [1.4e7, 2.0e7, 2.6e7]
start_level_m = 0.4
[bed]
critical_velocity_m_s = 0.42
[protection.basin]
length_m = 90.0
bed_level_m = -10.0
chezy_m05_s = 40.0
failure_slope_cot = 8.0
[protection.sea]
length_m = 90.0
bed_level_m = -10.0
chezy_m05_s = 40.0
failure_slope_cot = 8.0
[[stage]]
name = "sill"
start = 2027-04-01T00:00:00Z
end = 2027-04-11T00:00:00Z
[[stage.opening]]
name = "gap"
crest_level_m = -7.0
width_m = 300.0
relation = "broad-crest"
coefficient = 0.95
"""


def run(tmp_path, text=PLAN, factor=1.0, **changes):
    for old, new in changes.values():
        assert old in text
        text = text.replace(old, new)
    (tmp_path / "constants.csv").write_text("constituent,amplitude_m,phase_deg\nM2,1.4,40\nS2,0.4,80\n")
    path = tmp_path / "plan.toml"
    path.write_text(text.format(factor=factor), encoding="utf-8")
    return pipeline.run(read_plan(path, pipeline.plan_choices()))


def told(results, code):
    return [finding for finding in results.findings if finding.code == code]


def test_the_larger_sea_tide_is_what_a_plan_with_that_factor_gives(tmp_path):
    results, larger = run(tmp_path), run(tmp_path, factor=1.05)
    assert results.raised_sea.sea_factor == pytest.approx(1.05)
    deeper = list(results.raised_sea.final_depth_m)
    assert deeper == [place.rows[-1].chain[0].end_depth_m for place in larger.places]
    assert list(results.raised_sea.length_required_m) == [place.required.length_m for place in larger.places]
    assert deeper > [place.rows[-1].chain[0].end_depth_m for place in results.places]
    (finding,) = told(results, "sea-tide-may-rise")
    assert finding.severity == "note"
    assert f"to {deeper[1]:.2f} m" in finding.message
    assert "with 1.05 instead of 1:" in finding.message


def test_the_larger_sea_tide_goes_on_from_the_factor_of_the_plan(tmp_path):
    assert run(tmp_path, factor=1.1).raised_sea.sea_factor == pytest.approx(1.15)


def test_a_larger_sea_tide_without_a_result_says_why(tmp_path):
    # The bed on the sea side falls dry at the lowest of the larger tides only.
    lowest = run(tmp_path).flows[0].level_sea_m.min()
    bed = 0.1 + 1.025 * (lowest - 0.1)
    head, sea_side = PLAN.replace("chezy_m05_s = 40.0", "alpha = 2.5").split("[protection.sea]")
    results = run(
        tmp_path, f"{head}[protection.sea]{sea_side.replace('bed_level_m = -10.0', f'bed_level_m = {bed:.4f}')}"
    )
    (finding,) = told(results, "sea-tide-may-rise")
    assert finding.severity == "warning"
    assert "there is no result" in finding.message
    assert results.raised_sea is None


def test_a_sea_that_is_no_tide_cannot_be_made_larger_but_the_line_stands(tmp_path):
    times = np.datetime64("2027-03-31T00:00:00") + np.arange(12 * 144) * np.timedelta64(600, "s")
    level = 1.5 * np.sin(2.0 * np.pi * np.arange(times.size) * 600.0 / 44712.0)
    rows = "\n".join(f"{time}Z,{value:.4f}" for time, value in zip(times, level, strict=True))
    (tmp_path / "model.csv").write_text(f"time,level_m\n{rows}\n", encoding="utf-8")
    series = '[series.model]\nfile = "model.csv"\nquantity = "level"\nunit = "m"\n[bed]\n'
    results = run(
        tmp_path,
        series=("[bed]\n", series),
        sea=("end = 2027-04-11T00:00:00Z\n", 'end = 2027-04-11T00:00:00Z\nsea = "model"\n'),
    )
    (finding,) = told(results, "sea-tide-may-rise")
    assert "its factor has no effect here" in finding.message
    assert results.raised_sea is None


def test_the_sweep_begins_at_the_stage_itself(tmp_path):
    results = run(tmp_path)
    sweep = results.sweep
    assert (sweep.stage, sweep.opening) == ("sill", "gap")
    assert sweep.crest.value_m[0] == -7.0
    assert sweep.width.value_m[0] == 300.0
    np.testing.assert_allclose(sweep.crest.head_m[0], sweep.width.head_m[0], rtol=1e-3)
    # The stage is shorter than the window, so that its highest flood is at most that of the spring tide and near it.
    peak = max(row.peak_gap_velocity_m_s for place in results.places for row in place.rows)
    assert sweep.crest.gap_velocity_m_s[0].max() == pytest.approx(peak, rel=0.05)


@pytest.mark.parametrize(
    ("code", "changes"),
    [
        (
            "constant-area",
            {
                "area": (
                    "level_m = [-3.0, 0.0, 3.0]\narea_m2 = [1.4e7, 2.0e7, 2.6e7]",
                    "level_m = [0.0]\narea_m2 = [2.0e7]",
                )
            },
        ),
        ("basin-level-range", {"table": ("[-3.0, 0.0, 3.0]", "[-0.5, 0.0, 0.5]")}),
        ("basin-length", {"long": ("start_level_m", "length_m = 3.0e4\ndepth_m = 6.0\nstart_level_m")}),
        ("inertia", {"long": ("relation =", "flow_length_m = 9000.0\nrelation =")}),
    ],
)
def test_what_leaves_the_range_of_the_model_is_told_in_the_run(tmp_path, code, changes):
    assert not told(run(tmp_path), code)
    assert told(run(tmp_path, **changes), code)


def test_a_river_that_fills_a_closed_basin_is_an_error_with_its_rise(tmp_path):
    results = run(
        tmp_path,
        shut=("crest_level_m = -7.0", "crest_level_m = 6.0"),
        river=("start_level_m = 0.4", 'start_level_m = 0.4\n[[basin.inflow]]\nname = "river"\ndischarge_m3_s = 20.0'),
    )
    (finding,) = told(results, "river-ponds")
    assert finding.severity == "error"
    # Closed: 10 days of 20 m3/s onto the storage, by hand: V(z) - V(0.4) = 1.728e7 m3, A = 2.0e7 + 2e6 z.
    rise = (-2.08e7 + np.sqrt(2.08e7**2 + 2.0 * 2.0e6 * 1.728e7)) / 2.0e6
    assert results.flows[0].level_basin_m[-1] == pytest.approx(0.4 + rise, abs=1e-6)
    assert all(row.chain[0].end_depth_m == 0.0 for place in results.places for row in place.rows)
