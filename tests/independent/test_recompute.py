"""Two programs, one plan: the command line against the recomputation beside this file, and against closed forms."""

import ast
import csv
import json
import math
import shutil
import subprocess
import sys
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp
from scipy.special import gamma

HERE = Path(__file__).parent
TOLERANCE = 0.005
DONE = {0, 4}  # finished, without and with findings of severity error
M2_H, S2_H, K1_H, O1_H = 12.4206012, 12.0, 23.9344697, 25.8193417
OURS = ("formulas.py", "sections.py", "levels.py", "cycles.py", "recompute.py", "growing.py", "rebend.py")

DURATION_COLUMNS = (
    "cycles",
    "reference_velocity_m_s",
    "alpha",
    "critical_velocity_m_s",
    "reference_depth_m",
    "effective_duration_integral_h",
    "effective_duration_flow_mean_h",
    "effective_duration_cycle_mean_h",
    "stage_depth_m",
    "end_depth_m",
    "peak_gap_velocity_m_s",
    "peak_end_velocity_m_s",
    "share_percent",
)
PROTECTION_COLUMNS = (
    "final_depth_m",
    "final_depth_integral_m",
    "final_depth_flow_mean_m",
    "final_depth_cycle_mean_m",
    "length_required_m",
    "alpha_at_required",
)
CYCLE_COLUMNS = tuple(
    f"{side}_effective_{rule}_h" for side in ("basin", "sea") for rule in ("integral", "flow_mean", "cycle_mean")
)

Rows = list[dict[str, str]]


def wave(hours: np.ndarray, *parts: tuple[float, float, float]) -> np.ndarray:
    """Sum of amplitude x cos(2 pi (t - delay) / period)."""
    return sum(
        amplitude * np.cos(2.0 * np.pi * (hours - delay) / period) for amplitude, period, delay in parts
    ) + np.zeros_like(hours)


def write_table(path: Path, header: str, stamps: list[str], values: np.ndarray) -> None:
    lines = [f"{stamp},{value:.9g}" for stamp, value in zip(stamps, values.tolist(), strict=True)]
    path.write_text("\n".join([header, *lines]) + "\n", encoding="utf-8")


def utc_stamps(start: datetime, hours: np.ndarray) -> list[str]:
    return [f"{start + timedelta(hours=hour):%Y-%m-%dT%H:%M:%SZ}" for hour in hours.tolist()]


def write_series(path: Path, header: str, start: datetime, hours: np.ndarray, values: np.ndarray) -> None:
    write_table(path, header, utc_stamps(start, hours), values)


def write_routed_series(folder: Path) -> None:
    start = datetime(2027, 3, 31, tzinfo=UTC)
    hours = np.arange(0.0, 21 * 24.0, 1.0 / 6.0)
    level = 0.1 + wave(hours, (1.3, M2_H, 2.0), (0.35, S2_H, 3.1), (0.12, M2_H / 2.0, 0.7))
    write_series(folder / "sea.csv", "time,level_m", start, hours, level)
    discharge = 40.0 + wave(hours, (220.0, M2_H, 4.4), (40.0, S2_H, 5.0))
    write_series(folder / "turbines.csv", "time,discharge_m3_s", start, hours, discharge)


def write_routed_constants(folder: Path) -> None:
    constants = ("M2,1.25,40.0", "S2,0.4,95.0", "N2,0.22,20.0", "K1,0.11,200.0", "O1,0.09,150.0", "M4,0.10,310.0")
    (folder / "constants.csv").write_text(
        "\n".join(["constituent,amplitude_m,phase_deg", *constants]) + "\n", encoding="utf-8"
    )


def write_measured_pair(folder: Path) -> None:
    """Sea in centimetres on local time in two files, basin in metres UTC; holes of 40 minutes and 3 hours."""
    start = datetime(2026, 4, 27, 12, tzinfo=UTC)
    hours = np.arange(0.0, 25 * 24.0, 1.0 / 6.0)
    diurnal = ((0.10, K1_H, 5.0), (0.08, O1_H, 1.0))
    sea = 0.1 + wave(hours, (1.2, M2_H, 2.0), (0.35, S2_H, 3.1), *diurnal, (0.09, M2_H / 2.0, 0.7))
    basin = 0.15 + 0.78 * wave(hours, (1.2, M2_H, 2.6), (0.35, S2_H, 3.7), *diurnal, (0.04, M2_H / 2.0, 1.5))
    local = [f"{start + timedelta(hours=hour + 1.0):%Y-%m-%d %H:%M}" for hour in hours.tolist()]
    centimetres = np.round(100.0 * (sea + 2.0), 1)
    centimetres[1501:1504] = -999.0
    write_table(folder / "gauge_sea_1.csv", "local,level_cm", local[:2000], centimetres[:2000])
    write_table(folder / "gauge_sea_2.csv", "local,level_cm", local[2000:], centimetres[2000:])
    kept = np.ones(hours.size, dtype=bool)
    kept[2401:2418] = False
    write_series(folder / "gauge_basin.csv", "time,level_m", start, hours[kept], np.round(basin[kept], 3))


