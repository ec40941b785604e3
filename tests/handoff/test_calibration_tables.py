"""Tables of a calibration and the lines for the plan, of estimates invented by hand."""

import csv
import io
import json
import re
import tomllib

import numpy as np
import pytest

from tidescour import pipeline
from tidescour.gap.calibrating import Calibrated, Part
from tidescour.gap.calibration_records import Estimate, Interval
from tidescour.gap.campaigns import CampaignTable
from tidescour.gap.discharges import CampaignComparison, DischargeSeries, TidalDischarge
from tidescour.gap.held_back import LaggedSea, LevelScore
from tidescour.handoff.calibration_tables import (
    MOST_SLACKS,
    calibration_tables,
    campaigns_table,
    estimates_table,
    plan_lines,
    scores_table,
)
from tidescour.handoff.tables import csv_bytes, row_objects
from tidescour.plan.loader import read_plan

START_S = 1772323200.0  # 2026-03-01T00:00:00Z
PLAN = """
[site]
name = "Invented gap"
datum = "invented datum"
latitude_deg = 53.0

[records.sea]
files = ["sea.csv"]
utc_offset = "+00:00"
unit = "m"

[records.basin]
files = ["basin.csv"]
utc_offset = "+00:00"
unit = "m"
shift_m = 0.15

[basin]
level_m = [-3.0, 0.0, 3.0]
area_m2 = [1.4e7, 2.0e7, 2.6e7]

[calibration]
start = 2026-03-01T00:00:00Z
end = 2026-03-20T00:00:00Z
fit = ["coefficient", "area_factor", "datum_offset_m"]

[[calibration.opening]]
name = 'the "old" gap'
crest_level_m = -6.0
width_m = 250.0
relation = "broad-crest"
coefficient = 0.95

[[calibration.opening]]
name = "shoal"
crest_level_m = -2.0
width_m = 500.0
relation = "broad-crest"
coefficient = 0.90
"""
NAMES = ("coefficient", "area_factor", "datum_offset_m")


def estimate(values=(0.8, 1.2, 0.0321), low=(0.76, 1.1, 0.02), high=(0.84, 1.3, 0.044), names=NAMES, **changes):
    count = len(names)
    wanted = {
        "names": names,
        "estimate": np.array(values[:count]),
        "ci95_low": np.array(low[:count]),
        "ci95_high": np.array(high[:count]),
        "determined": np.ones(count, dtype=bool),
        "covariance": np.eye(count),
        "correlation": np.array([[1.0, 0.9, 0.1], [0.9, 1.0, -0.2], [0.1, -0.2, 1.0]])[:count, :count],
        "ratio": Interval(estimate=0.667, ci95_low=0.65, ci95_high=0.684) if count == 3 else None,
        "residual_std_m": 0.01,
        "residual_correlation_time_h": 1.0,
        "level_count": 1000,
        "effective_count": 100.0,
        "noise_order": 1,
        "discharge_count": 0,
        "chi_square": np.nan,
        "discharge_widening": 1.0,
        "tidal_excess": 1.0,
        "level_signal": np.ones(count),
        "discharge_signal": np.full(count, np.nan),
    }
    return Estimate(**{**wanted, **changes})


def score(rms_m, **changes):
    return LevelScore(
        **{"count": 500, "rms_m": rms_m, "bias_m": -0.01, "range_error_m": 0.02, "phase_error_s": 90.0} | changes
    )


def series(source, step_s, count=13, error=np.nan):
    time_s = START_S + step_s * np.arange(count)
    return DischargeSeries(
        source=source,
        time_s=time_s,
        discharge_m3_s=np.linspace(-60.0, 60.0, count),
        standard_error_m3_s=np.full(count, error),
    )


def discharge(source, slacks=(), volume=2.0e6):
    return TidalDischarge(
        source=source,
        start_s=START_S,
        end_s=START_S + 46800.0,
        flood_volume_m3=volume,
        ebb_volume_m3=1.0e6,
        flood_volume_error_m3=np.nan,
        ebb_volume_error_m3=5.0e4,
        flood_peak_m3_s=100.0,
        ebb_peak_m3_s=60.0,
        flood_peak_time_s=START_S,
        ebb_peak_time_s=np.nan,
        slack_time_s=np.array(slacks),
    )


