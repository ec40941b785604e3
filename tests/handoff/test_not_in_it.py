"""What the numbers do not hold."""

import json

from tidescour.handoff.encode import json_bytes
from tidescour.handoff.not_in_it import NOT_IN_IT, not_in_it_objects


def test_each_thing_left_out_says_why_which_way_it_errs_and_what_to_do():
    objects = not_in_it_objects()
    assert json.loads(json_bytes({"not_in_it": objects}))["not_in_it"] == objects
    assert len({each["name"] for each in objects}) == len(objects) == len(NOT_IN_IT)
    for each in objects:
        assert list(each) == ["name", "what", "why", "errs", "instead"]
        assert all(each.values())
        assert each["errs"] in ("cautious", "not cautious", "unknown")


def test_a_finding_tells_of_one_thing_left_out():
    codes = [code for each in NOT_IN_IT for code in each.told_by]
    assert len(set(codes)) == len(codes)
    assert {"tide-only", "placing-not-in-it", "abutment-eddies-not-in-it"} <= set(codes)


def test_the_things_that_an_engineer_asks_for_are_among_them():
    text = " ".join(" ".join(each.values()) for each in not_in_it_objects())
    for word in (
        "surge",
        "waves",
        "ships",
        "sand",
        "density",
        "caisson",
        "eddies",
        "ice",
        "bed forms",
        "fills in again",
    ):
        assert word in text
