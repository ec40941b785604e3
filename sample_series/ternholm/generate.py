"""Write the invented records of the Ternholm sample: two gauges with their faults, discharges, and a storm.

Run ``python generate.py`` in this folder. Needs numpy and scipy; the seed is fixed, so the files come out the same.
Nothing here was measured: tide, weather, basin, discharges and faults are made up, and the numbers that made them
stand below, so that whoever reads the records with a tool knows what it ought to find.
"""

from __future__ import annotations

import gzip
import math
from collections.abc import Iterable, Iterator
from datetime import UTC, datetime, timedelta, timezone
from itertools import pairwise
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

FloatArray = NDArray[np.float64]

SEED = 20261001
START = datetime(2026, 10, 1, tzinfo=UTC)
END = datetime(2027, 2, 1, tzinfo=UTC)
STEP = timedelta(minutes=10)
GRAVITY_M_S2 = 9.81

# The invented tide: mean amplitude [m] and Greenwich phase lag [degrees] over an 18.6-year nodal cycle.
SEA_MEAN_M = 0.08
SEA_CONSTANTS: dict[str, tuple[float, float]] = {
    "M2": (1.440, 312.0),
    "S2": (0.420, 15.0),
    "N2": (0.250, 288.0),
    "NU2": (0.0485, 288.0),
    "K2": (0.114, 15.0),
    "O1": (0.095, 205.0),
    "K1": (0.080, 355.0),
    "P1": (0.026, 355.0),
    "M4": (0.085, 128.0),
    "MS4": (0.050, 190.0),
    "M6": (0.030, 40.0),
}
# Multiples of the hour angle of the mean sun T, the mean longitudes of moon s, sun h and lunar perigee p, and a
# constant [degrees]: the equilibrium argument of each constituent. Last, which correction for the lunar node it takes.
EQUILIBRIUM: dict[str, tuple[int, int, int, int, float, str]] = {
    "M2": (2, -2, 2, 0, 0.0, "M2"),
    "S2": (2, 0, 0, 0, 0.0, "none"),
    "N2": (2, -3, 2, 1, 0.0, "M2"),
    "NU2": (2, -3, 4, -1, 0.0, "M2"),
    "K2": (2, 0, 2, 0, 0.0, "K2"),
    "O1": (1, -2, 1, 0, 90.0, "O1"),
    "K1": (1, 0, 1, 0, -90.0, "K1"),
    "P1": (1, 0, -1, 0, 90.0, "none"),
    "M4": (4, -4, 4, 0, 0.0, "M2 twice"),
    "MS4": (4, -2, 2, 0, 0.0, "M2"),
    "M6": (6, -6, 6, 0, 0.0, "M2 thrice"),
}
WEATHER_STD_M = 0.12
WEATHER_MEMORY_H = 30.0
SENSOR_STD_M = 0.010

# The basin before the works: storage, and the two openings as (bed [m], width [m], side slope, coefficient).
STORAGE_LEVEL_M = (-3.0, -2.0, -1.0, 0.0, 1.0, 2.0, 3.0)
STORAGE_AREA_M2 = (10.0e6, 12.0e6, 14.5e6, 17.5e6, 19.5e6, 21.0e6, 22.0e6)
ROUTING_STEP_S = 60.0
OPENINGS: tuple[tuple[float, float, float, float], ...] = ((-10.0, 320.0, 2.0, 0.95), (-4.5, 260.0, 0.0, 0.90))
BASIN_GAUGE_ZERO_M = -5.0  # the staff's zero on the site datum
BASIN_CLOCK = timezone(timedelta(hours=1))
MISSING = -999.0

# The faults, in UTC.
SEA_SPIKES: tuple[tuple[datetime, float], ...] = (
    (datetime(2026, 10, 17, 4, 20, tzinfo=UTC), 0.90),
    (datetime(2026, 11, 23, 15, 50, tzinfo=UTC), -1.10),
    (datetime(2027, 1, 8, 9, 10, tzinfo=UTC), 0.75),
)
SEA_GAP = (datetime(2026, 11, 12, 9, 10, tzinfo=UTC), datetime(2026, 11, 12, 11, 10, tzinfo=UTC))
SEA_MISSING = (datetime(2027, 1, 19, 22, 0, tzinfo=UTC), datetime(2027, 1, 20, 12, 0, tzinfo=UTC))
SEA_STUCK = (datetime(2026, 12, 4, 1, 30, tzinfo=UTC), datetime(2026, 12, 4, 7, 30, tzinfo=UTC))
BASIN_STUCK = (datetime(2026, 10, 29, 13, 0, tzinfo=UTC), datetime(2026, 10, 29, 17, 0, tzinfo=UTC))
BASIN_LOW = (datetime(2026, 12, 8, 10, 30, tzinfo=UTC), datetime(2026, 12, 19, 9, 0, tzinfo=UTC))
BASIN_LOW_M = -0.12
BASIN_TWICE = datetime(2026, 11, 2, 6, 40, tzinfo=UTC)