def calibrated(found=None, used=None, parts=None, rows=(), table_of="", curves=(), days=2.0):
    found = found or estimate()
    used = used or found
    time_s = START_S + np.arange(0.0, days * 86400.0 + 1.0, 60.0)
    record_s = time_s[::10][:100]
    coefficients = ()
    if "coefficient" in used.names:
        first = float(used.estimate[used.names.index("coefficient")])
        coefficients = (('the "old" gap', first), ("shoal", first * 0.90 / 0.95))
    comparison = CampaignComparison(
        start_s=START_S, end_s=START_S + 46800.0, whole_flood=True, whole_ebb=True, rows=tuple(rows)
    )
    campaign = CampaignTable(opening=table_of, measured=True, comparisons=(comparison,), series=tuple(curves))
    return Calibrated(
        estimate=found,
        used=used,
        coefficients=coefficients,
        time_s=time_s,
        level_sea_m=np.sin(time_s / 7116.0),
        level_routed_m=0.5 * np.sin(time_s / 7116.0),
        level_guess_m=np.where(time_s < START_S + 3600.0, np.nan, 0.5),
        record_time_s=record_s,
        record_level_m=0.1 + 0.0 * record_s,
        fitted_from_s=START_S + 86400.0,
        fitted_to_s=START_S + 1.5 * 86400.0,
        guess=LaggedSea(level_m=0.0, factor=0.5, lag_s=600.0, rms_m=0.1),
        parts=parts
        or (Part(name="fitted", start_s=START_S, end_s=START_S + 86400.0, routed=score(0.05), guess=score(0.09)),),
        campaigns=(campaign,) if rows or curves else (),
        findings=(),
    )


@pytest.fixture
def planned(tmp_path):
    def read(text=PLAN):
        path = tmp_path / "plan.toml"
        path.write_text(text, encoding="utf-8")
        return read_plan(path, pipeline.plan_choices(), purpose="calibrate")

    return read


def pasted(text, lines):
    """Return a plan with the lines put in the place of those with the same key, openings by their name."""
    found = tomllib.loads(lines)
    kept = {line.split(" = ")[0]: line for line in lines.splitlines() if " = " in line}
    for key in ("shift_m", "level_m", "area_m2", "volume_m3"):
        if key in kept:
            text, count = re.subn(rf"(?m)^{key} = .*$", kept[key], text)
            assert count == 1, key
    for opening in found.get("calibration", {}).get("opening", ()):
        for written in (json.dumps(opening["name"]), f"'{opening['name']}'"):
            text = re.sub(
                rf"(name = {re.escape(written)}\n(?:.*\n)*?)coefficient = .*",
                rf"\g<1>coefficient = {opening['coefficient']}",
                text,
            )
    return text


def rows_of(table):
    return list(csv.DictReader(io.StringIO(csv_bytes(table).decode("utf-8-sig"))))


def test_the_lines_are_toml_and_a_plan_with_them_has_the_numbers_found(planned):
    lines = plan_lines(planned(), calibrated())
    plan = planned(pasted(PLAN, lines))
    assert [opening.parameters["coefficient"] for opening in plan.calibration.opening] == pytest.approx(
        [0.8, 0.8 * 0.90 / 0.95], rel=5e-4
    )
    assert plan.basin.area_m2 == pytest.approx((1.2 * 1.4e7, 1.2 * 2.0e7, 1.2 * 2.6e7), rel=5e-6)
    assert plan.basin.level_m == (-3.0, 0.0, 3.0)
    assert plan.records.basin.shift_m == pytest.approx(0.15 + 0.0321, abs=5e-5)


def test_each_line_has_its_own_interval_behind_it(planned):
    lines = plan_lines(planned(), calibrated())
    assert "coefficient = 0.8  # 0.76 to 0.84\n" in lines
    assert f"coefficient = {0.8 * 0.90 / 0.95:.4g}  # {0.76 * 0.90 / 0.95:.4g} to {0.84 * 0.90 / 0.95:.4g}\n" in lines
    assert "# times 1.2: 1.1 to 1.3\n" in lines
    assert "shift_m = 0.1821  # 0.1700 to 0.1940\n" in lines


