from tidescour.plan.places import opening_names, places


def test_places_stand_in_order_of_openings_and_sides(read, plan_text):
    found = [(place.opening, place.side) for place in places(read(plan_text))]
    assert found == [("main gap", "sea"), ("main gap", "basin"), ("shoal", "sea"), ("shoal", "basin")]


def test_an_opening_stands_once_however_many_stages_have_it(read, plan_text):
    assert opening_names(read(plan_text)) == ("main gap", "shoal")


def test_an_override_goes_before_its_side_and_the_bed(read, plan_text):
    gap, shoal = (place for place in places(read(plan_text)) if place.side == "basin")
    assert (gap.bed_level_m, gap.d50_mm, gap.length_m) == (-9.0, 0.25, 90.0)
    assert (shoal.bed_level_m, shoal.d50_mm, shoal.length_m) == (-3.0, 0.2, 90.0)


def test_what_is_not_given_has_its_default(read, plan_text):
    gap, *_ = places(read(plan_text))
    assert (gap.widening, gap.local_velocity_factor, gap.start_depth_m) == (0.0, 1.0, 0.0)
    assert gap.alpha_basis == "integral"
    assert gap.chezy_m05_s is None
    assert gap.alpha == 2.4


def test_zero_in_an_override_is_a_value(read, plan_text, edit):
    text = edit(
        plan_text,
        ("chezy_m05_s = 40.0", "chezy_m05_s = 40.0\nstart_depth_m = 1.5\nwidening = 0.1"),
        ("bed_level_m = -3.0", "bed_level_m = 0.0\nstart_depth_m = 0.0\nwidening = 0.0"),
    )
    gap, shoal = (place for place in places(read(text)) if place.side == "basin")
    assert (gap.start_depth_m, gap.widening) == (1.5, 0.1)
    assert (shoal.bed_level_m, shoal.start_depth_m, shoal.widening) == (0.0, 0.0, 0.0)