def write_surveyed_sill(folder: Path) -> None:
    """A gully of 60 m in a channel of 200 m between two shoals; rain on two of six days."""
    points = "0,3 40,-1.5 90,-2 90,-6.5 150,-7.2 200,-5.5 240,-1 300,-0.5 340,3.5"
    (folder / "survey.csv").write_text("distance_m,level_m\n" + points.replace(" ", "\n") + "\n", encoding="utf-8")
    storage = [f"{z},{1.1e7 * z + 1.1e6 * z**2:.9g}" for z in np.arange(-4.0, 3.1, 0.25).tolist()]
    (folder / "storage.csv").write_text("\n".join(["level_m,volume_m3", *storage]) + "\n", encoding="utf-8")
    start = datetime(2027, 4, 1, tzinfo=UTC)
    hours = np.arange(0.0, 8 * 24.0, 1.0 / 6.0)
    level = 0.15 + wave(hours, (1.35, M2_H, 2.0), (0.3, S2_H, 3.1), (0.1, M2_H / 2.0, 0.7))
    write_series(folder / "sea.csv", "time,level_m", start, hours, level)
    rain = np.interp(hours, [0.0, 90.0, 110.0, 140.0, 192.0], [5.0, 5.0, 80.0, 5.0, 5.0])
    write_series(folder / "rain.csv", "time,discharge_m3_s", start, hours, rain)


def write_sine_velocity(folder: Path) -> None:
    start = datetime(2027, 6, 1, tzinfo=UTC)
    hours = np.arange(0.0, 32 * 24.0, 0.5)
    write_series(folder / "sea.csv", "time,level_m", start, hours, np.zeros_like(hours))
    write_series(folder / "basin.csv", "time,level_m", start, hours, np.zeros_like(hours))
    hours = np.arange(0.0, 32 * 24.0, 1.0 / 20.0)
    velocity = 1.5 * np.sin(2.0 * np.pi * hours / 12.42)
    write_series(folder / "velocity.csv", "time,velocity_m_s", start, hours, velocity)


PLANS: dict[str, Callable[[Path], None]] = {
    "routed_series": write_routed_series,
    "routed_constants": write_routed_constants,
    "measured_pair": write_measured_pair,
    "sine_velocity": write_sine_velocity,
    "surveyed_sill": write_surveyed_sill,
}


def read_rows(path: Path) -> Rows:
    with path.open(encoding="utf-8") as lines:
        return list(csv.DictReader(lines))


def run_program(plan: Path) -> dict[str, Rows]:
    """Results of `tidescour run` as text."""
    out = plan.parent / "results"
    command = [sys.executable, "-m", "tidescour.cli.main", "run", "--no-figures", str(plan), "--out", str(out)]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode in DONE, done.stderr
    results = {name: read_rows(out / f"{name}.csv") for name in ("durations", "protection", "cycles", "findings")}
    assert (done.returncode == 4) == any(row["severity"] == "error" for row in results["findings"])
    return results


def start_recomputation(plan: Path) -> subprocess.Popen[str]:
    """The other program, in a process that never sees the package."""
    return subprocess.Popen([sys.executable, str(HERE / "recompute.py"), str(plan)], stdout=subprocess.PIPE, text=True)


def finished(recomputation: subprocess.Popen[str]) -> dict[str, Rows]:
    """Its results."""
    answer, _ = recomputation.communicate()
    assert recomputation.returncode == 0
    return json.loads(answer)


