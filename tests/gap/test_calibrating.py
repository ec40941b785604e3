"""A calibration from records to its verdict, on basins routed by another program with numbers that are known."""

import runpy
from functools import partial
from pathlib import Path

import numpy as np
import pytest

from tidescour.errors import FitError
from tidescour.gap.calibrating import calibrate_basin
from tidescour.gap.levels import Waters
from tidescour.gauge.records import GaugeRecord, InputFile
from tidescour.plan.models import Basin, Calibration
from tidescour.plan.models_calibration import Discharge
from tidescour.units import utc_text

FILE = InputFile(path="invented.csv", sha256="0" * 64)
START_S = 1772323200.0  # 2026-03-01T00:00:00Z
DAY_S = 86400.0
DAYS = 12
SETTLED_S = 2.0 * 12.42 * 3600.0
TIME_S = START_S + np.arange(DAYS * 144 + 1) * 600.0
AREA_M2 = 2.0e7
BASIN = Basin(level_m=(-3.0, 3.0), area_m2=(0.7 * AREA_M2, 1.3 * AREA_M2))
CREST_M, WIDTH_M = -6.0, 250.0
COEFFICIENT, AREA_FACTOR, OFFSET_M = 0.8, 1.2, 0.07
CAMPAIGN_S = START_S + 5.0 * DAY_S + np.arange(26) * 1800.0
ALL_THREE = ("coefficient", "area_factor", "datum_offset_m")


def sea(time_s):
    angle = 2.0 * np.pi * (time_s - START_S) / 3600.0
    return 1.5 * np.cos(angle / 12.4206012) + 0.4 * np.cos(angle / 12.0 - 1.0) + 0.1 * np.cos(angle / 6.2103006 - 2.0)


@pytest.fixture(scope="session")
def truth(true_levels, broad_crest):
    """Return levels each ten minutes from the start, for a width that may change with time."""

    def route(width=lambda time_s: WIDTH_M, crest_m=CREST_M):
        times = np.concatenate([START_S + np.arange(-432, 0) * 600.0, TIME_S])

        def flow_at(time_s):
            return partial(broad_crest, crest_m=crest_m, strength_m=COEFFICIENT * width(time_s))

        # The router hands over the sea level alone: with it goes the time, for the width.
        level = true_levels(
            times,
            lambda time_s: (sea(time_s), flow_at(time_s)),
            lambda outside, inside: outside[1](outside[0], inside),
            lambda level_m: AREA_FACTOR * AREA_M2 * (1.0 + 0.1 * level_m),
            0.0,
        )
        return level[432:]

    return route


@pytest.fixture(scope="session")
def steady(truth):
    return truth()


@pytest.fixture(scope="session")
def true_flow(steady, broad_crest):
    """Return the true discharge at instants."""

    def flow(time_s):
        inside = np.interp(time_s, TIME_S, steady)
        pairs = zip(sea(time_s), inside, strict=True)
        return np.array([broad_crest(*pair, CREST_M, COEFFICIENT * WIDTH_M) for pair in pairs])

    return flow


def gauge(side, level_m):
    return GaugeRecord(
        side=side, time_s=TIME_S, level_m=level_m, flag=np.ones(TIME_S.size), step_s=600.0, files=(FILE,)
    )


def noise(seed=7, size_m=0.005):
    return size_m * np.random.default_rng(seed).standard_normal(TIME_S.size)


def opening(name="gap", coefficient=0.95, width_m=WIDTH_M, **changes):
    values = {"name": name, "crest_level_m": CREST_M, "width_m": width_m, "relation": "broad-crest"}
    return {**values, "parameters": {"coefficient": coefficient}, **changes}


def calibrated(level_m, fit=ALL_THREE, openings=(), discharges=(), basin=BASIN, sea_m=None, **span):
    planned = Calibration.model_validate(
        {
            "start": utc_text(START_S),
            "end": utc_text(START_S + DAYS * DAY_S),
            "fit": fit,
            "opening": openings or (opening(),),
            **span,
        }
    )
    record = gauge("basin", level_m)
    sea_record = gauge("sea", sea(TIME_S) if sea_m is None else sea_m)
    waters = Waters(sea_record=sea_record, basin_record=record, series={})
    return calibrate_basin(planned, basin, waters, record, tuple(discharges))


