"""What routing costs: against a plain integration, in days, in variants and in the whole command.

Run `python tests/bench/routing.py`; it prints ratios, all measured in this one run. The plain way is scipy's LSODA on a
right-hand side in plain Python, the sea by numpy.interp on ten-minute levels, rtol and atol 1e-6, no longest step; the
openings and the basin are those of the invented sample (sample_series/ternholm), five stages of 33 days.
"""

import math
import re
import shutil
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp

from tidescour.gap.forcing import even_steps, with_points_between
from tidescour.gap.openings import OpeningSet, opening_set
from tidescour.gap.routing import Forcing, basin_levels
from tidescour.gap.storage import Storage, basin_storage
from tidescour.pipeline import plan_choices
from tidescour.plan.loader import read_plan
from tidescour.plan.models import Plan, Stage

SAMPLE = Path(__file__).parents[2] / "sample_series" / "ternholm"
STAGE_DAYS, SHORT_DAYS = 33.0, 0.2
COMMANDS = 5
DAY_S = 86400.0
GRAVITY = 9.81
# A sea of invented size for the routing alone; the whole command fits its own from the sample's records.
WAVES = ((1.5, 44712.0, 0.0), (0.45, 43200.0, 0.6), (0.1, 22356.0, 1.0), (0.1, 86164.0, 2.0))


def sea_level(time_s: np.ndarray) -> np.ndarray:
    return sum(height * np.sin(2.0 * np.pi * time_s / period + phase) for height, period, phase in WAVES)


def best_of(times: int, work: Callable[[], object]) -> float:
    """Return the least wall time [s] of several runs: the clock of a shared machine only adds."""
    found = []
    for _ in range(times):
        begun = time.perf_counter()
        work()
        found.append(time.perf_counter() - begun)
    return min(found)


def forcing(days: float, step_s: float = 60.0) -> Forcing:
    instants = with_points_between(even_steps(0.0, days * DAY_S, step_s))
    sea, none = sea_level(instants)[:, None], np.zeros(instants.size)
    return Forcing(
        step_s=step_s,
        sea_level_m=np.ascontiguousarray(sea[0::2]),
        sea_level_between_m=np.ascontiguousarray(sea[1::2]),
        given_discharge_m3_s=none[0::2].copy(),
        given_discharge_between_m3_s=none[1::2].copy(),
    )


def plain_levels(stage: Stage, plan: Plan, days: float, at_s: np.ndarray | None = None) -> np.ndarray:
    """Route one stage the plain way, from mean sea level."""
    nodes = np.arange(0.0, days * DAY_S + 1201.0, 600.0)
    sea = sea_level(nodes)
    levels, areas = np.array(plan.basin.level_m), np.array(plan.basin.area_m2)
    openings = [
        (
            (o.crest_level_m, o.crest_level_m if o.crest_level_end_m is None else o.crest_level_end_m),
            (o.width_m, o.width_m if o.width_end_m is None else o.width_end_m),
            o.side_slope,
            o.parameters["coefficient"],
        )
        for o in stage.opening
    ]

    def rise(t: float, level: np.ndarray) -> list[float]:
        outside, inside = np.interp(t, nodes, sea), level[0]
        total, share = 0.0, t / (days * DAY_S)
        for crests, widths, slope, coefficient in openings:
            crest, width = crests[0] + share * (crests[1] - crests[0]), widths[0] + share * (widths[1] - widths[0])
            up, down = max(outside, inside) - crest, min(outside, inside) - crest
            if up <= 0.0:
                continue
            linear = 3.0 * width - 4.0 * slope * up
            critical = 4.0 * width * up / (linear + (linear * linear + 40.0 * slope * width * up) ** 0.5)
            depth = max(down, critical)
            discharge = coefficient * depth * (width + slope * depth) * (2.0 * GRAVITY * (up - depth)) ** 0.5
            total += discharge if outside >= inside else -discharge
        return [total / np.interp(inside, levels, areas)]

    found = solve_ivp(rise, (0.0, days * DAY_S), [0.0], method="LSODA", rtol=1e-6, atol=1e-6, t_eval=at_s)
    return found.y[0]


