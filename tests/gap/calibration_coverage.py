"""How often do the 95 % intervals of a calibration hold the truth? Counted over invented basins.

    python tests/gap/calibration_coverage.py --cases 200 --router tidescour

The truth is routed here by explicit Runge-Kutta steps over all cases at once (10 s). The fit routes with the implicit
trapezoid rule in steps of five minutes, which shares no code with the package either (two minutes), or with the
package's own basin, from the recorded level at the start on (ten minutes).
"""

import argparse
import math
from dataclasses import dataclass, replace

import numpy as np
from numba import njit
from scipy.signal import lfilter

from tidescour.gap.basin_model import Adjustment, basin_model, usable_levels
from tidescour.gap.calibration import estimate
from tidescour.gap.calibration_records import Evidence, Simulated
from tidescour.gap.levels import Waters
from tidescour.gauge.records import MISSING, PASS, GaugeRecord, InputFile
from tidescour.plan.models import Basin, Calibration
from tidescour.units import utc_text

GRAVITY = 9.81
PERIODS_H = np.array([12.4206012, 12.0, 6.2103006])
TEN_MINUTES = 600.0
SPIN_UP_S = 3 * 86400.0
NAMES = ("coefficient", "area_factor", "datum_offset_m")


@dataclass(frozen=True)
class Case:
    """One invented basin, gap, sea and campaign."""

    area_m2: float
    growth_per_m: float
    crest_m: float
    width_m: float
    amplitude_m: np.ndarray
    phase: np.ndarray
    days: float
    truth: np.ndarray
    campaign_start_s: float | None
    part_of_peak: float


def sea_level(case, time_s):
    angles = 2.0 * np.pi * np.asarray(time_s)[..., None] / (PERIODS_H * 3600.0) - case.phase
    return np.sum(case.amplitude_m * np.cos(angles), axis=-1)


def random_case(random, measured):
    amplitude = random.uniform(0.8, 2.0)
    area = 10 ** random.uniform(np.log10(3e6), np.log10(3e7))
    crest = -amplitude * random.uniform(1.6, 6.0)
    # The width follows from a response between strongly damped and nearly open.
    response = random.uniform(0.35, 1.0)
    gap_area = response * 2 * np.pi * amplitude / (12.42 * 3600) * area / math.sqrt(2 * GRAVITY * amplitude)
    days = random.uniform(10.0, 30.0)
    return Case(
        area_m2=area,
        growth_per_m=random.uniform(0.0, 0.15),
        crest_m=crest,
        width_m=gap_area / -crest,
        amplitude_m=amplitude * np.array([1.0, random.uniform(0.15, 0.4), random.uniform(0.02, 0.12)]),
        phase=random.uniform(0.0, 2 * np.pi, 3),
        days=days,
        truth=np.array([random.uniform(0.6, 1.4), random.uniform(0.8, 1.25), random.uniform(-0.1, 0.1)]),
        campaign_start_s=random.uniform(1.0, days - 1.0) * 86400.0 if measured else None,
        part_of_peak=random.uniform(0.05, 0.08),
    )


def noise(random, count):
    """Weather or seiches, AR(1) or AR(2) of 1 to 4 cm, and white sensor noise of 0.5 to 1 cm."""
    step_h = TEN_MINUTES / 3600.0
    time_h = np.exp(random.uniform(np.log(0.5), np.log(8.0)))
    first = math.exp(-step_h / time_h)
    if random.random() < 0.5:
        filter_ = np.array([1.0, -first])
    elif random.random() < 0.5:
        second = math.exp(-step_h / (time_h * random.uniform(0.1, 0.5)))
        filter_ = np.convolve([1.0, -first], [1.0, -second])
    else:  # a seiche that dies out in that time
        period_h = random.uniform(0.7, 4.0)
        filter_ = np.array([1.0, -2.0 * first * math.cos(2.0 * math.pi * step_h / period_h), first**2])
    extra = 3000
    slow = lfilter([1.0], filter_, random.standard_normal(count + extra))
    deviation = np.sqrt(np.sum(lfilter([1.0], filter_, np.eye(1, 20000)[0]) ** 2))
    slow = slow[extra:] / deviation * random.uniform(0.01, 0.04)
    return slow + random.uniform(0.005, 0.01) * random.standard_normal(count)