def test_volumes_that_differ_little_still_increase(planned):
    near = "volume_m3 = [-1.0, 12345678.0, 12345679.0]"
    text = PLAN.replace("area_m2 = [1.4e7, 2.0e7, 2.6e7]", near)
    plan = planned(pasted(text, plan_lines(planned(text), calibrated())))
    assert plan.basin.volume_m3 == pytest.approx((-1.2, 1.2 * 12345678.0, 1.2 * 12345679.0), rel=1e-8)


def test_a_storage_table_is_told_to_go(planned, tmp_path):
    (tmp_path / "storage.csv").write_text("level_m,area_m2\n-3,1.4e7\n3,2.6e7\n", encoding="utf-8")
    lists = "level_m = [-3.0, 0.0, 3.0]\narea_m2 = [1.4e7, 2.0e7, 2.6e7]"
    lines = plan_lines(planned(PLAN.replace(lists, 'table = "storage.csv"')), calibrated())
    assert "[basin]  # instead of its table\nlevel_m = [-3, 3]\narea_m2 = [16800000, 31200000]" in lines.replace(
        "1.68e+07", "16800000"
    ).replace("3.12e+07", "31200000")


def test_what_the_records_do_not_tell_is_not_written(planned):
    open_ends = estimate(low=(0.0, 0.0, 0.02), high=(np.inf, np.inf, 0.044), determined=np.array([False, False, True]))
    lines = plan_lines(planned(), calibrated(open_ends))
    assert tomllib.loads(lines) == {"records": {"basin": {"shift_m": pytest.approx(0.1821)}}}
    assert '# coefficient of the "old" gap: the records do not tell' in lines
    assert "inf" not in lines
    nothing = estimate(determined=np.zeros(3, dtype=bool))
    assert tomllib.loads(plan_lines(planned(), calibrated(nothing))) == {}


def test_lines_of_a_fit_with_the_storage_kept_say_so(planned):
    found = estimate(determined=np.array([False, False, True]))
    kept = estimate((0.667, 0.041), (0.65, 0.03), (0.684, 0.052), ("coefficient", "datum_offset_m"), ratio=None)
    lines = plan_lines(planned(), calibrated(found, kept))
    assert "with the storage as the plan has it" in lines
    written = tomllib.loads(lines)
    assert set(written) == {"calibration", "records"}
    assert written["calibration"]["opening"][0] == {"name": 'the "old" gap', "coefficient": 0.667}
    assert written["records"]["basin"]["shift_m"] == pytest.approx(0.191)


def test_only_what_was_fitted_is_written(planned):
    datum = estimate((0.0321,), (0.02,), (0.044,), ("datum_offset_m",))
    assert set(tomllib.loads(plan_lines(planned(), calibrated(datum)))) == {"records"}


def test_estimates_stand_with_their_ends_and_the_ratio_last():
    rows = rows_of(estimates_table(calibrated()))
    assert [row["parameter"] for row in rows] == [*NAMES, "coefficient_over_area_factor"]
    assert [float(rows[0][key]) for key in ("estimate", "ci95_low", "ci95_high")] == [0.8, 0.76, 0.84]
    assert {row["determined"] for row in rows} == {"yes"}
    # Within a factor of 1.5 either way the ratio is of use too.
    wide = estimate(ratio=Interval(estimate=1.0, ci95_low=0.6, ci95_high=1.7))
    assert rows_of(estimates_table(calibrated(wide)))[-1]["determined"] == "no"


