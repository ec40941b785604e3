"""From records and tables to a fit: which samples, which list, what is refused and what is said."""

import numpy as np
import pytest

from tidescour.errors import FitError, PlanError
from tidescour.gauge.records import FAIL, MISSING, NOT_EVALUATED, PASS, SUSPECT, GaugeRecord
from tidescour.plan.models import Tide
from tidescour.tide import fit as fit_module
from tidescour.tide.choice import choose_constituents
from tidescour.tide.fit import fit_from_table, fit_pair, fit_record
from tidescour.tide.predict import predicted_level

AUTO = Tide()
INFERRED = Tide(infer={"K2": ("S2", 0.272, 10.0), "P1": ("K1", 0.331, 5.0)})


def codes(fit):
    """Return the codes of the findings of a fit."""
    return {finding.code for finding in fit.findings}


def test_a_fit_says_what_it_rests_on(record, north_sea):
    fit = fit_record(record(north_sea, days=29.5), INFERRED, 53.4)
    names = choose_constituents(29.5 * 86400.0 - 3600.0, 1.0, 3600.0).names
    assert fit.constants.constituents == (*names, "K2", "P1")
    assert fit.side == "sea"
    assert fit.source == "record"
    assert fit.samples == 708
    assert fit.end_s - fit.start_s == 707 * 3600.0
    assert "inferred: K2 from S2, P1 from K1" in fit.choice
    assert "left out: MSF" in fit.choice
    assert fit.explained_share == pytest.approx(1.0, abs=1e-9)
    assert fit.residual_std_m < 1e-6


def test_a_prediction_a_year_on_holds_where_neighbours_are_inferred(record, north_sea, times):
    fit = fit_record(record(north_sea, days=29.5), INFERRED, 53.4)
    later_s = times(20.0, 3600.0, fit.end_s + 365.0 * 86400.0)
    error_m = predicted_level(fit.constants, later_s) - predicted_level(north_sea, later_s)
    assert np.max(np.abs(error_m)) < 1e-5


def test_a_prediction_drifts_where_neighbours_are_missing_and_the_fit_says_so(record, north_sea, times):
    # K2 is 0.272 of S2: taken together they are wrong by up to twice that a quarter of a year on.
    fit = fit_record(record(north_sea, days=29.5), AUTO, 53.4)
    later_s = times(20.0, 3600.0, fit.end_s + 80.0 * 86400.0)
    error_m = predicted_level(fit.constants, later_s) - predicted_level(north_sea, later_s)
    assert np.std(error_m) > 0.05
    assert "neighbour-missing" in codes(fit)
    assert "neighbour-missing" not in codes(fit_record(record(north_sea, days=210.0), AUTO, 53.4))


def test_noise_is_what_is_left(record, north_sea):
    noise_m = np.random.default_rng(4).normal(0.0, 0.08, 24 * 60)
    read = record(north_sea, days=60.0, noise_m=noise_m)
    fit = fit_record(read, INFERRED, 53.4)
    unknowns = 2 * (len(fit.constants.constituents) - 2) + 1
    left_m = np.std(noise_m) * np.sqrt(1.0 - unknowns / noise_m.size)
    assert fit.residual_std_m == pytest.approx(left_m, rel=0.02)
    assert fit.explained_share == pytest.approx(1.0 - fit.residual_std_m**2 / np.var(read.level_m), rel=1e-9)


def test_only_samples_flagged_one_or_two_enter(record, north_sea):
    read = record(north_sea, days=40.0)
    flag = np.where(np.arange(read.time_s.size) % 2 == 0, PASS, NOT_EVALUATED).astype(np.int8)
    level_m = read.level_m.copy()
    for first, value, mark in ((100, 50.0, SUSPECT), (300, -50.0, FAIL), (500, np.nan, MISSING)):
        level_m[first : first + 20] = value
        flag[first : first + 20] = mark
    spoilt = GaugeRecord(side="sea", time_s=read.time_s, level_m=level_m, flag=flag, step_s=3600.0, files=())
    fit = fit_record(spoilt, INFERRED, 53.4)
    assert fit.samples == read.time_s.size - 60
    assert fit.residual_std_m < 1e-6
    assert f"x {900 / 960:.4f} of good samples" in fit.choice