def measured(time_s, value, error, name=""):
    return [
        Discharge.model_validate(
            {"time": utc_text(at), "opening": name, "discharge_m3_s": flow, "standard_error_m3_s": error}
        )
        for at, flow in zip(time_s, value, strict=True)
    ]


def codes(found):
    return {finding.code for finding in found.findings}


def held(estimate, name, value):
    place = estimate.names.index(name)
    return estimate.ci95_low[place] <= value <= estimate.ci95_high[place]


@pytest.fixture(scope="session")
def levels_only(steady):
    return calibrated(steady - OFFSET_M + noise())


@pytest.fixture(scope="session")
def with_campaign(steady, true_flow):
    flow = true_flow(CAMPAIGN_S)
    error = 0.04 * np.abs(flow).max()
    read = flow + error * np.random.default_rng(3).standard_normal(flow.size)
    return calibrated(steady - OFFSET_M + noise(), discharges=measured(CAMPAIGN_S, read, error))


def test_levels_alone_give_the_ratio_and_the_datum(levels_only):
    ratio = levels_only.estimate.ratio
    assert ratio.ci95_low <= COEFFICIENT / AREA_FACTOR <= ratio.ci95_high
    assert ratio.estimate == pytest.approx(COEFFICIENT / AREA_FACTOR, rel=0.01)
    assert held(levels_only.estimate, "datum_offset_m", OFFSET_M)
    assert dict(zip(ALL_THREE, levels_only.estimate.determined, strict=True)) == {
        "coefficient": False,
        "area_factor": False,
        "datum_offset_m": True,
    }


def test_where_only_the_ratio_is_known_the_storage_is_kept_and_that_is_told(levels_only):
    used = levels_only.used
    assert used.names == ("coefficient", "datum_offset_m")
    assert held(used, "coefficient", COEFFICIENT / AREA_FACTOR)
    assert held(used, "datum_offset_m", OFFSET_M)
    assert levels_only.coefficients == (("gap", pytest.approx(used.estimate[0])),)
    assert {"storage-kept", "tied-parameters", "not-determined"} <= codes(levels_only)
    told = next(finding.message for finding in levels_only.findings if finding.code == "storage-kept")
    assert f"coefficient = {used.estimate[0]:.3g}" in told


def test_levels_on_one_datum_meet_within_the_noise(levels_only, steady):
    recorded = np.interp(levels_only.record_time_s, levels_only.time_s, levels_only.level_routed_m)
    settled = levels_only.record_time_s > START_S + SETTLED_S
    assert np.abs(recorded - np.interp(levels_only.record_time_s, TIME_S, steady))[settled].max() < 0.005
    np.testing.assert_allclose(levels_only.record_level_m, steady + noise(), atol=0.005)


def test_a_campaign_gives_both_numbers(with_campaign):
    found = with_campaign.estimate
    assert with_campaign.used is found
    assert found.determined.all()
    for name, value in zip(ALL_THREE, (COEFFICIENT, AREA_FACTOR, OFFSET_M), strict=True):
        assert held(found, name, value), name
    assert codes(with_campaign) <= {"tied-parameters"}


def test_discharges_from_every_source_meet_over_the_campaign(with_campaign, true_flow):
    (table,) = with_campaign.campaigns
    (comparison,) = table.comparisons
    assert (table.opening, table.measured) == ("", True)
    assert [row.source for row in comparison.rows] == ["measured", "by head", "by storage", "routed"]
    fine_s = np.arange(comparison.start_s, comparison.end_s + 1.0, 60.0)
    flow = true_flow(fine_s)
    flood, ebb = (np.trapezoid(np.maximum(sign * flow, 0.0), fine_s) for sign in (1.0, -1.0))
    slack = fine_s[:-1][flow[:-1] * flow[1:] < 0.0]
    for row in comparison.rows[1:]:
        # By head, half a centimetre of noise counts around slack; area and coefficient are known within 2 %.
        assert row.flood_volume_m3 == pytest.approx(flood, rel=0.03), row.source
        assert row.ebb_volume_m3 == pytest.approx(ebb, rel=0.03), row.source
        assert row.slack_time_s.size == slack.size
        np.testing.assert_allclose(row.slack_time_s, slack, atol=600.0)
    read = comparison.rows[0]
    assert abs(read.flood_volume_m3 - flood) < 3.0 * read.flood_volume_error_m3 + 0.02 * flood


