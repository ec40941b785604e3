import pytest

from tidescour.plan.places import places

ALPHA = "alpha_lengths_m = [60, 90, 150]\nalpha_values = [2.6, 2.4, 2.4]\n"
SHOAL = "protection.basin.opening.shoal"
GRAVEL = '[[filter]]\nname = "gravel"\nd15_mm = 1.2\nd85_mm = 4\n'


@pytest.fixture
def one_problem(problems, design_text, full_tables):
    """Return a function that gives the only problem of the design plan with a change."""

    def problem_of(old: str, new: str, purpose: str = "run") -> str:
        (found,) = problems((old, new), text=design_text, purpose=purpose)
        return found

    return problem_of


def test_every_design_key_is_read(read, design_text, full_tables):
    plan = read(design_text)
    assert [(layer.name, layer.top_level_m) for layer in plan.bed.layer] == [
        ("clean sand", -11.0), ("silty sand", -14.0), ("stiff clay", -19.0),
    ]  # fmt: skip
    assert (plan.bed.velocity_profile, plan.bed.fines_percent) == ("log-law", 22.0)
    assert plan.protection.basin.stop_slope_height_m == 5.0
    assert plan.protection.basin.opening["shoal"].alpha_values == (2.6, 2.4, 2.4)
    assert [grading.name for grading in plan.filter] == ["bed", "gravel"]
    assert plan.load_case[0].series == "storm"


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (ALPHA, ALPHA + "alpha = 2.5\n", f"{SHOAL}.alpha: stands beside a table of alpha by length; leave out one"),
        (
            "alpha_values = [2.6, 2.4, 2.4]\n",
            "",
            f"{SHOAL}.alpha_values: missing; alpha_lengths_m needs it: Disturbance",
        ),
        ("alpha_lengths_m = [60, 90, 150]\n", "", f"{SHOAL}.alpha_lengths_m: missing; alpha_values needs it: Lengths"),
        ("[60, 90, 150]", "[60, 90]", f"{SHOAL}.alpha_values: has 3 values where alpha_lengths_m has 2"),
        ("[60, 90, 150]", "[60, 90, 90]", f"{SHOAL}.alpha_lengths_m[3]: found 90 after 90; lengths must increase"),
        ("[2.6, 2.4, 2.4]", "[2.6, 2.4, 2.5]", f"{SHOAL}.alpha_values[3]: found 2.5 after 2.4; alpha cannot rise with"),
        ("[60, 90, 150]\nalpha_values = [2.6, 2.4, 2.4]", "[60]\nalpha_values = [2.6, 2.4]", "needs at least 2 in the"),
        ("widening = 0.1\n", "", 'basin.widening: missing; spreading = "fixed-rate" needs it: Lateral'),
        (
            "widening = 0.1\n",
            "widening = 0\n",
            'basin.widening: found 0, but spreading = "fixed-rate" needs a number over',
        ),
        (
            '"fixed-rate"\n',
            '"none"\n',
            'protection.basin.widening: found 0.1, but spreading = "none" takes no rate; leave',
        ),
        ('"fixed-rate"\n', '"plane-jet"\n', 'basin.widening: found 0.1, but spreading = "plane-jet" takes no rate'),
        ("widening = 0\n", "", f'{SHOAL}.spreading: found "plane-jet", but widening = 0.1 of [protection.basin] holds'),
        (
            "widening = 0\n",
            "widening = 0.2\n",
            f'{SHOAL}.widening: found 0.2, but spreading = "plane-jet" takes no rate',
        ),
        (
            '"fixed-rate"\n',
            '"fixd-rate"\n',
            'protection.basin.spreading: found "fixd-rate"; did you mean "fixed-rate"?',
        ),
        (
            "stop_slope_height_m = 5.0\n",
            "",
            "basin.stop_slope_height_m: missing; stop_slope_cot and stop_slope_height_m",
        ),
        (
            "stop_slope_cot = 3.0\n",
            "",
            "protection.basin.stop_slope_cot: missing; stop_slope_height_m and stop_slope_cot",
        ),
        (
            'name = "silty sand"',
            'name = "clean sand"',
            'bed.layer[2 "clean sand"].name: stands twice; every layer needs',
        ),
        ("top_level_m = -14.0", "top_level_m = -11", "].top_level_m: found -11, not under -11 of the layer above it"),
        ("d50_mm = 0.3\n", "", 'bed.layer[1 "clean sand"].d50_mm: missing; the critical velocity needs it, unless'),
        (
            "fines_percent = 60\n",
            "fines_percent = -1\n",
            '"stiff clay"].fines_percent: found -1; needs a number from 0',
        ),
        (
            'critical_velocity_evidence = "erosion tests on four cores"\n',
            "",
            "bed.critical_velocity_m_s: found 0.9 for a soil with 22 % of fines, whose cohesion is not credited",
        ),
        (
            'critical_velocity_evidence = "flume tests"\n',
            "",
            'bed.layer[3 "stiff clay"].critical_velocity_m_s: found 1.4 for a soil with 60 % of fines, whose cohesion',
        ),
        (
            "critical_velocity_m_s = 0.9\n",
            "",
            "bed.critical_velocity_evidence: belongs to critical_velocity_m_s, and none",
        ),
        (
            'law = "model-curve"\ntime_constant = 280\ntime_exponent = 0.38\ncurve_file = "curve.csv"\n'
            'curve_source = "physical model 1 in 60"\n',
            'law = "explicit"\ntime_constant = 280\n',
            'scour.time_constant: means nothing to law = "explicit"; leave it out, or write law = "time-scale", ',
        ),
        (
            "time_exponent = 0.38",
            'equilibrium = "turbulence"',
            'scour.equilibrium: means nothing to law = "model-curve"; leave it out, or write law = "saturating"',
        ),
        (
            'curve_source = "physical model 1 in 60"\n',
            "",
            'scour.curve_source: missing; law = "model-curve" needs it: Which',
        ),
        (
            'curve_file = "curve.csv"\n',
            "",
            'scour.curve_file: missing; law = "model-curve" needs it: Table of a physical',
        ),
        (GRAVEL, "", "filter: there is one grading; a filter needs the one under it too"),
        ('"gravel"', '"bed"', 'filter[2 "bed"].name: stands twice; every grading needs a name of its own'),
        ("d10_mm = 0.12", "d10_mm = 0.2", 'filter[1 "bed"].d15_mm: found 0.15, below d10_mm = 0.2'),
        ("d60_mm = 0.28", "d60_mm = 0.4", 'filter[1 "bed"].d85_mm: found 0.35, below d60_mm = 0.4'),
        ("d15_mm = 1.2", "d15_mm = 5", 'filter[2 "gravel"].d85_mm: found 4, below d15_mm = 5'),
    ],
)
def test_a_bed_that_does_not_hold_together_is_refused(one_problem, old, new, message):
    assert message in one_problem(old, new)