def test_bad_samples_at_both_ends_shorten_the_span(record, north_sea):
    hours = np.arange(40 * 24)
    fit = fit_record(record(north_sea, days=40.0, bad=(hours < 48) | (hours >= 38 * 24)), INFERRED, 53.4)
    assert fit.end_s - fit.start_s == (36 * 24 - 1) * 3600.0
    assert fit.choice.startswith(f"auto: Rayleigh 1 for {36 - 1 / 24:.2f} d x 1.0000")


def test_fifteen_days_are_enough_and_less_is_refused(record, north_sea):
    fit = fit_record(record(north_sea, days=15.0), AUTO, 53.4)
    assert {"M2", "S2", "K1", "O1"} <= set(fit.constants.constituents)
    with pytest.raises(FitError, match=r"sea record: 359\.0 h of good samples .* a tide needs 360 h .*sea_constants"):
        fit_record(record(north_sea, days=15.0 - 1.0 / 24.0), AUTO, 53.4)


def test_fifteen_days_are_counted_in_good_samples(record, north_sea):
    half = np.arange(28 * 24) % 2 == 1
    with pytest.raises(FitError, match=r"basin record: 336\.0 h of good samples .* basin = \"routed\""):
        fit_record(record(north_sea, days=28.0, side="basin", bad=half), AUTO, 53.4)


def test_a_record_without_good_samples_is_refused(record, north_sea):
    read = record(north_sea, days=20.0, bad=slice(None))
    with pytest.raises(FitError, match="sea record: no good samples"):
        fit_record(read, AUTO, 53.4)


def test_a_constant_record_is_its_mean(record, constants):
    fit = fit_record(record(constants({}, mean_m=0.1), days=20.0), AUTO, 53.4)
    assert fit.constants.mean_m == pytest.approx(0.1, abs=1e-12)
    assert np.max(fit.constants.amplitude_m) < 1e-12
    assert np.isnan(fit.explained_share)


def test_a_listed_fit_uses_the_list(record, north_sea):
    options = Tide(constituents=("M2", "S2", "N2", "K1", "O1", "M4", "MS4", "M6"), infer=INFERRED.infer)
    fit = fit_record(record(north_sea, days=30.0), options, 53.4)
    assert fit.constants.constituents == (*options.constituents, "K2", "P1")
    assert fit.choice.startswith("listed in the plan: 8 constituents")
    assert fit.residual_std_m < 1e-6


def test_an_ill_conditioned_list_is_warned_of_and_a_hopeless_one_refused(record, north_sea):
    # S2 with K2 alone: sqrt((1 + r) / (1 - r)) with r = sinc(17 d / 182.62 d), 11.7.
    listed = Tide(constituents=("M2", "S2", "K2", "K1", "O1"))
    fit = fit_record(record(north_sea, days=17.0), listed, 53.4)
    (finding,) = [each for each in fit.findings if each.code == "fit-ill-conditioned"]
    assert "S2 and K2" in finding.message or "K2 and S2" in finding.message
    assert "constituents-not-separable" in codes(fit)
    hopeless = Tide(constituents=("M2", "S2", "T2", "K2", "K1", "O1"))
    with pytest.raises(FitError, match=r"(S2|T2|K2) and (S2|T2|K2) are hard to tell apart .* at most 50"):
        fit_record(record(north_sea, days=17.0), hopeless, 53.4)


@pytest.mark.parametrize(
    ("options", "match"),
    [
        (Tide(constituents=("M2", "MS-4")), "no constituent is called 'MS-4'"),
        (Tide(constituents=("M2", "M12")), r"M12 cannot be told from slower ones in samples every 3600 s"),
        (Tide(constituents=("M2", "K1"), infer={"K2": ("S2", 0.272, 0.0)}), "S2 is not among the constituents to fit"),
        (Tide(infer={"L2": ("N2", 0.145, 0.0)}), "N2 is not among the constituents to fit"),
    ],
    ids=["unknown", "nyquist", "reference-not-listed", "reference-not-chosen"],
)
def test_a_list_or_an_inference_that_cannot_be_used_is_refused(record, north_sea, options, match):
    with pytest.raises(FitError, match=match):
        fit_record(record(north_sea, days=16.0), options, 53.4)


