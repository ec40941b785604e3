import pytest

from tidescour.errors import PlanError
from tidescour.plan.curve import read_curve


@pytest.fixture
def curve(tmp_path):
    """Return a function that reads a curve with these rows."""

    def read(*rows: str):
        path = tmp_path / "curve.csv"
        path.write_text("\n".join(("time_over_t1,depth_over_water_depth", *rows, "")))
        return read_curve(path)

    return read


def test_a_curve_is_read_as_it_stands(curve):
    assert curve("0.01,0.17", "1,1.01", "3,1.5") == ((0.01, 0.17), (1.0, 1.01), (3.0, 1.5))


def test_a_plan_has_the_points_of_its_curve(read, design_text, full_tables):
    scour = read(design_text).scour
    assert scour.curve_points == ((0.01, 0.17), (1.0, 1.01), (3.0, 1.5))
    assert (scour.law, scour.time_constant, scour.time_exponent) == ("model-curve", 280.0, 0.38)


@pytest.mark.parametrize(
    ("rows", "message"),
    [
        (("0.1,0.4", "1,1"), r"curve\.csv: has 2 points; a growth curve needs at least 3"),
        (("0,0", "1,1", "2,1.3"), r"curve\.csv row 2: leave the row 0, 0 out: the curve starts there by itself"),
        (("0,0.4", "1,1", "2,1.3"), r"curve\.csv row 2: time_over_t1: found 0; needs a number over 0"),
        (("0.1,-0.4", "1,1", "2,1.3"), r"row 2: depth_over_water_depth: found -0\.4; needs a number over 0"),
        (("0.1,0.4", "1,1", "1,1.3"), r"row 4: time_over_t1: found 1 after 1; it must increase"),
        (("0.1,0.4", "1,1", "2,1"), r"row 4: depth_over_water_depth: found 1 after 1; it must increase"),
        (("0.1,0.4", "1,deep", "2,1.3"), r'row 3: depth_over_water_depth: found "deep"; needs a finite number'),
        (
            ("0.1,0.4", "1,1.06", "2,1.3"),
            r"depth_over_water_depth is 1\.06 at time_over_t1 = 1; t1 is the time at which",
        ),
        (("0.1,0.4", "1,0.94", "2,1.3"), r"is 0\.94 at time_over_t1 = 1; .*: scale the times so that the curve passes"),
        (("0.1,0.1", "0.5,0.25", "2,1"), r"is 0\.5 at time_over_t1 = 1"),
    ],
)
def test_a_faulty_curve_is_refused(curve, rows, message):
    with pytest.raises(PlanError, match=message):
        curve(*rows)


def test_the_origin_is_refused_once(curve):
    with pytest.raises(PlanError) as refused:
        curve("0,0", "0.1,0.4", "1,1", "2,1.3")
    assert len(refused.value.problems) == 1


# h/h0 = (t/t1)^0.4 holds at time 1 whatever rows stand around it: a power is a line in logarithms.
def test_a_power_curve_passes_through_one_between_its_rows(curve):
    assert len(curve(*(f"{time},{time**0.4}" for time in (0.02, 0.3, 7.0)))) == 3


@pytest.mark.parametrize("factor", [0.96, 1.04])
def test_a_curve_may_miss_one_by_five_per_cent(curve, factor):
    assert curve(*(f"{time},{factor * time**0.4}" for time in (0.1, 1.0, 5.0)))


@pytest.mark.parametrize("times", [(0.1, 0.2, 0.5), (2.0, 3.0, 4.0)])
def test_a_curve_that_does_not_reach_time_one_is_not_judged_there(curve, times):
    assert curve(*(f"{time},{0.5 * time**0.4}" for time in times))


def test_a_faulty_curve_of_a_plan_is_refused_for_all(problems, design_text, full_tables):
    full_tables("curve.csv", ("1,1.01", "1,1.2"))
    (found,) = problems(("", ""), text=design_text, purpose="calibrate")
    assert "scour.curve_file: curve.csv: depth_over_water_depth is 1.2 at time_over_t1 = 1" in found


def test_a_curve_that_is_not_there_stops_what_needs_it(problems, read, design_text, full_tables, tmp_path):
    (tmp_path / "curve.csv").unlink()
    for purpose in ("run", "soundings", "delay"):
        (found,) = problems(("", ""), text=design_text, purpose=purpose)
        assert 'scour.curve_file: "curve.csv": no such file in ' in found
    assert read(design_text, "records").scour.curve_points == ()
