import runpy
from datetime import timedelta
from pathlib import Path

import numpy as np
import pytest

from tidescour.study.delay import (
    bound_to_its_time,
    first_to_shorten,
    moved,
    per_week,
    prolonged,
    stage_costs,
)

INVENTED = runpy.run_path(str(Path(__file__).with_name("invented_delay.py")))


def test_the_worst_place_is_that_which_most_weeks_deepen_most():
    costs = stage_costs(INVENTED["invented_study"]())
    assert [cost.stage for cost in costs] == ["first", "second"]
    assert [cost.most.side for cost in costs] == ["basin", "basin"]
    assert [(cost.fewest.weeks_late, cost.most.weeks_late) for cost in costs] == [(1, 4), (1, 4)]
    first = first_to_shorten(costs)
    assert first.stage == "second"
    assert per_week(first.most.own_stay.depth_m, first.most) == pytest.approx(0.3)
    assert per_week(first.most.own_stay.length_m, first.most) == pytest.approx(3.0)
    assert np.isnan(per_week(first.most.calendar.depth_m, first.most))


def test_weeks_without_a_result_do_not_count_and_nothing_that_deepens_nothing_is_to_be_shortened():
    depths = {("first", "gap", "sea"): (0.0, -0.1, np.nan), ("second", "gap", "sea"): (np.nan,) * 3}
    costs = stage_costs(INVENTED["invented_study"](depths))
    assert [(cost.stage, cost.most.weeks_late) for cost in costs] == [("first", 2)]
    assert first_to_shorten(costs) is None
    assert first_to_shorten(()) is None


def test_a_late_stage_ends_later_and_a_later_one_is_moved_whole():
    stage = INVENTED["stage"]("sill", 0, planned_end=INVENTED["START"])
    late, after = prolonged(stage, 3), moved(stage, 3)
    assert (late.start, late.end) == (stage.start, stage.end + timedelta(days=21))
    assert (after.start, after.end) == (stage.start + timedelta(days=21), stage.end + timedelta(days=21))
    assert late.opening == after.opening == stage.opening
    assert late.planned_end == stage.planned_end


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({}, ""),
        ({"basin": "tide"}, ""),
        ({"sea": "measured"}, 'sea = "measured"'),
        ({"sea": "measured", "basin": "measured"}, 'sea = "measured" and basin = "measured"'),
        ({"sea": "flood", "basin": "flood"}, "series 'flood'"),
    ],
)
def test_records_and_series_bind_a_stage_to_their_time(changes, words):
    assert bound_to_its_time(INVENTED["stage"]("sill", 0, **changes)) == words


def test_a_given_flow_binds_a_stage_too():
    stage = INVENTED["stage"]("sill", 0)
    given = stage.opening[0].model_copy(update={"relation": None, "end_velocity_series": "model"})
    assert bound_to_its_time(stage.model_copy(update={"opening": (given,)})) == "series 'model'"
