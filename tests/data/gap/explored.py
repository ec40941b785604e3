"""What two real pairs of gauges tell about a gap, computed with numpy and scipy alone.

The independent reference for the plans beside it: other code, another integrator (LSODA), plain least squares.
Run `python tests/data/gap/explored.py` (a minute or two); `--more` adds other crests and spells of the inlet.
"""

import csv
import gzip
import sys
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp
from scipy.interpolate import CubicSpline
from scipy.optimize import least_squares

FOLDER = Path(__file__).parent
DAY_S = 86400.0
TWO_G = 2 * 9.81
SPIN_UP_S = 10 * DAY_S
M2_S = 12.4206012 * 3600


def seconds(text: str, utc_offset_h: int = 0) -> float:
    """Seconds since 1970 UTC of an ISO time written with the given offset."""
    local = datetime.fromisoformat(text).replace(tzinfo=UTC)
    return (local - timedelta(hours=utc_offset_h)).timestamp()


def series(name: str, columns: tuple[str, ...], utc_offset_h: int = 0) -> tuple[np.ndarray, ...]:
    """Times and columns of a table; empty cells are NaN."""
    with gzip.open(FOLDER / name, "rt", encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    times = np.array([seconds(next(iter(row.values())), utc_offset_h) for row in rows])
    return times, *(np.array([float(row[column] or "nan") for row in rows]) for column in columns)


def crest_flow(sea_m: float, basin_m: float, crest_m: float) -> float:
    """Flow over one metre of a broad crest with coefficient 1, positive into the basin (methods: m B y sqrt(2g dh))."""
    high, low = max(sea_m, basin_m) - crest_m, min(sea_m, basin_m) - crest_m
    if high <= 0:
        return 0.0
    depth = max(low, 2 / 3 * high)
    return float(np.copysign(depth * (TWO_G * (high - depth)) ** 0.5, sea_m - basin_m))


def flap_flow(sea_m: float, basin_m: float, crest_m: float) -> float:
    """The same where a flap shuts against the flood."""
    return min(crest_flow(sea_m, basin_m, crest_m), 0.0)


class Gap:
    """One pair of gauges, an opening and a basin; levels on the site datum."""

    def __init__(self, *, sea: tuple[np.ndarray, np.ndarray], record: tuple[np.ndarray, np.ndarray], **site: object):
        self.sea = CubicSpline(*sea)
        self.time_s, self.level_m = record
        self.storage_m, self.storage_m2 = site["storage"]
        self.flow: Callable[[float, float, float], float] = site["flow"]
        self.crest_m, self.width_m, self.inflow_m3_s = site["crest_m"], site["width_m"], site["inflow_m3_s"]

    def within(self, start_s: float, end_s: float) -> np.ndarray:
        """Which readings lie in [start, end)."""
        return (self.time_s >= start_s) & (self.time_s < end_s)

    def routed(self, guess: np.ndarray, start_s: float, end_s: float) -> np.ndarray:
        """Basin levels as its gauge would read them at its readings in [start, end)."""
        coefficient, area_factor, offset_m = guess
        strength = coefficient * self.width_m
        minutes = np.arange(start_s - SPIN_UP_S, end_s + 60, 60.0)
        sea = self.sea(minutes)
        fine_m = np.arange(self.storage_m[0] - 2, self.storage_m[-1] + 2, 0.01)
        areas = area_factor * np.interp(fine_m, self.storage_m, self.storage_m2)

        def rise(time_s: float, level: np.ndarray) -> list[float]:
            at = min(max((time_s - minutes[0]) / 60, 0.0), len(sea) - 1.001)
            outside = sea[int(at)] + (at % 1) * (sea[int(at) + 1] - sea[int(at)])
            row = min(max((level[0] - fine_m[0]) / 0.01, 0.0), len(areas) - 1.001)
            area = areas[int(row)] + (row % 1) * (areas[int(row) + 1] - areas[int(row)])
            return [(strength * self.flow(outside, level[0], self.crest_m) + self.inflow_m3_s) / area]

        solved = solve_ivp(
            rise,
            (minutes[0], minutes[-1]),
            [1.0],
            method="LSODA",
            t_eval=self.time_s[self.within(start_s, end_s)],
            rtol=1e-6,
            atol=1e-6,
            max_step=900.0,
        )
        return solved.y[0] - offset_m

    def fitted(
        self, start_s: float, end_s: float, first: tuple[float, float, float], free: tuple[int, ...] = (0, 1, 2)
    ) -> tuple[np.ndarray, float, np.ndarray]:
        """Estimates, their rms misfit, and the correlations of the free ones (as if residuals were independent)."""
        levels = self.level_m[self.within(start_s, end_s)]

        def numbers(free_values: np.ndarray) -> np.ndarray:
            both = np.array([*np.log(first[:2]), first[2]])
            both[list(free)] = free_values
            return np.array([*np.exp(both[:2]), both[2]])

        def misfit(free_values: np.ndarray) -> np.ndarray:
            return self.routed(numbers(free_values), start_s, end_s) - levels

        def slopes(free_values: np.ndarray) -> np.ndarray:
            steps = 0.01 * np.eye(len(free))
            return np.column_stack([(misfit(free_values + h) - misfit(free_values - h)) / 0.02 for h in steps])

        begin = np.array([*np.log(first[:2]), first[2]])[list(free)]
        found = least_squares(misfit, begin, jac=slopes, xtol=1e-4, ftol=1e-6)
        spread = np.linalg.inv(found.jac.T @ found.jac)
        scale = np.sqrt(np.diag(spread))
        return numbers(found.x), rms(found.fun), spread / np.outer(scale, scale)

    def scaled_tide(self, start_s: float, end_s: float) -> tuple[float, float, float]:
        """The do-nothing guess level = a + b sea(t - lag): a, b, lag of least squares, lag to 2 min."""
        time_s, level_m = (values[self.within(start_s, end_s)] for values in (self.time_s, self.level_m))

        def solve(lag_s: float) -> tuple[float, np.ndarray]:
            design = np.column_stack([np.ones(len(time_s)), self.sea(time_s - lag_s)])
            line = np.linalg.lstsq(design, level_m, rcond=None)[0]
            return rms(design @ line - level_m), line

        lag_s = min(np.arange(-3600.0, 4 * 3600, 120), key=lambda lag: solve(lag)[0])
        return (*solve(lag_s)[1], float(lag_s))


def rms(values: np.ndarray) -> float:
    """Root mean square."""
    return float(np.sqrt(np.mean(values**2)))


def semidiurnal(time_s: np.ndarray, level_m: np.ndarray) -> complex:
    """M2 of a short record by least squares beside K1, O1 and M4, as a complex amplitude."""
    speeds = 2 * np.pi / np.array([M2_S, 23.9344697 * 3600, 25.8193417 * 3600, M2_S / 2])
    angles = np.outer(time_s - time_s[0], speeds)
    found = np.linalg.lstsq(np.hstack([angles[:, :1] ** 0, np.cos(angles), np.sin(angles)]), level_m, rcond=None)[0]
    return complex(found[1], -found[5])


def daily_ranges(time_s: np.ndarray, level_m: np.ndarray) -> np.ndarray:
    """Range in each whole lunar day of the record."""
    day = ((time_s - time_s[0]) // (2 * M2_S)).astype(int)
    return np.array([np.ptp(level_m[day == number]) for number in range(day[-1])])


def errors(time_s: np.ndarray, level_m: np.ndarray, predicted_m: np.ndarray) -> str:
    """Errors of a prediction in words: rms, mean, daily range, M2 amplitude and lateness."""
    turn = semidiurnal(time_s, predicted_m) / semidiurnal(time_s, level_m)
    range_m = np.mean(daily_ranges(time_s, predicted_m) - daily_ranges(time_s, level_m))
    late_min = -np.angle(turn) * M2_S / (120 * np.pi)
    return (
        f"rms {rms(predicted_m - level_m):.3f} m, mean {np.mean(predicted_m - level_m):+.3f} m, "
        f"daily range {range_m:+.3f} m, M2 {100 * (abs(turn) - 1):+.1f} % and {late_min:+.1f} min late"
    )


def compare(gap: Gap, start_s: float, end_s: float, first: tuple[float, float, float], hold_back: float = 0.25) -> None:
    """Fit the first part, predict the rest, print both ways."""
    split_s = end_s - hold_back * (end_s - start_s)
    kept, held = gap.within(start_s, split_s), gap.within(split_s, end_s)
    estimate, misfit, alike = gap.fitted(start_s, split_s, first)
    both = gap.routed(estimate, start_s, end_s)
    intercept, slope, lag_s = gap.scaled_tide(start_s, split_s)
    plain = intercept + slope * gap.sea(gap.time_s - lag_s)
    print("  coefficient {:.3f}, area_factor {:.3f}, datum_offset_m {:.3f}".format(*estimate))
    print(f"  coefficient / area_factor {estimate[0] / estimate[1]:.3f}; their correlation {alike[0, 1]:.4f}")
    print(f"  do-nothing guess {intercept:.3f} + {slope:.3f} sea(t - {lag_s / 60:.0f} min)")
    print(f"  fitted part: routed rms {misfit:.3f} m, do-nothing {rms(plain[kept] - gap.level_m[kept]):.3f} m")
    time_s, level_m = gap.time_s[held], gap.level_m[held]
    print(f"  held back, routed:     {errors(time_s, level_m, both[-len(time_s) :])}")
    print(f"  held back, do-nothing: {errors(time_s, level_m, plain[held])}")


def valley(gap: Gap, start_s: float, end_s: float, first: tuple[float, float, float]) -> None:
    """How little the misfit minds a wrong area: coefficient and offset fitted again for given area factors."""
    for factor in (0.7, 1.0, 1.4):
        begin = (first[0] * factor, factor, first[2])
        estimate, misfit, _ = gap.fitted(start_s, end_s, begin, free=(0, 2))
        print(f"  area factor {factor}: coefficient {estimate[0]:.3f}, offset {estimate[2]:+.3f} m, rms {misfit:.4f} m")


def inlet(crest_m: float = -0.2) -> Gap:
    """The breaching inlet of the plan beside this file."""
    time_s, ocean = series("inlet_ocean.csv.gz", ("level_m",))
    record_s, lagoon = series("inlet_lagoon.csv.gz", ("level_m",))
    storage = np.loadtxt(FOLDER / "inlet_hypsometry.csv", delimiter=",", skiprows=1, usecols=(0, 1), unpack=True)
    opening = {"flow": crest_flow, "crest_m": crest_m, "width_m": 20.0, "inflow_m3_s": 3.0}
    return Gap(sea=(time_s, ocean - 0.008), record=(record_s, lagoon + 0.82), storage=storage, **opening)


def gate() -> Gap:
    """The tide gate of the plan beside this file."""
    time_s, outside, inside = series("tide_gate.csv.gz", ("outside_m", "inside_m"), -8)
    storage = (np.array([0.25, 0.75, 1.25, 1.75]), np.array([4500.0, 4500.0, 16000.0, 96000.0]))
    opening = {"flow": flap_flow, "crest_m": 0.23, "width_m": 5.48, "inflow_m3_s": 0.55}
    return Gap(sea=(time_s, outside + 0.15), record=(time_s, inside), storage=storage, **opening)


def regulator() -> None:
    """How the inside level rises in the flood with the regulator open and shut, and the gauges' zeros by week."""
    time_s, outside, inside, angle = series("tide_gate.csv.gz", ("outside_m", "inside_m", "regulator_deg"), -8)
    step_h = np.diff(time_s) / 3600
    rate, sea_rate = np.diff(inside) / step_h, np.diff(outside) / step_h
    rising = (step_h < 1) & (sea_rate > 0.25)
    is_open, is_shut = rising & (angle[1:] > 50), rising & (angle[1:] < 1) & (outside[1:] > inside[1:] + 0.3)
    print(f"  rise inside while the sea rises: regulator open {np.median(rate[is_open]):.2f} m/h", end="")
    print(f" ({is_open.sum()} steps), shut {np.median(rate[is_shut]):.3f} m/h ({is_shut.sum()} steps)")
    level = is_open & (rate > 0.25) & (inside[1:] > 0.45)
    week = ((time_s[1:] - time_s[0]) // (7 * DAY_S)).astype(int)
    zeros = [np.median((inside - outside)[1:][level & (week == number)]) for number in range(week[-1])]
    print("  inside less outside while it lets the flood in, by week [m]: " + " ".join(f"{zero:.2f}" for zero in zeros))


def main() -> None:
    """Print both cases."""
    start_s, end_s = seconds("2012-08-20"), seconds("2012-09-17")
    more = "--more" in sys.argv
    for crest_m in (-0.2, -0.5, 0.1) if more else (-0.2,):
        print(f"Breaching inlet, 20 August to 17 September 2012, crest {crest_m} m")
        compare(inlet(crest_m), start_s, end_s, (0.9, 1.0, 0.0))
    week_s, lagoon = 7 * DAY_S, inlet()
    print("The same fitted part, crest -0.2 m, area factor given:")
    valley(lagoon, start_s, start_s + 3 * week_s, (0.9, 1.0, 0.0))
    print("Coefficient of single weeks, area factor 1:")
    for number in range(5):
        first_s = seconds("2012-08-13") + number * week_s
        estimate, misfit, _ = lagoon.fitted(first_s, first_s + week_s, (0.9, 1.0, 0.0), free=(0, 2))
        print(
            f"  week {number + 1} of 13 August on: {estimate[0]:.2f}, offset {estimate[2]:+.3f} m, rms {misfit:.3f} m"
        )
    print("Tide gate, 19 October to 7 December 2021")
    start_s, end_s = seconds("2021-10-19", -8), seconds("2021-12-07", -8)
    compare(gate(), start_s, end_s, (1.5, 1.0, 0.0))
    valley(gate(), start_s, start_s + 0.75 * (end_s - start_s), (1.5, 1.0, 0.0))
    regulator()
    for days in range(0, 13, 2) if more else ():
        print(f"Breaching inlet, four weeks from {days} days after 10 August 2012")
        first_s = seconds("2012-08-10") + days * DAY_S
        compare(lagoon, first_s, first_s + 4 * week_s, (0.9, 1.0, 0.0))


if __name__ == "__main__":
    main()