@pytest.mark.parametrize("factor", [0.3048, 100.0])
def test_a_fit_scales_with_the_levels(record, constants, factor):
    table = {"M2": (1.5, 60.0), "S2": (0.4, 120.0), "O1": (0.1, 200.0)}
    noise_m = np.random.default_rng(5).normal(0.0, 0.05, 20 * 24)
    plain = fit_record(record(constants(table), days=20.0, noise_m=noise_m), AUTO, 53.4)
    larger = constants({name: (factor * row[0], row[1]) for name, row in table.items()}, mean_m=factor * 0.3)
    scaled = fit_record(record(larger, days=20.0, noise_m=factor * noise_m), AUTO, 53.4)
    np.testing.assert_allclose(scaled.constants.amplitude_m, factor * plain.constants.amplitude_m, rtol=1e-9)
    assert scaled.residual_std_m == pytest.approx(factor * plain.residual_std_m, rel=1e-9)
    assert scaled.explained_share == pytest.approx(plain.explained_share, rel=1e-9)


def test_near_the_equator_the_fit_says_which_latitude_it_used(record, constants):
    read = record(constants({"M2": (1.0, 0.0)}, latitude_deg=2.0), days=20.0)
    assert "latitude-near-equator" in codes(fit_record(read, AUTO, 0.0))
    assert "latitude-near-equator" not in codes(fit_record(read, AUTO, -5.0))


def test_a_pair_is_fitted_on_the_shared_span_with_one_list(record, north_sea, constants, times):
    start_s = times(1.0)[0]
    inside = constants({"M2": (0.9, 80.0), "S2": (0.2, 150.0), "M4": (0.1, 10.0)}, mean_m=0.35)
    sea = record(north_sea, days=60.0)
    basin = record(inside, days=50.0, step_s=1800.0, side="basin", start_s=start_s + 20.0 * 86400.0)
    fits = fit_pair(sea, basin, AUTO, 53.4)
    assert [fit.side for fit in fits] == ["sea", "basin"]
    assert fits[0].constants.constituents == fits[1].constants.constituents
    shared_d = 40.0 - 1.0 / 24.0
    assert fits[0].constants.constituents == choose_constituents(shared_d * 86400.0, 1.0, 3600.0).names
    assert all(fit.start_s == start_s + 20.0 * 86400.0 for fit in fits)
    assert all(fit.end_s == start_s + 60.0 * 86400.0 - 3600.0 for fit in fits)
    place = fits[1].constants.constituents.index("M2")
    assert fits[1].constants.amplitude_m[place] == pytest.approx(0.9, abs=1e-6)


def test_the_list_of_a_pair_is_that_of_the_poorer_record(record, north_sea):
    bad = np.arange(60 * 24) % 10 < 6
    sea, basin = record(north_sea, days=60.0), record(north_sea, days=60.0, side="basin", bad=bad)
    fits = fit_pair(sea, basin, AUTO, 53.4)
    assert fits[0].constants.constituents == fits[1].constants.constituents
    assert "N2" not in fits[0].constants.constituents


def test_records_that_share_too_little_are_refused(record, north_sea, times):
    sea = record(north_sea, days=30.0)
    basin = record(north_sea, days=30.0, side="basin", start_s=times(1.0)[0] + 20.0 * 86400.0)
    with pytest.raises(FitError, match=r"240\.0 h of good samples of the span that both records share"):
        fit_pair(sea, basin, AUTO, 53.4)
    apart = record(north_sea, days=30.0, side="basin", start_s=times(1.0)[0] + 300.0 * 86400.0)
    with pytest.raises(FitError, match=r"0\.0 h of good samples of the span"):
        fit_pair(sea, apart, AUTO, 53.4)


