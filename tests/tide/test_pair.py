"""What the tides of both sides say about each other."""

import numpy as np
import pytest

from tidescour.errors import RecordError
from tidescour.tide.fit import fit_from_table
from tidescour.tide.pair import compare_fits

M2_MINUTES_PER_DEGREE = 60.0 / 28.984104


def fit(amplitude_m, phase_deg, name="M2"):
    """Return a fit with one constituent."""
    return fit_from_table([name], np.array([amplitude_m]), np.array([phase_deg]), 0.0, 53.4)


def test_a_smaller_and_later_basin_is_a_note_with_ratio_and_lag():
    (note,) = compare_fits(fit(1.5, 60.0), fit(0.9, 90.0))
    assert note.severity == "note"
    assert note.code == "sides-compared"
    assert "1.500 m at sea and 0.900 m in the basin (ratio 0.600)" in note.message
    assert f"the basin lags by {30.0 * M2_MINUTES_PER_DEGREE:.1f} min" in note.message


def test_exchanged_records_are_refused_with_what_to_write():
    with pytest.raises(RecordError, match=r"records are exchanged; write the files of the sea gauge under \[records"):
        compare_fits(fit(0.9, 90.0), fit(1.5, 60.0))


@pytest.mark.parametrize(
    ("sea", "basin", "code"),
    [
        ((1.5, 60.0), (1.6, 61.0), "basin-larger"),
        ((1.5, 60.0), (1.6, 58.0), "basin-larger"),
        ((1.5, 60.0), (1.0, 57.0), "basin-leads"),
    ],
    ids=["larger", "larger-within-clocks", "leads"],
)
def test_a_larger_or_leading_basin_alone_is_a_warning(sea, basin, code):
    note, warning = compare_fits(fit(*sea), fit(*basin))
    assert note.code == "sides-compared"
    assert warning.severity == "warning"
    assert warning.code == code


def test_a_lead_within_the_error_of_clocks_is_none():
    (note,) = compare_fits(fit(1.5, 60.0), fit(1.0, 58.0))
    assert f"leads by {2.0 * M2_MINUTES_PER_DEGREE:.1f} min" in note.message


def test_the_lag_is_taken_across_north():
    (note,) = compare_fits(fit(1.5, 350.0), fit(0.9, 10.0))
    assert f"lags by {20.0 * M2_MINUTES_PER_DEGREE:.1f} min" in note.message


@pytest.mark.parametrize("factor", [0.01, 3.2808])
def test_the_comparison_does_not_depend_on_the_unit_of_both(factor):
    (plain,) = compare_fits(fit(1.5, 60.0), fit(0.9, 90.0))
    (scaled,) = compare_fits(fit(1.5 * factor, 60.0), fit(0.9 * factor, 90.0))
    assert plain.message.split("(")[1] == scaled.message.split("(")[1]


@pytest.mark.parametrize(
    ("sea", "basin"),
    [(fit(1.5, 60.0), fit(0.9, 90.0, "K1")), (fit(1.5, 60.0), fit(0.0, 0.0))],
    ids=["not-fitted", "no-tide"],
)
def test_without_the_lunar_tide_nothing_is_compared(sea, basin):
    (note,) = compare_fits(sea, basin)
    assert note.code == "sides-not-compared"