def test_the_parts_share_the_span_as_the_plan_says(levels_only):
    fitted, back = levels_only.parts
    split_s = START_S + 0.75 * DAYS * DAY_S
    assert (fitted.name, back.name) == ("fitted", "held back")
    assert START_S + SETTLED_S <= fitted.start_s <= START_S + SETTLED_S + 1200.0
    assert (fitted.end_s, back.start_s, back.end_s) == (split_s, split_s + 600.0, START_S + DAYS * DAY_S)
    assert (levels_only.fitted_from_s, levels_only.fitted_to_s) == (fitted.start_s, fitted.end_s)
    assert fitted.routed.count == round((fitted.end_s - fitted.start_s) / 600.0) + 1
    for part in levels_only.parts:
        # A model without fault leaves the noise, which was invented as 5 mm.
        assert part.routed.rms_m == pytest.approx(0.005, rel=0.15)
        assert part.guess.rms_m > 5.0 * part.routed.rms_m
    assert "no-better-than-guess" not in codes(levels_only)


def test_nothing_held_back_is_told(steady):
    found = calibrated(steady - OFFSET_M + noise(), fit=("datum_offset_m",), hold_back=0.0)
    assert [part.name for part in found.parts] == ["fitted"]
    assert "nothing-held-back" in codes(found)
    # With no coefficient to fit there is none to write, nor one by week.
    assert found.coefficients == ()
    assert "basin-drifts" not in codes(found)


def test_a_gap_that_narrows_is_told_by_the_part_held_back(truth):
    closing = START_S + 0.75 * DAYS * DAY_S
    level = truth(lambda time_s: WIDTH_M if time_s < closing else 0.35 * WIDTH_M)
    found = calibrated(level + noise(), fit=("coefficient",))
    assert found.parts[0].routed.rms_m < 0.01
    told = next(finding.message for finding in found.findings if finding.code == "no-better-than-guess")
    back = found.parts[1]
    assert f"by {100.0 * back.routed.rms_m:.1f} cm rms" in told
    assert f"lagged by {100.0 * back.guess.rms_m:.1f} cm" in told


def test_a_gap_that_grows_while_it_is_fitted_is_told_as_drift(truth):
    level = truth(lambda time_s: WIDTH_M * (0.75 + 0.5 * (time_s - START_S) / (DAYS * DAY_S)))
    found = calibrated(level + noise(), fit=("coefficient",))
    told = next(finding.message for finding in found.findings if finding.code == "basin-drifts")
    assert "2 equal parts" in told


def test_two_openings_as_one_of_their_width_keep_the_shares_of_their_coefficients(steady):
    pair = (opening("west", 0.9, 0.4 * WIDTH_M), opening("east", 0.6, 0.6 * WIDTH_M))
    found = calibrated(steady - OFFSET_M + noise(), fit=("coefficient", "datum_offset_m"), openings=pair)
    west, east = dict(found.coefficients)["west"], dict(found.coefficients)["east"]
    assert east / west == pytest.approx(0.6 / 0.9, rel=1e-9)
    # The sum of coefficient times width is what the levels know.
    assert 0.4 * west + 0.6 * east == pytest.approx(COEFFICIENT / AREA_FACTOR, rel=0.01)
    assert found.estimate.estimate[0] == west


def test_campaigns_at_single_openings_have_tables_of_their_own(steady, true_flow):
    flow = true_flow(CAMPAIGN_S)
    pair = (opening("west", width_m=0.4 * WIDTH_M), opening("east", width_m=0.6 * WIDTH_M))
    rows = [
        *measured(CAMPAIGN_S, 0.4 * flow, 60.0, "west"),
        *measured(CAMPAIGN_S[5:6], 0.6 * flow[5:6], 60.0, "east"),
    ]
    areas = tuple(AREA_FACTOR * area for area in BASIN.area_m2)
    basin = BASIN.model_copy(update={"area_m2": areas})
    found = calibrated(steady + noise(), ("coefficient",), pair, rows, basin, hold_back=0.0)
    assert found.estimate.discharge_count == CAMPAIGN_S.size + 1
    every, west = found.campaigns
    # A single measurement is fitted, but is no campaign.
    assert [(table.opening, table.measured) for table in found.campaigns] == [("", False), ("west", True)]
    assert [series.source for series in west.series] == ["by head", "routed", "measured"]
    assert [series.source for series in every.series] == ["by head", "by storage", "routed"]
    comparison = west.comparisons[0]
    fine_s = np.arange(comparison.start_s, comparison.end_s + 1.0, 60.0)
    flood = np.trapezoid(np.maximum(0.4 * true_flow(fine_s), 0.0), fine_s)
    routed = next(row for row in comparison.rows if row.source == "routed")
    assert routed.flood_volume_m3 == pytest.approx(flood, rel=0.02)
    assert every.comparisons[0].end_s - every.comparisons[0].start_s > (DAYS - 1) * DAY_S