def routing_alone(plan: Plan) -> float:
    """Print how routing the five stages compares with the plain way; return the seconds of that."""
    storage, drive = basin_storage(plan.basin), forcing(STAGE_DAYS)
    sets = [opening_set(stage.opening) for stage in plan.stage]

    def routed() -> list[np.ndarray]:
        return [basin_levels(openings, drive, storage, 0.0).level_m for openings in sets]

    routed()
    ours = best_of(7, routed)
    plain = best_of(2, lambda: [plain_levels(stage, plan, STAGE_DAYS) for stage in plan.stage])
    print(
        f"routing alone, 5 stages of {STAGE_DAYS:g} days: plain {plain:.2f} s, here {ours:.4f} s: {plain / ours:.0f} x"
    )
    hours = np.arange(0.0, STAGE_DAYS * DAY_S + 1.0, 3600.0)
    worst, worst_plain = 0.0, 0.0
    for stage, openings, level in zip(plan.stage, sets, routed(), strict=True):
        converged = basin_levels(openings, forcing(STAGE_DAYS, 5.0), storage, 0.0).level_m
        worst = max(worst, float(np.abs(level - converged[::12]).max()))
        apart = plain_levels(stage, plan, STAGE_DAYS, hours) - converged[::720]
        worst_plain = max(worst_plain, float(np.abs(apart).max()))
    print(f"  level against steps of 5 s: within {1e3 * worst:.3f} mm; the plain way within {1e3 * worst_plain:.2f} mm")
    return plain


def growth_with_days(openings: OpeningSet, storage: Storage) -> None:
    """Print the time for each day at one, two, four and eight times the span."""
    for days in (33.0, 66.0, 132.0, 264.0):
        drive = forcing(days)
        seconds = best_of(7, lambda drive=drive: basin_levels(openings, drive, storage, 0.0))
        print(f"  {days:5.0f} days: {1e6 * seconds / days:7.1f} us a day")


