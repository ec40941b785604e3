import pytest

from tidescour.plan.notes import default_notes


def where(findings, code="default-used"):
    return {finding.where for finding in findings if finding.code == code}


def test_a_default_that_enters_a_number_is_named(read, plan_text):
    found = default_notes(read(plan_text))
    assert where(found) == {
        "water.temperature_c",
        "water.salinity_g_kg",
        "bed.grain_density_kg_m3",
        "bed.shields",
        "bed.velocity_profile",
        "bed.roughness_d50",
        "scour.tide",
        "stone.density_kg_m3",
        "stone.shields",
        "stone.stability_factor",
        "stone.edge_stability_factor",
        "stone.slope_factor",
        "tide.sea_factor",
        "tide.set_up_m",
        "protection.sea.spreading",
        "protection.sea.local_velocity_factor",
        "protection.sea.growth_factor",
        "protection.sea.depth_margin_factor",
        "protection.sea.alpha_basis",
        "protection.basin.spreading",
        "protection.basin.local_velocity_factor",
        "protection.basin.growth_factor",
        "protection.basin.depth_margin_factor",
        "protection.basin.alpha_basis",
    }
    assert {finding.severity for finding in found} == {"note"}


@pytest.mark.parametrize(
    ("key", "value", "old", "new"),
    [
        ("water.temperature_c", "10 degrees Celsius", "[tide]", "[water]\ntemperature_c = 10.0\n[tide]"),
        ("water.salinity_g_kg", "30 g/kg", "[tide]", "[water]\nsalinity_g_kg = 30\n[tide]"),
        ("bed.grain_density_kg_m3", "2650 kg/m3", "d50_mm = 0.25", "d50_mm = 0.25\ngrain_density_kg_m3 = 2650"),
        ("bed.shields", "soulsby", "d50_mm = 0.25", 'd50_mm = 0.25\nshields = "soulsby"'),
        ("bed.roughness_d50", "2.5 d50", "d50_mm = 0.25", "d50_mm = 0.25\nroughness_d50 = 2.5"),
        ("scour.tide", "integral", 'law = "explicit"', 'law = "explicit"\ntide = "integral"'),
        ("tide.sea_factor", "1 leaves", "[tide]", "[tide]\nsea_factor = 1.0"),
        ("tide.set_up_m", "0 m means", "[tide]", "[tide]\nset_up_m = 0"),
        ("protection.sea.spreading", "none means", "length_m = 80.0", "length_m = 80.0\nwidening = 0.0"),
        ("protection.sea.spreading", "none means", "length_m = 80.0", 'length_m = 80.0\nspreading = "none"'),
        ("protection.sea.growth_factor", "1 means", "length_m = 80.0", "length_m = 80.0\ngrowth_factor = 1"),
        (
            "protection.sea.depth_margin_factor",
            "1 means",
            "length_m = 80.0",
            "length_m = 80.0\ndepth_margin_factor = 1",
        ),
        ("bed.velocity_profile", "chezy", "d50_mm = 0.25", 'd50_mm = 0.25\nvelocity_profile = "chezy"'),
        ("stone.shields", "0.03 (Shields form) and 0.035", "[scour]", "[stone]\nshields = 0.03\n[scour]"),
        ("stone.slope_factor", "1 is k_sl", "[scour]", "[stone]\nslope_factor = 1\n[scour]"),
        (
            "protection.sea.local_velocity_factor",
            "1 means",
            "length_m = 80.0",
            "length_m = 80.0\nlocal_velocity_factor = 1",
        ),
    ],
)
def test_a_default_that_was_written_is_not_named(read, plan_text, edit, key, value, old, new):
    (note,) = [finding for finding in default_notes(read(plan_text)) if finding.where == key]
    assert f"the default {value}" in note.message
    assert key not in where(default_notes(read(edit(plan_text, (old, new)))))


def test_a_default_of_some_openings_names_these(read, plan_text, edit):
    plan = read(edit(plan_text, ("bed_level_m = -3.0", "bed_level_m = -3.0\nwidening = 0.1")))
    (note,) = [finding for finding in default_notes(plan) if finding.where == "protection.basin.spreading"]
    assert "not given for main gap;" in note.message


def test_a_given_threshold_needs_no_note_on_what_would_give_it(read, plan_text, edit):
    found = where(default_notes(read(edit(plan_text, ("d90_mm = 0.40", "critical_velocity_m_s = 0.45")))))
    assert not found & {"water.temperature_c", "bed.shields", "bed.roughness_d50"}
    assert {"water.salinity_g_kg", "bed.grain_density_kg_m3"} <= found


def test_alpha_of_another_rule_than_the_driving_one_is_a_warning(read, plan_text, edit):
    text = edit(plan_text, ('law = "explicit"', 'tide = "cycle-mean"'))
    found = [finding for finding in default_notes(read(text)) if finding.code == "alpha-basis"]
    assert [finding.where for finding in found].count("protection.sea.alpha_basis") == 2
    assert [finding.where for finding in found].count("protection.basin.alpha_basis") == 1
    assert {finding.severity for finding in found} == {"warning"}
    assert 'scour.tide = "cycle-mean" drives the growth' in found[0].message


