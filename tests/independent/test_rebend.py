"""The program against `rebend.py`: laws that bend, layers, spreading, five ways of counting the tide."""

import csv
import json
import math
import re
import subprocess
import sys
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest

HERE = Path(__file__).parent
PLAN = (HERE / "bending_layers.toml").read_text(encoding="utf-8")
BENDING = r'law = "saturating"\nequilibrium = "half-alpha"\ntime_constant = 240.0\ntime_exponent = 0.42\n'
LAYERS = r"\[\[bed\.layer\]\]\n(?:[^\[\n]+\n)+\n"
TOLERANCE = 0.005
HOURS_TOLERANCE = 0.0125  # hours go with depth^(1 / 0.4)
SAME_CYCLE = timedelta(hours=1)
OF_HOURS = ("effective_duration", "equivalent_start_h", "share_percent")
KEYS = {
    "durations": ("stage", "opening", "side"),
    "comparison": ("stage", "opening", "side", "rule"),
    "protection": ("opening", "side"),
}

Rows = list[dict[str, str]]


def write_levels(folder: Path) -> None:
    hours = np.arange(0.0, 12 * 24.0, 1.0 / 6.0)
    first = datetime(2027, 4, 1, tzinfo=UTC)
    stamps = [f"{first + timedelta(hours=hour):%Y-%m-%dT%H:%M:%SZ}" for hour in hours.tolist()]
    for name, mean_m, size, late_h, quarter_m in (("sea", 0.1, 1.0, 0.0, 0.12), ("basin", 0.15, 0.8, 0.7, 0.0)):
        level_m = mean_m + quarter_m * np.cos(2.0 * np.pi * (hours - 0.7) / 6.21)
        for amplitude_m, period_h, delay_h in ((1.6, 12.42, 2.0), (0.3, 12.0, 3.1)):
            level_m += size * amplitude_m * np.cos(2.0 * np.pi * (hours - delay_h - late_h) / period_h)
        rows = [f"{stamp},{level:.6f}" for stamp, level in zip(stamps, level_m.tolist(), strict=True)]
        (folder / f"{name}.csv").write_text("\n".join(["time,level_m", *rows]) + "\n", encoding="utf-8")


def both_programs(folder: Path, plan: str, again: str) -> tuple[dict[str, Rows], dict[str, list[dict]]]:
    """Results of the program on one plan, and of the other program on another."""
    write_levels(folder)
    (folder / "plan.toml").write_text(plan, encoding="utf-8")
    (folder / "again.toml").write_text(again, encoding="utf-8")
    rebend = [sys.executable, str(HERE / "rebend.py"), str(folder / "again.toml")]
    out = folder / "results"
    run = [
        sys.executable,
        "-m",
        "tidescour.cli.main",
        "run",
        "--no-figures",
        str(folder / "plan.toml"),
        "--out",
        str(out),
    ]
    with subprocess.Popen(rebend, stdout=subprocess.PIPE, text=True) as other:
        done = subprocess.run(run, capture_output=True, text=True, check=False)
        answer, _ = other.communicate()
    assert done.returncode in (0, 4), done.stderr
    assert other.returncode == 0
    results = {}
    for name in (*KEYS, "growth"):
        with (out / f"{name}.csv").open(encoding="utf-8") as lines:
            results[name] = list(csv.DictReader(lines))
    return results, json.loads(answer)


def agrees(column: str, text: str, value: float | str | None) -> bool:
    """Whether a cell is what the other program has."""
    if value is None or text == "":
        return value is None and text == ""
    if column == "length_reached":
        return abs(datetime.fromisoformat(text) - datetime.fromisoformat(str(value))) < SAME_CYCLE
    if isinstance(value, str):
        return text == value
    if math.isnan(value):
        return False
    return float(text) == pytest.approx(value, rel=HOURS_TOLERANCE if column.startswith(OF_HOURS) else TOLERANCE)


def differences(results: dict[str, Rows], again: dict[str, list[dict]], without: tuple[str, ...] = ()) -> list[str]:
    """Every cell in which the two differ."""
    wrong = []
    for table, keys in KEYS.items():
        found = {tuple(row[key] for key in keys): row for row in results[table]}
        expected = {tuple(row[key] for key in keys): row for row in again[table]}
        assert found.keys() == expected.keys()
        wrong += [
            f"{table} {key} {column}: program {found[key][column]}, again {value}"
            for key, row in expected.items()
            for column, value in row.items()
            if column not in without and not agrees(column, found[key][column], value)
        ]
    return wrong


def assert_growth_agrees(results: dict[str, Rows], again: dict[str, list[dict]]) -> None:
    found = {(row["opening"], row["side"], row["time_utc"][:16]): float(row["depth_m"]) for row in results["growth"]}
    for row in again["growth"]:
        moment = datetime.fromisoformat(row["time_utc"])
        near = [
            found.get((row["opening"], row["side"], f"{moment + timedelta(seconds=s):%Y-%m-%dT%H:%M}")) for s in (-1, 1)
        ]
        assert any(depth_m == pytest.approx(row["depth_m"], rel=TOLERANCE, abs=1e-3) for depth_m in near), row


@pytest.fixture(scope="module")
def bending(tmp_path_factory: pytest.TempPathFactory) -> tuple[dict, dict]:
    return both_programs(tmp_path_factory.mktemp("bending"), PLAN, PLAN)


def test_a_bending_law_over_layers_agrees_in_every_table(bending):
    assert differences(*bending) == []


def test_a_bending_law_over_layers_agrees_at_every_cycle(bending):
    assert_growth_agrees(*bending)


def test_the_plan_meets_what_it_is_for(bending):
    """Layers are met in mid-stage, one place is too short, another carries a hole from before."""
    results, again = bending
    layers = {(row["opening"], row["side"]): row["bed_layer"] for row in again["durations"] if row["stage"] == "raised"}
    assert set(layers.values()) == {"coarse sand", "silty sand"}
    assert [row["length_reached"] is not None for row in again["protection"]].count(True) == 1
    assert len(results["comparison"]) == 5 * len(results["durations"])


@pytest.mark.slow
def test_the_other_equilibrium_agrees(tmp_path):
    plan = PLAN.replace('"half-alpha"', '"turbulence"')
    assert differences(*both_programs(tmp_path, plan, plan)) == []


def test_layers_of_the_same_grain_are_no_layers(tmp_path):
    """The explicit law over layers, against the other program without any."""
    plan, laws = re.subn(BENDING, 'law = "explicit"\n', PLAN)
    plan = plan.replace("d50_mm = 0.7", "d50_mm = 0.2").replace("critical_velocity_m_s = 0.45", "d50_mm = 0.2")
    again, layers = re.subn(LAYERS, "", plan)
    assert (laws, layers) == (1, 2)
    results, bare = both_programs(tmp_path, plan, again)
    assert any(row["bed_layer"] != "surface" for row in results["durations"])
    assert differences(results, bare, without=("bed_layer",)) == []
    assert_growth_agrees(results, bare)