def test_an_interval_without_ends_is_an_empty_cell_in_csv_and_null_in_json():
    endless = estimate(
        low=(0.0, 0.0, -np.inf),
        high=(np.inf, 1.3, np.inf),
        determined=np.array([False, True, False]),
        ratio=Interval(estimate=0.7, ci95_low=0.0, ci95_high=np.inf),
    )
    table = estimates_table(calibrated(endless))
    cells = [[row[key] for key in ("estimate", "ci95_low", "ci95_high")] for row in rows_of(table)]
    assert [row == ["", "", ""] for row in cells] == [True, False, True, True]
    json.dumps(row_objects(table), allow_nan=False)
    assert row_objects(table)[0]["ci95_high"] is None
    assert [row["determined"] for row in rows_of(table)] == ["no", "yes", "no", "no"]


def test_every_table_of_a_calibration_can_be_written():
    slacks = START_S + 600.0 * np.arange(MOST_SLACKS + 3)
    found = calibrated(
        rows=(discharge("measured", slacks), discharge("routed", volume=np.nan)),
        curves=(series("routed", 60.0), series("measured", 1800.0, error=5.0)),
    )
    tables = {table.name: rows_of(table) for table in calibration_tables(found)}
    assert set(tables) == {"calibration", "correlations", "levels", "scores", "campaigns", "discharges"}
    assert [(row["parameter"], row["other"], float(row["correlation"])) for row in tables["correlations"]] == [
        ("coefficient", "area_factor", 0.9),
        ("coefficient", "datum_offset_m", 0.1),
        ("area_factor", "datum_offset_m", -0.2),
    ]
    measured, routed = tables["campaigns"]
    assert measured["opening"] == "all"
    assert len(measured["slacks"].split()) == MOST_SLACKS
    assert measured["slacks"].startswith("2026-03-01T00:00:00Z 2026-03-01T00:10:00Z")
    assert (routed["flood_volume_m3"], routed["slacks"]) == ("", "")
    assert measured["flood_volume_error_m3"] == ""
    # A computed series every ten minutes, a measured one as it is.
    assert [row["source"] for row in tables["discharges"]] == ["routed"] * 2 + ["measured"] * 13
    assert {row["standard_error_m3_s"] for row in tables["discharges"][:2]} == {""}


def part_counts(rows):
    return {part: sum(row["part"] == part for row in rows) for part in ("settling", "fitted", "held back")}


def test_levels_say_which_part_they_are_of_and_leave_holes_empty():
    held = START_S + 1.5 * 86400.0 + 600.0
    parts = (
        Part(name="fitted", start_s=START_S, end_s=held - 600.0, routed=score(0.05), guess=score(0.09)),
        Part(name="held back", start_s=held, end_s=held + 40000.0, routed=score(0.05), guess=score(0.09)),
    )
    rows = rows_of(calibration_tables(calibrated(parts=parts))[2])
    assert len(rows) == 2 * 144 + 1
    assert part_counts(rows) == {"settling": 144, "fitted": 73, "held back": 72}
    # Without a part held back nothing is called so, whatever the record lacks at its end.
    assert part_counts(rows_of(calibration_tables(calibrated())[2])) == {"settling": 144, "fitted": 145, "held back": 0}
    assert rows[100]["level_recorded_m"] == ""
    assert float(rows[50]["level_recorded_m"]) == pytest.approx(0.1)
    assert [row["level_guess_m"] == "" for row in rows[:8]] == [True] * 6 + [False] * 2


def test_scores_stand_by_part_and_method_with_the_phase_in_minutes():
    parts = tuple(
        Part(
            name=name,
            start_s=START_S,
            end_s=START_S + 86400.0,
            routed=score(0.05),
            guess=score(0.09, range_error_m=np.nan),
        )
        for name in ("fitted", "held back")
    )
    rows = rows_of(scores_table(calibrated(parts=parts)))
    assert [(row["part"], row["method"]) for row in rows] == [
        ("fitted", "routed"), ("fitted", "guess"), ("held back", "routed"), ("held back", "guess"),
    ]  # fmt: skip
    assert float(rows[0]["phase_error_min"]) == 1.5
    assert rows[1]["range_error_m"] == ""


def test_a_campaign_at_one_opening_has_its_name():
    rows = rows_of(campaigns_table(calibrated(rows=(discharge("measured"),), table_of="shoal")))
    assert [row["opening"] for row in rows] == ["shoal"]