def test_alpha_of_the_driving_rule_is_none(read, plan_text, edit):
    text = edit(
        plan_text,
        ('law = "explicit"', 'tide = "cycle-mean"'),
        ("alpha = 2.4", 'alpha = 2.4\nalpha_basis = "cycle-mean"'),
        ("chezy_m05_s = 40.0", 'chezy_m05_s = 40.0\nalpha_basis = "cycle-mean"'),
    )
    found = default_notes(read(text))
    assert not where(found, "alpha-basis")
    assert not where(found) & {"protection.sea.alpha_basis", "protection.basin.alpha_basis"}


@pytest.mark.parametrize("place", ['[protection.basin.opening."shoal"]', "[protection.basin]"])
def test_alpha_by_length_has_a_basis_too(read, plan_text, edit, place):
    table = f"{place}\nalpha_lengths_m = [60, 90]\nalpha_values = [2.6, 2.4]"
    basis = ('law = "explicit"', 'tide = "flow-mean"')
    found = default_notes(read(edit(plan_text, (place, table), basis)))
    warned = [finding for finding in found if finding.where == "protection.basin.alpha_basis"]
    assert {finding.message.split(",")[0] for finding in warned} == {"alpha of main gap", "alpha of shoal"}
    assert {finding.code for finding in warned} == {"default-used", "alpha-basis"}


@pytest.mark.parametrize(
    "where", ["bed.shields", "bed.velocity_profile", "bed.roughness_d50", "scour.law", "scour.time_constant",
              "scour.time_exponent", "scour.equilibrium", "soundings.prior_scatter", "water.temperature_c",
              "stone.shields", "stone.stability_factor", "stone.edge_stability_factor", "stone.slope_factor"],
)  # fmt: skip
def test_a_default_out_of_the_literature_says_that_it_is_from_memory(read, plan_text, edit, where):
    law = "" if where == "scour.law" else 'law = "saturating"\n'
    sounding = '[[sounding]]\ndate = 2027-05-01T00:00:00Z\nopening = "shoal"\nside = "sea"\n'
    text = edit(plan_text, ('law = "explicit"\n', law)) + sounding + "depth_m = 1\nstandard_error_m = 0.2\n"
    (note,) = [finding for finding in default_notes(read(text)) if finding.where == where]
    assert "from memory" in note.message


def test_numbers_of_other_laws_are_not_named(read, plan_text, edit):
    keys = {"scour.time_constant", "scour.time_exponent", "scour.equilibrium"}
    assert not where(default_notes(read(plan_text))) & keys
    for law, named in (("time-scale", keys - {"scour.equilibrium"}), ("saturating", keys)):
        assert where(default_notes(read(edit(plan_text, ('"explicit"', f'"{law}"'))))) & keys == named
    given = 'law = "time-scale"\ntime_constant = 330\ntime_exponent = 0.4'
    assert not where(default_notes(read(edit(plan_text, ('law = "explicit"', given))))) & keys


def test_scatter_of_soundings_is_named_where_there_are_soundings(read, design_text, full_tables, edit):
    keys = {"soundings.prior_scatter", "soundings.growth_scatter"}
    without = ("prior_scatter = 0.25\ngrowth_scatter = 0.05\n", "")
    assert where(default_notes(read(edit(design_text, without)))) & keys == keys
    assert not where(default_notes(read(design_text))) & keys


def test_a_plan_that_writes_every_design_key_has_few_notes(read, design_text, full_tables):
    found = where(default_notes(read(design_text)))
    assert not {key for key in found if key.startswith(("stone.", "soundings.", "scour.time"))}
    assert not found & {"protection.basin.spreading", "protection.basin.growth_factor", "bed.velocity_profile"}


def test_fines_are_not_credited(read, plan_text, edit):
    assert not where(
        default_notes(read(edit(plan_text, ("d90_mm", "fines_percent = 10\nd90_mm")))), "fines-not-credited"
    )
    notes = default_notes(read(edit(plan_text, ("d90_mm", "fines_percent = 10.5\nd90_mm"))))
    (found,) = [finding for finding in notes if finding.code == "fines-not-credited"]
    assert (found.severity, found.where) == ("warning", "bed")
    assert "10.5 % of fines" in found.message
    assert "the threshold used is that of clean sand" in found.message.lower()
    assert "2 to 4 times higher, but that falls once the top layer fails (from memory)" in found.message


def test_a_threshold_on_evidence_is_a_warning_that_quotes_it(read, design_text, full_tables):
    notes = default_notes(read(design_text))
    credited = {finding.where: finding for finding in notes if finding.code == "fines-credited"}
    assert credited.keys() == {"bed", "bed.layer 'stiff clay'"}
    assert "0.9 m/s of a soil with 22 % of fines is taken on this evidence: erosion tests" in credited["bed"].message
    assert where(notes, "fines-not-credited") == {"bed.layer 'silty sand'"}