BOUNDS = (
    ("shields = 0.03", "stone", "shields", "0.21", "over 0 up to 0.2: Shields parameter that the stone may reach"),
    ("stability_factor = 0.75", "stone", "stability_factor", "7.5", "over 0 up to 5: Factor phi of the Pilarczyk"),
    ("edge_stability_factor = 1.25", "stone", "edge_stability_factor", "12", "over 0 up to 5: The same at the end"),
    ("slope_factor = 0.9", "stone", "slope_factor", "1.1", "over 0 up to 1: Factor k_sl"),
    (
        'velocity_profile = "log-law"',
        "bed",
        "roughness_d50",
        "250",
        "over 0 up to 100: Bed roughness in the critical velocity",
    ),
    ("time_constant = 280", "scour", "time_constant", "0.9", "from 1 up to 100000: K of the time scale"),
    ("time_constant = 280", "scour", "time_constant", "1e6", "from 1 up to 100000: K of the time scale"),
    ("time_exponent = 0.38", "scour", "time_exponent", "1", "over 0 and under 1: Exponent of the time"),
    ("time_exponent = 0.38", "scour", "time_exponent", "0", "over 0 and under 1: Exponent of the time"),
    ("depth_margin_factor = 1.2", "protection.basin", "depth_margin_factor", "12", "from 1 up to 5: Margin"),
    ("upstream_slope_cot = 3.0", "protection.basin", "upstream_slope_cot", "0.3", "from 0.5 up to 100: Slope 1 in n"),
    ("failure_slope_cot = 6.0", "protection.basin", "failure_slope_cot", "600", "from 0.5 up to 200: Slope 1 in n"),
    ("stop_slope_cot = 3.0", "protection.basin", "stop_slope_cot", "300", "from 0.5 up to 100: Upper slope"),
    ("growth_factor = 0.9", "protection.basin", "growth_factor", "0.04", "from 0.05 up to 20: Multiplies the depth"),
    ("growth_factor = 0.9", "protection.basin", "growth_factor", "21", "from 0.05 up to 20: Multiplies the depth"),
    ("widening = 0.1", "protection.basin", "widening", "8", "from 0 up to 1: Lateral spreading of the flow"),
    ("stop_depth_m = 12", "protection.basin", "alpha", "24", "from 0.5 up to 10: Disturbance factor, given instead"),
    ("stop_depth_m = 12", "protection.basin", "local_velocity_factor", "6", "over 0 up to 5: Local over mean velocity"),
)


@pytest.mark.parametrize(("line", "table", "key", "value", "needs"), BOUNDS, ids=lambda text: text.split(":")[0])
def test_a_number_beyond_all_sense_is_refused_with_what_is_in_use(one_problem, line, table, key, value, needs):
    found = one_problem(f"{line}\n", f"{key} = {value}\n")
    assert f"{table}.{key}: found {float(value):.10g}; needs a number {needs}" in found.replace(".0;", ";")