def truth_levels(cases, step_s=20.0):
    """Route all cases at once by classical Runge-Kutta steps; return level and discharge at ten minutes."""
    column = {key: np.array([getattr(case, key) for case in cases]) for key in ("area_m2", "growth_per_m", "crest_m")}
    width = np.array([case.width_m * case.truth[0] for case in cases])
    area0 = column["area_m2"] * np.array([case.truth[1] for case in cases])
    amplitude = np.array([case.amplitude_m for case in cases])
    phase = np.array([case.phase for case in cases])
    speed = 2.0 * np.pi / (PERIODS_H * 3600.0)

    def sea(time_s):
        return np.sum(amplitude * np.cos(speed * time_s - phase), axis=1)

    def discharge(outside, inside):
        upper = np.maximum(np.maximum(outside, inside) - column["crest_m"], 0.0)
        lower = np.maximum(np.minimum(outside, inside) - column["crest_m"], 0.0)
        depth = np.maximum(lower, upper / 1.5)
        size = width * depth * np.sqrt(2.0 * GRAVITY * np.maximum(upper - depth, 0.0))
        return np.where(outside >= inside, size, -size)

    def rate(outside, inside):
        return discharge(outside, inside) / (area0 * (1.0 + column["growth_per_m"] * inside))

    every = int(TEN_MINUTES / step_s)
    count = int((SPIN_UP_S + max(case.days for case in cases) * 86400.0) / step_s)
    level, levels, flows = sea(-SPIN_UP_S), [], []
    outside = sea(-SPIN_UP_S)
    for index in range(count + 1):
        time_s = -SPIN_UP_S + index * step_s
        if index % every == 0 and time_s >= 0.0:
            levels.append(level)
            flows.append(discharge(outside, level))
        between, after = sea(time_s + 0.5 * step_s), sea(time_s + step_s)
        one = rate(outside, level)
        two = rate(between, level + 0.5 * step_s * one)
        three = rate(between, level + 0.5 * step_s * two)
        four = rate(after, level + step_s * three)
        level = level + step_s / 6.0 * (one + 2.0 * two + 2.0 * three + four)
        outside = after
    return np.array(levels), np.array(flows)


@njit(cache=False)
def _flow(outside, inside, crest, width):
    upper, lower = max(max(outside, inside) - crest, 0.0), max(min(outside, inside) - crest, 0.0)
    depth = max(lower, upper * 2.0 / 3.0)
    size = width * depth * math.sqrt(2.0 * 9.81 * max(upper - depth, 0.0))
    return size if outside >= inside else -size


@njit(cache=False)
def _stored(level, area, growth):
    """Volume under a level, above that at level 0; the area there is area (1 + growth level)."""
    return area * level * (1.0 + 0.5 * growth * level)


@njit(cache=False)
def _trapezoid_levels(sea, step_s, area, growth, crest, width):
    """Implicit trapezoid rule on the volume, each step solved by bisection."""
    levels, flows = np.empty(sea.size), np.empty(sea.size)
    levels[0], flows[0] = sea[0], 0.0
    for i in range(1, sea.size):
        target = _stored(levels[i - 1], area, growth) + 0.5 * step_s * flows[i - 1]
        low, high = levels[i - 1] - 0.25, levels[i - 1] + 0.25
        for _ in range(30):
            middle = 0.5 * (low + high)
            if _stored(middle, area, growth) - 0.5 * step_s * _flow(sea[i], middle, crest, width) > target:
                high = middle
            else:
                low = middle
        levels[i] = 0.5 * (low + high)
        flows[i] = _flow(sea[i], levels[i], crest, width)
    return levels, flows


def trapezoid_router(case, evidence, step_s=300.0):
    """Return the model that is fitted, another scheme than the truth's, and the evidence."""
    grid_s = np.arange(-SPIN_UP_S, evidence.level_time_s[-1] + 2.0 * step_s, step_s)
    sea = sea_level(case, grid_s)

    def simulate(parameters):
        levels, flows = _trapezoid_levels(
            sea, step_s, case.area_m2 * parameters[1], case.growth_per_m, case.crest_m, case.width_m * parameters[0]
        )
        return Simulated(
            level_m=np.interp(evidence.level_time_s, grid_s, levels) - parameters[2],
            discharge_m3_s=np.interp(evidence.discharge_time_s, grid_s, flows),
        )

    return simulate, evidence


