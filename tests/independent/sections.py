"""Flow through surveyed gaps and under gates, for the recomputation beside this file."""

import csv
import math
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from formulas import Array, G

GRID = np.linspace(0.0, 1.0, 65)


@dataclass(frozen=True)
class Survey:
    """The wet area of a surveyed gap by level, on levels 2 mm apart; walls stand at both ends."""

    level_m: Array
    area_m2: Array

    def area(self, level_m: Array | float, crest_m: float) -> Array:
        """Area between the fill and the water."""
        return np.interp(level_m, self.level_m, self.area_m2) - np.interp(crest_m, self.level_m, self.area_m2)

    def control_level(self, energy_m: float, low_m: float, crest_m: float) -> float:
        """The level from `low_m` up that lets most pass: the best of a grid, of a finer one round it, of a parabola."""
        first, last = low_m, energy_m
        for _ in range(2):
            tried = first + GRID * (last - first)
            passes = self.area(tried, crest_m) ** 2 * (energy_m - tried)
            best = int(passes.argmax())
            step = tried[1] - tried[0]
            first, last = tried[max(best - 1, 0)], tried[min(best + 1, GRID.size - 1)]
        if not 0 < best < GRID.size - 1:
            return float(tried[best])
        below, here, above = passes[best - 1 : best + 2]
        bend = below - 2.0 * here + above
        return float(tried[best] + (0.5 * step * (below - above) / bend if bend < 0.0 else 0.0))


def read_survey(path: Path) -> Survey:
    """Clip each straight piece of the profile at the water."""
    with path.open(encoding="utf-8") as lines:
        rows = [(float(row["distance_m"]), float(row["level_m"])) for row in csv.DictReader(lines)]
    distance, ground = np.array(rows).T
    low, high = np.minimum(ground[1:], ground[:-1]), np.maximum(ground[1:], ground[:-1])
    reach = np.diff(distance)
    level = np.arange(ground.min(), ground.max() + 8.0, 0.002)
    deep, shallow = (np.maximum(level[:, None] - end, 0.0) for end in (low, high))
    # A piece that rises from low to high is wet over (deep - shallow) / (high - low) of its reach.
    rise = np.where(high > low, high - low, 1.0)
    share = np.where(high > low, (deep - shallow) / rise, deep > 0.0)
    return Survey(level, (0.5 * (deep + shallow) * share * reach).sum(axis=1))


def survey_flow(
    sea_m: float, basin_m: float, crest_m: float, coefficient: float, survey: Survey, approach: dict[str, float]
) -> tuple[float, float, float]:
    """Discharge, wet area and mean width; the energy is the level and the velocity head of the approach."""
    up_m, down_m = max(sea_m, basin_m), max(min(sea_m, basin_m), crest_m)
    if up_m <= crest_m:
        return 0.0, 0.0, math.nan
    side = "sea" if sea_m > basin_m else "basin"
    approach_m2 = approach[f"approach_width_{side}_m"] * (up_m - approach[f"approach_bed_{side}_m"])
    energy_m = up_m
    for _ in range(100):
        level_m = survey.control_level(energy_m, down_m, crest_m)
        area = float(survey.area(level_m, crest_m))
        discharge = coefficient * area * math.sqrt(2.0 * G * max(energy_m - level_m, 0.0))
        before, energy_m = energy_m, up_m + (discharge / approach_m2) ** 2 / (2.0 * G)
        if abs(energy_m - before) < 1e-8:
            break
    width_m = area / (level_m - crest_m) if level_m > crest_m else math.nan
    return math.copysign(discharge, sea_m - basin_m), area, width_m


def gate_flow(sea_m: float, basin_m: float, gate: dict[str, float]) -> float:
    """Discharge under a gate in an upright opening: critical, a free jet of the contracted height, or drowned."""
    up_m, down_m = max(sea_m, basin_m) - gate["crest_level_m"], min(sea_m, basin_m) - gate["crest_level_m"]
    if up_m <= 0.0:
        return 0.0
    jet_m = gate["contraction"] * gate["height_m"]
    outlet_m = max(down_m, min(up_m / 1.5, jet_m))
    discharge = gate["coefficient"] * gate["width_m"] * min(outlet_m, jet_m) * math.sqrt(2.0 * G * (up_m - outlet_m))
    return math.copysign(discharge, sea_m - basin_m)
