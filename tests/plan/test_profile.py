import math
from itertools import pairwise

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from tidescour.errors import PlanError
from tidescour.plan.profile import open_part, read_profile

VALLEY = ((0.0, 2.0), (10.0, -4.0), (20.0, -7.0), (40.0, -5.0), (40.0, 1.0), (50.0, 2.0))


def area_under(points, level_m):
    """Return the area between a profile and a level above all of it."""
    return sum((right[0] - left[0]) * (level_m - 0.5 * (left[1] + right[1])) for left, right in pairwise(points))


@pytest.fixture
def survey(tmp_path):
    def write(text: str, name: str = "survey.csv"):
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return path

    return write


@pytest.mark.parametrize(
    "text",
    [
        "distance_m,level_m\n0,2\n10,-4\n10,-7\n",
        "note,level_m,distance_m\nwest,2,0\n,-4,10\nwall,-7,10\n",
        "# surveyed in May\ndistance_m;level_m\n0;2,0\n10;-4\n\n10;-7\n",
        "sep=;\ndistance_m;level_m\n0;2\n10;-4\n10;-7\n",
        "distance_m\tlevel_m\n0\t2\n10\t-4\n10\t-7\n",
    ],
    ids=["plain", "other columns and order", "decimal comma", "sep", "tab"],
)
def test_the_form_of_a_profile_does_not_matter(survey, text):
    assert read_profile(survey(text)) == ((0.0, 2.0), (10.0, -4.0), (10.0, -7.0))


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("distance_m,level\n0,2\n1,1\n2,2\n", r'survey.csv: has no column "level_m"; it has "distance_m" and "level"'),
        ("distance_m,level_m\n", r"survey.csv: has a header but no row"),
        ("distance_m,level_m\n0,2\n10,-4\n", r"survey.csv: has 2 points; a profile needs at least 3"),
        ("distance_m,level_m\n0,2\n10,low\n20,2\n", r'survey.csv row 3: level_m: found "low"; needs a finite number'),
        ("distance_m,level_m\n0,2\n,-4\n20,2\n", r"survey.csv row 3: distance_m: is empty; needs a finite number"),
        ("distance_m,level_m\n0,2\n10,nan\n20,2\n", r'survey.csv row 3: level_m: found "nan"; needs a finite number'),
        ("distance_m,level_m\n0,2\n10,1e999\n20,2\n", r"survey.csv row 3: level_m: found inf; needs a finite number"),
        ("distance_m,level_m\n0,2\n20,-4\n10,2\n", r"row 4: distance_m: found 10 after 20; distances cannot decrease"),
        ("distance_m,level_m\n5,2\n5,-4\n5,2\n", r"survey.csv: all points stand at one distance, 5 m"),
        ("distance_m,level_m\n0,-4\n5,-4\n9,-4\n", r"one level, -4 m; write width_m and crest_level_m instead"),
        ("distance_m;level_m\n0;1,250\n5;-4\n9;-4\n", r'row 2: level_m: found "1,250"; needs a finite number'),
        ("", r"survey.csv: is empty; needs a header row"),
    ],
)
def test_a_profile_that_is_none_is_refused(survey, text, message):
    with pytest.raises(PlanError, match=message):
        read_profile(survey(text))


def test_every_faulty_row_of_a_profile_is_named(survey):
    with pytest.raises(PlanError) as caught:
        read_profile(survey("distance_m,level_m\na,2\n10,b\n20,2\n"))
    assert [problem.split(":")[0] for problem in caught.value.problems] == ["survey.csv row 2", "survey.csv row 3"]


@pytest.mark.parametrize(
    ("start", "end", "expected"),
    [
        (-math.inf, math.inf, VALLEY),
        (-5.0, 60.0, VALLEY),
        (5.0, 30.0, ((5.0, -1.0), (10.0, -4.0), (20.0, -7.0), (30.0, -6.0))),
        (10.0, 20.0, ((10.0, -4.0), (20.0, -7.0))),
        (12.0, 16.0, ((12.0, -4.6), (16.0, -5.8))),
        (40.0, 50.0, ((40.0, 1.0), (50.0, 2.0))),
        (20.0, 40.0, ((20.0, -7.0), (40.0, -5.0))),
    ],
    ids=["whole", "wider than the survey", "between points", "at points", "within a reach", "right of a wall", "left"],
)
def test_a_profile_is_cut_by_vertical_walls(start, end, expected):
    part = open_part(VALLEY, start, end)
    assert [distance for distance, _ in part] == [distance for distance, _ in expected]
    assert [level for _, level in part] == pytest.approx([level for _, level in expected], rel=1e-15)


def test_a_cut_through_a_level_bed_stays_at_that_level():
    flat = ((0.0, 3.0), (0.0, -8.1), (300.0, -8.1), (300.0, 3.0))
    assert open_part(flat, 100.0 / 3.0, 777.0 / 7.1) == ((100.0 / 3.0, -8.1), (777.0 / 7.1, -8.1))


LEVELS = st.floats(-20, 10)


@settings(max_examples=60, deadline=None)
@given(
    steps=st.lists(st.tuples(st.floats(0, 50), LEVELS), min_size=3, max_size=9),
    shares=st.tuples(st.floats(0.01, 0.99), st.floats(0.01, 0.99)),
    factor=st.floats(0.1, 10),
)
def test_what_two_cuts_part_adds_up_and_scales(steps, shares, factor):
    distances = [sum(step for step, _ in steps[: position + 1]) for position in range(len(steps))]
    points = tuple(zip(distances, (level for _, level in steps), strict=True))
    first, last = distances[0], distances[-1]
    assume(last - first > 0.1)
    cut = first + shares[0] * (last - first)
    left, right = open_part(points, -math.inf, cut), open_part(points, cut, math.inf)
    assert left[-1][0] == right[0][0] == cut
    assert area_under(left, 10.0) + area_under(right, 10.0) == pytest.approx(area_under(points, 10.0), rel=1e-9)
    larger = open_part(tuple((factor * x, factor * z) for x, z in points), factor * cut, math.inf)
    assert area_under(larger, factor * 10.0) == pytest.approx(factor**2 * area_under(right, 10.0), rel=1e-6, abs=1e-6)