def test_too_many_samples_are_thinned_and_not_averaged(record, north_sea):
    # With fewer allowed than in earnest, so that the test is quick.
    fit = fit_record(record(north_sea, days=40.0, step_s=300.0), INFERRED, 53.4, many_samples=5000)
    assert fit.samples == 40 * 24 * 3
    (note,) = [each for each in fit.findings if each.code == "samples-thinned"]
    assert "11520 good samples" in note.message
    assert "first of every 20 min" in note.message
    # An average over 20 min would lower M6 by 1 - sinc(20 min / 4.14 h) = 1.0 %.
    place = fit.constants.constituents.index("M6")
    assert fit.constants.amplitude_m[place] == pytest.approx(0.06, rel=1e-5)


def test_thinning_keeps_the_fastest_constituent_below_four_fifths_of_nyquist(record, north_sea):
    options = Tide(constituents=("M2", "S2", "M12"))
    fit = fit_record(record(north_sea, days=40.0, step_s=600.0), options, 53.4, many_samples=500)
    assert fit.samples == 40 * 48


def test_more_than_memory_holds_is_refused(record, north_sea, monkeypatch):
    monkeypatch.setattr(fit_module, "MOST_SAMPLES", 700)
    with pytest.raises(FitError, match=r"720 good samples are more than a fit can hold .*records\.sea\.exclude"):
        fit_record(record(north_sea, days=30.0), INFERRED, 53.4)


def test_a_table_of_constants_is_a_fit_without_a_record():
    fit = fit_from_table(["M2", "S2"], np.array([1.5, 0.4]), np.array([-60.0, 480.0]), 0.2, 53.4)
    assert fit.side == "sea"
    assert fit.source == "table"
    assert fit.constants.mean_m == 0.2
    np.testing.assert_allclose(fit.constants.phase_deg, [300.0, 120.0])
    assert fit.samples == 0
    assert np.isnan([fit.start_s, fit.end_s, fit.explained_share, fit.residual_std_m]).all()
    assert fit.findings == ()


def test_a_table_predicts_what_it_says(constants, times):
    fit = fit_from_table(["M2", "S2"], np.array([1.5, 0.4]), np.array([60.0, 120.0]), 0.2, 53.4)
    same = constants({"M2": (1.5, 60.0), "S2": (0.4, 120.0)}, mean_m=0.2)
    np.testing.assert_array_equal(predicted_level(fit.constants, times(2.0)), predicted_level(same, times(2.0)))


def test_phases_of_yearly_constituents_in_a_table_are_warned_of():
    fit = fit_from_table(["M2", "SA"], np.array([1.5, 0.1]), np.array([60.0, 120.0]), 0.2, 53.4)
    (finding,) = fit.findings
    assert finding.code == "phase-reference"
    assert finding.message.startswith("SA: phases are counted from the perigee")


def test_all_problems_of_a_table_are_told_at_once():
    with pytest.raises(PlanError) as refused:
        fit_from_table(
            ["M2", "LAM2", "M2", "K1", "Z0"],
            np.array([-1.0, 0.1, 0.1, np.nan, 0.1]),
            np.array([0.0, np.nan, 0.0, 0.0, 0.0]),
            np.inf,
            53.4,
        )
    text = str(refused.value)
    assert len(refused.value.problems) == 7
    assert "'LAM2' is called LDA2 here" in text
    assert "M2 stands twice" in text
    assert "M2: amplitude_m -1.0 must be finite and not negative" in text
    assert "K1: amplitude_m nan" in text
    assert "LAM2: phase_deg nan must be finite" in text
    assert "Z0 is the mean level" in text
    assert "tide.sea_mean_m inf must be finite" in text


@pytest.mark.parametrize(
    ("names", "amplitude_m", "match"),
    [([], [], "holds no constituent"), (["M2"], [1.0, 2.0], "needs one amplitude_m and one phase_deg")],
)
def test_a_table_that_is_empty_or_ragged_is_refused(names, amplitude_m, match):
    with pytest.raises(PlanError, match=match):
        fit_from_table(names, np.array(amplitude_m), np.zeros(len(names)), 0.0, 53.4)
