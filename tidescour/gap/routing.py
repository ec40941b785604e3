"""The basin's level through its storage: dV/dt = sum of discharges + inflow, one stage at a time.

The step is implicit, of second order and L-stable (two equal implicit parts, Alexander 1977), because the discharge
changes infinitely fast with the level at slack: explicit steps chatter there, and the trapezoid rule passes its error
on from step to step. Each part is one equation in the signed root of the head, s with head = s |s|, in which the
discharge is nearly straight through slack; volume, not level, is carried from step to step.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from tidescour.compiled import compiled
from tidescour.errors import DomainError
from tidescour.gap.layers import content_at, extent_at, level_of
from tidescour.gap.openings import OpeningSet, place_openings
from tidescour.gap.relation_parts import Kernel
from tidescour.gap.relations import KERNELS, NO_VALUE_REMEDY, RELATIONS
from tidescour.gap.storage import Storage, largest_area, stored_volumes
from tidescour.units import SECONDS_PER_HOUR, FloatArray, read_only

GAMMA = 1.0 - math.sqrt(0.5)
"""Alexander (1977), Diagonally implicit Runge-Kutta methods for stiff ODEs, SIAM J. Numer. Anal. 14(6): order 2."""

LEVEL_TOLERANCE_M = 1e-8
ROOT_TOLERANCE = 1e-12
MOST_ITERATIONS = 100
BALANCE = 1e-9
ROUNDING = 1e-12
"""What summing many steps may leave of all that ran through a basin far smaller than that."""
OVERSTEP_M = 1e-4
"""More than the error of a step that follows the sea closely, less than can be seen in a level."""


class Forcing(NamedTuple):
    """What drives a basin through n even steps; a tuple of arrays, for that is what compiled code takes.

    Parameters
    ----------
    step_s : float
        Length of a step [s].
    sea_level_m : (n + 1, r) array
        Sea levels at the steps [m above datum]: the stage's, then those of openings with one of their own.
    sea_level_between_m : (n, r) array
        The same at `GAMMA` of each step.
    given_discharge_m3_s, given_discharge_between_m3_s : (n + 1,), (n,) array
        Sum of given discharges and inflows [m3/s into the basin], likewise.
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


class _Work(NamedTuple):
    """Room for one of the two parts of a step: crests, sections and discharges of the openings, and its last roots."""

    crests: FloatArray
    sections: FloatArray
    discharges: FloatArray
    past: FloatArray


def _room(openings: OpeningSet) -> _Work:
    count = openings.code.size
    return _Work(crests=np.empty(count), sections=openings.layers.copy(), discharges=np.zeros(count), past=np.zeros(5))


@compiled
def _total_discharge(
    kernels: tuple[Kernel, ...], openings: OpeningSet, work: _Work, sea: FloatArray, basin: float
) -> float:
    """Fill in the discharge of each opening [m3/s] and return their sum."""
    total = 0.0
    for k in range(openings.code.size):
        discharge, _, _ = kernels[openings.code[k]](
            sea[openings.sea_row[k]], basin, work.crests[k], work.sections[k], openings.numbers[k]
        )
        work.discharges[k] = discharge
        total += discharge
    return total


@compiled
def _solve_part(
    kernels: tuple[Kernel, ...],
    openings: OpeningSet,
    work: _Work,
    layers: FloatArray,
    sea: FloatArray,
    given: float,
    base: float,
    part_s: float,
    guess: float,
    fall: float,
) -> tuple[float, float]:
    """Return the signed root of the head that closes one implicit part, and how the excess falls with it there.

    The excess V(z) - base - part * (Q(z) + given) falls steadily with the root, so there is one zero. Secant steps
    from a guess of both, fenced by the bracket seen so far and halved where they do not close in. The discharges of
    `work` are left at the root.
    """
    tolerance = LEVEL_TOLERANCE_M * extent_at(sea[0] - guess * abs(guess), layers)
    low, high = -math.inf, math.inf
    old, old_excess = math.nan, math.nan
    root = guess
    for iteration in range(MOST_ITERATIONS):
        basin = sea[0] - root * abs(root)
        flow = _total_discharge(kernels, openings, work, sea, basin)
        excess = content_at(basin, layers) - base - part_s * (flow + given)
        if math.isnan(excess):
            break
        if iteration > 0 and excess != old_excess:
            fall = (old_excess - excess) / (root - old)
        if abs(excess) <= tolerance:
            # One more step costs nothing and keeps the guesses after this one smooth.
            return root + (excess / fall if fall > 0.0 else 0.0), fall
        if excess > 0.0:
            low = root
        else:
            high = root
        enclosed = math.isfinite(low) and math.isfinite(high)
        # Near slack the head itself is rounded, so that a small basin's excess cannot become any smaller.
        if enclosed and high - low <= 4e-16 * max(abs(low), abs(high)) + ROOT_TOLERANCE:
            return root, fall
        new = root + excess / fall if fall > 0.0 else math.nan
        if not low < new < high or (iteration > 8 and iteration % 2 == 0):
            if enclosed:
                new = 0.5 * (low + high)
            else:
                reach = max(2.0 * abs(root - guess), 1e-3)
                new = root + reach if excess > 0.0 else root - reach
        old, old_excess, root = root, excess, new
    return math.nan, fall


@compiled
def _expected_root(past: FloatArray) -> float:
    """Return the next of evenly stepped values by the polynomial through the last five, newest first."""
    return float(5.0 * (past[0] - past[3]) - 10.0 * (past[1] - past[2]) + past[4])


@compiled
def _remember(value: float, past: FloatArray) -> None:
    for j in range(4, 0, -1):
        past[j] = past[j - 1]
    past[0] = value