@pytest.fixture(scope="module", params=[name for name in PLANS if name != "sine_velocity"])
def both(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> tuple[dict, dict]:
    """Results of both programs on one plan."""
    folder = tmp_path_factory.mktemp(request.param)
    PLANS[request.param](folder)
    plan = Path(shutil.copy(HERE / f"{request.param}.toml", folder / "plan.toml"))
    with start_recomputation(plan) as recomputation:
        program = run_program(plan)
        return program, finished(recomputation)


def differences(program: Rows, again: Rows, keys: tuple[str, ...], columns: tuple[str, ...]) -> list[str]:
    """What differs by more than the tolerance, row by row; both must have the same rows."""
    found = {tuple(row[key] for key in keys): row for row in program}
    expected = {tuple(str(row[key]) for key in keys): row for row in again}
    assert found.keys() == expected.keys()
    wrong = []
    for row_key, row in expected.items():
        for column in columns:
            text = found[row_key][column]
            value = float(text) if text else math.nan
            if row[column] is None:
                agrees = text == ""
            else:
                agrees = abs(value - row[column]) <= TOLERANCE * abs(row[column]) + 1e-12
            if not agrees:
                wrong.append(f"{row_key} {column}: program {text or 'empty'}, again {row[column]}")
    return wrong


def test_durations_agree_with_the_recomputation(both):
    program, again = both
    keys = ("stage", "opening", "side")
    assert differences(program["durations"], again["durations"], keys, DURATION_COLUMNS) == []


def test_depths_and_lengths_agree_with_the_recomputation(both):
    program, again = both
    keys = ("opening", "side")
    assert differences(program["protection"], again["protection"], keys, PROTECTION_COLUMNS) == []


def test_every_cycle_agrees_with_the_recomputation(both):
    program, again = both
    found = {(row["stage"], row["opening"], int(row["cycle"])): row for row in program["cycles"]}
    expected = {(row["stage"], row["opening"], row["cycle"]): row for row in again["cycles"]}
    assert found.keys() == expected.keys()
    largest = {
        (stage, opening, column): max(row[column] for (s, o, _), row in expected.items() if (s, o) == (stage, opening))
        for stage, opening, _ in expected
        for column in CYCLE_COLUMNS
    }
    for key, row in expected.items():
        apart = datetime.fromisoformat(found[key]["start"]) - datetime.fromisoformat(row["start"])
        assert abs(apart) < timedelta(minutes=1), key
        for column in CYCLE_COLUMNS:
            least = TOLERANCE * largest[(*key[:2], column)]
            assert float(found[key][column]) == pytest.approx(row[column], rel=TOLERANCE, abs=least), (key, column)


def test_only_the_three_hour_hole_is_an_error(both, request):
    program, _ = both
    errors = [row["where"] for row in program["findings"] if row["severity"] == "error"]
    measured = "measured_pair" in request.node.callspec.id
    assert len(errors) == (1 if measured else 0)
    assert all("second" in where for where in errors)


def test_the_recomputation_shares_no_code_with_the_package():
    for name in OURS:
        for node in ast.walk(ast.parse((HERE / name).read_text(encoding="utf-8"))):
            if isinstance(node, ast.Import):
                assert all(not alias.name.startswith("tidescour") for alias in node.names)
            elif isinstance(node, ast.ImportFrom):
                assert not (node.module or "").startswith("tidescour")


def run_sine(folder: Path, change: Callable[[str], str]) -> dict[str, Rows]:
    write_sine_velocity(folder)
    plan = folder / "plan.toml"
    plan.write_text(change((HERE / "sine_velocity.toml").read_text(encoding="utf-8")), encoding="utf-8")
    return run_program(plan)


def sine_effective_hours(mean_strict: float, mean_plain: float, tides: int = 60) -> dict[str, float]:
    """Effective hours of half sines, from the means over the half of E^4.25 and of E^1.7, both over the peak."""
    half_h = 6.21 * tides
    return {
        "integral": half_h * mean_strict,
        "flow_mean": half_h * mean_plain**2.5,
        "cycle_mean": 2.0 * half_h * (mean_plain / 2.0) ** 2.5,
    }


def assert_sine_results(results: dict[str, Rows], hours: dict[str, float], peak_excess_m_s: float) -> None:
    """Breusers' law with a submerged relative density of 1.65, over 10 m (basin) and 12 m (sea)."""
    lengths = {row["side"]: row for row in results["protection"]}
    rows = {row["side"]: row for row in results["durations"]}
    assert rows.keys() == lengths.keys() == {"basin", "sea"}
    for side, depth_m, cot, shortest_m in (("basin", 10.0, 8.0, 24.0), ("sea", 12.0, 2.0, 36.0)):
        row = rows[side]
        assert row["cycles"] == "60"
        assert float(row["reference_velocity_m_s"]) == pytest.approx(1.5, rel=1e-4)
        assert float(row["reference_depth_m"]) == pytest.approx(depth_m, rel=1e-9)
        for rule, expected in hours.items():
            assert float(row[f"effective_duration_{rule}_h"]) == pytest.approx(expected, rel=TOLERANCE)
        row = lengths[side]
        for rule, expected in hours.items():
            depth = peak_excess_m_s**1.7 * depth_m**0.2 * expected**0.4 / (10.0 * 1.65**0.7)
            assert float(row[f"final_depth_{rule}_m"]) == pytest.approx(depth, rel=TOLERANCE)
            if rule == "integral":
                assert float(row["length_required_m"]) == pytest.approx(max(cot * depth, shortest_m), rel=TOLERANCE)


def test_sixty_sine_tides_without_a_threshold_give_the_closed_form(tmp_path):
    """Mean of sin^p over the half: Gamma((p+1)/2) / (sqrt(pi) Gamma(p/2+1))."""

    def mean(p: float) -> float:
        return gamma((p + 1.0) / 2.0) / (math.sqrt(math.pi) * gamma(p / 2.0 + 1.0))

    def without_threshold(text: str) -> str:
        return text.replace("critical_velocity_m_s = 0.75", "critical_velocity_m_s = 1e-9")

    assert_sine_results(run_sine(tmp_path, without_threshold), sine_effective_hours(mean(4.25), mean(1.7)), 3.75)


def test_sixty_sine_tides_over_a_threshold_give_the_integral(tmp_path):
    """u_c / (alpha u_m) = 0.2: the mean of ((sin - 0.2)+ / 0.8)^p over the half, by adaptive quadrature."""

    def mean(p: float) -> float:
        first = math.asin(0.2)
        return quad(lambda angle: ((math.sin(angle) - 0.2) / 0.8) ** p, first, math.pi - first)[0] / math.pi

    assert_sine_results(run_sine(tmp_path, str), sine_effective_hours(mean(4.25), mean(1.7)), 3.0)


def test_a_half_tide_over_a_moving_level_gives_the_infinitesimal_chain(tmp_path):
    """u = 1.5 sin, h0 = 10 + 1.5 sin(w t + 0.6): d(h^2.5)/dt = (E^1.7 h0^0.2 / (10 Delta^0.7))^2.5, solved as such."""

    def rate(hour: float, _: np.ndarray) -> list[float]:
        excess = max(2.5 * 1.5 * math.sin(math.pi * hour / 6.21) - 0.45, 0.0)
        depth_m = 10.0 + 1.5 * math.sin(math.pi * hour / 6.21 + 0.6)
        return [(excess**1.7 * depth_m**0.2 / (10.0 * 1.65**0.7)) ** 2.5]

    solved = solve_ivp(rate, (0.0, 6.21), [0.0], rtol=1e-8, atol=1e-10, max_step=0.02)
    write_sine_velocity(tmp_path)
    hours = np.arange(0.0, 24.0, 1.0 / 6.0)
    level = 1.5 * np.sin(2.0 * np.pi * hours / 12.42 + 0.6)
    write_series(tmp_path / "basin.csv", "time,level_m", datetime(2027, 6, 1, tzinfo=UTC), hours, level)
    text = (HERE / "sine_velocity.toml").read_text(encoding="utf-8")
    for old, new in (("= 0.75", "= 0.45"), ("2027-07-02T01:12:00Z", "2027-06-01T06:12:36Z")):
        assert text.count(old) == 1
        text = text.replace(old, new)
    plan = tmp_path / "plan.toml"
    plan.write_text(text, encoding="utf-8")
    basin = next(row for row in run_program(plan)["protection"] if row["side"] == "basin")
    assert float(basin["final_depth_m"]) == pytest.approx(float(solved.y[0, -1]) ** 0.4, rel=TOLERANCE)


def test_the_recomputation_gives_the_closed_form_too(tmp_path):
    write_sine_velocity(tmp_path)
    plan = Path(shutil.copy(HERE / "sine_velocity.toml", tmp_path))
    with start_recomputation(plan) as recomputation:
        row = finished(recomputation)["durations"][0]
    first = math.asin(0.2)
    strict = quad(lambda angle: ((math.sin(angle) - 0.2) / 0.8) ** 4.25, first, math.pi - first)[0] / math.pi
    assert row["effective_duration_integral_h"] == pytest.approx(372.6 * strict, rel=5e-4)