def growth_with_variants(plan: Plan, storage: Storage) -> None:
    """Print the time for each variant of the first stage at 1 to 300 of them, and with two threads."""
    drive = forcing(STAGE_DAYS)
    widths = np.linspace(1.0, 0.2, 300)
    variants = [
        opening_set([o.model_copy(update={"width_m": o.width_m * share}) for o in plan.stage[0].opening])
        for share in widths
    ]

    def route(openings: OpeningSet) -> float:
        return float(basin_levels(openings, drive, storage, 0.0).level_m[-1])

    for count in (1, 10, 100, 300):
        chosen = variants[:: len(variants) // count][:count]
        seconds = best_of(3, lambda chosen=chosen: [route(openings) for openings in chosen])
        print(f"  {count:4d} variants: {1e3 * seconds / count:6.2f} ms each")
    with ThreadPoolExecutor(2) as threads:
        two = best_of(3, lambda: list(threads.map(route, variants)))
    one = best_of(3, lambda: [route(openings) for openings in variants])
    print(f"  300 variants on two threads: {one / two:.2f} x one")


def array_rise(sea: float, level: np.ndarray, crests: np.ndarray, widths: np.ndarray, slopes: np.ndarray) -> np.ndarray:
    """Return the discharge [m3/s, coefficient 1] of (k, n) openings and variants, summed over the openings."""
    up, down = np.maximum(sea, level) - crests, np.minimum(sea, level) - crests
    up = np.maximum(up, 0.0)
    linear = 3.0 * widths - 4.0 * slopes * up
    critical = 4.0 * widths * up / (linear + np.sqrt(linear * linear + 40.0 * slopes * widths * up))
    depth = np.maximum(down, critical)
    total = depth * (widths + slopes * depth) * np.sqrt(2.0 * GRAVITY * np.maximum(up - depth, 0.0))
    return np.where(sea >= level, 1.0, -1.0) * total.sum(axis=0)


def arrays_over_variants(plan: Plan, compiled_s: float) -> None:
    """Print what the same implicit step costs as numpy arrays over variants; `compiled_s` is that of one step here.

    Four secant steps a part, which is what slack takes, on a basin of constant area: less work than the real one.
    """
    openings = plan.stage[0].opening
    area, steps, gamma = float(np.mean(plan.basin.area_m2)), 300, 1.0 - math.sqrt(0.5)
    crests = np.array([[o.crest_level_m] for o in openings])
    slopes = np.array([[o.side_slope] for o in openings])
    for count in (1, 100, 3000):
        widths = np.array([[o.width_m] for o in openings]) * np.linspace(1.0, 0.2, count)

        def route(count: int = count, widths: np.ndarray = widths) -> np.ndarray:
            level = np.zeros(count)
            for step in range(steps):
                base = level
                for at, rest in ((gamma, 0.0), (1.0, 1.0 - gamma)):
                    sea = float(sea_level(np.array((step + at) * 60.0)))
                    root = np.sign(sea - level) * np.sqrt(np.abs(sea - level)) + 1e-6
                    old, old_excess = root + 1e-4, None
                    for _ in range(4):
                        inside = sea - root * np.abs(root)
                        flow = array_rise(sea, inside, crests, widths, slopes)
                        excess = inside - base - gamma * 60.0 / area * flow
                        if old_excess is None:
                            new = root + 1e-6
                        else:
                            fall = np.where(excess == old_excess, 1.0, excess - old_excess)
                            new = root - excess * (root - old) / fall
                        old, old_excess, root = root, excess, new
                    level = sea - root * np.abs(root)
                    base = base + (1.0 - gamma) * 60.0 / area * flow if rest == 0.0 else base
            return level

        each = best_of(3, route) / steps / count
        print(f"  {count:4d} as arrays: {1e6 * each:8.3f} us a variant and step, {each / compiled_s:.1f} x compiled")


def whole_command(plain_s: float) -> None:
    """Print what 164 more days cost in `tidescour run`, output included, against the plain routing of them."""
    text = (SAMPLE / "plan.toml").read_text(encoding="utf-8")
    head, *stages = text.split("[[stage]]\n")
    with tempfile.TemporaryDirectory() as folder:
        for file in SAMPLE.iterdir():
            if file.is_file() and file.name != "plan.toml":
                shutil.copy(file, folder)
        seconds: dict[str, float] = {}
        for name, days in (("long", STAGE_DAYS), ("short", SHORT_DAYS)):
            begun, plan = datetime(2027, 4, 1, tzinfo=UTC), head
            for stage in stages:
                ended = begun + timedelta(days=days)
                stage = re.sub(r"(?m)^start = \S+", f"start = {begun.isoformat()}", stage, count=1)
                plan += "[[stage]]\n" + re.sub(r"(?m)^end = \S+", f"end = {ended.isoformat()}", stage, count=1)
                begun = ended
            (Path(folder) / f"{name}.toml").write_text(plan, encoding="utf-8")
        for _ in range(COMMANDS):
            for name in ("long", "short"):
                command = [sys.executable, "-m", "tidescour.cli.main", "run", f"{name}.toml", "--quiet"]
                begun_s = time.perf_counter()
                subprocess.run(command, cwd=folder, check=True, capture_output=True)
                seconds[name] = min(seconds.get(name, math.inf), time.perf_counter() - begun_s)
    more = seconds["long"] - seconds["short"]
    print(f"whole command: {seconds['long']:.2f} s for 165 days, {seconds['short']:.2f} s for 1 day")
    print(f"  164 more days: {more:.2f} s, {more / plain_s:.2f} of the plain routing alone")


def main() -> None:
    plan = read_plan(SAMPLE / "plan.toml", plan_choices())
    plain_s = routing_alone(plan)
    storage = basin_storage(plan.basin)
    print("routing by length of the span:")
    growth_with_days(opening_set(plan.stage[0].opening), storage)
    print("routing by number of variants:")
    growth_with_variants(plan, storage)
    drive, first = forcing(STAGE_DAYS), opening_set(plan.stage[0].opening)
    compiled_s = best_of(7, lambda: basin_levels(first, drive, storage, 0.0)) / (drive.sea_level_m.shape[0] - 1)
    arrays_over_variants(plan, compiled_s)
    whole_command(plain_s)


if __name__ == "__main__":
    main()
