"""The basin's level through its storage: dV/dt = sum of discharges + inflow, one stage at a time.

The step is implicit, of second order and L-stable (two equal implicit parts, Alexander 1977), because the discharge
changes infinitely fast with the level at slack: explicit steps chatter there, and the trapezoid rule passes its error
on from step to step. Each part is one equation in the signed root of the head, s with head = s |s|, in which the
discharge is nearly straight through slack; volume, not level, is carried from step to step.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from tidescour.compiled import compiled
from tidescour.gap.relations import KERNELS, Kernel
from tidescour.gap.storage import Storage, area_at, level_at, stored_volumes, volume_at
from tidescour.units import FloatArray, IntArray, read_only

GAMMA = 1.0 - math.sqrt(0.5)
"""Alexander (1977), Diagonally implicit Runge-Kutta methods for stiff ODEs, SIAM J. Numer. Anal. 14(6): order 2."""

LEVEL_TOLERANCE_M = 1e-10
ROOT_TOLERANCE = 1e-12
MOST_ITERATIONS = 100
BALANCE = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class OpeningSet:
    """The openings of a stage that follow a relation, as the kernels want them.

    Parameters
    ----------
    code : (k,) array of int64
        Place of each relation in the table.
    parameters : (k, p) array
        Each relation's own numbers.
    crest_level_m, width_m : (k, 2) array
        Crest [m above datum] and width at the crest [m] at the start and the end of the stage, linear between.
    side_slope : (k,) array
        Horizontal per vertical, both sides.
    """

    code: IntArray
    parameters: FloatArray
    crest_level_m: FloatArray
    width_m: FloatArray
    side_slope: FloatArray

    def __post_init__(self) -> None:
        """Check shapes; keep read-only copies."""
        for key in ("parameters", "crest_level_m", "width_m", "side_slope"):
            object.__setattr__(self, key, read_only(getattr(self, key)))
        count = self.code.size
        if self.crest_level_m.shape != (count, 2) or self.width_m.shape != (count, 2):
            raise ValueError("crest_level_m and width_m must have a start and an end for each opening")
        if self.side_slope.shape != (count,) or self.parameters.shape[:1] != (count,):
            raise ValueError("side_slope and parameters must have a row for each opening")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Forcing:
    """What drives a basin through n even steps.

    Parameters
    ----------
    step_s : float
        Length of a step [s].
    sea_level_m, given_discharge_m3_s : (n + 1,) array
        At the steps: sea level [m above datum] and the sum of given discharges and inflow [m3/s into the basin].
    sea_level_between_m, given_discharge_between_m3_s : (n,) array
        The same at `GAMMA` of each step.
    """

    step_s: float
    sea_level_m: FloatArray
    sea_level_between_m: FloatArray
    given_discharge_m3_s: FloatArray
    given_discharge_between_m3_s: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RoutedLevels:
    """Basin levels at the steps, and what passed each opening and came as given between first and last [m3]."""

    level_m: FloatArray
    passed_volume_m3: FloatArray
    given_volume_m3: float


@compiled
def _openings_discharge(
    kernels: tuple[Kernel, ...],
    codes: IntArray,
    parameters: FloatArray,
    crest: FloatArray,
    width: FloatArray,
    slope: FloatArray,
    fraction: float,
    sea: float,
    basin: float,
    discharges: FloatArray,
) -> float:
    """Fill the discharge of each opening [m3/s] and return their sum."""
    total = 0.0
    for k in range(codes.size):
        crest_level = crest[k, 0] + fraction * (crest[k, 1] - crest[k, 0])
        wide = width[k, 0] + fraction * (width[k, 1] - width[k, 0])
        discharge, _ = kernels[codes[k]](
            max(sea - crest_level, 0.0), max(basin - crest_level, 0.0), wide, slope[k], parameters[k]
        )
        discharges[k] = discharge
        total += discharge
    return total


@compiled
def _solve_part(
    kernels: tuple[Kernel, ...],
    codes: IntArray,
    parameters: FloatArray,
    crest: FloatArray,
    width: FloatArray,
    slope: FloatArray,
    fraction: float,
    sea: float,
    given: float,
    base: float,
    part_s: float,
    levels: FloatArray,
    areas: FloatArray,
    volumes: FloatArray,
    guess: float,
    discharges: FloatArray,
) -> float:
    """Return the signed root of the head that closes one implicit part; `discharges` are left at that root.

    The excess V(z) - base - part * (Q(z) + given) falls steadily with the root, so there is one zero. Secant steps
    from the guess, fenced by the bracket seen so far and halved where they do not close in.
    """
    tolerance = LEVEL_TOLERANCE_M * area_at(sea - guess * abs(guess), levels, areas)
    low, high = -math.inf, math.inf
    old, old_excess = math.nan, math.nan
    root = guess
    for iteration in range(MOST_ITERATIONS):
        basin = sea - root * abs(root)
        flow = _openings_discharge(kernels, codes, parameters, crest, width, slope, fraction, sea, basin, discharges)
        excess = volume_at(basin, levels, areas, volumes) - base - part_s * (flow + given)
        if abs(excess) <= tolerance:
            return root
        if excess > 0.0:
            low = root
        else:
            high = root
        enclosed = math.isfinite(low) and math.isfinite(high)
        # Near slack the head itself is rounded, so that a small basin's excess cannot become any smaller.
        if enclosed and high - low <= 4e-16 * max(abs(low), abs(high)) + ROOT_TOLERANCE:
            return root
        if iteration == 0:
            conductance = flow / root if abs(root) > 1e-6 else 0.0
            fall = 2.0 * abs(root) * area_at(basin, levels, areas) + part_s * conductance
            new = root + excess / max(fall, 1e-3 * tolerance / LEVEL_TOLERANCE_M)
        else:
            new = root - excess * (root - old) / (excess - old_excess)
        if not low < new < high or (iteration > 8 and iteration % 2 == 0):
            if enclosed:
                new = 0.5 * (low + high)
            else:
                reach = max(2.0 * abs(root - guess), 1e-3)
                new = root + reach if excess > 0.0 else root - reach
        old, old_excess, root = root, excess, new
    return math.nan


@compiled
def _route(
    kernels: tuple[Kernel, ...],
    codes: IntArray,
    parameters: FloatArray,
    crest: FloatArray,
    width: FloatArray,
    slope: FloatArray,
    sea: FloatArray,
    sea_between: FloatArray,
    given: FloatArray,
    given_between: FloatArray,
    step_s: float,
    levels: FloatArray,
    areas: FloatArray,
    volumes: FloatArray,
    start_level: float,
) -> tuple[FloatArray, FloatArray, float]:
    """Return levels at the steps, the volume passed by each opening and the volume given.

    Where a step finds no root the last level is NaN, and those between are not set.
    """
    steps = sea.size - 1
    part_s = GAMMA * step_s
    level = np.empty(steps + 1)
    level[0] = start_level
    passed = np.zeros(codes.size)
    first, second = np.zeros(codes.size), np.zeros(codes.size)
    volume = volume_at(start_level, levels, areas, volumes)
    given_volume = 0.0
    head = sea[0] - start_level
    root = math.copysign(math.sqrt(abs(head)), head)
    for i in range(steps):
        root = _solve_part(
            kernels, codes, parameters, crest, width, slope, (i + GAMMA) / steps, sea_between[i], given_between[i],
            volume, part_s, levels, areas, volumes, root, first,
        )  # fmt: skip
        base = volume + (step_s - part_s) * (first.sum() + given_between[i])
        root = _solve_part(
            kernels, codes, parameters, crest, width, slope, (i + 1.0) / steps, sea[i + 1], given[i + 1],
            base, part_s, levels, areas, volumes, root, second,
        )  # fmt: skip
        if math.isnan(root):
            level[steps] = math.nan
            break
        for k in range(codes.size):
            passed[k] += (step_s - part_s) * first[k] + part_s * second[k]
        given_volume += (step_s - part_s) * given_between[i] + part_s * given[i + 1]
        volume = base + part_s * (second.sum() + given[i + 1])
        level[i + 1] = level_at(volume, levels, areas, volumes)
    return level, passed, given_volume


def basin_levels(openings: OpeningSet, forcing: Forcing, storage: Storage, start_level_m: float) -> RoutedLevels:
    """Route the basin through one stage.

    Parameters
    ----------
    openings : OpeningSet
        The openings that follow a relation.
    forcing : Forcing
        Sea level and given discharges.
    storage : Storage
        Volume by level.
    start_level_m : float
        Basin level at the first step [m above datum].

    Returns
    -------
    RoutedLevels
        Levels at the steps; the volumes passed sum to the change of storage within 1e-9 of the area times one metre.

    Raises
    ------
    ArithmeticError
        If a step finds no level (a relation whose discharge rises with the basin level), or the volume does not
        balance: faults of the program.
    """
    level, passed, given_volume = _route(
        KERNELS,
        openings.code,
        openings.parameters,
        openings.crest_level_m,
        openings.width_m,
        openings.side_slope,
        forcing.sea_level_m,
        forcing.sea_level_between_m,
        forcing.given_discharge_m3_s,
        forcing.given_discharge_between_m3_s,
        forcing.step_s,
        storage.level_m,
        storage.area_m2,
        storage.volume_m3,
        start_level_m,
    )
    if not math.isfinite(level[-1]):
        raise ArithmeticError("a step finds no basin level that balances the flows")
    stored = np.ptp(stored_volumes(storage, level[[0, -1]]) - [0.0, passed.sum() + given_volume])
    if stored > BALANCE * max(float(np.ptp(level)), 1.0) * float(storage.area_m2.max()):
        raise ArithmeticError(f"the basin's volume is out of balance by {stored:.3g} m3")
    return RoutedLevels(
        level_m=read_only(level), passed_volume_m3=read_only(passed), given_volume_m3=float(given_volume)
    )