@pytest.mark.parametrize(
    ("old", "new", "path"),
    [
        ("[2.6, 2.4, 2.4]", "[26, 2.4, 2.4]", f"{SHOAL}.alpha_values[1]: found 26"),
        ("crest_level_m = -6.0", "crest_level_m = -6.0\nalpha_sea = 0.4", ".alpha_sea: found 0.4"),
        ("crest_level_m = -6.0", "crest_level_m = -6.0\nalpha_basin = 11", ".alpha_basin: found 11"),
    ],
)
def test_alpha_is_bounded_wherever_it_stands(one_problem, old, new, path):
    found = one_problem(old, new)
    assert f"{path}; needs a number from 0.5 up to 10: Disturbance factor" in found
    assert "1.5 to 4.5 in use" in found


def test_a_curve_needs_its_law(problems, design_text, full_tables):
    found = problems(('law = "model-curve"', 'law = "time-scale"'), text=design_text)
    assert [problem.split(": ")[1] for problem in found] == ["scour.curve_file", "scour.curve_source"]
    assert all(
        'means nothing to law = "time-scale"; leave it out, or write law = "model-curve"' in one for one in found
    )


def test_why_cohesion_is_not_credited_is_said(one_problem):
    found = one_problem('critical_velocity_evidence = "flume tests"\n', "")
    assert "over 10 % the threshold can be 2 to 4 times that of sand, but it falls once the top layer fails" in found
    assert (
        "write critical_velocity_evidence, or leave critical_velocity_m_s out so that d50_mm gives the threshold"
        in found
    )


@pytest.mark.parametrize("fines", ["", "fines_percent = 10\n"])
def test_a_given_threshold_of_sand_needs_no_evidence(read, plan_text, edit, fines):
    assert (
        read(edit(plan_text, ("d90_mm", f"{fines}critical_velocity_m_s = 0.5\nd90_mm"))).bed.critical_velocity_m_s
        == 0.5
    )


def test_a_table_is_a_way_to_alpha(read, problems, plan_text, edit):
    without = ("chezy_m05_s = 40.0\n", "")
    (found,) = problems(without)
    assert "protection.basin.chezy_m05_s: missing; it gives alpha, unless alpha is given here or by length" in found
    assert read(edit(plan_text, ("chezy_m05_s = 40.0\n", ALPHA))).protection.basin.alpha_lengths_m == (
        60.0,
        90.0,
        150.0,
    )
    (found,) = problems(without, ("bed_level_m = -3.0\n", "bed_level_m = -3.0\n" + ALPHA))
    assert 'for "main gap"' in found


def halves(side, own):
    """Return changes that give one key to the basin side and another to its shoal, and one that completes the other."""
    given = (("length_m = 90\n", f"length_m = 90\n{side}"), ("bed_level_m = -3.0\n", f"bed_level_m = -3.0\n{own}"))
    return given, ("[protection.sea]", f'[protection.basin.opening."main gap"]\n{own}\n[protection.sea]')


@pytest.mark.parametrize(
    ("side", "own", "missing"),
    [
        ('spreading = "fixed-rate"\n', "widening = 0.1\n", "widening"),
        ("stop_slope_cot = 3\n", "stop_slope_height_m = 5\n", "stop_slope_height_m"),
    ],
)
def test_what_a_side_leaves_to_its_openings_every_opening_must_give(
    read, problems, plan_text, edit, side, own, missing
):
    given, main_gap = halves(side, own)
    (found,) = problems(*given)
    assert f"protection.basin.{missing}: missing; " in found
    assert read(edit(plan_text, *given, main_gap))


def test_a_rate_alone_means_a_fixed_rate(read, plan_text, edit):
    given, _ = halves("widening = 0.1\n", 'spreading = "fixed-rate"\n')
    basin = [place for place in places(read(edit(plan_text, *given))) if place.side == "basin"]
    assert [(place.spreading, place.widening) for place in basin] == [("fixed-rate", 0.1)] * 2


def test_the_sides_are_judged_before_there_are_stages(problems, plan_text):
    stages = plan_text[plan_text.index("[[stage]]") :]
    spreading = ("length_m = 90\n", 'length_m = 90\nspreading = "none"\nwidening = 0.1\n')
    (found,) = problems((stages, ""), spreading, purpose="records")
    assert 'protection.basin.widening: found 0.1, but spreading = "none" takes no rate' in found


def test_what_a_design_lacks_does_not_stop_a_look_at_the_records(read, design_text, full_tables, edit):
    for missing in (
        "top_level_m = -11.0\n",
        "d85_mm = 4\n",
        'curve_source = "physical model 1 in 60"\n',
        "d50_mm = 0.3\n",
    ):
        assert read(edit(design_text, (missing, "")), "records").site.name == "Invented gap"
