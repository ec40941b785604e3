import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from tidescour.report.style import broken, date_labels, mark, rows_and_columns, thinned


@given(arrays(np.float64, st.integers(1, 400), elements=st.floats(-1e3, 1e3) | st.just(np.nan)), st.integers(8, 60))
@settings(max_examples=150, deadline=None)
def test_a_thinned_series_keeps_extremes_ends_and_order(value, points):
    time_s = np.arange(len(value), dtype=np.float64)
    thin_s, thin = thinned(time_s, value, points)
    assert np.all(np.diff(thin_s) > 0.0)
    assert np.array_equal(value[thin_s.astype(int)], thin, equal_nan=True)
    assert (thin_s[0], thin_s[-1]) == (0.0, len(value) - 1.0)
    if not np.all(np.isnan(value)):
        assert np.nanmax(thin) == np.nanmax(value)
        assert np.nanmin(thin) == np.nanmin(value)


@given(st.integers(61, 5000), st.integers(8, 60))
@settings(max_examples=60, deadline=None)
def test_a_thinned_series_is_short(count, points):
    rng = np.random.default_rng(count)
    thin_s, _ = thinned(np.arange(count, dtype=np.float64), rng.normal(size=count), points)
    assert len(thin_s) <= points + 2


def test_a_thinned_series_keeps_its_breaks():
    value = np.sin(np.arange(1000.0))
    value[300:700] = np.nan
    thin_s, thin = thinned(np.arange(1000.0), value, 40)
    assert np.any(np.isnan(thin[(thin_s >= 300.0) & (thin_s < 700.0)]))


def test_a_short_series_is_not_thinned():
    time_s, value = np.arange(5.0), np.array([0.0, 1.0, np.nan, 3.0, 4.0])
    assert thinned(time_s, value, 5) == (time_s, value)


def test_a_series_breaks_where_an_interval_is_too_long_and_only_there():
    time_s, value = broken(np.array([0.0, 600.0, 4200.0, 7801.0]), np.array([1.0, 2.0, 3.0, 4.0]), 3600.0)
    assert time_s == pytest.approx([0.0, 600.0, 4200.0, 6000.5, 7801.0])
    assert np.array_equal(value, [1.0, 2.0, 3.0, np.nan, 4.0], equal_nan=True)


def test_stages_differ_in_more_than_colour():
    looks = [mark(number) for number in range(20)]
    assert len({(look.colour, look.dash) for look in looks}) == 20
    assert len({(look.colour, look.hatch) for look in looks}) == 20
    # next to one another neither colour nor dash nor hatch is the same
    for first, second in itertools.pairwise(looks):
        assert first.colour != second.colour
        assert first.dash != second.dash
        assert first.hatch != second.hatch


@pytest.mark.parametrize(
    ("panels", "columns", "grid"), [(1, 3, (1, 1)), (3, 3, (1, 3)), (4, 3, (2, 3)), (5, 2, (3, 2))]
)
def test_a_grid_holds_its_panels(panels, columns, grid):
    assert rows_and_columns(panels, columns) == grid


@pytest.mark.parametrize(
    ("ticks", "labels"),
    [
        (["2026-11-15", "2026-12-01", "2027-01-01"], ["15 Nov\n2026", "01 Dec\n", "01 Jan\n2027"]),
        (
            ["2027-04-01T12:00", "2027-04-01T18:00", "2027-04-02T00:00"],
            ["12:00\n01 Apr 2027", "18:00\n", "00:00\n02 Apr 2027"],
        ),
        ([], []),
    ],
)
def test_the_first_tick_and_each_change_name_the_year_or_the_date(ticks, labels):
    days = np.array(ticks, dtype="datetime64[s]").astype(np.float64) / 86400.0
    assert date_labels(days) == labels