@compiled
def _added(volume: float, weight_s: float, work: _Work, given: float) -> float:
    """Return a volume with what runs through the openings, and what is given, in some time."""
    flow = given
    for discharge in work.discharges:
        flow += discharge
    return volume + weight_s * flow


@compiled
def _oversteps(level_m: float, before_m: float, forcing: Forcing, i: int) -> bool:
    """Return whether the basin would leave the range of its own level and all sea levels in a step without a cause."""
    lowest, highest = before_m, before_m
    for row in (forcing.sea_level_m[i], forcing.sea_level_between_m[i], forcing.sea_level_m[i + 1]):
        for sea in row:
            lowest, highest = min(lowest, sea), max(highest, sea)
    given, given_after = forcing.given_discharge_between_m3_s[i], forcing.given_discharge_m3_s[i + 1]
    too_high = level_m > highest + OVERSTEP_M and max(given, given_after) <= 0.0
    too_low = level_m < lowest - OVERSTEP_M and min(given, given_after) >= 0.0
    return too_high or too_low


@compiled
def _route(
    kernels: tuple[Kernel, ...],
    openings: OpeningSet,
    forcing: Forcing,
    layers: FloatArray,
    inner: _Work,
    outer: _Work,
    level: FloatArray,
    passed: FloatArray,
) -> float:
    """Fill in the levels at the steps, from the first, and the volume passed by each opening; return that given.

    The extrapolation inside a step can carry a basin that fills within the step past the level which it tends to.
    Such a step is taken again as one implicit step of first order, which cannot. Where a step finds no root the levels
    from there on are NaN.
    """
    steps = level.size - 1
    part_s = GAMMA * forcing.step_s
    rest_s = forcing.step_s - part_s
    volume = content_at(level[0], layers)
    given_volume = 0.0
    head = forcing.sea_level_m[0, 0] - level[0]
    root = math.copysign(math.sqrt(abs(head)), head)
    fall = 0.0
    for i in range(steps):
        sea, given = forcing.sea_level_between_m[i], forcing.given_discharge_between_m3_s[i]
        place_openings(openings, (i + GAMMA) / steps, inner.crests, inner.sections)
        # Roots follow those before them closely but at slack.
        guess = _expected_root(inner.past) if i > 4 else root
        inner_root, fall = _solve_part(kernels, openings, inner, layers, sea, given, volume, part_s, guess, fall)
        _remember(inner_root, inner.past)
        first = _added(volume, rest_s, inner, given)
        sea, given_after = forcing.sea_level_m[i + 1], forcing.given_discharge_m3_s[i + 1]
        place_openings(openings, (i + 1.0) / steps, outer.crests, outer.sections)
        guess = _expected_root(outer.past) if i > 4 else inner_root
        root, fall = _solve_part(kernels, openings, outer, layers, sea, given_after, first, part_s, guess, fall)
        weight, weight_after = rest_s, part_s
        if _oversteps(sea[0] - root * abs(root), level[i], forcing, i):
            weight, weight_after = 0.0, forcing.step_s
            root, fall = _solve_part(
                kernels, openings, outer, layers, sea, given_after, volume, weight_after, inner_root, fall
            )
        _remember(root, outer.past)
        if math.isnan(inner_root) or math.isnan(root):
            level[i + 1 :] = math.nan
            break
        for k in range(passed.size):
            passed[k] += weight * inner.discharges[k] + weight_after * outer.discharges[k]
        given_volume += weight * given + weight_after * given_after
        volume = _added(_added(volume, weight, inner, given), weight_after, outer, given_after)
        level[i + 1] = level_of(volume, layers)
    return given_volume


def _refuse_missing(openings: OpeningSet, forcing: Forcing, level_m: FloatArray, inner: _Work, outer: _Work) -> None:
    """Refuse a relation that had no value in the step that found no level."""
    last = int(np.argmin(np.isfinite(level_m))) - 1
    missing = [k for work in (inner, outer) for k in np.flatnonzero(np.isnan(work.discharges))]
    if not missing or not np.isfinite(forcing.sea_level_m[last + 1]).all():
        return
    k = missing[0]
    sea = forcing.sea_level_m[last, openings.sea_row[k]]
    raise DomainError(
        f"relation {tuple(RELATIONS)[openings.code[k]]} of opening {k + 1} of {openings.code.size} has no value "
        f"{last * forcing.step_s / SECONDS_PER_HOUR:.2f} h after the start, with the sea at {sea:.3g} m and the basin "
        f"at {level_m[last]:.3g} m; {NO_VALUE_REMEDY}"
    )


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
    DomainError
        If a relation has no value for the levels that it meets.
    ArithmeticError
        If a step finds no level (a relation whose discharge rises with the basin level), or the volume does not
        balance: faults of the program.
    """
    level, passed = np.empty(forcing.sea_level_m.shape[0]), np.zeros(openings.code.size)
    level[0] = start_level_m
    inner, outer = _room(openings), _room(openings)
    given_volume = _route(KERNELS, openings, forcing, storage.layers, inner, outer, level, passed)
    if not math.isfinite(level[-1]):
        _refuse_missing(openings, forcing, level, inner, outer)
        raise ArithmeticError("a step finds no basin level that balances the flows")
    stored = np.ptp(stored_volumes(storage, level[[0, -1]]) - [0.0, passed.sum() + given_volume])
    through = float(np.abs(passed).sum()) + abs(given_volume)
    if stored > BALANCE * max(float(np.ptp(level)), 1.0) * largest_area(storage) + ROUNDING * through:
        raise ArithmeticError(f"the basin's volume is out of balance by {stored:.3g} m3")
    return RoutedLevels(
        level_m=read_only(level), passed_volume_m3=read_only(passed), given_volume_m3=float(given_volume)
    )