def test_two_boats_at_one_time_are_one_value_of_both_weights(steady, true_flow):
    flow = true_flow(CAMPAIGN_S)
    rows = measured(CAMPAIGN_S, 1.1 * flow, 100.0) + measured(CAMPAIGN_S, 0.95 * flow, 50.0)
    found = calibrated(steady - OFFSET_M + noise(), discharges=rows)
    (table,) = found.campaigns
    series = table.series[-1]
    assert table.measured
    assert found.estimate.discharge_count == 2 * CAMPAIGN_S.size
    # Weights 1 to 4: (1.1 + 4 x 0.95) / 5, and an error of 100 / sqrt(5).
    np.testing.assert_allclose(series.discharge_m3_s, 0.98 * flow, rtol=1e-9)
    np.testing.assert_allclose(series.standard_error_m3_s, 100.0 / np.sqrt(5.0), rtol=1e-9)


def test_holes_and_failed_samples_of_the_basin_are_no_evidence(steady):
    level = steady - OFFSET_M + noise()
    flag = np.ones(TIME_S.size)
    level[700:800], flag[700:800] = np.nan, 9
    level[900:950], flag[900:950] = 25.0, 4
    record = GaugeRecord(side="basin", time_s=TIME_S, level_m=level, flag=flag, step_s=600.0, files=(FILE,))
    planned = Calibration.model_validate(
        {
            "start": utc_text(START_S),
            "end": utc_text(START_S + DAYS * DAY_S),
            "fit": ("coefficient", "datum_offset_m"),
            "opening": (opening(),),
        }
    )
    waters = Waters(sea_record=gauge("sea", sea(TIME_S)), basin_record=record, series={})
    found = calibrate_basin(planned, BASIN, waters, record, ())
    assert held(found.estimate, "coefficient", COEFFICIENT / AREA_FACTOR)
    assert not np.any(np.isin(found.record_time_s, TIME_S[np.r_[700:800, 900:950]]))
    assert np.all(np.isfinite(found.record_level_m))


def test_a_gap_that_is_shut_is_refused(steady):
    with pytest.raises(FitError, match=r"the gap is shut: .* in 0 % of the span only; correct crest_level_m"):
        calibrated(steady + noise(), openings=(opening(crest_level_m=5.0),))


def test_a_basin_that_stands_with_the_sea_is_refused():
    with pytest.raises(FitError, match=r"a wide gap tells nothing of the coefficient: .* calibrate on a span with"):
        calibrated(sea(TIME_S) + noise(), openings=(opening(width_m=20000.0),), fit=("coefficient",))


def test_less_than_two_tides_after_the_settling_are_refused(steady):
    with pytest.raises(FitError, match=r"basin levels cover 20 h; at least 2 tides .* longer span"):
        calibrated(steady + noise(), end=utc_text(START_S + 60.0 * 3600.0))


def test_records_are_kept_read_only(levels_only):
    for key in ("time_s", "level_sea_m", "level_routed_m", "level_guess_m", "record_time_s", "record_level_m"):
        with pytest.raises(ValueError, match="read-only"):
            getattr(levels_only, key)[0] = 0.0


@pytest.mark.slow
def test_intervals_hold_the_truth_as_often_as_they_say_with_the_packages_own_basin():
    coverage = runpy.run_path(str(Path(__file__).with_name("calibration_coverage.py")))
    rows, _ = coverage["study"](200, 20270401, coverage["package_router"])
    told = [(True, name) for name in (*ALL_THREE, "ratio")] + [(False, "datum_offset_m"), (False, "ratio")]
    shares = []
    for campaign, name in told:
        own = [
            low <= truth <= high
            for with_campaign, key, low, truth, high, *_ in rows
            if (with_campaign, key) == (campaign, name)
        ]
        assert len(own) == 100
        # Of 100 with 95 % each, 88 or fewer come once in 230.
        assert sum(own) >= 89, (campaign, name)
        shares.append(np.mean(own))
    assert 0.92 <= np.mean(shares) <= 0.98
