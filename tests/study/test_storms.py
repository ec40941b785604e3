import runpy
from datetime import timedelta
from pathlib import Path

import numpy as np
import pytest

from tidescour.gap.records import StageFlow
from tidescour.gauge.records import GivenSeries, InputFile
from tidescour.study.storms import jump_findings, storm_series, storm_stage
from tidescour.units import seconds_since_epoch

INVENTED = runpy.run_path(str(Path(__file__).with_name("invented_delay.py")))


def series(hours=25):
    return GivenSeries(
        name="surge",
        quantity="level",
        time_s=1e9 + 3600.0 * np.arange(hours),
        value=np.zeros(hours),
        file=InputFile(path="surge.csv", sha256="a" * 64),
    )


def with_opening(**changes):
    stage = INVENTED["stage"]("sill", 0)
    return stage.model_copy(update={"opening": (stage.opening[0].model_copy(update=changes),)})


def test_a_storm_follows_its_stage_on_the_levels_of_the_series():
    stage = with_opening(crest_level_end_m=-4.0, width_end_m=250.0)
    storm = storm_stage("ten years", stage, series())
    assert (storm.start, storm.end) == (stage.end, stage.end + timedelta(hours=24))
    assert (storm.sea, storm.basin, storm.name) == ("surge", "routed", "load case ten years")
    opening = storm.opening[0]
    assert (opening.crest_level_m, opening.width_m) == (-4.0, 250.0)
    assert (opening.crest_level_end_m, opening.width_end_m) == (None, None)
    placed = storm_series(storm, series())
    assert placed.time_s[0] == seconds_since_epoch(stage.end)
    assert placed.time_s - placed.time_s[0] == pytest.approx(3600.0 * np.arange(25))


def test_what_does_not_move_stays():
    storm = storm_stage("ten years", with_opening(), series())
    assert (storm.opening[0].crest_level_m, storm.opening[0].width_m) == (-6.0, 300.0)


@pytest.mark.parametrize("lag_s", [1800.0, -1800.0])
def test_an_opening_with_a_later_or_earlier_sea_finds_its_level_in_the_series(lag_s):
    storm = storm_stage("ten years", with_opening(sea_lag_s=lag_s), series())
    placed = storm_series(storm, series())
    assert (storm.end - storm.start).total_seconds() == 23.5 * 3600.0
    assert placed.time_s[0] <= seconds_since_epoch(storm.start) - max(lag_s, 0.0)
    assert placed.time_s[-1] >= seconds_since_epoch(storm.end) - min(lag_s, 0.0)


def flow(*levels_m, basin_m=0.0):
    count = len(levels_m)
    return StageFlow(
        stage="sill",
        time_s=60.0 * np.arange(count),
        level_sea_m=levels_m,
        level_basin_m=np.full(count, basin_m),
        covered=np.ones(count, dtype=bool),
        measured=False,
        routed=True,
        openings=(),
        inflow_m3_s=np.zeros(count),
    )


def test_a_jump_is_told_from_a_quarter_of_a_metre():
    before = flow(0.4, 0.5)
    assert jump_findings("ten years", before, flow(0.75, 2.0)) == ()
    (finding,) = jump_findings("ten years", before, flow(0.76, 2.0))
    assert (finding.severity, finding.where) == ("warning", "load case 'ten years'")
    assert "at 0.76 m and the stage ends with it at 0.50 m: its first hours" in finding.message
    assert finding.message.endswith("near 0.50 m, on the same rising tide")


def test_a_jump_whose_head_no_later_one_passes_is_an_error():
    (finding,) = jump_findings("ten years", flow(0.6, 0.5), flow(2.0, 1.0, -1.9))
    assert finding.severity == "error"
    assert "no later head is larger" in finding.message
    assert finding.message.endswith("falling tide")
    assert jump_findings("ten years", flow(0.6, 0.5), flow(2.0, 1.0, -2.1))[0].severity == "warning"