# Discharges measured at springs, from low-water slack to low-water slack, by a boat in each opening of `OPENINGS`:
# name, first crossing, time from crossing to crossing, crossings. Errors are normal and each its own, of a standard
# deviation that has a fixed part [m3/s] and one that grows with the discharge; a seed of theirs leaves the records be.
CAMPAIGN_SEED = 20261126
CAMPAIGN_ERROR_M3_S = 60.0
CAMPAIGN_ERROR_SHARE = 0.05
CAMPAIGN_LINES: tuple[tuple[str, datetime, timedelta, int], ...] = (
    ("main gap", datetime(2026, 11, 26, 5, 30, tzinfo=UTC), timedelta(minutes=30), 27),
    ("shoal", datetime(2026, 11, 26, 5, 0, tzinfo=UTC), timedelta(hours=1), 15),
)

# A storm for the load case of the plan: the tide from the end of its fourth stage on, and a surge on top that rises and
# falls like a bell.
STORM_START = datetime(2027, 7, 25, tzinfo=UTC)
STORM_END = datetime(2027, 7, 26, 12, 0, tzinfo=UTC)
SURGE_PEAK = datetime(2027, 7, 25, 20, 0, tzinfo=UTC)
SURGE_HEIGHT_M = 1.30
SURGE_LENGTH = timedelta(hours=6)  # standard deviation of the bell


def times() -> list[datetime]:
    """Stamps of both gauges, every 10 minutes, the last day's midnight left out."""
    return [START + k * STEP for k in range(int((END - START) / STEP))]


def seconds(moments: list[datetime]) -> FloatArray:
    """Seconds since 1970."""
    return np.array([moment.timestamp() for moment in moments])


def mean_longitudes(time_s: FloatArray) -> tuple[FloatArray, ...]:
    """Hour angle of the mean sun, mean longitudes of moon, sun, lunar perigee and lunar node [degrees].

    Linear terms of Meeus, Astronomical Algorithms (1998), chapters 25 and 47, from memory.
    """
    day = time_s / 86400.0 - 10957.5  # from 2000-01-01T12:00Z
    century = day / 36525.0
    moon = 218.3164 + 481267.8812 * century
    sun = 280.4665 + 36000.7698 * century
    perigee = 83.3532 + 4069.0137 * century
    node = 125.0445 - 1934.1363 * century
    hour_angle = 360.0 * (day % 1.0)
    return hour_angle, moon, sun, perigee, node


