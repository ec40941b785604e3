"""Choice of constituents: what the plan's auto means, and what a list is checked for."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tidescour.errors import DomainError, FitError
from tidescour.tide.choice import LONG_PERIOD, check_constituents, choose_constituents, missing_neighbours
from tidescour.tide.library import constituent_frequencies

DAY_S = 86400.0


@pytest.mark.parametrize(
    ("days", "wanted", "left_out"),
    # Methods of tidal analysis at Rayleigh 1: what becomes separable at the synodic periods 14.77, 27.55, 182.6 and
    # 205.9 days and at a year.
    [
        (15.0, {"M2", "S2", "K1", "O1", "M4", "MS4", "M6"}, {"N2", "Q1", "MN4", "K2", "P1", "MSF"}),
        (29.5, {"M2", "S2", "N2", "K1", "O1", "Q1", "M4", "MS4", "MN4"}, {"K2", "P1", "NU2", "L2", "MSF"}),
        (33.0, {"L2", "MU2"}, {"K2", "P1", "MM", "MSF"}),
        (183.0, {"K2", "P1"}, {"NU2", "T2", "SSA", "MF"}),
        (206.0, {"K2", "P1", "NU2"}, {"T2", "SA", "SSA", "MSM"}),
        (364.9, {"NU2"}, {"T2", "SA", "SSA", "MM", "MSF", "MF"}),
        (366.0, {"T2", "S1", *LONG_PERIOD}, set()),
    ],
)
def test_longer_records_tell_more_constituents_apart(days, wanted, left_out):
    names = set(choose_constituents(days * DAY_S, 1.0, 600.0).names)
    assert wanted <= names
    assert not left_out & names


def test_holes_shorten_the_record_by_their_share():
    whole = choose_constituents(60.0 * DAY_S, 1.0, 600.0)
    holed = choose_constituents(120.0 * DAY_S, 0.5, 600.0)
    assert holed.names == whole.names
    assert "N2" not in choose_constituents(40.0 * DAY_S, 0.6, 600.0).names


@pytest.mark.parametrize(
    ("step_h", "fastest_left"),
    # 0.8 of the Nyquist frequency, 0.4 / step: at 1 h 0.4, at 2 h 0.2 and at 3 h 0.1333 cycles per hour; M4 0.1610,
    # M6 0.2415, M8 0.3220, S2 0.0833.
    [(1.0, "M8"), (2.0, "M4"), (3.0, "M3")],
)
def test_frequencies_above_four_fifths_of_nyquist_are_left_out(step_h, fastest_left):
    choice = choose_constituents(40.0 * DAY_S, 1.0, 3600.0 * step_h)
    assert max(constituent_frequencies(choice.names)) <= 0.4 / step_h
    assert fastest_left in choice.names
    if step_h > 1.0:
        assert "M8" in choice.text


@settings(max_examples=40, deadline=None)
@given(days=st.floats(15.0, 800.0), shorter=st.floats(0.5, 1.0), step_s=st.sampled_from([60.0, 600.0, 3600.0, 7200.0]))
def test_a_shorter_record_never_holds_more(days, shorter, step_s):
    assume_long = max(days * shorter, 1.0)
    longer = set(choose_constituents(days * DAY_S, 1.0, step_s).names)
    assert set(choose_constituents(assume_long * DAY_S, 1.0, step_s).names) <= longer


def test_the_text_says_how_and_what_was_left_out():
    text = choose_constituents(29.5 * DAY_S, 0.98, 3600.0).text
    assert text.startswith("auto: Rayleigh 1 for 29.50 d x 0.9800 of good samples")
    assert text.endswith("left out: MSF")


@pytest.mark.parametrize(
    ("span_s", "share", "step_s"), [(-1.0, 1.0, 600.0), (1e6, 0.0, 600.0), (1e6, 1.1, 600.0), (1e6, 1.0, 0.0)]
)
def test_numbers_out_of_range_are_refused(span_s, share, step_s):
    with pytest.raises(DomainError, match=r"must (be positive|lie above 0)"):
        choose_constituents(span_s, share, step_s)


@pytest.mark.parametrize("span_s", [float("nan"), float("inf")])
def test_a_span_that_is_no_number_is_refused(span_s):
    with pytest.raises(DomainError, match="must be positive"):
        choose_constituents(span_s, 1.0, 600.0)


def test_half_a_day_tells_no_tide():
    with pytest.raises(FitError, match=r"10\.0 h of good samples every 600 s tell no tide"):
        choose_constituents(36000.0, 1.0, 600.0)


def test_a_list_is_kept_as_it_is():
    choice = check_constituents(("M4", "M2", "S2"), (), 60.0 * DAY_S, 1.0, 600.0)
    assert choice.names == ("M4", "M2", "S2")
    assert choice.findings == ()


def test_neighbours_too_close_for_the_record_are_a_warning_that_names_them():
    choice = check_constituents(("M2", "K2", "S2", "N2"), (), 60.0 * DAY_S, 1.0, 600.0)
    (finding,) = choice.findings
    assert finding.code == "constituents-not-separable"
    assert "S2 and K2 need 182.6 days to be told apart, the record holds 60.0" in finding.message


def test_an_inferred_neighbour_needs_no_telling_apart():
    assert check_constituents(("M2", "K2", "S2"), ("K2",), 60.0 * DAY_S, 1.0, 600.0).findings == ()


def test_a_list_with_frequencies_above_four_fifths_of_nyquist_is_refused():
    # S4 at 6 h loses its cosine.
    with pytest.raises(FitError, match=r"M4, S4 cannot be told from slower ones in samples every 21600 s"):
        check_constituents(("K1", "M4", "S4"), (), 60.0 * DAY_S, 1.0, 21600.0)


@pytest.mark.parametrize(
    ("names", "match"),
    [(("M2", "MS-4"), "no constituent is called 'MS-4'; nearest: MS4"), (("M2", "M2"), "M2 stands twice")],
)
def test_a_list_with_bad_names_is_refused(names, match):
    with pytest.raises(FitError, match=match):
        check_constituents(names, (), 60.0 * DAY_S, 1.0, 600.0)


def test_missing_neighbours_are_named_with_the_line_to_write():
    (finding,) = missing_neighbours(("M2", "S2", "K1", "P1"), "records.sea")
    assert finding.severity == "warning"
    assert 'tide.infer = { K2 = ["S2", 0.272, 0.0] }' in finding.message
    assert missing_neighbours(("M2", "S2", "K2"), "records.sea") == ()