def test_a_layer_of_sand_needs_what_gives_its_threshold(read, plan_text, edit):
    layer = 'critical_velocity_m_s = 0.45\n[[bed.layer]]\nname = "sand"\ntop_level_m = -12\nd50_mm = 0.3'
    found = where(default_notes(read(edit(plan_text, ("d90_mm = 0.40", layer)))))
    assert {"water.temperature_c", "bed.shields", "bed.velocity_profile", "bed.roughness_d50"} <= found


@pytest.mark.parametrize("change", ["sea_factor = 1.05", "set_up_m = -0.2"])
def test_a_change_of_the_sea_alone_is_a_warning_beside_the_basin_tide(read, plan_text, edit, change):
    text = edit(plan_text, ("[tide]", f"[tide]\n{change}"))
    assert not where(default_notes(read(text)), "sea-change")
    beside = edit(text, ('sea = "measured"\nbasin = "measured"', 'basin = "tide"'))
    (found,) = [finding for finding in default_notes(read(beside)) if finding.code == "sea-change"]
    assert found.severity == "warning"
    assert "sill to -4" in found.message


def test_a_plan_for_records_alone_has_notes_too(read, plan_text):
    text = plan_text[: plan_text.index("[basin]")]
    assert "water.temperature_c" in where(default_notes(read(text, "records")))


def renamed(read, text):
    return [finding for finding in default_notes(read(text)) if finding.code == "opening-renamed"]


def with_second_opening(plan_text, edit, first, second):
    """Return a plan whose opening "shoal" is `first` in stage 1, and whose "main gap" is `second` in stage 2."""
    head, tail = plan_text.rsplit('name = "main gap"', 1)
    return edit(
        f'{head}name = "{second}"{tail}',
        ('opening."shoal"', f'opening."{first}"'),
        ('name = "shoal"', f'name = "{first}"'),
    )


@pytest.mark.parametrize(
    ("first", "second"),
    [
        ("gap", "Gap"),
        ("gap", "g a-p_"),
        ("gap", "gap\\u200b"),
        ("gap", "gap\\u00a0\\u2011"),
        ("caf\\u00e9", "cafe\\u0301"),
        ("north gap", "noth gap"),
        ("sill 3 east", "sil 3 east"),
    ],
)
def test_an_opening_under_a_nearly_equal_name_is_a_warning(read, plan_text, edit, first, second):
    (found,) = renamed(read, with_second_opening(plan_text, edit, first, second))
    assert found.severity == "warning"
    assert "starts new holes, from a flat bed" in found.message
    assert f'did you mean "{first.encode().decode("unicode_escape")}"?' in found.message
    assert found.where.startswith("stage 'sill to -4', opening ")


@pytest.mark.parametrize(
    ("first", "second"),
    [("shoal", "main gap"), ("shoal", "powerhouse"), ("north gap", "south gap"), ("section 3", "section 4")],
)
def test_an_opening_under_another_name_is_a_new_one(read, plan_text, edit, first, second):
    assert not renamed(read, with_second_opening(plan_text, edit, first, second))


def test_names_that_differ_by_case_are_a_warning_also_where_both_go_on(read, plan_text, edit):
    opening = '\n[[stage.opening]]\nname = "{}"\ncrest_level_m = -3.0\nwidth_m = 9.0\ndischarge_series = "model"\n'
    (found,) = renamed(read, plan_text + opening.format("Main gap"))
    assert 'did you mean "main gap"?' in found.message
    assert not renamed(read, plan_text + opening.format("main gaps"))


def test_a_run_with_soundings_that_would_be_refused_goes_on_and_says_so(read, design_text, full_tables, edit):
    assert not where(default_notes(read(design_text)), "soundings-not-complete")
    text = edit(design_text, ("2027-05-20T12", "2028-05-20T12"), ("depth_m = 3.6\n", ""))
    (note,) = [one for one in default_notes(read(text)) if one.code == "soundings-not-complete"]
    assert (note.severity, note.where) == ("note", "sounding")
    for words in (
        "`tidescour soundings` would refuse the plan. plan.toml line ",
        "].depth_m: missing",
        "].date: found",
    ):
        assert words in note.message
    full_tables("soundings.csv", ("0.3", ""), ("0.25", ""))
    (note,) = [one for one in default_notes(read(text)) if one.code == "soundings-not-complete"]
    assert note.message.endswith("; and 1 more")


def test_a_slip_in_a_middle_stage_is_a_warning(read, plan_text):
    stage = plan_text[plan_text.rindex("[[stage]]") :].replace("2027-06", "2027-07").replace("2027-05-11", "2027-06-20")
    three = plan_text + stage.replace("sill to -4", "sill to -2")
    assert not renamed(read, three)
    slip = three.rindex('"main gap"', 0, three.rindex("[[stage]]"))
    (found,) = renamed(read, three[:slip] + '"main gpa"' + three[slip + len('"main gap"') :])
    assert found.where == "stage 'sill to -4', opening 'main gpa'"