def nodal_correction(kind: str, node_deg: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Factor and angle [degrees] of the 18.6-year cycle, leading terms (Schureman 1958, from memory)."""
    cosine, sine = np.cos(np.radians(node_deg)), np.sin(np.radians(node_deg))
    m2_factor, m2_angle = 1.0 - 0.037 * cosine, -2.1 * sine
    table = {
        "none": (np.ones_like(cosine), np.zeros_like(cosine)),
        "M2": (m2_factor, m2_angle),
        "M2 twice": (m2_factor**2, 2.0 * m2_angle),
        "M2 thrice": (m2_factor**3, 3.0 * m2_angle),
        "K2": (1.024 + 0.286 * cosine, -17.7 * sine),
        "O1": (1.009 + 0.187 * cosine, 10.8 * sine),
        "K1": (1.006 + 0.115 * cosine, -8.9 * sine),
    }
    return table[kind]


def tide(time_s: FloatArray) -> FloatArray:
    """Invented astronomical level at sea [m above site datum]."""
    hour_angle, moon, sun, perigee, node = mean_longitudes(time_s)
    level = np.full(time_s.shape, SEA_MEAN_M)
    for name, (amplitude, phase) in SEA_CONSTANTS.items():
        per_day, of_moon, of_sun, of_perigee, constant, kind = EQUILIBRIUM[name]
        factor, angle = nodal_correction(kind, node)
        argument = per_day * hour_angle + of_moon * moon + of_sun * sun + of_perigee * perigee + constant
        level = level + factor * amplitude * np.cos(np.radians(argument + angle - phase))
    return level


def weather(count: int, random: np.random.Generator) -> FloatArray:
    """Red noise that remembers some thirty hours [m]: a first-order process, smoothed so that it has no jumps."""
    keep = np.exp(-STEP.total_seconds() / 3600.0 / WEATHER_MEMORY_H)
    raw = np.empty(count)
    raw[0] = random.normal()
    for k, kick in enumerate(random.normal(size=count - 1), start=1):
        raw[k] = keep * raw[k - 1] + np.sqrt(1.0 - keep**2) * kick
    smooth = np.convolve(np.pad(raw, 18, mode="edge"), np.full(37, 1.0 / 37.0), mode="valid")
    return WEATHER_STD_M * (smooth - smooth.mean()) / smooth.std()


def crest_flow(opening: tuple[float, float, float, float], sea_m: float, basin_m: float) -> float:
    """Discharge through one opening from sea to basin [m3/s]: the energy law of a broad crest.

    The crest is the bed, so deep under water at every tide that control depth and lower depth are one; the short form
    max(lower, 2/3 upper) stands for the drowned and the free side of a section with steep banks.
    """
    bed_m, width_m, side_slope, coefficient = opening
    upper, lower = max(sea_m, basin_m) - bed_m, min(sea_m, basin_m) - bed_m
    if upper <= 0.0:
        return 0.0
    depth = max(lower, 2.0 / 3.0 * upper)
    area = depth * (width_m + side_slope * depth)
    return math.copysign(coefficient * area * math.sqrt(2.0 * GRAVITY_M_S2 * (upper - depth)), sea_m - basin_m)


def inflow(sea_m: float, basin_m: float) -> float:
    """Discharge through both openings from sea to basin [m3/s]."""
    return sum(crest_flow(opening, sea_m, basin_m) for opening in OPENINGS)


def stored(level_m: float) -> float:
    """Volume between the lowest level of the storage table and `level_m` [m3], the area linear between its rows."""
    rows = list(zip(STORAGE_LEVEL_M, STORAGE_AREA_M2, strict=True))
    volume = 0.0
    for (low_m, low_m2), (high_m, high_m2) in pairwise(rows):
        rise = min(level_m, high_m) - low_m
        if rise <= 0.0:
            break
        volume += rise * (low_m2 + 0.5 * rise * (high_m2 - low_m2) / (high_m - low_m))
    return volume


def basin_levels(sea_m: FloatArray, step_s: float) -> FloatArray:
    """Level of the basin [m] for sea levels every `step_s`: the trapezoid rule on the stored volume."""
    levels = np.empty(sea_m.size)
    levels[0] = sea_m[0]
    for k in range(1, sea_m.size):
        known = stored(levels[k - 1]) + 0.5 * step_s * inflow(sea_m[k - 1], levels[k - 1])

        def missing(level_m: float, known_m3: float = known, sea_level_m: float = float(sea_m[k])) -> float:
            return stored(level_m) - known_m3 - 0.5 * step_s * inflow(sea_level_m, level_m)

        levels[k] = brentq(missing, levels[k - 1] - 0.2, levels[k - 1] + 0.2, xtol=1e-7)
    return levels


def inside(moments: list[datetime], span: tuple[datetime, datetime]) -> NDArray[np.bool_]:
    """Which stamps lie in a half-open span."""
    return np.array([span[0] <= moment < span[1] for moment in moments])


def stick(level_m: FloatArray, where: NDArray[np.bool_]) -> FloatArray:
    """Repeat the first level of a stretch through it."""
    return np.where(where, level_m[np.flatnonzero(where)[0]], level_m)


def sea_rows(moments: list[datetime], level_m: FloatArray) -> Iterator[tuple[str, str]]:
    """Rows of the sea gauge with its faults, each with the month it belongs to."""
    faulty = stick(level_m, inside(moments, SEA_STUCK))
    for moment, height_m in SEA_SPIKES:
        faulty[moments.index(moment)] += height_m
    faulty[inside(moments, SEA_MISSING)] = MISSING
    for moment, level, lost in zip(moments, faulty, inside(moments, SEA_GAP), strict=True):
        if not lost:
            yield moment.strftime("%Y-%m"), f"{moment:%Y-%m-%dT%H:%M:%S},{level:.3f}"


def basin_rows(moments: list[datetime], level_m: FloatArray) -> Iterator[str]:
    """Rows of the basin gauge as its logger writes them, with its faults."""
    faulty = stick(level_m, inside(moments, BASIN_STUCK))
    faulty = faulty + np.where(inside(moments, BASIN_LOW), BASIN_LOW_M, 0.0)
    for moment, level in zip(moments, faulty, strict=True):
        stamp = f"{moment.astimezone(BASIN_CLOCK):%d.%m.%Y;%H:%M}"
        reading = f"{100.0 * (level - BASIN_GAUGE_ZERO_M):.1f}".replace(".", ",")
        yield f"{stamp};{reading}"
        if moment == BASIN_TWICE:
            yield f"{stamp};{reading}"


def campaign_rows(time_s: FloatArray, sea_m: FloatArray, basin_m: FloatArray) -> list[str]:
    """Rows of the measured discharges in order of time, from true levels at `time_s`."""
    random = np.random.default_rng(CAMPAIGN_SEED)
    rows = []
    for opening, (name, first, step, crossings) in zip(OPENINGS, CAMPAIGN_LINES, strict=True):
        for moment in (first + k * step for k in range(crossings)):
            sea, basin = (float(np.interp(moment.timestamp(), time_s, level_m)) for level_m in (sea_m, basin_m))
            flow = crest_flow(opening, sea, basin)
            error = round(CAMPAIGN_ERROR_M3_S + CAMPAIGN_ERROR_SHARE * abs(flow), -1)
            measured = flow + error * random.normal()
            rows.append(f"{moment:%Y-%m-%dT%H:%M:%SZ},{name},{measured:.0f},{error:.0f}")
    return sorted(rows)


def storm_rows() -> Iterator[str]:
    """Rows of the storm: time and level at sea."""
    count = int((STORM_END - STORM_START) / STEP) + 1
    moments = [STORM_START + k * STEP for k in range(count)]
    time_s = seconds(moments)
    off = (time_s - SURGE_PEAK.timestamp()) / SURGE_LENGTH.total_seconds()
    level = tide(time_s) + SURGE_HEIGHT_M * np.exp(-0.5 * off**2)
    for moment, value in zip(moments, level, strict=True):
        yield f"{moment:%Y-%m-%dT%H:%M:%SZ},{value:.3f}"


def write_records(folder: Path) -> None:
    """Write the monthly files of the sea gauge, the one file of the basin gauge, the discharges and the storm."""
    random = np.random.default_rng(SEED)
    moments = times()
    time_s = seconds(moments)
    surge_m = weather(time_s.size, random)
    fine_s = np.arange(time_s[0], time_s[-1] + 1.0, ROUTING_STEP_S)
    sea_m = tide(time_s) + surge_m
    fine_sea_m = tide(fine_s) + np.interp(fine_s, time_s, surge_m)
    fine_basin_m = basin_levels(fine_sea_m, ROUTING_STEP_S)
    basin_m = fine_basin_m[:: round(STEP.total_seconds() / ROUTING_STEP_S)]
    noise_m = random.normal(scale=SENSOR_STD_M, size=(2, time_s.size))

    months: dict[str, list[str]] = {}
    for month, row in sea_rows(moments, sea_m + noise_m[0]):
        months.setdefault(month, []).append(row)
    for month, rows in months.items():
        (folder / f"ternholm_sea_{month}.csv").write_bytes(_text("time,level_m", rows, "\n"))
    basin = _text("date;time;level_cm", basin_rows(moments, basin_m + noise_m[1]), "\r\n")
    with (folder / "ternholm_basin.csv.gz").open("wb") as raw, gzip.GzipFile("", "wb", fileobj=raw, mtime=0) as packed:
        packed.write(basin)
    header = "time,opening,discharge_m3_s,standard_error_m3_s"
    measured = campaign_rows(fine_s, fine_sea_m, fine_basin_m)
    (folder / "ternholm_campaign.csv").write_bytes(_text(header, measured, "\n"))
    (folder / "ternholm_storm.csv").write_bytes(_text("time,level_m", storm_rows(), "\n"))


def _text(header: str, rows: Iterable[str], line_end: str) -> bytes:
    return (line_end.join((header, *rows)) + line_end).encode("ascii")


if __name__ == "__main__":
    write_records(Path(__file__).parent)