def package_router(case, evidence):
    """Return the package's own model, which starts from the record, and the evidence after its settling."""
    file = InputFile(path="invented.csv", sha256="0" * 64)

    def gauge(side, time_s, level_m):
        flag = np.where(np.isfinite(level_m), PASS, MISSING)
        return GaugeRecord(side=side, time_s=time_s, level_m=level_m, flag=flag, step_s=TEN_MINUTES, files=(file,))

    opening = {
        "name": "gap",
        "crest_level_m": case.crest_m,
        "width_m": case.width_m,
        "relation": "broad-crest",
        "parameters": {"coefficient": 1.0},
    }
    start_s = evidence.level_time_s[np.isfinite(evidence.level_m)][0]
    span = {"start": utc_text(start_s), "end": utc_text(evidence.level_time_s[-1])}
    calibration = Calibration.model_validate({**span, "fit": NAMES, "opening": [opening]})
    reach_m = np.array([-4.0, 4.0])
    basin = Basin(level_m=tuple(reach_m), area_m2=tuple(case.area_m2 * (1.0 + case.growth_per_m * reach_m)))
    sea_s = np.arange(-144.0, case.days * 144.0 + 144.0) * TEN_MINUTES
    waters = Waters(
        sea_record=gauge("sea", sea_s, sea_level(case, sea_s)),
        basin_record=gauge("basin", evidence.level_time_s, evidence.level_m),
        series={},
    )
    model = basin_model(calibration, basin, waters)
    kept = usable_levels(model, evidence.level_time_s)
    settled = replace(evidence, level_time_s=evidence.level_time_s[kept], level_m=evidence.level_m[kept])
    adjustment = Adjustment(
        model=model,
        names=NAMES,
        level_time_s=settled.level_time_s,
        discharge_time_s=settled.discharge_time_s,
        discharge_opening=settled.discharge_opening,
    )
    return adjustment, settled


ROUTERS = {"trapezoid": trapezoid_router, "tidescour": package_router}


def evidence_of(random, case, levels, flows):
    """Return what the instruments read: levels each ten minutes with some holes, a campaign of 25 values."""
    count = int(case.days * 86400.0 / TEN_MINUTES)
    time_s = np.arange(count) * TEN_MINUTES
    read = levels[:count] - case.truth[2] + noise(random, count)
    read[random.random(count) < 0.01] = np.nan
    hole = random.integers(0, count - 60)
    read[hole : hole + random.integers(0, 60)] = np.nan
    times = np.empty(0) if case.campaign_start_s is None else case.campaign_start_s + np.arange(25) * 1800.0
    true = np.interp(times, time_s, flows[:count])
    error = np.full(times.shape, case.part_of_peak * np.abs(true).max()) if times.size else np.empty(0)
    return Evidence(
        level_time_s=time_s,
        level_m=read,
        discharge_time_s=times,
        discharge_m3_s=true + error * random.standard_normal(times.size),
        standard_error_m3_s=error,
        discharge_opening=np.zeros(times.size, dtype=np.int64),
    )


def study(cases, seed, router=trapezoid_router):
    """Return rows of (measured, name, low, truth, high, estimate, determined) and the estimates."""
    random = np.random.default_rng(seed)
    drawn = [random_case(random, measured=index % 2 == 0) for index in range(cases)]
    levels, flows = truth_levels(drawn)
    rows, estimates = [], []
    for index, case in enumerate(drawn):
        simulate, evidence = router(case, evidence_of(random, case, levels[:, index], flows[:, index]))
        found = estimate(NAMES, np.array([1.0, 1.0, 0.0]), simulate, evidence)
        estimates.append(found)
        measured = case.campaign_start_s is not None
        for place, name in enumerate(NAMES):
            rows.append(
                (measured, name, found.ci95_low[place], case.truth[place], found.ci95_high[place],
                 found.estimate[place], bool(found.determined[place]))
            )  # fmt: skip
        ratio = found.ratio
        rows.append(
            (measured, "ratio", ratio.ci95_low, case.truth[0] / case.truth[1], ratio.ci95_high, ratio.estimate, True)
        )
    return rows, estimates


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--cases", type=int, default=200)
    parser.add_argument("--seed", type=int, default=20270401)
    parser.add_argument("--router", choices=ROUTERS, default="trapezoid", help="what the fit routes with")
    arguments = parser.parse_args()
    rows, estimates = study(arguments.cases, arguments.seed, ROUTERS[arguments.router])
    print(
        f"{'evidence':26} {'number':16} {'held':>6} {'of':>5} {'held %':>7} {'determined':>11} {'width (median)':>15}"
    )
    for measured in (True, False):
        for name in (*NAMES, "ratio"):
            own = [row for row in rows if row[0] == measured and row[1] == name]
            held = sum(low <= truth <= high for _, _, low, truth, high, _, _ in own)
            width = np.median(
                [(high - low) / (1.0 if "offset" in name else value) for _, _, low, _, high, value, _ in own]
            )
            label = "levels and 13 h campaign" if measured else "levels only"
            useful = sum(row[6] for row in own)
            print(
                f"{label:26} {name:16} {held:6d} {len(own):5d} {100 * held / len(own):7.1f} {useful:11d} {width:15.4f}"
            )
    print("noise orders (quartiles):", np.percentile([found.noise_order for found in estimates], [0, 25, 50, 75, 100]))
    print("tidal excess found:", sum(found.tidal_excess > 1.0 for found in estimates), "of", len(estimates))
    print("codes:", sorted({finding.code for found in estimates for finding in found.findings}))


if __name__ == "__main__":
    main()
